//! Performance measures: names, values, Monte Carlo standard errors.

use crate::methods::NoAnswer;

/// A performance measure of a method for one estimand under one truth.
///
/// Definitions follow Morris, White & Crowther (2019), Table 6, where they appear there.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Measure {
    /// Mean error.
    Bias,
    /// Bias over the true value; absent when the true value is zero.
    RelativeBias,
    /// Standard deviation of the estimates.
    EmpiricalSe,
    /// Root mean squared standard error claimed by the method.
    ModelSe,
    /// Model SE over empirical SE.
    SeRatio,
    /// Root mean squared error.
    Rmse,
    /// Share of trials whose interval holds the true value; no answer counts as a miss.
    Coverage,
    /// Share of trials whose interval holds the mean estimate.
    BiasEliminatedCoverage,
    /// Share of trials whose interval lies wholly below the true value.
    MissesBelow,
    /// Share of trials whose interval lies wholly above the true value.
    MissesAbove,
    /// Mean interval width.
    MeanWidth,
    /// Median interval width.
    MedianWidth,
    /// Mean width over the reference method's mean width.
    Price,
    /// Share of trials whose two-sided interval excludes the null value.
    RejectionTwoSided,
    /// Share of trials whose interval lies wholly above the null value (one-sided test at half
    /// the two-sided level).
    RejectionAbove,
    /// Share of trials whose interval lies wholly below the null value.
    RejectionBelow,
    /// Skewness of the studentised error.
    Skewness,
    /// Kurtosis of the studentised error (3 for the normal law).
    Kurtosis,
    /// Kolmogorov distance between the studentised error and the standard normal law.
    KolmogorovDistance,
    /// Share of trials without an answer.
    NoAnswer,
}

impl Measure {
    /// Every measure, in report order.
    pub const ALL: [Self; 20] = [
        Self::Bias,
        Self::RelativeBias,
        Self::EmpiricalSe,
        Self::ModelSe,
        Self::SeRatio,
        Self::Rmse,
        Self::Coverage,
        Self::BiasEliminatedCoverage,
        Self::MissesBelow,
        Self::MissesAbove,
        Self::MeanWidth,
        Self::MedianWidth,
        Self::Price,
        Self::RejectionTwoSided,
        Self::RejectionAbove,
        Self::RejectionBelow,
        Self::Skewness,
        Self::Kurtosis,
        Self::KolmogorovDistance,
        Self::NoAnswer,
    ];

    /// Key used in result files and requirements.
    #[must_use]
    pub fn key(self) -> &'static str {
        match self {
            Self::Bias => "bias",
            Self::RelativeBias => "relative-bias",
            Self::EmpiricalSe => "empirical-se",
            Self::ModelSe => "model-se",
            Self::SeRatio => "se-ratio",
            Self::Rmse => "rmse",
            Self::Coverage => "coverage",
            Self::BiasEliminatedCoverage => "bias-eliminated-coverage",
            Self::MissesBelow => "misses-below",
            Self::MissesAbove => "misses-above",
            Self::MeanWidth => "mean-width",
            Self::MedianWidth => "median-width",
            Self::Price => "price",
            Self::RejectionTwoSided => "rejection-two-sided",
            Self::RejectionAbove => "rejection-above",
            Self::RejectionBelow => "rejection-below",
            Self::Skewness => "skewness",
            Self::Kurtosis => "kurtosis",
            Self::KolmogorovDistance => "kolmogorov-distance",
            Self::NoAnswer => "no-answer",
        }
    }

    /// The measure with a given key.
    #[must_use]
    pub fn from_key(key: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|measure| measure.key() == key)
    }
}

/// A value with its Monte Carlo standard error.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MeasureValue {
    /// The measure.
    pub measure: Measure,
    /// Its estimate.
    pub value: f64,
    /// Monte Carlo standard error of the estimate.
    pub mcse: f64,
    /// Clopper-Pearson limits (95 %) where the measure is a proportion of trials.
    pub limits: Option<(f64, f64)>,
    /// Trials that entered the estimate.
    pub trials_used: u64,
}

/// All measures of one method for one estimand under one truth.
#[derive(Debug, Clone)]
pub struct CellMeasures {
    /// Estimand index.
    pub estimand: usize,
    /// Method index.
    pub method: usize,
    /// Measures that are defined here, in report order.
    pub values: Vec<MeasureValue>,
    /// Trials without an answer, by reason; reasons that did not occur are absent.
    pub failures: Vec<(NoAnswer, u64)>,
}

impl CellMeasures {
    /// The value of a measure, if it is defined here.
    #[must_use]
    pub fn get(&self, measure: Measure) -> Option<&MeasureValue> {
        self.values.iter().find(|value| value.measure == measure)
    }
}

/// A property of the design itself.
#[derive(Debug, Clone, PartialEq)]
pub struct OperatingValue {
    /// Key: `units`, `arm-share`, `mean-outcome`, `stability-index`, ...
    pub characteristic: String,
    /// What the value is about: an arm, an estimand, or empty.
    pub subject: String,
    /// Its estimate.
    pub value: f64,
    /// Monte Carlo standard error.
    pub mcse: f64,
    /// Trials that entered the estimate.
    pub trials_used: u64,
}

/// Everything scored under one truth.
#[derive(Debug, Clone)]
pub struct TruthMeasures {
    /// Truth index.
    pub truth: usize,
    /// Trials replayed.
    pub trials: u64,
    /// One entry per estimand × method, estimand-major.
    pub cells: Vec<CellMeasures>,
    /// Operating characteristics.
    pub operating: Vec<OperatingValue>,
}
