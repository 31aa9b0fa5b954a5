//! What methods share in one trial: fits, residuals, leverages, scratch space.

use super::anticipation::AnticipationScratch;
use super::fit::{FitScratch, ModelRows};
use super::{CriticalValues, Fit, Needs, NoAnswer, RidgeScratch};
use crate::numerics::kernels::Kernels;
use crate::plan::{Plan, Term};
use crate::trial::{BatchSums, Trial};

/// Fits of one trial, prepared once for all methods, in buffers that are reused.
#[derive(Debug, Clone)]
pub struct Workbench {
    /// Stored design columns of the analysis model.
    pub(super) stored: Vec<usize>,
    positions: Vec<usize>,
    /// Position of the intercept in the analysis model.
    pub(super) intercept: Option<usize>,
    /// Contrast of each estimand under the truth at hand.
    pub(super) contrasts: Vec<Vec<f64>>,
    needs: Needs,
    pub(super) kernels: Kernels,
    pub(super) critical: CriticalValues,
    pub(super) pooled: Fit,
    pub(super) batch_fits: Vec<Fit>,
    /// Pooled Gram matrix and cross-products, before factoring.
    pub(super) gram: Vec<f64>,
    pub(super) cross: Vec<f64>,
    pub(super) residuals: Vec<f64>,
    pub(super) leverages: Vec<f64>,
    /// Gram matrix (`p × p`) and cross-products (`p`) of every batch, one after another.
    pub(super) batch_grams: Vec<f64>,
    pub(super) batch_crosses: Vec<f64>,
    pub(super) anticipation: AnticipationScratch,
    /// Squared length of each row of the analysis design.
    pub(super) row_squares: Vec<f64>,
    /// Rows of the analysis design, row-major.
    pub(super) rows: Vec<f64>,
    pub(super) weights: Vec<f64>,
    /// Estimand that `weights` belong to.
    weighted: Option<usize>,
    pub(super) batch_values: Vec<(f64, f64)>,
    tile: Vec<f64>,
    pub(super) scratch: FitScratch,
    pub(super) ridge: RidgeScratch,
    pub(super) sum_of_outcome_squares: f64,
}

impl Workbench {
    /// A workbench for the analysis model of a plan, for methods that need `needs`.
    ///
    /// `stored` are the stored columns of the analysis model, `used` the columns that batch sums
    /// are kept for. The contrasts are those of the first truth.
    #[must_use]
    pub fn new(
        plan: &Plan,
        stored: &[usize],
        used: &[usize],
        needs: Needs,
        kernels: Kernels,
    ) -> Self {
        let p = stored.len();
        let intercept = plan.analysis.position(Term::Intercept);
        let contrasts = plan
            .estimands
            .iter()
            .map(|e| e.contrasts[0].clone())
            .collect();
        let positions = stored
            .iter()
            .filter_map(|column| used.iter().position(|candidate| candidate == column))
            .collect();
        Self {
            stored: stored.to_vec(),
            positions,
            intercept,
            contrasts,
            needs,
            kernels,
            critical: CriticalValues::new(plan.level, plan.units()),
            pooled: Fit::new(p),
            batch_fits: plan.batches.iter().map(|_| Fit::new(p)).collect(),
            gram: vec![0.0; p * p],
            cross: vec![0.0; p],
            residuals: Vec::new(),
            leverages: Vec::new(),
            batch_grams: Vec::new(),
            batch_crosses: Vec::new(),
            anticipation: AnticipationScratch::default(),
            row_squares: Vec::new(),
            rows: Vec::new(),
            weights: Vec::new(),
            weighted: None,
            batch_values: Vec::new(),
            tile: Vec::new(),
            scratch: FitScratch::default(),
            ridge: RidgeScratch::default(),
            sum_of_outcome_squares: 0.0,
        }
    }

    /// Number of batches of the plan.
    #[must_use]
    pub fn batches(&self) -> usize {
        self.batch_fits.len()
    }

    /// Contrast of each estimand, to be set for a truth.
    pub fn contrasts_mut(&mut self) -> &mut [Vec<f64>] {
        &mut self.contrasts
    }

    /// Fit on all units.
    #[must_use]
    pub fn pooled(&self) -> &Fit {
        &self.pooled
    }

    /// Pooled Gram matrix of the analysis model, `p × p`.
    #[must_use]
    pub fn gram(&self) -> &[f64] {
        &self.gram
    }

    /// Point estimate and `c'(X'X)^{-1}c` of the pooled fit, if there is one.
    pub fn pooled_contrast(&mut self, estimand: usize) -> Option<(f64, f64)> {
        self.pooled.answered().ok()?;
        let contrast = &self.contrasts[estimand];
        let variance = self
            .pooled
            .contrast_variance(contrast, &mut self.scratch, self.kernels);
        Some((self.pooled.point(contrast, self.kernels), variance))
    }

    /// `c'(X_k'X_k)^{-1}c` of one batch, if the batch identifies its coefficients.
    pub fn batch_contrast_variance(&mut self, batch: usize, estimand: usize) -> Option<f64> {
        let fit = &self.batch_fits[batch];
        fit.answered().ok()?;
        let contrast = &self.contrasts[estimand];
        Some(fit.contrast_variance(contrast, &mut self.scratch, self.kernels))
    }

