//! Nearest prototype: each category is the mean of its examples, and distance counts less where items of one category differ.
//!
//! Computes logit = −(z − p_c)ᵀ Q (z − p_c) + a_c² s²/n_c, up to a term that is the same for all categories. The prototype p_c
//! is the mean of the category's examples, drawn toward the mean of all categories while the category has few (James–Stein
//! shrinkage): p_c = m + a_c (mean_c − m), a_c = n_c/(n_c + κ). With T the scatter of the examples around their categories'
//! means, summed, Q = ν (T + ν I)⁻¹: directions in which items of one category differ much count less, those of which the
//! examples say nothing count whole. ν is ρ times T's average over the directions it has; ρ = ∞ makes Q = I, plain distances,
//! and so does one example a category. Up to scale, Q is the metric of linear discriminant analysis with a regularised
//! covariance. ρ is chosen among seven by leave-one-out log loss, from the prior's own guess downhill.
//!
//! A mean of n_c examples lies farther from everything by s²/n_c on average, s² the square of an item's distance from its
//! category's centre, in Q, as leave-one-out finds it; without taking that off, categories with many examples would draw
//! items from those with few.
//!
//! Leave-one-out is the exact refit at the same ν: an example left out changes T by one product of a vector with itself, Q
//! by another (Sherman, Morrison 1950), and all happens in the products Z Q Zᵀ. Learning costs O(n² d + n³) for every ρ, the
//! head alone as much or, with more examples than dimensions, O(n d² + d³/3).
//!
//! Prototypes: Snell, Swersky, Zemel 2017 (arXiv:1703.05175); a metric from the examples, mixed with the whole space's: Bateni
//! et al. 2020 (arXiv:1912.03432); regularised discriminant analysis: Friedman 1989 (doi:10.1080/01621459.1989.10478752).

use ndarray::{Array1, Array2, Axis};

use super::{Learned, Learner, LeftOut, calibrate::temperature, log_loss, positive_definite};
use crate::{arithmetic, head::Head, prior::Prior, support::Support};

/// The ρ tried.
const REGULARISATIONS: [f64; 7] = [0.03, 0.1, 0.3, 1.0, 3.0, 10.0, 30.0];

/// How sure the prior's ρ is: the standard deviation of its logarithm.
const REGULARISATION_SPREAD: f64 = 2.0;

/// The nearest-prototype learner.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Prototype {
    /// κ ≥ 0: how many examples the common mean counts for.
    pub shrinkage: f64,
    /// ρ > 0: how much of an average direction's scatter every direction is given; infinite for plain distances.
    pub regularisation: f64,
}

/// What a fit to more examples takes over from the examples that were judged.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Decided {
    pub regularisation: f64,
    /// s².
    pub variance: f64,
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
        let distance = |(i, &label): (usize, &usize)| -> f64 {
            let mean = means.row(label);
            let mean = mean.as_slice().expect("standard layout");
            support.embedding(i).iter().zip(mean).map(|(&x, mean)| (f64::from(x) - mean).powi(2)).sum()
        };
        let sum = support.labels().iter().enumerate().map(distance).sum();
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
        self.learn_at(support, self.penalty(support))
    }
}

impl Prototype {
    fn trust(&self, count: usize) -> f64 {
        let count = count as f64;
        count / (count + self.shrinkage)
    }

    /// ν for these examples; infinite where they show no scatter.
    pub fn penalty(&self, support: &Support) -> f64 {
        let scatter = Scatter::around(&support.means(), support);
        let directions = scatter.freedom.min(support.dimension());
        // Identical examples differ by what rounding leaves of them.
        let seen = scatter.sum > 1e-9 * support.len() as f64;
        if seen { self.regularisation * scatter.sum / directions as f64 } else { f64::INFINITY }
    }

    /// Learns at a given ν > 0 (infinite for plain distances), with the exact leave-one-out logits.
    pub fn learn_at(&self, support: &Support, penalty: f64) -> Learned {
        let scene = Scene::new(support, penalty);
        let head = self.head(support, &scene.metric_means(), scene.variance());
        Learned { head, left_out: self.leave_one_out(&scene) }
    }

