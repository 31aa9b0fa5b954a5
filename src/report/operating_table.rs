//! Terminal table of the operating characteristics: properties of the design itself.

use super::table::Look;
use super::text::{bold, clean, wrap};
use super::text_table::{Align, Cell, Column, TextTable};
use super::{Scored, number};
use crate::score::OperatingValue;

/// Widest line of a truth's name in a heading.
const HEADING_WIDTH: usize = 14;

/// Decimals of a row in which no value has a Monte Carlo error.
const PLAIN_DECIMALS: usize = 2;

/// One table: a row per characteristic, a column per truth. Empty when there are none.
#[must_use]
pub fn operating_tables(scored: &Scored, look: Look) -> String {
    // Rows in order of first appearance over the truths.
    let mut keys: Vec<(&str, &str)> = Vec::new();
    for value in scored
        .measures
        .iter()
        .flat_map(|measures| &measures.operating)
    {
        let key = (value.characteristic.as_str(), value.subject.as_str());
        if !keys.contains(&key) {
            keys.push(key);
        }
    }
    if keys.is_empty() {
        return String::new();
    }
    let columns = scored
        .measures
        .iter()
        .map(|measures| Column {
            heading: wrap(&clean(&scored.truths[measures.truth]), HEADING_WIDTH, 4).join("\n"),
            align: Align::Right,
        })
        .collect();
    let mut table = TextTable::new("characteristic", columns);
    for (characteristic, subject) in keys {
        let values: Vec<Option<&OperatingValue>> = scored
            .measures
            .iter()
            .map(|measures| {
                measures.operating.iter().find(|value| {
                    (value.characteristic.as_str(), value.subject.as_str())
                        == (characteristic, subject)
                })
            })
            .collect();
        let errors = values.iter().flatten().map(|value| value.mcse);
        let decimals = number::decimals(errors, PLAIN_DECIMALS);
        let label = if subject.is_empty() {
            characteristic.to_owned()
        } else {
            format!("{characteristic}: {subject}")
        };
        let cells = values.iter().map(|value| cell(*value, decimals)).collect();
        table.push(label, cells);
    }
    let title = bold("Operating characteristics of the design.", look.ansi);
    format!("{title}\n\n{}", table.render(look.width, look.ansi))
}

fn cell(value: Option<&OperatingValue>, decimals: usize) -> Cell {
    value.map_or_else(
        || Cell::plain("-"),
        |value| Cell {
            value: number::fixed(value.value, decimals),
            error: (value.mcse > 0.0).then(|| format!("±{}", number::fixed(value.mcse, decimals))),
        },
    )
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::fixtures;

    #[test]
    fn each_characteristic_has_a_row_and_each_truth_a_column() {
        let text = operating_tables(&fixtures::scored(2), Look::default());
        let share = text
            .lines()
            .find(|line| line.starts_with("arm-share: early"))
            .unwrap();
        assert_eq!(share.matches('±').count(), 2, "{text}");
        // The number of units never varies in the fixture: no error is shown.
        let units = text.lines().find(|line| line.starts_with("units")).unwrap();
        assert!(!units.contains('±') && units.contains("240"), "{text}");
    }

    #[test]
    fn nothing_scored_draws_nothing() {
        let mut scored = fixtures::scored(2);
        for measures in &mut scored.measures {
            measures.operating.clear();
        }
        assert!(operating_tables(&scored, Look::default()).is_empty());
    }
}
