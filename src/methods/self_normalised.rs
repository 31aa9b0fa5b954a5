//! Any-time valid ellipsoid projected on a contrast.

use super::anticipation::multiply;
use super::workbench::checked;
use super::{Answer, Estimate, NoAnswer, Workbench};

/// Self-normalised confidence ellipsoid, projected on one contrast.
///
/// Formula: `V = S + λI`, point `c'V^{-1}X'y`, half width
/// `‖c‖_{V^{-1}} [s √(log det V - p log λ + 2 log(1/α)) + √λ B]`, `B` a bound on `‖β‖` and `s` the
/// residual sd of least squares in place of a known sub-Gaussian scale. The standard error shown
/// is that of the linear form.
/// Needs: a bound on the coefficients, stated before the data.
/// Valid when: sub-Gaussian errors whose scale is known, any rule, any stopping (proved then).
/// Fails when: never by much; its price is its width, several times that of least squares.
/// Cost: `O(p³)` per estimand.
/// Source: Abbasi-Yadkori, Pál & Szepesvári (2011).
pub(super) fn estimate(
    bench: &mut Workbench,
    estimand: usize,
    penalty: f64,
    bound: f64,
) -> Estimate {
    bench.pooled.answered()?;
    let degrees = bench.pooled.degrees();
    if degrees == 0 {
        return Err(NoAnswer::NoResidualDegrees);
    }
    let kernels = bench.kernels;
    let p = bench.stored.len();
    let scratch = &mut bench.anticipation;
    scratch.factor.clear();
    scratch.factor.extend_from_slice(&bench.gram);
    for j in 0..p {
        scratch.factor[j * p + j] += penalty;
    }
    kernels.cholesky(&mut scratch.factor, p, 0.0);
    let log_determinant: f64 = (0..p)
        .map(|j| 2.0 * libm::log(scratch.factor[j * p + j]))
        .sum();
    let contrast = &bench.contrasts[estimand];
    scratch.first.clear();
    scratch.first.extend_from_slice(contrast);
    kernels.solve_lower(&scratch.factor, p, &mut scratch.first);
    let length = kernels.dot(&scratch.first, &scratch.first).sqrt();
    kernels.solve_lower_transposed(&scratch.factor, p, &mut scratch.first);
    let point = kernels.dot(&scratch.first, &bench.cross);
    scratch.image.clear();
    scratch.image.resize(p, 0.0);
    multiply(&bench.gram, &scratch.first, &mut scratch.image, kernels);
    let spread = kernels.dot(&scratch.first, &scratch.image).sqrt();
    let sd = (bench.pooled.residual_squares() / degrees as f64).sqrt();
    let miss = bench.critical.miss();
    let radius = log_determinant - p as f64 * libm::log(penalty) - 2.0 * libm::log(miss);
    let half_width = length * (sd * radius.max(0.0).sqrt() + penalty.sqrt() * bound);
    checked(Answer {
        point,
        standard_error: sd * spread,
        lower: point - half_width,
        upper: point + half_width,
    })
}
