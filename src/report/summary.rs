//! The whole result as one JSON value, for machines.

use serde::Serialize;

use super::Scored;
use super::number::real;
use crate::score::{CellMeasures, TruthMeasures};

/// Layout version of the summary.
const FORMAT: u32 = 1;

/// Everything that a replay found. Values that do not exist are `null`.
#[derive(Debug, Clone, Serialize)]
pub struct Summary<'a> {
    /// Layout version.
    pub format: u32,
    /// Program version.
    pub version: &'static str,
    /// Title of the study.
    pub title: &'a str,
    /// Question that the simulation answers.
    pub aim: &'a str,
    /// Confidence level of the intervals.
    pub level: f64,
    /// Allowance below the level within which a method is still honest.
    pub tolerance: f64,
    /// Label of the method whose mean width is the unit of price.
    pub reference: &'a str,
    /// Results, one per truth.
    pub truths: Vec<TruthSummary<'a>>,
    /// Verdicts, one per estimand × method.
    pub verdicts: Vec<VerdictSummary<'a>>,
}

/// Results under one truth.
#[derive(Debug, Clone, Serialize)]
pub struct TruthSummary<'a> {
    /// Name of the truth.
    pub truth: &'a str,
    /// Trials replayed.
    pub trials: u64,
    /// One entry per estimand × method.
    pub results: Vec<CellSummary<'a>>,
    /// Operating characteristics.
    pub operating: Vec<OperatingSummary<'a>>,
}

/// Measures of one method for one estimand.
#[derive(Debug, Clone, Serialize)]
pub struct CellSummary<'a> {
    /// Name of the estimand.
    pub estimand: &'a str,
    /// Label of the method.
    pub method: &'a str,
    /// True value of the estimand.
    pub true_value: f64,
    /// Null value of the estimand.
    pub null_value: f64,
    /// Whether the null hypothesis holds, so that rejections are type I errors.
    pub null_holds: bool,
    /// Measures.
    pub measures: Vec<ValueSummary>,
    /// Trials without an answer, by reason.
    pub failures: Vec<FailureSummary>,
}

/// A measure.
#[derive(Debug, Clone, Serialize)]
pub struct ValueSummary {
    /// Key of the measure.
    pub measure: &'static str,
    /// Its estimate.
    pub value: f64,
    /// Monte Carlo standard error.
    pub mcse: f64,
    /// Lower 95 % Clopper-Pearson limit of a proportion.
    pub lower: Option<f64>,
    /// Upper 95 % Clopper-Pearson limit of a proportion.
    pub upper: Option<f64>,
    /// Trials that entered the estimate.
    pub trials_used: u64,
}

/// Trials without an answer for one reason.
#[derive(Debug, Clone, Serialize)]
pub struct FailureSummary {
    /// Key of the reason.
    pub reason: &'static str,
    /// Number of trials.
    pub trials: u64,
    /// Share of all trials.
    pub share: f64,
}

/// An operating characteristic.
#[derive(Debug, Clone, Serialize)]
pub struct OperatingSummary<'a> {
    /// Key of the characteristic.
    pub characteristic: &'a str,
    /// What it is about; empty for the whole design.
    pub subject: &'a str,
    /// Its estimate.
    pub value: f64,
    /// Monte Carlo standard error.
    pub mcse: f64,
    /// Trials that entered the estimate.
    pub trials_used: u64,
}

/// The verdict on one method for one estimand.
#[derive(Debug, Clone, Serialize)]
pub struct VerdictSummary<'a> {
    /// Name of the estimand.
    pub estimand: &'a str,
    /// Label of the method.
    pub method: &'a str,
    /// The word over all truths.
    pub verdict: &'a str,
    /// The word under each truth.
    pub truths: Vec<TruthVerdict<'a>>,
    /// Price, if it is known.
    pub price: Option<f64>,
    /// Whether this is the cheapest honest method for the estimand.
    pub cheapest: bool,
}

/// The verdict under one truth.
#[derive(Debug, Clone, Serialize)]
pub struct TruthVerdict<'a> {
    /// Name of the truth.
    pub truth: &'a str,
    /// The word.
    pub verdict: &'a str,
}

