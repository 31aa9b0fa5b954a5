//! Batchwise-studentised least squares.

use super::workbench::checked;
use super::{Answer, Estimate, Workbench};

/// Batch estimates studentised one by one and combined with weights fixed in advance.
///
/// Formula: `θ̂_k`, `V_k` least-squares estimate and unit variance of batch k, `q_k` weights with
/// `Σq_k = 1`, `s²` the pooled within-batch variance with `Σ(n_k-p)` degrees of freedom. Then
/// `Σ√q_k (θ̂_k-θ)/(s√V_k)` follows Student's t exactly; with `κ_k = √(q_k/V_k)` the point is
/// `Σκ_kθ̂_k/Σκ_k` and its standard error `s/Σκ_k`.
/// Needs: more units than coefficients in every batch.
/// Valid when: normal errors of one variance (exact, any rule); otherwise for large batches.
/// Fails when: a batch cannot identify the contrast. It is never dropped, since which batches
/// drop would depend on earlier outcomes.
/// Cost: `O(Kp²)` per estimand.
/// Source: Zhang, Janson & Murphy (2020); the exact t form follows from the independence of the
/// pooled within-batch variance.
pub(super) fn estimate(bench: &mut Workbench, estimand: usize, weights: &[f64]) -> Estimate {
    let (variance, degrees) = bench.within_batch_variance()?;
    bench.fill_batch_values(estimand);
    let mut total = 0.0;
    let mut sum = 0.0;
    for (&(point, unit), &weight) in bench.batch_values.iter().zip(weights) {
        let kappa = (weight / unit).sqrt();
        total += kappa;
        sum += kappa * point;
    }
    let critical = bench.critical.student(degrees);
    checked(Answer::symmetric(
        sum / total,
        variance.sqrt() / total,
        critical,
    ))
}
