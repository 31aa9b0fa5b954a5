//! Measures and their Monte Carlo standard errors from the tally of one cell.
//!
//! With `n` trials, of which `m` were answered, the measures of errors, standard errors, widths
//! and studentised errors are over the `m` answered trials; shares of trials (coverage, misses,
//! rejections, no answer) are over all `n`, so that coverage, misses below, misses above and no
//! answer sum to one. The number of trials used stands beside each value.
//!
//! Formulas follow Morris, White & Crowther (2019), Table 6, where the measure appears there. A
//! standard error that the trials cannot give (fewer than two answers) is infinite; a measure
//! without a finite value is absent.

use crate::methods::NoAnswer;
use crate::numerics::distribution::clopper_pearson;

use super::measure::{CellMeasures, Measure, MeasureValue};
use super::moments::{CentralMoments, real};
use super::scored::NORMAL_BINS;
use super::sketch::Sketch;
use super::tally::CellTally;

/// Confidence of the Clopper-Pearson limits beside each share of trials.
const LIMITS_CONFIDENCE: f64 = 0.95;

/// Measures in report order; those without a finite value are left out.
#[derive(Default)]
struct Values(Vec<MeasureValue>);

impl Values {
    fn push(&mut self, measure: Measure, (value, mcse): (f64, f64), trials_used: u64) {
        self.push_limited(measure, (value, mcse), None, trials_used);
    }

    fn push_limited(
        &mut self,
        measure: Measure,
        (value, mcse): (f64, f64),
        limits: Option<(f64, f64)>,
        trials_used: u64,
    ) {
        if value.is_finite() {
            let mcse = if mcse.is_nan() { f64::INFINITY } else { mcse };
            self.0.push(MeasureValue {
                measure,
                value,
                mcse,
                limits,
                trials_used,
            });
        }
    }

    /// Share of trials; the binomial standard error and exact limits.
    fn push_share(&mut self, measure: Measure, count: u64, trials: u64) {
        let limits = clopper_pearson(count, trials, LIMITS_CONFIDENCE);
        let share = real(count) / real(trials);
        self.push_limited(
            measure,
            (share, share_mcse(share, trials)),
            Some(limits),
            trials,
        );
    }
}

/// All measures of one cell.
pub(crate) fn cell_measures(
    cell: &CellTally,
    trials: u64,
    true_value: f64,
    estimand: usize,
    method: usize,
) -> CellMeasures {
    let mut values = Values::default();
    let counts = &cell.counts;
    let moments = &cell.moments;
    let answered = counts.answered;
    let squared_se = &moments.squared_standard_error;

    let bias = (moments.error.mean(), moments.error.standard_error());
    if answered > 0 {
        values.push(Measure::Bias, bias, answered);
        let size = true_value.abs();
        values.push(
            Measure::RelativeBias,
            (bias.0 / true_value, bias.1 / size),
            answered,
        );
    }
    values.push(Measure::EmpiricalSe, empirical_se(&moments.error), answered);
    if answered > 0 {
        values.push(Measure::ModelSe, model_se(squared_se), answered);
    }
    values.push(
        Measure::SeRatio,
        se_ratio(squared_se, &moments.error),
        answered,
    );
    values.push(Measure::Rmse, rmse(&moments.error), answered);
    values.push_share(Measure::Coverage, counts.hits, trials);
    push_bias_eliminated_coverage(&mut values, cell, bias.0, trials);
    values.push_share(Measure::MissesBelow, counts.misses_below, trials);
    values.push_share(Measure::MissesAbove, counts.misses_above, trials);
    if answered > 0 {
        let width = (moments.width.mean(), moments.width.standard_error());
        values.push(Measure::MeanWidth, width, answered);
    }
    if let Some(median) = median(&cell.width) {
        values.push(Measure::MedianWidth, median, answered);
    }
    if let Some(price) = moments.paired_width.ratio() {
        values.push(Measure::Price, price, moments.paired_width.count());
    }
    let rejected = counts.rejected_above + counts.rejected_below;
    values.push_share(Measure::RejectionTwoSided, rejected, trials);
    values.push_share(Measure::RejectionAbove, counts.rejected_above, trials);
    values.push_share(Measure::RejectionBelow, counts.rejected_below, trials);
    values.push(Measure::Skewness, skewness(&moments.studentised), answered);
    values.push(Measure::Kurtosis, kurtosis(&moments.studentised), answered);
    if let Some(distance) = kolmogorov_distance(&cell.normal_bins, answered) {
        values.push(Measure::KolmogorovDistance, distance, answered);
    }
    values.push_share(Measure::NoAnswer, trials - answered, trials);

    let failures = NoAnswer::ALL
        .into_iter()
        .zip(counts.failures)
        .filter(|&(_, count)| count > 0)
        .collect();
    CellMeasures {
        estimand,
        method,
        values: values.0,
        failures,
    }
}

/// `√(p (1 - p) / n)`.
fn share_mcse(share: f64, trials: u64) -> f64 {
    (share * (1.0 - share) / real(trials)).max(0.0).sqrt()
}

/// Relative standard error of a sample standard deviation of normal values: `1/√(2(m - 1))`.
fn relative_sd_error(count: u64) -> f64 {
    if count < 2 {
        f64::NAN
    } else {
        1.0 / (2.0 * (real(count) - 1.0)).sqrt()
    }
}

fn empirical_se(error: &CentralMoments<4>) -> (f64, f64) {
    let sd = error.variance().sqrt();
    (sd, sd * relative_sd_error(error.count()))
}

/// `√mean(se²)`, with the delta method for the square root.
fn model_se(squared_se: &CentralMoments<2>) -> (f64, f64) {
    let value = squared_se.mean().sqrt();
    (value, squared_se.standard_error() / (2.0 * value))
}