impl<'a> Summary<'a> {
    /// The summary of a replay.
    #[must_use]
    pub fn new(scored: &'a Scored) -> Self {
        Self {
            format: FORMAT,
            version: env!("CARGO_PKG_VERSION"),
            title: &scored.title,
            aim: &scored.aim,
            level: scored.level,
            tolerance: scored.tolerance,
            reference: &scored.methods[scored.reference],
            truths: scored
                .measures
                .iter()
                .map(|measures| truth(scored, measures))
                .collect(),
            verdicts: verdicts(scored),
        }
    }
}

/// The summary as indented JSON text.
///
/// # Errors
/// If JSON cannot hold a value; none of these types can bring that about.
pub fn summary_json(scored: &Scored) -> serde_json::Result<String> {
    Ok(serde_json::to_string_pretty(&Summary::new(scored))? + "\n")
}

fn truth<'a>(scored: &'a Scored, measures: &'a TruthMeasures) -> TruthSummary<'a> {
    TruthSummary {
        truth: &scored.truths[measures.truth],
        trials: measures.trials,
        results: measures
            .cells
            .iter()
            .map(|result| cell(scored, measures, result))
            .collect(),
        operating: measures
            .operating
            .iter()
            .map(|value| OperatingSummary {
                characteristic: &value.characteristic,
                subject: &value.subject,
                value: value.value,
                mcse: value.mcse,
                trials_used: value.trials_used,
            })
            .collect(),
    }
}

fn cell<'a>(
    scored: &'a Scored,
    measures: &TruthMeasures,
    cell: &'a CellMeasures,
) -> CellSummary<'a> {
    CellSummary {
        estimand: &scored.estimands[cell.estimand],
        method: &scored.methods[cell.method],
        true_value: scored.true_values[measures.truth][cell.estimand],
        null_value: scored.nulls[cell.estimand],
        null_holds: scored.null_holds(measures.truth, cell.estimand),
        measures: cell
            .values
            .iter()
            .map(|value| ValueSummary {
                measure: value.measure.key(),
                value: value.value,
                mcse: value.mcse,
                lower: value.limits.map(|limits| limits.0),
                upper: value.limits.map(|limits| limits.1),
                trials_used: value.trials_used,
            })
            .collect(),
        failures: cell
            .failures
            .iter()
            .map(|&(reason, trials)| FailureSummary {
                reason: reason.key(),
                trials,
                share: real(trials) / real(measures.trials),
            })
            .collect(),
    }
}

fn verdicts(scored: &Scored) -> Vec<VerdictSummary<'_>> {
    scored
        .verdicts
        .iter()
        .map(|line| VerdictSummary {
            estimand: &scored.estimands[line.estimand],
            method: &scored.methods[line.method],
            verdict: line.overall,
            truths: scored
                .truths
                .iter()
                .zip(&line.per_truth)
                .map(|(truth, word)| TruthVerdict {
                    truth,
                    verdict: word,
                })
                .collect(),
            price: line.price,
            cheapest: line.cheapest,
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::fixtures;

    #[test]
    fn everything_is_found_under_its_name() {
        let mut scored = fixtures::scored(2);
        scored.measures[0].cells[0].values[0].mcse = f64::NAN;
        let text = summary_json(&scored).unwrap();
        let json: serde_json::Value = serde_json::from_str(&text).unwrap();
        assert_eq!(json["truths"][1]["truth"], scored.truths[1].as_str());
        let result = &json["truths"][0]["results"][1];
        assert_eq!(result["method"], "batch-combined");
        assert_eq!(result["null_holds"], true);
        assert_eq!(result["failures"][0]["reason"], "rank-deficient");
        assert_eq!(result["measures"][2]["measure"], "coverage");
        assert_eq!(result["measures"][2]["value"], 0.951);
        assert!(json["truths"][0]["results"][0]["measures"][0]["mcse"].is_null());
        assert_eq!(json["verdicts"][1]["cheapest"], true);
        assert_eq!(json["truths"][0]["operating"][1]["subject"], "early");
    }
}
