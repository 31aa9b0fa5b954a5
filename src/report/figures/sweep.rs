//! A measure against a swept scenario value, one curve per method.

use std::fmt::Write as _;

use super::canvas::{self, Canvas, LARGE, PAGE_WIDTH, SMALL, Type};
use super::palette::SOFT;
use super::placement::{fold, real};
use super::sweep_panel::{Frame, Look, brackets_height, paint_panel};
use super::{Figure, slug};
use crate::report::number::{per_cent, short};

const MARGIN: f64 = 14.0;
/// Height of the plot of a panel.
const PLOT: f64 = 230.0;
/// Room above (panel name) and below (ticks, axis title) a plot.
const HEAD: f64 = 30.0;
const FOOT: f64 = 50.0;
/// From this many panels on, two stand side by side.
const SIDE_BY_SIDE: usize = 3;

/// Horizontal axis of a sweep figure.
#[derive(Debug, Clone, PartialEq)]
pub enum AxisScale {
    /// Numbers on a linear axis.
    Linear,
    /// Positive numbers on a logarithmic axis.
    Logarithmic,
    /// Words at equal distances; the points' `x` are their positions 0, 1, ...
    Words(Vec<String>),
}

/// A value with its Monte Carlo interval.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CurvePoint {
    /// Value of the swept entry.
    pub x: f64,
    /// Value of the measure.
    pub value: f64,
    /// Lower 95 % Monte Carlo limit.
    pub lower: f64,
    /// Upper 95 % Monte Carlo limit.
    pub upper: f64,
}

/// The curve of one method.
#[derive(Debug, Clone, PartialEq)]
pub struct SweepCurve {
    /// Method index: it sets colour, mark and dash.
    pub method: usize,
    /// Method label.
    pub label: String,
    /// Points in increasing `x`.
    pub points: Vec<CurvePoint>,
}

/// Where a method stops being honest.
#[derive(Debug, Clone, PartialEq)]
pub struct BreakPoint {
    /// Method index.
    pub method: usize,
    /// Last value at which it was honest.
    pub from: f64,
    /// First value at which it was not.
    pub to: f64,
    /// What is written beside the bracket; room is short, the method's label is enough.
    pub text: String,
}

/// One panel: one value of the second axis.
#[derive(Debug, Clone, PartialEq)]
pub struct SweepPanel {
    /// Value of the second axis, such as `p/n = 0.25`; empty for a single axis.
    pub label: String,
    /// Curves.
    pub curves: Vec<SweepCurve>,
    /// Break points to mark.
    pub break_points: Vec<BreakPoint>,
}

/// What a sweep figure shows.
#[derive(Debug, Clone, PartialEq)]
pub struct SweepFigure {
    /// Title.
    pub title: String,
    /// Name of the measure.
    pub measure: String,
    /// Name of the horizontal axis.
    pub axis: String,
    /// Horizontal axis.
    pub scale: AxisScale,
    /// Whether the measure is a share, to be shown in per cent.
    pub per_cent: bool,
    /// A value to draw a line at: the nominal level, or zero bias.
    pub nominal: Option<f64>,
    /// Half-open band below the nominal line; zero for none.
    pub tolerance: f64,
    /// Panels.
    pub panels: Vec<SweepPanel>,
}

/// Draws a sweep figure. `name` is turned into a safe file name.
#[must_use]
pub fn sweep_figure(name: &str, figure: &SweepFigure) -> Figure {
    let name = slug(name);
    let across = if figure.panels.len() >= SIDE_BY_SIDE {
        2
    } else {
        1
    };
    let room = PAGE_WIDTH - 2.0 * MARGIN - 20.0;
    let title = fold(&figure.title, LARGE, room, 2);
    let legend = fold(&legend_text(figure), SMALL, room, 2);
    let top = 18.0 + 20.0 * real(title.len()) + 16.0 * real(legend.len());
    let lines: Vec<&[SweepPanel]> = figure.panels.chunks(across).collect();
    let heights: Vec<f64> = lines
        .iter()
        .map(|panels| HEAD + brackets(panels) + PLOT + FOOT)
        .collect();
    let height = top + heights.iter().sum::<f64>() + 4.0;
    let description = describe(figure);
    let look = Look::of(figure);
    let svg = canvas::draw(&name, &figure.title, &description, height, |canvas| {
        texts(canvas, &title, &legend);
        let width = (PAGE_WIDTH - 2.0 * MARGIN) / real(across);
        let mut y = top;
        for (panels, height) in lines.iter().zip(&heights) {
            for (place, panel) in panels.iter().enumerate() {
                let left = MARGIN + width * real(place);
                let frame = Frame {
                    left,
                    right: left + width - 8.0,
                    name: y + 12.0,
                    top: y + HEAD + brackets(panels),
                    bottom: y + height - FOOT,
                };
                paint_panel(canvas, figure, panel, &look, frame);
            }
            y += height;
        }
    });
    Figure {
        name,
        title: figure.title.clone(),
        description,
        svg,
    }
}

fn texts(canvas: &mut Canvas<'_>, title: &[String], legend: &[String]) {
    let mut y = 20.0;
    for text in title {
        canvas.text(text, (MARGIN, y), Type::of(LARGE).bold());
        y += 20.0;
    }
    for text in legend {
        canvas.text(text, (MARGIN, y), Type::of(SMALL).colour(SOFT));
        y += 16.0;
    }
}

