//! From the points of a sweep to the curves of a figure.

use super::coverage::interval;
use super::placement::real;
use super::sweep::{AxisScale, CurvePoint, SweepCurve, SweepFigure, SweepPanel};
use crate::report::number::short;
use crate::report::scored::cells_of;
use crate::report::{AxisValue, SweepPoint};
use crate::score::Measure;

/// Relative slack within which ratios of neighbouring values count as equal.
const RATIO_SLACK: f64 = 1e-6;
/// Values that grow by less than this from one to the next are drawn on a linear axis.
const LEAST_RATIO: f64 = 1.4;

impl SweepFigure {
    /// The figure of one measure for one estimand under one truth: curves along the first axis,
    /// a panel for every combination of the others. Break points are empty, to be filled in.
    #[must_use]
    pub fn from_points(
        axes: &[String],
        points: &[SweepPoint],
        truth: usize,
        estimand: usize,
        measure: Measure,
    ) -> Self {
        let (scale, positions) = axis_scale(points);
        let mut panels: Vec<(&[AxisValue], SweepPanel)> = Vec::new();
        for (point, x) in points.iter().zip(positions) {
            let others = point.axes.get(1..).unwrap_or_default();
            let place = panels
                .iter()
                .position(|(key, _)| *key == others)
                .unwrap_or_else(|| {
                    let label = panel_label(axes, others);
                    let panel = SweepPanel {
                        label,
                        curves: Vec::new(),
                        break_points: Vec::new(),
                    };
                    panels.push((others, panel));
                    panels.len() - 1
                });
            add_point(&mut panels[place].1, point, x, (truth, estimand, measure));
        }
        let mut panels: Vec<SweepPanel> = panels.into_iter().map(|(_, panel)| panel).collect();
        for curve in panels.iter_mut().flat_map(|panel| &mut panel.curves) {
            curve.points.sort_by(|a, b| a.x.total_cmp(&b.x));
        }
        let first = points.first().map(|point| &point.scored);
        let (nominal, tolerance) = match measure {
            Measure::Coverage | Measure::BiasEliminatedCoverage => (
                first.map(|scored| scored.level),
                first.map_or(0.0, |scored| scored.tolerance),
            ),
            Measure::Bias | Measure::RelativeBias => (Some(0.0), 0.0),
            Measure::SeRatio | Measure::Price => (Some(1.0), 0.0),
            _ => (None, 0.0),
        };
        let name = measure.key().replace('-', " ");
        let title = first.map_or_else(String::new, |scored| {
            format!(
                "{name}: {}, truth {}",
                scored.estimands[estimand], scored.truths[truth]
            )
        });
        Self {
            title: capitalised(&title),
            measure: name,
            axis: axes.first().cloned().unwrap_or_default(),
            scale,
            per_cent: is_share(measure),
            nominal,
            tolerance,
            panels,
        }
    }
}

/// Whether a measure is a share of trials.
fn is_share(measure: Measure) -> bool {
    matches!(
        measure,
        Measure::Coverage
            | Measure::BiasEliminatedCoverage
            | Measure::MissesBelow
            | Measure::MissesAbove
            | Measure::RejectionTwoSided
            | Measure::RejectionAbove
            | Measure::RejectionBelow
            | Measure::NoAnswer
    )
}

fn add_point(
    panel: &mut SweepPanel,
    point: &SweepPoint,
    x: f64,
    (truth, estimand, measure): (usize, usize, Measure),
) {
    let scored = &point.scored;
    let Some(measures) = scored
        .measures
        .iter()
        .find(|measures| measures.truth == truth)
    else {
        return;
    };
    for cell in cells_of(measures, estimand) {
        let Some(value) = cell.get(measure) else {
            continue;
        };
        let (lower, upper) = interval(value);
        let place = panel
            .curves
            .iter()
            .position(|curve| curve.method == cell.method);
        let place = place.unwrap_or_else(|| {
            let label = scored.methods[cell.method].clone();
            panel.curves.push(SweepCurve {
                method: cell.method,
                label,
                points: Vec::new(),
            });
            panel.curves.len() - 1
        });
        panel.curves[place].points.push(CurvePoint {
            x,
            value: value.value,
            lower,
            upper,
        });
    }
}

