//! Nearest prototype: each category is the mean of its examples.
//!
//! Computes logit = −‖z − p_c‖² + a_c² s²/n_c, up to a term that is the same for all categories. The prototype p_c is the
//! mean of the category's examples, drawn toward the mean of all categories while the category has few (James–Stein
//! shrinkage): p_c = m + a_c (mean_c − m), a_c = n_c/(n_c + κ). A mean of n_c examples lies farther from everything by
//! s²/n_c on average, s² the pooled variance within categories; without taking that off, categories with many examples
//! would draw items from those with few. Use it when there are one or two examples a category. Fitting costs O(n d),
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
    /// `trust` gives a_c and `variance` s²/n_c for a category.
    fn logits(&self, trust: impl Fn(usize) -> f64, variance: impl Fn(usize) -> f64) -> Array1<f64> {
        let categories = self.query.len();
        let query_common = self.query.sum() / categories as f64;
        let common_square = self.with_common.sum() / categories as f64;
        Array1::from_shape_fn(categories, |c| {
            let a = trust(c);
            let rest = 1.0 - a;
            let query = a * self.query[c] + rest * query_common;
            let square = a * a * self.squares[c] + 2.0 * a * rest * self.with_common[c] + rest * rest * common_square;
            2.0 * query - square + a * a * variance(c)
        })
    }
}

/// Squared distances of examples from their category's mean, summed, and how many of them are free.
#[derive(Clone, Copy)]
pub(super) struct Scatter {
    sum: f64,
    freedom: usize,
}

impl Scatter {
    /// The scatter of the whole support set. Cost O(n²) once the inner products are known.
    pub(super) fn of(support: &Support) -> Self {
        let gram = support.gram();
        let mut within = gram.diag().sum();
        for (i, &label) in support.labels().iter().enumerate() {
            let own: f64 = (0..support.len()).filter(|&j| support.labels()[j] == label).map(|j| gram[[i, j]]).sum();
            within -= own / support.counts()[label] as f64;
        }
        Self { sum: within.max(0.0), freedom: support.len() - support.categories() }
    }

    /// s²; 0 where every category has one example, and then it would make no difference.
    pub(super) fn variance(self) -> f64 {
        if self.freedom == 0 { 0.0 } else { self.sum / self.freedom as f64 }
    }

    /// Without one example at this squared distance from the mean of its category of `count` ≥ 2.
    fn without(self, squared_distance: f64, count: f64) -> Self {
        let sum = (self.sum - squared_distance * count / (count - 1.0)).max(0.0);
        Self { sum, freedom: self.freedom - 1 }
    }
}

impl Learner for Prototype {
    fn learn(&self, support: &Support) -> Learned {
        let prototypes = support.combine(&self.coefficients(support));
        let mut bias = prototypes.map_axis(ndarray::Axis(1), |p| -p.iter().map(|&x| f64::from(x).powi(2)).sum::<f64>());
        let variance = Scatter::of(support).variance();
        for (c, bias) in bias.iter_mut().enumerate() {
            *bias += self.trust(support.counts()[c]).powi(2) * variance / support.counts()[c] as f64;
        }
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
        let scatter = Scatter::of(support);
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
            squares[label] = (with * with * between[[label, label]] - 2.0 * with * with_means[[i, label]] + own)
                / (without * without);
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
            let squared_distance = own - 2.0 * with_means[[i, label]] + between[[label, label]];
            let variance = scatter.without(squared_distance, with).variance();
            let count = |c: usize| support.counts()[c] - usize::from(c == label);
            left_out.set(i, &products.logits(|c| self.trust(count(c)), |c| variance / count(c) as f64));
        }
        left_out
    }
}
