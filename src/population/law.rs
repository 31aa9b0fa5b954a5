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

    /// Number of covariates, each driven by one latent normal.
    pub(super) fn len(&self) -> usize {
        self.transforms.len()
    }

    /// Whether every covariate is normal.
    #[must_use]
    pub fn is_gaussian(&self) -> bool {
        self.transforms
            .iter()
            .all(|transform| matches!(transform, Transform::Affine { .. }))
    }

    /// Weights on the independent latent normals of a score with the given slopes on the
    /// covariate columns of a Gaussian population: `w = L'Db`.
    pub(super) fn latent_weights(&self, slopes: &[f64], out: &mut Vec<f64>) {
        out.clear();
        out.extend(
            self.transforms
                .iter()
                .zip(slopes)
                .map(|(transform, slope)| match transform {
                    Transform::Affine { scale, .. } => scale * slope,
                    _ => 0.0,
                }),
        );
        match &self.correlation {
            CorrelationFactor::Identity => {}
            CorrelationFactor::Autoregressive(rho) => {
                let innovation = (1.0 - rho * rho).sqrt();
                let mut later = 0.0;
                for (index, weight) in out.iter_mut().enumerate().rev() {
                    later = *weight + rho * later;
                    *weight = if index == 0 {
                        later
                    } else {
                        innovation * later
                    };
                }
            }
            CorrelationFactor::Lower(factor) => {
                // Entry j needs the values at j and after, so it can be replaced in order.
                for column in 0..out.len() {
                    out[column] = (column..out.len())
                        .map(|row| factor[(row, column)] * out[row])
                        .sum();
                }
            }
        }
    }

    /// Turns independent latent normals (one column per covariate, of the pool's count) into the
    /// covariates of a Gaussian population.
    pub(super) fn correlate(&self, independent: &[f64], scratch: &mut [f64], pool: &mut Pool) {
        let count = scratch.len();
        scratch.fill(0.0);
        for (index, transform) in self.transforms.iter().enumerate() {
            let own = &independent[index * count..(index + 1) * count];
            let column = self.first_columns[index];
            match &self.correlation {
                CorrelationFactor::Identity => transform.fill(0, own, pool.column_mut(column)),
                CorrelationFactor::Autoregressive(rho) => {
                    let innovation = if index == 0 {
                        1.0
                    } else {
                        (1.0 - rho * rho).sqrt()
                    };
                    for (z, e) in scratch.iter_mut().zip(own) {
                        *z = rho * *z + innovation * e;
                    }
                    transform.fill(0, scratch, pool.column_mut(column));
                }
                CorrelationFactor::Lower(factor) => {
                    scratch.fill(0.0);
                    for earlier in 0..=index {
                        let weight = factor[(index, earlier)];
                        let column = &independent[earlier * count..(earlier + 1) * count];
                        for (z, e) in scratch.iter_mut().zip(column) {
                            *z += weight * e;
                        }
                    }
                    transform.fill(0, scratch, pool.column_mut(column));
                }
            }
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
