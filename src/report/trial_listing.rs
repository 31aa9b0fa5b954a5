//! One trial, unit by unit.

use crate::plan::{Plan, Source, Term};
use crate::trial::Trial;
use std::fmt::Write as _;

/// A trial as CSV: batch, unit, arm, covariates, outcome, expected outcome, probabilities.
#[must_use]
pub fn trial_listing(plan: &Plan, trial: &Trial) -> String {
    let design = plan.design();
    let mut out = String::from("batch,unit,source");
    if !plan.arms.is_empty() {
        out.push_str(",arm");
    }
    for name in &plan.population.columns {
        let _ = write!(out, ",{}", quoted(name));
    }
    out.push_str(",outcome,expected_outcome,selection_probability");
    for arm in &plan.arms {
        let _ = write!(out, ",{}", quoted(&format!("allocation_probability_{arm}")));
    }
    out.push('\n');
    for batch in 0..trial.batches() {
        for row in trial.batch_rows(batch) {
            let source = match &plan.population.source {
                Source::Roster(roster) => quoted(&roster.ids[trial.sources()[row]]),
                Source::Law(_) => (trial.sources()[row] + 1).to_string(),
            };
            let _ = write!(out, "{},{},{source}", batch + 1, row + 1);
            if !plan.arms.is_empty() {
                let _ = write!(out, ",{}", quoted(&plan.arms[trial.arms()[row]]));
            }
            for (stored, term) in design.terms.iter().enumerate() {
                if matches!(term, Term::Covariate(_)) {
                    let _ = write!(out, ",{}", trial.value(row, stored));
                }
            }
            let _ = write!(out, ",{},{}", trial.outcomes()[row], trial.expected()[row]);
            let probability = trial.selection_probabilities()[row];
            // A rule that is deterministic in the score has no probability to log.
            if probability.is_nan() {
                out.push(',');
            } else {
                let _ = write!(out, ",{probability}");
            }
            if !plan.arms.is_empty() {
                for probability in trial.allocation_probabilities(row) {
                    let _ = write!(out, ",{probability}");
                }
            }
            out.push('\n');
        }
    }
    out
}

/// A CSV field, quoted where it must be.
fn quoted(field: &str) -> String {
    if field.contains([',', '"', '\n', '\r']) {
        format!("\"{}\"", field.replace('"', "\"\""))
    } else {
        field.to_owned()
    }
}
