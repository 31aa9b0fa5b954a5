//! Columns of one trial.

use crate::numerics::kernels::Columns;

/// One trial: unit rows in time order, stored by column, in buffers that are reused.
#[derive(Debug, Clone)]
pub struct Trial {
    capacity: usize,
    arm_count: usize,
    /// Stored design columns, `capacity × width`, column-major.
    design: Vec<f64>,
    /// Observed outcome of each unit.
    outcomes: Vec<f64>,
    /// True expected outcome of each unit.
    expected: Vec<f64>,
    /// Arm of each unit (0 without arms).
    arms: Vec<usize>,
    /// Probability with which each unit was enrolled given its batch's candidates; 1 for a unit
    /// that no rule could have passed over, NaN where the rule is deterministic in the score.
    selection_probabilities: Vec<f64>,
    /// Allocation probability of every arm for each unit, `unit * arms + arm`.
    allocation_probabilities: Vec<f64>,
    /// Roster row or candidate number of each unit, for listings.
    sources: Vec<usize>,
    /// End row of each finished batch.
    ends: Vec<usize>,
    rows: usize,
}

impl Trial {
    /// An empty trial with room for `capacity` units, `width` stored columns and `arm_count` arms.
    #[must_use]
    pub fn new(capacity: usize, width: usize, arm_count: usize, batches: usize) -> Self {
        Self {
            capacity,
            arm_count,
            design: vec![0.0; capacity * width],
            outcomes: vec![0.0; capacity],
            expected: vec![0.0; capacity],
            arms: vec![0; capacity],
            selection_probabilities: vec![1.0; capacity],
            allocation_probabilities: vec![0.0; capacity * arm_count],
            sources: vec![0; capacity],
            ends: Vec::with_capacity(batches),
            rows: 0,
        }
    }

    /// Forgets all units.
    pub fn clear(&mut self) {
        self.ends.clear();
        self.rows = 0;
    }

    /// Units enrolled so far.
    #[must_use]
    pub fn rows(&self) -> usize {
        self.rows
    }

    /// Room for units; the leading dimension of the design columns.
    #[must_use]
    pub fn capacity(&self) -> usize {
        self.capacity
    }

    /// Number of arms (0 without arms).
    #[must_use]
    pub fn arm_count(&self) -> usize {
        self.arm_count
    }

    /// Number of finished batches.
    #[must_use]
    pub fn batches(&self) -> usize {
        self.ends.len()
    }

    /// Rows of a finished batch.
    #[must_use]
    pub fn batch_rows(&self, batch: usize) -> std::ops::Range<usize> {
        let start = if batch == 0 { 0 } else { self.ends[batch - 1] };
        start..self.ends[batch]
    }

    /// Rows of the first `batches` batches.
    #[must_use]
    pub fn rows_before(&self, batches: usize) -> usize {
        if batches == 0 {
            0
        } else {
            self.ends[batches - 1]
        }
    }

    /// Stored design columns of some rows.
    #[must_use]
    pub fn design(&self, rows: std::ops::Range<usize>) -> Columns<'_> {
        Columns::new(&self.design, self.capacity, rows.start, rows.len())
    }

    /// The whole stored design, column-major with leading dimension [`Self::capacity`].
    #[must_use]
    pub fn design_values(&self) -> &[f64] {
        &self.design
    }

    /// One stored column of a row range, to be filled.
    pub fn column_mut(&mut self, column: usize, rows: std::ops::Range<usize>) -> &mut [f64] {
        let start = column * self.capacity;
        &mut self.design[start + rows.start..start + rows.end]
    }

    /// One stored value.
    #[must_use]
    pub fn value(&self, row: usize, column: usize) -> f64 {
        self.design[column * self.capacity + row]
    }

    /// Outcomes of all units.
    #[must_use]
    pub fn outcomes(&self) -> &[f64] {
        &self.outcomes[..self.rows]
    }

    /// Outcomes of some rows, to be filled.
    pub fn outcomes_mut(&mut self, rows: std::ops::Range<usize>) -> &mut [f64] {
        &mut self.outcomes[rows]
    }

    /// True expected outcomes of all units.
    #[must_use]
    pub fn expected(&self) -> &[f64] {
        &self.expected[..self.rows]
    }

    /// True expected outcomes of some rows, to be filled.
    pub fn expected_mut(&mut self, rows: std::ops::Range<usize>) -> &mut [f64] {
        &mut self.expected[rows]
    }

    /// Arms of all units.
    #[must_use]
    pub fn arms(&self) -> &[usize] {
        &self.arms[..self.rows]
    }

    /// Arms of some rows, to be filled.
    pub fn arms_mut(&mut self, rows: std::ops::Range<usize>) -> &mut [usize] {
        &mut self.arms[rows]
    }

    /// Selection probabilities of all units.
    #[must_use]
    pub fn selection_probabilities(&self) -> &[f64] {
        &self.selection_probabilities[..self.rows]
    }

    /// Allocation probabilities of one unit, one per arm.
    #[must_use]
    pub fn allocation_probabilities(&self, row: usize) -> &[f64] {
        &self.allocation_probabilities[row * self.arm_count..(row + 1) * self.arm_count]
    }

    /// Allocation probabilities of some rows, to be filled, `row * arms + arm`.
    pub fn allocation_probabilities_mut(&mut self, rows: std::ops::Range<usize>) -> &mut [f64] {
        &mut self.allocation_probabilities[rows.start * self.arm_count..rows.end * self.arm_count]
    }

    /// Roster row or candidate number of all units.
    #[must_use]
    pub fn sources(&self) -> &[usize] {
        &self.sources[..self.rows]
    }

    /// Appends one unit with its source and selection probability; its design columns are to be
    /// filled by the caller. Returns its row.
    ///
    /// # Panics
    /// If the trial is full.
    pub fn push_unit(&mut self, source: usize, selection_probability: f64) -> usize {
        let row = self.rows;
        assert!(row < self.capacity, "trial is full at {row} units");
        self.sources[row] = source;
        self.selection_probabilities[row] = selection_probability;
        self.rows += 1;
        row
    }

    /// Ends the current batch.
    pub fn finish_batch(&mut self) {
        self.ends.push(self.rows);
    }
}
