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

use ndarray::{Array1, Array2, Axis};

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
    /// The scatter of the whole support set around its category means (C × d). Cost O(n d).
    pub(super) fn around(means: &Array2<f64>, support: &Support) -> Self {
        let sum = support
            .labels()
            .iter()
            .enumerate()
            .flat_map(|(i, &label)| support.embedding(i).iter().zip(means.row(label).to_vec()))
            .map(|(&x, mean)| (f64::from(x) - mean).powi(2))
            .sum();
        Self { sum, freedom: support.len() - support.categories() }
    }

    /// s²; 0 where every category has one example, and then it would make no difference.
    pub(super) fn variance(self) -> f64 {
        if self.freedom == 0 { 0.0 } else { self.sum / self.freedom as f64 }
    }

    /// Without one example at this squared distance from the mean of its category of `count` ≥ 2.
    pub(super) fn without(self, squared_distance: f64, count: f64) -> Self {
        let sum = (self.sum - squared_distance * count / (count - 1.0)).max(0.0);
        Self { sum, freedom: self.freedom - 1 }
    }
}

impl Learner for Prototype {
    fn learn(&self, support: &Support) -> Learned {
        Learned { head: self.fit(support), left_out: self.leave_one_out(support) }
    }
}

impl Prototype {
    /// The head alone. Cost O(n d).
    pub fn fit(&self, support: &Support) -> Head {
        let means = support.means();
        let common = means.mean_axis(Axis(0)).expect("a support set has categories");
        let mut bias = Array1::zeros(support.categories());
        let variance = Scatter::around(&means, support).variance();
        let prototypes = Array2::from_shape_fn(means.dim(), |(c, j)| {
            common[j] + self.trust(support.counts()[c]) * (means[[c, j]] - common[j])
        });
        for (c, bias) in bias.iter_mut().enumerate() {
            let square: f64 = prototypes.row(c).iter().map(|x| x * x).sum();
            *bias = self.trust(support.counts()[c]).powi(2) * variance / support.counts()[c] as f64 - square;
        }
        Head::new(prototypes.mapv(|x| (2.0 * x) as f32), bias)
    }

    /// The logits of every example by the prototypes of the others, in closed form.
    fn leave_one_out(&self, support: &Support) -> LeftOut {
        let (n, categories) = (support.len(), support.categories());
        let gram = support.gram();
        let means = support.mean_coefficients();
        let with_means = arithmetic::times(gram, &means);
        let between = arithmetic::times(&means.t().to_owned(), &with_means);
        let common = between.mean_axis(Axis(1)).expect("a support set has categories");
        let scatter = Scatter::around(&support.means(), support);
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
