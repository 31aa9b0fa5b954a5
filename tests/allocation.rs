//! The replay loop allocates nothing once its worker is warm.
//!
//! One test in this file: the counter is global, and other tests would add to it.

mod common;

use stats_alloc::{INSTRUMENTED_SYSTEM, Region, StatsAlloc};
use std::alloc::System;
use windage::replay::{Study, Worker};
use windage::score::BlockRecord;
use windage::streams::Phase;

#[global_allocator]
static ALLOCATOR: &StatsAlloc<System> = &INSTRUMENTED_SYSTEM;

#[test]
fn a_warm_worker_allocates_nothing() {
    let text = r#"
format = 1
[study]
title = "allocation"
[population]
covariates = [
  { name = "x", law = "normal", count = 8 },
  { name = "dose", law = "gamma", shape = 2.0 },
]
[arms]
names = ["a", "b"]
[outcome]
family = "normal"
noise = { law = "normal", sd = 1.0 }
[[truth]]
name = "null"
coefficients = { x = 0.1 }
[[batch]]
size = 60
[[batch]]
size = 60
select = [
  { share = 0.5, rule = "top-quantile", fraction = 0.2, score = "predicted-outcome" },
  { share = 0.5, rule = "tilted", fraction = 0.5, score = "predicted-outcome", strength = 0.5 },
]
allocate = { rule = "thompson", floor = 0.1 }
[[batch]]
size = 60
select = { rule = "top-quantile", fraction = 0.2, score = "predicted-outcome", fit = "ridge", penalty = 2.0 }
allocate = { rule = "thompson-linear", floor = 0.1 }
[[estimand]]
name = "effect of b"
contrast = { b = 1.0 }
[[method]]
kind = "least-squares"
[[method]]
kind = "least-squares"
variance = "HC3"
[[method]]
kind = "ridge"
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
penalty = 2.0
[precision]
trials = 1000
seed = 3
"#;
    let study = Study::prepare(&common::plan(text));
    let mut worker = Worker::new(&study);
    let mut record = BlockRecord::default();
    let mut replay = |worker: &mut Worker<'_>, trials: std::ops::Range<u64>| {
        record.clear();
        for index in trials {
            worker.simulate(0, Phase::Replay, index);
            worker.score_into(&mut record);
        }
    };
    replay(&mut worker, 0..50);
    let region = Region::new(ALLOCATOR);
    replay(&mut worker, 0..50);
    let change = region.change();
    assert_eq!(change.allocations + change.reallocations, 0, "{change:?}");
}
