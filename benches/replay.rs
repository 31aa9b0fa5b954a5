//! Cost of a replayed trial and of its stages.
//!
//! The job is that of `benches/numpy_replay.py`: two batches of n/2 units, p independent standard
//! normal covariates, no intercept, batch 2 the top 15 % by predicted outcome, eleven methods on
//! one contrast. `trial` replays whole trials on one thread; `every candidate drawn` does the same
//! without the short cut for Gaussian candidates. Stages: drawing and enrolling (with the batch
//! sums, which the rule needs), then preparing the fits, then each method.

use criterion::{BenchmarkId, Criterion, criterion_group, criterion_main};
use std::hint::black_box;
use std::path::Path;
use windage::methods::{Needs, estimate};
use windage::plan;
use windage::replay::{Study, Worker, simulate_block};
use windage::scenario::Scenario;
use windage::streams::{Phase, Purpose, Streams, fill_standard_normal};

const SIZES: [(usize, usize); 3] = [(500, 10), (1000, 50), (500, 100)];

/// Trials replayed in one iteration, so that set-up does not count.
const TRIALS: u64 = 16;

fn study(units: usize, covariates: usize) -> Study {
    let half = units / 2;
    let slope = 1.0 / (covariates as f64).sqrt();
    let penalty = half as f64 / 2.0 / (units as f64).ln();
    let text = format!(
        r#"
format = 1
[study]
title = "benchmark"
[population]
covariates = [{{ name = "x", law = "normal", count = {covariates} }}]
[outcome]
family = "normal"
noise = {{ law = "normal", sd = 1.0 }}
[analysis]
regressors = ["covariates"]
[[truth]]
name = "aligned"
coefficients = {{ x = {slope} }}
[[batch]]
size = {half}
[[batch]]
size = {half}
select = {{ rule = "top-quantile", fraction = 0.15, score = "predicted-outcome" }}
[[estimand]]
name = "aligned"
along = "coefficients"
[[method]]
kind = "least-squares"
[[method]]
kind = "least-squares"
variance = "HC0"
[[method]]
kind = "least-squares"
variance = "HC1"
[[method]]
kind = "least-squares"
variance = "HC2"
[[method]]
kind = "least-squares"
variance = "HC3"
[[method]]
kind = "ridge"
penalty = 1.0
[[method]]
kind = "first-batch"
[[method]]
kind = "last-batch"
[[method]]
kind = "batch-combined"
[[method]]
kind = "inverse-variance"
[[method]]
kind = "w-decorrelation"
penalty = {penalty}
[precision]
trials = 1000
seed = 1
"#
    );
    let scenario = Scenario::parse(&text, "benchmark.toml", Path::new("."))
        .unwrap_or_else(|mistakes| panic!("{mistakes}"));
    let plan = plan::resolve(&scenario).unwrap_or_else(|mistakes| panic!("{mistakes}"));
    Study::prepare(&plan)
}

fn trials(criterion: &mut Criterion) {
    let mut group = criterion.benchmark_group("sixteen trials");
    group.sample_size(20);
    for (units, covariates) in SIZES {
        let size = format!("n={units} p={covariates}");
        let plain = study(units, covariates).with_every_candidate_drawn();
        for (name, study) in [
            ("trial", study(units, covariates)),
            ("every candidate drawn", plain),
        ] {
            let mut worker = Worker::new(&study);
            let mut first = 0;
            group.bench_function(BenchmarkId::new(name, &size), |bencher| {
                bencher.iter(|| {
                    first += TRIALS;
                    black_box(simulate_block(&mut worker, 0, first, TRIALS))
                });
            });
        }
    }
    group.finish();
}

fn stages(criterion: &mut Criterion) {
    for (units, covariates) in SIZES {
        let mut group = criterion.benchmark_group(format!("stages n={units} p={covariates}"));
        group.sample_size(20);
        let study = study(units, covariates);
        let mut normals = vec![0.0; units * covariates];
        group.bench_function("draw the enrolled units' normals", |bencher| {
            let mut stream = Streams::new(1, Phase::Replay, 0).open(Purpose::Noise, 0, 0, 0);
            bencher.iter(|| fill_standard_normal(&mut stream, black_box(&mut normals)));
        });
        let mut worker = Worker::new(&study);
        let mut index = 0;
        group.bench_function("simulate: draw, sums, fit, select, observe", |bencher| {
            bencher.iter(|| {
                index += 1;
                worker.simulate(0, Phase::Replay, index);
            });
        });
        let all: Vec<usize> = (0..covariates).collect();
        let mut gram = vec![0.0; covariates * covariates];
        group.bench_function("Gram matrix of all units", |bencher| {
            let trial = worker.trial();
            let rows = 0..trial.rows();
            bencher.iter(|| {
                study
                    .kernels()
                    .gram(trial.design(rows.clone()), &all, &mut gram);
            });
        });
        let mut factor = gram.clone();
        group.bench_function(
            "solve: Cholesky factor and two triangular solves",
            |bencher| {
                let mut solution = vec![1.0; covariates];
                bencher.iter(|| {
                    factor.copy_from_slice(&gram);
                    study.kernels().cholesky(&mut factor, covariates, 0.0);
                    study
                        .kernels()
                        .solve_lower(&factor, covariates, &mut solution);
                    study
                        .kernels()
                        .solve_lower_transposed(&factor, covariates, &mut solution);
                    solution.fill(1.0);
                });
            },
        );
        group.bench_function("prepare: all fits, residuals, leverages", |bencher| {
            bencher.iter(|| {
                black_box(worker.prepare());
            });
        });
        for (label, method) in study
            .plan()
            .methods
            .iter()
            .map(|method| &method.label)
            .zip(study.methods())
        {
            let mut own = Worker::with_needs(&study, Needs::union(method.needs(), study.needs()));
            own.simulate(0, Phase::Replay, 1);
            own.prepare();
            group.bench_function(format!("method {label}"), |bencher| {
                bencher.iter(|| {
                    let (bench, trial) = own.workbench();
                    black_box(estimate(method, bench, trial, 0))
                });
            });
        }
        group.finish();
    }
}

criterion_group!(benches, trials, stages);
criterion_main!(benches);
