//! Where the units of a study come from.

use nalgebra::DMatrix;

/// Covariate columns and the source that fills them.
#[derive(Debug, Clone)]
pub struct Population {
    /// Names of the numeric covariate columns, in column order (a categorical covariate with
    /// `L` levels gives `L - 1` columns named `name=level`).
    pub columns: Vec<String>,
    /// Law or roster.
    pub source: Source,
}

/// A law to draw from, or a file of real units.
#[derive(Debug, Clone)]
pub enum Source {
    /// Covariates drawn from marginal laws joined by a Gaussian copula.
    Law(LawPopulation),
    /// Units drawn without replacement from a file.
    Roster(Roster),
}

/// Marginal laws in file order, joined by a Gaussian copula on their latent normals.
#[derive(Debug, Clone)]
pub struct LawPopulation {
    /// One marginal per covariate; each is driven by one latent standard normal.
    pub marginals: Vec<Marginal>,
    /// Factor of the latent correlation matrix.
    pub correlation: CorrelationFactor,
}

/// Marginal law of one covariate.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)] // the fields are described on their variant
pub enum Marginal {
    /// Normal with mean and standard deviation (`sd > 0`).
    Normal { mean: f64, sd: f64 },
    /// Uniform on `[low, high]`, `low < high`.
    Uniform { low: f64, high: f64 },
    /// `exp` of a normal with mean `log_mean` and standard deviation `log_sd > 0`.
    LogNormal { log_mean: f64, log_sd: f64 },
    /// Gamma with `shape > 0` and `scale > 0` (mean `shape × scale`).
    Gamma { shape: f64, scale: f64 },
    /// `location + scale × t(df)`, `df > 0`, `scale > 0`.
    StudentT { df: f64, location: f64, scale: f64 },
    /// One with the given probability, else zero.
    Bernoulli { probability: f64 },
    /// Level `k` with probability `probabilities[k]`; the first level is the reference, the
    /// others give one indicator column each. Probabilities sum to one.
    Categorical { probabilities: Vec<f64> },
    /// Poisson with `mean > 0`.
    Poisson { mean: f64 },
}

impl Marginal {
    /// Number of numeric columns that this covariate gives.
    #[must_use]
    pub fn width(&self) -> usize {
        match self {
            Self::Categorical { probabilities } => probabilities.len() - 1,
            _ => 1,
        }
    }

    /// Whether the covariate is the latent normal itself, up to shift and scale.
    #[must_use]
    pub fn is_normal(&self) -> bool {
        matches!(self, Self::Normal { .. })
    }
}

/// How correlated latent normals are made from independent ones.
#[derive(Debug, Clone)]
pub enum CorrelationFactor {
    /// Independent covariates.
    Identity,
    /// Correlation `rho^|j - k|`, `-1 < rho < 1`, made by recursion.
    Autoregressive(f64),
    /// Lower Cholesky factor of the correlation matrix (marginals × marginals).
    Lower(DMatrix<f64>),
}

/// A file of real units.
#[derive(Debug, Clone)]
pub struct Roster {
    /// Unit identifiers, in file order.
    pub ids: Vec<String>,
    /// Covariate values, rows × columns, column-major.
    pub values: Vec<f64>,
    /// Recorded outcomes, if the file is to supply them.
    pub outcomes: Option<Vec<f64>>,
}

impl Roster {
    /// Number of units in the file.
    #[must_use]
    pub fn len(&self) -> usize {
        self.ids.len()
    }

    /// Whether the file holds no unit.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.ids.is_empty()
    }
}
