//! Least-squares fit of some rows of a trial.

use super::NoAnswer;
use crate::numerics::kernels::{Columns, Kernels};
use crate::numerics::least_squares::LeastSquares;
use crate::trial::Trial;
use std::ops::Range;

/// Smallest Cholesky tolerance `1 - R²` of a column on the earlier ones for which the normal
/// equations are trusted. Their relative error is about machine epsilon over the tolerance, here
/// at most 2e-10; below it the rows are factored by Householder QR instead.
const TRUSTED_TOLERANCE: f64 = 1e-6;

/// A least-squares fit in buffers that are reused.
#[derive(Debug, Clone)]
pub struct Fit {
    p: usize,
    units: usize,
    factor: Vec<f64>,
    coefficients: Vec<f64>,
    residual_squares: f64,
    state: State,
}

#[derive(Debug, Clone)]
enum State {
    /// Not fitted, or no answer.
    Failed(NoAnswer),
    /// `factor` holds the Cholesky factor of the Gram matrix.
    Normal,
    /// The design is ill-conditioned; the rows were factored.
    Orthogonal(Box<LeastSquares>),
}

/// Rows of a trial with the stored columns of the analysis model.
#[derive(Debug, Clone)]
pub(super) struct ModelRows<'a> {
    pub(super) trial: &'a Trial,
    pub(super) rows: Range<usize>,
    pub(super) stored: &'a [usize],
}

impl<'a> ModelRows<'a> {
    pub(super) fn design(&self) -> Columns<'a> {
        self.trial.design(self.rows.clone())
    }

    pub(super) fn outcomes(&self) -> &'a [f64] {
        &self.trial.outcomes()[self.rows.clone()]
    }
}

/// Scratch space that fits share.
#[derive(Debug, Clone, Default)]
pub(super) struct FitScratch {
    pub(super) residuals: Vec<f64>,
    pub(super) vector: Vec<f64>,
}

impl Fit {
    /// An empty fit of `p` coefficients.
    #[must_use]
    pub fn new(p: usize) -> Self {
        Self {
            p,
            units: 0,
            factor: vec![0.0; p * p],
            coefficients: vec![0.0; p],
            residual_squares: 0.0,
            state: State::Failed(NoAnswer::EmptyBatch),
        }
    }

    /// Buffers for the Gram matrix and the cross-products, to be filled before [`Self::solve`].
    pub(super) fn sums_mut(&mut self) -> (&mut [f64], &mut [f64]) {
        (&mut self.factor, &mut self.coefficients)
    }

    /// Fits the rows, whose sums were put into [`Self::sums_mut`]. `deficient` is the reason
    /// given when the rows have not full column rank.
    pub(super) fn solve(
        &mut self,
        model: &ModelRows<'_>,
        deficient: NoAnswer,
        scratch: &mut FitScratch,
        kernels: Kernels,
    ) {
        self.units = model.rows.len();
        if self.units == 0 {
            self.state = State::Failed(NoAnswer::EmptyBatch);
            return;
        }
        if self.units < self.p {
            self.state = State::Failed(deficient);
            return;
        }
        let outcomes = model.outcomes();
        let tolerance = kernels.cholesky(&mut self.factor, self.p, 0.0);
        if tolerance < TRUSTED_TOLERANCE {
            let mut orthogonal = Box::new(LeastSquares::new());
            let leading = model.trial.capacity();
            let design = &model.trial.design_values()[model.rows.start..];
            match orthogonal.fit(design, leading, self.units, model.stored, outcomes) {
                Ok(()) => {
                    self.coefficients.copy_from_slice(orthogonal.coefficients());
                    self.residual_squares = orthogonal.residual_sum_of_squares();
                    self.fill_residuals(model, scratch, kernels);
                    self.state = State::Orthogonal(orthogonal);
                }
                Err(_) => self.state = State::Failed(deficient),
            }
            return;
        }
        kernels.solve_lower(&self.factor, self.p, &mut self.coefficients);
        kernels.solve_lower_transposed(&self.factor, self.p, &mut self.coefficients);
        self.fill_residuals(model, scratch, kernels);
        self.residual_squares = kernels.dot(&scratch.residuals, &scratch.residuals);
        self.state = State::Normal;
    }

