//! Candidates screened for one part of a batch.

use crate::numerics::kernels::Columns;

/// Candidate covariates, column-major, in a buffer that is reused; and the roster rows that are
/// still to be had.
#[derive(Debug, Clone)]
pub struct Pool {
    columns: usize,
    count: usize,
    values: Vec<f64>,
    /// Independent latent normals, kept where the correlation factor needs all of them.
    pub(super) latents: Vec<f64>,
    /// Weights of a score on the latent normals.
    pub(super) weights: Vec<f64>,
    /// Candidate number, or roster row, of each candidate.
    sources: Vec<usize>,
    /// Roster rows not yet enrolled in this trial.
    pub(super) remaining: Vec<usize>,
    /// Candidates enrolled from the current pool, by position; used to compact `remaining`.
    enrolled: Vec<bool>,
}

impl Pool {
    /// An empty pool for candidates with `columns` covariate columns.
    #[must_use]
    pub fn new(columns: usize) -> Self {
        Self {
            columns,
            count: 0,
            values: Vec::new(),
            latents: Vec::new(),
            weights: Vec::new(),
            sources: Vec::new(),
            remaining: Vec::new(),
            enrolled: Vec::new(),
        }
    }

    /// Starts a new trial from a roster of `rows` units (0 for a law).
    pub fn reset(&mut self, rows: usize) {
        self.remaining.clear();
        self.remaining.extend(0..rows);
    }

    /// Makes room for `count` candidates numbered from zero.
    pub(super) fn prepare(&mut self, count: usize) {
        self.count = count;
        if self.values.len() < count * self.columns {
            self.values.resize(count * self.columns, 0.0);
        }
        self.sources.clear();
        self.sources.extend(0..count);
        self.enrolled.clear();
        self.enrolled.resize(count, false);
    }

    /// Number of candidates.
    #[must_use]
    pub fn count(&self) -> usize {
        self.count
    }

    /// Covariates of the candidates, `count × columns`.
    #[must_use]
    pub fn covariates(&self) -> Columns<'_> {
        Columns::new(&self.values, self.count.max(1), 0, self.count)
    }

    pub(super) fn column_mut(&mut self, column: usize) -> &mut [f64] {
        &mut self.values[column * self.count..(column + 1) * self.count]
    }

    pub(super) fn sources_mut(&mut self) -> &mut [usize] {
        &mut self.sources
    }

    /// Candidate number, or roster row, of a candidate.
    #[must_use]
    pub fn source(&self, candidate: usize) -> usize {
        self.sources[candidate]
    }

    /// Marks a candidate as enrolled.
    pub fn enrol(&mut self, candidate: usize) {
        self.enrolled[candidate] = true;
    }

    /// Removes the enrolled candidates from the roster rows still to be had.
    pub fn finish(&mut self) {
        if self.remaining.is_empty() {
            return;
        }
        let enrolled = &self.enrolled;
        let mut position = 0;
        self.remaining.retain(|_| {
            let keep = !enrolled.get(position).copied().unwrap_or(false);
            position += 1;
            keep
        });
    }
}
