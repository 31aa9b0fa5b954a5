//! Plain-text tables that fit a terminal.

use super::number;
use super::text::{clean, dimmed, display_width, pad, push_line, wrap};

/// Narrowest width that a table is laid out for.
pub(super) const NARROWEST: usize = 60;

/// Blank columns between two table columns.
const GAP: usize = 2;

/// A label column narrower than this is not squeezed further; the columns are split instead.
const LABEL_FLOOR: usize = 18;

/// Lines that a label may take before it is cut with an ellipsis.
const LABEL_LINES: usize = 3;

/// Alignment of a column.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Align {
    /// Text.
    Left,
    /// Numbers.
    Right,
}

/// Heading and alignment of a column.
#[derive(Debug, Clone)]
pub struct Column {
    /// Heading; `\n` separates its lines.
    pub heading: String,
    /// Alignment of heading and cells.
    pub align: Align,
}

/// One cell: a value and, beside or below it, its error.
#[derive(Debug, Clone, Default)]
pub struct Cell {
    /// The value.
    pub value: String,
    /// The error, sign included, such as `±0.4`.
    pub error: Option<String>,
}

impl Cell {
    /// A cell without error.
    #[must_use]
    pub fn plain(value: impl Into<String>) -> Self {
        Self {
            value: value.into(),
            error: None,
        }
    }
}

/// A table whose first column labels the rows.
///
/// Errors stand beside their values where the width allows it and below them where it does not;
/// if even that is too wide, the columns are split into several tables that repeat the labels.
#[derive(Debug, Clone, Default)]
pub struct TextTable {
    columns: Vec<Column>,
    rows: Vec<(String, Vec<Cell>)>,
    label_heading: String,
}

/// Widths of one column: its values, its errors, its heading.
#[derive(Clone, Copy)]
struct Extent {
    value: usize,
    error: usize,
    heading: usize,
}

impl Extent {
    fn beside(self) -> usize {
        let error = if self.error == 0 { 0 } else { self.error + 1 };
        self.heading.max(self.value + error)
    }

    fn below(self) -> usize {
        self.heading.max(self.value).max(self.error)
    }
}

impl TextTable {
    /// An empty table. `label_heading` stands over the row labels.
    #[must_use]
    pub fn new(label_heading: impl Into<String>, columns: Vec<Column>) -> Self {
        Self {
            columns,
            rows: Vec::new(),
            label_heading: label_heading.into(),
        }
    }

    /// Adds a row; missing cells are blank.
    pub fn push(&mut self, label: impl Into<String>, mut cells: Vec<Cell>) {
        cells.resize(self.columns.len(), Cell::default());
        self.rows.push((clean(&label.into()), cells));
    }

    /// Lays the table out in at most `width` columns (at least 60). With `ansi`, headings are
    /// bold and errors below their values are dim; nothing depends on it.
    #[must_use]
    pub fn render(&self, width: usize, ansi: bool) -> String {
        let width = width.max(NARROWEST);
        let extents: Vec<Extent> = (0..self.columns.len()).map(|c| self.extent(c)).collect();
        let label = self
            .rows
            .iter()
            .map(|(label, _)| display_width(label))
            .chain([display_width(&self.label_heading)])
            .max()
            .unwrap_or(0);
        let floor = label.min(LABEL_FLOOR);
        let total = |of: fn(Extent) -> usize| extents.iter().map(|&e| of(e) + GAP).sum::<usize>();
        let all: Vec<usize> = (0..self.columns.len()).collect();
        let beside = total(Extent::beside);
        if floor + beside <= width {
            return self.draw(&all, &extents, label.min(width - beside), true, ansi);
        }
        let below = total(Extent::below);
        if floor + below <= width {
            return self.draw(&all, &extents, label.min(width - below), false, ansi);
        }
        let parts = split(&extents, width - floor);
        let widest = parts
            .iter()
            .map(|part| {
                part.iter()
                    .map(|&c| extents[c].below() + GAP)
                    .sum::<usize>()
            })
            .max()
            .unwrap_or(0);
        let label = label.min(width.saturating_sub(widest).max(1));
        let drawn: Vec<String> = parts
            .iter()
            .map(|part| self.draw(part, &extents, label, false, ansi))
            .collect();
        drawn.join("\n")
    }

    fn extent(&self, column: usize) -> Extent {
        let widest = |texts: &mut dyn Iterator<Item = &str>| texts.map(display_width).max();
        let mut values = self
            .rows
            .iter()
            .map(|(_, cells)| cells[column].value.as_str());
        let mut errors = self
            .rows
            .iter()
            .filter_map(|(_, cells)| cells[column].error.as_deref());
        Extent {
            value: widest(&mut values).unwrap_or(0),
            error: widest(&mut errors).unwrap_or(0),
            heading: widest(&mut self.columns[column].heading.split('\n')).unwrap_or(0),
        }
    }

