//! What is counted and summed for one estimand and method.

use crate::methods::NoAnswer;

use super::moments::{CentralMoments, PairMoments};
use super::sketch::bin_key;

/// Trials counted by what happened in them.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub(crate) struct Counts {
    /// Trials with an answer.
    pub answered: u64,
    /// Trials without, by reason in the order of [`NoAnswer::ALL`].
    pub failures: [u64; NoAnswer::ALL.len()],
    /// Interval holds the true value.
    pub hits: u64,
    /// Interval below the true value.
    pub misses_below: u64,
    /// Interval above the true value.
    pub misses_above: u64,
    /// Interval above the null value.
    pub rejected_above: u64,
    /// Interval below the null value.
    pub rejected_below: u64,
}

impl Counts {
    pub(crate) fn merge(&mut self, part: &Self) {
        self.answered += part.answered;
        for (own, added) in self.failures.iter_mut().zip(part.failures) {
            *own += added;
        }
        self.hits += part.hits;
        self.misses_below += part.misses_below;
        self.misses_above += part.misses_above;
        self.rejected_above += part.rejected_above;
        self.rejected_below += part.rejected_below;
    }

    pub(crate) fn fail(&mut self, reason: NoAnswer) {
        if let Some(index) = NoAnswer::ALL.iter().position(|&known| known == reason) {
            self.failures[index] += 1;
        }
    }
}

/// Moments of one cell.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub(crate) struct CellMoments {
    /// Error.
    pub error: CentralMoments<4>,
    /// Squared standard error.
    pub squared_standard_error: CentralMoments<2>,
    /// Interval width.
    pub width: CentralMoments<2>,
    /// Width and reference width in the trials answered by both.
    pub paired_width: PairMoments,
    /// Studentised error.
    pub studentised: CentralMoments<8>,
}

impl CellMoments {
    pub(crate) fn merge(&mut self, part: &Self) {
        self.error.merge(&part.error);
        self.squared_standard_error
            .merge(&part.squared_standard_error);
        self.width.merge(&part.width);
        self.paired_width.merge(&part.paired_width);
        self.studentised.merge(&part.studentised);
    }
}

/// Sketch bins of the values of one block, with their exact range.
#[derive(Debug, Clone)]
pub(crate) struct BinKeys {
    pub keys: Vec<u32>,
    pub least: f64,
    pub greatest: f64,
}

impl Default for BinKeys {
    fn default() -> Self {
        Self {
            keys: Vec::new(),
            least: f64::INFINITY,
            greatest: f64::NEG_INFINITY,
        }
    }
}

impl BinKeys {
    pub(crate) fn refill(&mut self, values: &[f64]) {
        self.keys.clear();
        self.keys.extend(values.iter().map(|&value| bin_key(value)));
        self.least = values.iter().copied().fold(f64::INFINITY, f64::min);
        self.greatest = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    }
}
