//! Terminal tables of the measures: one block per truth × estimand.

use super::number;
use super::scored::cells_of;
use super::text::{bold, clean, paragraph};
use super::text_table::{Align, Column, TextTable, measure_cell};
use super::{Scored, operating_tables, verdict_tables};
use crate::score::{CellMeasures, Measure, TruthMeasures};

/// Decimals of a column in which no value has a Monte Carlo error.
const PLAIN_DECIMALS: usize = 3;

/// How tables are laid out.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Look {
    /// Terminal columns to fit; fewer than 60 are taken as 60.
    pub width: usize,
    /// Whether headings may be bold and errors dim.
    pub ansi: bool,
}

impl Default for Look {
    /// 100 columns of plain text.
    fn default() -> Self {
        Self {
            width: 100,
            ansi: false,
        }
    }
}

/// A column of the block: heading, measure, factor.
struct Shown {
    heading: &'static str,
    measure: Measure,
    scale: f64,
}

const BEFORE_TEST: [Shown; 7] = [
    Shown {
        heading: "bias",
        measure: Measure::Bias,
        scale: 1.0,
    },
    Shown {
        heading: "SE\nratio",
        measure: Measure::SeRatio,
        scale: 1.0,
    },
    Shown {
        heading: "coverage\n%",
        measure: Measure::Coverage,
        scale: 100.0,
    },
    Shown {
        heading: "misses\nbelow %",
        measure: Measure::MissesBelow,
        scale: 100.0,
    },
    Shown {
        heading: "misses\nabove %",
        measure: Measure::MissesAbove,
        scale: 100.0,
    },
    Shown {
        heading: "mean\nwidth",
        measure: Measure::MeanWidth,
        scale: 1.0,
    },
    Shown {
        heading: "price",
        measure: Measure::Price,
        scale: 1.0,
    },
];

/// Everything that a replay prints: measures, verdicts, operating characteristics.
#[must_use]
pub fn replay_tables(scored: &Scored, look: Look) -> String {
    let parts = [
        measure_tables(scored, look),
        verdict_tables(scored, look),
        operating_tables(scored, look),
    ];
    parts
        .into_iter()
        .filter(|part| !part.is_empty())
        .collect::<Vec<_>>()
        .join("\n")
}

/// One block per truth × estimand: a row per method, a column per measure, Monte Carlo standard
/// errors beside or below the values, and the reasons of missing answers.
#[must_use]
pub fn measure_tables(scored: &Scored, look: Look) -> String {
    let mut blocks = Vec::new();
    for measures in &scored.measures {
        for estimand in 0..scored.estimands.len() {
            blocks.push(block(scored, measures, estimand, look));
        }
    }
    blocks.join("\n")
}

fn block(scored: &Scored, measures: &TruthMeasures, estimand: usize, look: Look) -> String {
    let truth = measures.truth;
    let null_holds = scored.null_holds(truth, estimand);
    let title = format!(
        "Truth: {}. Estimand: {}.",
        scored.truths[truth], scored.estimands[estimand]
    );
    let facts = format!(
        "True value {}, null value {}, {} intervals, {} trials; ± is one Monte Carlo standard error.",
        number::short(scored.true_values[truth][estimand]),
        number::short(scored.nulls[estimand]),
        number::per_cent(scored.level),
        number::grouped(measures.trials),
    );
    let cells = cells_of(measures, estimand);
    let facts = if all_answered(&cells) {
        format!("{facts} Every method answered in every trial.")
    } else {
        facts
    };
    let mut text = String::new();
    for line in paragraph(&title, look.width).lines() {
        text.push_str(&bold(line, look.ansi));
        text.push('\n');
    }
    text.push_str(&paragraph(&facts, look.width));
    text.push('\n');
    text.push_str(&table(scored, &cells, null_holds).render(look.width, look.ansi));
    text.push_str(&reasons(scored, measures.trials, &cells, look));
    text
}

fn all_answered(cells: &[&CellMeasures]) -> bool {
    cells.iter().all(|cell| cell.failures.is_empty())
}

