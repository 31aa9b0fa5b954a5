//! Small exact cases and properties of tally and measures.

use proptest::prelude::*;

use super::*;
use crate::methods::{Answer, Estimate, NoAnswer};

fn layout(methods: usize, true_value: f64) -> Layout {
    Layout {
        estimands: 1,
        methods,
        arms: 0,
        reference: 0,
        true_values: vec![true_value],
        nulls: vec![0.0],
        level: 0.95,
    }
}

/// Block of trials of a study without arms, `estimates` trial-major.
fn block(methods: usize, estimates: &[Estimate]) -> BlockRecord {
    let trials = estimates.len() / methods;
    BlockRecord {
        trials,
        estimates: estimates.to_vec(),
        units: vec![20.0; trials],
        arm_units: Vec::new(),
        mean_outcomes: vec![0.0; trials],
    }
}

fn tally(layout: &Layout, estimates: &[Estimate], trials_per_block: usize) -> Tally {
    let mut tally = Tally::new(layout.clone());
    for part in estimates.chunks(trials_per_block * layout.methods) {
        tally.absorb(&block(layout.methods, part));
    }
    tally
}

fn close(cell: &CellMeasures, measure: Measure, value: f64, mcse: f64) {
    let found = cell
        .get(measure)
        .unwrap_or_else(|| panic!("{measure:?} is absent"));
    assert!(
        (found.value - value).abs() < 1e-9,
        "{measure:?}: {} for {value}",
        found.value
    );
    assert!(
        (found.mcse - mcse).abs() < 1e-9,
        "{measure:?}: mcse {} for {mcse}",
        found.mcse
    );
}

/// Invented estimates; values by our own computation, formulas of Morris, White & Crowther
/// (2019), Table 6 (recalled).
#[test]
fn ten_replicates() {
    let points = [0.12, -0.05, 0.33, 0.08, 0.21, 0.17, -0.02, 0.26, 0.11, 0.04];
    let standard_errors = [0.11, 0.12, 0.10, 0.13, 0.12, 0.11, 0.10, 0.12, 0.13, 0.11];
    let estimates: Vec<Estimate> = points
        .iter()
        .zip(standard_errors)
        .map(|(&point, se)| Ok(Answer::symmetric(point, se, 1.959_963_984_540_054)))
        .collect();
    for trials_per_block in [1, 3, 10] {
        let measures = tally(&layout(1, 0.1), &estimates, trials_per_block).measures(0, &[]);
        let cell = &measures.cells[0];
        close(cell, Measure::Bias, 0.025, 0.038_100_743_649_785_454);
        close(cell, Measure::RelativeBias, 0.25, 0.381_007_436_497_854_5);
        close(
            cell,
            Measure::EmpiricalSe,
            0.120_485_130_479_518_8,
            0.028_398_617_598_071_243,
        );
        close(
            cell,
            Measure::ModelSe,
            0.115_455_619_178_972_83,
            0.003_405_109_938_522_302,
        );
        // Published as relative error in per cent of the empirical SE.
        close(
            cell,
            Measure::SeRatio,
            1.0 - 0.041_743_834_119_023_715,
            0.227_624_430_726_944_63,
        );
        // Mean squared error 0.01369 with error 0.005246...; the root by the delta method.
        let rmse = 0.013_69_f64.sqrt();
        close(
            cell,
            Measure::Rmse,
            rmse,
            0.005_246_087_430_965_419 / (2.0 * rmse),
        );
        close(cell, Measure::Coverage, 0.9, 0.094_868_329_805_051_37);
        close(
            cell,
            Measure::BiasEliminatedCoverage,
            0.9,
            0.094_868_329_805_051_37,
        );
        close(
            cell,
            Measure::RejectionTwoSided,
            0.2,
            0.126_491_106_406_735_2,
        );
        close(cell, Measure::NoAnswer, 0.0, 0.0);
        // The paired width of the reference to itself.
        close(cell, Measure::Price, 1.0, 0.0);
    }
}

