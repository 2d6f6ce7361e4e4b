//! A few gradient steps: a softmax head that starts at the prototypes and descends on the examples.
//!
//! Starts at the nearest-prototype head (without shrinkage) with the prior's temperature, then takes T ≤ 20 full-batch
//! steps down the log loss, in which every category counts the same however uneven the counts. Start and steps come from a
//! [`Descent`]: weights fall into groups by direction (bands of the directions that a starter damps, and the rest), and
//! each group has a start scale a_g and a step size α_tg of its own at every step t, the bias one more. With M_g the map onto
//! group g, the start is the logit −τ Σ_g a_g (z − p_c)ᵀ M_g (z − p_c), and a step is w −= Σ_g α_tg M_g ∂L/∂w. Steps see
//! examples from the mean m of the categories' means: what all of them have in common would make one direction so steep that
//! steps overshoot, and tells no category from another.
//!
//! All of it happens in the span of the examples: with K_g = (Z − m) M_g (Z − m)ᵀ a step changes the logits by
//! −(Σ_g α_tg K_g + β_t) E, E the weighted errors (n × C), so it costs O(n² C) whatever the dimension. Leave-one-out repeats
//! the steps without each example, from the mean without it, exactly, in O(n³ C T).
//!
//! Use it where examples are plenty enough for prototypes to be crude and too few for a free fit. MAML: Finn et al. 2017
//! (arXiv:1703.03400); start at the prototypes: Triantafillou et al. 2020 (arXiv:1903.03096); learned step sizes: Li et al.
//! 2017 (arXiv:1707.09835), one for each step: Antoniou et al. 2019 (arXiv:1810.09502).

use std::{ops::Range, sync::Arc};

use ndarray::{Array1, Array2, ArrayView2, ArrayViewMut1, Axis};
use serde::{Deserialize, Serialize};

use super::{Learned, Learner, LeftOut};
use crate::{arithmetic, head::Head, prior::Prior, support::Support};

/// The most steps.
pub const MOST_STEPS: usize = 20;

/// About how many multiplications leave-one-out may take. Beyond, a spread-out part of the examples is left out, each of
/// them still alone.
const BUDGET: usize = 1_500_000_000;

/// How many examples are left out whatever it takes.
const LEAST_JUDGED: usize = 12;

/// How many columns of logits are worked on at a time while examples are left out: they stay in the cache.
const BLOCK: usize = 128;

/// Directions in the space by group: the first so many, the next, and so on; what none of them holds is the rest.
#[derive(Debug, Clone, PartialEq)]
pub struct Groups {
    /// r × d, near to orthonormal.
    directions: Array2<f32>,
    /// Where each group ends, ascending up to r.
    ends: Vec<usize>,
}

impl Groups {
    /// Groups of these directions (r × d, orthonormal but for rounding): the first up to the first of `ends`, and so on.
    ///
    /// # Panics
    /// If `ends` does not ascend up to r.
    pub fn new(directions: Array2<f32>, ends: Vec<usize>) -> Self {
        assert!(ends.is_sorted() && ends.last().copied().unwrap_or(0) == directions.nrows(), "ends ascend up to r");
        Self { directions: directions.as_standard_layout().into_owned(), ends }
    }

    /// How many groups, the rest not counted.
    pub fn len(&self) -> usize {
        self.ends.len()
    }

    /// Whether there is the rest only.
    pub fn is_empty(&self) -> bool {
        self.ends.is_empty()
    }

    fn ranges(&self) -> impl Iterator<Item = Range<usize>> + '_ {
        let starts = std::iter::once(0).chain(self.ends.iter().copied());
        starts.zip(&self.ends).map(|(start, &end)| start..end)
    }

    /// Inner products of rows (n × d) with the directions: n × r. Cost O(n r d).
    pub(crate) fn coordinates(&self, rows: ArrayView2<f32>) -> Array2<f64> {
        arithmetic::products(rows, self.directions.view()).mapv(f64::from)
    }
}

/// The gradient learner's start and steps.
#[derive(Debug, Clone, PartialEq)]
pub struct Descent {
    groups: Option<Arc<Groups>>,
    /// a_g for every group and the rest.
    start: Vec<f64>,
    steps: Vec<Step>,
}

/// One step's sizes.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Step {
    /// For the weights, by group, the rest last.
    pub weights: Vec<f64>,
    /// For the bias.
    pub bias: f64,
}

