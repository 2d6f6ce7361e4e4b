//! The few sums everything rests on, in one fixed order, so that native and wasm give the same bits.
//!
//! No fused multiply-add, no platform library: `libm` for exponentials and logarithms.

use ndarray::{Array1, Array2, ArrayView1, ArrayView2};

const LANES: usize = 16;

/// Inner product in f32 over 16 running sums, which compilers turn into SIMD without reordering. Cost O(d).
pub fn dot(a: &[f32], b: &[f32]) -> f32 {
    debug_assert_eq!(a.len(), b.len());
    let mut sums = [0.0_f32; LANES];
    let (a_chunks, a_rest) = a.as_chunks::<LANES>();
    let (b_chunks, b_rest) = b.as_chunks::<LANES>();
    for (x, y) in a_chunks.iter().zip(b_chunks) {
        for lane in 0..LANES {
            sums[lane] += x[lane] * y[lane];
        }
    }
    for (lane, (x, y)) in a_rest.iter().zip(b_rest).enumerate() {
        sums[lane] += x * y;
    }
    // Halving keeps the rounding error small and the order fixed.
    let mut width = LANES / 2;
    while width > 0 {
        for lane in 0..width {
            sums[lane] += sums[lane + width];
        }
        width /= 2;
    }
    sums[0]
}

/// A row of a matrix in standard layout.
pub fn row<'a, T>(matrix: &'a ArrayView2<'a, T>, index: usize) -> &'a [T] {
    let columns = matrix.ncols();
    &matrix.as_slice().expect("matrices here are in standard layout")[index * columns..(index + 1) * columns]
}

/// All inner products between the rows of `a` and the rows of `b`. Cost O(rows · rows · d).
pub fn products(a: ArrayView2<f32>, b: ArrayView2<f32>) -> Array2<f32> {
    Array2::from_shape_fn((a.nrows(), b.nrows()), |(i, j)| dot(row(&a, i), row(&b, j)))
}

/// The inner products of the rows with each other, in f64 storage. Cost O(n² d / 2).
pub fn gram(rows: ArrayView2<f32>) -> Array2<f64> {
    let n = rows.nrows();
    let mut gram = Array2::zeros((n, n));
    for i in 0..n {
        for j in 0..=i {
            let product = f64::from(dot(row(&rows, i), row(&rows, j)));
            gram[[i, j]] = product;
            gram[[j, i]] = product;
        }
    }
    gram
}

/// The matrix product A · B in f64. Cost O(rows · inner · columns).
///
/// `ndarray`'s own goes through kernels that fuse multiply and add where the processor can.
pub fn times(a: &Array2<f64>, b: &Array2<f64>) -> Array2<f64> {
    let columns = b.ncols();
    let mut product = Array2::zeros((a.nrows(), columns));
    let b = b.as_standard_layout();
    let (Some(b), Some(sums)) = (b.as_slice(), product.as_slice_mut()) else { return product };
    if columns == 0 {
        return product;
    }
    for (a_row, sums) in a.outer_iter().zip(sums.chunks_exact_mut(columns)) {
        for (&factor, b_row) in a_row.iter().zip(b.chunks_exact(columns)) {
            if factor != 0.0 {
                sums.iter_mut().zip(b_row).for_each(|(sum, &x)| *sum += factor * x);
            }
        }
    }
    product
}

/// log Σ exp(x), without overflow.
pub fn log_sum_exp(logits: ArrayView1<f64>) -> f64 {
    let top = logits.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    if top == f64::NEG_INFINITY {
        return top;
    }
    top + libm::log(logits.iter().map(|&x| libm::exp(x - top)).sum::<f64>())
}

/// Probabilities from logits.
pub fn softmax(logits: ArrayView1<f64>) -> Array1<f64> {
    let norm = log_sum_exp(logits);
    logits.mapv(|x| libm::exp(x - norm))
}

