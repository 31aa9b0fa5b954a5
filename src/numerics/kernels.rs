//! Dense kernels of the replay loop: Gram matrix, Cholesky factor, triangular solves.
//!
//! Matrices are column-major. The kernels are compiled for several instruction sets and chosen at
//! run time, but every sum has one fixed order (eight interleaved partial sums, added pairwise at
//! the end) and products are not fused with sums, so the bits do not depend on the instruction
//! set.

use pulp::{Arch, Simd, WithSimd};

/// Interleaved partial sums of a dot product. Eight doubles fill one 512-bit or two 256-bit
/// registers, enough independent chains to hide the latency of an addition.
const LANES: usize = 8;

/// A view of some rows of a column-major matrix.
#[derive(Debug, Clone, Copy)]
pub struct Columns<'a> {
    values: &'a [f64],
    leading: usize,
    first: usize,
    rows: usize,
}

impl<'a> Columns<'a> {
    /// Rows `first .. first + rows` of the matrix stored in `values` with leading dimension
    /// `leading`.
    ///
    /// # Panics
    /// If the rows do not fit into the leading dimension.
    #[must_use]
    pub fn new(values: &'a [f64], leading: usize, first: usize, rows: usize) -> Self {
        assert!(
            first + rows <= leading,
            "rows {first}..{} of {leading}",
            first + rows
        );
        Self {
            values,
            leading,
            first,
            rows,
        }
    }

    /// Number of rows.
    #[must_use]
    pub fn rows(&self) -> usize {
        self.rows
    }

    /// One column.
    #[must_use]
    pub fn column(&self, column: usize) -> &'a [f64] {
        let start = column * self.leading + self.first;
        &self.values[start..start + self.rows]
    }
}

/// Which compiled version of the kernels to use; the results are the same bit for bit.
#[derive(Debug, Clone, Copy)]
pub struct Kernels {
    arch: Option<Arch>,
}

impl Default for Kernels {
    fn default() -> Self {
        Self::detect()
    }
}

impl Kernels {
    /// The version for the widest instruction set that this processor has.
    #[must_use]
    pub fn detect() -> Self {
        Self {
            arch: Some(Arch::new()),
        }
    }

    /// The version for the baseline instruction set.
    #[must_use]
    pub fn portable() -> Self {
        Self { arch: None }
    }

    /// Runs `kernel` compiled for the chosen instruction set; [`dot`] and [`add_scaled`] inside it
    /// are compiled with it.
    #[inline(always)]
    pub(crate) fn run<T>(self, kernel: impl FnOnce() -> T) -> T {
        match self.arch {
            Some(arch) => arch.dispatch(kernel),
            None => kernel(),
        }
    }

    /// Gram matrix of the columns `used`: entry `(i, j)` of the `p × p` column-major `out` is the
    /// inner product of columns `used[i]` and `used[j]`. Both triangles are written.
    pub fn gram(self, x: Columns<'_>, used: &[usize], out: &mut [f64]) {
        let gram = Gram { x, used, out };
        match self.arch {
            Some(arch) => arch.dispatch(gram),
            None => gram.with_simd(pulp::Scalar::new()),
        }
    }

    /// Inner products of the columns `used` with `y`.
    pub fn cross(self, x: Columns<'_>, used: &[usize], y: &[f64], out: &mut [f64]) {
        self.run(
            #[inline(always)]
            || {
                for (value, &column) in out.iter_mut().zip(used) {
                    *value = dot(x.column(column), y);
                }
            },
        );
    }

    /// Inner product.
    #[must_use]
    pub fn dot(self, a: &[f64], b: &[f64]) -> f64 {
        self.run(
            #[inline(always)]
            || dot(a, b),
        )
    }

    /// `y += Σ_j coefficients[j] × column used[j]`.
    pub fn add_combination(
        self,
        x: Columns<'_>,
        used: &[usize],
        coefficients: &[f64],
        y: &mut [f64],
    ) {
        self.run(
            #[inline(always)]
            || add_combination(x, used, coefficients, y),
        );
    }

    /// `y += factor × x`.
    pub fn add_scaled(self, factor: f64, x: &[f64], y: &mut [f64]) {
        self.run(
            #[inline(always)]
            || add_scaled(factor, x, y),
        );
    }

