//! Methods: one estimator a file. They read a finished [`crate::trial::Trial`] and answer, or say
//! why they cannot.

mod answer;
mod anticipated_decorrelation;
mod anticipation;
mod batch_combined;
mod critical;
mod fit;
mod inverse_variance;
mod least_squares;
mod predictable_pivot;
mod ridge;
mod self_normalised;
mod single_batch;
mod tuned;
mod w_decorrelation;
mod workbench;

pub use answer::{Answer, Estimate, NoAnswer};
pub use critical::CriticalValues;
pub use fit::Fit;
pub use tuned::{Needs, TunedMethod};
pub use workbench::Workbench;

use crate::plan::DebiasingSteps;
use crate::trial::Trial;
use ridge::RidgeScratch;

/// The estimate of one method for one estimand, from a prepared workbench.
///
/// # Errors
/// The reason why the method has no answer.
pub fn estimate(
    method: &TunedMethod,
    bench: &mut Workbench,
    trial: &Trial,
    estimand: usize,
) -> Estimate {
    match method {
        TunedMethod::LeastSquares { variance } => {
            least_squares::estimate(bench, trial, estimand, *variance)
        }
        TunedMethod::Ridge { penalty } => ridge::estimate(bench, estimand, *penalty),
        TunedMethod::FirstBatch => single_batch::estimate(bench, estimand, 0),
        TunedMethod::LastBatch => {
            let last = bench.batches() - 1;
            single_batch::estimate(bench, estimand, last)
        }
        TunedMethod::BatchCombined { weights } => {
            batch_combined::estimate(bench, estimand, &weights[estimand])
        }
        TunedMethod::InverseVariance => inverse_variance::estimate(bench, estimand),
        TunedMethod::WDecorrelation {
            penalty,
            steps,
            error,
        } => match steps {
            DebiasingSteps::Units => w_decorrelation::by_units(bench, estimand, *penalty, *error),
            DebiasingSteps::Batches => {
                w_decorrelation::by_batches(bench, estimand, *penalty, *error)
            }
        },
        TunedMethod::AnticipatedDecorrelation => {
            anticipated_decorrelation::estimate(bench, estimand)
        }
        TunedMethod::PredictablePivot => predictable_pivot::estimate(bench, estimand),
        TunedMethod::SelfNormalised { penalty, bound } => {
            self_normalised::estimate(bench, estimand, *penalty, *bound)
        }
    }
}
