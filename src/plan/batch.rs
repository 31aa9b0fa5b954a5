//! Batches, and the rules that fill them.

use super::Model;

/// Units enrolled between two looks at the outcomes.
#[derive(Debug, Clone)]
pub struct Batch {
    /// Units to enrol; the sum of the parts' sizes.
    pub size: usize,
    /// Who is enrolled: one part, or a mixture in which each part fills its share.
    pub select: Vec<SelectPart>,
    /// Which arm each unit gets; `None` in a study without arms.
    pub allocate: Option<Allocation>,
}

/// One part of a batch's selection.
#[derive(Debug, Clone)]
pub struct SelectPart {
    /// Units that this part enrols.
    pub size: usize,
    /// Candidates screened for them; equals `size` for the random rule.
    pub candidates: usize,
    /// The rule.
    pub rule: SelectRule,
}

/// Selection rule.
#[derive(Debug, Clone)]
pub enum SelectRule {
    /// The candidates as they come.
    Random,
    /// The candidates with the highest (or lowest) scores.
    Quantile {
        /// Which end of the scores is enrolled.
        tail: Tail,
        /// What candidates are ranked by.
        score: Score,
    },
    /// Candidates, in order of arrival, whose score exceeds a threshold; fewer than `size` are
    /// enrolled when too few candidates pass.
    AboveThreshold {
        /// Threshold on the score's own scale.
        threshold: f64,
        /// What is compared with the threshold.
        score: Score,
    },
    /// Fixed-size systematic sampling with inclusion probability proportional to
    /// `exp(strength × score)`, capped at one; the probabilities are logged.
    Tilted {
        /// Log-odds weight of one unit of score.
        strength: f64,
        /// What the inclusion probability grows with.
        score: Score,
    },
    /// The candidates with the largest prediction variance `x'(S + λI)^{-1}x`.
    Uncertain {
        /// Working model whose information matrix measures uncertainty.
        fit: ScoreFit,
    },
}

impl SelectRule {
    /// The score that the rule ranks by, if it has one.
    #[must_use]
    pub fn score(&self) -> Option<&Score> {
        match self {
            Self::Quantile { score, .. }
            | Self::AboveThreshold { score, .. }
            | Self::Tilted { score, .. } => Some(score),
            Self::Random | Self::Uncertain { .. } => None,
        }
    }

    /// The working model that the rule fits to earlier outcomes or covariates, if any.
    #[must_use]
    pub fn fit(&self) -> Option<&ScoreFit> {
        match self {
            Self::Uncertain { fit } => Some(fit),
            _ => self.score().and_then(Score::fit),
        }
    }
}

/// End of the score distribution.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Tail {
    /// Highest scores.
    Top,
    /// Lowest scores.
    Bottom,
}

/// What candidates are ranked by.
#[derive(Debug, Clone)]
pub enum Score {
    /// Outcome predicted by the working model if the unit were in `arm`.
    PredictedOutcome {
        /// Arm to predict under; 0 in a study without arms.
        arm: usize,
        /// Working model.
        fit: ScoreFit,
    },
    /// Predicted difference between `arm` and the reference arm.
    PredictedContrast {
        /// Arm compared with the reference; at least 1.
        arm: usize,
        /// Working model.
        fit: ScoreFit,
    },
    /// The value of one covariate column.
    Covariate {
        /// Covariate column.
        column: usize,
    },
}

impl Score {
    /// The working model behind the score, if it needs one.
    #[must_use]
    pub fn fit(&self) -> Option<&ScoreFit> {
        match self {
            Self::PredictedOutcome { fit, .. } | Self::PredictedContrast { fit, .. } => Some(fit),
            Self::Covariate { .. } => None,
        }
    }
}

/// Working model of a rule: fitted on every outcome that is due.
#[derive(Debug, Clone)]
pub struct ScoreFit {
    /// Regressors.
    pub model: Model,
    /// Ridge penalty `λ ≥ 0` on every coefficient but the intercept; 0 is least squares.
    pub penalty: f64,
}

/// Allocation of a batch's units to arms.
#[derive(Debug, Clone)]
pub struct Allocation {
    /// The rule that gives the probabilities.
    pub rule: AllocationRule,
    /// Smallest probability of any arm, in `[0, 1/K]`, enforced by clipping.
    pub floor: f64,
    /// How the units are drawn from the probabilities.
    pub draw: Draw,
}

/// How units are drawn from their allocation probabilities.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Draw {
    /// Randomised quotas: systematic sampling of the fractional parts in random order. The
    /// marginal probabilities are exact and the arm counts are within one of their expectation.
    Quota,
    /// Independent draws.
    Independent,
}

/// Rule that gives every unit its arm probabilities.
#[derive(Debug, Clone)]
pub enum AllocationRule {
    /// The same probability for every arm, in permuted blocks of one unit per arm.
    Equal,
    /// Fixed shares, summing to one.
    Fixed {
        /// Share of each arm.
        shares: Vec<f64>,
    },
    /// `ε/K` for every arm plus `1 - ε` for the arm with the highest mean so far (ties shared).
    EpsilonGreedy {
        /// Share allocated at random.
        epsilon: f64,
    },
    /// Posterior probability that the arm has the highest mean, normal outcomes.
    Thompson {
        /// Known or estimated outcome variance.
        variance: OutcomeVariance,
        /// Prior mean of every arm.
        prior_mean: f64,
        /// Prior sd of every arm; infinite for a flat prior.
        prior_sd: f64,
    },
    /// Posterior probability that the arm has the highest predicted outcome for the unit's own
    /// covariates; an independent Bayesian linear regression in each arm.
    ThompsonLinear {
        /// Known or estimated outcome variance.
        variance: OutcomeVariance,
        /// Prior sd of every coefficient (finite).
        prior_sd: f64,
        /// Covariate columns used, besides the intercept.
        columns: Vec<usize>,
    },
}

impl AllocationRule {
    /// Whether the rule looks at earlier outcomes.
    #[must_use]
    pub fn looks_back(&self) -> bool {
        !matches!(self, Self::Equal | Self::Fixed { .. })
    }
}

/// Outcome variance as an allocation rule takes it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum OutcomeVariance {
    /// Known standard deviation.
    Known {
        /// Standard deviation.
        sd: f64,
    },
    /// Estimated from the outcomes seen, pooled over arms.
    Estimated,
}
