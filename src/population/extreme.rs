//! The extreme candidates of a Gaussian population, without drawing the others.

use super::{LawSampler, Pool};
use crate::numerics::distribution::normal_quantile;
use crate::plan::Tail;
use crate::streams::{Purpose, Streams, fill_standard_normal, open_uniform};
use rand_distr::{Beta, Distribution};

/// Stream column of the order statistics, beyond any covariate column.
const ORDER_STATISTICS: usize = (1 << 18) - 1;

/// Which candidates are wanted.
#[derive(Debug, Clone, Copy)]
pub struct Extreme<'a> {
    /// Slope of the score on each covariate column.
    pub slopes: &'a [f64],
    /// Which end of the scores is enrolled.
    pub tail: Tail,
    /// Candidates screened.
    pub candidates: usize,
    /// Candidates enrolled, fewer than are screened.
    pub size: usize,
}

impl LawSampler {
    /// Draws the `size` candidates with the highest (or lowest) scores among `candidates`,
    /// exactly in law and in exchangeable order, at the cost of `size` candidates.
    ///
    /// A linear score of Gaussian covariates is `constant + ‖w‖u` with `u = w'e/‖w‖` standard
    /// normal, `e` the independent latent normals and `w` the score's weights on them. The upper
    /// tail probability of the best candidate left out is `V ~ Beta(k+1, m-k)`, the enrolled have
    /// tail probabilities uniform on `(0, V)`, and given `u` the rest of `e` is an independent
    /// normal: draw `e`, then replace its component along `w`.
    ///
    /// The population must be [Gaussian](Self::is_gaussian).
    pub(super) fn draw_extreme(
        &self,
        streams: &Streams,
        batch: usize,
        part: usize,
        extreme: &Extreme<'_>,
        pool: &mut Pool,
    ) {
        let (size, candidates) = (extreme.size, extreme.candidates);
        let latent_count = self.len();
        pool.prepare(size);
        let mut latents = std::mem::take(&mut pool.latents);
        // One column of corrections, one of scratch, then the independent latent normals.
        latents.resize(((latent_count + 2) * size).max(latents.len()), 0.0);
        let (corrections, rest) = latents.split_at_mut(size);
        let (scratch, rest) = rest.split_at_mut(size);
        let independent = &mut rest[..latent_count * size];
        let mut weights = std::mem::take(&mut pool.weights);
        self.latent_weights(extreme.slopes, &mut weights);
        let norm = weights
            .iter()
            .map(|weight| weight * weight)
            .sum::<f64>()
            .sqrt();
        corrections.fill(0.0);
        for (index, column) in independent.chunks_exact_mut(size).enumerate() {
            let mut stream = streams.open(Purpose::Candidates, batch, part, index);
            fill_standard_normal(&mut stream, column);
            if norm > 0.0 {
                let weight = weights[index] / norm;
                for (sum, value) in corrections.iter_mut().zip(&*column) {
                    *sum -= weight * value;
                }
            }
        }
        if norm > 0.0 {
            let mut stream = streams.open(Purpose::Candidates, batch, part, ORDER_STATISTICS);
            let left_out = Beta::new(size as f64 + 1.0, (candidates - size) as f64)
                .map_or(1.0, |law| law.sample(&mut stream));
            let sign = match extreme.tail {
                Tail::Top => -1.0,
                Tail::Bottom => 1.0,
            };
            for correction in corrections.iter_mut() {
                let tail_probability = left_out * open_uniform(&mut stream);
                *correction += sign * normal_quantile(tail_probability);
            }
            for (index, column) in independent.chunks_exact_mut(size).enumerate() {
                let weight = weights[index] / norm;
                for (value, correction) in column.iter_mut().zip(&*corrections) {
                    *value += weight * correction;
                }
            }
        }
        self.correlate(independent, scratch, pool);
        pool.latents = latents;
        pool.weights = weights;
    }
}
