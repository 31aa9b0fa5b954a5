//! Central moments that can be merged without loss.

/// Binomial coefficients `C(p, k)` up to the largest order in use.
const BINOMIAL: [[f64; 9]; 9] = [
    [1.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0],
    [1.0, 1.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0],
    [1.0, 2.0, 1.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0],
    [1.0, 3.0, 3.0, 1.0, 0.0, 0.0, 0.0, 0.0, 0.0],
    [1.0, 4.0, 6.0, 4.0, 1.0, 0.0, 0.0, 0.0, 0.0],
    [1.0, 5.0, 10.0, 10.0, 5.0, 1.0, 0.0, 0.0, 0.0],
    [1.0, 6.0, 15.0, 20.0, 15.0, 6.0, 1.0, 0.0, 0.0],
    [1.0, 7.0, 21.0, 35.0, 35.0, 21.0, 7.0, 1.0, 0.0],
    [1.0, 8.0, 28.0, 56.0, 70.0, 56.0, 28.0, 8.0, 1.0],
];

/// A count as a real number.
#[allow(clippy::cast_precision_loss)] // no replay reaches 2^53 trials
pub(crate) fn real(count: u64) -> f64 {
    count as f64
}

/// Count, mean and sums of powers about the mean, up to power `ORDER` (2 to 8).
///
/// The sums of two parts combine by the binomial theorem after shifting each part to the common
/// mean, which is the pairwise update of Chan, Golub & `LeVeque` (1983) for the variance and of
/// Pébay (2008) for higher orders. No raw power is ever formed, so a large mean costs no digits.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CentralMoments<const ORDER: usize> {
    count: u64,
    mean: f64,
    /// Entry `p - 1` is `Σ (x - mean)^p`; the first entry is zero by definition of the mean.
    power_sums: [f64; ORDER],
}

impl<const ORDER: usize> Default for CentralMoments<ORDER> {
    fn default() -> Self {
        Self {
            count: 0,
            mean: 0.0,
            power_sums: [0.0; ORDER],
        }
    }
}

impl<const ORDER: usize> CentralMoments<ORDER> {
    /// Moments of a sequence, by two passes in its order.
    #[must_use]
    pub fn of(values: &[f64]) -> Self {
        if values.is_empty() {
            return Self::default();
        }
        let count = values.len() as u64;
        let first_pass = values.iter().sum::<f64>() / real(count);
        // The rounding error of the plain mean is found again in the mean deviation from it.
        let correction = values.iter().map(|x| x - first_pass).sum::<f64>() / real(count);
        let mean = first_pass + correction;
        let mut power_sums = [0.0; ORDER];
        for x in values {
            let deviation = x - mean;
            let mut power = deviation;
            for sum in &mut power_sums[1..] {
                power *= deviation;
                *sum += power;
            }
        }
        Self {
            count,
            mean,
            power_sums,
        }
    }

    /// Adds the moments of a further part of the sequence.
    pub fn merge(&mut self, part: &Self) {
        if part.count == 0 {
            return;
        }
        if self.count == 0 {
            *self = *part;
            return;
        }
        let (own, added) = (real(self.count), real(part.count));
        let total = own + added;
        let difference = part.mean - self.mean;
        // Deviations of each part's mean from the common mean.
        let own_shift = -difference * (added / total);
        let added_shift = difference * (own / total);
        let mut power_sums = [0.0; ORDER];
        for order in 2..=ORDER {
            power_sums[order - 1] =
                self.power_sum_about(order, own_shift) + part.power_sum_about(order, added_shift);
        }
        self.power_sums = power_sums;
        self.mean += difference * (added / total);
        self.count += part.count;
    }

    /// `Σ (x - mean + shift)^order`.
    fn power_sum_about(&self, order: usize, shift: f64) -> f64 {
        let mut sum = self.power_sums[order - 1];
        let mut power = 1.0;
        let lower_sums = self.power_sums[..order - 1].iter().rev();
        for (coefficient, lower_sum) in BINOMIAL[order][1..order].iter().zip(lower_sums) {
            power *= shift;
            sum += coefficient * power * lower_sum;
        }
        sum + real(self.count) * power * shift
    }

    /// Number of values.
    #[must_use]
    pub fn count(&self) -> u64 {
        self.count
    }

    /// Mean; 0 without values.
    #[must_use]
    pub fn mean(&self) -> f64 {
        self.mean
    }

    /// `Σ (x - mean)^order / n`; NaN without values.
    ///
    /// # Panics
    ///
    /// If `order` is 0 or above `ORDER`.
    #[must_use]
    pub fn central(&self, order: usize) -> f64 {
        self.power_sums[order - 1] / real(self.count)
    }