/// Facts of Morris, White & Crowther (2019), section 5.3 (recalled): 1900 trials for a Monte
/// Carlo standard error of 0.5 % at a coverage of 95 %, 10 000 at 50 %; 0.545 % and 1.25 % with
/// 1600 trials.
#[test]
fn standard_error_of_coverage() {
    let hit: Estimate = Ok(Answer {
        point: 0.0,
        standard_error: 1.0,
        lower: -1.0,
        upper: 1.0,
    });
    let miss: Estimate = Ok(Answer {
        point: 0.0,
        standard_error: 1.0,
        lower: 0.5,
        upper: 1.0,
    });
    for (trials, hits, mcse, digits) in [
        (1900, 1805, 0.005, 1e-12),
        (10_000, 5000, 0.005, 1e-12),
        (1600, 1520, 0.005_45, 6e-6),
        (1600, 800, 0.0125, 1e-12),
    ] {
        let mut estimates = vec![hit; hits];
        estimates.resize(trials, miss);
        let measures = tally(&layout(1, 0.0), &estimates, 64).measures(0, &[]);
        let coverage = measures.cells[0].get(Measure::Coverage).unwrap();
        assert!(
            (coverage.mcse - mcse).abs() < digits,
            "{trials}: {}",
            coverage.mcse
        );
    }
}

#[test]
fn failures_are_counted_and_cover_nothing() {
    let estimates = [
        Ok(Answer::symmetric(0.2, 0.5, 2.0)),
        Err(NoAnswer::EmptyBatch),
        Err(NoAnswer::RankDeficient),
        Ok(Answer::symmetric(f64::NAN, 0.5, 2.0)),
        Err(NoAnswer::EmptyBatch),
    ];
    let measures = tally(&layout(1, 0.0), &estimates, 2).measures(3, &[]);
    let cell = &measures.cells[0];
    assert_eq!(measures.truth, 3);
    assert_eq!(measures.trials, 5);
    assert_eq!(
        cell.failures,
        [
            (NoAnswer::RankDeficient, 1),
            (NoAnswer::EmptyBatch, 2),
            (NoAnswer::DegenerateVariance, 1)
        ]
    );
    let share = |measure| cell.get(measure).unwrap().value;
    assert!((share(Measure::NoAnswer) - 0.8).abs() < 1e-15);
    assert!((share(Measure::Coverage) - 0.2).abs() < 1e-15);
    assert_eq!(cell.get(Measure::Coverage).unwrap().trials_used, 5);
    let bias = cell.get(Measure::Bias).unwrap();
    assert!((bias.value - 0.2).abs() < 1e-15);
    assert_eq!(bias.trials_used, 1);
    assert!(bias.mcse.is_infinite(), "one answer has no standard error");
    assert_eq!(cell.get(Measure::RelativeBias), None);
    assert_eq!(cell.get(Measure::EmpiricalSe), None);
}

#[test]
fn nothing_answered_and_nothing_absorbed() {
    let nothing = Tally::new(layout(1, 0.0)).measures(0, &[]);
    assert!(nothing.cells[0].values.is_empty());
    let failed = tally(&layout(1, 0.0), &[Err(NoAnswer::EmptyBatch); 3], 2).measures(0, &[]);
    let keys: Vec<&str> = failed.cells[0]
        .values
        .iter()
        .map(|value| value.measure.key())
        .collect();
    assert_eq!(
        keys,
        [
            "coverage",
            "bias-eliminated-coverage",
            "misses-below",
            "misses-above",
            "rejection-two-sided",
            "rejection-above",
            "rejection-below",
            "no-answer"
        ]
    );
}

