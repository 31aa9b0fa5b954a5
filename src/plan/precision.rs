//! How many trials, how verdicts are reached, and what is required.

/// Size and seed of the simulation.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Precision {
    /// Trials per truth.
    pub trials: u64,
    /// Seed of every stream.
    pub seed: u64,
    /// Trials of the pilot replay, per truth.
    pub pilot_trials: u64,
}

/// How verdicts are reached.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Verdicts {
    /// A method is honest if its coverage is at least level minus this.
    pub tolerance: f64,
    /// Simultaneous confidence of all verdicts of the scenario.
    pub confidence: f64,
    /// Index of the method whose mean width is the unit of price.
    pub reference: usize,
}

/// A stated requirement; not met, the program exits with code 3.
#[derive(Debug, Clone, PartialEq)]
pub struct Requirement {
    /// Measure name as in `measures.csv`, or `honest`.
    pub measure: String,
    /// Method index, or every method when absent.
    pub method: Option<usize>,
    /// Estimand index, or every estimand when absent.
    pub estimand: Option<usize>,
    /// Truth index, or every truth when absent.
    pub truth: Option<usize>,
    /// The bound.
    pub bound: Bound,
}

/// Bound of a requirement.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Bound {
    /// Value at least this.
    AtLeast(f64),
    /// Value at most this.
    AtMost(f64),
    /// The verdict must be honest.
    Honest,
}