    /// Learns at the ρ that the examples choose from this prior's guess; and what was decided.
    pub(super) fn learn_chosen(prior: &Prior, support: &Support) -> (Learned, Decided) {
        let expected = prior.regularisation.at(support.shot());
        let one = Self { regularisation: 1.0, ..prior.prototype(support) };
        let unit = one.penalty(support);
        let judge = |regularisation: f64| {
            let scene = Scene::new(support, regularisation * unit);
            let left_out = one.leave_one_out(&scene);
            let factor = temperature(&left_out, support, prior.prototype_factor(support));
            let pull = (libm::log(regularisation / expected) / REGULARISATION_SPREAD).powi(2) / 2.0;
            let (loss, known) = log_loss(&left_out, support, factor);
            (known, loss + pull, scene, left_out, regularisation)
        };
        let mut best = judge(expected);
        if best.0 > 0 {
            let weaker = REGULARISATIONS.into_iter().rev().filter(|&one| one < expected);
            let stronger = REGULARISATIONS.into_iter().filter(|&one| one > expected);
            for direction in [weaker.collect::<Vec<_>>(), stronger.collect()] {
                for next in direction.into_iter().map(judge) {
                    if next.1 >= best.1 {
                        break;
                    }
                    best = next;
                }
            }
        }
        // The head is made once: it alone costs O(n C d).
        let (_, _, scene, left_out, regularisation) = best;
        let variance = scene.variance();
        let head = one.head(support, &scene.metric_means(), variance);
        (Learned { head, left_out }, Decided { regularisation, variance })
    }

    /// The head alone: in n × n or in d × d, whichever is smaller.
    pub fn fit(&self, support: &Support) -> Head {
        let penalty = self.penalty(support);
        let scene = (support.len() <= support.dimension()).then(|| Scene::new(support, penalty));
        let variance = match &scene {
            Some(scene) => scene.variance(),
            None => Scene::new(&support.spread(super::JUDGED_LIMIT).0, penalty).variance(),
        };
        self.fit_with(support, variance)
    }

    /// The head alone, given s².
    pub(super) fn fit_with(&self, support: &Support, variance: f64) -> Head {
        let penalty = self.penalty(support);
        let means = support.means();
        let metric_means = if penalty.is_infinite() {
            means
        } else if support.len() <= support.dimension() {
            metric_means_dual(support, penalty)
        } else {
            metric_means_primal(support, &means, penalty)
        };
        self.head(support, &metric_means, variance)
    }

    /// Prototypes from the means, given what Q makes of each mean (C × d).
    fn head(&self, support: &Support, metric_means: &Array2<f64>, variance: f64) -> Head {
        let means = support.means();
        let common = means.mean_axis(Axis(0)).expect("a support set has categories");
        let metric_common = metric_means.mean_axis(Axis(0)).expect("a support set has categories");
        let drawn = |c: usize, j: usize, common: &Array1<f64>, means: &Array2<f64>| {
            common[j] + self.trust(support.counts()[c]) * (means[[c, j]] - common[j])
        };
        let mut bias = Array1::zeros(support.categories());
        for (c, bias) in bias.iter_mut().enumerate() {
            let square: f64 = (0..support.dimension())
                .map(|j| drawn(c, j, &common, &means) * drawn(c, j, &metric_common, metric_means))
                .sum();
            *bias = self.trust(support.counts()[c]).powi(2) * variance / support.counts()[c] as f64 - square;
        }
        let weights =
            Array2::from_shape_fn(means.dim(), |(c, j)| (2.0 * drawn(c, j, &metric_common, metric_means)) as f32);
        Head::new(weights, bias)
    }

    /// The logits of every example by the prototypes and the metric of the others, in closed form.
    fn leave_one_out(&self, scene: &Scene) -> LeftOut {
        let support = scene.support;
        let (n, categories) = (support.len(), support.categories());
        let mut left_out = LeftOut::unknown(n, categories);
        for i in 0..n {
            let label = support.labels()[i];
            if support.counts()[label] == 1 {
                continue;
            }
            let without = scene.without(i);
            let count = |c: usize| support.counts()[c] - usize::from(c == label);
            let variance = without.variance;
            left_out.set(i, &without.products.logits(|c| self.trust(count(c)), |c| variance / count(c) as f64));
        }
        left_out
    }
}

/// W (K + ν I)⁻¹ of a support set, W its within-category deviations: what Q takes away from a combination of examples.
struct Damping {
    /// Deviations' products with each other, plus ν.
    factor: arithmetic::Cholesky,
    /// Examples' products with deviations, n × n.
    with_deviations: Array2<f64>,
}