    /// Replaces the lower triangle of the symmetric `p × p` matrix by its Cholesky factor and
    /// returns the smallest tolerance `L_jj² / S_jj` met. Columns whose tolerance is not above
    /// `threshold` are aliased: their diagonal becomes infinite, which makes their coefficient
    /// zero in every later solve.
    pub fn cholesky(self, matrix: &mut [f64], p: usize, threshold: f64) -> f64 {
        self.run(
            #[inline(always)]
            || cholesky(matrix, p, threshold),
        )
    }

    /// Solves `L v = b` in place.
    pub fn solve_lower(self, factor: &[f64], p: usize, b: &mut [f64]) {
        self.run(
            #[inline(always)]
            || {
                for j in 0..p {
                    let column = &factor[j * p..(j + 1) * p];
                    let value = b[j] / column[j];
                    b[j] = value;
                    if value != 0.0 {
                        add_scaled(-value, &column[j + 1..], &mut b[j + 1..p]);
                    }
                }
            },
        );
    }

    /// Solves `L' v = b` in place.
    pub fn solve_lower_transposed(self, factor: &[f64], p: usize, b: &mut [f64]) {
        self.run(
            #[inline(always)]
            || {
                for j in (0..p).rev() {
                    let column = &factor[j * p..(j + 1) * p];
                    let sum = dot(&column[j + 1..], &b[j + 1..p]);
                    b[j] = (b[j] - sum) / column[j];
                }
            },
        );
    }

    /// Squared lengths `x_i'(LL')^{-1}x_i` of the whitened rows: their leverages when `L` is the
    /// factor of their Gram matrix. `tile` is scratch space that grows as needed.
    pub fn leverages(
        self,
        x: Columns<'_>,
        used: &[usize],
        factor: &[f64],
        tile: &mut Vec<f64>,
        out: &mut [f64],
    ) {
        if tile.len() < used.len() * TILE {
            tile.resize(used.len() * TILE, 0.0);
        }
        let leverages = Leverages {
            x,
            used,
            factor,
            tile,
            out,
        };
        match self.arch {
            Some(arch) => arch.dispatch(leverages),
            None => leverages.with_simd(pulp::Scalar::new()),
        }
    }

    /// Diagonal of the inverse of the matrix whose Cholesky factor is given, one entry per
    /// coefficient. `tile` is scratch space that grows as needed.
    pub fn inverse_diagonal(self, factor: &[f64], tile: &mut Vec<f64>, out: &mut [f64]) {
        if tile.len() < out.len() * TILE {
            tile.resize(out.len() * TILE, 0.0);
        }
        let diagonal = InverseDiagonal { factor, tile, out };
        match self.arch {
            Some(arch) => arch.dispatch(diagonal),
            None => diagonal.with_simd(pulp::Scalar::new()),
        }
    }
}

#[inline(always)]
fn fold(sums: [f64; LANES]) -> f64 {
    ((sums[0] + sums[4]) + (sums[2] + sums[6])) + ((sums[1] + sums[5]) + (sums[3] + sums[7]))
}

/// Inner product with eight interleaved partial sums.
#[inline(always)]
pub(crate) fn dot(a: &[f64], b: &[f64]) -> f64 {
    let (a_chunks, a_rest) = a.as_chunks::<LANES>();
    let (b_chunks, b_rest) = b.as_chunks::<LANES>();
    let mut sums = [0.0; LANES];
    for (a, b) in a_chunks.iter().zip(b_chunks) {
        for lane in 0..LANES {
            sums[lane] += a[lane] * b[lane];
        }
    }
    let mut total = fold(sums);
    for (a, b) in a_rest.iter().zip(b_rest) {
        total += a * b;
    }
    total
}

/// Columns of a block of the Gram matrix: `TALL × WIDE` inner products, each in eight partial
/// sums, fill twelve 256-bit registers and leave room for the operands.
const TALL: usize = 3;
const WIDE: usize = 2;

/// Gram matrix block by block, one pass over memory for each block.
///
/// Written with explicit vectors: left to itself, the compiler shuffles where it should stream,
/// at a third of the speed.
struct Gram<'a, 'b> {
    x: Columns<'a>,
    used: &'b [usize],
    out: &'b mut [f64],
}

impl WithSimd for Gram<'_, '_> {
    type Output = ();