/// Model SE over empirical SE; the relative errors of the two add in squares.
fn se_ratio(squared_se: &CentralMoments<2>, error: &CentralMoments<4>) -> (f64, f64) {
    let (model, model_mcse) = model_se(squared_se);
    let ratio = model / empirical_se(error).0;
    let relative = (model_mcse / model).hypot(relative_sd_error(error.count()));
    (ratio, ratio * relative)
}

/// Root mean squared error; the variance of the squared error comes from the central moments,
/// `Var(e²) = μ₄ - μ₂² + 4 b μ₃ + 4 b² μ₂` with `b` the mean error.
fn rmse(error: &CentralMoments<4>) -> (f64, f64) {
    let bias = error.mean();
    let [second, third, fourth] = [2, 3, 4].map(|order| error.central(order));
    let value = (bias * bias + second).sqrt();
    if error.count() < 2 {
        return (value, f64::NAN);
    }
    if value == 0.0 {
        return (0.0, 0.0);
    }
    let variance = fourth - second * second + 4.0 * bias * third + 4.0 * bias * bias * second;
    let mean_square_mcse = (variance.max(0.0) / (real(error.count()) - 1.0)).sqrt();
    (value, mean_square_mcse / (2.0 * value))
}

/// Share of trials whose interval holds the mean estimate, from the sketches of the limits.
///
/// The counts are interpolated inside one bin of relative width `2^-8`, so the exact limits are
/// those of the count rounded outwards. The standard error is binomial, as in Morris, White &
/// Crowther (2019): it leaves out the Monte Carlo error of the mean estimate.
fn push_bias_eliminated_coverage(values: &mut Values, cell: &CellTally, bias: f64, trials: u64) {
    let missed = cell.lower_error.count_above(bias) + cell.upper_error.count_below(bias);
    let held = (real(cell.counts.answered) - missed).max(0.0);
    let share = held / real(trials);
    #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // a count, not negative
    let (fewest, most) = (
        held.floor() as u64,
        (held.ceil() as u64).min(cell.counts.answered),
    );
    let limits = (
        clopper_pearson(fewest, trials, LIMITS_CONFIDENCE).0,
        clopper_pearson(most, trials, LIMITS_CONFIDENCE).1,
    );
    let mcse = share_mcse(share, trials);
    values.push_limited(
        Measure::BiasEliminatedCoverage,
        (share, mcse),
        Some(limits),
        trials,
    );
}

/// Median and half the distance between the quantiles one standard error of the rank away.
fn median(widths: &Sketch) -> Option<(f64, f64)> {
    let middle = widths.quantile(0.5)?;
    let count = widths.count();
    if count < 2 {
        return Some((middle, f64::NAN));
    }
    let rank_error = 0.5 / real(count).sqrt();
    let upper = widths.quantile(0.5 + rank_error)?;
    let lower = widths.quantile(0.5 - rank_error)?;
    Some((middle, 0.5 * (upper - lower)))
}

/// Moments of the standardised value `u`, orders 0 to 8, each `E u^order`.
fn standardised(moments: &CentralMoments<8>) -> [f64; 9] {
    let sd = moments.central(2).sqrt();
    let mut standardised = [1.0, 0.0, 1.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0];
    let mut scale = sd * sd;
    for (order, moment) in standardised.iter_mut().enumerate().skip(3) {
        scale *= sd;
        *moment = moments.central(order) / scale;
    }
    standardised
}

/// Standard error of a mean of `q(u)`, `q` a polynomial with mean zero given by its coefficients
/// in ascending order, from the moments of `u`.
fn influence_mcse(coefficients: &[f64], moments: &[f64; 9], count: u64) -> f64 {
    if count < 2 {
        return f64::NAN;
    }
    let mut second = 0.0;
    for (i, one) in coefficients.iter().enumerate() {
        for (j, two) in coefficients.iter().enumerate() {
            second += one * two * moments[i + j];
        }
    }
    (second.max(0.0) / real(count)).sqrt()
}

/// Skewness `g`; influence function `u³ - g - 3u - (3g/2)(u² - 1)`.
fn skewness(moments: &CentralMoments<8>) -> (f64, f64) {
    let u = standardised(moments);
    let g = u[3];
    (
        g,
        influence_mcse(&[0.5 * g, -3.0, -1.5 * g, 1.0], &u, moments.count()),
    )
}

/// Kurtosis `k`; influence function `u⁴ - k - 4 g u - 2k(u² - 1)`, `g` the skewness.
fn kurtosis(moments: &CentralMoments<8>) -> (f64, f64) {
    let u = standardised(moments);
    let (g, k) = (u[3], u[4]);
    (
        k,
        influence_mcse(&[k, -4.0 * g, -2.0 * k, 0.0, 1.0], &u, moments.count()),
    )
}

/// Largest distance between the two distribution functions over the edges of 4096 equiprobable
/// bins, and the standard error of the empirical one where it is reached.
///
/// Between edges both functions rise by what lies in one bin, so the exact distance is greater by
/// at most 1/4096. A distance of pure chance is about `0.87/√m`, not zero.
fn kolmogorov_distance(normal_bins: &[u64], answered: u64) -> Option<(f64, f64)> {
    if answered == 0 {
        return None;
    }
    let mut passed = 0;
    let mut farthest = (0.0, 0.0);
    for (edge, &count) in (1..NORMAL_BINS as u64).zip(normal_bins) {
        passed += count;
        let empirical = real(passed) / real(answered);
        let distance = (empirical - real(edge) / real(NORMAL_BINS as u64)).abs();
        if distance > farthest.0 {
            farthest = (distance, share_mcse(empirical, answered));
        }
    }
    Some(farthest)
}
