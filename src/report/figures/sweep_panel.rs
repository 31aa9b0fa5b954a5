//! One panel of a sweep figure.

use super::canvas::{Anchor, Canvas, NORMAL, SMALL, Type};
use super::palette::{BAND, FAINT, INK, SOFT, series};
use super::placement::{fold, push_apart, real, shorten, text_width};
use super::scale::{Scale, ticks};
use super::sweep::{AxisScale, SweepFigure, SweepPanel};
use crate::report::number::short;

/// Room for the numbers of the vertical axis, and for the labels at the right ends of the curves.
const NUMBERS: f64 = 46.0;
const LABELS_WIDE: f64 = 236.0;
const LABELS_NARROW: f64 = 150.0;
/// A panel narrower than this has the narrow label column.
const NARROW: f64 = 600.0;
/// Distance of neighbouring labels, and height of a bracket's line.
const LINE: f64 = 15.0;
const BRACKET: f64 = 18.0;
/// Length of the leader from a curve to its label.
const LEADER: f64 = 16.0;

/// Where a panel lies on the page.
#[derive(Debug, Clone, Copy)]
pub(super) struct Frame {
    pub(super) left: f64,
    pub(super) right: f64,
    /// Middle of the line with the panel's name.
    pub(super) name: f64,
    /// Top and bottom of the plot.
    pub(super) top: f64,
    pub(super) bottom: f64,
}

/// Scales common to all panels.
pub(super) struct Look {
    x: (f64, f64),
    y: (f64, f64),
    /// Swept values with their texts, in increasing order.
    x_ticks: Vec<(f64, String)>,
}

impl Look {
    pub(super) fn of(figure: &SweepFigure) -> Self {
        let points = || {
            figure
                .panels
                .iter()
                .flat_map(|p| &p.curves)
                .flat_map(|c| &c.points)
        };
        let mut swept: Vec<f64> = points()
            .map(|point| point.x)
            .filter(|x| x.is_finite())
            .collect();
        swept.sort_by(f64::total_cmp);
        swept.dedup();
        let x = (
            swept.first().copied().unwrap_or(1.0),
            swept.last().copied().unwrap_or(1.0),
        );
        let x_ticks = match &figure.scale {
            AxisScale::Words(words) => words
                .iter()
                .enumerate()
                .map(|(place, word)| (real(place), word.clone()))
                .collect(),
            _ => swept.iter().map(|&x| (x, short(x))).collect(),
        };
        let floor = figure.nominal.map(|nominal| nominal - figure.tolerance);
        let values = points()
            .flat_map(|point| [point.value, point.lower, point.upper])
            .chain(figure.nominal)
            .chain(floor)
            .filter(|value| value.is_finite());
        let (low, high) = values.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), value| {
            (low.min(value), high.max(value))
        });
        let (low, high) = if low <= high { (low, high) } else { (0.0, 1.0) };
        let edge = if high > low {
            0.04 * (high - low)
        } else {
            0.05 * high.abs().max(0.1)
        };
        let (mut low, mut high) = (low - edge, high + edge);
        if figure.per_cent {
            // A hair beyond the ends, so that curves at 0 and 100 % are not cut.
            (low, high) = (
                low.max(-0.01 * (high - low)),
                high.min(1.0 + 0.01 * (high - low)),
            );
        }
        Self {
            x,
            y: (low, high),
            x_ticks,
        }
    }
}

/// Height of the strip above a plot in which `count` break points are marked.
pub(super) fn brackets_height(count: usize) -> f64 {
    BRACKET * real(count)
}

/// Draws one panel.
pub(super) fn paint_panel(
    canvas: &mut Canvas<'_>,
    figure: &SweepFigure,
    panel: &SweepPanel,
    look: &Look,
    frame: Frame,
) {
    let labels = if frame.right - frame.left < NARROW {
        LABELS_NARROW
    } else {
        LABELS_WIDE
    };
    let (from, to) = (frame.left + NUMBERS, frame.right - labels);
    let x = match figure.scale {
        AxisScale::Logarithmic if look.x.0 > 0.0 => {
            Scale::logarithmic(look.x.0, look.x.1, from + 10.0, to - 10.0)
        }
        _ => Scale::linear(look.x.0, look.x.1, from + 10.0, to - 10.0),
    };
    let y = Scale::linear(look.y.0, look.y.1, frame.bottom, frame.top);
    let heading = if panel.label.is_empty() {
        unit(figure)
    } else {
        format!("{}; {}", panel.label, unit(figure))
    };
    let heading = shorten(&heading, NORMAL, frame.right - frame.left - 10.0);
    canvas.text(&heading, (frame.left, frame.name), Type::of(NORMAL).bold());
    axes(canvas, figure, look, frame, (x, y), (from, to));
    for (line, mark) in panel.break_points.iter().enumerate() {
        let style = series(mark.method);
        let middle = frame.top - BRACKET * (real(line) + 0.5);
        let (left, right) = (x.within(mark.from), x.within(mark.to));
        canvas.line((left, middle), (right, middle), style.colour, 1.6);
        for end in [left, right] {
            canvas.line((end, middle - 5.0), (end, middle + 5.0), style.colour, 1.6);
            canvas.curve(
                &[(end, middle + 5.0), (end, frame.bottom)],
                SOFT,
                0.8,
                &[2.0, 4.0],
            );
        }
        // The text goes to the side with more room.
        let (after, before) = (frame.right - right - 8.0, left - from - 8.0);
        let (at, anchor, room) = if after >= before {
            (right + 8.0, Anchor::Start, after)
        } else {
            (left - 8.0, Anchor::End, before)
        };
        let text = shorten(&mark.text, SMALL, room);
        canvas.text(&text, (at, middle), Type::of(SMALL).anchor(anchor));
    }
    curves(canvas, panel, frame, (x, y), (to, labels));
}

