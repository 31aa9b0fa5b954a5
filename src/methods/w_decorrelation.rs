//! Online debiasing by W-decorrelation.

use super::workbench::checked;
use super::{Answer, Estimate, NoAnswer, Workbench};
use crate::numerics::kernels::{add_scaled, dot};

/// Least squares plus a correction whose weights are predictable.
///
/// Formula: `c'β̂ + a'(y - Xβ̂)` with, row by row in time order and starting from `r = c`,
/// `a_i = r'x_i/(λ+‖x_i‖²)`, `r ← r - a_i x_i`; this is row `c` of the matrix W, at `O(np)`.
/// `se = s‖a‖`, normal critical value.
/// Needs: unit rows in order, full column rank, λ fixed in advance.
/// Valid when: the remainder `r'(β̂-β)` is small against `se` (stable directions, p/n small).
/// Fails when: p/n is large or λ too large: the remainder then dominates, and the interval misses.
/// Cost: `O(np)` per estimand. Price: intervals are often twice as wide as those of least squares.
/// Source: Deshpande, Mackey, Syrgkanis & Taddy (2018).
pub(super) fn estimate(bench: &mut Workbench, estimand: usize, penalty: f64) -> Estimate {
    bench.pooled.answered()?;
    let degrees = bench.pooled.degrees();
    if degrees == 0 {
        return Err(NoAnswer::NoResidualDegrees);
    }
    let kernels = bench.kernels;
    let p = bench.stored.len();
    let contrast = &bench.contrasts[estimand];
    let remainder = &mut bench.scratch.vector;
    remainder.clear();
    remainder.extend_from_slice(contrast);
    let (rows, squares, residuals) = (&bench.rows, &bench.row_squares, &bench.residuals);
    let (correction, weight_squares) = kernels.run(
        #[inline(always)]
        || {
            let mut correction = 0.0;
            let mut weight_squares = 0.0;
            for ((row, square), residual) in rows.chunks_exact(p).zip(squares).zip(residuals) {
                let weight = dot(remainder, row) / (penalty + square);
                add_scaled(-weight, row, remainder);
                correction += weight * residual;
                weight_squares += weight * weight;
            }
            (correction, weight_squares)
        },
    );
    let point = bench.pooled.point(contrast, kernels) + correction;
    let variance = bench.pooled.residual_squares() / degrees as f64;
    let critical = bench.critical.normal();
    checked(Answer::symmetric(
        point,
        (variance * weight_squares).sqrt(),
        critical,
    ))
}
