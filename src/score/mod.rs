//! Tallies, measures with Monte Carlo errors, verdicts.

mod measure;
mod record;
mod tally;

pub use measure::{CellMeasures, Measure, MeasureValue, OperatingValue, TruthMeasures};
pub use record::{BlockRecord, Layout};
pub use tally::{CellDistribution, Tally};
