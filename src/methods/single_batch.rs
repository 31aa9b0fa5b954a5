//! Least squares on one batch alone.

use super::workbench::checked;
use super::{Answer, Estimate, NoAnswer, Workbench};

/// Least squares on the first or the last batch with a t interval.
///
/// Formula: `c'β̂_k ± t(n_k-p) s_k √V_k`, `V_k = c'(X_k'X_k)^{-1}c`.
/// Needs: more units than coefficients in the batch, of full column rank.
/// Valid when: normal errors (exact), whatever the rule: given the past, a batch is an ordinary
/// regression.
/// Fails when: the model is wrong and the batch was selected on covariates.
/// Cost: `O(p²)` per estimand. Price: all other batches are thrown away.
pub(super) fn estimate(bench: &mut Workbench, estimand: usize, batch: usize) -> Estimate {
    let fit = &bench.batch_fits[batch];
    fit.answered()?;
    let degrees = fit.degrees();
    if degrees == 0 {
        return Err(NoAnswer::NoResidualDegrees);
    }
    let contrast = &bench.contrasts[estimand];
    let point = fit.point(contrast, bench.kernels);
    let unit = fit.contrast_variance(contrast, &mut bench.scratch, bench.kernels);
    let standard_error = (fit.residual_squares() / degrees as f64 * unit).sqrt();
    let critical = bench.critical.student(degrees);
    checked(Answer::symmetric(point, standard_error, critical))
}
