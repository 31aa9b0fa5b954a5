//! Tallies, measures with Monte Carlo errors, verdicts.

mod cell;
mod coverage_test;
mod distribution;
mod formulas;
mod measure;
mod moments;
mod operating;
mod record;
mod requirement;
mod scored;
mod sketch;
mod summary;
mod tally;
mod verdict;

#[cfg(test)]
mod calibration_tests;
#[cfg(test)]
mod tally_tests;

pub use distribution::{CellDistribution, Histogram};
pub use measure::{CellMeasures, Measure, MeasureValue, OperatingValue, TruthMeasures};
pub use moments::{CentralMoments, PairMoments};
pub use record::{BlockRecord, Layout};
pub use requirement::{Labels, Offender, RequirementOutcome, evaluate};
pub use sketch::Sketch;
pub use summary::BlockSummary;
pub use tally::Tally;
pub use verdict::{
    CheapestHonest, EstimandVerdict, MethodVerdict, TruthVerdict, Verdict, verdicts,
};