    fn draw(
        &self,
        columns: &[usize],
        extents: &[Extent],
        label: usize,
        beside: bool,
        ansi: bool,
    ) -> String {
        let width_of = |c: usize| {
            if beside {
                extents[c].beside()
            } else {
                extents[c].below()
            }
        };
        let headings: Vec<Vec<&str>> = columns
            .iter()
            .map(|&c| self.columns[c].heading.split('\n').collect())
            .collect();
        let height = headings.iter().map(Vec::len).max().unwrap_or(1);
        let rule = "─".repeat(label + columns.iter().map(|&c| width_of(c) + GAP).sum::<usize>());
        let mut text = String::new();
        for line in 0..height {
            let mut out = pad(
                if line + 1 == height {
                    &self.label_heading
                } else {
                    ""
                },
                label,
                Align::Left,
            );
            for (&c, heading) in columns.iter().zip(&headings) {
                // Headings sit on the rule: short ones start lower.
                let part = (line + heading.len())
                    .checked_sub(height)
                    .map_or("", |l| heading[l]);
                out.push_str(&" ".repeat(GAP));
                out.push_str(&pad(part, width_of(c), self.columns[c].align));
            }
            push_line(&mut text, &out, ansi.then_some("1"));
        }
        push_line(&mut text, &rule, None);
        for (name, cells) in &self.rows {
            let names = wrap(name, label, LABEL_LINES);
            let errors = !beside && columns.iter().any(|&c| cells[c].error.is_some());
            for line in 0..names.len().max(1 + usize::from(errors)) {
                let mut out = pad(
                    names.get(line).map_or("", String::as_str),
                    label,
                    Align::Left,
                );
                for &c in columns {
                    let cell = &cells[c];
                    let part = match (line, beside) {
                        (0, true) => side_by_side(cell, extents[c]),
                        (0, false) => cell.value.clone(),
                        (1, false) => {
                            let error = cell.error.clone().unwrap_or_default();
                            let padded = pad(&error, width_of(c), self.columns[c].align);
                            out.push_str(&" ".repeat(GAP));
                            out.push_str(&if ansi { dimmed(&padded) } else { padded });
                            continue;
                        }
                        _ => String::new(),
                    };
                    out.push_str(&" ".repeat(GAP));
                    out.push_str(&pad(&part, width_of(c), self.columns[c].align));
                }
                push_line(&mut text, &out, None);
            }
        }
        text
    }
}

fn side_by_side(cell: &Cell, extent: Extent) -> String {
    if extent.error == 0 {
        return cell.value.clone();
    }
    let error = pad(
        cell.error.as_deref().unwrap_or(""),
        extent.error,
        Align::Left,
    );
    format!("{} {error}", cell.value)
}

/// Greedy parts of consecutive columns, each at most `room` wide.
fn split(extents: &[Extent], room: usize) -> Vec<Vec<usize>> {
    let mut parts: Vec<Vec<usize>> = Vec::new();
    let mut used = usize::MAX;
    for (column, extent) in extents.iter().enumerate() {
        let needed = extent.below() + GAP;
        match parts.last_mut() {
            Some(part) if used.saturating_add(needed) <= room => {
                part.push(column);
                used += needed;
            }
            _ => {
                parts.push(vec![column]);
                used = needed;
            }
        }
    }
    parts
}

/// The cell of a value with its error, both multiplied by `scale`.
pub(super) fn measure_cell(
    value: Option<&crate::score::MeasureValue>,
    scale: f64,
    decimals: usize,
) -> Cell {
    value.map_or_else(
        || Cell::plain("-"),
        |value| Cell {
            value: number::fixed(scale * value.value, decimals),
            error: number::doubt(value, scale, decimals),
        },
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    fn table(columns: usize) -> TextTable {
        let heading = |c: usize| Column {
            heading: format!("measure\nno. {c}"),
            align: Align::Right,
        };
        let mut table = TextTable::new("method", (0..columns).map(heading).collect());
        for label in [
            "plain",
            "a rather long label that nobody would want to read in full twice",
        ] {
            let cell = Cell {
                value: "0.123".into(),
                error: Some("±0.004".into()),
            };
            table.push(label, vec![cell; columns]);
        }
        table
    }

    fn widest(text: &str) -> usize {
        text.lines().map(display_width).max().unwrap()
    }

    #[test]
    fn errors_stand_beside_when_there_is_room_and_below_when_not() {
        let wide = table(4).render(100, false);
        assert!(wide.contains("0.123 ±0.004"), "{wide}");
        let narrow = table(8).render(100, false);
        assert!(!narrow.contains("0.123 ±"), "{narrow}");
        assert!(narrow.contains("±0.004   ±0.004"), "{narrow}");
    }

    #[test]
    fn no_width_is_exceeded_and_no_cell_is_lost() {
        for columns in [1, 3, 8, 14] {
            for width in [10, 60, 73, 100, 160] {
                let text = table(columns).render(width, false);
                assert!(widest(&text) <= width.max(60), "{columns} {width}\n{text}");
                assert_eq!(text.matches("0.123").count(), 2 * columns);
                assert_eq!(text.matches("±0.004").count(), 2 * columns);
                for c in 0..columns {
                    assert!(text.contains(&format!("no. {c}")));
                }
            }
        }
    }

    #[test]
    fn ansi_adds_nothing_but_style() {
        let plain = table(8).render(100, false);
        let styled = table(8).render(100, true);
        let stripped = styled
            .replace("\u{1b}[1m", "")
            .replace("\u{1b}[2m", "")
            .replace("\u{1b}[0m", "");
        let trimmed: Vec<&str> = stripped.lines().map(str::trim_end).collect();
        assert_ne!(plain, styled);
        assert_eq!(plain.lines().collect::<Vec<_>>(), trimmed);
    }
}
