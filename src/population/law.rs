//! Candidates from marginal laws joined by a Gaussian copula.

use super::Pool;
use super::marginal::Transform;
use crate::plan::{CorrelationFactor, LawPopulation};
use crate::streams::{Purpose, Streams, fill_standard_normal};

/// A law prepared for drawing.
#[derive(Debug, Clone)]
pub struct LawSampler {
    transforms: Vec<Transform>,
    /// First column of each marginal.
    first_columns: Vec<usize>,
    correlation: CorrelationFactor,
}

impl LawSampler {
    /// Prepares a law for drawing.
    #[must_use]
    pub fn new(law: &LawPopulation) -> Self {
        let mut first_columns = Vec::with_capacity(law.marginals.len());
        let mut next = 0;
        for marginal in &law.marginals {
            first_columns.push(next);
            next += marginal.width();
        }
        Self {
            transforms: law.marginals.iter().map(Transform::new).collect(),
            first_columns,
            correlation: law.correlation.clone(),
        }
    }

    /// Draws `count` candidates. Column by column, each from its own stream position, so that a
    /// population with more covariates or more candidates keeps the values of the smaller one.
    pub(super) fn draw(
        &self,
        streams: &Streams,
        batch: usize,
        part: usize,
        count: usize,
        pool: &mut Pool,
    ) {
        pool.prepare(count);
        let latent_columns = match self.correlation {
            CorrelationFactor::Identity => 1,
            CorrelationFactor::Autoregressive(_) => 2,
            CorrelationFactor::Lower(_) => self.transforms.len() + 1,
        };
        let mut latents = std::mem::take(&mut pool.latents);
        if latents.len() < latent_columns * count {
            latents.resize(latent_columns * count, 0.0);
        }
        for (index, transform) in self.transforms.iter().enumerate() {
            let mut stream = streams.open(Purpose::Candidates, batch, part, index);
            let column = self.first_columns[index];
            let latent = match &self.correlation {
                CorrelationFactor::Identity => {
                    if let &Transform::Affine { location, scale } = transform {
                        let out = pool.column_mut(column);
                        fill_standard_normal(&mut stream, out);
                        if location != 0.0 || (scale - 1.0).abs() > 0.0 {
                            for value in out {
                                *value = location + scale * *value;
                            }
                        }
                        continue;
                    }
                    let latent = &mut latents[..count];
                    fill_standard_normal(&mut stream, latent);
                    &*latent
                }
                CorrelationFactor::Autoregressive(rho) => {
                    let innovation = (1.0 - rho * rho).sqrt();
                    let (fresh, rest) = latents.split_at_mut(count);
                    let current = &mut rest[..count];
                    fill_standard_normal(&mut stream, fresh);
                    if index == 0 {
                        current.copy_from_slice(fresh);
                    } else {
                        for (z, e) in current.iter_mut().zip(&*fresh) {
                            *z = rho * *z + innovation * e;
                        }
                    }
                    &*current
                }
                CorrelationFactor::Lower(factor) => {
                    let (sum, independent) = latents.split_at_mut(count);
                    let fresh = &mut independent[index * count..(index + 1) * count];
                    fill_standard_normal(&mut stream, fresh);
                    sum.fill(0.0);
                    for earlier in 0..=index {
                        let weight = factor[(index, earlier)];
                        let column = &independent[earlier * count..(earlier + 1) * count];
                        for (z, e) in sum.iter_mut().zip(column) {
                            *z += weight * e;
                        }
                    }
                    &*sum
                }
            };
            for offset in 0..transform.width() {
                transform.fill(offset, latent, pool.column_mut(column + offset));
            }
        }
        pool.latents = latents;
    }
}
