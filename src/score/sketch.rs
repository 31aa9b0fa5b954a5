//! A histogram of reals whose bins are as fine as a floating-point number with an 8-bit mantissa.

use super::moments::real;

/// Bits of mantissa kept: every octave is cut into `2^8` bins.
const MANTISSA_BITS: u32 = 8;
/// Bins of one octave.
const BINS_PER_OCTAVE: usize = 1 << MANTISSA_BITS;
/// Bits dropped from an `f64`, which has 52 bits of mantissa.
const DROPPED_BITS: u32 = 52 - MANTISSA_BITS;
/// Octaves of one sign: the values of the 11-bit exponent.
const OCTAVES_PER_SIGN: usize = 1 << 11;
/// Sign bit of a key: above 11 bits of exponent and 8 of mantissa.
const SIGN: u32 = 1 << (11 + MANTISSA_BITS);
/// Marks an octave in which nothing fell yet.
const NO_PAGE: u16 = u16::MAX;

/// Bin of a finite value: sign, exponent and the first mantissa bits.
#[must_use]
pub(crate) fn bin_key(value: f64) -> u32 {
    // Adding zero turns -0 into +0, so that zero has one bin.
    let bits = (value + 0.0).to_bits() >> DROPPED_BITS;
    // 20 bits are left.
    u32::try_from(bits).unwrap_or(u32::MAX)
}

/// Bin edges, lower first.
fn bin_edges(key: u32) -> (f64, f64) {
    let magnitude = u64::from(key & !SIGN);
    let inner = f64::from_bits(magnitude << DROPPED_BITS);
    let outer = f64::from_bits((magnitude + 1) << DROPPED_BITS);
    if key & SIGN == 0 {
        (inner, outer)
    } else {
        (-outer, -inner)
    }
}

/// Counts of reals in logarithmic bins of relative width `2^-8`, both signs.
///
/// Memory is taken octave by octave when a value first falls there, so it is bounded by the range
/// of the values, whatever their number. Counts are integers: the sketch does not depend on the
/// order in which values came.
#[derive(Debug, Clone)]
pub struct Sketch {
    /// Page of each octave, negative octaves in the second half.
    page_of_octave: Vec<u16>,
    pages: Vec<[u64; BINS_PER_OCTAVE]>,
    count: u64,
    least: f64,
    greatest: f64,
}

impl Default for Sketch {
    fn default() -> Self {
        Self {
            page_of_octave: vec![NO_PAGE; 2 * OCTAVES_PER_SIGN],
            pages: Vec::new(),
            count: 0,
            least: f64::INFINITY,
            greatest: f64::NEG_INFINITY,
        }
    }
}

impl Sketch {
    /// Counts finite values.
    pub fn extend(&mut self, values: &[f64]) {
        for &value in values {
            self.add_key(bin_key(value));
            self.widen(value, value);
        }
    }

    /// Counts a value known by its bin alone; [`Self::widen`] must be told its range.
    pub(crate) fn add_key(&mut self, key: u32) {
        let octave = (key >> MANTISSA_BITS) as usize;
        let mut page = self.page_of_octave[octave];
        if page == NO_PAGE {
            // At most 2^12 octaves exist, so the number of pages fits.
            page = u16::try_from(self.pages.len()).unwrap_or(NO_PAGE - 1);
            self.page_of_octave[octave] = page;
            self.pages.push([0; BINS_PER_OCTAVE]);
        }
        self.pages[page as usize][key as usize % BINS_PER_OCTAVE] += 1;
        self.count += 1;
    }

    /// Extends the exact range of the values counted.
    pub(crate) fn widen(&mut self, least: f64, greatest: f64) {
        self.least = self.least.min(least);
        self.greatest = self.greatest.max(greatest);
    }

    /// Number of values counted.
    #[must_use]
    pub fn count(&self) -> u64 {
        self.count
    }

    /// Least and greatest value, exactly; `None` when empty.
    #[must_use]
    pub fn range(&self) -> Option<(f64, f64)> {
        (self.count > 0).then_some((self.least, self.greatest))
    }