fn brackets(panels: &[SweepPanel]) -> f64 {
    panels
        .iter()
        .map(|panel| brackets_height(panel.break_points.len()))
        .fold(0.0, f64::max)
}

fn legend_text(figure: &SweepFigure) -> String {
    let mut text = "Bands: 95 % Monte Carlo interval.".to_owned();
    if let Some(nominal) = figure.nominal.filter(|_| figure.per_cent) {
        let _ = write!(text, " Line: level {}.", per_cent(nominal));
        if figure.tolerance > 0.0 {
            let floor = per_cent(nominal - figure.tolerance);
            let _ = write!(text, " Grey band: tolerance, down to {floor}.");
        }
    }
    if figure
        .panels
        .iter()
        .any(|panel| !panel.break_points.is_empty())
    {
        text.push_str(" Brackets: a method stops being honest.");
    }
    text
}

fn describe(figure: &SweepFigure) -> String {
    let shown = |value: f64| {
        if figure.per_cent {
            per_cent(value)
        } else {
            short(value)
        }
    };
    let mut text = format!("Curves of {} against {}.", figure.measure, figure.axis);
    for panel in &figure.panels {
        if !panel.label.is_empty() {
            let _ = write!(text, " Panel {}.", panel.label);
        }
        for curve in &panel.curves {
            if let (Some(first), Some(last)) = (curve.points.first(), curve.points.last()) {
                let (first, last) = (shown(first.value), shown(last.value));
                let _ = write!(text, " {}: from {first} to {last}.", curve.label);
            }
        }
        for mark in &panel.break_points {
            let _ = write!(text, " {}.", mark.text);
        }
    }
    text
}

#[cfg(test)]
mod tests {
    use super::super::canvas::{assert_on_page, assert_well_formed};
    use super::super::sweep_points::points;
    use super::*;
    use crate::report::AxisValue;
    use crate::report::fixtures;
    use crate::score::Measure;

    fn drawn(methods: usize, seconds: &[f64], broken: bool) -> (SweepFigure, Figure) {
        let axes = ["p/n".to_owned(), "batch.2.fraction".to_owned()];
        let mut figure =
            SweepFigure::from_points(&axes, &points(methods, seconds), 1, 0, Measure::Coverage);
        if broken {
            for panel in &mut figure.panels {
                panel.break_points = (0..methods.min(3))
                    .map(|method| BreakPoint {
                        method,
                        from: 0.4,
                        to: 0.8,
                        text: format!("{} stops being honest", fixtures::LABELS[method]),
                    })
                    .collect();
            }
        }
        let drawing = sweep_figure("coverage / p over n", &figure);
        (figure, drawing)
    }

    #[test]
    fn the_figure_is_whole_and_on_its_page() {
        for methods in [1, 2, 9] {
            for seconds in [&[1.0][..], &[1.0, 3.0], &[1.0, 2.0, 5.0, 9.0, 9.5]] {
                for broken in [false, true] {
                    let (figure, drawing) = drawn(methods, seconds, broken);
                    assert_eq!(figure.panels.len(), seconds.len());
                    assert_well_formed(&drawing.svg);
                    assert_on_page(&drawing.svg);
                    assert_eq!(drawing.name, "coverage-p-over-n");
                    assert_eq!(drawing, drawn(methods, seconds, broken).1);
                }
            }
        }
    }

    #[test]
    fn panels_are_named_by_the_second_axis() {
        let (figure, drawing) = drawn(2, &[1.0, 3.0], true);
        assert_eq!(figure.panels[1].label, "batch.2.fraction = 3");
        assert_eq!(figure.nominal, Some(0.95));
        assert!(drawing.description.contains("stops being honest"));
        assert!(
            drawing
                .description
                .contains("least-squares: from 95.2 % to 95.2 %.")
        );
    }

    #[test]
    fn words_and_bias_are_drawn_too() {
        let mut points = points(9, &[1.0]);
        let words = [
            "random",
            "top-quantile, predicted outcome",
            "tilted",
            "above-threshold, predicted contrast",
            "uncertain",
        ];
        for (point, word) in points.iter_mut().zip(words) {
            point.axes = vec![AxisValue::Word(word.to_owned())];
        }
        // One value that does not exist breaks its curve and nothing else.
        points[2].scored.measures[0].cells[1].values[0].value = f64::NAN;
        let axes = ["batch.2.select.rule".to_owned()];
        let figure = SweepFigure::from_points(&axes, &points, 0, 0, Measure::Bias);
        assert_eq!(figure.nominal, Some(0.0));
        let drawing = sweep_figure("bias by rule", &figure);
        assert_well_formed(&drawing.svg);
        assert_on_page(&drawing.svg);
        assert!(drawing.svg.contains("random") && !drawing.svg.contains("NaN"));
    }

    #[test]
    fn a_sweep_without_points_draws_an_empty_page() {
        let figure = SweepFigure::from_points(&[], &[], 0, 0, Measure::Bias);
        assert_well_formed(&sweep_figure("bias", &figure).svg);
    }
}