/// The measure and its unit.
fn unit(figure: &SweepFigure) -> String {
    if figure.per_cent {
        format!("{}, %", figure.measure)
    } else {
        figure.measure.clone()
    }
}

fn axes(
    canvas: &mut Canvas<'_>,
    figure: &SweepFigure,
    look: &Look,
    frame: Frame,
    (x, y): (Scale, Scale),
    (from, to): (f64, f64),
) {
    if let Some(nominal) = figure.nominal.filter(|_| figure.tolerance > 0.0) {
        let (top, bottom) = (y.within(nominal), y.within(nominal - figure.tolerance));
        canvas.rectangle(from, top, to, bottom, BAND);
    }
    let factor = if figure.per_cent { 100.0 } else { 1.0 };
    for (value, text) in ticks(factor * look.y.0, factor * look.y.1, 5) {
        let at = y.at(value / factor);
        canvas.line((from, at), (to, at), FAINT, 1.0);
        canvas.text(&text, (from - 6.0, at), Type::of(SMALL).anchor(Anchor::End));
    }
    canvas.line((from, frame.bottom), (to, frame.bottom), SOFT, 1.0);
    let step = (to - from) / real(look.x_ticks.len().max(1));
    let words = matches!(figure.scale, AxisScale::Words(_));
    let mut free = f64::NEG_INFINITY;
    for (value, text) in &look.x_ticks {
        let at = x.at(*value);
        canvas.line((at, frame.bottom), (at, frame.bottom + 4.0), SOFT, 1.0);
        // Words share the axis; numbers that would run into each other are left out.
        let text = if words {
            shorten(text, SMALL, step - 6.0)
        } else {
            text.clone()
        };
        let half = text_width(&text, SMALL) / 2.0;
        if at - half > free {
            let kind = Type::of(SMALL).anchor(Anchor::Middle);
            canvas.text(&text, (at, frame.bottom + 13.0), kind);
            free = at + half + 6.0;
        }
    }
    let logarithmic = matches!(figure.scale, AxisScale::Logarithmic);
    let axis = format!(
        "{}{}",
        figure.axis,
        if logarithmic { " (log scale)" } else { "" }
    );
    let axis = shorten(&axis, SMALL, to - from);
    let kind = Type::of(SMALL).anchor(Anchor::Middle).colour(SOFT);
    canvas.text(&axis, (f64::midpoint(from, to), frame.bottom + 31.0), kind);
    if let Some(nominal) = figure.nominal {
        canvas.line((from, y.within(nominal)), (to, y.within(nominal)), INK, 1.4);
    }
}

fn curves(
    canvas: &mut Canvas<'_>,
    panel: &SweepPanel,
    frame: Frame,
    (x, y): (Scale, Scale),
    (to, labels): (f64, f64),
) {
    let parts = |curve: &super::SweepCurve| -> Vec<Vec<super::CurvePoint>> {
        // A value that does not exist breaks the curve.
        let known = |point: &super::CurvePoint| point.value.is_finite() && point.x.is_finite();
        let split = curve.points.split(|point| !known(point));
        split
            .filter(|part| !part.is_empty())
            .map(<[_]>::to_vec)
            .collect()
    };
    for curve in &panel.curves {
        for part in parts(curve) {
            let upper = part
                .iter()
                .map(|point| (x.at(point.x), y.within(point.upper)));
            let lower = part
                .iter()
                .rev()
                .map(|point| (x.at(point.x), y.within(point.lower)));
            let outline: Vec<(f64, f64)> = upper.chain(lower).collect();
            if outline.iter().all(|(_, y)| y.is_finite()) {
                canvas.area(&outline, series(curve.method).colour, 0.18);
            }
        }
    }
    let mut ends = Vec::new();
    for curve in &panel.curves {
        let style = series(curve.method);
        let mut end = None;
        for part in parts(curve) {
            let line: Vec<(f64, f64)> = part
                .iter()
                .map(|point| (x.at(point.x), y.within(point.value)))
                .collect();
            canvas.curve(&line, style.colour, 1.8, style.dash);
            for &at in &line {
                canvas.mark(at, style.mark, style.colour, 4.0);
            }
            end = line.last().copied().or(end);
        }
        if let Some(end) = end {
            ends.push((curve, end));
        }
    }
    let wanted: Vec<f64> = ends.iter().map(|(_, end)| end.1).collect();
    let gap = LINE.min((frame.bottom - frame.top + LINE) / real(ends.len().max(1)));
    let placed = push_apart(&wanted, gap, frame.top, frame.bottom);
    for ((curve, end), label) in ends.into_iter().zip(placed) {
        let style = series(curve.method);
        let start = to + LEADER;
        canvas.curve(
            &[(end.0 + 5.0, end.1), (start, label)],
            style.colour,
            0.8,
            &[],
        );
        canvas.mark((start + 6.0, label), style.mark, style.colour, 4.0);
        let room = labels - LEADER - 16.0;
        let text = fold(&curve.label, SMALL, room, 1).concat();
        canvas.text(&text, (start + 14.0, label), Type::of(SMALL));
    }
}
