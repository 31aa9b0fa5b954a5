//! Coverage by method: a dot with its Monte Carlo interval, one panel per truth.

use std::fmt::Write as _;

use super::canvas::{self, Anchor, Canvas, LARGE, NORMAL, PAGE_WIDTH, SMALL, Type};
use super::palette::{ACCENT, BAND, FAINT, INK, Mark, SOFT};
use super::placement::{fold, real, text_width};
use super::scale::{Scale, ticks};
use super::{Figure, slug};
use crate::report::Scored;
use crate::report::number::{decimals, fixed, per_cent};
use crate::report::scored::cells_of;
use crate::score::{Measure, MeasureValue};

const MARGIN: f64 = 14.0;
const LABEL_WIDTH: f64 = 186.0;
const ROW: f64 = 32.0;
/// Panels side by side.
const ACROSS: usize = 3;
/// Room between panels, and for the number at a panel's right edge.
const GAP: f64 = 18.0;
const NUMBER: f64 = 46.0;
/// Room above the rows of a panel (name, level) and below (ticks, axis title).
const HEAD: f64 = 58.0;
const FOOT: f64 = 52.0;
/// Marks keep this distance from the ends of the scale.
const INSET: f64 = 7.0;

/// Two-sided 95 % normal quantile, for intervals of measures without exact limits.
const NORMAL_95: f64 = 1.959_963_984_540_054;

/// Coverage of every method for one estimand, one panel per truth.
#[must_use]
pub fn coverage_figure(scored: &Scored, estimand: usize) -> Figure {
    let estimand_name = &scored.estimands[estimand];
    let name = format!("coverage-{}-{}", estimand + 1, slug(estimand_name));
    let name = name.trim_end_matches('-').to_owned();
    let title = format!("Coverage by method: {estimand_name}");
    let panels: Vec<Panel> = scored
        .measures
        .iter()
        .map(|measures| Panel {
            truth: scored.truths[measures.truth].clone(),
            dots: cells_of(measures, estimand)
                .into_iter()
                .filter_map(|cell| {
                    let value = cell.get(Measure::Coverage)?;
                    let (lower, upper) = interval(value);
                    let label = scored.methods[cell.method].clone();
                    Some(Dot {
                        label,
                        value: value.value,
                        mcse: value.mcse,
                        lower,
                        upper,
                    })
                })
                .collect(),
        })
        .collect();
    let description = describe(scored, &panels);
    let page = Page::of(scored, &title, &panels);
    let svg = canvas::draw(&name, &title, &description, page.height, |canvas| {
        page.paint(canvas);
    });
    Figure {
        name,
        title,
        description,
        svg,
    }
}

struct Panel {
    truth: String,
    dots: Vec<Dot>,
}

struct Dot {
    label: String,
    value: f64,
    mcse: f64,
    lower: f64,
    upper: f64,
}

/// 95 % Monte Carlo interval of a proportion: exact limits where they are known.
pub(super) fn interval(value: &MeasureValue) -> (f64, f64) {
    let half = NORMAL_95 * value.mcse;
    value
        .limits
        .unwrap_or((value.value - half, value.value + half))
}

fn describe(scored: &Scored, panels: &[Panel]) -> String {
    let mut text = format!(
        "Dots with 95 % Monte Carlo intervals against the level of {}.",
        per_cent(scored.level)
    );
    for panel in panels {
        let _ = write!(text, " Truth {}:", panel.truth);
        for dot in &panel.dots {
            let _ = write!(text, " {} {} %;", dot.label, number_of(dot));
        }
    }
    text
}

fn number_of(dot: &Dot) -> String {
    let places = decimals(std::iter::once(100.0 * dot.mcse), 0);
    fixed(100.0 * dot.value, places)
}

struct Page<'a> {
    panels: &'a [Panel],
    title: Vec<String>,
    legend: Vec<String>,
    across: usize,
    low: f64,
    level: f64,
    floor: f64,
    /// Panels of one line of the page, and their height.
    line_height: f64,
    top: f64,
    height: f64,
}

impl<'a> Page<'a> {
    fn of(scored: &Scored, title: &str, panels: &'a [Panel]) -> Self {
        let room = PAGE_WIDTH - 2.0 * MARGIN - 20.0;
        let title = fold(title, LARGE, room, 2);
        let floor = scored.level - scored.tolerance;
        let legend = format!(
            "Bars: 95 % Monte Carlo interval. Line: level {}. Grey band: tolerance, down to {}. \
             Diamond: interval wholly below the band.",
            per_cent(scored.level),
            per_cent(floor),
        );
        let legend = fold(&legend, SMALL, room, 2);
        let lowest = panels
            .iter()
            .flat_map(|panel| &panel.dots)
            .map(|dot| dot.lower)
            .filter(|lower| lower.is_finite())
            .fold(floor, f64::min)
            .max(0.0);
        // Whole fives of per cent, or whole per cents where everything is close to the level.
        let grid = if lowest < 0.9 { 0.05 } else { 0.01 };
        let low = (((lowest + 1e-9) / grid).floor() * grid).min(0.99);
        let rows = panels
            .iter()
            .map(|panel| panel.dots.len())
            .max()
            .unwrap_or(0);
        let across = panels.len().clamp(1, ACROSS);
        let line_height = HEAD + ROW * real(rows) + FOOT;
        let top = 16.0 + 20.0 * real(title.len()) + 16.0 * real(legend.len());
        let height = top + line_height * real(panels.len().div_ceil(across)) + 4.0;
        let level = scored.level;
        Self {
            panels,
            title,
            legend,
            across,
            low,
            level,
            floor,
            line_height,
            top,
            height,
        }
    }

