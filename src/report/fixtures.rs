//! Invented results for the tests of this module.

use super::{Scored, VerdictLine};
use crate::methods::NoAnswer;
use crate::score::{CellMeasures, Measure, MeasureValue, OperatingValue, TruthMeasures};

/// Trials of every invented truth.
pub(super) const TRIALS: u64 = 10_000;

/// Labels, from short to far too long.
pub(super) const LABELS: [&str; 9] = [
    "least-squares",
    "batch-combined",
    "first-batch",
    "inverse-variance",
    "w-decorrelation (replayed λ)",
    "least-squares, heteroscedasticity-consistent HC3 with the small-sample correction",
    "ridge <λ = 0.5> & \"usual\" interval",
    "last-batch",
    "batch-combined, equal weights",
];

const COVERAGES: [f64; 9] = [0.931, 0.951, 0.949, 0.55, 0.968, 0.88, 0.71, 1.0, 0.944];

fn value(measure: Measure, value: f64, mcse: f64) -> MeasureValue {
    MeasureValue {
        measure,
        value,
        mcse,
        limits: None,
        trials_used: TRIALS,
    }
}

fn share(measure: Measure, p: f64) -> MeasureValue {
    let mcse = (p * (1.0 - p) / 10_000.0).sqrt();
    let lower = (p - 1.96 * mcse - 0.000_1).max(0.0);
    let upper = (p + 1.96 * mcse + 0.000_1).min(1.0);
    MeasureValue {
        measure,
        value: p,
        mcse,
        limits: Some((lower, upper)),
        trials_used: TRIALS,
    }
}

fn cell(truth: usize, estimand: usize, method: usize) -> CellMeasures {
    let step = f64::from(u8::try_from(method).unwrap());
    let coverage = COVERAGES[method] - if truth == 1 && method == 0 { 0.02 } else { 0.0 };
    let failures = if method == 1 {
        vec![(NoAnswer::RankDeficient, 7), (NoAnswer::EmptyBatch, 5)]
    } else {
        Vec::new()
    };
    CellMeasures {
        estimand,
        method,
        values: vec![
            value(Measure::Bias, -0.0123 + 0.004 * step, 0.000_7),
            value(Measure::SeRatio, 0.992, 0.007),
            share(Measure::Coverage, coverage),
            share(Measure::MissesBelow, 0.7 * (1.0 - coverage)),
            share(Measure::MissesAbove, 0.3 * (1.0 - coverage)),
            value(Measure::MeanWidth, 0.2543 * (1.0 + 0.21 * step), 0.000_4),
            value(
                Measure::Price,
                1.0 + 0.21 * step,
                if method == 0 { 0.0 } else { 0.002 },
            ),
            share(
                Measure::RejectionTwoSided,
                if truth == 0 { 0.061 } else { 0.873 },
            ),
            share(Measure::NoAnswer, if method == 1 { 0.001_2 } else { 0.0 }),
        ],
        failures,
    }
}

fn operating(characteristic: &str, subject: &str, value: f64, mcse: f64) -> OperatingValue {
    OperatingValue {
        characteristic: characteristic.to_owned(),
        subject: subject.to_owned(),
        value,
        mcse,
        trials_used: TRIALS,
    }
}

/// Two truths, two estimands, up to nine methods.
pub(super) fn scored(methods: usize) -> Scored {
    let measures = (0..2)
        .map(|truth| TruthMeasures {
            truth,
            trials: TRIALS,
            cells: (0..2)
                .flat_map(|estimand| (0..methods).map(move |method| cell(truth, estimand, method)))
                .collect(),
            operating: vec![
                operating("units", "", 240.0, 0.0),
                operating("arm-share", "early", 0.612, 0.003),
                operating("mean-outcome", "", 1.271, 0.0011),
            ],
        })
        .collect();
    let verdicts = (0..2)
        .flat_map(|estimand| {
            (0..methods).map(move |method| VerdictLine {
                estimand,
                method,
                per_truth: match method {
                    0 => vec!["not honest", "not honest"],
                    1 => vec!["honest", "honest"],
                    _ => vec!["honest", "undecided"],
                },
                overall: ["not honest", "honest", "undecided"][method.min(2)],
                price: Some([1.0, 1.21, 1.42][method.min(2)]),
                cheapest: method == 1,
            })
        })
        .collect();
    Scored {
        title: "Saltmarsh replanting (invented)".to_owned(),
        aim: "Does steering season 2 spoil the interval?".to_owned(),
        level: 0.95,
        tolerance: 0.01,
        confidence: 0.95,
        reference: 0,
        truths: vec![
            "no effect".to_owned(),
            "worthwhile effect, \"strong\" drift".to_owned(),
        ],
        estimands: vec![
            "elevation effect".to_owned(),
            "late, minus early".to_owned(),
        ],
        methods: LABELS[..methods]
            .iter()
            .map(|&label| label.to_owned())
            .collect(),
        true_values: vec![vec![0.0, 0.0], vec![0.3, 0.25]],
        nulls: vec![0.0, 0.0],
        measures,
        verdicts,
    }
}