    /// Occupied bins in ascending order: lower edge, upper edge, count. The outermost edges are
    /// drawn in to the exact range.
    pub fn bins(&self) -> impl Iterator<Item = (f64, f64, u64)> + '_ {
        let negative = (0..OCTAVES_PER_SIGN)
            .rev()
            .map(|octave| (octave + OCTAVES_PER_SIGN, true));
        let positive = (0..OCTAVES_PER_SIGN).map(|octave| (octave, false));
        negative
            .chain(positive)
            .filter(|&(octave, _)| self.page_of_octave[octave] != NO_PAGE)
            .flat_map(move |(octave, reversed)| {
                let page = &self.pages[self.page_of_octave[octave] as usize];
                (0..BINS_PER_OCTAVE).filter_map(move |step| {
                    let bin = if reversed {
                        BINS_PER_OCTAVE - 1 - step
                    } else {
                        step
                    };
                    let key = u32::try_from(octave * BINS_PER_OCTAVE + bin).unwrap_or(u32::MAX);
                    let (lower, upper) = bin_edges(key);
                    (page[bin] > 0)
                        .then(|| (lower.max(self.least), upper.min(self.greatest), page[bin]))
                })
            })
    }

    /// Quantile: the bin is that of the order statistic `⌈p n⌉`, the place inside it comes from
    /// linear interpolation, so the relative error is at most `2^-8`. Exact when all values are
    /// equal. `None` when empty; `p` is clamped to `[0, 1]`.
    #[must_use]
    pub fn quantile(&self, p: f64) -> Option<f64> {
        let (least, greatest) = self.range()?;
        let target = p.clamp(0.0, 1.0) * real(self.count);
        if target <= 0.0 {
            return Some(least);
        }
        let mut passed = 0.0;
        for (lower, upper, count) in self.bins() {
            let inside = real(count);
            if passed + inside >= target {
                return Some(lower + (upper - lower) * ((target - passed) / inside));
            }
            passed += inside;
        }
        Some(greatest)
    }

    /// Number of values below `x`, with linear interpolation inside the bin that holds `x`.
    #[must_use]
    pub fn count_below(&self, x: f64) -> f64 {
        self.bins()
            .map(|(lower, upper, count)| real(count) * share_below(lower, upper, x))
            .sum()
    }

    /// Number of values above `x`, with linear interpolation inside the bin that holds `x`.
    #[must_use]
    pub fn count_above(&self, x: f64) -> f64 {
        // Mirrored, so that a bin of one repeated value equal to `x` lies neither below nor above.
        self.bins()
            .map(|(lower, upper, count)| real(count) * share_below(-upper, -lower, -x))
            .sum()
    }
}

/// Share of a uniform law on `[lower, upper]` that lies strictly below `x`.
fn share_below(lower: f64, upper: f64, x: f64) -> f64 {
    if x <= lower {
        0.0
    } else if x >= upper {
        1.0
    } else {
        (x - lower) / (upper - lower)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn sketch(values: &[f64]) -> Sketch {
        let mut sketch = Sketch::default();
        sketch.extend(values);
        sketch
    }

    #[test]
    fn one_repeated_value_is_exact() {
        let constant = sketch(&[0.3; 5]);
        assert_eq!(constant.quantile(0.5), Some(0.3));
        assert_eq!(constant.quantile(0.9), Some(0.3));
        assert!(constant.count_below(0.3) + constant.count_above(0.3) < f64::EPSILON);
        assert!((constant.count_below(0.301) - 5.0).abs() < f64::EPSILON);
    }

    #[test]
    fn bins_ascend_through_zero() {
        let mixed = sketch(&[2.0, -3.0, 0.0, -0.0, -0.001, 5e-5, 700.0]);
        let bins: Vec<(f64, f64, u64)> = mixed.bins().collect();
        assert_eq!(bins.len(), 6);
        assert!(bins.windows(2).all(|pair| pair[0].1 <= pair[1].0));
        assert_eq!(
            bins.iter().map(|bin| bin.2).collect::<Vec<_>>(),
            [1, 1, 2, 1, 1, 1]
        );
        assert_eq!(mixed.range(), Some((-3.0, 700.0)));
    }

    #[test]
    fn empty_sketch_has_no_quantile() {
        assert_eq!(Sketch::default().quantile(0.5), None);
    }

    proptest! {
        /// The order statistic is met within the relative width of a bin.
        #[test]
        fn quantile_within_relative_bound(
            mut values in prop::collection::vec(-1e3..1e3_f64, 1..200),
            p in 0.001..1.0_f64,
        ) {
            let found = sketch(&values).quantile(p).unwrap();
            values.sort_by(f64::total_cmp);
            #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // small and positive
            let rank = (p * real(values.len() as u64)).ceil() as usize;
            let exact = values[rank.clamp(1, values.len()) - 1];
            prop_assert!((found - exact).abs() <= exact.abs() / 256.0, "{found} {exact}");
        }

        /// Interpolated counts are off by no more than the bin that holds the point.
        #[test]
        fn counts_around_a_point(
            values in prop::collection::vec(-4.0..4.0_f64, 1..200),
            x in -5.0..5.0_f64,
        ) {
            let sketch = sketch(&values);
            let below = sketch.count_below(x);
            let key = bin_key(x);
            let near = values.iter().filter(|&&value| bin_key(value) == key).count() as u64;
            let exact = values.iter().filter(|&&value| value < x).count() as u64;
            prop_assert!((below - real(exact)).abs() <= real(near) + 1e-9);
            let total = below + sketch.count_above(x);
            prop_assert!((total - real(sketch.count())).abs() < 1e-9);
        }
    }
}