    fn paint(&self, canvas: &mut Canvas<'_>) {
        let mut y = 20.0;
        for text in &self.title {
            canvas.text(text, (MARGIN, y), Type::of(LARGE).bold());
            y += 20.0;
        }
        for text in &self.legend {
            canvas.text(text, (MARGIN, y), Type::of(SMALL).colour(SOFT));
            y += 16.0;
        }
        let left = MARGIN + LABEL_WIDTH + 10.0;
        let width = (PAGE_WIDTH - MARGIN - left) / real(self.across);
        for (line, panels) in self.panels.chunks(self.across).enumerate() {
            let top = self.top + self.line_height * real(line);
            if let Some(first) = panels.first() {
                for (row, dot) in first.dots.iter().enumerate() {
                    label(canvas, &dot.label, top + HEAD + ROW * (real(row) + 0.5));
                }
            }
            for (place, panel) in panels.iter().enumerate() {
                let from = left + width * real(place);
                self.panel(canvas, panel, top, (from, from + width - NUMBER - GAP));
            }
        }
    }

    fn panel(&self, canvas: &mut Canvas<'_>, panel: &Panel, top: f64, (from, to): (f64, f64)) {
        let scale = Scale::linear(self.low, 1.0, from + INSET, to - INSET);
        let (first, last) = (top + HEAD, top + HEAD + ROW * real(panel.dots.len()));
        let names = fold(&panel.truth, NORMAL, to - from + NUMBER, 2);
        for (line, text) in names.iter().enumerate() {
            let y = top + 28.0 - 16.0 * real(names.len() - 1 - line);
            canvas.text(text, (from, y), Type::of(NORMAL).bold());
        }
        canvas.rectangle(
            scale.within(self.floor),
            first,
            scale.at(self.level),
            last,
            BAND,
        );
        let wanted = if to - from > 300.0 { 8 } else { 4 };
        for (value, text) in ticks(100.0 * self.low, 100.0, wanted) {
            let x = scale.at(value / 100.0);
            canvas.line((x, first), (x, last + 4.0), FAINT, 1.0);
            canvas.text(
                &text,
                (x, last + 14.0),
                Type::of(SMALL).anchor(Anchor::Middle),
            );
        }
        let middle = f64::midpoint(from, to);
        let axis = Type::of(SMALL).anchor(Anchor::Middle).colour(SOFT);
        canvas.text("coverage, %", (middle, last + 33.0), axis);
        let level = scale.at(self.level);
        canvas.line((level, first - 4.0), (level, last), INK, 1.4);
        let text = format!("level {}", per_cent(self.level));
        let half = text_width(&text, SMALL) / 2.0;
        let x = level.clamp(from + half, (to + NUMBER - half).max(from + half));
        canvas.text(
            &text,
            (x, first - 12.0),
            Type::of(SMALL).anchor(Anchor::Middle),
        );
        for (row, dot) in panel.dots.iter().enumerate() {
            let y = first + ROW * (real(row) + 0.5);
            canvas.line((from, y), (to, y), FAINT, 1.0);
            let failing = dot.upper < self.floor;
            let (mark, colour) = if failing {
                (Mark::Diamond, ACCENT)
            } else {
                (Mark::Disc, INK)
            };
            let (lower, upper) = (scale.within(dot.lower), scale.within(dot.upper));
            canvas.line((lower, y), (upper, y), colour, 2.0);
            for x in [lower, upper] {
                canvas.line((x, y - 5.0), (x, y + 5.0), colour, 1.4);
            }
            canvas.mark((scale.within(dot.value), y), mark, colour, 4.0);
            let kind = Type::of(SMALL).anchor(Anchor::End).colour(colour);
            canvas.text(&number_of(dot), (to + NUMBER - 4.0, y), kind);
        }
    }
}

fn label(canvas: &mut Canvas<'_>, text: &str, middle: f64) {
    let lines = fold(text, SMALL, LABEL_WIDTH, 2);
    for (line, text) in lines.iter().enumerate() {
        let y = middle + 14.0 * (real(line) - real(lines.len() - 1) / 2.0);
        canvas.text(
            text,
            (MARGIN + LABEL_WIDTH, y),
            Type::of(SMALL).anchor(Anchor::End),
        );
    }
}

#[cfg(test)]
mod tests {
    use super::super::canvas::{assert_on_page, assert_well_formed};
    use super::*;
    use crate::report::fixtures;

    #[test]
    fn the_figure_is_whole_and_on_its_page() {
        for methods in [1, 2, 9] {
            for truths in [1, 2, 5] {
                let mut scored = fixtures::scored(methods);
                let measures = scored.measures[1].clone();
                scored.measures = vec![measures; truths];
                let figure = coverage_figure(&scored, 1);
                assert_well_formed(&figure.svg);
                assert_on_page(&figure.svg);
                assert_eq!(figure.name, "coverage-2-late-minus-early");
                assert_eq!(figure.svg, coverage_figure(&scored, 1).svg);
            }
        }
    }

    #[test]
    fn failing_methods_differ_in_shape() {
        let figure = coverage_figure(&fixtures::scored(2), 0);
        // In the first truth 93.1 % lies below 94 %, and so does 91.1 % in the second.
        assert_eq!(figure.svg.matches("<polygon").count(), 2);
        assert_eq!(figure.svg.matches("<circle").count(), 2);
        assert!(
            figure.description.contains("least-squares 93.1 %"),
            "{}",
            figure.description
        );
    }

    #[test]
    fn an_unscored_estimand_draws_an_empty_page() {
        let mut scored = fixtures::scored(2);
        scored.measures.clear();
        assert_well_formed(&coverage_figure(&scored, 0).svg);
    }
}