/// The price compares widths in trials that both methods answered, and nothing else.
#[test]
fn price_is_paired() {
    let wide = |half: f64| {
        Ok(Answer {
            point: 0.0,
            standard_error: 1.0,
            lower: -half,
            upper: half,
        })
    };
    let estimates = [
        wide(1.0),
        wide(2.0),
        wide(3.0),
        wide(4.0),
        wide(2.0),
        wide(6.0),
        wide(50.0),
        Err(NoAnswer::EmptyBatch),
        Err(NoAnswer::EmptyBatch),
        wide(70.0),
    ];
    let measures = tally(&layout(2, 0.0), &estimates, 2).measures(0, &[]);
    // Widths 4, 8, 12 against 2, 6, 4: ratio 2; residuals 0, -4, 4 over mean width 4 give
    // √(16 / 3) / 4.
    let price = measures.cells[1].get(Measure::Price).unwrap();
    assert!((price.value - 2.0).abs() < 1e-14);
    assert!((price.mcse - (16.0_f64 / 3.0).sqrt() / 4.0).abs() < 1e-14);
    assert_eq!(price.trials_used, 3);
    close(&measures.cells[0], Measure::Price, 1.0, 0.0);
}

/// Values in report order, every measure present in an ordinary case.
#[test]
fn report_order() {
    let estimates: Vec<Estimate> = (0..50)
        .map(|k| Ok(Answer::symmetric(f64::from(k * 7 % 50) / 25.0, 0.4, 2.0)))
        .collect();
    let measures = tally(&layout(1, 1.0), &estimates, 8).measures(0, &[]);
    let found: Vec<Measure> = measures.cells[0]
        .values
        .iter()
        .map(|value| value.measure)
        .collect();
    assert_eq!(found, Measure::ALL);
    // Fifty equal steps: no skewness, kurtosis 9/5 · (n² - 7/3)/(n² - 1).
    let kurtosis = measures.cells[0].get(Measure::Kurtosis).unwrap();
    assert!((kurtosis.value - 1.8 * (2500.0 - 7.0 / 3.0) / 2499.0).abs() < 1e-9);
    assert!(
        measures.cells[0]
            .get(Measure::Skewness)
            .unwrap()
            .value
            .abs()
            < 1e-9
    );
}

#[test]
fn figures_hold_every_answer() {
    let estimates: Vec<Estimate> = (0..200)
        .map(|k| Ok(Answer::symmetric(f64::from(k) / 10.0 - 10.0, 1.0, 2.0)))
        .collect();
    let tally = tally(&layout(1, 0.0), &estimates, 16);
    let distributions = tally.distributions();
    assert_eq!(distributions.len(), 1);
    let studentised = &distributions[0].studentised;
    let inner: f64 = studentised.counts.iter().sum();
    assert!((inner + studentised.below + studentised.above - 200.0).abs() < 1e-9);
    assert!((studentised.below - 40.0).abs() <= 1.0);
    let errors = tally.error_histogram(0, &[-20.0, 0.0, 20.0]);
    assert_eq!(
        errors,
        distributions[0].error_histogram(&[-20.0, 0.0, 20.0])
    );
    assert!((errors.counts[0] - 100.0).abs() <= 1.0, "{errors:?}");
}

fn any_estimate() -> impl Strategy<Value = Estimate> {
    prop_oneof![
        8 => (-3.0..3.0_f64, 0.05..2.0_f64)
            .prop_map(|(point, se)| Ok(Answer::symmetric(point, se, 1.5))),
        1 => Just(Err(NoAnswer::BatchRankDeficient)),
        1 => Just(Ok(Answer::symmetric(f64::INFINITY, 1.0, 2.0))),
    ]
}

/// Everything a reader can see, bit by bit.
fn bits(tally: &Tally) -> Vec<(usize, Measure, u64, u64)> {
    tally
        .measures(0, &[])
        .cells
        .iter()
        .enumerate()
        .flat_map(|(index, cell)| {
            cell.values.iter().map(move |value| {
                (
                    index,
                    value.measure,
                    value.value.to_bits(),
                    value.mcse.to_bits(),
                )
            })
        })
        .collect()
}

