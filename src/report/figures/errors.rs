//! Histograms of the error and of the studentised error, one row per method.

use std::fmt::Write as _;

use super::canvas::{self, Anchor, Canvas, LARGE, NORMAL, PAGE_WIDTH, SMALL, Type};
use super::histogram::{ErrorHistogram, NORMAL_PEAK, Range, TAIL, common_range, studentised_range};
use super::palette::{ACCENT, BAR, FAINT, INK, Mark, SOFT};
use super::placement::{fold, real, text_width};
use super::scale::{Scale, ticks};
use super::{Figure, slug};
use crate::report::Scored;
use crate::report::number::{decimals, doubt, fixed, short};
use crate::score::{Measure, MeasureValue};

const MARGIN: f64 = 14.0;
const LABEL_WIDTH: f64 = 172.0;
const RAW: (f64, f64) = (196.0, 482.0);
const STUDENTISED: (f64, f64) = (512.0, 772.0);
const NOTES: f64 = 784.0;
const ROW: f64 = 80.0;
const PLOT: f64 = 60.0;
/// Room below the last row for ticks and axis titles.
const FOOT: f64 = 52.0;

/// Bars narrower than this many pixels are joined.
const NARROWEST_BAR: f64 = 4.0;

/// The histograms of one method.
#[derive(Debug, Clone, PartialEq)]
pub struct ErrorRow {
    /// Method index.
    pub method: usize,
    /// Estimate minus true value.
    pub raw: ErrorHistogram,
    /// Error over the standard error that the method claims.
    pub studentised: ErrorHistogram,
}

/// The error histograms of every method for one estimand under one truth.
///
/// Left, the error on a scale common to all methods; right, the studentised error with the
/// standard normal density over it. Each histogram has its own height.
#[must_use]
pub fn error_figure(scored: &Scored, truth: usize, estimand: usize, rows: &[ErrorRow]) -> Figure {
    let names = (&scored.truths[truth], &scored.estimands[estimand]);
    let name = format!(
        "errors-{}-{}-{}-{}",
        truth + 1,
        slug(names.0),
        estimand + 1,
        slug(names.1)
    );
    let name = name.replace("--", "-").trim_end_matches('-').to_owned();
    let title = format!("Error of each method: {}, truth {}", names.1, names.0);
    let notes: Vec<Notes> = rows
        .iter()
        .map(|row| Notes::of(scored, truth, estimand, row))
        .collect();
    let description = describe(&notes);
    let heading = fold(&title, LARGE, PAGE_WIDTH - 2.0 * MARGIN - 20.0, 2);
    let top = 30.0 + 20.0 * real(heading.len());
    let bottom = top + 24.0 + ROW * real(rows.len());
    let svg = canvas::draw(&name, &title, &description, bottom + FOOT, |canvas| {
        for (line, text) in heading.iter().enumerate() {
            let at = (MARGIN, 20.0 + 20.0 * real(line));
            canvas.text(text, at, Type::of(LARGE).bold());
        }
        paint(canvas, rows, &notes, top, bottom);
    });
    Figure {
        name,
        title,
        description,
        svg,
    }
}

/// Texts beside the histograms of one method.
struct Notes {
    label: String,
    /// The bias: the mean of the error.
    mean: Option<f64>,
    bias: String,
    coverage: Vec<String>,
}

impl Notes {
    fn of(scored: &Scored, truth: usize, estimand: usize, row: &ErrorRow) -> Self {
        let cell = scored
            .measures
            .iter()
            .find(|measures| measures.truth == truth)
            .and_then(|m| {
                m.cells
                    .iter()
                    .find(|cell| cell.estimand == estimand && cell.method == row.method)
            });
        let get = |measure| cell.and_then(|cell| cell.get(measure));
        let told = |value: &MeasureValue, scale: f64| {
            let places = decimals(std::iter::once(scale * value.mcse), 1);
            (
                fixed(scale * value.value, places),
                doubt(value, scale, places).unwrap_or_default(),
            )
        };
        let bias = get(Measure::Bias).map_or_else(String::new, |value| {
            let (value, error) = told(value, 1.0);
            format!("bias {value} {error}").trim_end().to_owned()
        });
        let coverage = get(Measure::Coverage).map_or_else(Vec::new, |value| {
            let (value, error) = told(value, 100.0);
            vec![
                "coverage".to_owned(),
                format!("{value} % {error}").trim_end().to_owned(),
            ]
        });
        Self {
            label: scored.methods[row.method].clone(),
            mean: get(Measure::Bias)
                .map(|value| value.value)
                .filter(|mean| mean.is_finite()),
            bias,
            coverage,
        }
    }
}

fn describe(notes: &[Notes]) -> String {
    let mut text = "Small histograms, one row per method. Left: estimate minus true value, with the \
                    mean marked against zero. Right: the error over the claimed standard error, with \
                    the standard normal curve."
        .to_owned();
    for note in notes {
        let _ = write!(
            text,
            " {}: {}; {}.",
            note.label,
            note.bias,
            note.coverage.join(" ")
        );
    }
    text
}

