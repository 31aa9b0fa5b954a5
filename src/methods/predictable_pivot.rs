//! Predictable weights of one total budget that end at the contrast.

use super::anticipation::multiply;
use super::workbench::checked;
use super::{Answer, Estimate, NoAnswer, Workbench};

/// An exact pivot from weights that never look at the outcomes they weigh.
///
/// Formula: weights `a_k = X_kb_k`, of total budget `Σ‖a_k‖² = 1`, with `X'a = sc` at the end.
/// With `G = Σ_{<k}X_j'a_j`, `used = Σ_{<k}‖a_j‖²` and `F_k` the information to come,
/// `M_c = (S_k+F_k)^{-1}c`, `M_g = (S_k+F_k)^{-1}G`, `s` is the larger root of
/// `c'M_c s² - 2c'M_g s + G'M_g = 1 - used`, `b_k = sM_c - M_g`. The last batch has `F_K = 0` and
/// closes the account. Point `a'y/s`, `se = s_w/s` with the within-batch sd `s_w`, t with
/// `Σ(n_k-p)` degrees of freedom. `F_k` is the information per unit of batch 1 (shrunk) times the
/// units to come, deflated by `(m-p-1)/m` for `m` units.
/// Needs: more units than coefficients in every batch.
/// Valid when: normal errors of one variance: **exact in finite samples, whatever the rule**, since
/// `b_k` and the final `s` are fixed before the last outcomes and each `‖a_k‖` before its own
/// (proved); insensitive to heavy tails and skewness (simulated only).
/// Fails when: the last batch is small or one-sided: it must carry the closing, and the width grows.
/// Cost: `O(Kp³)` per estimand, whatever the number of units.
/// Source: own derivation.
pub(super) fn estimate(bench: &mut Workbench, estimand: usize) -> Estimate {
    let (variance, degrees) = bench.within_batch_variance()?;
    let mut scratch = std::mem::take(&mut bench.anticipation);
    let closed = weigh(bench, &mut scratch, estimand);
    bench.anticipation = scratch;
    let (sum, scale) = closed?;
    let critical = bench.critical.student(degrees);
    checked(Answer::symmetric(
        sum / scale,
        variance.sqrt() / scale,
        critical,
    ))
}

/// The weighted sum `a'y` and the scale `s` of the contrast it estimates.
fn weigh(
    bench: &Workbench,
    scratch: &mut super::anticipation::AnticipationScratch,
    estimand: usize,
) -> Result<(f64, f64), NoAnswer> {
    /// Budget that is kept for the last batch.
    const LEAST_LEFT: f64 = 0.005;
    let kernels = bench.kernels;
    let p = bench.stored.len();
    let contrast = &bench.contrasts[estimand];
    scratch.prepare(bench.batch_gram(0), bench.batch_fits[0].units(), p);
    let mut to_come: usize = bench.batch_fits.iter().map(super::Fit::units).sum();
    let mut left = 1.0;
    let mut scale = 0.0;
    let mut sum = 0.0;
    let last = bench.batches() - 1;
    for batch in 0..=last {
        to_come -= bench.batch_fits[batch].units();
        let anticipated = if batch == last {
            0.0
        } else {
            (to_come as f64 - p as f64 - 1.0).max(0.0)
        };
        scratch.factor(bench.batch_gram(batch), anticipated, p, kernels);
        scratch.first.copy_from_slice(contrast);
        scratch.second.copy_from_slice(&scratch.state);
        for vector in [&mut scratch.first, &mut scratch.second] {
            kernels.solve_lower(&scratch.factor, p, vector);
            kernels.solve_lower_transposed(&scratch.factor, p, vector);
        }
        let a = kernels.dot(contrast, &scratch.first);
        let b = kernels.dot(contrast, &scratch.second);
        let c = kernels.dot(&scratch.state, &scratch.second);
        let discriminant = b * b - a * (c - left);
        let root = (b + discriminant.max(0.0).sqrt()) / a;
        if discriminant >= 0.0 && root > 0.0 {
            scale = root;
        } else if batch == last {
            return Err(NoAnswer::BudgetNotClosed);
        } else if b > 0.0 {
            scale = c / b;
        }
        // b_k = s M_c - M_g, kept in `first`.
        for (value, reached) in scratch.first.iter_mut().zip(&scratch.second) {
            *value = scale * *value - reached;
        }
        multiply(
            bench.batch_gram(batch),
            &scratch.first,
            &mut scratch.image,
            kernels,
        );
        let mut cost = kernels.dot(&scratch.first, &scratch.image);
        if batch != last && left - cost < LEAST_LEFT {
            let shrink = ((left - LEAST_LEFT).max(0.0) / cost).sqrt();
            for value in scratch.first.iter_mut().chain(&mut scratch.image) {
                *value *= shrink;
            }
            cost *= shrink * shrink;
        }
        left -= cost;
        kernels.add_scaled(1.0, &scratch.image, &mut scratch.state);
        sum += kernels.dot(&scratch.first, bench.batch_cross(batch));
    }
    Ok((sum, scale))
}
