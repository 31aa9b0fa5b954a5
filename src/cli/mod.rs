//! The command line: one file a verb, arguments to library call to exit code. No statistics here.

mod check;
mod options;
mod output;
mod replay;
mod sweep;

use crate::plan::{self, Plan};
use crate::scenario::{Diagnostics, Scenario};
use clap::{Parser, Subcommand};
use output::Output;
use std::path::Path;
use std::process::ExitCode;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::time::{SystemTime, UNIX_EPOCH};

/// Simulates a planned adaptive study and scores every method of inference on it.
#[derive(Debug, Parser)]
#[command(version, about, after_help = EXIT_CODES)]
struct Arguments {
    #[command(subcommand)]
    verb: Verb,
}

const EXIT_CODES: &str = "\
Exit codes: 0 done; 1 the run failed or was interrupted; 2 the scenario or the command line is \
wrong; 3 done, but a requirement of the scenario was not met.

Examples:
  windage check scenarios/saltmarsh-enrichment.toml
  windage replay scenarios/saltmarsh-enrichment.toml --output saltmarsh
  windage sweep scenarios/marker-sweep.toml --output markers

windage is a planning aid: it shows how methods behave in the truths that were put in. Decisions \
about people are for the responsible investigators, the trial statistician, the ethics committee \
and the regulator.";

#[derive(Debug, Subcommand)]
enum Verb {
    /// Read a scenario, report every mistake, and say in plain words what the study will do.
    Check(check::Check),
    /// Simulate the trials, score every method under every truth, write the result folder.
    Replay(replay::Replay),
    /// Replay over a grid of scenario values and find where a method stops being honest.
    Sweep(sweep::Sweep),
}

/// How a verb ended.
enum Ending {
    Done,
    RequirementNotMet,
}

/// Why a verb could not do its job.
enum Failure {
    /// The scenario or the command line is wrong.
    Usage(String),
    /// The run failed.
    Run(String),
    /// The reader of the output has gone.
    OutputClosed,
}

impl From<Diagnostics> for Failure {
    fn from(mistakes: Diagnostics) -> Self {
        Self::Usage(mistakes.to_string())
    }
}

impl From<std::io::Error> for Failure {
    fn from(error: std::io::Error) -> Self {
        if error.kind() == std::io::ErrorKind::BrokenPipe {
            Self::OutputClosed
        } else {
            Self::Run(format!("error: the output could not be written: {error}"))
        }
    }
}

/// Parses the command line, runs the verb, and maps its ending to the exit code.
#[must_use]
pub fn main() -> ExitCode {
    let arguments = Arguments::parse();
    let output = Output::detect();
    let ending = match arguments.verb {
        Verb::Check(verb) => verb.run(&output),
        Verb::Replay(verb) => verb.run(&output),
        Verb::Sweep(verb) => verb.run(&output),
    };
    match ending {
        // A reader that has seen enough, such as `head`, is not an error.
        Ok(Ending::Done) | Err(Failure::OutputClosed) => ExitCode::SUCCESS,
        Ok(Ending::RequirementNotMet) => ExitCode::from(3),
        Err(Failure::Usage(message)) => {
            eprintln!("{}", message.trim_end());
            ExitCode::from(2)
        }
        Err(Failure::Run(message)) => {
            eprintln!("{}", message.trim_end());
            ExitCode::from(1)
        }
    }
}

/// Reads a scenario and replaces what the command line overrides.
fn read_scenario(
    path: &Path,
    trials: Option<u64>,
    seed: Option<u64>,
) -> Result<(Scenario, Plan), Failure> {
    let (mut scenario, mut plan) = plan::read(path)?;
    for (key, value) in [("precision.trials", trials), ("precision.seed", seed)] {
        let Some(value) = value else { continue };
        let value = i64::try_from(value)
            .map_err(|_| Failure::Usage(format!("error: {value} is too large for {key}")))?;
        scenario = scenario.with_value(key, toml::Value::Integer(value))?;
        plan = plan::resolve(&scenario)?;
    }
    Ok((scenario, plan))
}

/// A failure of the run in the words of its error.
fn run_failure(error: impl std::fmt::Display) -> Failure {
    Failure::Run(format!("error: {error}"))
}

/// The time, UTC.
fn started_now() -> String {
    let since = SystemTime::now().duration_since(UNIX_EPOCH);
    crate::report::utc_text(since.map_or(0, |duration| duration.as_secs()))
}

/// A flag that the interrupt signal sets; a second signal ends the program at once.
fn interrupt_flag() -> Result<Arc<AtomicBool>, Failure> {
    let flag = Arc::new(AtomicBool::new(false));
    let handle = Arc::clone(&flag);
    ctrlc::set_handler(move || {
        if handle.swap(true, Ordering::SeqCst) {
            std::process::exit(1);
        }
    })
    .map_err(|error| Failure::Run(format!("error: no handler for Ctrl-C: {error}")))?;
    Ok(flag)
}
