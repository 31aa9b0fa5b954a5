//! Blocks of trials in parallel, absorbed in index order.

use super::{Study, Worker, diagnostics};
use crate::score::{BlockRecord, CellDistribution, Layout, Tally, TruthMeasures};
use crate::streams::Phase;
use rayon::prelude::*;
use std::sync::Mutex;
use std::sync::atomic::{AtomicBool, Ordering};

/// Trials in a block. Part of what the result depends on: blocks are summed in index order.
pub const BLOCK_TRIALS: u64 = 64;

/// Blocks in flight per thread; absorbed together in index order.
const BLOCKS_PER_THREAD: usize = 4;

/// How far a replay has come.
#[derive(Debug, Clone, Copy)]
pub struct Progress {
    /// Truth index at work.
    pub truth: usize,
    /// Trials finished over all truths.
    pub done: u64,
    /// Trials to do over all truths.
    pub total: u64,
}

/// The run was asked to stop before it was done.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
#[error("interrupted after {done} of {total} trials; nothing was written")]
pub struct Interrupted {
    /// Trials finished over all truths.
    pub done: u64,
    /// Trials to do over all truths.
    pub total: u64,
}

/// Receives the records of every block in index order.
pub trait TrialSink {
    /// Takes the block that starts with trial `first` of truth `truth`.
    ///
    /// # Errors
    /// If the records cannot be kept.
    fn take(&mut self, truth: usize, first: u64, block: &BlockRecord) -> std::io::Result<()>;
}

/// How to run a replay; none of it changes a bit of the result.
pub struct ReplayOptions<'a> {
    /// Worker threads; 0 for one per core.
    pub threads: usize,
    /// Set from outside to stop the run.
    pub interrupt: &'a AtomicBool,
    /// Called as the run proceeds.
    pub progress: &'a mut dyn FnMut(Progress),
    /// Receives every trial.
    pub sink: Option<&'a mut dyn TrialSink>,
    /// Whether the design diagnostics (stability, comparison with a fixed design) are wanted.
    pub diagnostics: bool,
}

/// Results under one truth.
#[derive(Debug, Clone)]
pub struct TruthResult {
    /// Measures.
    pub measures: TruthMeasures,
    /// Distributions of the errors, one per estimand × method.
    pub distributions: Vec<CellDistribution>,
}

/// Why a replay gave no result.
#[derive(Debug, thiserror::Error)]
pub enum ReplayError {
    /// Asked to stop.
    #[error(transparent)]
    Interrupted(#[from] Interrupted),
    /// The trials could not be kept.
    #[error("the trials could not be kept: {0}")]
    Sink(#[from] std::io::Error),
    /// Worker threads could not be started.
    #[error("worker threads could not be started: {0}")]
    Threads(#[from] rayon::ThreadPoolBuildError),
}

/// Simulates and scores one block of trials of a truth.
#[must_use]
pub fn simulate_block(
    worker: &mut Worker<'_>,
    truth: usize,
    first: u64,
    trials: u64,
) -> BlockRecord {
    let mut record = BlockRecord::default();
    worker.set_truth(truth);
    for index in first..first + trials {
        worker.simulate(truth, Phase::Replay, index);
        worker.score_into(&mut record);
    }
    record
}

/// The tally layout of a truth.
#[must_use]
pub fn layout(study: &Study, truth: usize) -> Layout {
    let plan = study.plan();
    Layout {
        estimands: plan.estimands.len(),
        methods: plan.methods.len(),
        arms: plan.arm_count(),
        reference: plan.verdicts.reference,
        true_values: study
            .true_values(truth)
            .iter()
            .map(|value| value.value)
            .collect(),
        nulls: plan
            .estimands
            .iter()
            .map(|estimand| estimand.null)
            .collect(),
        level: plan.level,
    }
}

/// Replays every truth of a study and scores every method.
///
/// # Errors
/// When interrupted, when the sink fails, or when threads cannot be started.
pub fn replay(
    study: &Study,
    options: &mut ReplayOptions<'_>,
) -> Result<Vec<TruthResult>, ReplayError> {
    let threads = rayon::ThreadPoolBuilder::new()
        .num_threads(options.threads)
        .build()?;
    let plan = study.plan();
    let trials = plan.precision.trials;
    let total = trials * plan.truths.len() as u64;
    let blocks = trials.div_ceil(BLOCK_TRIALS);
    let wave = (threads.current_num_threads() * BLOCKS_PER_THREAD) as u64;
    let workers: Mutex<Vec<Worker<'_>>> = Mutex::new(Vec::new());
    let mut results = Vec::with_capacity(plan.truths.len());
    let mut done = 0;
    for truth in 0..plan.truths.len() {
        let mut tally = Tally::new(layout(study, truth));
        let mut next = 0;
        while next < blocks {
            let end = (next + wave).min(blocks);
            let records: Vec<Option<BlockRecord>> = threads.install(|| {
                (next..end)
                    .into_par_iter()
                    .map(|block| {
                        if options_interrupted(options.interrupt) {
                            return None;
                        }
                        let first = block * BLOCK_TRIALS;
                        let count = BLOCK_TRIALS.min(trials - first);
                        let mut worker = take(&workers).unwrap_or_else(|| Worker::new(study));
                        let record = simulate_block(&mut worker, truth, first, count);
                        give_back(&workers, worker);
                        Some(record)
                    })
                    .collect()
            });
            for (block, record) in (next..end).zip(&records) {
                let Some(record) = record else {
                    return Err(Interrupted { done, total }.into());
                };
                if let Some(sink) = &mut options.sink {
                    sink.take(truth, block * BLOCK_TRIALS, record)?;
                }
                tally.absorb(record);
                done += record.trials as u64;
            }
            (options.progress)(Progress { truth, done, total });
            next = end;
        }
        let mut measures = tally.measures(truth, &plan.arms);
        if options.diagnostics {
            measures
                .operating
                .extend(threads.install(|| diagnostics::operating(study, truth)));
        }
        results.push(TruthResult {
            measures,
            distributions: tally.distributions(),
        });
    }
    Ok(results)
}

fn options_interrupted(flag: &AtomicBool) -> bool {
    flag.load(Ordering::Relaxed)
}

fn take<'a>(workers: &Mutex<Vec<Worker<'a>>>) -> Option<Worker<'a>> {
    // A worker is whole whatever happened to the thread that held the lock.
    workers
        .lock()
        .unwrap_or_else(std::sync::PoisonError::into_inner)
        .pop()
}

fn give_back<'a>(workers: &Mutex<Vec<Worker<'a>>>, worker: Worker<'a>) {
    workers
        .lock()
        .unwrap_or_else(std::sync::PoisonError::into_inner)
        .push(worker);
}
