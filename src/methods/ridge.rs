//! Ridge regression with the usual interval.

use super::workbench::checked;
use super::{Answer, Estimate, NoAnswer, Workbench};

/// Buffers of the ridge.
#[derive(Debug, Clone, Default)]
pub(super) struct RidgeScratch {
    factor: Vec<f64>,
    coefficients: Vec<f64>,
    direction: Vec<f64>,
    image: Vec<f64>,
    diagonal: Vec<f64>,
    tile: Vec<f64>,
}

/// Ridge regression, interval as if it were unbiased.
///
/// Formula: `β̃ = (S+Λ)^{-1}X'y` with `Λ = λI` except for the intercept; `se` is the sd of the
/// linear form, `s²c'(S+Λ)^{-1}S(S+Λ)^{-1}c`, with `s² = ‖y-Xβ̃‖²/(n-tr H)` and t with
/// `n - tr H` degrees of freedom, `tr H = tr (S+Λ)^{-1}S`.
/// Needs: more units than effective coefficients.
/// Valid when: the bias `-c'(S+Λ)^{-1}Λβ` is small against `se`.
/// Fails when: it is not; the interval knows nothing of the bias. Shown to be compared, not to be
/// used.
/// Cost: `O(p³)` per estimand.
/// Source: Hoerl & Kennard (1970).
pub(super) fn estimate(bench: &mut Workbench, estimand: usize, penalty: f64) -> Estimate {
    let kernels = bench.kernels;
    let p = bench.stored.len();
    let units = bench.pooled.units();
    if units == 0 {
        return Err(NoAnswer::EmptyBatch);
    }
    let scratch = &mut bench.ridge;
    scratch.factor.clear();
    scratch.factor.extend_from_slice(&bench.gram);
    for index in (0..p).filter(|&index| Some(index) != bench.intercept) {
        scratch.factor[index * p + index] += penalty;
    }
    if kernels.cholesky(&mut scratch.factor, p, 0.0) <= f64::EPSILON {
        return Err(NoAnswer::RankDeficient);
    }
    let coefficients = &mut scratch.coefficients;
    coefficients.clear();
    coefficients.extend_from_slice(&bench.cross);
    kernels.solve_lower(&scratch.factor, p, coefficients);
    kernels.solve_lower_transposed(&scratch.factor, p, coefficients);
    // tr H = p - λ Σ_j [(S+Λ)^{-1}]_jj over the penalised coefficients.
    scratch.diagonal.clear();
    scratch.diagonal.resize(p, 0.0);
    kernels.inverse_diagonal(&scratch.factor, &mut scratch.tile, &mut scratch.diagonal);
    if let Some(intercept) = bench.intercept {
        scratch.diagonal[intercept] = 0.0;
    }
    let trace: f64 = scratch.diagonal.iter().sum();
    let degrees = units as f64 - (p as f64 - penalty * trace);
    if degrees <= 0.0 {
        return Err(NoAnswer::NoResidualDegrees);
    }
    let contrast = &bench.contrasts[estimand];
    let point = kernels.dot(contrast, coefficients);
    // ‖y - Xβ̃‖² = y'y - 2β̃'X'y + β̃'Sβ̃.
    scratch.image.clear();
    scratch.image.resize(p, 0.0);
    multiply(&bench.gram, p, coefficients, &mut scratch.image);
    let residual_squares = bench.sum_of_outcome_squares
        - 2.0 * kernels.dot(coefficients, &bench.cross)
        + kernels.dot(coefficients, &scratch.image);
    scratch.direction.clear();
    scratch.direction.extend_from_slice(contrast);
    kernels.solve_lower(&scratch.factor, p, &mut scratch.direction);
    kernels.solve_lower_transposed(&scratch.factor, p, &mut scratch.direction);
    scratch.image.fill(0.0);
    multiply(&bench.gram, p, &scratch.direction, &mut scratch.image);
    let unit = kernels.dot(&scratch.direction, &scratch.image);
    let standard_error = (residual_squares / degrees * unit).sqrt();
    let critical = bench.critical.student_fractional(degrees);
    checked(Answer::symmetric(point, standard_error, critical))
}

/// `out += S v` for a column-major symmetric matrix.
fn multiply(matrix: &[f64], p: usize, vector: &[f64], out: &mut [f64]) {
    for (column, factor) in matrix.chunks_exact(p).zip(vector) {
        for (value, entry) in out.iter_mut().zip(column) {
            *value += factor * entry;
        }
    }
}
