//! Where a method stops being honest along the first axis of a sweep.

use super::GridPoint;
use crate::numerics::distribution::clopper_pearson;
use crate::plan::Plan;
use crate::scenario::BreakPoint;
use crate::score::{Measure, TruthMeasures};

/// Bisections after which a bracket on a continuous axis is taken as fine enough.
const MOST_BISECTIONS: usize = 12;
/// Width of a bracket relative to its upper end at which the bisection ends.
const RELATIVE_WIDTH: f64 = 0.01;

/// What is sought: the cells of one method.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Search {
    /// Method index.
    pub method: usize,
    /// Estimand index, or every estimand.
    pub estimand: Option<usize>,
    /// Truth index, or every truth.
    pub truth: Option<usize>,
}

/// A bracket of the break point for one combination of the other axes.
#[derive(Debug, Clone, PartialEq)]
pub struct BreakBracket {
    /// Values of the axes after the first.
    pub others: Vec<toml::Value>,
    /// Last value at which the coverage was not shown to be too low; `None` when it was too low
    /// at the first value of the grid already.
    pub from: Option<f64>,
    /// Smallest value at which it was; `None` when it never was on the grid.
    pub to: Option<f64>,
    /// Analysis coefficients over planned units at `from` and `to`.
    pub ratios: (Option<f64>, Option<f64>),
    /// Points evaluated for the bisection.
    pub evaluations: usize,
}

impl Search {
    /// Resolves the names of a scenario's search; `None` when a name is not known.
    #[must_use]
    pub fn of(plan: &Plan, wanted: &BreakPoint) -> Option<Self> {
        let by_kind = |label: &str| {
            let mut matching = plan.methods.iter().enumerate().filter(|(_, method)| {
                method.label == label
                    || method
                        .label
                        .strip_prefix(label)
                        .is_some_and(|rest| rest.starts_with(" ("))
            });
            let exact = plan.methods.iter().position(|method| method.label == label);
            exact.or_else(|| matching.next().map(|(index, _)| index))
        };
        let estimand = match &wanted.estimand {
            None => None,
            Some(name) => Some(
                plan.estimands
                    .iter()
                    .position(|known| &known.name == name)?,
            ),
        };
        let truth = match &wanted.truth {
            None => None,
            Some(name) => Some(plan.truths.iter().position(|known| &known.name == name)?),
        };
        Some(Self {
            method: by_kind(&wanted.method)?,
            estimand,
            truth,
        })
    }

    /// Whether some matching coverage is below level minus tolerance beyond Monte Carlo doubt:
    /// its upper Clopper-Pearson limit, at the plan's confidence shared over the matching cells,
    /// lies below the bound.
    #[must_use]
    pub fn broken(&self, plan: &Plan, measures: &[TruthMeasures]) -> bool {
        let bound = plan.level - plan.verdicts.tolerance;
        let matching: Vec<_> = measures
            .iter()
            .filter(|truth| self.truth.is_none_or(|index| index == truth.truth))
            .flat_map(|truth| &truth.cells)
            .filter(|cell| {
                cell.method == self.method
                    && self.estimand.is_none_or(|index| index == cell.estimand)
            })
            .collect();
        let doubt = (1.0 - plan.verdicts.confidence) / matching.len().max(1) as f64;
        matching.iter().any(|cell| {
            cell.get(Measure::Coverage).is_some_and(|coverage| {
                let trials = coverage.trials_used;
                #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)]
                let hits = (coverage.value * trials as f64).round() as u64;
                // A one-sided limit is a two-sided one at twice the doubt.
                clopper_pearson(hits, trials, 1.0 - 2.0 * doubt).1 < bound
            })
        })
    }
}

/// Finds the break point for every combination of the other axes by bisection between the last
/// grid value that is sound and the first that is not. `evaluate` replays a point that is not on
/// the grid and says whether the method is broken there.
///
/// # Errors
/// What `evaluate` returns.
pub fn find_breaks<E>(
    points: &[(GridPoint, bool)],
    mut evaluate: impl FnMut(&[toml::Value]) -> Result<(Plan, bool), E>,
) -> Result<Vec<BreakBracket>, E> {
    let mut combinations: Vec<Vec<toml::Value>> = Vec::new();
    for (point, _) in points {
        let others = point.values[1..].to_vec();
        if !combinations.contains(&others) {
            combinations.push(others);
        }
    }
    let mut brackets = Vec::new();
    for others in combinations {
        let mut line: Vec<(f64, bool, &GridPoint)> = points
            .iter()
            .filter(|(point, _)| point.values[1..] == others[..])
            .filter_map(|(point, broken)| Some((number(&point.values[0])?, *broken, point)))
            .collect();
        line.sort_by(|a, b| a.0.total_cmp(&b.0));
        let Some(first) = line.iter().position(|entry| entry.1) else {
            let last = line.last();
            brackets.push(BreakBracket {
                others,
                from: last.map(|entry| entry.0),
                to: None,
                ratios: (last.map(|entry| ratio(&entry.2.plan)), None),
                evaluations: 0,
            });
            continue;
        };
        let whole = line.iter().all(|entry| entry.2.values[0].is_integer());
        let mut to = (line[first].0, ratio(&line[first].2.plan));
        let mut from = first
            .checked_sub(1)
            .map(|place| (line[place].0, ratio(&line[place].2.plan)));
        let mut evaluations = 0;
        while let Some(low) = from
            && evaluations < MOST_BISECTIONS
            && let Some(middle) = middle(low.0, to.0, whole)
        {
            let mut values = vec![middle.clone()];
            values.extend(others.iter().cloned());
            let (plan, broken) = evaluate(&values)?;
            evaluations += 1;
            let found = (number(&middle).unwrap_or(to.0), ratio(&plan));
            if broken {
                to = found;
            } else {
                from = Some(found);
            }
        }
        brackets.push(BreakBracket {
            others,
            from: from.map(|end| end.0),
            to: Some(to.0),
            ratios: (from.map(|end| end.1), Some(to.1)),
            evaluations,
        });
    }
    Ok(brackets)
}

fn ratio(plan: &Plan) -> f64 {
    plan.analysis.len() as f64 / plan.units() as f64
}

fn number(value: &toml::Value) -> Option<f64> {
    value
        .as_float()
        .or_else(|| value.as_integer().map(|integer| integer as f64))
}

/// A value between two ends, or `None` when they are close enough.
#[allow(clippy::cast_possible_truncation)] // whole axis values are small integers
fn middle(low: f64, high: f64, whole: bool) -> Option<toml::Value> {
    if whole {
        let value = low.midpoint(high).floor();
        return (value > low && value < high).then_some(toml::Value::Integer(value as i64));
    }
    let close = high - low <= RELATIVE_WIDTH * high.abs().max(low.abs());
    (!close).then(|| toml::Value::Float(low.midpoint(high)))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bisection_narrows_whole_and_continuous_axes() {
        let (mut low, mut high) = (0.0, 100.0);
        while let Some(value) = middle(low, high, true) {
            let value = number(&value).unwrap();
            if value >= 37.0 {
                high = value;
            } else {
                low = value;
            }
        }
        assert!((low - 36.0).abs() < 1e-12 && (high - 37.0).abs() < 1e-12);
        let (mut low, mut high) = (0.1, 0.9);
        while let Some(value) = middle(low, high, false) {
            let value = number(&value).unwrap();
            if value >= 0.3 {
                high = value;
            } else {
                low = value;
            }
        }
        assert!(low < 0.3 && high >= 0.3 && high - low < 0.01);
    }
}
