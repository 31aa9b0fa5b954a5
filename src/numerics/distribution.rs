//! Distribution functions and quantiles that statistics here are built on.
//!
//! Built on `statrs`; its bisected quantiles are polished by Newton steps on the distribution
//! function, so that they are good to about ten digits. Outside its domain a function gives NaN.

use statrs::distribution::{Binomial, ContinuousCDF, DiscreteCDF, FisherSnedecor, Normal};
use statrs::function::beta::{beta_reg, inv_beta_reg};
use statrs::function::gamma::ln_gamma;

/// Newton steps after a coarse root; two double the digits twice.
const POLISHING_STEPS: usize = 3;
/// Relative size below which a term of an expansion is left out.
const NEGLIGIBLE: f64 = 1e-11;
/// Bound on the Newton steps of a quantile that may start far off.
const MOST_STEPS: usize = 40;

/// Distribution function of the standard normal law.
#[must_use]
pub fn normal_cdf(z: f64) -> f64 {
    0.5 * libm::erfc(-z * std::f64::consts::FRAC_1_SQRT_2)
}

/// Density of the standard normal law.
#[must_use]
pub fn normal_density(z: f64) -> f64 {
    libm::exp(-0.5 * z * z) / (2.0 * std::f64::consts::PI).sqrt()
}

/// Quantile of the standard normal law; infinite at 0 and 1, NaN outside `[0, 1]`.
#[must_use]
pub fn normal_quantile(probability: f64) -> f64 {
    if !(0.0..=1.0).contains(&probability) {
        return f64::NAN;
    }
    Normal::standard().inverse_cdf(probability)
}

/// Distribution function of Student's t law; `df` may be infinite.
#[must_use]
pub fn student_t_cdf(t: f64, df: f64) -> f64 {
    if df.is_infinite() && df > 0.0 {
        return normal_cdf(t);
    }
    if df.is_nan() || df <= 0.0 || t.is_nan() {
        return f64::NAN;
    }
    // P(|T| > |t|) = I_{df/(df+t²)}(df/2, 1/2).
    let both_tails = beta_reg(df / 2.0, 0.5, df / (df + t * t));
    if t > 0.0 {
        1.0 - 0.5 * both_tails
    } else {
        0.5 * both_tails
    }
}

/// Density of Student's t law with finite `df`.
fn student_t_density(t: f64, df: f64) -> f64 {
    let log_constant =
        ln_gamma(df.midpoint(1.0)) - ln_gamma(df / 2.0) - 0.5 * (df * std::f64::consts::PI).ln();
    (log_constant - df.midpoint(1.0) * (t * t / df).ln_1p()).exp()
}

/// Quantile of Student's t law from the standard normal quantile `z` by its expansion in `1/df`
/// (Abramowitz & Stegun 1964, 26.7.5, recalled), if its fifth term is negligible.
fn student_t_expansion(z: f64, df: f64) -> Option<f64> {
    let s = z * z;
    let g1 = (s + 1.0) / 4.0;
    let g2 = ((5.0 * s + 16.0) * s + 3.0) / 96.0;
    let g3 = (((3.0 * s + 19.0) * s + 17.0) * s - 15.0) / 384.0;
    let g4 = ((((79.0 * s + 776.0) * s + 1482.0) * s - 1920.0) * s - 945.0) / 92_160.0;
    // Size of the fifth term, all signs taken as positive.
    let g5 =
        (((((27.0 * s + 339.0) * s + 930.0) * s + 1782.0) * s + 765.0) * s + 17_955.0) / 368_640.0;
    (g5 < NEGLIGIBLE * df.powi(5)).then(|| z + z * (g1 + (g2 + (g3 + g4 / df) / df) / df) / df)
}

