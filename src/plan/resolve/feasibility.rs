//! Whether the parts of a plan go together: outcomes that are due, units that suffice, memory.

use super::batches::PlacedBatch;
use super::methods::PlacedMethod;
use super::population::Supply;
use super::select::ranks_units;
use crate::plan::{MethodKind, Model, SelectRule, Truth};
use crate::scenario::{Fields, Place, Sink};

/// Most numbers of one array of a trial: 1.6 GB.
const MOST_NUMBERS: usize = 200_000_000;

/// The sound parts of a scenario.
pub(super) struct Study<'a> {
    pub(super) batches: &'a [PlacedBatch],
    /// `None` where the analysis model has a mistake.
    pub(super) analysis: Option<&'a Model>,
    /// `None` where a truth has a mistake.
    pub(super) truths: Option<&'a [Truth]>,
    /// Number of covariate columns, if it is known.
    pub(super) columns: Option<usize>,
    pub(super) supply: Supply,
}

/// Reports every part that does not go with the others.
pub(super) fn check(study: &Study<'_>, root: &Fields<'_>, methods: &[PlacedMethod]) {
    let sink = root.sink();
    // The same entry, unrolled, would say the same thing again.
    let mut said = Vec::new();
    for (index, placed) in study.batches.iter().enumerate() {
        if !said.contains(&placed.entry) {
            let before = sink.trouble();
            check_past(study, index, sink);
            check_supply(study, index, sink);
            if sink.trouble() != before {
                said.push(placed.entry);
            }
        }
    }
    if let Some(analysis) = study.analysis {
        for placed in methods {
            check_method(study, analysis, placed, sink);
        }
    }
    check_memory(study, root);
}

/// Units whose outcomes are due before a batch (zero-based), and the truth that delays most.
fn due<'a>(study: &Study<'a>, batch: usize) -> (usize, Option<&'a Truth>) {
    let slowest = study
        .truths
        .unwrap_or_default()
        .iter()
        .max_by_key(|truth| truth.delay)
        .filter(|truth| truth.delay > 0);
    let delay = slowest.map_or(0, |truth| truth.delay);
    let seen = batch.saturating_sub(delay);
    let units = study.batches[..seen]
        .iter()
        .map(|placed| placed.batch.size)
        .sum();
    (units, slowest)
}

fn check_past(study: &Study<'_>, index: usize, sink: &Sink<'_>) {
    let placed = &study.batches[index];
    let (units, slowest) = due(study, index);
    let none_due = |rule: &str, place: &Place| {
        let reason = match slowest {
            Some(truth) if index > 0 => format!(
                "no outcome is due before batch {}: under the truth \"{}\" outcomes are {} batches late",
                index + 1,
                truth.name,
                truth.delay
            ),
            _ => format!("batch {} comes before any outcome", index + 1),
        };
        let help = format!(
            "use {rule} until outcomes are due, from batch {} on",
            slowest.map_or(0, |truth| truth.delay) + 2
        );
        sink.report(place, reason, Some(help));
    };
    for (part, place) in placed.batch.select.iter().zip(&placed.part_places) {
        if let Some(score) = part.rule.score()
            && study.analysis.is_some()
            && !ranks_units(score)
        {
            sink.report(
                place,
                "the score is the same for every unit: its model holds no covariate that matters to it",
                Some(
                    "add regressors to the rule: covariates, or for a contrast their interactions with the arm, as \"treated:age\""
                        .to_owned(),
                ),
            );
        }
        let Some(fit) = part.rule.fit() else { continue };
        if units == 0 {
            none_due("rule = \"random\" or score = \"covariate\"", place);
        } else if fit.penalty == 0.0 && study.analysis.is_some() && fit.model.len() > units {
            let what = match part.rule {
                SelectRule::Uncertain { .. } => "units",
                _ => "outcomes",
            };
            sink.report(
                place,
                format!(
                    "the rule's model has {} coefficients, but only {units} {what} are due before batch {}",
                    fit.model.len(),
                    index + 1
                ),
                Some(
                    "list fewer regressors, use fit = \"ridge\", or enrol more units before"
                        .to_owned(),
                ),
            );
        }
    }
    let looks_back = placed
        .batch
        .allocate
        .as_ref()
        .is_some_and(|allocation| allocation.rule.looks_back());
    if looks_back && units == 0 {
        none_due("rule = \"equal\"", &placed.allocate_place);
    }
}

