//! Same bits whatever the threads, the order of blocks or the instruction set; common random
//! numbers across methods, truths and sweep points.

mod common;

use common::{plan, run};
use windage::replay::{BLOCK_TRIALS, Study, TruthResult, Worker, layout, simulate_block};
use windage::score::Tally;
use windage::streams::Phase;

fn scenario(covariates: usize, trials: u64) -> String {
    format!(
        r#"
format = 1
[study]
title = "determinism"
[population]
covariates = [
  {{ name = "x", law = "normal", count = {covariates} }},
  {{ name = "dose", law = "gamma", shape = 2.0 }},
]
correlation = {{ kind = "autoregressive", rho = 0.4 }}
[arms]
names = ["a", "b"]
[outcome]
family = "normal"
noise = {{ law = "laplace", sd = 1.0 }}
[[truth]]
name = "null"
coefficients = {{ x = 0.1 }}
[[truth]]
name = "effect"
coefficients = {{ x = 0.1, b = 0.4 }}
drift = {{ kind = "linear", total = 0.3 }}
[[batch]]
size = 40
[[batch]]
size = 40
select = [
  {{ share = 0.5, rule = "random" }},
  {{ share = 0.5, rule = "top-quantile", fraction = 0.5, score = "predicted-outcome" }},
]
allocate = {{ rule = "thompson", floor = 0.1 }}
[[batch]]
size = 40
select = {{ rule = "tilted", fraction = 0.5, score = "covariate", covariate = "x1", strength = 0.7 }}
allocate = {{ rule = "epsilon-greedy", epsilon = 0.2 }}
[[estimand]]
name = "effect of b"
contrast = {{ b = 1.0 }}
[[method]]
kind = "least-squares"
[[method]]
kind = "least-squares"
variance = "HC3"
[[method]]
kind = "batch-combined"
[[method]]
kind = "w-decorrelation"
penalty = 2.0
[precision]
trials = {trials}
seed = 99
"#
    )
}

/// Every bit of every measure.
fn bits(results: &[TruthResult]) -> Vec<u64> {
    let mut out = Vec::new();
    for result in results {
        for cell in &result.measures.cells {
            for value in &cell.values {
                out.extend([
                    value.value.to_bits(),
                    value.mcse.to_bits(),
                    value.trials_used,
                ]);
            }
        }
        for value in &result.measures.operating {
            out.extend([value.value.to_bits(), value.mcse.to_bits()]);
        }
    }
    assert!(out.len() > 200, "there is something to compare");
    out
}

#[test]
fn thread_count_does_not_change_a_bit() {
    let study = Study::prepare(&plan(&scenario(3, 1000)));
    let one = bits(&run(&study, 1));
    assert_eq!(one, bits(&run(&study, 2)));
    assert_eq!(one, bits(&run(&study, 5)));
}

#[test]
fn block_order_does_not_change_a_bit() {
    let trials = 1000;
    let study = Study::prepare(&plan(&scenario(3, trials)));
    let forward = run(&study, 2);
    let mut backward = Vec::new();
    for truth in 0..2 {
        let blocks = trials.div_ceil(BLOCK_TRIALS);
        let mut worker = Worker::new(&study);
        let mut records: Vec<_> = (0..blocks)
            .rev()
            .map(|block| {
                let first = block * BLOCK_TRIALS;
                let count = BLOCK_TRIALS.min(trials - first);
                simulate_block(&mut worker, truth, first, count)
            })
            .collect();
        records.reverse();
        let mut tally = Tally::new(layout(&study, truth));
        for record in &records {
            tally.absorb(record);
        }
        let measures = tally.measures(truth, &study.plan().arms);
        backward.push(TruthResult {
            measures,
            distributions: tally.distributions(),
        });
    }
    assert_eq!(bits(&forward), bits(&backward));
}

#[test]
fn instruction_set_does_not_change_a_bit() {
    let plan = plan(&scenario(3, 300));
    let native = run(&Study::prepare(&plan), 1);
    let portable = run(&Study::prepare(&plan).with_portable_kernels(), 1);
    assert_eq!(bits(&native), bits(&portable));
}

#[test]
fn truths_share_covariates_and_noise() {
    let study = Study::prepare(&plan(&scenario(3, 10)));
    let mut null = Worker::new(&study);
    let mut effect = Worker::new(&study);
    null.simulate(0, Phase::Replay, 4);
    effect.simulate(1, Phase::Replay, 4);
    let (null, effect) = (null.trial(), effect.trial());
    let first_batch = 0..40;
    for row in first_batch {
        assert_eq!(null.value(row, 2).to_bits(), effect.value(row, 2).to_bits());
        let noise = null.outcomes()[row] - null.expected()[row];
        let other = effect.outcomes()[row] - effect.expected()[row];
        assert!(
            (noise - other).abs() < 1e-12,
            "the noise of a unit is the same in every truth"
        );
    }
}

#[test]
fn sweep_points_share_the_columns_and_units_they_have_in_common() {
    let narrow = Study::prepare(&plan(&scenario(3, 10)));
    let wide = Study::prepare(&plan(&scenario(6, 10)));
    let mut small = Worker::new(&narrow);
    let mut large = Worker::new(&wide);
    small.simulate(0, Phase::Replay, 2);
    large.simulate(0, Phase::Replay, 2);
    let first = narrow.design().first_covariate();
    for row in 0..40 {
        for column in first..first + 3 {
            assert_eq!(
                small.trial().value(row, column).to_bits(),
                large.trial().value(row, column).to_bits()
            );
        }
    }
}

#[test]
fn methods_are_applied_to_the_same_trials() {
    let study = Study::prepare(&plan(&scenario(3, 64)));
    let record = simulate_block(&mut Worker::new(&study), 0, 0, 64);
    for estimates in record.estimates.chunks_exact(4) {
        let model = estimates[0].expect("an answer");
        let sandwich = estimates[1].expect("an answer");
        assert_eq!(model.point.to_bits(), sandwich.point.to_bits());
        assert!(model.width() > 0.0 && sandwich.width() > 0.0);
    }
}
