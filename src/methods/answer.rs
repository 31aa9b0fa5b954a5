//! What a method says about one estimand in one trial.

use std::fmt;

/// Point estimate, standard error and interval.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Answer {
    /// Point estimate.
    pub point: f64,
    /// Standard error that the method claims.
    pub standard_error: f64,
    /// Lower confidence limit.
    pub lower: f64,
    /// Upper confidence limit.
    pub upper: f64,
}

impl Answer {
    /// Interval `point ± critical × standard_error`.
    #[must_use]
    pub fn symmetric(point: f64, standard_error: f64, critical: f64) -> Self {
        let half_width = critical * standard_error;
        Self {
            point,
            standard_error,
            lower: point - half_width,
            upper: point + half_width,
        }
    }

    /// Width of the interval.
    #[must_use]
    pub fn width(&self) -> f64 {
        self.upper - self.lower
    }
}

/// An answer, or the reason why there is none.
pub type Estimate = Result<Answer, NoAnswer>;

/// Why a method has no answer in a trial.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum NoAnswer {
    /// The pooled design matrix has not full column rank.
    RankDeficient,
    /// The design of a batch that the method needs has not full column rank.
    BatchRankDeficient,
    /// No residual degree of freedom is left for the variance.
    NoResidualDegrees,
    /// A batch that the method needs enrolled nobody.
    EmptyBatch,
    /// A standard error came out as zero or not finite.
    DegenerateVariance,
    /// Predictable weights could not be closed on the contrast within their budget.
    BudgetNotClosed,
}

impl NoAnswer {
    /// Every reason, in report order.
    pub const ALL: [Self; 6] = [
        Self::RankDeficient,
        Self::BatchRankDeficient,
        Self::NoResidualDegrees,
        Self::EmptyBatch,
        Self::DegenerateVariance,
        Self::BudgetNotClosed,
    ];

    /// Key used in result files.
    #[must_use]
    pub fn key(self) -> &'static str {
        match self {
            Self::RankDeficient => "rank-deficient",
            Self::BatchRankDeficient => "batch-rank-deficient",
            Self::NoResidualDegrees => "no-residual-degrees",
            Self::EmptyBatch => "empty-batch",
            Self::DegenerateVariance => "degenerate-variance",
            Self::BudgetNotClosed => "budget-not-closed",
        }
    }
}

impl fmt::Display for NoAnswer {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        formatter.write_str(match self {
            Self::RankDeficient => "the pooled design matrix has not full column rank",
            Self::BatchRankDeficient => "the design matrix of a batch has not full column rank",
            Self::NoResidualDegrees => "no residual degree of freedom is left",
            Self::EmptyBatch => "a batch enrolled nobody",
            Self::DegenerateVariance => "the standard error is zero or not finite",
            Self::BudgetNotClosed => "the predictable weights could not be closed on the contrast",
        })
    }
}
