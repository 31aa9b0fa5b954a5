//! From the scenario as written to the plan as meant: defaults, names, and every check of meaning.
//!
//! One file per section. Each goes on after a mistake, so that all mistakes are found in one
//! reading; what can only be judged on sound parts (does the roster suffice, are there enough
//! outcomes for a rule's model) is judged last, on the parts that are sound.

mod allocate;
mod batches;
mod closing;
mod coefficients;
mod correlation;
mod estimands;
mod feasibility;
mod marginals;
mod methods;
mod names;
mod outcome;
mod population;
mod regressors;
mod roster;
mod select;
mod truths;

#[cfg(test)]
mod tests;

use std::path::Path;

use super::Plan;
use crate::scenario::{Diagnostic, Diagnostics, Draft, Fields, Scenario, Sink};
use names::Names;

/// Version of the scenario format that is read.
const FORMAT: u64 = 1;

/// Makes the plan of a scenario.
///
/// # Errors
///
/// Every mistake in the meaning of the scenario, in the order of the file.
pub fn resolve(scenario: &Scenario) -> Result<Plan, Diagnostics> {
    let sink = scenario.sink();
    let plan = build(scenario, &sink, true);
    finish(plan, sink.into_list())
}

/// Reads a scenario file and makes its plan.
///
/// # Errors
///
/// If the file cannot be read; else every mistake in it, from syntax to meaning, in one list.
pub fn read(path: &Path) -> Result<(Scenario, Plan), Diagnostics> {
    from_draft(Scenario::read_draft(path)?)
}

/// Reads a scenario text and makes its plan; `origin` is the file name used in messages, and paths
/// in the scenario are relative to `base_folder`.
///
/// # Errors
///
/// Every mistake in the text, from syntax to meaning, in one list.
pub fn parse(
    text: &str,
    origin: &str,
    base_folder: &Path,
) -> Result<(Scenario, Plan), Diagnostics> {
    from_draft(Scenario::parse_draft(text, origin, base_folder))
}

fn from_draft(draft: Draft) -> Result<(Scenario, Plan), Diagnostics> {
    let Draft {
        scenario,
        mut mistakes,
        unreadable,
        complete,
    } = draft;
    let mut plan = None;
    if complete {
        let sink = scenario.sink();
        plan = build(&scenario, &sink, unreadable.is_empty());
        // A name may be missing because its line could not be read: that line is the mistake.
        let consequence = |diagnostic: &Diagnostic| {
            diagnostic
                .missing
                .as_ref()
                .is_some_and(|name| unreadable.iter().any(|line| line.contains(name.as_str())))
        };
        mistakes.extend(
            sink.into_list()
                .into_iter()
                .filter(|diagnostic| !consequence(diagnostic)),
        );
    }
    finish(plan, mistakes).map(|plan| (scenario, plan))
}

fn finish(plan: Option<Plan>, mistakes: Vec<Diagnostic>) -> Result<Plan, Diagnostics> {
    match (plan, Diagnostics::from_list(mistakes)) {
        (Some(plan), None) => Ok(plan),
        (_, Some(diagnostics)) => Err(diagnostics),
        // A part is only missing after a report; this keeps a slip in that rule from a panic.
        (None, None) => Err(Diagnostics::one(Diagnostic::of_file(
            "scenario",
            "the scenario could not be resolved".to_owned(),
            None,
        ))),
    }
}

/// Number of covariates that brings the analysis model to a share of the planned units:
/// `round(share × units)` minus the other coefficients of the analysis model, at least one.
///
/// `path` is the path of a `count` in the scenario that `plan` was made of; `None` where the
/// scenario does not give that count.
#[must_use]
#[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // units are at most 10^9
pub fn count_for_share(scenario: &Scenario, plan: &Plan, path: &str, share: f64) -> Option<usize> {
    let current = usize::try_from(scenario.value(path)?.as_integer()?).ok()?;
    let others = plan.analysis.len().saturating_sub(current);
    let coefficients = (share * plan.units() as f64).round().max(0.0) as usize;
    Some(coefficients.saturating_sub(others).max(1))
}

fn build(scenario: &Scenario, sink: &Sink<'_>, whole: bool) -> Option<Plan> {
    let root = Fields::of(scenario.root(), "the scenario", sink)?;
    check_format(&root);
    let (title, aim) = study(&root);

    let mut names = Names::new();
    let arms = population::arms(&root, &mut names);
    let population = population::read(&root, scenario.base_folder(), &mut names);
    let recorded = population.recorded;

    let (precision, seed) = closing::precision(&root);
    let before = sink.trouble();
    let batches = batches::read(&root, &names, population.supply());
    let batches_sound = sink.trouble() == before;
    let batch_count = batches_sound.then_some(batches.len());

    let before = sink.trouble();
    let truths = truths::read(&root, &names, recorded, seed, batch_count);
    let truths_sound = sink.trouble() == before;

    let before = sink.trouble();
    let (analysis, level) = regressors::analysis(&root, &names);
    let analysis_sound = sink.trouble() == before && names.is_complete();
    let batches = batches::with_default_regressors(batches, &analysis);

    let estimands = estimands::read(&root, &names, &analysis, &truths, analysis_sound);
    let methods = methods::read(&root, batch_count);
    let truth_names = truths::names(&root, recorded);
    let (verdicts, requirements) = closing::judgement(&root, &methods, &estimands, &truth_names);

    // Sizes are compared only where every number that enters is known.
    if whole && batches_sound {
        let study = feasibility::Study {
            batches: &batches,
            analysis: analysis_sound.then_some(&analysis),
            truths: truths_sound.then_some(truths.as_slice()),
            columns: names.is_complete().then(|| names.columns().len()),
            supply: population.supply(),
        };
        feasibility::check(&study, &root, &methods);
    }

    Some(Plan {
        title: title?,
        aim,
        population: population.resolved?,
        arms,
        truths,
        batches: batches::plain(batches),
        analysis,
        level,
        estimands: estimands.into_iter().collect::<Option<_>>()?,
        methods: methods.into_iter().map(|method| method.method).collect(),
        precision: precision?,
        verdicts: verdicts?,
        requirements,
    })
}

fn check_format(root: &Fields<'_>) {
    root.required("format", "begin the file with format = 1");
    if let Some(format) = root.whole("format")
        && format != FORMAT
    {
        root.report(
            "format",
            format!("the format is {format}"),
            "this version reads format = 1",
        );
    }
}

/// Title and aim.
fn study(root: &Fields<'_>) -> (Option<String>, String) {
    if root
        .required("study", "add [study] with title = \"...\"")
        .is_none()
    {
        return (None, String::new());
    }
    let Some(fields) = root.section("study") else {
        return (None, String::new());
    };
    fields.required("title", "say in one line what the study is");
    let title = fields.text("title").map(str::to_owned);
    let aim = fields.text("aim").unwrap_or_default();
    // The aim is quoted in running text.
    let aim = aim.split_whitespace().collect::<Vec<_>>().join(" ");
    (title, aim)
}
