//! Regressors of a linear model.

/// One regressor.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Term {
    /// The constant one.
    Intercept,
    /// Indicator of an arm other than the reference.
    Arm(usize),
    /// A covariate column.
    Covariate(usize),
    /// A covariate column times the indicator of an arm other than the reference.
    ArmCovariate {
        /// Arm index, at least 1.
        arm: usize,
        /// Covariate column.
        column: usize,
    },
}

/// An ordered list of distinct regressors, with their names as the scenario spells them.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Model {
    /// Regressors, in coefficient order.
    pub terms: Vec<Term>,
    /// Name of each regressor: `intercept`, an arm, a covariate column, or `arm:column`.
    pub names: Vec<String>,
}

impl Model {
    /// Number of coefficients.
    #[must_use]
    pub fn len(&self) -> usize {
        self.terms.len()
    }

    /// Whether the model has no regressor.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.terms.is_empty()
    }

    /// Position of a regressor.
    #[must_use]
    pub fn position(&self, term: Term) -> Option<usize> {
        self.terms.iter().position(|&candidate| candidate == term)
    }
}

/// The columns that a trial stores: every regressor that any model of the plan uses, each once.
///
/// The order is the intercept, the arm indicators, all covariates, then interactions.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Design {
    /// Stored columns.
    pub terms: Vec<Term>,
    /// Number of arm indicators (arms - 1, or 0).
    pub arm_indicators: usize,
    /// Number of covariate columns.
    pub covariates: usize,
}

impl Design {
    /// The design for `arms` arms (0 without arms), `covariates` covariate columns, and the
    /// interactions of `models`.
    #[must_use]
    pub fn new<'a>(
        arms: usize,
        covariates: usize,
        models: impl IntoIterator<Item = &'a Model>,
    ) -> Self {
        let arm_indicators = arms.saturating_sub(1);
        let mut terms = vec![Term::Intercept];
        terms.extend((1..=arm_indicators).map(Term::Arm));
        terms.extend((0..covariates).map(Term::Covariate));
        for model in models {
            for &term in &model.terms {
                if !terms.contains(&term) {
                    terms.push(term);
                }
            }
        }
        Self {
            terms,
            arm_indicators,
            covariates,
        }
    }

    /// Number of stored columns.
    #[must_use]
    pub fn width(&self) -> usize {
        self.terms.len()
    }

    /// Stored column of the first arm indicator.
    #[must_use]
    pub fn first_arm_indicator(&self) -> usize {
        1
    }

    /// Stored column of the first covariate.
    #[must_use]
    pub fn first_covariate(&self) -> usize {
        1 + self.arm_indicators
    }

    /// Stored columns that are interactions, with their arm and covariate column.
    pub fn interactions(&self) -> impl Iterator<Item = (usize, usize, usize)> + '_ {
        self.terms
            .iter()
            .enumerate()
            .filter_map(|(stored, term)| match *term {
                Term::ArmCovariate { arm, column } => Some((stored, arm, column)),
                _ => None,
            })
    }

    /// Stored column of each regressor of a model; the model must be among those that the design
    /// was made for.
    #[must_use]
    pub fn columns_of(&self, model: &Model) -> Vec<usize> {
        model
            .terms
            .iter()
            .filter_map(|term| self.terms.iter().position(|candidate| candidate == term))
            .collect()
    }
}
