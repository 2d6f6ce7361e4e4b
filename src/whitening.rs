//! Whitening: how past categories scattered, taken out of the space.
//!
//! z = u − Uᵀ diag(δ) U u, with the rows of U the leading directions of the pooled covariance within past categories and
//! δ_i = 1 − sqrt(s̄²/(s_i + a t)): directions in which items of one category differ anyway count less when categories are
//! told apart. s_i is the variance along direction i, t the mean variance a dimension, a = 1, and s̄² the mean of the
//! remaining variances plus a t. (Shrunk within-class whitening, the metric of linear discriminant analysis; low rank, so
//! that a starter stays small.)

use nalgebra::{DMatrix, SymmetricEigen};
use ndarray::{Array2, ArrayView1};

use crate::{arithmetic::dot, meta::statistics::Sums};

/// How strongly variances are drawn toward their mean.
const SHRINKAGE: f64 = 1.0;

/// The most directions that are damped: a starter of 1280 dimensions stays below 400 KB.
pub const MOST_DIRECTIONS: usize = 256;

/// A direction is raised to at most this much beyond its own length, as a negative damping.
pub const LEAST_DAMPING: f64 = -3.0;

/// A linear map of rank ≤ [`MOST_DIRECTIONS`] beside the identity.
#[derive(Debug, Clone, PartialEq)]
pub struct Whitening {
    /// r × d, unit length.
    directions: Array2<f32>,
    /// δ, r numbers: 1 takes a direction out, 0 leaves it, below 0 raises it.
    damping: Vec<f32>,
}

impl Whitening {
    /// The whitening of these directions (r × d, unit length) by these factors (r, each from
    /// [`LEAST_DAMPING`] to 1).
    pub(crate) fn new(directions: Array2<f32>, damping: Vec<f32>) -> Self {
        debug_assert_eq!(directions.nrows(), damping.len());
        Self { directions: directions.as_standard_layout().into_owned(), damping }
    }

    /// Learned from past categories; at most `rank` directions. Cost O(d³).
    ///
    /// The covariance of few items has few directions, and is trusted no further than they reach.
    pub fn learn(sums: &Sums, rank: usize) -> Self {
        let covariance = sums.covariance();
        let d = covariance.nrows();
        let matrix = DMatrix::from_fn(d, d, |i, j| covariance[[i, j]]);
        let SymmetricEigen { eigenvectors, eigenvalues } = SymmetricEigen::new(matrix);
        let mut order: Vec<usize> = (0..d).collect();
        order.sort_by(|&a, &b| eigenvalues[b].total_cmp(&eigenvalues[a]).then(a.cmp(&b)));
        let variance = |place: usize| eigenvalues[order[place]].max(0.0);
        let typical = SHRINKAGE * (0..d).map(variance).sum::<f64>() / d as f64;
        let rank = rank.min(MOST_DIRECTIONS).min(sums.freedom()).min(d - 1);
        if rank == 0 || typical <= 0.0 {
            return Self::new(Array2::zeros((0, d)), Vec::new());
        }
        let rest = (rank..d).map(variance).sum::<f64>() / (d - rank) as f64 + typical;
        let damping = |i: usize| 1.0 - (rest / (variance(i) + typical)).sqrt();
        let damping: Vec<f32> = (0..rank).map(|i| damping(i).clamp(0.0, 1.0) as f32).collect();
        let directions = Array2::from_shape_fn((rank, d), |(i, j)| {
            // An eigenvector's sign is arbitrary; the largest entry is made positive so that files come out the same.
            let column = eigenvectors.column(order[i]);
            let sign = column[column.iamax()].signum();
            (sign * column[j]) as f32
        });
        Self::new(directions, damping)
    }

    /// How many directions are damped (r).
    pub fn rank(&self) -> usize {
        self.damping.len()
    }

    /// How many numbers a place has (d).
    pub fn dimension(&self) -> usize {
        self.directions.ncols()
    }

    /// The directions, r × d, and the damping of each.
    pub fn parts(&self) -> (&Array2<f32>, &[f32]) {
        (&self.directions, &self.damping)
    }

    /// Whitens a place (or a difference of places) where it stands. Cost O(r d).
    pub fn apply(&self, place: &mut [f32]) {
        let along: Vec<f32> = self.directions.outer_iter().map(|direction| dot(slice(&direction), place)).collect();
        for ((direction, &damping), along) in self.directions.outer_iter().zip(&self.damping).zip(along) {
            let factor = damping * along;
            place.iter_mut().zip(slice(&direction)).for_each(|(x, &u)| *x -= factor * u);
        }
    }
}

fn slice<'a>(row: &'a ArrayView1<'a, f32>) -> &'a [f32] {
    row.as_slice().expect("standard layout by construction")
}