impl Descent {
    /// So many steps (at most [`MOST_STEPS`]), all of one size for weights, which are in one group, and one for the bias.
    ///
    /// Examples seen from their middle lie within a fraction of a unit of it and call for steps of many units; the bias
    /// overshoots from 4 on.
    pub fn even(steps: usize, weights: f64, bias: f64) -> Self {
        let step = Step { weights: vec![weights], bias };
        Self { groups: None, start: vec![1.0], steps: vec![step; steps.min(MOST_STEPS)] }
    }

    /// A start scale (≥ 0) for each of these groups and the rest, and at most [`MOST_STEPS`] steps with a size (≥ 0) for
    /// each of them.
    ///
    /// # Panics
    /// If a list isn't one longer than the groups are, or there are more steps.
    pub fn new(groups: Arc<Groups>, start: Vec<f64>, steps: Vec<Step>) -> Self {
        let fits = |list: &Vec<f64>| list.len() == groups.len() + 1;
        assert!(
            fits(&start) && steps.iter().all(|step| fits(&step.weights)),
            "one number a group, and one for the rest"
        );
        assert!(steps.len() <= MOST_STEPS, "at most {MOST_STEPS} steps");
        Self { groups: Some(groups), start, steps }
    }

    /// The start's scales a_g by group, the rest last.
    pub fn start(&self) -> &[f64] {
        &self.start
    }

    /// The steps in order.
    pub fn steps(&self) -> &[Step] {
        &self.steps
    }
}

/// K_g between items and examples, N × n, one for each group and one for the rest: of all their products, and for groups
/// the items' coordinates (N × r), the examples first. Cost O(N n r).
pub(crate) fn kernels(groups: Option<(&Groups, &Array2<f64>)>, products: &Array2<f64>) -> Vec<Array2<f64>> {
    let n = products.ncols();
    let mut rest = products.clone();
    let mut kernels = Vec::new();
    if let Some((groups, coordinates)) = groups {
        for range in groups.ranges() {
            let columns: Vec<usize> = range.collect();
            let part = coordinates.select(Axis(1), &columns);
            let examples = part.select(Axis(0), &(0..n).collect::<Vec<_>>());
            let kernel = arithmetic::times(&part, &examples.t().to_owned());
            rest -= &kernel;
            kernels.push(kernel);
        }
    }
    kernels.push(rest);
    kernels
}

/// What the examples (the first n rows) weigh in the mean of the categories' means, `without` one of them whose category has
/// others.
pub(crate) fn middle(labels: &[usize], counts: &[usize], without: Option<usize>) -> Array1<f64> {
    Array1::from(weights(labels, counts, without))
}

/// A kernel (N × n, the examples first) as seen from the middle of the examples.
pub(crate) fn centred(kernel: &Array2<f64>, middle: &Array1<f64>) -> Array2<f64> {
    let along = kernel.dot(middle);
    let square: f64 = (0..middle.len()).map(|i| middle[i] * along[i]).sum();
    Array2::from_shape_fn(kernel.dim(), |(j, i)| kernel[[j, i]] - along[j] - along[i] + square)
}

/// Σ_g factor_g K_g.
pub(crate) fn combined(kernels: &[Array2<f64>], factors: &[f64]) -> Array2<f64> {
    let mut sum = &kernels[0] * factors[0];
    for (kernel, &factor) in kernels.iter().zip(factors).skip(1) {
        sum.scaled_add(factor, kernel);
    }
    sum
}

/// Squared distances within and between under one kernel: what start logits are made of.
pub(crate) struct Start {
    /// x · M p_c for every row, N × C.
    pub with_means: Array2<f64>,
    /// p_c · M p_c.
    pub squares: Array1<f64>,
    /// Squared distances of examples from their own category's mean, summed; and how many of them are free.
    scatter: f64,
    freedom: usize,
    counts: Vec<usize>,
}

impl Start {
    /// `kernel` is N × n: every row's products with the examples, which are the first n rows.
    pub fn new(kernel: &Array2<f64>, labels: &[usize], counts: &[usize]) -> Self {
        let means = Array2::from_shape_fn((labels.len(), counts.len()), |(i, c)| {
            if labels[i] == c { 1.0 / counts[c] as f64 } else { 0.0 }
        });
        let with_means = arithmetic::times(kernel, &means);
        let mut squares = Array1::zeros(counts.len());
        let mut total = 0.0;
        for (i, &label) in labels.iter().enumerate() {
            squares[label] += with_means[[i, label]] / counts[label] as f64;
            total += kernel[[i, i]];
        }
        let between: f64 = counts.iter().zip(&squares).map(|(&count, square)| count as f64 * square).sum();
        let scatter = (total - between).max(0.0);
        Self { with_means, squares, scatter, freedom: labels.len() - counts.len(), counts: counts.to_vec() }
    }

