//! Online debiasing by W-decorrelation.

use super::anticipation::multiply;
use super::workbench::checked;
use super::{Answer, Estimate, NoAnswer, Workbench};
use crate::numerics::kernels::{add_scaled, dot};
use crate::plan::DebiasingError;

/// Least squares plus a correction whose weights are predictable.
///
/// Formula: `c'β̂ + a'(y - Xβ̂)` with, row by row in time order and starting from `r = c`,
/// `a_i = r'x_i/(λ+‖x_i‖²)`, `r ← r - a_i x_i`; this is row `c` of the matrix W, at `O(np)`.
/// `se = s‖a‖` as published, or `s‖a + XS^{-1}r‖`, which counts the remainder `r'(β̂-β)` too and is
/// exact for a fixed design; normal critical value.
/// Needs: unit rows in order, full column rank, λ fixed in advance.
/// Valid when: the remainder `r'(β̂-β)` is small against `se` (stable directions, p/n small).
/// Fails when: p/n is large or λ too large: the remainder then dominates, and the interval misses.
/// Cost: `O(np)` per estimand. Price: intervals are often twice as wide as those of least squares.
/// Source: Deshpande, Mackey, Syrgkanis & Taddy (2018); remainder-aware error: own derivation.
pub(super) fn by_units(
    bench: &mut Workbench,
    estimand: usize,
    penalty: f64,
    error: DebiasingError,
) -> Estimate {
    bench.pooled.answered()?;
    let kernels = bench.kernels;
    let p = bench.stored.len();
    let contrast = &bench.contrasts[estimand];
    let mut remainder = std::mem::take(&mut bench.anticipation.state);
    remainder.clear();
    remainder.extend_from_slice(contrast);
    let (rows, squares, residuals) = (&bench.rows, &bench.row_squares, &bench.residuals);
    let (correction, weight_squares) = kernels.run(
        #[inline(always)]
        || {
            let mut correction = 0.0;
            let mut weight_squares = 0.0;
            for ((row, square), residual) in rows.chunks_exact(p).zip(squares).zip(residuals) {
                let weight = dot(&remainder, row) / (penalty + square);
                add_scaled(-weight, row, &mut remainder);
                correction += weight * residual;
                weight_squares += weight * weight;
            }
            (correction, weight_squares)
        },
    );
    let point = bench.pooled.point(contrast, kernels) + correction;
    let answer = finish(bench, estimand, point, weight_squares, &remainder, error);
    bench.anticipation.state = remainder;
    answer
}

/// The same with the weights of a whole batch at once, from the batch's sums:
/// `a_k = X_k(S_k+λI)^{-1}r`, `r ← λ(S_k+λI)^{-1}r`.
///
/// Needs: batch sums only. Cost: `O(Kp³)` per estimand, whatever the number of units.
/// Valid when, fails when: as row by row, with a somewhat smaller price.
pub(super) fn by_batches(
    bench: &mut Workbench,
    estimand: usize,
    penalty: f64,
    error: DebiasingError,
) -> Estimate {
    bench.pooled.answered()?;
    let kernels = bench.kernels;
    let p = bench.stored.len();
    let mut scratch = std::mem::take(&mut bench.anticipation);
    scratch.state.clear();
    scratch.state.extend_from_slice(&bench.contrasts[estimand]);
    scratch.image.clear();
    scratch.image.resize(p, 0.0);
    let mut weighted = 0.0;
    let mut weight_squares = 0.0;
    for batch in 0..bench.batches() {
        let gram = bench.batch_gram(batch);
        scratch.factor.clear();
        scratch.factor.extend_from_slice(gram);
        for j in 0..p {
            scratch.factor[j * p + j] += penalty;
        }
        kernels.cholesky(&mut scratch.factor, p, 0.0);
        kernels.solve_lower(&scratch.factor, p, &mut scratch.state);
        kernels.solve_lower_transposed(&scratch.factor, p, &mut scratch.state);
        multiply(gram, &scratch.state, &mut scratch.image, kernels);
        weight_squares += kernels.dot(&scratch.state, &scratch.image);
        weighted += kernels.dot(&scratch.state, bench.batch_cross(batch));
        for value in &mut scratch.state {
            *value *= penalty;
        }
    }
    // c'β̂ + a'(y - Xβ̂) = a'y + r'β̂, since X'a = c - r.
    let point = weighted + kernels.dot(&scratch.state, bench.pooled.coefficients());
    let answer = finish(
        bench,
        estimand,
        point,
        weight_squares,
        &scratch.state,
        error,
    );
    bench.anticipation = scratch;
    answer
}

/// The interval from the point, the squared length of the weights and the remainder.
fn finish(
    bench: &mut Workbench,
    estimand: usize,
    point: f64,
    weight_squares: f64,
    remainder: &[f64],
    error: DebiasingError,
) -> Estimate {
    let degrees = bench.pooled.degrees();
    if degrees == 0 {
        return Err(NoAnswer::NoResidualDegrees);
    }
    let squares = match error {
        DebiasingError::Weights => weight_squares,
        DebiasingError::RemainderAware => bench.with_remainder(estimand, weight_squares, remainder),
    };
    let variance = bench.pooled.residual_squares() / degrees as f64;
    let critical = bench.critical.normal();
    checked(Answer::symmetric(
        point,
        (variance * squares).sqrt(),
        critical,
    ))
}