    #[inline(always)]
    fn with_simd<S: Simd>(self, simd: S) {
        let Self { x, used, out } = self;
        let p = used.len();
        // At the edge a block repeats the last column.
        let column = |index: usize| x.column(used[index.min(p - 1)]);
        for i in (0..p).step_by(TALL) {
            let a: [&[f64]; TALL] = std::array::from_fn(|offset| column(i + offset));
            for j in (i / WIDE * WIDE..p).step_by(WIDE) {
                let b: [&[f64]; WIDE] = std::array::from_fn(|offset| column(j + offset));
                let products = block_products(simd, a, b);
                for (di, row) in products.iter().enumerate().take(p - i) {
                    for (dj, &value) in row.iter().enumerate().take(p - j) {
                        out[(j + dj) * p + i + di] = value;
                        out[(i + di) * p + j + dj] = value;
                    }
                }
            }
        }
    }
}

/// Inner products of some columns with some others, each with eight interleaved partial sums
/// whatever the width of a vector.
#[inline(always)]
fn block_products<S: Simd>(simd: S, a: [&[f64]; TALL], b: [&[f64]; WIDE]) -> [[f64; WIDE]; TALL] {
    let rows = a[0].len();
    let chunks = rows / LANES;
    let a_chunks: [&[[f64; LANES]]; TALL] = a.map(|column| &column.as_chunks().0[..chunks]);
    let b_chunks: [&[[f64; LANES]]; WIDE] = b.map(|column| &column.as_chunks().0[..chunks]);
    let vectors = LANES / S::F64_LANES;
    let mut sums = [[[simd.splat_f64s(0.0); LANES]; WIDE]; TALL];
    for chunk in 0..chunks {
        #[allow(clippy::needless_range_loop)] // indexes the operands as well as the sums
        for vector in 0..vectors {
            let right = b_chunks.map(|column| S::as_simd_f64s(&column[chunk]).0[vector]);
            for i in 0..TALL {
                let left = S::as_simd_f64s(&a_chunks[i][chunk]).0[vector];
                for j in 0..WIDE {
                    let product = simd.mul_f64s(left, right[j]);
                    sums[i][j][vector] = simd.add_f64s(sums[i][j][vector], product);
                }
            }
        }
    }
    let mut out = [[0.0; WIDE]; TALL];
    for i in 0..TALL {
        for j in 0..WIDE {
            let mut lanes = [0.0; LANES];
            let (parts, _) = S::as_mut_simd_f64s(&mut lanes);
            parts[..vectors].copy_from_slice(&sums[i][j][..vectors]);
            out[i][j] = fold(lanes);
            for row in chunks * LANES..rows {
                out[i][j] += a[i][row] * b[j][row];
            }
        }
    }
    out
}

/// Rows whitened together: four 256-bit registers of eight rows each.
const TILE: usize = 32;

/// Whitens the columns `first ..` of a tile in place (forward substitution with the factor) and
/// returns the squared length of each row. The columns before `first` must be zero.
#[inline(always)]
fn whiten_tile<S: Simd>(
    simd: S,
    factor: &[f64],
    first: usize,
    tile: &mut [[f64; TILE]],
) -> [f64; TILE] {
    let p = tile.len();
    let vectors = TILE / S::F64_LANES;
    let mut squares = [0.0; TILE];
    for j in first..p {
        let (done, rest) = tile.split_at_mut(j);
        let mut sums = [simd.splat_f64s(0.0); TILE];
        let (own, _) = S::as_mut_simd_f64s(&mut rest[0]);
        sums[..vectors].copy_from_slice(&own[..vectors]);
        for (k, column) in done.iter().enumerate().skip(first) {
            let weight = simd.splat_f64s(factor[k * p + j]);
            let (column, _) = S::as_simd_f64s(column);
            for (sum, value) in sums.iter_mut().zip(column).take(vectors) {
                *sum = simd.sub_f64s(*sum, simd.mul_f64s(weight, *value));
            }
        }
        let scale = simd.splat_f64s(1.0 / factor[j * p + j]);
        let (square, _) = S::as_mut_simd_f64s(&mut squares);
        for vector in 0..vectors {
            own[vector] = simd.mul_f64s(sums[vector], scale);
            let product = simd.mul_f64s(own[vector], own[vector]);
            square[vector] = simd.add_f64s(square[vector], product);
        }
    }
    squares
}

/// Squared lengths of the whitened rows, tile by tile, so that a tile's columns stay in the
/// first-level cache.
struct Leverages<'a, 'b> {
    x: Columns<'a>,
    used: &'b [usize],
    factor: &'b [f64],
    tile: &'b mut [f64],
    out: &'b mut [f64],
}

impl WithSimd for Leverages<'_, '_> {
    type Output = ();

