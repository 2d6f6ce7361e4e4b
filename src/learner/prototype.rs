//! Nearest prototype: each category is the mean of its examples.
//!
//! Computes logit = −‖z − p_c‖², up to a term that is the same for all categories. The prototype p_c is the mean of the
//! category's examples, drawn toward the mean of all categories while the category has few (James–Stein shrinkage):
//! p_c = m + n_c/(n_c + κ) · (mean_c − m). Use it when there are one or two examples a category. Fitting costs O(n d),
//! leave-one-out O(n² d) for the products it shares with the other learners and then O(n C).
//!
//! Snell, Swersky, Zemel 2017 (arXiv:1703.05175).

use ndarray::{Array1, Array2};

use super::{Learned, Learner, LeftOut};
use crate::{arithmetic, head::Head, support::Support};

/// The nearest-prototype learner.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Prototype {
    /// κ ≥ 0: how many examples the common mean counts for.
    pub shrinkage: f64,
}

impl Prototype {
    fn trust(&self, count: usize) -> f64 {
        let count = count as f64;
        count / (count + self.shrinkage)
    }

    /// n × C coefficients whose combination of the examples gives the prototypes.
    pub(crate) fn coefficients(&self, support: &Support) -> Array2<f64> {
        let means = support.mean_coefficients();
        let common = means.mean_axis(ndarray::Axis(1)).expect("a support set has categories");
        let mut coefficients = means;
        for (c, mut column) in coefficients.axis_iter_mut(ndarray::Axis(1)).enumerate() {
            let trust = self.trust(support.counts()[c]);
            column.zip_mut_with(&common, |x, &m| *x = m + trust * (*x - m));
        }
        coefficients
    }
}

/// Inner products of the category means with each other and with one query: all that logits depend on.
struct Products {
    /// query · mean_c
    query: Array1<f64>,
    /// mean_c · mean_c
    squares: Array1<f64>,
    /// mean_c · m
    with_common: Array1<f64>,
}

impl Products {
    fn logits(&self, trust: impl Fn(usize) -> f64) -> Array1<f64> {
        let categories = self.query.len();
        let query_common = self.query.sum() / categories as f64;
        let common_square = self.with_common.sum() / categories as f64;
        Array1::from_shape_fn(categories, |c| {
            let a = trust(c);
            let rest = 1.0 - a;
            let query = a * self.query[c] + rest * query_common;
            let square = a * a * self.squares[c] + 2.0 * a * rest * self.with_common[c] + rest * rest * common_square;
            2.0 * query - square
        })
    }
}

impl Learner for Prototype {
    fn learn(&self, support: &Support) -> Learned {
        let prototypes = support.combine(&self.coefficients(support));
        let bias = prototypes.map_axis(ndarray::Axis(1), |p| -p.iter().map(|&x| f64::from(x).powi(2)).sum::<f64>());
        Learned { head: Head::new(prototypes.mapv(|x| 2.0 * x), bias), left_out: self.leave_one_out(support) }
    }
}

impl Prototype {
    /// The logits of every example by the prototypes of the others, in closed form.
    fn leave_one_out(&self, support: &Support) -> LeftOut {
        let (n, categories) = (support.len(), support.categories());
        let gram = support.gram();
        let means = support.mean_coefficients();
        let with_means = arithmetic::times(gram, &means);
        let between = arithmetic::times(&means.t().to_owned(), &with_means);
        let common = between.mean_axis(ndarray::Axis(1)).expect("a support set has categories");
        let mut left_out = LeftOut::unknown(n, categories);
        for i in 0..n {
            let label = support.labels()[i];
            let count = support.counts()[label];
            if count == 1 {
                continue;
            }
            let (with, without) = (count as f64, (count - 1) as f64);
            let own = gram[[i, i]];
            let mut query = with_means.row(i).to_owned();
            let mut squares = between.diag().to_owned();
            let mut with_common = common.clone();
            // Only the example's own category moves: mean' = (n_c mean − x) / (n_c − 1).
            squares[label] =
                (with * with * between[[label, label]] - 2.0 * with * with_means[[i, label]] + own) / (without * without);
            let mut own_sum = 0.0;
            for c in 0..categories {
                let moved = if c == label {
                    squares[label]
                } else {
                    (with * between[[label, c]] - with_means[[i, c]]) / without
                };
                own_sum += moved;
                with_common[c] += (moved - between[[label, c]]) / categories as f64;
            }
            with_common[label] = own_sum / categories as f64;
            query[label] = (with * with_means[[i, label]] - own) / without;
            let products = Products { query, squares, with_common };
            let trust = |c: usize| self.trust(support.counts()[c] - usize::from(c == label));
            left_out.set(i, &products.logits(trust));
        }
        left_out
    }
}
