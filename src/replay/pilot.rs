//! The pilot replay: tuning constants fixed before the first scored trial.

use super::{Study, Worker};
use crate::methods::Needs;
use crate::numerics::eigen::smallest_eigenvalue;
use crate::streams::Phase;

/// What the pilot replay found. It uses streams of its own, pools all truths with equal weight
/// (which truth holds is not known before the data), and is part of what the scenario determines.
#[derive(Debug, Clone, PartialEq)]
pub struct Pilot {
    /// Trials replayed per truth.
    pub trials: u64,
    /// Weights of the batches in proportion to their expected information `E[1/V_k]`, one row per
    /// estimand, each summing to one.
    pub planned_weights: Vec<Vec<f64>>,
    /// The `1/n` quantile of the smallest eigenvalue of the pooled Gram matrix, divided by
    /// `log n` (the tuning rule of Deshpande, Mackey, Syrgkanis & Taddy 2018).
    pub decorrelation_penalty: f64,
}

impl Pilot {
    /// Replays the pilot trials of a study.
    #[must_use]
    pub(super) fn run(study: &Study) -> Self {
        let plan = study.plan();
        let needs = Needs {
            pooled_fit: true,
            every_batch: true,
            ..Needs::default()
        };
        let mut worker = Worker::with_needs(study, needs);
        let estimands = plan.estimands.len();
        let batches = plan.batches.len();
        let p = study.analysis().len();
        let mut information = vec![vec![0.0; batches]; estimands];
        let mut smallest = Vec::new();
        for truth in 0..plan.truths.len() {
            worker.set_truth(truth);
            for index in 0..plan.precision.pilot_trials {
                worker.simulate(truth, Phase::Pilot, index);
                let bench = worker.prepare();
                for (estimand, row) in information.iter_mut().enumerate() {
                    for (batch, sum) in row.iter_mut().enumerate() {
                        // A batch that cannot identify the contrast carries no information.
                        if let Some(variance) = bench.batch_contrast_variance(batch, estimand) {
                            *sum += 1.0 / variance;
                        }
                    }
                }
                smallest.push(smallest_eigenvalue(bench.gram(), p));
            }
        }
        let planned_weights = information.into_iter().map(normalised).collect();
        smallest.sort_unstable_by(f64::total_cmp);
        let units = plan.units() as f64;
        #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)]
        let rank = ((smallest.len() as f64 / units).ceil() as usize).max(1) - 1;
        let quantile = smallest.get(rank).copied().unwrap_or(1.0);
        // A singular pilot design would ask for no regularisation at all; one unit of information
        // keeps the method defined.
        let floor = f64::EPSILON * units;
        let decorrelation_penalty = quantile.max(floor) / units.ln().max(1.0);
        Self {
            trials: plan.precision.pilot_trials,
            planned_weights,
            decorrelation_penalty,
        }
    }
}

/// Scales to sum one; equal weights when nothing is known.
fn normalised(mut weights: Vec<f64>) -> Vec<f64> {
    let total: f64 = weights.iter().sum();
    if total > 0.0 {
        for weight in &mut weights {
            *weight /= total;
        }
    } else {
        let equal = 1.0 / weights.len() as f64;
        weights.fill(equal);
    }
    weights
}
