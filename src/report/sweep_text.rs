//! A sweep as terminal tables, sentences and a table of break points.

use super::csv_files::{CsvError, write};
use super::number;
use super::text::{bold, paragraph};
use super::text_table::{Align, Column, TextTable, measure_cell};
use super::{AxisValue, Look, Scored, SweepPoint};
use crate::planning::BreakBracket;
use crate::score::Measure;

/// Coverage of every method along the sweep, one block per truth × estimand.
#[must_use]
pub fn sweep_tables(axes: &[String], points: &[SweepPoint], look: Look) -> String {
    let mut out = String::new();
    let Some(first) = points.first().map(|point| &point.scored) else {
        return out;
    };
    for (truth, truth_name) in first.truths.iter().enumerate() {
        for (estimand, estimand_name) in first.estimands.iter().enumerate() {
            let title = format!(
                "Coverage in % by {}: {estimand_name}, truth {truth_name}",
                axes.join(", ")
            );
            for line in paragraph(&title, look.width).lines() {
                out.push_str(&bold(line, look.ansi));
                out.push('\n');
            }
            let columns = points
                .iter()
                .map(|point| Column {
                    heading: point.axes.iter().map(show).collect::<Vec<_>>().join("\n"),
                    align: Align::Right,
                })
                .collect();
            let mut table = TextTable::new("method", columns);
            for (method, label) in first.methods.iter().enumerate() {
                let cells = points
                    .iter()
                    .map(|point| {
                        let cells = &point.scored.measures[truth].cells;
                        let own = cells
                            .iter()
                            .find(|cell| cell.estimand == estimand && cell.method == method);
                        let coverage = own.and_then(|cell| cell.get(Measure::Coverage));
                        measure_cell(coverage, 100.0, COVERAGE_DECIMALS)
                    })
                    .collect();
                table.push(label.as_str(), cells);
            }
            out.push_str(&table.render(look.width, look.ansi));
            out.push('\n');
        }
    }
    out
}

/// Decimals of a coverage in per cent.
const COVERAGE_DECIMALS: usize = 1;

fn show(value: &AxisValue) -> String {
    match value {
        AxisValue::Number(number) => number::short(*number),
        AxisValue::Word(word) => word.clone(),
    }
}

/// One sentence per bracket.
#[must_use]
pub fn break_sentences(
    axes: &[String],
    method: &str,
    scored: &Scored,
    brackets: &[BreakBracket],
    width: usize,
) -> String {
    let bound = 100.0 * (scored.level - scored.tolerance);
    let axis = axes.first().map_or("", String::as_str);
    let mut out = String::from("Break point\n");
    for bracket in brackets {
        let place = if bracket.others.is_empty() {
            String::new()
        } else {
            let others: Vec<String> = axes[1..]
                .iter()
                .zip(&bracket.others)
                .map(|(axis, value)| format!("{axis} = {value}"))
                .collect();
            format!("With {}: ", others.join(", "))
        };
        let share = |ratio: Option<f64>| {
            ratio.map_or_else(String::new, |ratio| format!(" (p/n = {ratio:.3})"))
        };
        let sentence = match (bracket.from, bracket.to) {
            (Some(from), Some(to)) => format!(
                "the smallest value of {axis} at which {method} is shown to cover less than \
                 {bound:.1} % lies above {}{} and at or below {}{}, found in {} further replays",
                number::short(from),
                share(bracket.ratios.0),
                number::short(to),
                share(bracket.ratios.1),
                bracket.evaluations
            ),
            (None, Some(to)) => format!(
                "{method} covers less than {bound:.1} % at the first value of {axis} already, \
                 {}{}",
                number::short(to),
                share(bracket.ratios.1)
            ),
            (Some(from), None) => format!(
                "{method} is not shown to cover less than {bound:.1} % anywhere up to {axis} = \
                 {}{}",
                number::short(from),
                share(bracket.ratios.0)
            ),
            (None, None) => "no value could be judged".to_owned(),
        };
        out.push_str(&paragraph(&format!("{place}{sentence}."), width));
    }
    out
}

/// `break-points.csv`: one row per combination of the other axes.
///
/// # Errors
/// If the CSV writer refuses a record.
pub fn break_points_csv(
    axes: &[String],
    method: &str,
    brackets: &[BreakBracket],
) -> Result<String, CsvError> {
    let mut columns: Vec<&str> = axes.iter().skip(1).map(String::as_str).collect();
    columns.extend([
        "method",
        "axis",
        "not_broken_at",
        "broken_at",
        "coefficients_per_unit_not_broken",
        "coefficients_per_unit_broken",
    ]);
    let end = |value: Option<f64>| value.map_or_else(String::new, |value| value.to_string());
    let rows = brackets
        .iter()
        .map(|bracket| {
            let mut row: Vec<String> = bracket
                .others
                .iter()
                .map(|value| match value {
                    toml::Value::String(word) => word.clone(),
                    other => other.to_string(),
                })
                .collect();
            row.extend([
                method.to_owned(),
                axes.first().cloned().unwrap_or_default(),
                end(bracket.from),
                end(bracket.to),
                end(bracket.ratios.0),
                end(bracket.ratios.1),
            ]);
            row
        })
        .collect();
    write("break-points.csv", &columns, rows)
}