    /// s²: the pooled variance within categories; 0 where every category has one example.
    fn variance(&self) -> f64 {
        if self.freedom == 0 { 0.0 } else { self.scatter / self.freedom as f64 }
    }

    /// Each category's constant: s²/n_c − p_c · M p_c.
    pub fn constants(&self) -> Array1<f64> {
        let variance = self.variance();
        Array1::from_shape_fn(self.counts.len(), |c| variance / self.counts[c] as f64 - self.squares[c])
    }

    /// −‖x − p_c‖² + s²/n_c for every row, but for what is the same in all categories: N × C.
    pub fn logits(&self) -> Array2<f64> {
        &self.with_means * 2.0 + &self.constants()
    }

    /// The same by the prototypes without example `i`, whose category has others.
    fn logits_without(&self, kernel: &Array2<f64>, i: usize, label: usize) -> Array2<f64> {
        let (with, without) = (self.counts[label] as f64, (self.counts[label] - 1) as f64);
        let own = kernel[[i, i]];
        let product = self.with_means[[i, label]];
        let mut moved = self.with_means.clone();
        for j in 0..moved.nrows() {
            moved[[j, label]] = (with * moved[[j, label]] - kernel[[j, i]]) / without;
        }
        let mut squares = self.squares.clone();
        squares[label] = (with * with * squares[label] - 2.0 * with * product + own) / (without * without);
        let distance = own - 2.0 * product + self.squares[label];
        let mut counts = self.counts.clone();
        counts[label] -= 1;
        let scatter = (self.scatter - distance * with / without).max(0.0);
        Self { with_means: moved, squares, scatter, freedom: self.freedom - 1, counts }.logits()
    }
}

/// Adds `values` times a factor to some columns of a row.
fn add(row: &mut ArrayViewMut1<f64>, columns: Range<usize>, factor: f64, values: &[f64]) {
    let row = row.as_slice_mut().expect("standard layout");
    row[columns].iter_mut().zip(values).for_each(|(x, value)| *x += factor * value);
}

/// What each example's loss counts for: every category the same. An example that is left out counts for nothing.
fn weights(labels: &[usize], counts: &[usize], left_out: Option<usize>) -> Vec<f64> {
    let out_of = |label: usize| counts[label] - usize::from(left_out.is_some_and(|i| labels[i] == label));
    let weight = |(i, &label): (usize, &usize)| {
        if left_out == Some(i) { 0.0 } else { 1.0 / (out_of(label) * counts.len()) as f64 }
    };
    labels.iter().enumerate().map(weight).collect()
}

/// The weighted errors of one softmax head: w_i (softmax(logits_i) − onehot_i), n × C.
pub(crate) fn errors(logits: &Array2<f64>, labels: &[usize], counts: &[usize]) -> Array2<f64> {
    let mut errors = logits.clone();
    let weights = weights(labels, counts, None);
    for ((mut row, &label), weight) in errors.outer_iter_mut().zip(labels).zip(weights) {
        into_error(row.as_slice_mut().expect("standard layout"), label, weight);
    }
    errors
}

/// Turns the logits of one example into its weighted error.
fn into_error(logits: &mut [f64], label: usize, weight: f64) {
    if weight == 0.0 {
        logits.fill(0.0);
        return;
    }
    let top = logits.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    logits.iter_mut().for_each(|x| *x = libm::exp(*x - top));
    let factor = weight / logits.iter().sum::<f64>();
    logits.iter_mut().for_each(|x| *x *= factor);
    logits[label] -= weight;
}

/// The few-step gradient learner.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Gradient<'a> {
    /// Start, steps and the start's temperature.
    pub prior: &'a Prior,
}

/// A support set seen through the descent's kernels.
struct Landscape<'a> {
    support: &'a Support,
    temperature: f64,
    start_kernel: Array2<f64>,
    start: Start,
    /// By group, n × n, not centred.
    kernels: Vec<Array2<f64>>,
    /// The different sums Σ_g α_tg K_g with their β_t, and which of them each step uses.
    step_kernels: Vec<(Array2<f64>, f64)>,
    order: Vec<usize>,
}

/// Where one of several descents at once goes its own way.
struct Variant {
    weights: Vec<f64>,
    /// For every different step: the kernel's products of all examples with the variant's own middle, and of that with itself;
    /// none where it is everyone's.
    middle: Option<Vec<(Array1<f64>, f64)>>,
}

