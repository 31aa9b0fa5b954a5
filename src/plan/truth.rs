//! One set of data-generating parameter values.

/// Parameters of the outcome under one truth.
///
/// The mean of a unit in arm `a` with covariate row `x` is
/// `intercept + arm_effects[a] + Σ_j x_j (slopes[j] + interactions[a][j]) + drift(batch)`.
#[derive(Debug, Clone)]
pub struct Truth {
    /// Name, unique in the scenario.
    pub name: String,
    /// Why this truth is tried, if the scenario says so.
    pub reason: Option<String>,
    /// Intercept.
    pub intercept: f64,
    /// Effect of each arm against the reference arm; entry 0 is zero. Empty without arms.
    pub arm_effects: Vec<f64>,
    /// Slope of each covariate column.
    pub slopes: Vec<f64>,
    /// Arm-by-covariate interactions, one row of slopes per arm (row 0 is zero); empty when
    /// there are none.
    pub interactions: Vec<Vec<f64>>,
    /// Law of the noise.
    pub noise: Noise,
    /// Change of the mean over batches.
    pub drift: Drift,
    /// Batches by which an outcome is late: with delay `d`, a rule for batch `k` sees the
    /// outcomes of batches up to `k - 1 - d` (counting from one).
    pub delay: usize,
}

/// Noise of the outcome.
#[derive(Debug, Clone, PartialEq)]
pub struct Noise {
    /// Standardised law: mean zero, variance one (before heteroscedasticity).
    pub law: NoiseLaw,
    /// Standard deviation.
    pub sd: f64,
    /// Heteroscedasticity: the sd of a unit is `sd × exp(slope × x[column])`.
    pub log_sd_slope: Option<(usize, f64)>,
}

/// Standardised noise law.
#[derive(Debug, Clone, Copy, PartialEq)]
#[allow(missing_docs)] // the fields are described on their variant
pub enum NoiseLaw {
    /// Standard normal.
    Normal,
    /// Student t with `df > 2`, scaled to unit variance.
    StudentT { df: f64 },
    /// Laplace, scaled to unit variance.
    Laplace,
    /// Log-normal with the given sd of the logarithm, centred and scaled to unit variance.
    CentredLogNormal { log_sd: f64 },
}

/// Change of the mean outcome over batches, the same in all arms.
#[derive(Debug, Clone, Copy, PartialEq)]
#[allow(missing_docs)] // the fields are described on their variant
pub enum Drift {
    /// None.
    None,
    /// From 0 in the first batch to `total` in the last, in equal steps.
    Linear { total: f64 },
    /// `size` is added from batch `from` on (zero-based).
    Step { from: usize, size: f64 },
}

impl Drift {
    /// Shift of the mean in batch `batch` (zero-based) of `batches`.
    #[must_use]
    pub fn shift(self, batch: usize, batches: usize) -> f64 {
        match self {
            Self::Linear { total } if batches > 1 => total * batch as f64 / (batches - 1) as f64,
            Self::None | Self::Linear { .. } => 0.0,
            Self::Step { from, size } => {
                if batch >= from {
                    size
                } else {
                    0.0
                }
            }
        }
    }
}