    /// Sample variance with divisor `n - 1`; NaN for fewer than two values.
    #[must_use]
    pub fn variance(&self) -> f64 {
        if self.count < 2 {
            return f64::NAN;
        }
        self.power_sums[1] / (real(self.count) - 1.0)
    }

    /// Standard error of the mean; NaN for fewer than two values.
    #[must_use]
    pub fn standard_error(&self) -> f64 {
        (self.variance() / real(self.count)).sqrt()
    }
}

/// Means, variances and covariance of pairs.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct PairMoments {
    count: u64,
    means: [f64; 2],
    /// `Σ (x - mean)²` of each coordinate.
    squares: [f64; 2],
    /// `Σ (x - mean x)(y - mean y)`.
    products: f64,
}

impl PairMoments {
    /// Moments of a sequence of pairs, by two passes in its order.
    ///
    /// # Panics
    ///
    /// If the slices differ in length.
    #[must_use]
    pub fn of(first: &[f64], second: &[f64]) -> Self {
        assert_eq!(first.len(), second.len(), "pairs need both coordinates");
        let [one, two] = [first, second].map(CentralMoments::<2>::of);
        let products = first
            .iter()
            .zip(second)
            .map(|(x, y)| (x - one.mean) * (y - two.mean))
            .sum();
        Self {
            count: one.count,
            means: [one.mean, two.mean],
            squares: [one.power_sums[1], two.power_sums[1]],
            products,
        }
    }

    /// Adds the moments of a further part of the sequence.
    pub fn merge(&mut self, part: &Self) {
        if part.count == 0 {
            return;
        }
        if self.count == 0 {
            *self = *part;
            return;
        }
        let (own, added) = (real(self.count), real(part.count));
        let total = own + added;
        let difference = [part.means[0] - self.means[0], part.means[1] - self.means[1]];
        let weight = own * (added / total);
        self.squares[0] += part.squares[0] + difference[0] * difference[0] * weight;
        self.squares[1] += part.squares[1] + difference[1] * difference[1] * weight;
        self.means[0] += difference[0] * (added / total);
        self.means[1] += difference[1] * (added / total);
        self.products += part.products + difference[0] * difference[1] * weight;
        self.count += part.count;
    }

    /// Number of pairs.
    #[must_use]
    pub fn count(&self) -> u64 {
        self.count
    }