/// Axis and position of every point along it: numbers if all are numbers, else words in order of
/// first appearance.
fn axis_scale(points: &[SweepPoint]) -> (AxisScale, Vec<f64>) {
    let firsts: Vec<&AxisValue> = points
        .iter()
        .filter_map(|point| point.axes.first())
        .collect();
    let numbers: Vec<f64> = firsts
        .iter()
        .filter_map(|value| match value {
            AxisValue::Number(number) => Some(*number),
            AxisValue::Word(_) => None,
        })
        .collect();
    if numbers.len() == points.len() {
        let scale = if geometric(&numbers) {
            AxisScale::Logarithmic
        } else {
            AxisScale::Linear
        };
        return (scale, numbers);
    }
    let mut words: Vec<String> = Vec::new();
    let positions = firsts
        .iter()
        .map(|value| {
            let word = match value {
                AxisValue::Number(number) => short(*number),
                AxisValue::Word(word) => word.clone(),
            };
            let place = words
                .iter()
                .position(|known| *known == word)
                .unwrap_or_else(|| {
                    words.push(word);
                    words.len() - 1
                });
            real(place)
        })
        .collect();
    (AxisScale::Words(words), positions)
}

/// Whether at least three distinct positive values grow by a constant ratio.
fn geometric(values: &[f64]) -> bool {
    let mut values = values.to_vec();
    values.sort_by(f64::total_cmp);
    values.dedup();
    if values.len() < 3 || values[0] <= 0.0 {
        return false;
    }
    let ratio = values[1] / values[0];
    let equal = |pair: &[f64]| ((pair[1] / pair[0]) / ratio - 1.0).abs() < RATIO_SLACK;
    ratio >= LEAST_RATIO && values.windows(2).all(equal)
}

fn panel_label(axes: &[String], values: &[AxisValue]) -> String {
    let part = |(axis, value): (&String, &AxisValue)| match value {
        AxisValue::Number(number) => format!("{axis} = {}", short(*number)),
        AxisValue::Word(word) => format!("{axis} = {word}"),
    };
    axes.iter()
        .skip(1)
        .zip(values)
        .map(part)
        .collect::<Vec<_>>()
        .join(", ")
}

fn capitalised(text: &str) -> String {
    let mut characters = text.chars();
    characters.next().map_or_else(String::new, |first| {
        first.to_uppercase().chain(characters).collect()
    })
}

/// An invented sweep: coverage falls with the first axis, faster for later methods.
#[cfg(test)]
pub(super) fn points(methods: usize, seconds: &[f64]) -> Vec<SweepPoint> {
    let mut points = Vec::new();
    for &second in seconds {
        for x in [0.05, 0.1, 0.2, 0.4, 0.8] {
            let mut scored = crate::report::fixtures::scored(methods);
            for cell in scored
                .measures
                .iter_mut()
                .flat_map(|measures| &mut measures.cells)
            {
                let loss = 0.05 * f64::from(u8::try_from(cell.method).unwrap()) * x * second;
                for value in &mut cell.values {
                    if value.measure == Measure::Coverage {
                        value.value = 0.952 - loss;
                        value.limits = Some((0.945 - loss, 0.958 - loss));
                    }
                }
            }
            let mut axes = vec![AxisValue::Number(x)];
            if seconds.len() > 1 {
                axes.push(AxisValue::Number(second));
            }
            points.push(SweepPoint { axes, scored });
        }
    }
    points
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn axes_are_recognised() {
        assert!(geometric(&[0.4, 0.1, 0.2, 0.2]));
        assert!(!geometric(&[0.1, 0.2, 0.3]));
        assert!(!geometric(&[0.0, 0.1, 0.2]));
        assert!(!geometric(&[1.0, 2.0]));
        let mut words = points(2, &[1.0]);
        for (point, word) in words.iter_mut().zip(["a", "b", "c", "d", "a"]) {
            point.axes = vec![AxisValue::Word(word.to_owned())];
        }
        let (scale, positions) = axis_scale(&words);
        assert_eq!(
            scale,
            AxisScale::Words(["a", "b", "c", "d"].map(ToOwned::to_owned).to_vec())
        );
        assert_eq!(positions, [0.0, 1.0, 2.0, 3.0, 0.0]);
    }
}
