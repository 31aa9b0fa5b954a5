//! The probability that one of several normal variables is the largest.

use super::distribution::{normal_cdf, normal_density};

/// Half-width of the integration range in standard deviations.
const REACH: f64 = 8.0;
/// Intervals of the trapezoid rule when no sd is much smaller than another.
const INTERVALS: f64 = 128.0;
/// Ratio of sds down to which [`INTERVALS`] is enough; below, the grid is refined in proportion.
const EASY_RATIO: f64 = 0.25;
/// Finest grid; a smaller sd is then a step on the scale of the wider variable.
const MOST_INTERVALS: f64 = 32_768.0;

/// Probability that each of the independent normals with the given means and standard deviations
/// is the largest.
///
/// `π_a = ∫ φ(u) Π_{b≠a} Φ((m_a + s_a u - m_b)/s_b) du`, closed form for two variables, else by
/// the trapezoid rule, which converges geometrically for such integrands. A standard deviation of
/// zero is a point mass; point masses that tie for the largest share it.
///
/// # Panics
/// If the slices differ in length.
#[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // bounded above
pub fn probability_of_being_largest(means: &[f64], sds: &[f64], out: &mut [f64]) {
    assert!(
        means.len() == sds.len() && means.len() == out.len(),
        "one entry per variable"
    );
    if let ([m0, m1], [s0, s1]) = (means, sds)
        && s0.hypot(*s1) > 0.0
    {
        out[1] = normal_cdf((m1 - m0) / s0.hypot(*s1));
        out[0] = normal_cdf((m0 - m1) / s0.hypot(*s1));
        return;
    }
    let widest = sds.iter().fold(0.0f64, |a, &b| a.max(b));
    let narrowest = sds
        .iter()
        .filter(|&&s| s > 0.0)
        .fold(widest, |a, &b| a.min(b));
    let ratio = if widest > 0.0 {
        narrowest / widest
    } else {
        1.0
    };
    let intervals = (INTERVALS * (EASY_RATIO / ratio).max(1.0)).min(MOST_INTERVALS) as usize;
    let step = 2.0 * REACH / intervals as f64;
    for a in 0..means.len() {
        out[a] = if sds[a] > 0.0 {
            (0..=intervals)
                .map(|node| {
                    let u = node as f64 * step - REACH;
                    normal_density(u) * beats_all(means, sds, a, means[a] + sds[a] * u)
                })
                .sum::<f64>()
                * step
        } else {
            beats_all(means, sds, a, means[a])
        };
    }
    let total: f64 = out.iter().sum();
    for probability in out.iter_mut() {
        *probability /= total;
    }
}

/// Probability that all variables but `own` are below `value`; a point mass equal to it counts as
/// below, and normalisation shares the tie.
fn beats_all(means: &[f64], sds: &[f64], own: usize, value: f64) -> f64 {
    let mut product = 1.0;
    for (b, (&mean, &sd)) in means.iter().zip(sds).enumerate() {
        if b == own {
            continue;
        }
        product *= if sd > 0.0 {
            normal_cdf((value - mean) / sd)
        } else {
            f64::from(u8::from(value >= mean))
        };
    }
    product
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn largest(means: &[f64], sds: &[f64]) -> Vec<f64> {
        let mut out = vec![0.0; means.len()];
        probability_of_being_largest(means, sds, &mut out);
        out
    }

    proptest! {
        #[test]
        fn a_hopeless_third_variable_leaves_the_closed_form(
            m in -2.0f64..2.0, s0 in 0.1f64..2.0, s1 in 0.1f64..2.0,
        ) {
            let three = largest(&[0.0, m, -100.0], &[s0, s1, 1.0]);
            let two = largest(&[0.0, m], &[s0, s1]);
            prop_assert!((three[0] - two[0]).abs() < 1e-9, "{three:?} {two:?}");
            prop_assert!((three.iter().sum::<f64>() - 1.0).abs() < 1e-12);
        }
    }

    #[test]
    fn equal_variables_are_equally_likely() {
        for probability in largest(&[0.3; 5], &[0.7; 5]) {
            assert!((probability - 0.2).abs() < 1e-12);
        }
        assert_eq!(largest(&[1.0, 1.0, 0.0], &[0.0; 3]), [0.5, 0.5, 0.0]);
    }
}