impl Damping {
    fn new(support: &Support, with_means: &Array2<f64>, between: &Array2<f64>, penalty: f64) -> Self {
        let labels = support.labels();
        let with_deviations = Array2::from_shape_fn((support.len(), support.len()), |(i, j)| {
            support.gram()[[i, j]] - with_means[[i, labels[j]]]
        });
        let mut deviations = Array2::from_shape_fn(with_deviations.dim(), |(i, j)| {
            with_deviations[[i, j]] - with_means[[j, labels[i]]] + between[[labels[i], labels[j]]]
        });
        deviations.diag_mut().mapv_inplace(|x| x + penalty);
        Self { factor: positive_definite(deviations), with_deviations }
    }
}

/// The examples as Q shows them: all their products, and those of their means.
struct Scene<'a> {
    support: &'a Support,
    /// ν.
    penalty: f64,
    damping: Option<Damping>,
    /// z_i Q z_j, n × n.
    products: Array2<f64>,
    /// z_i Q mean_c, n × C.
    with_means: Array2<f64>,
    /// mean_c Q mean_k, C × C.
    between: Array2<f64>,
    /// mean_c Q m, m the mean of all means.
    with_common: Array1<f64>,
}

/// The same without one example.
struct Without {
    products: Products,
    variance: f64,
}

impl<'a> Scene<'a> {
    fn new(support: &'a Support, penalty: f64) -> Self {
        let means = support.mean_coefficients();
        let mean_products = |gram: &Array2<f64>| {
            let with_means = arithmetic::times(gram, &means);
            let between = arithmetic::times(&means.t().to_owned(), &with_means);
            (with_means, between)
        };
        let (mut with_means, mut between) = mean_products(support.gram());
        let mut products = support.gram().clone();
        let damping = penalty.is_finite().then(|| Damping::new(support, &with_means, &between, penalty));
        if let Some(damping) = &damping {
            products -= &damping.factor.congruent(&damping.with_deviations);
            (with_means, between) = mean_products(&products);
        }
        let with_common = between.mean_axis(Axis(1)).expect("a support set has categories");
        Self { support, penalty, damping, products, with_means, between, with_common }
    }

    /// Q mean_c, C × d.
    fn metric_means(&self) -> Array2<f64> {
        match &self.damping {
            Some(damping) => damped_means(self.support, damping),
            None => self.support.means(),
        }
    }

    /// The squared distance of an example from its category's mean.
    fn distance(&self, example: usize) -> f64 {
        let label = self.support.labels()[example];
        self.products[[example, example]] - 2.0 * self.with_means[[example, label]] + self.between[[label, label]]
    }

    /// s²: the mean square of a distance from a category's centre, each taken without the item itself.
    fn variance(&self) -> f64 {
        let terms = (0..self.support.len()).map(|i| {
            let count = self.support.counts()[self.support.labels()[i]];
            (count, self.distance(i))
        });
        pooled(terms, self.penalty)
    }

    fn without(&self, i: usize) -> Without {
        let support = self.support;
        let (labels, counts) = (support.labels(), support.counts());
        let (label, categories) = (labels[i], support.categories());
        let (with, without) = (counts[label] as f64, (counts[label] - 1) as f64);
        // δ, the example's deviation, and how far its share in T held distances along it down.
        let distance = self.distance(i).max(0.0);
        let gain = gain(with, distance, self.penalty);
        let along = |j: usize| self.products[[j, i]] - self.with_means[[j, label]];
        let means_along = Array1::from_shape_fn(categories, |c| self.with_means[[i, c]] - self.between[[label, c]]);
        let common_along = means_along.sum() / categories as f64;
        let own_along = along(i);
        let own = self.products[[i, i]] + gain * own_along * own_along;
        let with_mean = |j: usize, along: f64, c: usize| self.with_means[[j, c]] + gain * along * means_along[c];
        let between = |c: usize, k: usize| self.between[[c, k]] + gain * means_along[c] * means_along[k];

        let mut query = Array1::from_shape_fn(categories, |c| with_mean(i, own_along, c));
        let mut squares = Array1::from_shape_fn(categories, |c| between(c, c));
        let mut with_common = &self.with_common + &(&means_along * (gain * common_along));
        // Only the example's own category moves: mean' = (n_c mean − x) / (n_c − 1).
        let (own_mean, own_square) = (query[label], squares[label]);
        let moved_square = (with * with * own_square - 2.0 * with * own_mean + own) / (without * without);
        let mut own_sum = 0.0;
        for c in 0..categories {
            let before = between(label, c);
            let moved = if c == label { moved_square } else { (with * before - query[c]) / without };
            own_sum += moved;
            with_common[c] += (moved - before) / categories as f64;
        }
        with_common[label] = own_sum / categories as f64;
        squares[label] = moved_square;
        query[label] = (with * own_mean - own) / without;

        let others = (0..support.len()).filter(|&j| j != i).map(|j| {
            let along = along(j);
            let square = self.products[[j, j]] + gain * along * along;
            let mut product = with_mean(j, along, labels[j]);
            if labels[j] != label {
                return (counts[labels[j]], square - 2.0 * product + between(labels[j], labels[j]));
            }
            product = (with * product - self.products[[j, i]] - gain * along * own_along) / without;
            (counts[label] - 1, square - 2.0 * product + moved_square)
        });
        Without { variance: pooled(others, self.penalty), products: Products { query, squares, with_common } }
    }
}

