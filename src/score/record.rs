//! What a block of trials hands to the tally.

use crate::methods::Estimate;

/// Shape and constants of the tally of one truth.
#[derive(Debug, Clone)]
pub struct Layout {
    /// Number of estimands.
    pub estimands: usize,
    /// Number of methods.
    pub methods: usize,
    /// Number of arms (0 without arms).
    pub arms: usize,
    /// Index of the method whose mean width is the unit of price.
    pub reference: usize,
    /// True value of each estimand under this truth.
    pub true_values: Vec<f64>,
    /// Null value of each estimand.
    pub nulls: Vec<f64>,
    /// Confidence level of the intervals.
    pub level: f64,
}

impl Layout {
    /// Number of cells: estimands × methods; cell `estimand * methods + method`.
    #[must_use]
    pub fn cells(&self) -> usize {
        self.estimands * self.methods
    }
}

/// Results of consecutive trials of one truth, trial-major.
#[derive(Debug, Clone, Default)]
pub struct BlockRecord {
    /// Number of trials in the block.
    pub trials: usize,
    /// `trials × cells`: the estimates of trial `t` are at `t * cells ..`.
    pub estimates: Vec<Estimate>,
    /// Units enrolled, one per trial.
    pub units: Vec<f64>,
    /// Units per arm, `trials × arms`.
    pub arm_units: Vec<f64>,
    /// Mean over the enrolled of the true expected outcome, one per trial.
    pub mean_outcomes: Vec<f64>,
}

impl BlockRecord {
    /// Forgets all trials but keeps the room.
    pub fn clear(&mut self) {
        self.trials = 0;
        self.estimates.clear();
        self.units.clear();
        self.arm_units.clear();
        self.mean_outcomes.clear();
    }
}
