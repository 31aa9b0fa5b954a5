//! Laws of the error and of the studentised error, for figures.

use super::moments::real;
use super::sketch::Sketch;

/// Limit of the linear bins of the studentised error.
const STUDENTISED_LIMIT: f64 = 6.0;
/// Linear bins per unit of the studentised error: width 0.1.
const BINS_PER_UNIT: f64 = 10.0;
/// Linear bins between the limits.
const INNER_BINS: usize = 120;
/// Linear bins with one more on each side for what lies beyond the limits.
pub(crate) const LINEAR_BINS: usize = INNER_BINS + 2;

/// Counts between edges.
#[derive(Debug, Clone, PartialEq)]
pub struct Histogram {
    /// Edges in ascending order, one more than bins.
    pub edges: Vec<f64>,
    /// Count of each bin; a fraction where a finer bin was divided.
    pub counts: Vec<f64>,
    /// Count below the first edge.
    pub below: f64,
    /// Count above the last edge.
    pub above: f64,
}

/// Bin of a finite studentised error: 0 below the limits, `LINEAR_BINS - 1` above them.
#[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // clamped before the cast
pub(crate) fn linear_bin(studentised: f64) -> u16 {
    let place = ((studentised + STUDENTISED_LIMIT) * BINS_PER_UNIT).floor() + 1.0;
    place.clamp(0.0, real(LINEAR_BINS as u64 - 1)) as u16
}

/// Laws of the error of one method for one estimand.
#[derive(Debug, Clone)]
pub struct CellDistribution {
    /// Estimand index.
    pub estimand: usize,
    /// Method index.
    pub method: usize,
    /// Errors (estimate minus true value) of the answered trials.
    pub error: Sketch,
    /// Errors over their standard errors, in bins of width 0.1 on `[-6, 6]`.
    pub studentised: Histogram,
}

impl CellDistribution {
    /// The error re-binned onto ascending edges.
    #[must_use]
    pub fn error_histogram(&self, edges: &[f64]) -> Histogram {
        rebin(&self.error, edges)
    }
}

/// Spreads the bins of a sketch evenly over the bins between `edges` (ascending).
pub(crate) fn rebin(sketch: &Sketch, edges: &[f64]) -> Histogram {
    let below: Vec<f64> = edges.iter().map(|&edge| sketch.count_below(edge)).collect();
    let counts = below
        .windows(2)
        .map(|pair| (pair[1] - pair[0]).max(0.0))
        .collect();
    let total = real(sketch.count());
    Histogram {
        edges: edges.to_vec(),
        counts,
        below: below.first().copied().unwrap_or(0.0),
        above: below.last().map_or(0.0, |last| total - last),
    }
}

/// Histogram of the studentised error from its linear counts.
pub(crate) fn studentised_histogram(counts: &[u64; LINEAR_BINS]) -> Histogram {
    let edges = (0..=INNER_BINS)
        .map(|edge| real(edge as u64) / BINS_PER_UNIT - STUDENTISED_LIMIT)
        .collect();
    Histogram {
        edges,
        counts: counts[1..=INNER_BINS]
            .iter()
            .map(|&count| real(count))
            .collect(),
        below: real(counts[0]),
        above: real(counts[LINEAR_BINS - 1]),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn linear_bins_meet_their_edges() {
        for (value, bin) in [
            (-7.0, 0),
            (-6.0, 1),
            (-0.05, 60),
            (0.0, 61),
            (0.05, 61),
            (5.95, 120),
            (6.0, 121),
            (1e30, 121),
        ] {
            assert_eq!(linear_bin(value), bin, "{value}");
        }
        let mut counts = [0; LINEAR_BINS];
        counts[61] = 3;
        counts[0] = 1;
        let histogram = studentised_histogram(&counts);
        assert_eq!(histogram.edges.len(), 121);
        let bin = histogram
            .counts
            .iter()
            .position(|&count| count > 0.0)
            .unwrap();
        assert!(histogram.edges[bin].abs() < 1e-12);
        assert!((histogram.edges[bin + 1] - 0.1).abs() < 1e-12);
        assert!((histogram.below - 1.0).abs() < f64::EPSILON);
    }

    #[test]
    fn rebinning_keeps_every_value() {
        let mut sketch = Sketch::default();
        let values: Vec<f64> = (0..1000_u64).map(|k| real(k) / 100.0 - 4.0).collect();
        sketch.extend(&values);
        let histogram = rebin(&sketch, &[-2.0, 0.0, 1.0, 5.0]);
        let total = histogram.below + histogram.above + histogram.counts.iter().sum::<f64>();
        assert!((total - 1000.0).abs() < 1e-9);
        for (found, exact) in histogram.counts.iter().zip([200.0, 100.0, 400.0]) {
            assert!((found - exact).abs() < 3.0, "{found} {exact}");
        }
        assert!((histogram.below - 200.0).abs() < 3.0);
    }
}
