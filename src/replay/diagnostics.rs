//! Design diagnostics: how far the information of a trial strays from its mean.

use super::{Study, Worker};
use crate::methods::Needs;
use crate::numerics::kernels::Kernels;
use crate::plan::{Allocation, AllocationRule, Draw, Plan, SelectRule};
use crate::score::OperatingValue;
use crate::streams::Phase;
use nalgebra::DMatrix;

/// Trials that the diagnostics replay, unless their eigenvalues would cost more than about a
/// second.
const TRIALS: u64 = 200;
const FEWEST_TRIALS: u64 = 20;
const EIGENVALUE_BUDGET: f64 = 1e9;

/// Stability of the pooled Gram matrix (Lai & Wei 1982), and how the least-squares error of each
/// estimand goes with its own variance factor; for the design and for the same number of units
/// enrolled at random in equal arms.
pub(super) fn operating(study: &Study, truth: usize) -> Vec<OperatingValue> {
    let mut values = Vec::new();
    describe(study, truth, "", &mut values);
    let fixed = Study::without_methods(&without_adaptation(study.plan()));
    describe(&fixed, truth, "fixed-design-", &mut values);
    values
}

/// The same study with every batch enrolled at random and allocated equally.
fn without_adaptation(plan: &Plan) -> Plan {
    let mut fixed = plan.clone();
    for batch in &mut fixed.batches {
        for part in &mut batch.select {
            part.rule = SelectRule::Random;
            part.candidates = part.size;
        }
        if batch.allocate.is_some() {
            batch.allocate = Some(Allocation {
                rule: AllocationRule::Equal,
                floor: 0.0,
                draw: Draw::Quota,
            });
        }
    }
    fixed
}

#[allow(
    clippy::cast_precision_loss,
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss
)]
fn trials_for(p: usize, trials: u64) -> u64 {
    let affordable = (EIGENVALUE_BUDGET / (p as f64).powi(3)) as u64;
    affordable.clamp(FEWEST_TRIALS, TRIALS).min(trials)
}

fn describe(study: &Study, truth: usize, prefix: &str, out: &mut Vec<OperatingValue>) {
    let plan = study.plan();
    let kernels = study.kernels();
    let p = study.analysis().len();
    let trials = trials_for(p, plan.precision.trials);
    let needs = Needs {
        pooled_fit: true,
        ..Needs::default()
    };
    let mut worker = Worker::with_needs(study, needs);
    worker.set_truth(truth);
    let mut grams: Vec<Vec<f64>> = Vec::new();
    // Per estimand: variance factor and error of each trial.
    let mut pairs: Vec<Vec<(f64, f64)>> = vec![Vec::new(); plan.estimands.len()];
    for index in 0..trials {
        worker.simulate(truth, Phase::Replay, index);
        let bench = worker.prepare();
        grams.push(bench.gram().to_vec());
        for (estimand, list) in pairs.iter_mut().enumerate() {
            if let Some((point, variance)) = bench.pooled_contrast(estimand) {
                list.push((variance, point));
            }
        }
    }
    let mut push = |name: &str, subject: &str, value: f64, mcse: f64, used: usize| {
        if value.is_finite() {
            out.push(OperatingValue {
                characteristic: format!("{prefix}{name}"),
                subject: subject.to_owned(),
                value,
                mcse,
                trials_used: used as u64,
            });
        }
    };
    if let Some(indices) = stability(&grams, p, kernels) {
        let (mean, error) = mean_and_error(&indices);
        push("stability-index", "", mean, error, indices.len());
    }
    for (estimand, list) in plan.estimands.iter().zip(&pairs) {
        let name = &estimand.name;
        let variances: Vec<f64> = list.iter().map(|pair| pair.0).collect();
        let points: Vec<f64> = list.iter().map(|pair| pair.1).collect();
        let (mean, _) = mean_and_error(&points);
        // Squared about the mean: the correlation shall show spread, not bias.
        let squares: Vec<f64> = points.iter().map(|x| (x - mean) * (x - mean)).collect();
        let (variance_mean, variance_error) = mean_and_error(&variances);
        let used = list.len();
        let count = (used as f64).sqrt();
        let variation = variance_error * count / variance_mean;
        push(
            "variance-factor-cv",
            name,
            variation,
            variation / (2.0 * used as f64).sqrt(),
            used,
        );
        for (key, other) in [
            ("variance-error-correlation", &points),
            ("variance-squared-error-correlation", &squares),
        ] {
            let r = correlation(&variances, other);
            push(key, name, r, (1.0 - r * r) / count, used);
        }
    }
}

/// Operator norm of `M^{-1/2} S M^{-1/2} - I` for every trial, `M` the mean of the `S`.
fn stability(grams: &[Vec<f64>], p: usize, kernels: Kernels) -> Option<Vec<f64>> {
    let mut mean = vec![0.0; p * p];
    for gram in grams {
        kernels.add_scaled(1.0 / grams.len() as f64, gram, &mut mean);
    }
    if kernels.cholesky(&mut mean, p, f64::EPSILON) <= f64::EPSILON {
        return None;
    }
    // With M = LL', L^{-1} S L^{-T} has the same eigenvalues as M^{-1/2} S M^{-1/2}.
    let norms = grams.iter().map(|gram| {
        let mut half = gram.clone();
        for column in half.chunks_exact_mut(p) {
            kernels.solve_lower(&mean, p, column);
        }
        let mut whole = DMatrix::from_column_slice(p, p, &half).transpose();
        for column in whole.as_mut_slice().chunks_exact_mut(p) {
            kernels.solve_lower(&mean, p, column);
        }
        let eigenvalues = whole.symmetric_eigenvalues();
        eigenvalues
            .iter()
            .fold(0.0f64, |norm, value| norm.max((value - 1.0).abs()))
    });
    Some(norms.collect())
}

fn mean_and_error(values: &[f64]) -> (f64, f64) {
    let count = values.len() as f64;
    let mean = values.iter().sum::<f64>() / count;
    let squares: f64 = values
        .iter()
        .map(|value| (value - mean) * (value - mean))
        .sum();
    (mean, (squares / (count - 1.0) / count).sqrt())
}

fn correlation(a: &[f64], b: &[f64]) -> f64 {
    let (mean_a, _) = mean_and_error(a);
    let (mean_b, _) = mean_and_error(b);
    let mut sums = (0.0, 0.0, 0.0);
    for (x, y) in a.iter().zip(b) {
        let (dx, dy) = (x - mean_a, y - mean_b);
        sums = (sums.0 + dx * dx, sums.1 + dx * dy, sums.2 + dy * dy);
    }
    sums.1 / (sums.0 * sums.2).sqrt()
}
