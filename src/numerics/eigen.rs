//! Eigenvalues outside the replay loop.

use nalgebra::DMatrix;

/// Smallest eigenvalue of a symmetric `p × p` matrix (column-major); zero for an empty one.
#[must_use]
pub fn smallest_eigenvalue(matrix: &[f64], p: usize) -> f64 {
    if p == 0 {
        return 0.0;
    }
    DMatrix::from_column_slice(p, p, matrix)
        .symmetric_eigenvalues()
        .min()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn two_by_two_matches_the_quadratic_formula() {
        // Eigenvalues of [[2, 1], [1, 3]] are (5 ± √5)/2.
        let found = smallest_eigenvalue(&[2.0, 1.0, 1.0, 3.0], 2);
        assert!((found - (5.0 - 5.0f64.sqrt()) / 2.0).abs() < 1e-14);
    }
}