impl<'a> Landscape<'a> {
    fn new(prior: &Prior, support: &'a Support) -> Self {
        let descent = &prior.descent;
        let coordinates = descent.groups.as_deref().map(|groups| (groups, groups.coordinates(support.embeddings())));
        let coordinates = coordinates.as_ref().map(|(groups, coordinates)| (*groups, coordinates));
        let kernels = kernels(coordinates, support.gram());
        let start_kernel = combined(&kernels, &descent.start);
        let mut distinct: Vec<&Step> = Vec::new();
        let mut order = Vec::new();
        for step in &descent.steps {
            let place = distinct.iter().position(|&known| known == step).unwrap_or_else(|| {
                distinct.push(step);
                distinct.len() - 1
            });
            order.push(place);
        }
        let middle = middle(support.labels(), support.counts(), None);
        let seen: Vec<Array2<f64>> = kernels.iter().map(|kernel| centred(kernel, &middle)).collect();
        Self {
            support,
            temperature: prior.prototype_factor(support),
            start: Start::new(&start_kernel, support.labels(), support.counts()),
            start_kernel,
            step_kernels: distinct.iter().map(|step| (combined(&seen, &step.weights), step.bias)).collect(),
            kernels,
            order,
        }
    }

    fn everyone(&self) -> Variant {
        Variant { weights: weights(self.support.labels(), self.support.counts(), None), middle: None }
    }

    /// Variants without each of these examples, whose categories have others.
    fn without(&self, examples: &[usize]) -> Vec<Variant> {
        let (labels, counts) = (self.support.labels(), self.support.counts());
        let mut middles = Array2::zeros((labels.len(), examples.len()));
        for (mut column, &i) in middles.axis_iter_mut(Axis(1)).zip(examples) {
            column.assign(&middle(labels, counts, Some(i)));
        }
        let along: Vec<Array2<f64>> =
            self.step_kernels.iter().map(|(kernel, _)| arithmetic::times(kernel, &middles)).collect();
        let own = |k: usize, along: &Array2<f64>| {
            let along = along.column(k).to_owned();
            let square = along.iter().zip(middles.column(k)).map(|(x, a)| x * a).sum();
            (along, square)
        };
        let variant = |(k, &i): (usize, &usize)| Variant {
            weights: weights(labels, counts, Some(i)),
            middle: Some(along.iter().map(|along| own(k, along)).collect()),
        };
        examples.iter().enumerate().map(variant).collect()
    }

    /// Descends from these logits (n × C for each variant, side by side). `watch` is shown the errors of every step. Cost
    /// O(n² C T) a variant.
    fn descend(&self, logits: &mut Array2<f64>, variants: &[Variant], mut watch: impl FnMut(&Array2<f64>)) {
        let categories = self.support.categories();
        for &step in &self.order {
            let (kernel, bias) = &self.step_kernels[step];
            let mut errors = logits.clone();
            for (i, mut row) in errors.outer_iter_mut().enumerate() {
                let row = row.as_slice_mut().expect("standard layout");
                for (logits, variant) in row.chunks_exact_mut(categories).zip(variants) {
                    into_error(logits, self.support.labels()[i], variant.weights[i]);
                }
            }
            *logits -= &arithmetic::times(kernel, &errors);
            let sums = errors.sum_axis(Axis(0));
            let mut moved = Array2::zeros(logits.dim());
            for (number, variant) in variants.iter().enumerate() {
                let own = number * categories..(number + 1) * categories;
                let sums = &sums.as_slice().expect("standard layout")[own.clone()];
                let Some(middle) = &variant.middle else {
                    moved.outer_iter_mut().for_each(|mut row| add(&mut row, own.clone(), -bias, sums));
                    continue;
                };
                let (along, square) = &middle[step];
                let mut errors_along = vec![0.0; categories];
                for (&along, errors) in along.iter().zip(errors.outer_iter()) {
                    let errors = &errors.to_slice().expect("standard layout")[own.clone()];
                    errors_along.iter_mut().zip(errors).for_each(|(sum, &x)| *sum += along * x);
                }
                for (mut row, &along) in moved.outer_iter_mut().zip(along) {
                    add(&mut row, own.clone(), 1.0, &errors_along);
                    add(&mut row, own.clone(), along - square - bias, sums);
                }
            }
            *logits += &moved;
            watch(&errors);
        }
    }

