//! `windage sweep`: replay over a grid of scenario values, find where a method breaks.

use super::options::RunOptions;
use super::output::{Output, ProgressLine};
use super::{Ending, Failure, interrupt_flag, run_failure, started_now};
use crate::plan::Plan;
use crate::planning::{BreakBracket, GridPoint, Search, find_breaks, grid, point};
use crate::replay::{ReplayOptions, Study, replay};
use crate::report::figures::{BreakPoint, SweepFigure, sweep_figure};
use crate::report::{
    AxisValue, Clock, DATA_DICTIONARY, Look, Machine, ResultFolder, RunRecord, Scored, SweepPoint,
    break_points_csv, break_sentences, sweep_csv, sweep_tables,
};
use crate::score::Measure;
use std::fmt::Write as _;
use std::sync::atomic::AtomicBool;
use std::time::Instant;

/// Arguments of `sweep`.
#[derive(Debug, clap::Args)]
pub(super) struct Sweep {
    #[command(flatten)]
    run: RunOptions,
}

/// What replays the points of a sweep.
struct Runner<'a> {
    threads: usize,
    interrupt: &'a AtomicBool,
    progress: ProgressLine,
}

impl Runner<'_> {
    fn score(&mut self, label: &str, plan: &Plan) -> Result<Scored, Failure> {
        let study = Study::prepare(plan);
        let true_values = study.true_value_table();
        let progress = &mut self.progress;
        let results = replay(
            &study,
            &mut ReplayOptions {
                threads: self.threads,
                interrupt: self.interrupt,
                progress: &mut |state| progress.show(label, state),
                sink: None,
                diagnostics: false,
            },
        );
        if results.is_err() {
            self.progress.finish();
        }
        let measures = results
            .map_err(run_failure)?
            .into_iter()
            .map(|result| result.measures)
            .collect();
        Ok(Scored::judge(plan, true_values, measures).0)
    }
}

impl Sweep {
    pub(super) fn run(self, output: &Output) -> Result<Ending, Failure> {
        let (scenario, _) = self.run.read()?;
        let Some(sweep) = scenario.sweep() else {
            return Err(Failure::Usage(format!(
                "error: {} has no [sweep] section: add one with axes = [{{ path = \"...\", \
                 values = [...] }}]",
                self.run.scenario.display()
            )));
        };
        let points = grid(&scenario, sweep)?;
        let folder = self.run.folder()?;
        let interrupt = interrupt_flag()?;
        let (started, begun) = (started_now(), Instant::now());
        let axes: Vec<String> = sweep.axes.iter().map(|axis| axis.path.clone()).collect();
        let mut runner = Runner {
            threads: self.run.threads,
            interrupt: &interrupt,
            progress: output.progress(self.run.quiet),
        };
        let search = sweep.break_point.as_ref().and_then(|wanted| {
            let plan = &points.first()?.plan;
            Search::of(plan, wanted)
        });
        let mut scored = Vec::with_capacity(points.len());
        let mut judged: Vec<(GridPoint, bool)> = Vec::with_capacity(points.len());
        for (index, point) in points.iter().enumerate() {
            let label = format!("point {} of {}: ", index + 1, points.len());
            let found = runner.score(&label, &point.plan)?;
            let broken = search
                .as_ref()
                .is_some_and(|search| search.broken(&point.plan, &found.measures));
            judged.push((point.clone(), broken));
            let values = point.values.iter().map(axis_value).collect();
            scored.push(SweepPoint {
                axes: values,
                scored: found,
            });
        }
        let brackets = match &search {
            None => Vec::new(),
            Some(search) => find_breaks(&judged, |values| {
                let extra = point(&scenario, sweep, values)?;
                let found = runner.score("break point: ", &extra.plan)?;
                let broken = search.broken(&extra.plan, &found.measures);
                Ok::<_, Failure>((extra.plan, broken))
            })?,
        };
        runner.progress.finish();
        let first = &scored[0].scored;
        let method = search.as_ref().map_or(0, |search| search.method);
        let label = first.methods[method].clone();
        let clock = Clock {
            started,
            seconds: begun.elapsed().as_secs_f64(),
        };
        let precision = points[0].plan.precision;
        let record = RunRecord::new(
            first,
            scenario.text(),
            precision.seed,
            precision.trials,
            None,
            clock,
            Machine::current(self.run.thread_count()),
        );
        write_files(
            &folder,
            scenario.text(),
            &record,
            &axes,
            &scored,
            search.as_ref(),
            &brackets,
        )?;
        let written = folder.commit().map_err(run_failure)?;
        let look = Look {
            width: output.width,
            ansi: output.styled,
        };
        let mut text = sweep_tables(&axes, &scored, look);
        if search.is_some() {
            text.push_str(&break_sentences(
                &axes,
                &label,
                first,
                &brackets,
                output.width,
            ));
        }
        let _ = writeln!(
            text,
            "\n{} points, {} trials per truth and point, seed {}, {:.1} s. Written to {}.",
            points.len(),
            precision.trials,
            precision.seed,
            record.clock.seconds,
            written.display()
        );
        Output::print(&text)?;
        Ok(Ending::Done)
    }
}

