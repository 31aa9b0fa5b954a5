//! Least squares by Householder QR with column scaling and pivoting.
//!
//! For final estimates on ill-conditioned designs: the normal equations square the condition
//! number, the orthogonal factor does not.

/// The design has not full column rank.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
#[error("the design has rank {rank}, fewer than its {columns} columns")]
pub struct RankDeficient {
    /// Numerical rank found.
    pub rank: usize,
    /// Number of columns.
    pub columns: usize,
}

/// A least-squares fit through the orthogonal factor `XDP = QR`, `D` scaling every column to unit
/// length and `P` the pivoting (Businger & Golub 1965).
#[derive(Debug, Clone, Default)]
pub struct LeastSquares {
    rows: usize,
    columns: usize,
    /// Householder vectors below the diagonal, `rows × columns`, column-major.
    factor: Vec<f64>,
    /// Diagonal of R.
    diagonal: Vec<f64>,
    scales: Vec<f64>,
    /// Position in the design of each column of the factor.
    pivots: Vec<usize>,
    coefficients: Vec<f64>,
    residual_squares: f64,
}

impl LeastSquares {
    /// An empty fit.
    #[must_use]
    pub fn new() -> Self {
        Self::default()
    }

    /// Fits `rows` rows of the columns `columns` of a column-major design with leading dimension
    /// `leading`, with one step of iterative refinement.
    ///
    /// # Errors
    /// When a pivot is below `max(rows, columns) × ε` of the largest (columns scaled to unit
    /// length), or there are fewer rows than columns.
    ///
    /// # Panics
    /// If the design or the outcomes are shorter than the rows.
    pub fn fit(
        &mut self,
        design: &[f64],
        leading: usize,
        rows: usize,
        columns: &[usize],
        outcomes: &[f64],
    ) -> Result<(), RankDeficient> {
        let p = columns.len();
        self.rows = rows;
        self.columns = p;
        self.factor.clear();
        self.scales.clear();
        for &column in columns {
            let source = &design[column * leading..column * leading + rows];
            let norm = length(source);
            let scale = if norm > 0.0 { 1.0 / norm } else { 0.0 };
            self.scales.push(scale);
            self.factor.extend(source.iter().map(|value| value * scale));
        }
        self.pivots.clear();
        self.pivots.extend(0..p);
        self.diagonal.clear();
        if rows < p {
            return Err(RankDeficient {
                rank: rows,
                columns: p,
            });
        }
        let tolerance = rows.max(p) as f64 * f64::EPSILON;
        for step in 0..p {
            self.pivot(step);
            let (_, column) = self.column_mut(step);
            let norm = length(column);
            let largest = self
                .diagonal
                .first()
                .map_or(norm, |first: &f64| first.abs());
            if norm <= tolerance * largest || norm == 0.0 {
                return Err(RankDeficient {
                    rank: step,
                    columns: p,
                });
            }
            self.reflect(step, norm);
        }
        let mut right = outcomes[..rows].to_vec();
        self.coefficients = self.solve(&mut right);
        // One refinement step: the residual is formed from the original columns.
        let mut residuals = outcomes[..rows].to_vec();
        self.subtract_fitted(design, leading, columns, &mut residuals);
        let correction = self.solve(&mut residuals.clone());
        for (coefficient, step) in self.coefficients.iter_mut().zip(correction) {
            *coefficient += step;
        }
        let mut residuals = outcomes[..rows].to_vec();
        self.subtract_fitted(design, leading, columns, &mut residuals);
        self.residual_squares = residuals.iter().map(|value| value * value).sum();
        Ok(())
    }

    fn subtract_fitted(
        &self,
        design: &[f64],
        leading: usize,
        columns: &[usize],
        residuals: &mut [f64],
    ) {
        for (&column, coefficient) in columns.iter().zip(&self.coefficients) {
            let source = &design[column * leading..column * leading + self.rows];
            for (residual, value) in residuals.iter_mut().zip(source) {
                *residual -= coefficient * value;
            }
        }
    }

    /// The part of a factor column from its diagonal down, and the columns after it.
    fn column_mut(&mut self, step: usize) -> (&mut [f64], &mut [f64]) {
        let (head, later) = self.factor.split_at_mut((step + 1) * self.rows);
        let column = &mut head[step * self.rows + step..];
        (later, column)
    }

    /// Brings the longest remaining column to the front.
    fn pivot(&mut self, step: usize) {
        let mut best = (step, -1.0);
        for column in step..self.columns {
            let start = column * self.rows;
            let norm = length(&self.factor[start + step..start + self.rows]);
            if norm > best.1 {
                best = (column, norm);
            }
        }
        if best.0 != step {
            for row in 0..self.rows {
                self.factor
                    .swap(step * self.rows + row, best.0 * self.rows + row);
            }
            self.pivots.swap(step, best.0);
        }
    }

    /// Applies the Householder reflection that clears a column below its diagonal.
    fn reflect(&mut self, step: usize, norm: f64) {
        let rows = self.rows;
        let (later, column) = self.column_mut(step);
        let alpha = -norm.copysign(column[0]);
        column[0] -= alpha;
        let scale = column.iter().map(|value| value * value).sum::<f64>();
        for other in later.chunks_exact_mut(rows) {
            let tail = &mut other[step..];
            let product: f64 = column.iter().zip(&*tail).map(|(v, x)| v * x).sum();
            let factor = 2.0 * product / scale;
            for (x, v) in tail.iter_mut().zip(&*column) {
                *x -= factor * v;
            }
        }
        self.diagonal.push(alpha);
    }

