//! The working model of a rule, fitted on every outcome that is due.

use super::Past;
use crate::numerics::kernels::Kernels;
use crate::plan::{Design, ScoreFit, Term};

/// Relative pivot below which a regressor counts as a combination of the earlier ones; its
/// coefficient is then zero, so that a rule can always act.
const ALIAS_TOLERANCE: f64 = 1e-9;

/// Coefficients and factor of a working model, in buffers that are reused.
#[derive(Debug, Clone)]
pub struct WorkingFit {
    terms: Vec<Term>,
    positions: Vec<usize>,
    /// 0, 1, 2, ... : the regressors of the factor in their own order.
    order: Vec<usize>,
    penalty: f64,
    factor: Vec<f64>,
    coefficients: Vec<f64>,
}

impl WorkingFit {
    /// Prepares a working model over the summed columns `used` of `design`.
    #[must_use]
    pub fn new(fit: &ScoreFit, design: &Design, used: &[usize]) -> Self {
        let stored = design.columns_of(&fit.model);
        let positions: Vec<usize> = stored
            .iter()
            .filter_map(|column| used.iter().position(|candidate| candidate == column))
            .collect();
        let p = positions.len();
        Self {
            terms: fit.model.terms.clone(),
            positions,
            order: (0..p).collect(),
            penalty: fit.penalty,
            factor: vec![0.0; p * p],
            coefficients: vec![0.0; p],
        }
    }

    /// Fits by least squares or ridge regression through the Cholesky factor.
    pub fn update(&mut self, past: &Past<'_>, kernels: Kernels) {
        let p = self.positions.len();
        past.sums()
            .total(&self.positions, &mut self.factor, &mut self.coefficients);
        if self.penalty > 0.0 {
            for (index, term) in self.terms.iter().enumerate() {
                if *term != Term::Intercept {
                    self.factor[index * p + index] += self.penalty;
                }
            }
        }
        kernels.cholesky(&mut self.factor, p, ALIAS_TOLERANCE);
        kernels.solve_lower(&self.factor, p, &mut self.coefficients);
        kernels.solve_lower_transposed(&self.factor, p, &mut self.coefficients);
    }

    /// Regressors with their fitted coefficients.
    pub fn coefficients(&self) -> impl Iterator<Item = (Term, f64)> + '_ {
        self.terms
            .iter()
            .copied()
            .zip(self.coefficients.iter().copied())
    }

    /// Regressors.
    #[must_use]
    pub fn terms(&self) -> &[Term] {
        &self.terms
    }

    /// The regressors' positions in the factor, in order.
    #[must_use]
    pub fn order(&self) -> &[usize] {
        &self.order
    }

    /// Lower Cholesky factor of the (penalised) Gram matrix.
    #[must_use]
    pub fn factor(&self) -> &[f64] {
        &self.factor
    }
}
