//! Methods with their tuning constants fixed, as they stand before the first scored trial.

use crate::plan::{DebiasingError, DebiasingSteps, VarianceForm};

/// A method ready to be applied.
#[derive(Debug, Clone, PartialEq)]
pub enum TunedMethod {
    /// Least squares on all units.
    LeastSquares {
        /// Form of the variance estimate.
        variance: VarianceForm,
    },
    /// Ridge regression with the usual interval.
    Ridge {
        /// Penalty on every coefficient but the intercept.
        penalty: f64,
    },
    /// Least squares on the first batch.
    FirstBatch,
    /// Least squares on the last batch.
    LastBatch,
    /// Batchwise-studentised least squares.
    BatchCombined {
        /// Weights, one row per estimand, one entry per batch, each row summing to one.
        weights: Vec<Vec<f64>>,
    },
    /// Inverse-variance combination of batch estimates.
    InverseVariance,
    /// Online debiasing by W-decorrelation.
    WDecorrelation {
        /// The tuning constant λ.
        penalty: f64,
        /// Whether the weights follow unit by unit or batch by batch.
        steps: DebiasingSteps,
        /// What the standard error counts.
        error: DebiasingError,
    },
    /// Decorrelation that anticipates the information of later batches.
    AnticipatedDecorrelation,
    /// Predictable weights of one total budget that end at the contrast.
    PredictablePivot,
    /// Any-time valid ellipsoid projected on the contrast.
    SelfNormalised {
        /// Regularisation λ.
        penalty: f64,
        /// Bound on the Euclidean norm of the coefficients.
        bound: f64,
    },
}

/// What a method reads; the workbench prepares no more than the scenario's methods need.
#[allow(clippy::struct_excessive_bools)] // a set of independent needs
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub struct Needs {
    /// The least-squares fit on all units.
    pub pooled_fit: bool,
    /// Residuals of that fit, unit by unit.
    pub residuals: bool,
    /// Leverages of that fit, unit by unit.
    pub leverages: bool,
    /// The least-squares fit of the first batch.
    pub first_batch: bool,
    /// The least-squares fit of the last batch.
    pub last_batch: bool,
    /// The least-squares fit of every batch.
    pub every_batch: bool,
    /// Gram matrix and cross-products of every batch.
    pub batch_sums: bool,
    /// Unit rows in time order.
    pub rows_in_order: bool,
}

impl Needs {
    /// What either needs.
    #[must_use]
    pub fn union(self, other: Self) -> Self {
        Self {
            pooled_fit: self.pooled_fit || other.pooled_fit,
            residuals: self.residuals || other.residuals,
            leverages: self.leverages || other.leverages,
            first_batch: self.first_batch || other.first_batch,
            last_batch: self.last_batch || other.last_batch,
            every_batch: self.every_batch || other.every_batch,
            batch_sums: self.batch_sums || other.batch_sums,
            rows_in_order: self.rows_in_order || other.rows_in_order,
        }
    }
}

impl TunedMethod {
    /// What the method reads.
    #[must_use]
    pub fn needs(&self) -> Needs {
        let nothing = Needs::default();
        match self {
            Self::LeastSquares { variance } => Needs {
                pooled_fit: true,
                residuals: *variance != VarianceForm::Model,
                leverages: matches!(variance, VarianceForm::Hc2 | VarianceForm::Hc3),
                ..nothing
            },
            // They solve equations of their own, from the pooled sums that come with the fit.
            Self::Ridge { .. } | Self::SelfNormalised { .. } => Needs {
                pooled_fit: true,
                ..nothing
            },
            Self::FirstBatch => Needs {
                first_batch: true,
                ..nothing
            },
            Self::LastBatch => Needs {
                last_batch: true,
                ..nothing
            },
            Self::BatchCombined { .. } | Self::InverseVariance => Needs {
                every_batch: true,
                ..nothing
            },
            Self::WDecorrelation {
                steps: DebiasingSteps::Units,
                ..
            } => Needs {
                pooled_fit: true,
                residuals: true,
                rows_in_order: true,
                ..nothing
            },
            Self::WDecorrelation {
                steps: DebiasingSteps::Batches,
                ..
            } => Needs {
                pooled_fit: true,
                batch_sums: true,
                ..nothing
            },
            Self::AnticipatedDecorrelation => Needs {
                pooled_fit: true,
                every_batch: true,
                batch_sums: true,
                ..nothing
            },
            Self::PredictablePivot => Needs {
                every_batch: true,
                batch_sums: true,
                ..nothing
            },
        }
    }
}