    /// Prepares all that the methods need from a finished trial.
    pub fn prepare(&mut self, trial: &Trial, sums: &BatchSums) {
        self.weighted = None;
        let kernels = self.kernels;
        if self.needs.pooled_fit {
            let all = sums.prefix(sums.batches());
            all.total(&self.positions, &mut self.gram, &mut self.cross);
            let (gram, cross) = self.pooled.sums_mut();
            gram.copy_from_slice(&self.gram);
            cross.copy_from_slice(&self.cross);
            let model = ModelRows {
                trial,
                rows: 0..trial.rows(),
                stored: &self.stored,
            };
            self.pooled
                .solve(&model, NoAnswer::RankDeficient, &mut self.scratch, kernels);
            self.sum_of_outcome_squares = kernels.dot(trial.outcomes(), trial.outcomes());
            if self.needs.residuals && self.pooled.answered().is_ok() {
                std::mem::swap(&mut self.residuals, &mut self.scratch.residuals);
            }
            if self.needs.leverages && self.pooled.answered().is_ok() {
                let model = ModelRows {
                    trial,
                    rows: 0..trial.rows(),
                    stored: &self.stored,
                };
                self.pooled
                    .leverages(&model, &mut self.tile, kernels, &mut self.leverages);
            }
        }
        let last = self.batch_fits.len() - 1;
        for (batch, fit) in self.batch_fits.iter_mut().enumerate() {
            let wanted = self.needs.every_batch
                || (self.needs.first_batch && batch == 0)
                || (self.needs.last_batch && batch == last);
            if !wanted {
                continue;
            }
            let (gram, cross) = fit.sums_mut();
            sums.batch_only(batch).total(&self.positions, gram, cross);
            let model = ModelRows {
                trial,
                rows: trial.batch_rows(batch),
                stored: &self.stored,
            };
            fit.solve(
                &model,
                NoAnswer::BatchRankDeficient,
                &mut self.scratch,
                kernels,
            );
        }
        if self.needs.batch_sums {
            self.fill_batch_sums(sums);
        }
        if self.needs.rows_in_order {
            self.fill_rows(trial);
        }
    }

    fn fill_batch_sums(&mut self, sums: &BatchSums) {
        let p = self.stored.len();
        self.batch_grams.resize(sums.batches() * p * p, 0.0);
        self.batch_crosses.resize(sums.batches() * p, 0.0);
        for batch in 0..sums.batches() {
            sums.batch_only(batch).total(
                &self.positions,
                &mut self.batch_grams[batch * p * p..(batch + 1) * p * p],
                &mut self.batch_crosses[batch * p..(batch + 1) * p],
            );
        }
    }

    /// Copies the analysis design row by row and sums the squares of each row.
    fn fill_rows(&mut self, trial: &Trial) {
        /// Rows copied together, so that the columns are read in cache lines.
        const TILE: usize = 16;
        let (n, p) = (trial.rows(), self.stored.len());
        self.rows.resize(n * p, 0.0);
        self.row_squares.clear();
        self.row_squares.resize(n, 0.0);
        let design = trial.design(0..n);
        for start in (0..n).step_by(TILE) {
            let end = (start + TILE).min(n);
            for (j, &column) in self.stored.iter().enumerate() {
                for (i, &value) in design.column(column)[start..end].iter().enumerate() {
                    self.rows[(start + i) * p + j] = value;
                }
            }
        }
        for &column in &self.stored {
            for (sum, value) in self.row_squares.iter_mut().zip(design.column(column)) {
                *sum += value * value;
            }
        }
    }

    /// `a = X(X'X)^{-1}c` of the pooled fit, into `weights`.
    pub(super) fn fill_contrast_weights(&mut self, trial: &Trial, estimand: usize) {
        if self.weighted == Some(estimand) {
            return;
        }
        self.weighted = Some(estimand);
        let model = ModelRows {
            trial,
            rows: 0..trial.rows(),
            stored: &self.stored,
        };
        self.pooled.contrast_weights(
            &self.contrasts[estimand],
            &model,
            &mut self.scratch,
            self.kernels,
            &mut self.weights,
        );
    }

    /// `‖a + XS^{-1}r‖²` from `‖a‖²` and the remainder `r = c - X'a`, which is
    /// `‖a‖² + 2c'S^{-1}r - r'S^{-1}r`.
    pub(super) fn with_remainder(&mut self, estimand: usize, squares: f64, rest: &[f64]) -> f64 {
        let kernels = self.kernels;
        let (whitened, vector) = (&mut self.scratch.residuals, &mut self.scratch.vector);
        self.pooled.whiten_contrast(rest, vector, kernels);
        whitened.clear();
        whitened.extend_from_slice(vector);
        self.pooled
            .whiten_contrast(&self.contrasts[estimand], vector, kernels);
        squares + 2.0 * kernels.dot(vector, whitened) - kernels.dot(whitened, whitened)
    }

    /// Within-batch variance pooled over batches, with its degrees of freedom.
    pub(super) fn within_batch_variance(&self) -> Result<(f64, usize), NoAnswer> {
        let mut squares = 0.0;
        let mut degrees = 0;
        for fit in &self.batch_fits {
            fit.answered()?;
            squares += fit.residual_squares();
            degrees += fit.degrees();
        }
        if degrees == 0 {
            return Err(NoAnswer::NoResidualDegrees);
        }
        Ok((squares / degrees as f64, degrees))
    }

    /// Estimate and unit variance `c'(X_k'X_k)^{-1}c` of every batch, into `batch_values`.
    pub(super) fn fill_batch_values(&mut self, estimand: usize) {
        let contrast = &self.contrasts[estimand];
        self.batch_values.clear();
        for fit in &self.batch_fits {
            let variance = fit.contrast_variance(contrast, &mut self.scratch, self.kernels);
            self.batch_values
                .push((fit.point(contrast, self.kernels), variance));
        }
    }
}

/// An answer, unless its standard error is zero or not finite.
pub(super) fn checked(answer: super::Answer) -> super::Estimate {
    if answer.point.is_finite() && answer.standard_error.is_finite() && answer.standard_error > 0.0
    {
        Ok(answer)
    } else {
        Err(NoAnswer::DegenerateVariance)
    }
}