    #[inline(always)]
    fn with_simd<S: Simd>(self, simd: S) {
        let Self {
            x,
            used,
            factor,
            tile,
            out,
        } = self;
        let (tile, _) = tile[..used.len() * TILE].as_chunks_mut::<TILE>();
        for start in (0..x.rows()).step_by(TILE) {
            let count = TILE.min(x.rows() - start);
            for (target, &column) in tile.iter_mut().zip(used) {
                target[..count].copy_from_slice(&x.column(column)[start..start + count]);
            }
            let squares = whiten_tile(simd, factor, 0, tile);
            out[start..start + count].copy_from_slice(&squares[..count]);
        }
    }
}

/// Squared lengths of the columns of the inverse factor: whitened unit vectors, tile by tile.
struct InverseDiagonal<'b> {
    factor: &'b [f64],
    tile: &'b mut [f64],
    out: &'b mut [f64],
}

impl WithSimd for InverseDiagonal<'_> {
    type Output = ();

    #[inline(always)]
    fn with_simd<S: Simd>(self, simd: S) {
        let Self { factor, tile, out } = self;
        let p = out.len();
        let (tile, _) = tile[..p * TILE].as_chunks_mut::<TILE>();
        for start in (0..p).step_by(TILE) {
            let count = TILE.min(p - start);
            tile.as_flattened_mut().fill(0.0);
            for offset in 0..count {
                tile[start + offset][offset] = 1.0;
            }
            let squares = whiten_tile(simd, factor, start, tile);
            out[start..start + count].copy_from_slice(&squares[..count]);
        }
    }
}

/// `y += factor × x`.
#[inline(always)]
pub(crate) fn add_scaled(factor: f64, x: &[f64], y: &mut [f64]) {
    for (y, x) in y.iter_mut().zip(x) {
        *y += factor * x;
    }
}

#[inline(always)]
fn add_combination(x: Columns<'_>, used: &[usize], coefficients: &[f64], y: &mut [f64]) {
    // Four columns a pass: one load and one store of y for four products.
    let (used_quads, used_rest) = used.as_chunks::<4>();
    let (coefficient_quads, coefficient_rest) = coefficients.as_chunks::<4>();
    for (columns, factors) in used_quads.iter().zip(coefficient_quads) {
        let c0 = x.column(columns[0]);
        let c1 = x.column(columns[1]);
        let c2 = x.column(columns[2]);
        let c3 = x.column(columns[3]);
        for ((((y, c0), c1), c2), c3) in y.iter_mut().zip(c0).zip(c1).zip(c2).zip(c3) {
            *y += (factors[0] * c0 + factors[1] * c1) + (factors[2] * c2 + factors[3] * c3);
        }
    }
    for (&column, &factor) in used_rest.iter().zip(coefficient_rest) {
        add_scaled(factor, x.column(column), y);
    }
}

#[inline(always)]
fn cholesky(matrix: &mut [f64], p: usize, threshold: f64) -> f64 {
    let mut smallest: f64 = 1.0;
    for j in 0..p {
        let (done, rest) = matrix.split_at_mut(j * p);
        let column = &mut rest[..p];
        let original = column[j];
        let target = &mut column[j..];
        let mut k = 0;
        while k + 4 <= j {
            let l0 = &done[k * p + j..(k + 1) * p];
            let l1 = &done[(k + 1) * p + j..(k + 2) * p];
            let l2 = &done[(k + 2) * p + j..(k + 3) * p];
            let l3 = &done[(k + 3) * p + j..(k + 4) * p];
            let (f0, f1, f2, f3) = (l0[0], l1[0], l2[0], l3[0]);
            for ((((t, l0), l1), l2), l3) in target.iter_mut().zip(l0).zip(l1).zip(l2).zip(l3) {
                *t -= (f0 * l0 + f1 * l1) + (f2 * l2 + f3 * l3);
            }
            k += 4;
        }
        while k < j {
            let l = &done[k * p + j..(k + 1) * p];
            add_scaled(-l[0], l, target);
            k += 1;
        }
        let pivot = target[0];
        // A zero or negative pivot, or a zero column, gives tolerance 0 (NaN is caught by `max`).
        let tolerance = if original > 0.0 {
            (pivot / original).max(0.0)
        } else {
            0.0
        };
        smallest = smallest.min(tolerance);
        if tolerance > threshold {
            let scale = 1.0 / pivot.sqrt();
            for value in target.iter_mut() {
                *value *= scale;
            }
        } else {
            target.fill(0.0);
            target[0] = f64::INFINITY;
        }
    }
    smallest
}

