//! What the test files share.
#![allow(dead_code)] // each test file uses its own part

use std::path::Path;
use std::sync::atomic::AtomicBool;
use windage::plan::{self, Plan};
use windage::replay::{ReplayOptions, Study, TruthResult, replay};
use windage::scenario::Scenario;
use windage::score::Measure;

/// The plan of a scenario text.
pub fn plan(text: &str) -> Plan {
    let scenario = Scenario::parse(text, "test.toml", Path::new("."))
        .unwrap_or_else(|mistakes| panic!("{mistakes}"));
    plan::resolve(&scenario).unwrap_or_else(|mistakes| panic!("{mistakes}"))
}

/// Replays a prepared study without diagnostics.
pub fn run(study: &Study, threads: usize) -> Vec<TruthResult> {
    let interrupt = AtomicBool::new(false);
    let mut options = ReplayOptions {
        threads,
        interrupt: &interrupt,
        progress: &mut |_| {},
        sink: None,
        diagnostics: false,
    };
    replay(study, &mut options).expect("not interrupted")
}

/// Replays a scenario text.
pub fn results(text: &str) -> Vec<TruthResult> {
    run(&Study::prepare(&plan(text)), 0)
}

/// Value and Monte Carlo standard error of a measure of one cell.
pub fn value(result: &TruthResult, cell: usize, measure: Measure) -> (f64, f64) {
    let found = result.measures.cells[cell].get(measure);
    let found = found.unwrap_or_else(|| panic!("{measure:?} is not defined in cell {cell}"));
    (found.value, found.mcse)
}

/// Fails unless `value` is within `z` Monte Carlo standard errors of `expected`.
#[track_caller]
pub fn assert_within_mc(label: &str, value: f64, expected: f64, mcse: f64, z: f64) {
    let distance = (value - expected) / mcse;
    assert!(
        distance.abs() <= z,
        "{label}: {value} is {distance:.2} Monte Carlo standard errors from {expected}"
    );
}