    /// Mean of the first coordinate over mean of the second, and its standard error by the delta
    /// method. `None` without pairs or with a zero denominator; the error is NaN for one pair.
    #[must_use]
    pub fn ratio(&self) -> Option<(f64, f64)> {
        if self.count == 0 || self.means[1] == 0.0 {
            return None;
        }
        let ratio = self.means[0] / self.means[1];
        if self.count == 1 {
            return Some((ratio, f64::NAN));
        }
        let n = real(self.count);
        let residual =
            self.squares[0] + ratio * ratio * self.squares[1] - 2.0 * ratio * self.products;
        // Rounding can leave a residual of proportional widths slightly below zero.
        let variance = residual.max(0.0) / (n - 1.0) / n;
        Some((ratio, variance.sqrt() / self.means[1].abs()))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn merged<const ORDER: usize>(parts: &[&[f64]]) -> CentralMoments<ORDER> {
        let mut running = CentralMoments::default();
        for part in parts {
            running.merge(&CentralMoments::of(part));
        }
        running
    }

    #[test]
    fn four_values_by_hand() {
        // 1, 2, 3, 6: mean 3, deviations -2 -1 0 3.
        let moments = merged::<4>(&[&[1.0], &[2.0, 3.0], &[], &[6.0]]);
        assert_eq!(moments.count(), 4);
        let expected = [3.0, 14.0 / 4.0, 18.0 / 4.0, 98.0 / 4.0];
        let found = [
            moments.mean(),
            moments.central(2),
            moments.central(3),
            moments.central(4),
        ];
        for (one, two) in found.iter().zip(expected) {
            assert!((one - two).abs() < 1e-14, "{one} {two}");
        }
        assert!((moments.variance() - 14.0 / 3.0).abs() < 1e-14);
    }

    #[test]
    fn one_value_has_no_variance() {
        assert!(CentralMoments::<2>::of(&[5.0]).variance().is_nan());
    }

    /// NIST univariate summary statistics, `NumAcc1` to `NumAcc4` (recalled): certified mean
    /// and standard deviation of data with many leading digits in common.
    #[test]
    fn nist_numerical_accuracy_sets() {
        let alternating = |base: f64, low: f64, high: f64| -> Vec<f64> {
            let mut values = vec![base];
            for _ in 0..500 {
                values.extend([low, high]);
            }
            values
        };
        // The last column is the relative error that rounding of the decimal inputs allows.
        let sets = [
            (
                vec![10_000_001.0, 10_000_003.0, 10_000_002.0],
                10_000_002.0,
                1.0,
                1e-15,
            ),
            (alternating(1.2, 1.1, 1.3), 1.2, 0.1, 1e-13),
            (
                alternating(1_000_000.2, 1_000_000.1, 1_000_000.3),
                1_000_000.2,
                0.1,
                1e-9,
            ),
            (
                alternating(10_000_000.2, 10_000_000.1, 10_000_000.3),
                10_000_000.2,
                0.1,
                1e-8,
            ),
        ];
        for (values, mean, sd, allowed) in sets {
            for width in [1, 7, 1001] {
                let parts: Vec<&[f64]> = values.chunks(width).collect();
                let moments = merged::<2>(&parts);
                assert!(
                    (moments.mean() / mean - 1.0).abs() < 1e-15,
                    "{}",
                    moments.mean()
                );
                let error = moments.variance().sqrt() / sd - 1.0;
                assert!(
                    error.abs() < allowed,
                    "width {width} sd {sd} error {error:e}"
                );
            }
        }
    }

    #[test]
    fn ratio_by_hand() {
        // x = 2, 4, 6; y = 1, 3, 2: R = 2, residuals x - 2y = 0, -2, 2, so the variance of the
        // ratio is (8 / 2) / 3 / 2² = 1/3.
        let mut pairs = PairMoments::of(&[2.0], &[1.0]);
        pairs.merge(&PairMoments::of(&[4.0, 6.0], &[3.0, 2.0]));
        let (ratio, error) = pairs.ratio().unwrap();
        assert!((ratio - 2.0).abs() < 1e-14);
        assert!((error - (1.0_f64 / 3.0).sqrt()).abs() < 1e-14);
    }

    #[test]
    fn ratio_of_a_variable_to_itself_is_exactly_one() {
        let widths = [0.3, 0.41, 0.27, 0.6];
        assert_eq!(PairMoments::of(&widths, &widths).ratio(), Some((1.0, 0.0)));
    }

    proptest! {
        /// Any partition gives the direct two-pass moments to 1e-12, relative to the absolute
        /// moment of the same order (odd central moments may cancel to zero).
        #[test]
        fn partition_does_not_matter(
            values in prop::collection::vec(-50.0..150.0_f64, 1..300),
            cuts in prop::collection::vec(0..300_usize, 0..12),
        ) {
            let mut cuts: Vec<usize> = cuts.iter().map(|cut| cut % values.len()).collect();
            cuts.extend([0, values.len()]);
            cuts.sort_unstable();
            let parts: Vec<&[f64]> = cuts.windows(2).map(|cut| &values[cut[0]..cut[1]]).collect();
            let whole = merged::<8>(&parts);
            let n = real(values.len() as u64);
            let mean = values.iter().sum::<f64>() / n;
            prop_assert_eq!(whole.count(), values.len() as u64);
            prop_assert!((whole.mean() - mean).abs() <= 1e-12 * 150.0);
            for order in 2..=8_i32 {
                let direct = values.iter().map(|x| (x - mean).powi(order)).sum::<f64>() / n;
                let scale = values.iter().map(|x| (x - mean).abs().powi(order)).sum::<f64>() / n;
                let found = whole.central(usize::try_from(order).unwrap());
                // A sequence of nearly equal values has moments of pure rounding.
                prop_assert!((found - direct).abs() <= 1e-12 * scale + 1e-24);
            }
        }

        /// Pair moments of any partition agree with the direct covariance.
        #[test]
        fn pair_partition_does_not_matter(
            pairs in prop::collection::vec((0.1..3.0_f64, 0.5..2.0_f64), 2..200),
            cut in 0..200_usize,
        ) {
            let (x, y): (Vec<f64>, Vec<f64>) = pairs.iter().copied().unzip();
            let cut = cut % x.len();
            let mut parts = PairMoments::of(&x[..cut], &y[..cut]);
            parts.merge(&PairMoments::of(&x[cut..], &y[cut..]));
            let whole = PairMoments::of(&x, &y);
            prop_assert!((parts.products - whole.products).abs() < 1e-11);
            let (ratio, error) = parts.ratio().unwrap();
            let (direct, direct_error) = whole.ratio().unwrap();
            prop_assert!((ratio - direct).abs() < 1e-12 * direct);
            prop_assert!((error - direct_error).abs() < 1e-7);
        }
    }
}
