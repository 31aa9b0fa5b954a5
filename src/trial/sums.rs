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

/// Sums of the first batches of a trial, and of nothing later.
#[derive(Debug, Clone, Copy)]
pub struct SumsPrefix<'a> {
    used: &'a [usize],
    gram: &'a [f64],
    cross: &'a [f64],
    units: &'a [usize],
}

impl BatchSums {
    /// Sums of the first `batches` batches.
    #[must_use]
    pub fn prefix(&self, batches: usize) -> SumsPrefix<'_> {
        let width = self.used.len();
        SumsPrefix {
            used: &self.used,
            gram: &self.gram[..batches * width * width],
            cross: &self.cross[..batches * width],
            units: &self.units[..batches],
        }
    }
}

impl SumsPrefix<'_> {
    /// Number of units.
    #[must_use]
    pub fn units(&self) -> usize {
        self.units.iter().sum()
    }

    /// Adds up the sums of all batches over the used columns at `positions`: `gram` gets the
    /// `p × p` Gram matrix (column-major, both triangles), `cross` the `p` cross-products.
    pub fn total(&self, positions: &[usize], gram: &mut [f64], cross: &mut [f64]) {
        let width = self.used.len();
        let p = positions.len();
        gram.fill(0.0);
        cross.fill(0.0);
        for batch in 0..self.units.len() {
            let batch_gram = &self.gram[batch * width * width..(batch + 1) * width * width];
            let batch_cross = &self.cross[batch * width..(batch + 1) * width];
            for (j, &column) in positions.iter().enumerate() {
                let source = &batch_gram[column * width..(column + 1) * width];
                let target = &mut gram[j * p..(j + 1) * p];
                if p == width {
                    for (value, add) in target.iter_mut().zip(source) {
                        *value += add;
                    }
                } else {
                    for (value, &row) in target.iter_mut().zip(positions) {
                        *value += source[row];
                    }
                }
                cross[j] += batch_cross[column];
            }
        }
    }
}

impl BatchSums {
    /// Sums of one batch, as a prefix of one.
    #[must_use]
    pub fn batch_only(&self, batch: usize) -> SumsPrefix<'_> {
        let width = self.used.len();
        SumsPrefix {
            used: &self.used,
            gram: &self.gram[batch * width * width..(batch + 1) * width * width],
            cross: &self.cross[batch * width..(batch + 1) * width],
            units: &self.units[batch..=batch],
        }
    }
}
