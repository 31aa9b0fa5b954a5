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