    fn leave_one_out(&self) -> LeftOut {
        let (labels, counts) = (self.support.labels(), self.support.counts());
        let (n, categories) = (self.support.len(), self.support.categories());
        let mut left_out = LeftOut::unknown(n, categories);
        let mut judged: Vec<usize> = (0..n).filter(|&i| counts[labels[i]] > 1).collect();
        let affordable = (BUDGET / (n * n * categories * self.order.len().max(1))).max(LEAST_JUDGED);
        if judged.len() > affordable {
            judged = (0..affordable).map(|k| judged[k * judged.len() / affordable]).collect();
        }
        for block in judged.chunks((BLOCK / categories).max(1)) {
            let mut logits = Array2::zeros((n, block.len() * categories));
            for (variant, &i) in block.iter().enumerate() {
                let start = self.start.logits_without(&self.start_kernel, i, labels[i]) * self.temperature;
                let columns = variant * categories;
                for ((j, c), &x) in start.indexed_iter() {
                    logits[[j, columns + c]] = x;
                }
            }
            self.descend(&mut logits, &self.without(block), |_| ());
            for (variant, &i) in block.iter().enumerate() {
                let columns = variant * categories;
                left_out.set(i, &Array1::from_shape_fn(categories, |c| logits[[i, columns + c]]));
            }
        }
        left_out
    }
}

impl Learner for Gradient<'_> {
    fn learn(&self, support: &Support) -> Learned {
        let landscape = Landscape::new(self.prior, support);
        Learned { head: self.descend(&landscape), left_out: landscape.leave_one_out() }
    }
}

impl Gradient<'_> {
    /// The head alone. Cost O(n² (d + C T)), and O(n r d) with directions.
    pub fn fit(&self, support: &Support) -> Head {
        self.descend(&Landscape::new(self.prior, support))
    }

    fn descend(&self, landscape: &Landscape) -> Head {
        let Descent { groups, start, steps } = &self.prior.descent;
        let support = landscape.support;
        let temperature = landscape.temperature;
        // Coefficients of the examples by group, the rest last: w = Σ_g M_g Zᵀ A_g.
        let mut stepped = vec![Array2::<f64>::zeros((support.len(), support.categories())); start.len()];
        let mut bias = landscape.start.constants() * temperature;
        let mut logits = landscape.start.logits() * temperature;
        let mut sizes = steps.iter();
        landscape.descend(&mut logits, &[landscape.everyone()], |errors| {
            let Some(step) = sizes.next() else { return };
            bias.scaled_add(-step.bias, &errors.sum_axis(Axis(0)));
            stepped.iter_mut().zip(&step.weights).for_each(|(sum, &size)| sum.scaled_add(-size, errors));
        });
        let means = support.mean_coefficients();
        let middle = middle(support.labels(), support.counts(), None);
        let mut coefficients = Vec::with_capacity(start.len());
        for ((mut stepped, kernel), a) in stepped.into_iter().zip(&landscape.kernels).zip(start) {
            // Steps see examples from the middle, and so must items.
            let sums = stepped.sum_axis(Axis(0));
            for (mut row, &share) in stepped.outer_iter_mut().zip(&middle) {
                row.scaled_add(-share, &sums);
            }
            bias -= &kernel.dot(&middle).dot(&stepped);
            coefficients.push(stepped + &means * (2.0 * temperature * a));
        }
        let rest = &coefficients[coefficients.len() - 1];
        let weights = support.combine(rest);
        let weights = match groups {
            Some(groups) => self.add_groups(weights, groups, support, &coefficients),
            None => weights,
        };
        Head::new(weights, bias)
    }

    /// Adds what the groups have beyond the rest: Σ_g M_g Zᵀ (A_g − A_rest).
    fn add_groups(
        &self,
        weights: Array2<f32>,
        groups: &Groups,
        support: &Support,
        coefficients: &[Array2<f64>],
    ) -> Array2<f32> {
        let coordinates = groups.coordinates(support.embeddings());
        let rest = &coefficients[coefficients.len() - 1];
        let mut weights = weights.mapv(f64::from);
        for (range, own) in groups.ranges().zip(coefficients) {
            let beyond = own - rest;
            for k in range {
                let direction = groups.directions.row(k);
                for c in 0..weights.nrows() {
                    let along: f64 = (0..support.len()).map(|i| beyond[[i, c]] * coordinates[[i, k]]).sum();
                    weights.row_mut(c).iter_mut().zip(&direction).for_each(|(w, &u)| *w += along * f64::from(u));
                }
            }
        }
        weights.mapv(|w| w as f32)
    }
}