    /// Residuals of the rows, left in the scratch space.
    fn fill_residuals(&self, model: &ModelRows<'_>, scratch: &mut FitScratch, kernels: Kernels) {
        let residuals = &mut scratch.residuals;
        residuals.clear();
        residuals.resize(self.units, 0.0);
        kernels.add_combination(model.design(), model.stored, &self.coefficients, residuals);
        for (value, outcome) in residuals.iter_mut().zip(model.outcomes()) {
            *value = outcome - *value;
        }
    }

    /// Whether there is a fit.
    ///
    /// # Errors
    /// The reason why there is none.
    pub fn answered(&self) -> Result<(), NoAnswer> {
        match self.state {
            State::Failed(reason) => Err(reason),
            _ => Ok(()),
        }
    }

    /// Coefficients, in model order.
    #[must_use]
    pub fn coefficients(&self) -> &[f64] {
        &self.coefficients
    }

    /// Residual sum of squares.
    #[must_use]
    pub fn residual_squares(&self) -> f64 {
        self.residual_squares
    }

    /// Residual degrees of freedom.
    #[must_use]
    pub fn degrees(&self) -> usize {
        self.units.saturating_sub(self.p)
    }

    /// Number of units.
    #[must_use]
    pub fn units(&self) -> usize {
        self.units
    }

    /// `c'β̂`.
    pub(super) fn point(&self, contrast: &[f64], kernels: Kernels) -> f64 {
        kernels.dot(contrast, &self.coefficients)
    }

    /// A vector `v` with `v'v = c'(X'X)^{-1}c`, linear in `c`.
    pub(super) fn whiten_contrast(&self, contrast: &[f64], out: &mut Vec<f64>, kernels: Kernels) {
        out.clear();
        if let State::Orthogonal(fit) = &self.state {
            out.extend(fit.rotated_contrast(contrast));
            return;
        }
        out.extend_from_slice(contrast);
        kernels.solve_lower(&self.factor, self.p, out);
    }

    /// `c'(X'X)^{-1}c`.
    pub(super) fn contrast_variance(
        &self,
        contrast: &[f64],
        scratch: &mut FitScratch,
        kernels: Kernels,
    ) -> f64 {
        if let State::Orthogonal(fit) = &self.state {
            return fit.contrast_variance(contrast);
        }
        let vector = &mut scratch.vector;
        vector.clear();
        vector.extend_from_slice(contrast);
        kernels.solve_lower(&self.factor, self.p, vector);
        kernels.dot(vector, vector)
    }

    /// `a = X(X'X)^{-1}c`, so that `c'β̂ = a'y`.
    pub(super) fn contrast_weights(
        &self,
        contrast: &[f64],
        model: &ModelRows<'_>,
        scratch: &mut FitScratch,
        kernels: Kernels,
        out: &mut Vec<f64>,
    ) {
        out.clear();
        out.resize(self.units, 0.0);
        if let State::Orthogonal(fit) = &self.state {
            fit.contrast_weights(contrast, out);
            return;
        }
        let vector = &mut scratch.vector;
        vector.clear();
        vector.extend_from_slice(contrast);
        kernels.solve_lower(&self.factor, self.p, vector);
        kernels.solve_lower_transposed(&self.factor, self.p, vector);
        kernels.add_combination(model.design(), model.stored, vector, out);
    }

    /// Leverages `h_i = x_i'(X'X)^{-1}x_i`.
    pub(super) fn leverages(
        &self,
        model: &ModelRows<'_>,
        tile: &mut Vec<f64>,
        kernels: Kernels,
        out: &mut Vec<f64>,
    ) {
        let count = self.units;
        out.clear();
        out.resize(count, 0.0);
        if let State::Orthogonal(fit) = &self.state {
            fit.leverages(out);
            return;
        }
        kernels.leverages(model.design(), model.stored, &self.factor, tile, out);
    }
}
