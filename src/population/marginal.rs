//! Marginal laws as monotone transforms of a latent standard normal.

use crate::numerics::quantile_table::{QuantileTable, bisect_decreasing};
use crate::plan::Marginal;
use statrs::distribution::{ContinuousCDF, Normal, StudentsT};
use statrs::function::gamma::{gamma_lr, gamma_ur};

/// A marginal law prepared for drawing.
#[derive(Debug, Clone)]
pub(super) enum Transform {
    /// `location + scale × z`.
    Affine { location: f64, scale: f64 },
    /// `low + range × Φ(z)`.
    Uniform { low: f64, range: f64 },
    /// `exp(location + scale × z)`.
    Exponential { location: f64, scale: f64 },
    /// `location + scale × table(z)`.
    Table {
        table: QuantileTable,
        location: f64,
        scale: f64,
    },
    /// Number of cut points below `z`.
    Count { cuts: Vec<f64> },
    /// Indicators that the number of cut points below `z` is 1, 2, ...
    Levels { cuts: Vec<f64> },
}

/// Quantile of the standard normal with cumulative probability `probability`.
fn cut(probability: f64) -> f64 {
    if probability <= 0.0 {
        f64::NEG_INFINITY
    } else if probability >= 1.0 {
        f64::INFINITY
    } else {
        Normal::standard().inverse_cdf(probability)
    }
}

fn normal_upper_tail(z: f64) -> f64 {
    0.5 * libm::erfc(z * std::f64::consts::FRAC_1_SQRT_2)
}

impl Transform {
    pub(super) fn new(marginal: &Marginal) -> Self {
        match marginal {
            &Marginal::Normal { mean, sd } => Self::Affine {
                location: mean,
                scale: sd,
            },
            &Marginal::Uniform { low, high } => Self::Uniform {
                low,
                range: high - low,
            },
            &Marginal::LogNormal { log_mean, log_sd } => Self::Exponential {
                location: log_mean,
                scale: log_sd,
            },
            &Marginal::Gamma { shape, scale } => Self::Table {
                table: QuantileTable::new(|z| standard_gamma_quantile(shape, z)),
                location: 0.0,
                scale,
            },
            &Marginal::StudentT {
                df,
                location,
                scale,
            } => Self::Table {
                table: student_t_table(df),
                location,
                scale,
            },
            &Marginal::Bernoulli { probability } => Self::Count {
                cuts: vec![cut(1.0 - probability)],
            },
            Marginal::Categorical { probabilities } => {
                let mut total = 0.0;
                let last = probabilities.len() - 1;
                let cuts = probabilities[..last]
                    .iter()
                    .map(|probability| {
                        total += probability;
                        cut(total)
                    })
                    .collect();
                Self::Levels { cuts }
            }
            &Marginal::Poisson { mean } => Self::Count {
                cuts: poisson_cuts(mean),
            },
        }
    }

    /// Number of numeric columns.
    pub(super) fn width(&self) -> usize {
        match self {
            Self::Levels { cuts } => cuts.len(),
            _ => 1,
        }
    }

    /// Fills the `offset`-th column of the covariate from its latent normals.
    pub(super) fn fill(&self, offset: usize, latent: &[f64], out: &mut [f64]) {
        let pairs = out.iter_mut().zip(latent);
        match self {
            Self::Affine { location, scale } => pairs.for_each(|(x, z)| *x = location + scale * z),
            Self::Uniform { low, range } => {
                pairs.for_each(|(x, &z)| *x = low + range * normal_upper_tail(-z));
            }
            Self::Exponential { location, scale } => {
                pairs.for_each(|(x, z)| *x = libm::exp(location + scale * z));
            }
            Self::Table {
                table,
                location,
                scale,
            } => {
                pairs.for_each(|(x, &z)| *x = location + scale * table.at(z));
            }
            Self::Count { cuts } => {
                pairs.for_each(|(x, &z)| *x = cuts.partition_point(|&cut| cut < z) as f64);
            }
            Self::Levels { cuts } => pairs.for_each(|(x, &z)| {
                let level = cuts.partition_point(|&cut| cut < z);
                *x = f64::from(u8::from(level == offset + 1));
            }),
        }
    }
}

