//! Seeded simulations: are the Monte Carlo standard errors what they claim?

use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{ChiSquared, Distribution, StandardNormal};

use super::moments::{CentralMoments, real};
use super::*;
use crate::methods::{Answer, Estimate, NoAnswer};

const TRIALS_PER_BLOCK: usize = 50;
const CRITICAL: f64 = 1.959_963_984_540_054;

fn layout(methods: usize) -> Layout {
    Layout {
        estimands: 1,
        methods,
        arms: 0,
        reference: 0,
        true_values: vec![2.0],
        nulls: vec![2.2],
        level: 0.95,
    }
}

/// Replays trials whose estimates are drawn by `draw`, one per method.
fn simulate(
    trials: usize,
    methods: usize,
    rng: &mut ChaCha8Rng,
    draw: impl Fn(&mut ChaCha8Rng, &mut Vec<Estimate>),
) -> TruthMeasures {
    let mut tally = Tally::new(layout(methods));
    let mut left = trials;
    while left > 0 {
        let size = left.min(TRIALS_PER_BLOCK);
        let mut estimates = Vec::with_capacity(size * methods);
        for _ in 0..size {
            draw(rng, &mut estimates);
        }
        tally.absorb(&BlockRecord {
            trials: size,
            estimates,
            units: vec![1.0; size],
            arm_units: Vec::new(),
            mean_outcomes: vec![0.0; size],
        });
        left -= size;
    }
    tally.measures(0, &[])
}

fn normal(rng: &mut ChaCha8Rng) -> f64 {
    StandardNormal.sample(rng)
}

/// Normal errors with known standard error: every measure has a known value. Each is compared
/// within 4 Monte Carlo standard errors; with ten comparisons the false-alarm bound is
/// 10 · 6.4e-5 = 6.4e-4 for a new seed.
#[test]
fn normal_errors_with_known_standard_error() {
    let mut rng = ChaCha8Rng::seed_from_u64(101);
    let measures = simulate(40_000, 1, &mut rng, |rng, estimates| {
        estimates.push(Ok(Answer::symmetric(
            2.0 + 0.5 * normal(rng),
            0.5,
            CRITICAL,
        )));
    });
    let cell = &measures.cells[0];
    for (measure, expected) in [
        (Measure::Bias, 0.0),
        (Measure::RelativeBias, 0.0),
        (Measure::EmpiricalSe, 0.5),
        (Measure::SeRatio, 1.0),
        (Measure::Rmse, 0.5),
        (Measure::Coverage, 0.95),
        (Measure::BiasEliminatedCoverage, 0.95),
        (Measure::MissesBelow, 0.025),
        (Measure::Skewness, 0.0),
        (Measure::Kurtosis, 3.0),
    ] {
        let found = cell.get(measure).unwrap();
        let distance = (found.value - expected).abs() / found.mcse;
        assert!(
            distance < 4.0,
            "{measure:?}: {} is {distance} errors off",
            found.value
        );
    }
    let exact = |measure| {
        cell.get(measure)
            .map(|found| (found.value, found.mcse))
            .unwrap()
    };
    assert!((exact(Measure::ModelSe).0 - 0.5).abs() < 1e-12);
    // The width is the same up to rounding, so its median is exact.
    assert!((exact(Measure::MedianWidth).0 - CRITICAL).abs() < 1e-12);
    assert!(exact(Measure::MedianWidth).1 < 1e-12);
    // P(√m D > 1.95) = 2 exp(-2 · 1.95²) = 1e-3 by the law of Kolmogorov.
    assert!(exact(Measure::KolmogorovDistance).0 < 1.95 / 200.0);
    let limits = cell.get(Measure::Coverage).unwrap().limits.unwrap();
    assert!(limits.0 < 0.95 && 0.95 < limits.1);
}

/// The mean claimed error of every measure against the spread of the measure over replications.
///
/// 400 replications of 500 trials know a spread to 3.5 % (one standard error, normal measures),
/// so 15 % is more than four standard errors for each of the twenty measures: the false-alarm
/// bound is 20 · 6.4e-5 = 1.3e-3 for a new seed, if the claimed errors are right on average.
/// The method scored is biased, its estimates are correlated with those of the reference, its
/// standard errors follow the root of a scaled chi-squared law, and one trial in ten has no answer.
#[test]
fn claimed_errors_match_the_spread_of_replications() {
    const REPLICATIONS: usize = 400;
    const TRIALS: usize = 500;
    let mut rng = ChaCha8Rng::seed_from_u64(202);
    let chi_squared = ChiSquared::<f64>::new(100.0).unwrap();
    let mut values = vec![Vec::new(); Measure::ALL.len()];
    let mut errors = vec![Vec::new(); Measure::ALL.len()];
    for _ in 0..REPLICATIONS {
        let measures = simulate(TRIALS, 2, &mut rng, |rng, estimates| {
            let shared = normal(rng);
            let standard_error = (chi_squared.sample(rng) / 100.0).sqrt();
            estimates.push(Ok(Answer::symmetric(
                2.5 + shared,
                standard_error,
                CRITICAL,
            )));
            let wider = 1.3 * standard_error * (0.2 * normal(rng)).exp();
            let own = 0.8 * shared + 0.6 * normal(rng);
            let answered = normal(rng) < 1.281_551_565_544_6;
            estimates.push(if answered {
                let point = 2.5 + own * standard_error;
                Ok(Answer {
                    point,
                    standard_error,
                    lower: point - wider,
                    upper: point + wider,
                })
            } else {
                Err(NoAnswer::EmptyBatch)
            });
        });
        for (index, measure) in Measure::ALL.into_iter().enumerate() {
            let found = measures.cells[1].get(measure).unwrap();
            values[index].push(found.value);
            errors[index].push(found.mcse);
        }
    }
    for (index, measure) in Measure::ALL.into_iter().enumerate() {
        let spread = CentralMoments::<2>::of(&values[index]).variance().sqrt();
        let claimed = errors[index].iter().sum::<f64>() / real(REPLICATIONS as u64);
        let ratio = claimed / spread;
        assert!((0.85..1.15).contains(&ratio), "{measure:?}: {ratio}");
    }
}
