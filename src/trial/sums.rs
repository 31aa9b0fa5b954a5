//! Batch sums: all that least squares needs from a batch.

use super::Trial;
use crate::numerics::kernels::Kernels;

/// Gram matrices and cross-products of every finished batch, over the stored columns `used`.
#[derive(Debug, Clone)]
pub struct BatchSums {
    used: Vec<usize>,
    batches: usize,
    /// Per batch `w × w`.
    gram: Vec<f64>,
    /// Per batch `w`.
    cross: Vec<f64>,
    /// Units per batch.
    units: Vec<usize>,
}

/// Sums of one batch, or of several batches together.
#[derive(Debug, Clone, Copy)]
pub struct SumsView<'a> {
    /// Gram matrix over the used columns, `w × w`.
    pub gram: &'a [f64],
    /// Cross-products with the outcome, `w`.
    pub cross: &'a [f64],
    /// Number of units.
    pub units: usize,
}

impl BatchSums {
    /// Room for `batches` batches over the stored columns `used`.
    #[must_use]
    pub fn new(used: Vec<usize>, batches: usize) -> Self {
        let width = used.len();
        Self {
            used,
            batches: 0,
            gram: vec![0.0; batches * width * width],
            cross: vec![0.0; batches * width],
            units: vec![0; batches],
        }
    }

    /// Forgets all batches.
    pub fn clear(&mut self) {
        self.batches = 0;
    }

    /// Stored columns over which sums are kept, in increasing order.
    #[must_use]
    pub fn used(&self) -> &[usize] {
        &self.used
    }

    /// Number of batches summed so far.
    #[must_use]
    pub fn batches(&self) -> usize {
        self.batches
    }

    /// Position of a stored column among the used ones.
    #[must_use]
    pub fn position(&self, stored: usize) -> Option<usize> {
        self.used.iter().position(|&column| column == stored)
    }

    /// Adds the sums of the trial's next batch.
    pub fn push(&mut self, trial: &Trial, kernels: Kernels) {
        let batch = self.batches;
        let width = self.used.len();
        let rows = trial.batch_rows(batch);
        let design = trial.design(rows.clone());
        let gram = &mut self.gram[batch * width * width..(batch + 1) * width * width];
        kernels.gram(design, &self.used, gram);
        let cross = &mut self.cross[batch * width..(batch + 1) * width];
        kernels.cross(design, &self.used, &trial.outcomes()[rows.clone()], cross);
        self.units[batch] = rows.len();
        self.batches += 1;
    }

    /// Sums of one batch.
    #[must_use]
    pub fn batch(&self, batch: usize) -> SumsView<'_> {
        let width = self.used.len();
        SumsView {
            gram: &self.gram[batch * width * width..(batch + 1) * width * width],
            cross: &self.cross[batch * width..(batch + 1) * width],
            units: self.units[batch],
        }
    }
}