/// Table of the Student t law as a transform of a standard normal.
pub(crate) fn student_t_table(df: f64) -> QuantileTable {
    match StudentsT::new(0.0, 1.0, df) {
        // Lower tail only: it keeps full relative precision, and the law is symmetric.
        Ok(law) => QuantileTable::new(|z| {
            let target = normal_upper_tail(z.abs());
            let mut low = -1.0;
            while law.cdf(low) > target {
                low *= 2.0;
            }
            bisect_decreasing(0.0, -low, target, |t| law.cdf(-t)).copysign(z)
        }),
        // A plan holds positive degrees of freedom only.
        Err(_) => QuantileTable::new(|z| z),
    }
}

/// Quantile of the gamma law with unit scale at `Φ(z)`, from the tail that is smaller.
fn standard_gamma_quantile(shape: f64, z: f64) -> f64 {
    let target = normal_upper_tail(z);
    let mut high = shape.max(1.0);
    while gamma_ur(shape, high) > target && high < f64::MAX / 4.0 {
        high *= 2.0;
    }
    if z > 0.0 {
        bisect_decreasing(0.0, high, target, |x| gamma_ur(shape, x))
    } else {
        let lower = normal_upper_tail(-z);
        // On the log scale, since the lower quantile may be many powers of ten below one.
        let log_x = bisect_decreasing(-700.0, libm::log(high), -lower, |log_x| {
            -gamma_lr(shape, libm::exp(log_x).max(f64::MIN_POSITIVE))
        });
        libm::exp(log_x)
    }
}

/// Latent cut points of a Poisson law: the count is the number of cuts below `z`.
fn poisson_cuts(mean: f64) -> Vec<f64> {
    // P(count <= k) = Q(k + 1, mean); cuts stop where a standard normal no longer reaches.
    const REACH: f64 = 8.5;
    let mut cuts = Vec::new();
    let mut at_most = 1.0;
    loop {
        let cut = cut(gamma_ur(at_most, mean));
        if cut > REACH {
            return cuts;
        }
        cuts.push(cut);
        at_most += 1.0;
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use statrs::distribution::{Discrete, Gamma, Poisson};

    #[test]
    fn transforms_reproduce_the_distribution_function() {
        for (shape, z) in [
            (0.3, -2.0),
            (0.3, 1.5),
            (2.5, -1.0),
            (2.5, 3.0),
            (40.0, 0.2),
        ] {
            let table = QuantileTable::new(|z| standard_gamma_quantile(shape, z));
            let law = Gamma::new(shape, 1.0).unwrap();
            let expected = normal_upper_tail(-z);
            assert!(
                (law.cdf(table.at(z)) - expected).abs() < 1e-8,
                "gamma {shape} at {z}"
            );
        }
        for (df, z) in [(3.0, -2.5), (3.0, 0.7), (8.0, 1.9), (100.0, -0.1)] {
            let law = StudentsT::new(0.0, 1.0, df).unwrap();
            let found = law.cdf(student_t_table(df).at(z));
            assert!(
                (found - normal_upper_tail(-z)).abs() < 1e-8,
                "t {df} at {z}"
            );
        }
    }

    #[test]
    fn poisson_cuts_have_the_right_masses() {
        let law = Poisson::new(2.3).unwrap();
        let cuts = poisson_cuts(2.3);
        let mut below = 0.0;
        for (count, &cut) in cuts.iter().enumerate().take(12) {
            let cumulative = normal_upper_tail(-cut);
            assert!(
                (cumulative - below - law.pmf(count as u64)).abs() < 1e-9,
                "{count}"
            );
            below = cumulative;
        }
    }

    #[test]
    fn levels_are_reference_coded() {
        let transform = Transform::new(&Marginal::Categorical {
            probabilities: vec![0.2, 0.5, 0.3],
        });
        let latent = [-1.5, -0.5, 0.0, 1.5];
        let mut second = [9.0; 4];
        let mut third = [9.0; 4];
        transform.fill(0, &latent, &mut second);
        transform.fill(1, &latent, &mut third);
        assert_eq!(second.map(|v| v > 0.5), [false, true, true, false]);
        assert_eq!(third.map(|v| v > 0.5), [false, false, false, true]);
    }
}
