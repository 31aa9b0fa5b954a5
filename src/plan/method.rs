//! Methods: estimator, standard error, interval and test, fixed before the data.

/// One method to score.
#[derive(Debug, Clone)]
pub struct Method {
    /// Label, unique in the scenario.
    pub label: String,
    /// What it does.
    pub kind: MethodKind,
}

/// Kind of method, with its options.
#[derive(Debug, Clone, PartialEq)]
pub enum MethodKind {
    /// Least squares on all units.
    LeastSquares {
        /// Form of the variance estimate.
        variance: VarianceForm,
    },
    /// Ridge regression with the usual interval.
    Ridge {
        /// Penalty `λ > 0` on every coefficient but the intercept.
        penalty: f64,
    },
    /// Least squares on the first batch alone.
    FirstBatch,
    /// Least squares on the last batch alone.
    LastBatch,
    /// Batchwise-studentised least squares with weights fixed in advance.
    BatchCombined {
        /// Weights of the batches.
        weights: BatchWeights,
    },
    /// Batch estimates weighted by their inverse variances.
    InverseVariance,
    /// Online debiasing by W-decorrelation.
    WDecorrelation {
        /// The tuning constant λ.
        penalty: DebiasingPenalty,
    },
}

/// Form of the variance estimate of least squares.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum VarianceForm {
    /// Homoscedastic, residual sum of squares over `n - p`.
    Model,
    /// Heteroscedasticity-consistent, no correction.
    Hc0,
    /// HC0 times `n/(n - p)`.
    Hc1,
    /// Squared residuals over `1 - h`.
    Hc2,
    /// Squared residuals over `(1 - h)²`.
    Hc3,
}

/// Weights of the batch-combined method, all fixed before the data.
#[derive(Debug, Clone, PartialEq)]
pub enum BatchWeights {
    /// Share of the planned units.
    Size,
    /// The same for every batch.
    Equal,
    /// Given in the scenario, one per batch, positive, summing to one.
    Given(Vec<f64>),
    /// Proportional to the batches' expected information in a pilot replay, per estimand.
    Planned,
}

/// Tuning constant of W-decorrelation.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum DebiasingPenalty {
    /// The published rule: the `1/n` quantile of the smallest eigenvalue of the Gram matrix over
    /// a pilot replay, divided by `log n`.
    Replayed,
    /// Fixed in the scenario.
    Fixed(f64),
}
