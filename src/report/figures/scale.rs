//! Scales of axes and their ticks.

use crate::report::number::short;

/// Maps values to pixels.
#[derive(Debug, Clone, Copy)]
pub(super) struct Scale {
    low: f64,
    high: f64,
    from: f64,
    to: f64,
    logarithmic: bool,
}

impl Scale {
    /// A linear scale that puts `low` at pixel `from` and `high` at pixel `to`.
    pub(super) fn linear(low: f64, high: f64, from: f64, to: f64) -> Self {
        let (low, high) = opened(low, high);
        Self {
            low,
            high,
            from,
            to,
            logarithmic: false,
        }
    }

    /// A logarithmic scale; both ends must be positive.
    pub(super) fn logarithmic(low: f64, high: f64, from: f64, to: f64) -> Self {
        let (low, high) = opened(low.ln(), high.ln());
        Self {
            low,
            high,
            from,
            to,
            logarithmic: true,
        }
    }

    /// The pixel of a value.
    pub(super) fn at(&self, value: f64) -> f64 {
        let value = if self.logarithmic { value.ln() } else { value };
        self.from + (value - self.low) / (self.high - self.low) * (self.to - self.from)
    }

    /// The pixel of a value, or of the end of the scale that it lies beyond.
    pub(super) fn within(&self, value: f64) -> f64 {
        self.at(value)
            .clamp(self.from.min(self.to), self.from.max(self.to))
    }
}

/// A range without extent gets some.
fn opened(low: f64, high: f64) -> (f64, f64) {
    if high > low {
        return (low, high);
    }
    let half = if low == 0.0 { 1.0 } else { 0.1 * low.abs() };
    (low - half, low + half)
}

/// Round values from `low` to `high`, about `wanted` of them: multiples of 1, 2 or 5 times a
/// power of ten, with texts that show the step's last digit.
pub(super) fn ticks(low: f64, high: f64, wanted: u32) -> Vec<(f64, String)> {
    let (low, high) = opened(low, high);
    let rough = (high - low) / f64::from(wanted.max(1));
    let power = rough.log10().floor();
    let unit = 10_f64.powf(power);
    let step = unit
        * [1.0, 2.0, 5.0, 10.0]
            .into_iter()
            .find(|m| m * unit >= rough)
            .unwrap_or(10.0);
    // A hair of slack keeps the ends when rounding moves them.
    let slack = 1e-9 * step;
    let first = ((low - slack) / step).ceil();
    let count = ((high + slack) / step).floor() - first;
    let places = decimals(step);
    (0..=40_u32)
        .take_while(|&k| f64::from(k) <= count)
        .map(|k| {
            let value = (first + f64::from(k)) * step;
            (value, tick_text(value, step, places))
        })
        .collect()
}

fn tick_text(value: f64, step: f64, places: usize) -> String {
    if value.abs() < 0.5 * step {
        return "0".to_owned();
    }
    if value.abs() >= 1e6 || places > 5 {
        short(value)
    } else {
        format!("{value:.places$}")
    }
}

#[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // clamped to 0 ..= 20
fn decimals(step: f64) -> usize {
    (-(step * 1.000_001).log10().floor()).clamp(0.0, 20.0) as usize
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ticks_are_round_and_inside() {
        let texts = |low, high, wanted| -> Vec<String> {
            ticks(low, high, wanted)
                .into_iter()
                .map(|(_, text)| text)
                .collect()
        };
        assert_eq!(texts(0.0, 1.0, 5), ["0", "0.2", "0.4", "0.6", "0.8", "1.0"]);
        assert_eq!(texts(-0.12, 0.11, 4), ["-0.1", "0", "0.1"]);
        assert_eq!(texts(50.0, 100.0, 5), ["50", "60", "70", "80", "90", "100"]);
        assert_eq!(texts(3.0, 3.0, 4), ["2.8", "3.0", "3.2"]);
    }

    #[test]
    fn scales_map_their_ends() {
        let scale = Scale::linear(0.0, 2.0, 100.0, 50.0);
        assert!((scale.at(1.0) - 75.0).abs() < 1e-12);
        assert!((scale.within(9.0) - 50.0).abs() < 1e-12);
        let scale = Scale::logarithmic(1.0, 100.0, 0.0, 10.0);
        assert!((scale.at(10.0) - 5.0).abs() < 1e-12);
        assert!(Scale::linear(3.0, 3.0, 0.0, 1.0).at(3.0).is_finite());
    }
}
