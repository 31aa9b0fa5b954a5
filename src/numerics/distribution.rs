//! Distribution functions and quantiles.

use statrs::distribution::{Beta, Binomial, ContinuousCDF, DiscreteCDF, Normal, StudentsT};

/// Standard normal distribution function.
#[must_use]
pub fn normal_cdf(z: f64) -> f64 {
    Normal::standard().cdf(z)
}

/// Standard normal quantile; infinite at 0 and 1, NaN outside `[0, 1]`.
#[must_use]
pub fn normal_quantile(p: f64) -> f64 {
    if (0.0..=1.0).contains(&p) {
        Normal::standard().inverse_cdf(p)
    } else {
        f64::NAN
    }
}

/// Student t quantile; infinite `df` is the normal law, NaN for `p` outside `[0, 1]` or `df <= 0`.
#[must_use]
pub fn student_t_quantile(p: f64, df: f64) -> f64 {
    if df == f64::INFINITY {
        return normal_quantile(p);
    }
    match StudentsT::new(0.0, 1.0, df) {
        Ok(law) if (0.0..=1.0).contains(&p) => law.inverse_cdf(p),
        _ => f64::NAN,
    }
}

/// Exact two-sided confidence limits of a binomial proportion (Clopper & Pearson, 1934).
///
/// Without trials the limits are 0 and 1.
#[must_use]
#[allow(clippy::cast_precision_loss)] // counts stay below 2^53
pub fn clopper_pearson(successes: u64, trials: u64, confidence: f64) -> (f64, f64) {
    let tail = 0.5 * (1.0 - confidence);
    let failures = trials.saturating_sub(successes);
    let quantile = |p: f64, a: u64, b: u64| {
        Beta::new(a as f64, b as f64).map_or(f64::NAN, |law| law.inverse_cdf(p))
    };
    let lower = if successes == 0 {
        0.0
    } else {
        quantile(tail, successes, failures + 1)
    };
    let upper = if failures == 0 {
        1.0
    } else {
        quantile(1.0 - tail, successes + 1, failures)
    };
    (lower, upper)
}

/// `P(X <= k)` for `X` binomial with `n` trials of probability `p`; NaN for `p` outside `[0, 1]`.
#[must_use]
pub fn binomial_cdf(k: u64, n: u64, p: f64) -> f64 {
    Binomial::new(p, n).map_or(f64::NAN, |law| law.cdf(k))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ten_of_ten_has_the_closed_form_lower_limit() {
        // With no failure in n trials the lower limit is (tail)^(1/n).
        let (lower, upper) = clopper_pearson(10, 10, 0.95);
        assert!((lower - 0.025_f64.powf(0.1)).abs() < 1e-9);
        assert!((upper - 1.0).abs() < f64::EPSILON);
    }

    #[test]
    fn binomial_cdf_of_three_coins() {
        assert!((binomial_cdf(1, 3, 0.5) - 0.5).abs() < 1e-12);
    }
}
