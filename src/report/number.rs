//! Numbers as people and as files read them.

use crate::score::MeasureValue;

/// Decimals beyond which a table switches to powers of ten.
const MOST_DECIMALS: i32 = 6;

/// Magnitude from which a table switches to powers of ten.
const LARGEST_PLAIN: f64 = 1e7;

/// Shortest text that reads back as the same number; empty for a value that does not exist.
pub(super) fn exact(value: f64) -> String {
    if value.is_nan() {
        return String::new();
    }
    // Debug formatting is the shortest round trip and, unlike Display, uses an exponent for
    // extreme values; the `.0` of whole numbers is dropped.
    let text = format!("{value:?}");
    text.strip_suffix(".0")
        .map_or(text.clone(), ToOwned::to_owned)
}

/// Decimals at which the smallest positive error shows one significant digit; `fallback` when
/// there is no positive error.
pub(super) fn decimals(errors: impl Iterator<Item = f64>, fallback: usize) -> usize {
    let smallest = errors
        .filter(|error| error.is_finite() && *error > 0.0)
        .fold(f64::INFINITY, f64::min);
    if smallest.is_infinite() {
        return fallback;
    }
    // A hair of slack: 0.1 may come out of a product a little below 0.1.
    let wanted = -(smallest * (1.0 + 1e-9)).log10().floor();
    if wanted <= 0.0 {
        0
    } else {
        whole(wanted).min(whole(f64::from(MOST_DECIMALS) + 1.0))
    }
}

/// A value at a number of decimals; very large or very fine values as powers of ten.
pub(super) fn fixed(value: f64, decimals: usize) -> String {
    if value.is_nan() {
        return "-".to_owned();
    }
    if value.is_infinite() {
        return if value > 0.0 { "infinite" } else { "-infinite" }.to_owned();
    }
    if value.abs() >= LARGEST_PLAIN || decimals > whole(f64::from(MOST_DECIMALS)) {
        return format!("{value:.2e}");
    }
    let text = format!("{value:.decimals$}");
    // "-0.00" says nothing that "0.00" does not.
    let is_zero = text.bytes().all(|byte| matches!(byte, b'-' | b'0' | b'.'));
    if is_zero {
        text.trim_start_matches('-').to_owned()
    } else {
        text
    }
}

/// A number in running text: four significant digits at most, no trailing zeros.
pub(super) fn short(value: f64) -> String {
    if value == 0.0 || !value.is_finite() {
        return fixed(value, 0);
    }
    let magnitude = value.abs().log10().floor();
    if !(-4.0..7.0).contains(&magnitude) {
        return format!("{value:.2e}");
    }
    let places = whole((3.0 - magnitude).max(0.0));
    let text = fixed(value, places);
    if text.contains('.') {
        text.trim_end_matches('0').trim_end_matches('.').to_owned()
    } else {
        text
    }
}

/// A share as per cent in running text, such as `95 %` or `97.5 %`.
pub(super) fn per_cent(share: f64) -> String {
    format!("{} %", short(100.0 * share))
}

/// A count with thin groups of three digits, such as `10 000`.
pub(super) fn grouped(count: u64) -> String {
    let digits = count.to_string();
    let mut text = String::with_capacity(digits.len() + digits.len() / 3);
    for (position, digit) in digits.chars().enumerate() {
        if position > 0 && (digits.len() - position).is_multiple_of(3) {
            text.push(' ');
        }
        text.push(digit);
    }
    text
}

/// The Monte Carlo error beside a value: `±` its standard error, or, where every trial agreed and
/// the standard error is zero, the exact 95 % limit that is not trivial. `scale` multiplies both
/// (100 for per cent).
pub(super) fn doubt(value: &MeasureValue, scale: f64, decimals: usize) -> Option<String> {
    if value.mcse.is_nan() {
        return None;
    }
    if value.mcse > 0.0 {
        return Some(format!("±{}", fixed(scale * value.mcse, decimals)));
    }
    let (lower, upper) = value.limits?;
    // The limit is rounded to two significant digits of its distance from the end.
    if value.value >= 1.0 {
        let places = decimals_of_distance(scale * (1.0 - lower));
        Some(format!("≥{}", fixed(scale * lower, places)))
    } else {
        let places = decimals_of_distance(scale * upper);
        Some(format!("≤{}", fixed(scale * upper, places)))
    }
}

fn decimals_of_distance(distance: f64) -> usize {
    decimals(std::iter::once(distance), 1)
}

#[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // callers pass small values ≥ 0
fn whole(value: f64) -> usize {
    value as usize
}

/// A count as a float.
#[allow(clippy::cast_precision_loss)] // counts of trials are far below 2^52
pub(super) fn real(count: u64) -> f64 {
    count as f64
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::score::Measure;

    #[test]
    fn exact_numbers_read_back() {
        for value in [
            0.1 + 0.2,
            1.0,
            -0.0,
            1e-300,
            12_345_678_901.0,
            f64::INFINITY,
            5e-324,
        ] {
            let text = exact(value);
            assert_eq!(
                text.parse::<f64>().unwrap().to_bits(),
                value.to_bits(),
                "{text}"
            );
        }
        assert_eq!(exact(1.0), "1");
        assert_eq!(exact(f64::NAN), "");
        assert!(exact(1e-300).len() < 10);
    }

    #[test]
    fn decimals_follow_the_smallest_error() {
        assert_eq!(decimals([0.004, 0.02].into_iter(), 3), 3);
        assert_eq!(decimals([2.2, 0.0].into_iter(), 3), 0);
        assert_eq!(decimals([0.0, f64::NAN].into_iter(), 3), 3);
        assert_eq!(fixed(0.012_345, decimals([0.001].into_iter(), 0)), "0.012");
        assert_eq!(fixed(-0.000_1, 2), "0.00");
        assert_eq!(fixed(1.5e9, 2), "1.50e9");
    }

    #[test]
    fn running_text_is_short() {
        assert_eq!(short(0.3), "0.3");
        assert_eq!(short(1.0 / 3.0), "0.3333");
        assert_eq!(short(120.0), "120");
        assert_eq!(per_cent(0.975), "97.5 %");
        assert_eq!(grouped(1_234_567), "1 234 567");
        assert_eq!(grouped(100), "100");
    }

    #[test]
    fn agreement_of_all_trials_shows_the_exact_limit() {
        let value = MeasureValue {
            measure: Measure::Coverage,
            value: 1.0,
            mcse: 0.0,
            limits: Some((0.9963, 1.0)),
            trials_used: 1000,
        };
        assert_eq!(doubt(&value, 100.0, 1).unwrap(), "≥99.6");
        let none = MeasureValue {
            value: 0.0,
            limits: Some((0.0, 0.003_682)),
            ..value
        };
        assert_eq!(doubt(&none, 100.0, 1).unwrap(), "≤0.4");
        let usual = MeasureValue {
            value: 0.931,
            mcse: 0.004,
            ..value
        };
        assert_eq!(doubt(&usual, 100.0, 1).unwrap(), "±0.4");
    }
}
