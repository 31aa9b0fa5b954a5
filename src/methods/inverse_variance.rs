//! Batch estimates weighted by their inverse variances.

use super::workbench::checked;
use super::{Answer, Estimate, Workbench};

/// Inverse-variance combination of batch estimates.
///
/// Formula: `Σ(θ̂_k/V_k)/Σ(1/V_k)`, `se = s/√Σ(1/V_k)` with the pooled within-batch variance,
/// t with `Σ(n_k-p)` degrees of freedom.
/// Needs: more units than coefficients in every batch.
/// Valid when: the information of later batches does not depend on earlier outcomes.
/// Fails when: it does; the weights are then not fixed in advance, and the estimate is slightly
/// biased.
/// Cost: `O(Kp²)` per estimand.
pub(super) fn estimate(bench: &mut Workbench, estimand: usize) -> Estimate {
    let (variance, degrees) = bench.within_batch_variance()?;
    bench.fill_batch_values(estimand);
    let mut total = 0.0;
    let mut sum = 0.0;
    for &(point, unit) in &bench.batch_values {
        total += 1.0 / unit;
        sum += point / unit;
    }
    let critical = bench.critical.student(degrees);
    checked(Answer::symmetric(
        sum / total,
        (variance / total).sqrt(),
        critical,
    ))
}
