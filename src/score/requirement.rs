//! Stated requirements against what was found.
//!
//! A requirement on a measure is met when the value itself satisfies the bound in every matching
//! cell; its Monte Carlo standard error is shown beside it, not built into the bound. Where doubt
//! must be covered, `honest` is the requirement to state: it is met by the verdict alone.

use crate::plan::{Bound, Plan, Requirement};

use super::measure::{CellMeasures, Measure, TruthMeasures};
use super::verdict::{EstimandVerdict, TruthVerdict, Verdict};

/// Names of truths, estimands and methods for texts.
#[derive(Debug, Clone, Default)]
pub struct Labels {
    /// Truth names, by index.
    pub truths: Vec<String>,
    /// Estimand names, by index.
    pub estimands: Vec<String>,
    /// Method labels, by index.
    pub methods: Vec<String>,
}

impl Labels {
    /// Names of a plan.
    #[must_use]
    pub fn of(plan: &Plan) -> Self {
        Self {
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
        }
    }
}

/// The matching cell that is farthest from meeting a requirement.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Offender {
    /// Truth index.
    pub truth: usize,
    /// Estimand index.
    pub estimand: usize,
    /// Method index.
    pub method: usize,
    /// Value of the measure there (the coverage for `honest`); `None` if it is not defined there.
    pub value: Option<f64>,
    /// Monte Carlo standard error of the value.
    pub mcse: Option<f64>,
    /// Verdict there, for `honest`.
    pub verdict: Option<Verdict>,
}

impl Offender {
    /// The place in words: method, estimand and truth.
    #[must_use]
    pub fn place(&self, labels: &Labels) -> String {
        format!(
            "{} for {} under {}",
            name(&labels.methods, self.method, "method"),
            name(&labels.estimands, self.estimand, "estimand"),
            name(&labels.truths, self.truth, "truth"),
        )
    }
}

/// What became of one requirement.
#[derive(Debug, Clone, PartialEq)]
pub struct RequirementOutcome {
    /// The requirement in words.
    pub requirement: String,
    /// Whether it is met in every matching cell. A requirement that matches no cell where its
    /// measure is defined is not met.
    pub met: bool,
    /// The worst matching cell; `None` if there is none.
    pub worst: Option<Offender>,
}

/// Compares every requirement with measures and verdicts.
///
/// A measure that is not defined in a matching cell leaves the requirement unmet, since nothing
/// was shown; the one exception is relative bias at a true value of zero, where the cell has
/// nothing to meet and is passed over.
#[must_use]
pub fn evaluate(
    requirements: &[Requirement],
    labels: &Labels,
    measures: &[TruthMeasures],
    verdicts: &[EstimandVerdict],
) -> Vec<RequirementOutcome> {
    requirements
        .iter()
        .map(|requirement| {
            let candidates = match requirement.bound {
                Bound::Honest => honest_candidates(requirement, verdicts),
                Bound::AtLeast(bound) => measured(requirement, measures, |value| value - bound),
                Bound::AtMost(bound) => measured(requirement, measures, |value| bound - value),
            };
            // The first of equally bad cells, so that the answer does not depend on chance order.
            let worst = candidates
                .into_iter()
                .min_by(|one, two| one.margin.total_cmp(&two.margin));
            RequirementOutcome {
                requirement: describe(requirement, labels),
                met: worst.is_some_and(|worst| worst.margin >= 0.0),
                worst: worst.map(|worst| worst.offender),
            }
        })
        .collect()
}

/// A matching cell and how far it is on the right side of the bound.
#[derive(Debug, Clone, Copy)]
struct Candidate {
    margin: f64,
    offender: Offender,
}

fn selected(choice: Option<usize>, index: usize) -> bool {
    choice.is_none_or(|chosen| chosen == index)
}

