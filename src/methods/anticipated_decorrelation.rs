//! Decorrelation that anticipates the information of later batches.

use super::anticipation::multiply;
use super::workbench::checked;
use super::{Answer, Estimate, Workbench};

/// Least squares plus predictable weights that leave it a small, planned remainder.
///
/// Formula: `F_k` the information expected after batch k, `J` per unit (from batch 1, shrunk)
/// times the units to come plus `P = nJ/φ`, `φ = 16`. From `r = c`, batch by batch,
/// `b_k = (S_k+F_k)^{-1}r`, `a_k = X_kb_k`, `r ← r - S_kb_k`. Point `r'β̂ + Σb_k'X_k'y_k`, which is
/// `c'β̂ + a'(y-Xβ̂)`; `se = s‖a + XS^{-1}r‖` with the within-batch variance, t with `Σ(n_k-p)`
/// degrees of freedom.
/// Needs: more units than coefficients in every batch.
/// Valid when: shown by simulation only (no proof): coverage near the level with two batches.
/// Fails when: many small batches are allocated by what looks better; it then undercovers by a few
/// points.
/// Cost: `O(Kp³)` per estimand, whatever the number of units.
/// Source: own derivation; the remainder-aware standard error is exact for a fixed design.
pub(super) fn estimate(bench: &mut Workbench, estimand: usize) -> Estimate {
    /// Share of the total information that least squares keeps.
    const REMAINDER_SHARE: f64 = 1.0 / 16.0;
    bench.pooled.answered()?;
    let (variance, degrees) = bench.within_batch_variance()?;
    let kernels = bench.kernels;
    let p = bench.stored.len();
    let mut scratch = std::mem::take(&mut bench.anticipation);
    scratch.prepare(bench.batch_gram(0), bench.batch_fits[0].units(), p);
    scratch.state.copy_from_slice(&bench.contrasts[estimand]);
    let units: usize = bench.batch_fits.iter().map(super::Fit::units).sum();
    let mut seen = 0;
    let mut point = 0.0;
    let mut squares = 0.0;
    for batch in 0..bench.batches() {
        seen += bench.batch_fits[batch].units();
        let to_come = (units - seen) as f64 + REMAINDER_SHARE * units as f64;
        scratch.factor(bench.batch_gram(batch), to_come, p, kernels);
        scratch.first.copy_from_slice(&scratch.state);
        kernels.solve_lower(&scratch.factor, p, &mut scratch.first);
        kernels.solve_lower_transposed(&scratch.factor, p, &mut scratch.first);
        multiply(
            bench.batch_gram(batch),
            &scratch.first,
            &mut scratch.image,
            kernels,
        );
        squares += kernels.dot(&scratch.first, &scratch.image);
        kernels.add_scaled(-1.0, &scratch.image, &mut scratch.state);
        point += kernels.dot(&scratch.first, bench.batch_cross(batch));
    }
    point += kernels.dot(&scratch.state, bench.pooled.coefficients());
    let squares = bench.with_remainder(estimand, squares, &scratch.state);
    bench.anticipation = scratch;
    let critical = bench.critical.student(degrees);
    checked(Answer::symmetric(
        point,
        (variance * squares).sqrt(),
        critical,
    ))
}
