//! `windage replay`: simulate, score, print the tables, write the result folder.

use super::options::RunOptions;
use super::output::Output;
use super::{Ending, Failure, interrupt_flag, run_failure, started_now};
use crate::replay::{ReplayOptions, Study, TrialSink, replay};
use crate::report::{
    Clock, Look, Machine, RunRecord, Scored, TrialsFile, replay_figures, replay_tables,
    summary_json, write_result,
};
use crate::score::{BlockRecord, Labels, RequirementOutcome, evaluate};
use std::fmt::Write as _;
use std::fs::File;
use std::time::Instant;

/// Arguments of `replay`.
#[derive(Debug, clap::Args)]
pub(super) struct Replay {
    #[command(flatten)]
    run: RunOptions,
    /// Write every trial's estimates to `trials.parquet`.
    #[arg(long)]
    keep_trials: bool,
    /// Print the results as JSON instead of tables.
    #[arg(long)]
    json: bool,
}

/// Keeps every trial in a Parquet file.
struct KeepTrials {
    file: TrialsFile<File>,
    methods: usize,
}

impl TrialSink for KeepTrials {
    fn take(&mut self, truth: usize, first: u64, block: &BlockRecord) -> std::io::Result<()> {
        self.file
            .push_block(truth, first, self.methods, block)
            .map_err(|error| std::io::Error::other(error.to_string()))
    }
}

impl Replay {
    pub(super) fn run(self, output: &Output) -> Result<Ending, Failure> {
        let (scenario, plan) = self.run.read()?;
        let folder = self.run.folder()?;
        let interrupt = interrupt_flag()?;
        let (started, begun) = (started_now(), Instant::now());
        let mut progress = output.progress(self.run.quiet);
        progress.note("preparing");
        let study = Study::prepare(&plan);
        let true_values = study.true_value_table();
        let mut keep = if self.keep_trials {
            let named = Scored::new(&plan, true_values.clone(), Vec::new(), Vec::new());
            let file = folder.create("trials.parquet").map_err(run_failure)?;
            let file = TrialsFile::begin(file, &named).map_err(run_failure)?;
            Some(KeepTrials {
                file,
                methods: plan.methods.len(),
            })
        } else {
            None
        };
        let results = replay(
            &study,
            &mut ReplayOptions {
                threads: self.run.threads,
                interrupt: &interrupt,
                progress: &mut |state| progress.show("", state),
                sink: keep.as_mut().map(|keep| keep as &mut dyn TrialSink),
                diagnostics: true,
            },
        );
        progress.finish();
        let results = results.map_err(run_failure)?;
        if let Some(keep) = keep {
            keep.file.finish().map_err(run_failure)?;
        }
        let (measures, distributions): (Vec<_>, Vec<_>) = results
            .into_iter()
            .map(|result| (result.measures, result.distributions))
            .unzip();
        let (scored, judged) = Scored::judge(&plan, true_values, measures);
        let clock = Clock {
            started,
            seconds: begun.elapsed().as_secs_f64(),
        };
        let precision = plan.precision;
        let record = RunRecord::new(
            &scored,
            scenario.text(),
            precision.seed,
            precision.trials,
            None,
            clock,
            Machine::current(self.run.thread_count()),
        );
        let figures = replay_figures(&scored, &distributions);
        write_result(&folder, scenario.text(), &record, &scored, &figures).map_err(run_failure)?;
        let written = folder.commit().map_err(run_failure)?;
        let labels = Labels::of(&plan);
        let outcomes = evaluate(&plan.requirements, &labels, &scored.measures, &judged);
        let met = outcomes.iter().all(|outcome| outcome.met);
        if self.json {
            let text = summary_json(&scored).map_err(run_failure)?;
            Output::print(&(text + "\n"))?;
        } else {
            let mut text = tables(&scored, &outcomes, &labels, output);
            let _ = writeln!(
                text,
                "\n{} trials per truth, seed {}, {:.1} s. Written to {}.\n{CAUTION}",
                precision.trials,
                precision.seed,
                record.clock.seconds,
                written.display()
            );
            Output::print(&text)?;
        }
        Ok(if met {
            Ending::Done
        } else {
            Ending::RequirementNotMet
        })
    }
}

const CAUTION: &str = "\
A planning aid: it shows the truths that were put in, not that they hold. The trial statistician,
the ethics committee and the regulator decide.";

/// The tables of a replay, and what became of the requirements.
fn tables(
    scored: &Scored,
    outcomes: &[RequirementOutcome],
    labels: &Labels,
    output: &Output,
) -> String {
    let look = Look {
        width: output.width,
        ansi: output.styled,
    };
    let mut text = replay_tables(scored, look);
    if !outcomes.is_empty() {
        text.push_str("\nRequirements\n");
    }
    for outcome in outcomes {
        let word = if outcome.met { "met    " } else { "NOT MET" };
        let _ = write!(text, "  {word}  {}", outcome.requirement);
        if let (false, Some(worst)) = (outcome.met, &outcome.worst) {
            let _ = write!(text, "; worst: {}", worst.place(labels));
            if let Some(value) = worst.value {
                let _ = write!(text, ", {value:.4}");
            }
        }
        text.push('\n');
    }
    text
}