fn paint(canvas: &mut Canvas<'_>, rows: &[ErrorRow], notes: &[Notes], top: f64, bottom: f64) {
    let raw = common_range(&spans(rows, |row| &row.raw));
    let studentised = studentised_range(&spans(rows, |row| &row.studentised));
    let columns = [
        (RAW, raw, "Error", "estimate minus true value"),
        (
            STUDENTISED,
            studentised,
            "Studentised error",
            "error over claimed standard error",
        ),
    ];
    for ((from, to), (low, high), heading, axis) in columns {
        let scale = Scale::linear(low, high, from, to);
        canvas.text(heading, (from, top + 6.0), Type::of(NORMAL).bold());
        let tick_texts = ticks(low, high, 7);
        for (value, text) in thinned(&tick_texts, &scale) {
            let x = scale.at(value);
            canvas.line((x, top + 20.0), (x, bottom), FAINT, 1.0);
            canvas.text(
                &text,
                (x, bottom + 12.0),
                Type::of(SMALL).anchor(Anchor::Middle),
            );
        }
        let middle = f64::midpoint(from, to);
        let kind = Type::of(SMALL).anchor(Anchor::Middle).colour(SOFT);
        canvas.text(axis, (middle, bottom + 32.0), kind);
    }
    let after = STUDENTISED.0 + text_width("Studentised error", NORMAL) + 16.0;
    canvas.curve(
        &[(after, top + 6.0), (after + 22.0, top + 6.0)],
        INK,
        1.6,
        &[5.0, 3.0],
    );
    canvas.text(
        "standard normal",
        (after + 27.0, top + 6.0),
        Type::of(SMALL).colour(SOFT),
    );
    let after = RAW.0 + text_width("Error", NORMAL) + 16.0;
    canvas.mark((after + 4.0, top + 6.0), Mark::Triangle, ACCENT, 5.0);
    canvas.text(
        "mean",
        (after + 14.0, top + 6.0),
        Type::of(SMALL).colour(SOFT),
    );
    canvas.line((after + 64.0, top), (after + 64.0, top + 12.0), INK, 1.4);
    canvas.text(
        "zero",
        (after + 71.0, top + 6.0),
        Type::of(SMALL).colour(SOFT),
    );
    for (place, (row, notes)) in rows.iter().zip(notes).enumerate() {
        let base = top + 24.0 + ROW * real(place) + ROW - 14.0;
        paint_row(canvas, row, notes, base, (raw, studentised));
    }
}

fn spans(rows: &[ErrorRow], of: fn(&ErrorRow) -> &ErrorHistogram) -> Vec<Range> {
    rows.iter().filter_map(|row| of(row).span()).collect()
}

fn paint_row(
    canvas: &mut Canvas<'_>,
    row: &ErrorRow,
    notes: &Notes,
    base: f64,
    (raw, studentised): (Range, Range),
) {
    let mut left = fold(&notes.label, NORMAL, LABEL_WIDTH, 2);
    let label_lines = left.len();
    left.push(notes.bias.clone());
    left.extend(beyond_text(&row.raw, raw));
    let mut y = base - PLOT + 8.0;
    for (line, text) in left.iter().enumerate() {
        let kind = if line < label_lines {
            Type::of(NORMAL)
        } else {
            Type::of(SMALL).colour(SOFT)
        };
        canvas.text(text, (MARGIN, y), kind);
        y += 15.5;
    }
    let mut right = notes.coverage.clone();
    right.extend(beyond_text(&row.studentised, studentised));
    for (line, text) in right.iter().enumerate() {
        let kind = if line == 1 {
            Type::of(NORMAL)
        } else {
            Type::of(SMALL).colour(SOFT)
        };
        canvas.text(text, (NOTES, base - PLOT + 14.0 + 16.0 * real(line)), kind);
    }
    // Error: bars, zero line, mean.
    let scale = Scale::linear(raw.0, raw.1, RAW.0, RAW.1);
    histogram(canvas, &row.raw, raw, RAW, base, 0.0);
    let zero = scale.at(0.0);
    canvas.line((zero, base - PLOT), (zero, base), INK, 1.4);
    if let Some(mean) = notes.mean {
        let x = scale.within(mean);
        canvas.curve(&[(x, base - PLOT), (x, base)], ACCENT, 1.4, &[4.0, 3.0]);
        canvas.mark((x, base + 6.0), Mark::Triangle, ACCENT, 5.0);
    }
    // Studentised error: bars under the normal curve.
    let highest = histogram(
        canvas,
        &row.studentised,
        studentised,
        STUDENTISED,
        base,
        NORMAL_PEAK,
    );
    let scale = Scale::linear(studentised.0, studentised.1, STUDENTISED.0, STUDENTISED.1);
    let curve: Vec<(f64, f64)> = (0..=120_u32)
        .map(|k| {
            let z = studentised.0 + (studentised.1 - studentised.0) * f64::from(k) / 120.0;
            let density = NORMAL_PEAK * (-0.5 * z * z).exp();
            (scale.at(z), base - PLOT * density / highest)
        })
        .collect();
    canvas.curve(&curve, INK, 1.6, &[5.0, 3.0]);
}

