//! Temporary.
/// smallest eigenvalue
#[must_use]
pub fn smallest_eigenvalue(m: &[f64], p: usize) -> f64 {
    nalgebra::DMatrix::from_column_slice(p, p, m)
        .symmetric_eigenvalues()
        .min()
}