fn check_supply(study: &Study<'_>, index: usize, sink: &Sink<'_>) {
    let placed = &study.batches[index];
    let candidates: usize = placed.batch.select.iter().map(|part| part.candidates).sum();
    let numbers = study.columns.unwrap_or(1).saturating_mul(candidates);
    if numbers > MOST_NUMBERS {
        sink.report(
            &placed.place,
            format!(
                "batch {} screens {candidates} candidates with {} covariates each",
                index + 1,
                study.columns.unwrap_or(1)
            ),
            Some(format!(
                "at most {MOST_NUMBERS} values fit in memory; screen fewer candidates"
            )),
        );
    }
    if let Supply::Roster(Some(units)) = study.supply {
        let before: usize = study.batches[..index]
            .iter()
            .map(|placed| placed.batch.size)
            .sum();
        if before + candidates > units {
            sink.report(
                &placed.size_place,
                format!(
                    "batch {} needs {candidates} candidates, but {} of the {units} units of the roster remain",
                    index + 1,
                    units.saturating_sub(before)
                ),
                Some("enrol or screen fewer units".to_owned()),
            );
        }
    }
}

fn check_method(study: &Study<'_>, analysis: &Model, placed: &PlacedMethod, sink: &Sink<'_>) {
    let coefficients = analysis.len();
    let size = |index: usize| study.batches[index].batch.size;
    let last = study.batches.len().saturating_sub(1);
    let short = match placed.method.kind {
        MethodKind::LeastSquares { .. }
        | MethodKind::WDecorrelation { .. }
        | MethodKind::SelfNormalised { .. } => {
            let units: usize = (0..=last).map(size).sum();
            (units <= coefficients).then(|| format!("the study has {units} units"))
        }
        MethodKind::FirstBatch => {
            (size(0) <= coefficients).then(|| format!("batch 1 has {} units", size(0)))
        }
        MethodKind::LastBatch => (size(last) <= coefficients)
            .then(|| format!("batch {} has {} units", last + 1, size(last))),
        MethodKind::BatchCombined { .. }
        | MethodKind::InverseVariance
        | MethodKind::AnticipatedDecorrelation
        | MethodKind::PredictablePivot => (0..=last)
            .find(|&index| size(index) <= coefficients)
            .map(|index| format!("batch {} has {} units", index + 1, size(index))),
        MethodKind::Ridge { .. } => None,
    };
    if let Some(short) = short {
        sink.report(
            &placed.place,
            format!(
                "\"{}\" estimates {coefficients} coefficients, but {short}",
                placed.method.label
            ),
            Some(
                "it needs more units than coefficients: use fewer covariates or larger batches"
                    .to_owned(),
            ),
        );
    }
}

fn check_memory(study: &Study<'_>, root: &Fields<'_>) {
    let units: usize = study
        .batches
        .iter()
        .map(|placed| placed.batch.size)
        .fold(0, usize::saturating_add);
    let width = study
        .columns
        .unwrap_or(1)
        .max(study.analysis.map_or(1, Model::len));
    if units.saturating_mul(width) > MOST_NUMBERS {
        root.report(
            "batch",
            format!("one trial has {units} units with {width} values each"),
            format!("at most {MOST_NUMBERS} values fit in memory; enrol fewer units"),
        );
    }
    if width.saturating_mul(width) > MOST_NUMBERS {
        root.report(
            "analysis",
            format!("the analysis model would need a matrix of {width} × {width}"),
            "use fewer regressors",
        );
    }
}
