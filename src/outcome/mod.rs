//! Outcomes of units: expected value and noise under one truth.

mod noise;

use crate::numerics::kernels::Kernels;
use crate::plan::{Design, Truth};
use crate::streams::{Purpose, Streams, fill_standard_normal};
use crate::trial::Trial;
use noise::NoiseTransform;
use std::ops::Range;

/// Generates outcomes under one truth.
#[derive(Debug, Clone)]
pub struct OutcomeModel {
    truth: Truth,
    /// Stored columns and slopes that are not zero.
    columns: Vec<usize>,
    slopes: Vec<f64>,
    first_covariate: usize,
    noise: NoiseTransform,
    batches: usize,
}

impl OutcomeModel {
    /// Prepares a truth for a study of `batches` batches with the stored columns `design`.
    #[must_use]
    pub fn new(truth: &Truth, design: &Design, batches: usize) -> Self {
        let first_covariate = design.first_covariate();
        let nonzero = truth
            .slopes
            .iter()
            .enumerate()
            .filter(|&(_, &slope)| slope != 0.0);
        let (columns, slopes) = nonzero
            .map(|(column, &slope)| (first_covariate + column, slope))
            .unzip();
        Self {
            truth: truth.clone(),
            columns,
            slopes,
            first_covariate,
            noise: NoiseTransform::new(truth.noise.law),
            batches,
        }
    }

    /// Fills expected and observed outcomes of one batch, whose covariates and arms are in place.
    ///
    /// The noise of unit `i` of a batch is the same standard normal number under every truth.
    pub fn fill(
        &self,
        streams: &Streams,
        batch: usize,
        rows: Range<usize>,
        trial: &mut Trial,
        scratch: &mut Vec<f64>,
        kernels: Kernels,
    ) {
        let truth = &self.truth;
        let count = rows.len();
        let base = truth.intercept + truth.drift.shift(batch, self.batches);
        scratch.clear();
        scratch.resize(2 * count, base);
        let (expected, noise) = scratch.split_at_mut(count);
        kernels.add_combination(
            trial.design(rows.clone()),
            &self.columns,
            &self.slopes,
            expected,
        );
        if !truth.arm_effects.is_empty() {
            for (value, &arm) in expected.iter_mut().zip(&trial.arms()[rows.clone()]) {
                *value += truth.arm_effects[arm];
            }
        }
        if !truth.interactions.is_empty() {
            for (offset, value) in expected.iter_mut().enumerate() {
                let row = rows.start + offset;
                let slopes = &truth.interactions[trial.arms()[row]];
                for (column, slope) in slopes.iter().enumerate() {
                    *value += slope * trial.value(row, self.first_covariate + column);
                }
            }
        }
        let mut stream = streams.open(Purpose::Noise, batch, 0, 0);
        fill_standard_normal(&mut stream, noise);
        self.noise.apply(noise);
        match truth.noise.log_sd_slope {
            None => noise.iter_mut().for_each(|value| *value *= truth.noise.sd),
            Some((column, slope)) => {
                for (offset, value) in noise.iter_mut().enumerate() {
                    let x = trial.value(rows.start + offset, self.first_covariate + column);
                    *value *= truth.noise.sd * libm::exp(slope * x);
                }
            }
        }
        trial.expected_mut(rows.clone()).copy_from_slice(expected);
        for ((outcome, mean), noise) in trial
            .outcomes_mut(rows)
            .iter_mut()
            .zip(&*expected)
            .zip(&*noise)
        {
            *outcome = mean + noise;
        }
    }
}