fn measured(
    requirement: &Requirement,
    measures: &[TruthMeasures],
    margin: impl Fn(f64) -> f64,
) -> Vec<Candidate> {
    let Some(measure) = Measure::from_key(&requirement.measure) else {
        return Vec::new();
    };
    let mut candidates = Vec::new();
    for truth in measures
        .iter()
        .filter(|truth| selected(requirement.truth, truth.truth))
    {
        for cell in &truth.cells {
            let wanted = selected(requirement.estimand, cell.estimand)
                && selected(requirement.method, cell.method);
            if !wanted || has_nothing_to_meet(cell, measure) {
                continue;
            }
            let found = cell.get(measure);
            candidates.push(Candidate {
                margin: found.map_or(f64::NEG_INFINITY, |found| margin(found.value)),
                offender: Offender {
                    truth: truth.truth,
                    estimand: cell.estimand,
                    method: cell.method,
                    value: found.map(|found| found.value),
                    mcse: found.map(|found| found.mcse),
                    verdict: None,
                },
            });
        }
    }
    candidates
}

/// Relative bias is absent beside a bias only when the true value is zero.
fn has_nothing_to_meet(cell: &CellMeasures, measure: Measure) -> bool {
    measure == Measure::RelativeBias
        && cell.get(Measure::RelativeBias).is_none()
        && cell.get(Measure::Bias).is_some()
}

fn honest_candidates(requirement: &Requirement, verdicts: &[EstimandVerdict]) -> Vec<Candidate> {
    let mut candidates = Vec::new();
    for estimand in verdicts
        .iter()
        .filter(|one| selected(requirement.estimand, one.estimand))
    {
        for method in &estimand.methods {
            if !selected(requirement.method, method.method) {
                continue;
            }
            for truth in method
                .truths
                .iter()
                .filter(|one| selected(requirement.truth, one.truth))
            {
                candidates.push(Candidate {
                    margin: honest_margin(truth),
                    offender: Offender {
                        truth: truth.truth,
                        estimand: estimand.estimand,
                        method: method.method,
                        value: (!truth.coverage.is_nan()).then_some(truth.coverage),
                        mcse: (!truth.coverage_mcse.is_nan()).then_some(truth.coverage_mcse),
                        verdict: Some(truth.verdict),
                    },
                });
            }
        }
    }
    candidates
}

/// Orders by verdict first and coverage second; coverage lies in `[0, 1]`, so a step of two
/// between verdicts keeps them apart.
fn honest_margin(truth: &TruthVerdict) -> f64 {
    let coverage = if truth.coverage.is_nan() {
        0.0
    } else {
        truth.coverage
    };
    match truth.verdict {
        Verdict::Honest => coverage,
        Verdict::Undecided => coverage - 2.0,
        Verdict::NotHonest => coverage - 4.0,
    }
}

fn name(names: &[String], index: usize, kind: &str) -> String {
    names
        .get(index)
        .cloned()
        .unwrap_or_else(|| format!("{kind} {}", index + 1))
}

