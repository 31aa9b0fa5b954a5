//! Tests of coverage against a bound: exact p-values, their adjustment, the trials they need.

use crate::numerics::distribution::{binomial_cdf, normal_quantile};

use super::measure::{CellMeasures, Measure};
use super::moments::real;

/// Chance of a decision at the number of trials that is offered for an undecided method.
const DECISION_CHANCE: f64 = 0.8;
/// Coverage that would take more trials than this to tell from the bound is practically at it.
const MOST_TRIALS: f64 = 1e8;

/// p-values against "coverage below the bound" and "coverage at least the bound".
pub(crate) fn p_values(cell: &CellMeasures, bound: f64) -> [f64; 2] {
    let Some(coverage) = cell.get(Measure::Coverage) else {
        return [1.0, 1.0];
    };
    // No coverage is below a bound of zero, none is above a bound of one.
    if bound <= 0.0 {
        return [0.0, 1.0];
    }
    if bound >= 1.0 {
        return [1.0, 0.0];
    }
    let trials = coverage.trials_used;
    let hits = hits(coverage.value, trials);
    // P(X >= hits) as a lower tail of the misses, which keeps its digits when it is small.
    let at_least = binomial_cdf(trials - hits, trials, 1.0 - bound);
    let at_most = binomial_cdf(hits, trials, bound);
    [at_least, at_most]
}

/// Hits from their share: the product is within rounding of an integer.
#[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // within 0 and the trials
fn hits(share: f64, trials: u64) -> u64 {
    ((share * real(trials)).round() as u64).min(trials)
}

/// p-values adjusted by the step-down method of Holm (1979), in the order given.
pub(crate) fn holm(p_values: &[f64]) -> Vec<f64> {
    let mut order: Vec<usize> = (0..p_values.len()).collect();
    order.sort_by(|&one, &two| p_values[one].total_cmp(&p_values[two]));
    let mut adjusted = vec![1.0; p_values.len()];
    let mut running = 0.0_f64;
    for (rank, &index) in order.iter().enumerate() {
        let left = real((p_values.len() - rank) as u64);
        running = running.max((left * p_values[index]).min(1.0));
        adjusted[index] = running;
    }
    adjusted
}

/// Trials at which a one-sided test of the bound at `single_error` (the Bonferroni share, the
/// first step of Holm) decides with the stated chance if the coverage is `seen`: by the normal
/// approximation, `((z_error √(c(1-c)) + z_chance √(s(1-s))) / (s - c))²`, `c` the bound and `s`
/// the coverage seen.
pub(crate) fn trials_to_decide(
    seen: f64,
    trials: u64,
    bound: f64,
    single_error: f64,
) -> Option<u64> {
    let spread = |share: f64| (share * (1.0 - share)).sqrt();
    let reach = normal_quantile(1.0 - single_error) * spread(bound)
        + normal_quantile(DECISION_CHANCE) * spread(seen);
    let needed = (reach / (seen - bound)).powi(2).ceil();
    // Not finite at the bound itself.
    if !needed.is_finite() || needed > MOST_TRIALS {
        return None;
    }
    #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // at most MOST_TRIALS
    let needed = needed as u64;
    // The approximation may promise what this many trials just failed to show.
    Some(needed.max(trials + 1))
}

#[cfg(test)]
mod tests {
    use super::super::measure::MeasureValue;
    use super::*;

    fn cell(coverage: f64, trials_used: u64) -> CellMeasures {
        let value = MeasureValue {
            measure: Measure::Coverage,
            value: coverage,
            mcse: 0.0,
            limits: None,
            trials_used,
        };
        CellMeasures {
            estimand: 0,
            method: 0,
            values: vec![value],
            failures: Vec::new(),
        }
    }

    #[test]
    fn holm_by_hand() {
        let adjusted = holm(&[0.01, 0.04, 0.03, 0.005]);
        for (found, expected) in adjusted.iter().zip([0.03, 0.06, 0.06, 0.02]) {
            assert!((found - expected).abs() < 1e-12);
        }
        assert!((holm(&[0.7, 0.9])[1] - 1.0).abs() < 1e-12);
    }

    #[test]
    fn exact_p_values_of_ten_trials() {
        // Ten hits of ten at a bound of 0.9: P(X >= 10) = 0.9^10, P(X <= 10) = 1.
        let [at_least, at_most] = p_values(&cell(1.0, 10), 0.9);
        assert!((at_least - 0.9_f64.powi(10)).abs() < 1e-9);
        assert!((at_most - 1.0).abs() < 1e-12);
        // Eight of ten: P(X >= 8) = 0.92980917 (45·0.9⁸·0.1² + 10·0.9⁹·0.1 + 0.9¹⁰).
        let exact = 45.0 * 0.9_f64.powi(8) * 0.01 + 0.9_f64.powi(9) + 0.9_f64.powi(10);
        let [at_least, at_most] = p_values(&cell(0.8, 10), 0.9);
        assert!((at_least - exact).abs() < 1e-9);
        // P(X <= 8) = 1 - P(X >= 9).
        assert!((at_most - (1.0 - 0.9_f64.powi(9) - 0.9_f64.powi(10))).abs() < 1e-9);
    }

    #[test]
    fn bounds_outside_the_unit_interval_need_no_test() {
        assert_eq!(
            p_values(&cell(0.3, 10), 0.0).map(f64::to_bits),
            [0.0, 1.0].map(f64::to_bits)
        );
        assert_eq!(
            p_values(&cell(1.0, 10), 1.0).map(f64::to_bits),
            [1.0, 0.0].map(f64::to_bits)
        );
    }

    #[test]
    fn coverage_at_the_bound_cannot_be_decided() {
        assert_eq!(trials_to_decide(0.94, 100, 0.94, 0.025), None);
        assert_eq!(trials_to_decide(0.940_01, 100, 0.94, 0.025), None);
        assert!(trials_to_decide(0.941, 100, 0.94, 0.025).is_some());
    }
}