/// Draws bars on a base line; returns the density that reaches the top of the plot, which is at
/// least `least`.
fn histogram(
    canvas: &mut Canvas<'_>,
    histogram: &ErrorHistogram,
    (low, high): Range,
    (from, to): Range,
    base: f64,
    least: f64,
) -> f64 {
    let scale = Scale::linear(low, high, from, to);
    let bars = histogram.bars(low, high, NARROWEST_BAR * (high - low) / (to - from));
    let highest = bars.iter().map(|bar| bar.2).fold(least, f64::max);
    let highest = if highest > 0.0 { 1.04 * highest } else { 1.0 };
    let mut outline = Vec::with_capacity(4 * bars.len());
    for &(left, right, density) in &bars {
        let y = base - PLOT * density / highest;
        let (left, right) = (scale.at(left), scale.at(right));
        outline.extend([(left, base), (left, y), (right, y), (right, base)]);
    }
    if !outline.is_empty() {
        canvas.area(&outline, BAR, 1.0);
    }
    canvas.line((from, base), (to, base), SOFT, 1.0);
    highest
}

fn beyond_text(histogram: &ErrorHistogram, (low, high): Range) -> Option<String> {
    let share = histogram.beyond(low, high);
    // Shares below the tails that any scale leaves out are not worth a line.
    (share > 2.0 * TAIL).then(|| format!("{} % beyond", short((1000.0 * share).round() / 10.0)))
}

/// Ticks whose texts do not run into each other.
fn thinned(all: &[(f64, String)], scale: &Scale) -> Vec<(f64, String)> {
    let mut kept = Vec::new();
    let mut free = f64::NEG_INFINITY;
    for (value, text) in all {
        let half = text_width(text, SMALL) / 2.0;
        if scale.at(*value) - half > free {
            free = scale.at(*value) + half + 6.0;
            kept.push((*value, text.clone()));
        }
    }
    kept
}

#[cfg(test)]
mod tests {
    use super::super::canvas::{assert_on_page, assert_well_formed};
    use super::super::histogram::normal;
    use super::*;
    use crate::report::fixtures;

    fn rows(methods: usize) -> Vec<ErrorRow> {
        (0..methods)
            .map(|method| {
                let step = f64::from(u8::try_from(method).unwrap());
                let sd = if method == 1 {
                    0.2
                } else {
                    0.065 + 0.005 * step
                };
                ErrorRow {
                    method,
                    raw: normal(0.01 * step - 0.03, sd, -1.0, 1.0),
                    studentised: normal(0.2 * step - 0.5, 1.0 + 0.15 * step, -8.0, 8.0),
                }
            })
            .collect()
    }

    #[test]
    fn the_figure_is_whole_and_on_its_page() {
        for methods in [1, 2, 9] {
            let scored = fixtures::scored(methods);
            let figure = error_figure(&scored, 1, 0, &rows(methods));
            assert_well_formed(&figure.svg);
            assert_on_page(&figure.svg);
            assert_eq!(
                figure.name,
                "errors-2-worthwhile-effect-strong-drift-1-elevation-effect"
            );
            assert_eq!(figure.svg.matches("<polygon").count(), 3 * methods + 1);
            assert_eq!(figure.svg, error_figure(&scored, 1, 0, &rows(methods)).svg);
            assert!(figure.description.contains("least-squares: bias -0.0123"));
        }
    }

    #[test]
    fn empty_and_single_bin_histograms_do_no_harm() {
        let scored = fixtures::scored(2);
        let one = ErrorHistogram {
            edges: vec![-0.1, 0.1],
            counts: vec![5.0],
        };
        let nothing = ErrorHistogram::default();
        let infinite = ErrorHistogram {
            edges: vec![f64::NEG_INFINITY, -1.0, 1.0, f64::INFINITY],
            counts: vec![50.0, 0.0, 50.0],
        };
        for raw in [one, nothing, infinite] {
            let row = |method| ErrorRow {
                method,
                raw: raw.clone(),
                studentised: raw.clone(),
            };
            let figure = error_figure(&scored, 0, 0, &[row(0), row(1)]);
            assert_well_formed(&figure.svg);
            assert!(!figure.svg.contains("NaN"));
        }
    }

    #[test]
    fn one_very_wide_method_does_not_squash_the_others() {
        let mut wide = rows(3);
        wide[1].raw = normal(0.0, 20.0, -100.0, 100.0);
        let (low, high) = common_range(&spans(&wide, |row| &row.raw));
        let figure = error_figure(&fixtures::scored(3), 0, 1, &wide);
        assert_well_formed(&figure.svg);
        assert_on_page(&figure.svg);
        assert!(high - low < 1.0, "{low} {high}");
        assert!(beyond_text(&wide[1].raw, (low, high)).is_some());
    }
}
