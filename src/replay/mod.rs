//! Replays: one trial, blocks of trials in parallel, pilot replays and design diagnostics.

mod diagnostics;
mod engine;
mod pilot;
mod projection;
mod study;
mod worker;

pub use engine::{
    BLOCK_TRIALS, Interrupted, Progress, ReplayError, ReplayOptions, TrialSink, TruthResult,
    layout, replay, simulate_block,
};
pub use pilot::Pilot;
pub use study::{Study, TrueValue};
pub use worker::Worker;
