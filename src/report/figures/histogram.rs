//! Binned errors and what a drawing needs of them.

/// Share of trials on either side that the common scale may leave out.
pub(super) const TAIL: f64 = 0.002;

/// Standard normal density at zero, `1/√(2π)`.
pub(super) const NORMAL_PEAK: f64 = 0.398_942_280_401_432_7;

/// A method with a range wider than this many times the median range does not set the scale.
const WIDEST: f64 = 4.0;

/// Range of the studentised error that is always shown, and the most that is shown.
const STUDENTISED_LEAST: f64 = 4.0;
const STUDENTISED_MOST: f64 = 8.0;

/// Lower and upper end.
pub(super) type Range = (f64, f64);

/// Counts in bins.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct ErrorHistogram {
    /// Edges of the bins, increasing, one more than there are bins; the outermost may be
    /// infinite.
    pub edges: Vec<f64>,
    /// Trials in each bin.
    pub counts: Vec<f64>,
}

impl ErrorHistogram {
    pub(super) fn bins(&self) -> impl Iterator<Item = (f64, f64, f64)> + '_ {
        self.edges
            .windows(2)
            .zip(&self.counts)
            .map(|(edge, &count)| (edge[0], edge[1], count))
    }

    pub(super) fn total(&self) -> f64 {
        self.counts.iter().sum()
    }

    /// Edges between which all but [`TAIL`] of the trials on either side lie.
    pub(super) fn span(&self) -> Option<(f64, f64)> {
        let spare = TAIL * self.total();
        let bins: Vec<_> = self.bins().collect();
        let (mut seen_low, mut seen_high) = (0.0, 0.0);
        let filled = |seen: &mut f64, count: f64| {
            *seen += count;
            *seen > spare
        };
        let low = bins.iter().find(|bin| filled(&mut seen_low, bin.2))?;
        let high = bins.iter().rfind(|bin| filled(&mut seen_high, bin.2))?;
        // An infinite edge is replaced by the other edge of its bin.
        let low = if low.0.is_finite() { low.0 } else { low.1 };
        let high = if high.1.is_finite() { high.1 } else { high.0 };
        (low.is_finite() && high.is_finite() && low < high).then_some((low, high))
    }

    /// Bins cut to a range, as (left, right, count), taking trials as even within a bin. A bin
    /// with an infinite edge has no density and lies wholly beyond.
    pub(super) fn inside(&self, low: f64, high: f64) -> impl Iterator<Item = (f64, f64, f64)> + '_ {
        self.bins().filter_map(move |(left, right, count)| {
            let (from, to) = (left.max(low), right.min(high));
            let known = left.is_finite() && right.is_finite() && from < to;
            known.then(|| (from, to, count * (to - from) / (right - left)))
        })
    }

    /// Share of the trials beyond a range.
    pub(super) fn beyond(&self, low: f64, high: f64) -> f64 {
        1.0 - self.inside(low, high).map(|bin| bin.2).sum::<f64>() / self.total()
    }

    /// Bars inside a range as (left, right, density), neighbours joined up to `least` in width.
    pub(super) fn bars(&self, low: f64, high: f64, least: f64) -> Vec<(f64, f64, f64)> {
        let slack = 1e-9 * (high - low);
        let total = self.total();
        let mut bars: Vec<(f64, f64, f64)> = Vec::new();
        for (left, right, count) in self.inside(low, high) {
            match bars.last_mut() {
                Some(bar) if bar.1 - bar.0 < least - slack => {
                    bar.1 = right;
                    bar.2 += count;
                }
                _ => bars.push((left, right, count)),
            }
        }
        for bar in &mut bars {
            bar.2 /= total * (bar.1 - bar.0);
        }
        bars
    }
}

/// The range of the error common to all methods; zero is always in it.
pub(super) fn common_range(spans: &[Range]) -> Range {
    let mut widths: Vec<f64> = spans.iter().map(|span| span.1 - span.0).collect();
    widths.sort_by(f64::total_cmp);
    let Some(&median) = widths.get(widths.len() / 2) else {
        return (-1.0, 1.0);
    };
    let usual = || {
        spans
            .iter()
            .filter(|span| span.1 - span.0 <= WIDEST * median)
    };
    let low = usual().map(|span| span.0).fold(0.0, f64::min);
    let high = usual().map(|span| span.1).fold(0.0, f64::max);
    let edge = 0.02 * (high - low);
    (low - edge, high + edge)
}

/// The range of the studentised error common to all methods.
pub(super) fn studentised_range(spans: &[Range]) -> Range {
    spans.iter().fold(
        (-STUDENTISED_LEAST, STUDENTISED_LEAST),
        |(low, high), span| {
            (
                low.min(span.0).max(-STUDENTISED_MOST),
                high.max(span.1).min(STUDENTISED_MOST),
            )
        },
    )
}

/// Counts of 10 000 normal errors, by the density at the bin middles; invented.
#[cfg(test)]
pub(super) fn normal(mean: f64, sd: f64, low: f64, high: f64) -> ErrorHistogram {
    let step = (high - low) / 200.0;
    let edges: Vec<f64> = (0..=200_u32).map(|k| low + step * f64::from(k)).collect();
    let counts = edges
        .windows(2)
        .map(|edge| {
            let z = (f64::midpoint(edge[0], edge[1]) - mean) / sd;
            (10_000.0 * step / sd * NORMAL_PEAK * (-0.5 * z * z).exp()).round()
        })
        .collect();
    ErrorHistogram { edges, counts }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn joined_bars_keep_the_trials() {
        let histogram = normal(0.0, 1.0, -5.0, 5.0);
        let bars = histogram.bars(-5.0, 5.0, 0.2);
        let mass: f64 = bars.iter().map(|bar| (bar.1 - bar.0) * bar.2).sum();
        assert!((mass - 1.0).abs() < 1e-9);
        assert_eq!(bars.len(), 50);
        let (low, high) = histogram.span().unwrap();
        // Normal quantile of 0.002 is -2.88; bins are 0.05 wide.
        assert!(
            (low + 2.88).abs() < 0.06 && (high - 2.88).abs() < 0.06,
            "{low} {high}"
        );
        assert!((histogram.beyond(-1.95, 1.95) - 0.051_2).abs() < 0.002);
    }
}