/// The requirement in words.
fn describe(requirement: &Requirement, labels: &Labels) -> String {
    let part = |choice: Option<usize>, names: &[String], kind: &str| match choice {
        Some(index) => name(names, index, kind),
        None => format!("every {kind}"),
    };
    let method = part(requirement.method, &labels.methods, "method");
    let estimand = part(requirement.estimand, &labels.estimands, "estimand");
    let truth = part(requirement.truth, &labels.truths, "truth");
    let place = format!("for {estimand} under {truth}");
    match requirement.bound {
        Bound::Honest => format!("{method} is honest {place}"),
        Bound::AtLeast(bound) => {
            format!(
                "{} of {method} {place} is at least {bound}",
                requirement.measure
            )
        }
        Bound::AtMost(bound) => {
            format!(
                "{} of {method} {place} is at most {bound}",
                requirement.measure
            )
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::measure::MeasureValue;
    use super::super::verdict::verdicts;
    use super::*;
    use crate::plan::Verdicts;

    fn labels() -> Labels {
        Labels {
            truths: vec!["no effect".into(), "worthwhile effect".into()],
            estimands: vec!["elevation effect".into()],
            methods: vec!["least squares".into(), "batch combined".into()],
        }
    }

    fn requirement(measure: &str, method: Option<usize>, bound: Bound) -> Requirement {
        Requirement {
            measure: measure.into(),
            method,
            estimand: None,
            truth: None,
            bound,
        }
    }

    /// Two truths; coverage of each method under each, and bias equal to truth + method tenths.
    fn measures() -> Vec<TruthMeasures> {
        let coverage = [[0.95, 0.955], [0.82, 0.957]];
        (0..2)
            .map(|truth| TruthMeasures {
                truth,
                trials: 20_000,
                operating: Vec::new(),
                cells: (0..2)
                    .map(|method| CellMeasures {
                        estimand: 0,
                        method,
                        failures: Vec::new(),
                        values: [
                            (Measure::Bias, [[0.0, 0.1], [0.1, 0.2]][truth][method]),
                            (Measure::Coverage, coverage[truth][method]),
                        ]
                        .into_iter()
                        .map(|(measure, value)| MeasureValue {
                            measure,
                            value,
                            mcse: 0.002,
                            limits: None,
                            trials_used: 20_000,
                        })
                        .collect(),
                    })
                    .collect(),
            })
            .collect()
    }

    fn outcome(requirement: Requirement) -> RequirementOutcome {
        let measures = measures();
        let rule = Verdicts {
            tolerance: 0.01,
            confidence: 0.95,
            reference: 0,
        };
        let verdicts = verdicts(&measures, 0.95, &rule);
        evaluate(&[requirement], &labels(), &measures, &verdicts).remove(0)
    }

    #[test]
    fn the_worst_cell_decides() {
        let least_squares = outcome(requirement("coverage", Some(0), Bound::AtLeast(0.94)));
        assert!(!least_squares.met);
        let worst = least_squares.worst.unwrap();
        assert_eq!((worst.truth, worst.method, worst.value), (1, 0, Some(0.82)));
        assert_eq!(
            worst.place(&labels()),
            "least squares for elevation effect under worthwhile effect"
        );
        assert_eq!(
            least_squares.requirement,
            "coverage of least squares for every estimand under every truth is at least 0.94"
        );
        assert!(outcome(requirement("coverage", Some(1), Bound::AtLeast(0.955))).met);
        let bias = outcome(requirement("bias", None, Bound::AtMost(0.15)));
        assert!(!bias.met);
        assert_eq!(bias.worst.unwrap().value, Some(0.2));
    }

    #[test]
    fn a_chosen_truth_is_the_only_one_that_counts() {
        let mut chosen = requirement("coverage", Some(0), Bound::AtLeast(0.94));
        chosen.truth = Some(0);
        let chosen = outcome(chosen);
        assert!(chosen.met);
        assert_eq!(chosen.worst.unwrap().truth, 0);
    }

    #[test]
    fn honest_follows_the_verdict() {
        let batch_combined = outcome(requirement("honest", Some(1), Bound::Honest));
        assert!(batch_combined.met);
        assert_eq!(batch_combined.worst.unwrap().verdict, Some(Verdict::Honest));
        let every = outcome(requirement("honest", None, Bound::Honest));
        assert!(!every.met);
        assert_eq!(
            every.requirement,
            "every method is honest for every estimand under every truth"
        );
        let worst = every.worst.unwrap();
        assert_eq!(
            (worst.method, worst.truth, worst.verdict),
            (0, 1, Some(Verdict::NotHonest))
        );
    }

    #[test]
    fn what_is_not_defined_is_not_met() {
        // No price was measured here.
        let price = outcome(requirement("price", Some(0), Bound::AtMost(2.0)));
        assert!(!price.met);
        assert_eq!(price.worst.unwrap().value, None);
        // Relative bias is absent although bias is there: every true value is zero, so nothing
        // was shown at all.
        let relative = outcome(requirement("relative-bias", Some(0), Bound::AtMost(0.1)));
        assert!(!relative.met);
        assert_eq!(relative.worst, None);
    }
}
