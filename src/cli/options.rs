//! Arguments that every verb that replays takes.

use super::{Failure, read_scenario, run_failure};
use crate::plan::Plan;
use crate::report::ResultFolder;
use crate::scenario::Scenario;
use std::path::PathBuf;

/// Scenario, result folder, and how to run; only the scenario, trials and seed change a result.
#[derive(Debug, clap::Args)]
pub(super) struct RunOptions {
    /// Scenario file.
    pub(super) scenario: PathBuf,
    /// Result folder; by default `NAME-result` beside where the program runs.
    #[arg(short, long, value_name = "FOLDER")]
    pub(super) output: Option<PathBuf>,
    /// Replace a result folder that exists.
    #[arg(short, long)]
    pub(super) force: bool,
    /// Trials per truth, instead of the scenario's number.
    #[arg(short, long, value_name = "NUMBER")]
    pub(super) trials: Option<u64>,
    /// Seed, instead of the scenario's.
    #[arg(long, value_name = "NUMBER")]
    pub(super) seed: Option<u64>,
    /// Worker threads; one per core by default. The result does not depend on it.
    #[arg(
        long,
        value_name = "NUMBER",
        default_value_t = 0,
        hide_default_value = true
    )]
    pub(super) threads: usize,
    /// Show no progress.
    #[arg(short, long)]
    pub(super) quiet: bool,
}

impl RunOptions {
    /// Reads the scenario and replaces what the command line overrides.
    pub(super) fn read(&self) -> Result<(Scenario, Plan), Failure> {
        read_scenario(&self.scenario, self.trials, self.seed)
    }

    /// Begins the result folder asked for, or one named after the scenario.
    pub(super) fn folder(&self) -> Result<ResultFolder, Failure> {
        let target = self.output.clone().unwrap_or_else(|| {
            let stem = self.scenario.file_stem();
            let name = stem.map_or("scenario".into(), |stem| stem.to_string_lossy());
            PathBuf::from(format!("{name}-result"))
        });
        ResultFolder::begin(&target, self.force).map_err(run_failure)
    }

    /// Threads that the run will use.
    pub(super) fn thread_count(&self) -> usize {
        if self.threads > 0 {
            return self.threads;
        }
        std::thread::available_parallelism().map_or(1, usize::from)
    }
}
