//! Standardised noise laws as monotone transforms of a standard normal.

use crate::numerics::quantile_table::QuantileTable;
use crate::plan::NoiseLaw;
use crate::population::student_t_table;

/// A noise law prepared for drawing: mean zero, variance one.
#[derive(Debug, Clone)]
pub(super) enum NoiseTransform {
    Normal,
    Table { table: QuantileTable, scale: f64 },
    Laplace,
    LogNormal { log_sd: f64, mean: f64, sd: f64 },
}

impl NoiseTransform {
    pub(super) fn new(law: NoiseLaw) -> Self {
        match law {
            NoiseLaw::Normal => Self::Normal,
            // The variance of t(df) is df / (df - 2).
            NoiseLaw::StudentT { df } => Self::Table {
                table: student_t_table(df),
                scale: ((df - 2.0) / df).sqrt(),
            },
            NoiseLaw::Laplace => Self::Laplace,
            NoiseLaw::CentredLogNormal { log_sd } => {
                let variance = log_sd * log_sd;
                Self::LogNormal {
                    log_sd,
                    mean: libm::exp(variance / 2.0),
                    sd: (libm::expm1(variance) * libm::exp(variance)).sqrt(),
                }
            }
        }
    }

    /// Transforms standard normals in place.
    pub(super) fn apply(&self, values: &mut [f64]) {
        match self {
            Self::Normal => {}
            Self::Table { table, scale } => {
                for value in values {
                    *value = scale * table.at(*value);
                }
            }
            // Quantile -ln(2q)/√2 at upper tail probability q.
            Self::Laplace => {
                for value in values {
                    let two_tails = libm::erfc(value.abs() * std::f64::consts::FRAC_1_SQRT_2);
                    let size = -libm::log(two_tails) * std::f64::consts::FRAC_1_SQRT_2;
                    *value = size.copysign(*value);
                }
            }
            Self::LogNormal { log_sd, mean, sd } => {
                for value in values {
                    *value = (libm::exp(log_sd * *value) - mean) / sd;
                }
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Integrates moments against the normal density by the trapezoid rule.
    #[test]
    fn every_law_has_mean_zero_and_variance_one() {
        for law in [
            NoiseLaw::Normal,
            NoiseLaw::StudentT { df: 6.0 },
            NoiseLaw::Laplace,
            NoiseLaw::CentredLogNormal { log_sd: 0.6 },
        ] {
            let step = 1e-3;
            let mut nodes: Vec<f64> = (-8400..=8400).map(|k| f64::from(k) * step).collect();
            let weights: Vec<f64> = nodes
                .iter()
                .map(|z| (-z * z / 2.0).exp() * step / (2.0 * std::f64::consts::PI).sqrt())
                .collect();
            NoiseTransform::new(law).apply(&mut nodes);
            let mean: f64 = nodes.iter().zip(&weights).map(|(x, w)| x * w).sum();
            let variance: f64 = nodes.iter().zip(&weights).map(|(x, w)| x * x * w).sum();
            assert!(mean.abs() < 1e-6, "{law:?}: mean {mean}");
            assert!(
                (variance - 1.0).abs() < 1e-4,
                "{law:?}: variance {variance}"
            );
        }
    }
}