/// The index of the largest value; the first of several. `None` only for an empty slice.
pub fn arg_max<'a>(values: impl IntoIterator<Item = &'a f64>) -> Option<usize> {
    let mut best: Option<(usize, f64)> = None;
    for (index, &value) in values.into_iter().enumerate() {
        if best.is_none_or(|(_, top)| value > top) {
            best = Some((index, value));
        }
    }
    best.map(|(index, _)| index)
}

/// Cholesky factor (lower triangle) of a symmetric positive definite matrix, or `None` if it is not. Cost O(n³/3).
pub struct Cholesky(Array2<f64>);

impl Cholesky {
    /// Factors the matrix; only its lower triangle is read.
    pub fn new(mut a: Array2<f64>) -> Option<Self> {
        let n = a.nrows();
        let cells = a.as_slice_mut()?;
        for j in 0..n {
            for i in j..n {
                let (head, tail) = cells.split_at(i * n);
                let row_i = &tail[..j];
                let row_j = if i == j { row_i } else { &head[j * n..j * n + j] };
                let sum = dot64(row_i, row_j);
                let value = cells[i * n + j] - sum;
                if i == j {
                    if !(value > 0.0 && value.is_finite()) {
                        return None;
                    }
                    cells[j * n + j] = value.sqrt();
                } else {
                    cells[i * n + j] = value / cells[j * n + j];
                }
            }
        }
        Some(Self(a))
    }

    /// B A⁻¹ Bᵀ, symmetric, for B with as many columns as A has. Cost O(rows n² / 2 + rows² n / 2).
    pub fn congruent(&self, b: &Array2<f64>) -> Array2<f64> {
        let n = self.0.nrows();
        let rows = b.nrows();
        // Every row x of B becomes L⁻¹ x.
        let mut half = b.as_standard_layout().into_owned();
        for mut row in half.outer_iter_mut() {
            let row = row.as_slice_mut().expect("standard layout");
            for i in 0..n {
                let factors = self.0.row(i);
                let factors = factors.as_slice().expect("standard layout");
                row[i] = (row[i] - dot64(&row[..i], &factors[..i])) / factors[i];
            }
        }
        let half = half.view();
        let mut product = Array2::zeros((rows, rows));
        for i in 0..rows {
            for j in 0..=i {
                let value = dot64(self::row(&half, i), self::row(&half, j));
                product[[i, j]] = value;
                product[[j, i]] = value;
            }
        }
        product
    }

    /// Solves A x = b for every column of `b`. Cost O(n²) a column.
    pub fn solve(&self, b: &Array2<f64>) -> Array2<f64> {
        let n = self.0.nrows();
        let mut x = b.clone();
        for i in 0..n {
            for k in 0..i {
                let factor = self.0[[i, k]];
                let (upper, mut lower) = x.view_mut().split_at(ndarray::Axis(0), i);
                lower.row_mut(0).scaled_add(-factor, &upper.row(k));
            }
            let pivot = self.0[[i, i]];
            x.row_mut(i).mapv_inplace(|v| v / pivot);
        }
        for i in (0..n).rev() {
            for k in i + 1..n {
                let factor = self.0[[k, i]];
                let (mut upper, lower) = x.view_mut().split_at(ndarray::Axis(0), k);
                upper.row_mut(i).scaled_add(-factor, &lower.row(0));
            }
            let pivot = self.0[[i, i]];
            x.row_mut(i).mapv_inplace(|v| v / pivot);
        }
        x
    }
}

/// Inner product in f64 over four running sums.
pub fn dot64(a: &[f64], b: &[f64]) -> f64 {
    let mut sums = [0.0_f64; 4];
    let (a_chunks, a_rest) = a.as_chunks::<4>();
    let (b_chunks, b_rest) = b.as_chunks::<4>();
    for (x, y) in a_chunks.iter().zip(b_chunks) {
        for lane in 0..4 {
            sums[lane] += x[lane] * y[lane];
        }
    }
    for (lane, (x, y)) in a_rest.iter().zip(b_rest).enumerate() {
        sums[lane] += x * y;
    }
    (sums[0] + sums[2]) + (sums[1] + sums[3])
}