#[cfg(test)]
mod tests {
    use super::*;
    use nalgebra::{DMatrix, DVector};
    use proptest::prelude::*;

    fn matrix(rows: usize, columns: usize, seed: u64) -> Vec<f64> {
        let mut state = seed.wrapping_mul(2).wrapping_add(1);
        (0..rows * columns)
            .map(|_| {
                state = state
                    .wrapping_mul(6_364_136_223_846_793_005)
                    .wrapping_add(1_442_695);
                f64::from(u32::try_from(state >> 33).unwrap()) / f64::from(1u32 << 30) - 1.0
            })
            .collect()
    }

    proptest! {
        #[test]
        fn kernels_agree_with_a_reference_library(
            rows in 1usize..70, p in 1usize..23, seed in 0u64..1000,
        ) {
            let rows = rows + p;
            let x = matrix(rows, p, seed);
            let y = matrix(rows, 1, seed + 1);
            let used: Vec<usize> = (0..p).collect();
            let view = Columns::new(&x, rows, 0, rows);
            let reference = DMatrix::from_column_slice(rows, p, &x);
            let target = DVector::from_column_slice(&y);
            let mut bits: Vec<Vec<u64>> = Vec::new();
            for kernels in [Kernels::detect(), Kernels::portable()] {
                let mut gram = vec![0.0; p * p];
                kernels.gram(view, &used, &mut gram);
                let expected = reference.transpose() * &reference;
                for (a, b) in gram.iter().zip(expected.iter()) {
                    prop_assert!((a - b).abs() <= 1e-12 * (1.0 + b.abs()));
                }
                let mut cross = vec![0.0; p];
                kernels.cross(view, &used, &y, &mut cross);
                let mut factor = gram.clone();
                let tolerance = kernels.cholesky(&mut factor, p, 1e-10);
                prop_assume!(tolerance > 1e-4);
                let mut solution = cross.clone();
                kernels.solve_lower(&factor, p, &mut solution);
                kernels.solve_lower_transposed(&factor, p, &mut solution);
                let expected = reference.clone().svd(true, true).solve(&target, 1e-14).unwrap();
                for (a, b) in solution.iter().zip(expected.iter()) {
                    prop_assert!((a - b).abs() <= 1e-8 * (1.0 + b.abs()), "{a} {b}");
                }
                let mut leverages = vec![0.0; rows];
                kernels.leverages(view, &used, &factor, &mut Vec::new(), &mut leverages);
                let trace: f64 = leverages.iter().sum();
                prop_assert!((trace - p as f64).abs() < 1e-8 * p as f64, "leverages sum to p");
                let mut diagonal = vec![0.0; p];
                kernels.inverse_diagonal(&factor, &mut Vec::new(), &mut diagonal);
                let inverse = (reference.transpose() * &reference).try_inverse().unwrap();
                for (found, expected) in diagonal.iter().zip(inverse.diagonal().iter()) {
                    prop_assert!((found / expected - 1.0).abs() < 1e-8);
                }
                let mut fitted = vec![0.0; rows];
                kernels.add_combination(view, &used, &solution, &mut fitted);
                let direct = &reference * DVector::from_column_slice(&solution);
                for (a, b) in fitted.iter().zip(direct.iter()) {
                    prop_assert!((a - b).abs() <= 1e-10 * (1.0 + b.abs()));
                }
                bits.push(
                    [gram, factor, solution, leverages, diagonal, fitted]
                        .concat().iter().map(|v| v.to_bits()).collect(),
                );
            }
            prop_assert_eq!(&bits[0], &bits[1], "bits must not depend on the instruction set");
        }
    }

    #[test]
    fn an_aliased_column_gets_coefficient_zero() {
        // Third column is the sum of the first two.
        let x = [1.0, 2.0, 3.0, 5.0, 1.0, 0.0, 4.0, 2.0, 2.0, 2.0, 7.0, 7.0];
        let view = Columns::new(&x, 4, 0, 4);
        let kernels = Kernels::detect();
        let mut gram = vec![0.0; 9];
        kernels.gram(view, &[0, 1, 2], &mut gram);
        let tolerance = kernels.cholesky(&mut gram, 3, 1e-12);
        assert!(tolerance < 1e-12);
        let mut b = vec![1.0, 2.0, 3.0];
        kernels.solve_lower(&gram, 3, &mut b);
        kernels.solve_lower_transposed(&gram, 3, &mut b);
        assert!(b[2].abs() < f64::MIN_POSITIVE);
        assert!(b[0].is_finite() && b[1].is_finite());
    }
}
