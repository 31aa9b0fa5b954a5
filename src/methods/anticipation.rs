//! Information that later batches are expected to bring, seen from the first batch.

use super::Workbench;
use crate::numerics::kernels::Kernels;

/// Buffers of the methods with anticipated information.
#[derive(Debug, Clone, Default)]
pub(super) struct AnticipationScratch {
    /// Information per unit, `p × p`, estimated from batch 1.
    per_unit: Vec<f64>,
    /// Factor of a batch's Gram matrix plus the information to come.
    pub(super) factor: Vec<f64>,
    /// Solution for the contrast, or for the remainder.
    pub(super) first: Vec<f64>,
    /// Solution for what the weights have reached so far.
    pub(super) second: Vec<f64>,
    /// What is still to be explained, or what has been reached.
    pub(super) state: Vec<f64>,
    /// Image of the weights under the batch's Gram matrix.
    pub(super) image: Vec<f64>,
}

impl AnticipationScratch {
    /// Sets the information per unit to `(1-w)S_1/n_1 + w tr(S_1/n_1)/p I`, `w = min(1, p/n_1)`:
    /// the matrix of batch 1, shrunk towards a multiple of the identity.
    pub(super) fn prepare(&mut self, first_gram: &[f64], units: usize, p: usize) {
        let scale = 1.0 / units as f64;
        let weight = (p as f64 * scale).min(1.0);
        self.per_unit.clear();
        self.per_unit.extend(
            first_gram
                .iter()
                .map(|value| (1.0 - weight) * scale * value),
        );
        let trace: f64 = (0..p).map(|j| first_gram[j * p + j]).sum::<f64>() * scale;
        for j in 0..p {
            self.per_unit[j * p + j] += weight * trace / p as f64;
        }
        for buffer in [
            &mut self.first,
            &mut self.second,
            &mut self.state,
            &mut self.image,
        ] {
            buffer.clear();
            buffer.resize(p, 0.0);
        }
    }

    /// Factors `S_k + m J`, `J` the information per unit and `m` an effective number of units to
    /// come.
    pub(super) fn factor(&mut self, gram: &[f64], units_to_come: f64, p: usize, kernels: Kernels) {
        self.factor.clear();
        self.factor.extend_from_slice(gram);
        kernels.add_scaled(units_to_come, &self.per_unit, &mut self.factor);
        kernels.cholesky(&mut self.factor, p, 0.0);
    }
}

impl Workbench {
    /// Gram matrix of a batch.
    pub(super) fn batch_gram(&self, batch: usize) -> &[f64] {
        let p = self.stored.len();
        &self.batch_grams[batch * p * p..(batch + 1) * p * p]
    }

    /// Cross-products of a batch.
    pub(super) fn batch_cross(&self, batch: usize) -> &[f64] {
        let p = self.stored.len();
        &self.batch_crosses[batch * p..(batch + 1) * p]
    }
}

/// `out = S v` for a column-major symmetric matrix.
pub(super) fn multiply(matrix: &[f64], vector: &[f64], out: &mut [f64], kernels: Kernels) {
    out.fill(0.0);
    for (column, &factor) in matrix.chunks_exact(vector.len()).zip(vector) {
        kernels.add_scaled(factor, column, out);
    }
}