    /// `Q'v` in place.
    fn rotate(&self, vector: &mut [f64]) {
        for step in 0..self.columns {
            let column = &self.factor[step * self.rows + step..(step + 1) * self.rows];
            apply_reflection(column, &mut vector[step..]);
        }
    }

    /// `Qv` in place.
    fn rotate_back(&self, vector: &mut [f64]) {
        for step in (0..self.columns).rev() {
            let column = &self.factor[step * self.rows + step..(step + 1) * self.rows];
            apply_reflection(column, &mut vector[step..]);
        }
    }

    /// Entry of R above the diagonal.
    fn upper(&self, row: usize, column: usize) -> f64 {
        self.factor[column * self.rows + row]
    }

    /// Least-squares solution for a right-hand side, which is overwritten.
    fn solve(&self, right: &mut [f64]) -> Vec<f64> {
        self.rotate(right);
        let mut solution = vec![0.0; self.columns];
        for row in (0..self.columns).rev() {
            let mut sum = right[row];
            for (column, value) in right.iter().enumerate().take(self.columns).skip(row + 1) {
                sum -= self.upper(row, column) * value;
            }
            right[row] = sum / self.diagonal[row];
            let original = self.pivots[row];
            solution[original] = right[row] * self.scales[original];
        }
        solution
    }

    /// `R^{-T}P'Dc`, the contrast in the orthonormal basis: linear in `c`, and its squared length is
    /// `c'(X'X)^{-1}c`.
    #[must_use]
    pub fn rotated_contrast(&self, contrast: &[f64]) -> Vec<f64> {
        let mut out = Vec::with_capacity(self.columns);
        for row in 0..self.columns {
            let original = self.pivots[row];
            let mut sum = contrast[original] * self.scales[original];
            for (earlier, value) in out.iter().enumerate() {
                sum -= self.upper(earlier, row) * value;
            }
            out.push(sum / self.diagonal[row]);
        }
        out
    }

    /// Coefficients, in design order.
    #[must_use]
    pub fn coefficients(&self) -> &[f64] {
        &self.coefficients
    }

    /// Residual sum of squares.
    #[must_use]
    pub fn residual_sum_of_squares(&self) -> f64 {
        self.residual_squares
    }

    /// `c'(X'X)^{-1}c`.
    #[must_use]
    pub fn contrast_variance(&self, contrast: &[f64]) -> f64 {
        self.rotated_contrast(contrast)
            .iter()
            .map(|value| value * value)
            .sum()
    }

    /// `a = X(X'X)^{-1}c`, so that `c'β̂ = a'y`; `out` has one entry per row.
    pub fn contrast_weights(&self, contrast: &[f64], out: &mut [f64]) {
        out.fill(0.0);
        out[..self.columns].copy_from_slice(&self.rotated_contrast(contrast));
        self.rotate_back(out);
    }

    /// Leverages: squared lengths of the rows of the orthonormal basis.
    pub fn leverages(&self, out: &mut [f64]) {
        out.fill(0.0);
        let mut basis = vec![0.0; self.rows];
        for column in 0..self.columns {
            basis.fill(0.0);
            basis[column] = 1.0;
            self.rotate_back(&mut basis);
            for (leverage, value) in out.iter_mut().zip(&basis) {
                *leverage += value * value;
            }
        }
    }
}

fn apply_reflection(vector: &[f64], target: &mut [f64]) {
    let scale: f64 = vector.iter().map(|value| value * value).sum();
    let product: f64 = vector.iter().zip(&*target).map(|(v, x)| v * x).sum();
    let factor = 2.0 * product / scale;
    for (x, v) in target.iter_mut().zip(vector) {
        *x -= factor * v;
    }
}

/// Euclidean length, scaled against overflow.
fn length(values: &[f64]) -> f64 {
    let largest = values.iter().fold(0.0f64, |a, b| a.max(b.abs()));
    if largest == 0.0 {
        return 0.0;
    }
    largest
        * values
            .iter()
            .map(|v| (v / largest) * (v / largest))
            .sum::<f64>()
            .sqrt()
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn weights_variances_and_leverages_are_consistent(
            values in prop::collection::vec(-2.0f64..2.0, 60),
            outcomes in prop::collection::vec(-2.0f64..2.0, 15),
        ) {
            let mut fit = LeastSquares::new();
            let columns = [0, 2, 3];
            prop_assume!(fit.fit(&values, 15, 15, &columns, &outcomes).is_ok());
            let contrast = [1.0, -2.0, 0.5];
            let mut weights = [0.0; 15];
            fit.contrast_weights(&contrast, &mut weights);
            let point: f64 = contrast.iter().zip(fit.coefficients()).map(|(c, b)| c * b).sum();
            let linear: f64 = weights.iter().zip(&outcomes).map(|(a, y)| a * y).sum();
            prop_assert!((point - linear).abs() < 1e-9 * (1.0 + point.abs()));
            let squares: f64 = weights.iter().map(|a| a * a).sum();
            let variance = fit.contrast_variance(&contrast);
            prop_assert!((squares - variance).abs() < 1e-9 * (1.0 + variance));
            let mut leverages = [0.0; 15];
            fit.leverages(&mut leverages);
            prop_assert!((leverages.iter().sum::<f64>() - 3.0).abs() < 1e-9);
        }
    }

    #[test]
    fn a_column_that_repeats_another_is_found() {
        let design = [1.0, 1.0, 1.0, 2.0, 2.0, 2.0];
        let found = LeastSquares::new().fit(&design, 3, 3, &[0, 1], &[1.0, 2.0, 3.0]);
        assert_eq!(
            found,
            Err(RankDeficient {
                rank: 1,
                columns: 2
            })
        );
    }
}
