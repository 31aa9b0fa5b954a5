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
        /// Whether the weights follow unit by unit or batch by batch.
        steps: DebiasingSteps,
        /// What the standard error counts.
        error: DebiasingError,
    },
    /// Decorrelation that anticipates the information of later batches.
    AnticipatedDecorrelation,
    /// Predictable weights of one total budget that end at the contrast: an exact pivot.
    PredictablePivot,
    /// Any-time valid ellipsoid projected on the contrast.
    SelfNormalised {
        /// Regularisation `λ > 0`.
        penalty: f64,
        /// Bound on the Euclidean norm of the coefficients.
        bound: f64,
    },
}

/// Steps in which the weights of W-decorrelation follow.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum DebiasingSteps {
    /// Unit by unit, in time order.
    Units,
    /// Batch by batch, from the batches' sums.
    Batches,
}

/// What the standard error of a debiased estimate counts.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum DebiasingError {
    /// The weights of the correction alone, as published.
    Weights,
    /// The weights of the correction and of the remainder that least squares still carries.
    RemainderAware,
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