/// Writes every file of a sweep into its folder.
fn write_files(
    folder: &ResultFolder,
    scenario_text: &str,
    record: &RunRecord,
    axes: &[String],
    scored: &[SweepPoint],
    search: Option<&Search>,
    brackets: &[BreakBracket],
) -> Result<(), Failure> {
    let method = search.map_or(0, |search| search.method);
    let label = &scored[0].scored.methods[method];
    let write = |name: &str, text: &str| folder.write(name, text.as_bytes()).map_err(run_failure);
    write("scenario.toml", scenario_text)?;
    write("run.json", &record.to_json().map_err(run_failure)?)?;
    write("columns.md", DATA_DICTIONARY)?;
    write("sweep.csv", &sweep_csv(axes, scored).map_err(run_failure)?)?;
    if search.is_some() {
        let text = break_points_csv(axes, label, brackets).map_err(run_failure)?;
        write("break-points.csv", &text)?;
    }
    for (name, mut figure) in sweep_figures(axes, scored) {
        mark_breaks(&mut figure, search, label, brackets);
        let drawn = sweep_figure(&name, &figure);
        write(&format!("figures/{}.svg", drawn.name), &drawn.svg)?;
    }
    Ok(())
}

fn axis_value(value: &toml::Value) -> AxisValue {
    match value {
        toml::Value::Integer(integer) => AxisValue::Number(*integer as f64),
        toml::Value::Float(float) => AxisValue::Number(*float),
        toml::Value::String(word) => AxisValue::Word(word.clone()),
        other => AxisValue::Word(other.to_string()),
    }
}

/// Coverage, bias and price along the first axis, for every truth and estimand.
fn sweep_figures(axes: &[String], points: &[SweepPoint]) -> Vec<(String, SweepFigure)> {
    let first = &points[0].scored;
    let mut figures = Vec::new();
    for (truth, truth_name) in first.truths.iter().enumerate() {
        for (estimand, estimand_name) in first.estimands.iter().enumerate() {
            for measure in [Measure::Coverage, Measure::Bias, Measure::Price] {
                let name = format!(
                    "{}-{}-{}-{truth_name}-{estimand_name}",
                    measure.key(),
                    truth + 1,
                    estimand + 1
                );
                let figure = SweepFigure::from_points(axes, points, truth, estimand, measure);
                figures.push((name, figure));
            }
        }
    }
    figures
}

/// Marks the bracket of the break point in every panel of a coverage figure.
fn mark_breaks(
    figure: &mut SweepFigure,
    search: Option<&Search>,
    label: &str,
    brackets: &[BreakBracket],
) {
    let Some(search) = search else { return };
    if figure.measure != Measure::Coverage.key() {
        return;
    }
    for (panel, bracket) in figure.panels.iter_mut().zip(brackets) {
        if let (Some(from), Some(to)) = (bracket.from, bracket.to) {
            panel.break_points.push(BreakPoint {
                method: search.method,
                from,
                to,
                text: label.to_owned(),
            });
        }
    }
}
