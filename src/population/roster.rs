//! Candidates from a file of real units.

use super::Pool;
use crate::plan::Roster;
use crate::streams::{Purpose, Streams, uniform_index};

/// Draws roster units without replacement.
#[derive(Debug, Clone)]
pub struct RosterSampler {
    rows: usize,
    columns: usize,
    /// rows × columns, column-major.
    values: Vec<f64>,
}

impl RosterSampler {
    /// Prepares a roster for drawing.
    #[must_use]
    pub fn new(roster: &Roster) -> Self {
        let rows = roster.len();
        let columns = roster.values.len().checked_div(rows).unwrap_or(0);
        Self {
            rows,
            columns,
            values: roster.values.clone(),
        }
    }

    /// Number of units in the roster.
    #[must_use]
    pub fn rows(&self) -> usize {
        self.rows
    }

    /// Draws `count` of the remaining units (all of them, if fewer remain) in random order.
    pub(super) fn draw(
        &self,
        streams: &Streams,
        batch: usize,
        part: usize,
        count: usize,
        pool: &mut Pool,
    ) {
        let count = count.min(pool.remaining.len());
        let mut stream = streams.open(Purpose::Candidates, batch, part, 0);
        for position in 0..count {
            let left = pool.remaining.len() - position;
            let other = position + uniform_index(&mut stream, left);
            pool.remaining.swap(position, other);
        }
        pool.prepare(count);
        for position in 0..count {
            let row = pool.remaining[position];
            pool.sources_mut()[position] = row;
        }
        for column in 0..self.columns {
            let source = &self.values[column * self.rows..(column + 1) * self.rows];
            for position in 0..count {
                let row = pool.source(position);
                pool.column_mut(column)[position] = source[row];
            }
        }
    }
}