proptest! {
    /// Summaries made apart and merged in order are the same tally, bit for bit.
    #[test]
    fn merged_summaries_have_the_bits_of_absorbed_blocks(
        estimates in prop::collection::vec(any_estimate(), 2..200),
        trials_per_block in 1..40_usize,
    ) {
        let methods = 2;
        let whole = estimates.len() / methods * methods;
        let estimates = &estimates[..whole];
        let layout = layout(methods, 0.25);
        let absorbed = tally(&layout, estimates, trials_per_block);
        let summaries: Vec<BlockSummary> = estimates
            .chunks(trials_per_block * methods)
            .rev() // made in another order than merged
            .map(|part| BlockSummary::of(&layout, &block(methods, part)))
            .collect();
        let mut merged = Tally::new(layout);
        for summary in summaries.iter().rev() {
            merged.merge(summary);
        }
        prop_assert_eq!(bits(&absorbed), bits(&merged));
    }

    /// Every trial is a hit, a miss on one side, or without an answer.
    #[test]
    fn shares_sum_to_one(estimates in prop::collection::vec(any_estimate(), 1..150)) {
        let measures = tally(&layout(1, 0.25), &estimates, 16).measures(0, &[]);
        let share = |measure| measures.cells[0].get(measure).unwrap().value;
        let sum = share(Measure::Coverage)
            + share(Measure::MissesBelow)
            + share(Measure::MissesAbove)
            + share(Measure::NoAnswer);
        prop_assert!((sum - 1.0).abs() < 1e-12);
        let rejections = share(Measure::RejectionAbove) + share(Measure::RejectionBelow);
        prop_assert!((rejections - share(Measure::RejectionTwoSided)).abs() < 1e-12);
    }

    /// Direct computation of the measures that sketches and bins only approximate.
    #[test]
    fn sketched_measures_are_near_the_direct_ones(
        answers in prop::collection::vec((-3.0..3.0_f64, 0.05..2.0_f64), 5..150),
    ) {
        let estimates: Vec<Estimate> =
            answers.iter().map(|&(point, se)| Ok(Answer::symmetric(point, se, 1.5))).collect();
        let measures = tally(&layout(1, 0.0), &estimates, 16).measures(0, &[]);
        let cell = &measures.cells[0];
        let found = |measure| cell.get(measure).unwrap().value;
        let n = moments::real(answers.len() as u64);

        let mut widths: Vec<f64> = answers.iter().map(|&(_, se)| 3.0 * se).collect();
        widths.sort_by(f64::total_cmp);
        let median = widths[answers.len().div_ceil(2) - 1];
        prop_assert!((found(Measure::MedianWidth) / median - 1.0).abs() <= 1.0 / 256.0);

        let mean = answers.iter().map(|answer| answer.0).sum::<f64>() / n;
        let held =
            answers.iter().filter(|&&(point, se)| (point - mean).abs() <= 1.5 * se).count();
        let near = answers
            .iter()
            .flat_map(|&(point, se)| [point - 1.5 * se, point + 1.5 * se])
            .filter(|limit| sketch::bin_key(*limit) == sketch::bin_key(mean))
            .count();
        let difference = found(Measure::BiasEliminatedCoverage) * n - moments::real(held as u64);
        prop_assert!(difference.abs() <= moments::real(near as u64) + 1e-9);

        let mut z: Vec<f64> = answers.iter().map(|&(point, se)| point / se).collect();
        z.sort_by(f64::total_cmp);
        let mut exact = 0.0_f64;
        for (rank, &z) in (0_u64..).zip(&z) {
            let normal = crate::numerics::distribution::normal_cdf(z);
            exact = exact.max((normal - moments::real(rank) / n).abs());
            exact = exact.max((moments::real(rank + 1) / n - normal).abs());
        }
        let binned = found(Measure::KolmogorovDistance);
        prop_assert!(binned <= exact + 1e-12 && exact <= binned + 1.0 / 4096.0 + 1e-12);
    }
}
