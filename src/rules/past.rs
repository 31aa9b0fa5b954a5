//! What a rule may see.

use crate::numerics::kernels::Columns;
use crate::trial::{BatchSums, SumsPrefix, Trial};

/// The batches whose outcomes are due, and nothing else.
#[derive(Debug, Clone, Copy)]
pub struct Past<'a> {
    design: Columns<'a>,
    outcomes: &'a [f64],
    arms: &'a [usize],
    sums: SumsPrefix<'a>,
}

impl<'a> Past<'a> {
    /// The first `batches` batches of a trial.
    #[must_use]
    pub fn new(trial: &'a Trial, sums: &'a BatchSums, batches: usize) -> Self {
        let rows = trial.rows_before(batches);
        Self {
            design: trial.design(0..rows),
            outcomes: &trial.outcomes()[..rows],
            arms: &trial.arms()[..rows],
            sums: sums.prefix(batches),
        }
    }

    /// Number of units.
    #[must_use]
    pub fn units(&self) -> usize {
        self.outcomes.len()
    }

    /// Stored design columns.
    #[must_use]
    pub fn design(&self) -> Columns<'a> {
        self.design
    }

    /// Outcomes in time order.
    #[must_use]
    pub fn outcomes(&self) -> &'a [f64] {
        self.outcomes
    }

    /// Arms in time order.
    #[must_use]
    pub fn arms(&self) -> &'a [usize] {
        self.arms
    }

    /// Batch sums.
    #[must_use]
    pub fn sums(&self) -> SumsPrefix<'a> {
        self.sums
    }
}