/// By how much leaving an example out raises products along its deviation: the factor on the products of both with it.
/// `count` ≥ 2 is its category's, `distance` its own squared from the category's mean, itself in T and in the mean.
fn gain(count: f64, distance: f64, penalty: f64) -> f64 {
    let share = count / ((count - 1.0) * penalty);
    // In exact arithmetic share · distance < 1; rounding must not turn the sign.
    share / (1.0 - share * distance).max(1e-9)
}

/// s² from every example's count of its category and squared distance from its category's mean in Q.
fn pooled(examples: impl Iterator<Item = (usize, f64)>, penalty: f64) -> f64 {
    let (mut sum, mut freedom) = (0.0, 0.0);
    for (count, distance) in examples.filter(|&(count, _)| count > 1) {
        let (count, distance) = (count as f64, distance.max(0.0));
        // Seen without itself the example lies farther, by n/(n − 1) for the mean and by this for Q.
        sum += distance + gain(count, distance, penalty) * distance * distance;
        freedom += (count - 1.0) / count;
    }
    if freedom == 0.0 { 0.0 } else { sum / freedom }
}

/// Q mean_c, by the examples: a mean less what of it lies along deviations.
fn damped_means(support: &Support, damping: &Damping) -> Array2<f64> {
    let means = support.mean_coefficients();
    let along = arithmetic::times(&damping.with_deviations.t().to_owned(), &means);
    let mut coefficients = damping.factor.solve(&along);
    // From deviations to examples: each less its category's mean.
    let mut sums = Array2::<f64>::zeros((support.categories(), support.categories()));
    for (i, &label) in support.labels().iter().enumerate() {
        sums.row_mut(label).scaled_add(1.0 / support.counts()[label] as f64, &coefficients.row(i));
    }
    for (i, &label) in support.labels().iter().enumerate() {
        let mut row = coefficients.row_mut(i);
        row -= &sums.row(label);
    }
    support.combine_exactly(&(means - coefficients))
}

fn metric_means_dual(support: &Support, penalty: f64) -> Array2<f64> {
    let means = support.mean_coefficients();
    let with_means = arithmetic::times(support.gram(), &means);
    let between = arithmetic::times(&means.t().to_owned(), &with_means);
    damped_means(support, &Damping::new(support, &with_means, &between, penalty))
}

/// The same by T itself, for many examples.
fn metric_means_primal(support: &Support, means: &Array2<f64>, penalty: f64) -> Array2<f64> {
    let d = support.dimension();
    let mut scatter = Array2::<f64>::zeros((d, d));
    let mut deviation = vec![0.0; d];
    for (i, &label) in support.labels().iter().enumerate() {
        deviation
            .iter_mut()
            .zip(support.embedding(i))
            .zip(means.row(label))
            .for_each(|((out, &x), &mean)| *out = f64::from(x) - mean);
        for j in 0..d {
            let factor = deviation[j];
            let row = &mut scatter.row_mut(j);
            let row = row.as_slice_mut().expect("standard layout");
            row[..=j].iter_mut().zip(&deviation).for_each(|(sum, &x)| *sum += factor * x);
        }
    }
    scatter.diag_mut().mapv_inplace(|x| x + penalty);
    (positive_definite(scatter).solve(&means.t().to_owned()) * penalty).t().to_owned()
}