/// Quantile of Student's t law; `df` may be infinite.
#[must_use]
pub fn student_t_quantile(probability: f64, df: f64) -> f64 {
    if df.is_infinite() && df > 0.0 {
        return normal_quantile(probability);
    }
    if df.is_nan() || df <= 0.0 || !(0.0..=1.0).contains(&probability) {
        return f64::NAN;
    }
    if (probability - 0.5).abs() < f64::EPSILON {
        return 0.0;
    }
    if let Some(quantile) = student_t_expansion(normal_quantile(probability), df) {
        return quantile;
    }
    // The smaller tail keeps its relative precision; the law is symmetric.
    let tail = probability.min(1.0 - probability);
    if tail <= 0.0 {
        return if probability < 0.5 {
            f64::NEG_INFINITY
        } else {
            f64::INFINITY
        };
    }
    let x = inv_beta_reg(df / 2.0, 0.5, 2.0 * tail);
    // Tails too thin for the inverse beta end at zero; the density's own tail is the start then.
    let mut t = if x > 0.0 {
        (df * (1.0 - x) / x).sqrt()
    } else {
        f64::MAX.sqrt()
    };
    for _ in 0..MOST_STEPS {
        let density = student_t_density(t, df);
        let found = student_t_cdf(-t, df);
        // Heavy tails are powers of t: there Newton's step is taken on logarithms of both.
        let next = if t > 1.0 {
            t * ((found / tail).ln() * found / (t * density)).exp()
        } else {
            t + (found - tail) / density
        };
        if !next.is_finite() || (next - t).abs() <= 2.0 * f64::EPSILON * t.abs() {
            break;
        }
        t = next;
    }
    t.copysign(probability - 0.5)
}

/// Quantile of the F law with `numerator` and `denominator` degrees of freedom.
#[must_use]
pub fn f_quantile(probability: f64, numerator: f64, denominator: f64) -> f64 {
    let inside = (0.0..=1.0).contains(&probability);
    match FisherSnedecor::new(numerator, denominator) {
        Ok(law) if inside => {
            use statrs::distribution::Continuous;
            let mut quantile = law.inverse_cdf(probability);
            for _ in 0..POLISHING_STEPS {
                let step = (law.cdf(quantile) - probability) / law.pdf(quantile);
                if !step.is_finite() || quantile - step <= 0.0 {
                    break;
                }
                quantile -= step;
            }
            quantile
        }
        _ => f64::NAN,
    }
}

/// Distribution function of the binomial law: the chance of at most `k` successes in `n` trials.
#[must_use]
pub fn binomial_cdf(k: u64, n: u64, probability: f64) -> f64 {
    Binomial::new(probability, n).map_or(f64::NAN, |law| law.cdf(k))
}

/// Exact limits for a proportion (Clopper & Pearson 1934): `(lower, upper)` at `confidence`.
#[must_use]
pub fn clopper_pearson(successes: u64, trials: u64, confidence: f64) -> (f64, f64) {
    if trials == 0 || successes > trials || !(0.0..1.0).contains(&confidence) {
        return (f64::NAN, f64::NAN);
    }
    let tail = 0.5 * (1.0 - confidence);
    let (hits, misses) = (successes as f64, (trials - successes) as f64);
    let lower = if successes == 0 {
        0.0
    } else {
        beta_quantile(hits, misses + 1.0, tail)
    };
    let upper = if successes == trials {
        1.0
    } else {
        1.0 - beta_quantile(misses, hits + 1.0, tail)
    };
    (lower, upper)
}

/// Lower-tail quantile of the beta law, polished on the logarithm of the distribution function.
fn beta_quantile(a: f64, b: f64, probability: f64) -> f64 {
    let mut x = inv_beta_reg(a, b, probability);
    let log_constant = ln_gamma(a + b) - ln_gamma(a) - ln_gamma(b);
    for _ in 0..POLISHING_STEPS {
        let cumulative = beta_reg(a, b, x);
        let density = (log_constant + (a - 1.0) * x.ln() + (b - 1.0) * (-x).ln_1p()).exp();
        let step = (cumulative - probability) / density;
        let next = x - step;
        if !step.is_finite() || next <= 0.0 || next >= 1.0 {
            break;
        }
        x = next;
    }
    x
}
