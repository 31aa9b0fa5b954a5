//! Contextual Thompson allocation: a Bayesian linear regression in each arm.

use crate::numerics::kernels::{Columns, Kernels};
use crate::numerics::quadrature::probability_of_being_largest;
use crate::plan::{Design, OutcomeVariance};
use crate::rules::Past;

/// Relative pivot below which a regressor of an arm counts as aliased when the outcome variance
/// is estimated by least squares.
const ALIAS_TOLERANCE: f64 = 1e-9;

/// Independent regressions of the outcome on intercept and covariates, one per arm.
///
/// Prior `β ~ N(0, τ²I)`; posterior precision `X'X/σ² + I/τ²`, posterior mean that precision's
/// inverse times `X'y/σ²`. The predictive mean of a unit with row `x` in arm `a` is
/// `N(x'M_a, x'V_a x)`, independent between arms.
#[derive(Debug, Clone)]
pub(super) struct ArmRegressions {
    variance: OutcomeVariance,
    prior_precision: f64,
    /// Stored design columns: intercept, then covariates.
    stored: Vec<usize>,
    arm_count: usize,
    /// Per arm `d × d`.
    gram: Vec<f64>,
    factor: Vec<f64>,
    /// Per arm `d`.
    cross: Vec<f64>,
    mean: Vec<f64>,
    squares: Vec<f64>,
    counts: Vec<f64>,
    row: Vec<f64>,
    means: Vec<f64>,
    sds: Vec<f64>,
}

impl ArmRegressions {
    pub(super) fn new(
        variance: OutcomeVariance,
        prior_sd: f64,
        columns: &[usize],
        arm_count: usize,
        design: &Design,
    ) -> Self {
        let mut stored = vec![0];
        stored.extend(
            columns
                .iter()
                .map(|column| design.first_covariate() + column),
        );
        let d = stored.len();
        Self {
            variance,
            prior_precision: 1.0 / (prior_sd * prior_sd),
            arm_count,
            gram: vec![0.0; arm_count * d * d],
            factor: vec![0.0; arm_count * d * d],
            cross: vec![0.0; arm_count * d],
            mean: vec![0.0; arm_count * d],
            squares: vec![0.0; arm_count],
            counts: vec![0.0; arm_count],
            row: vec![0.0; d],
            means: vec![0.0; arm_count],
            sds: vec![0.0; arm_count],
            stored,
        }
    }

    /// Fits every arm on the outcomes that are due.
    pub(super) fn fit(&mut self, past: &Past<'_>, kernels: Kernels) {
        let d = self.stored.len();
        self.gram.fill(0.0);
        self.cross.fill(0.0);
        self.squares.fill(0.0);
        self.counts.fill(0.0);
        for (unit, (&arm, &outcome)) in past.arms().iter().zip(past.outcomes()).enumerate() {
            for (value, &column) in self.row.iter_mut().zip(&self.stored) {
                *value = past.design().column(column)[unit];
            }
            let gram = &mut self.gram[arm * d * d..(arm + 1) * d * d];
            for (column, &factor) in gram.chunks_exact_mut(d).zip(&self.row) {
                kernels.add_scaled(factor, &self.row, column);
            }
            kernels.add_scaled(outcome, &self.row, &mut self.cross[arm * d..(arm + 1) * d]);
            self.squares[arm] += outcome * outcome;
            self.counts[arm] += 1.0;
        }
        let variance = match self.variance {
            OutcomeVariance::Known { sd } => sd * sd,
            OutcomeVariance::Estimated => self.residual_variance(kernels),
        };
        for arm in 0..self.arm_count {
            let factor = &mut self.factor[arm * d * d..(arm + 1) * d * d];
            let gram = &self.gram[arm * d * d..(arm + 1) * d * d];
            for (value, sum) in factor.iter_mut().zip(gram) {
                *value = sum / variance;
            }
            for index in 0..d {
                factor[index * d + index] += self.prior_precision;
            }
            kernels.cholesky(factor, d, 0.0);
            let mean = &mut self.mean[arm * d..(arm + 1) * d];
            for (value, sum) in mean.iter_mut().zip(&self.cross[arm * d..(arm + 1) * d]) {
                *value = sum / variance;
            }
            kernels.solve_lower(factor, d, mean);
            kernels.solve_lower_transposed(factor, d, mean);
        }
    }

    /// Residual variance of the least-squares fits, pooled over arms; the mean square of the
    /// outcomes when no residual degree of freedom is left.
    fn residual_variance(&mut self, kernels: Kernels) -> f64 {
        let d = self.stored.len();
        let mut residual = 0.0;
        let mut degrees = 0.0;
        for arm in 0..self.arm_count {
            let factor = &mut self.factor[arm * d * d..(arm + 1) * d * d];
            factor.copy_from_slice(&self.gram[arm * d * d..(arm + 1) * d * d]);
            kernels.cholesky(factor, d, ALIAS_TOLERANCE);
            let rank = (0..d).filter(|&j| factor[j * d + j].is_finite()).count();
            let scaled = &mut self.mean[arm * d..(arm + 1) * d];
            scaled.copy_from_slice(&self.cross[arm * d..(arm + 1) * d]);
            kernels.solve_lower(factor, d, scaled);
            residual += self.squares[arm] - kernels.dot(scaled, scaled);
            degrees += self.counts[arm] - rank as f64;
        }
        let units: f64 = self.counts.iter().sum();
        let total: f64 = self.squares.iter().sum();
        // Far below the mean square, the difference above is rounding error.
        let smallest = (total / units.max(1.0) * 1e-12).max(f64::MIN_POSITIVE);
        if degrees > 0.0 {
            (residual / degrees).max(smallest)
        } else {
            (total / units.max(1.0)).max(smallest)
        }
    }

    /// Probability that each arm has the largest predicted outcome for one unit of the batch.
    pub(super) fn probabilities(
        &mut self,
        batch: Columns<'_>,
        unit: usize,
        kernels: Kernels,
        out: &mut [f64],
    ) {
        let d = self.stored.len();
        for arm in 0..self.arm_count {
            for (value, &column) in self.row.iter_mut().zip(&self.stored) {
                *value = batch.column(column)[unit];
            }
            self.means[arm] = kernels.dot(&self.row, &self.mean[arm * d..(arm + 1) * d]);
            kernels.solve_lower(
                &self.factor[arm * d * d..(arm + 1) * d * d],
                d,
                &mut self.row,
            );
            self.sds[arm] = kernels.dot(&self.row, &self.row).sqrt();
        }
        probability_of_being_largest(&self.means, &self.sds, out);
    }
}
