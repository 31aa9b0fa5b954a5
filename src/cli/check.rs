//! `windage check`: read a scenario and say what the study will do.

use super::output::Output;
use super::{Ending, Failure, read_scenario};
use crate::replay::{Study, Worker};
use crate::report::{narrative, trial_listing};
use crate::streams::Phase;
use std::path::PathBuf;

/// Arguments of `check`.
#[derive(Debug, clap::Args)]
pub(super) struct Check {
    /// Scenario file.
    scenario: PathBuf,
    /// Print one simulated trial unit by unit, as CSV, instead of the description.
    #[arg(long, value_name = "NUMBER")]
    trial: Option<u64>,
    /// Truth under which the trial is simulated; the first by default.
    #[arg(long, value_name = "NAME", requires = "trial")]
    truth: Option<String>,
}

impl Check {
    pub(super) fn run(self, output: &Output) -> Result<Ending, Failure> {
        let (_, plan) = read_scenario(&self.scenario, None, None)?;
        let Some(index) = self.trial else {
            Output::print(&narrative(&plan, output.width))?;
            return Ok(Ending::Done);
        };
        let truth = match &self.truth {
            None => 0,
            Some(name) => plan
                .truths
                .iter()
                .position(|truth| &truth.name == name)
                .ok_or_else(|| {
                    let known: Vec<&str> = plan
                        .truths
                        .iter()
                        .map(|truth| truth.name.as_str())
                        .collect();
                    Failure::Usage(format!(
                        "error: the scenario has no truth {name:?}; it has {}",
                        known.join(", ")
                    ))
                })?,
        };
        let study = Study::without_methods(&plan);
        let mut worker = Worker::new(&study);
        worker.simulate(truth, Phase::Replay, index);
        Output::print(&trial_listing(&plan, worker.trial()))?;
        Ok(Ending::Done)
    }
}
