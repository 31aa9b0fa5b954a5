//! What a report is made from.

use crate::plan::Plan;
use crate::score::{CellMeasures, TruthMeasures};

/// Relative distance below which a true value counts as equal to the null value: a contrast is a
/// sum of products, so rounding may leave a few units in the last place.
const NULL_ROUNDING: f64 = 1e-12;

/// Everything that was scored in one replay, with the names that the scenario gives.
#[derive(Debug, Clone)]
pub struct Scored {
    /// Title of the study.
    pub title: String,
    /// Question that the simulation answers.
    pub aim: String,
    /// Confidence level of the intervals, in `(0, 1)`.
    pub level: f64,
    /// Coverage may fall short of the level by this much and still be called honest.
    pub tolerance: f64,
    /// Simultaneous confidence of all verdicts.
    pub confidence: f64,
    /// Index of the method whose mean width is the unit of price.
    pub reference: usize,
    /// Name of each truth.
    pub truths: Vec<String>,
    /// Name of each estimand.
    pub estimands: Vec<String>,
    /// Label of each method.
    pub methods: Vec<String>,
    /// True value of each estimand, `truths × estimands`, one row per truth.
    pub true_values: Vec<Vec<f64>>,
    /// Null value of each estimand.
    pub nulls: Vec<f64>,
    /// Measures, one entry per truth that was replayed.
    pub measures: Vec<TruthMeasures>,
    /// Verdicts, one per estimand × method; empty when none were reached.
    pub verdicts: Vec<VerdictLine>,
}

impl Scored {
    /// Joins a plan's names to what was scored. `true_values` holds one row per truth, one value
    /// per estimand.
    #[must_use]
    pub fn new(
        plan: &Plan,
        true_values: Vec<Vec<f64>>,
        measures: Vec<TruthMeasures>,
        verdicts: Vec<VerdictLine>,
    ) -> Self {
        Self {
            title: plan.title.clone(),
            aim: plan.aim.clone(),
            level: plan.level,
            tolerance: plan.verdicts.tolerance,
            confidence: plan.verdicts.confidence,
            reference: plan.verdicts.reference,
            truths: plan.truths.iter().map(|truth| truth.name.clone()).collect(),
            estimands: plan
                .estimands
                .iter()
                .map(|estimand| estimand.name.clone())
                .collect(),
            methods: plan
                .methods
                .iter()
                .map(|method| method.label.clone())
                .collect(),
            true_values,
            nulls: plan
                .estimands
                .iter()
                .map(|estimand| estimand.null)
                .collect(),
            measures,
            verdicts,
        }
    }

    /// Whether the null hypothesis of an estimand holds under a truth, so that a rejection is an
    /// error and not power.
    #[must_use]
    pub fn null_holds(&self, truth: usize, estimand: usize) -> bool {
        let (value, null) = (self.true_values[truth][estimand], self.nulls[estimand]);
        (value - null).abs() <= NULL_ROUNDING * null.abs().max(1.0)
    }
}

/// The cells of one estimand under one truth, in method order.
pub(super) fn cells_of(measures: &TruthMeasures, estimand: usize) -> Vec<&CellMeasures> {
    measures
        .cells
        .iter()
        .filter(|cell| cell.estimand == estimand)
        .collect()
}

/// The verdict on one method for one estimand.
#[derive(Debug, Clone, PartialEq)]
pub struct VerdictLine {
    /// Estimand index.
    pub estimand: usize,
    /// Method index.
    pub method: usize,
    /// One word per truth: `honest`, `not honest` or `undecided`.
    pub per_truth: Vec<&'static str>,
    /// The word over all truths.
    pub overall: &'static str,
    /// Largest price over the truths, if it is known.
    pub price: Option<f64>,
    /// Whether this is the cheapest honest method for the estimand.
    pub cheapest: bool,
}

/// Value of a swept scenario entry.
#[derive(Debug, Clone, PartialEq)]
pub enum AxisValue {
    /// A number.
    Number(f64),
    /// A word, such as the name of a rule.
    Word(String),
}

/// One point of a sweep.
#[derive(Debug, Clone)]
pub struct SweepPoint {
    /// Value of each axis, in the order of the sweep's axes.
    pub axes: Vec<AxisValue>,
    /// What was scored there.
    pub scored: Scored,
}

#[cfg(test)]
mod tests {
    use super::super::fixtures;

    #[test]
    fn null_is_recognised_through_rounding() {
        let mut scored = fixtures::scored(2);
        scored.nulls[0] = 0.3;
        scored.true_values[1][0] = 0.1 + 0.2; // one unit in the last place above 0.3
        assert!(scored.null_holds(1, 0));
        scored.true_values[1][0] = 0.3001;
        assert!(!scored.null_holds(1, 0));
    }
}