fn table(scored: &Scored, cells: &[&CellMeasures], null_holds: bool) -> TextTable {
    let test = Shown {
        heading: if null_holds { "type I\n%" } else { "power\n%" },
        measure: Measure::RejectionTwoSided,
        scale: 100.0,
    };
    let missing = Shown {
        heading: "no\nanswer %",
        measure: Measure::NoAnswer,
        scale: 100.0,
    };
    let shown: Vec<&Shown> = BEFORE_TEST
        .iter()
        .chain([&test])
        .chain((!all_answered(cells)).then_some(&missing))
        .collect();
    let columns = shown
        .iter()
        .map(|shown| Column {
            heading: shown.heading.to_owned(),
            align: Align::Right,
        })
        .collect();
    let decimals: Vec<usize> = shown
        .iter()
        .map(|shown| {
            let errors = cells.iter().filter_map(|cell| cell.get(shown.measure));
            // Per cent of trials need one decimal at most when every trial agreed.
            let fallback = if shown.scale > 1.0 { 1 } else { PLAIN_DECIMALS };
            number::decimals(errors.map(|value| shown.scale * value.mcse), fallback)
        })
        .collect();
    let mut table = TextTable::new("method", columns);
    for cell in cells {
        let row = shown
            .iter()
            .zip(&decimals)
            .map(|(shown, &decimals)| measure_cell(cell.get(shown.measure), shown.scale, decimals))
            .collect();
        table.push(scored.methods[cell.method].as_str(), row);
    }
    table
}

/// One sentence per method that failed to answer: how often and why.
fn reasons(scored: &Scored, trials: u64, cells: &[&CellMeasures], look: Look) -> String {
    let mut text = String::new();
    for cell in cells.iter().filter(|cell| !cell.failures.is_empty()) {
        let parts: Vec<String> = cell
            .failures
            .iter()
            .map(|(reason, count)| format!("{} trials: {reason}", number::grouped(*count)))
            .collect();
        let sentence = format!(
            "No answer from {} in {} of {} trials ({}). They count as misses.",
            clean(&scored.methods[cell.method]),
            number::grouped(cell.failures.iter().map(|(_, count)| count).sum()),
            number::grouped(trials),
            parts.join("; "),
        );
        text.push_str(&paragraph(&sentence, look.width));
    }
    text
}

#[cfg(test)]
mod tests {
    use super::super::text::display_width;
    use super::*;
    use crate::report::fixtures;

    #[test]
    fn every_block_fits_the_width() {
        for methods in [2, 9] {
            let scored = fixtures::scored(methods);
            for width in [20, 60, 80, 100, 200] {
                let text = replay_tables(&scored, Look { width, ansi: false });
                for line in text.lines() {
                    assert!(display_width(line) <= width.max(60), "{width}: {line}");
                }
            }
        }
    }

    #[test]
    fn values_stand_with_their_errors() {
        let text = measure_tables(&fixtures::scored(2), Look::default());
        // Invented coverage 0.931 with error 0.0025 in the fixture: shown in per cent.
        assert!(text.contains("93.1"), "{text}");
        assert!(text.contains("±0.3"), "{text}");
        assert!(text.contains("type I"), "{text}");
        assert!(text.contains("power"), "{text}");
        assert_eq!(
            text.matches("Truth: ").count(),
            4,
            "two truths × two estimands\n{text}"
        );
    }

    #[test]
    fn missing_answers_are_told_with_their_reason() {
        let text = measure_tables(&fixtures::scored(2), Look::default());
        assert!(text.contains("No answer from"), "{text}");
        assert!(text.contains("a batch enrolled nobody"), "{text}");
    }

    #[test]
    fn an_absent_measure_is_a_dash() {
        let mut scored = fixtures::scored(2);
        for cell in &mut scored.measures[0].cells {
            cell.values.retain(|value| value.measure != Measure::Price);
        }
        let text = measure_tables(
            &scored,
            Look {
                width: 200,
                ansi: false,
            },
        );
        let row = text
            .lines()
            .find(|line| line.starts_with("least-squares"))
            .unwrap();
        assert!(row.contains(" - "), "{row}");
    }
}
