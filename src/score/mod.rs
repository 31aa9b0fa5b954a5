//! Tallies, measures with Monte Carlo errors, verdicts.

mod measure;
mod record;

pub use measure::{CellMeasures, Measure, MeasureValue, OperatingValue, TruthMeasures};
pub use record::{BlockRecord, Layout};
