//! The scenario *as meant*: laws, rules, contrasts and truths, resolved and checked.
//!
//! A [`Plan`] is valid by construction: every index is in range, every size is at least one,
//! every probability lies in `[0, 1]`, every correlation factor exists. The engine sees only the
//! plan, never the text it came from.

mod batch;
mod estimand;
mod method;
mod model;
mod population;
mod precision;
mod resolve;
mod truth;

pub use batch::{
    Allocation, AllocationRule, Batch, Draw, OutcomeVariance, Score, ScoreFit, SelectPart,
    SelectRule, Tail,
};
pub use estimand::Estimand;
pub use method::{
    BatchWeights, DebiasingError, DebiasingPenalty, DebiasingSteps, Method, MethodKind,
    VarianceForm,
};
pub use model::{Design, Model, Term};
pub use population::{CorrelationFactor, LawPopulation, Marginal, Population, Roster, Source};
pub use precision::{Bound, Precision, Requirement, Verdicts};
pub use resolve::{count_for_share, parse, read, resolve};
pub use truth::{Drift, Noise, NoiseLaw, Truth};

/// A planned study, the truths to try it under, and the methods to score.
#[derive(Debug, Clone)]
pub struct Plan {
    /// Title of the study, one line.
    pub title: String,
    /// Question that the simulation answers, in plain words.
    pub aim: String,
    /// Where the units come from.
    pub population: Population,
    /// Arm names, the reference (control) arm first. Empty: a study without arms.
    pub arms: Vec<String>,
    /// Data-generating parameter values to try, at least one.
    pub truths: Vec<Truth>,
    /// Batches in time order, `repeat` already unrolled, at least one.
    pub batches: Vec<Batch>,
    /// Regressors of the analysis model.
    pub analysis: Model,
    /// Confidence level of every interval, in `(0, 1)`.
    pub level: f64,
    /// Contrasts of the analysis coefficients that the study is to estimate.
    pub estimands: Vec<Estimand>,
    /// Methods to score, in the order of the file.
    pub methods: Vec<Method>,
    /// Number of trials and seed.
    pub precision: Precision,
    /// How the verdicts are reached.
    pub verdicts: Verdicts,
    /// Stated requirements that decide the exit code.
    pub requirements: Vec<Requirement>,
}

impl Plan {
    /// Units planned over all batches (an `above-threshold` batch may enrol fewer).
    #[must_use]
    pub fn units(&self) -> usize {
        self.batches.iter().map(|batch| batch.size).sum()
    }

    /// The columns that a trial of this plan stores.
    #[must_use]
    pub fn design(&self) -> Design {
        let rules = self
            .batches
            .iter()
            .flat_map(|batch| &batch.select)
            .filter_map(|part| part.rule.fit())
            .map(|fit| &fit.model);
        Design::new(
            self.arm_count(),
            self.population.columns.len(),
            std::iter::once(&self.analysis).chain(rules),
        )
    }

    /// Number of arms; 0 for a study without arms.
    #[must_use]
    pub fn arm_count(&self) -> usize {
        self.arms.len()
    }
}
