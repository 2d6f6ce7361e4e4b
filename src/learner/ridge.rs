//! Ridge regression to the categories, in closed form.
//!
//! Minimises Σ_c mean_{i in c} ‖W z_i + b − y_i‖² + μ‖W‖², with y_i one-hot minus 1/C: every category counts the same
//! however uneven the counts, and the bias is not penalised. μ is the strength λ over the mean number of examples a
//! category. With the Gram matrix K and N the diagonal of the counts n_c, the solution is W = Aᵀ Z where
//!
//! ```text
//! ⎡ K + μ N   1 ⎤ ⎡ A  ⎤   ⎡ Y ⎤
//! ⎣    1ᵀ     0 ⎦ ⎣ bᵀ ⎦ = ⎣ 0 ⎦
//! ```
//!
//! and the residual of an example left out is A_i / P_ii, P the inverse of that matrix (Allen 1974; Cawley 2006). An
//! example left out also lowers n_c for the others of its category; a correction of rank n_c makes the closed form exactly
//! the refit. λ is chosen among eight by leave-one-out log loss, from the prior's own guess downhill.
//!
//! A fit to few examples fits what is peculiar to them, so that further items of their category score lower than those of a
//! category with many, and big categories would draw items from small ones. With r the share of an example's square that it has
//! in common with its category, an item scores about g_c = r/(r + (1 − r)/n_c) of what the mean of n_c examples does; scores are
//! divided by that (measured from what an item of no category scores), times its geometric mean over categories.
//!
//! Use it from about two examples a category. Learning with leave-one-out costs O(n² d + n³) a strength, the head alone
//! O(n² d + n³/3) or, with more examples than dimensions, O(n d² + d³/3).
//!
//! R2-D2: Bertinetto et al. 2019 (arXiv:1805.08136).

use ndarray::{Array1, Array2, Axis};

use super::{Learned, Learner, LeftOut, calibrate::temperature, log_loss, positive_definite, prototype::Scatter};
use crate::{arithmetic, head::Head, prior::Prior, support::Support};

/// The strengths tried.
const STRENGTHS: [f64; 8] = [0.01, 0.03, 0.1, 0.3, 1.0, 3.0, 10.0, 30.0];

/// How sure the prior's strength is: the standard deviation of its logarithm.
const STRENGTH_SPREAD: f64 = 2.5;

/// The least share of its square that an example is taken to have in common with its category.
const LEAST_COMMON: f64 = 0.05;

/// The ridge learner.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Ridge<'a> {
    /// Where the choice of strength starts.
    pub prior: &'a Prior,
}

/// A solution at one strength.
struct Solution {
    /// A, n × C.
    coefficients: Array2<f64>,
    bias: Array1<f64>,
    left_out: LeftOut,
}

impl Learner for Ridge<'_> {
    fn learn(&self, support: &Support) -> Learned {
        self.learn_with_strength(support).0
    }
}

impl Ridge<'_> {
    /// Learns, and says which strength was chosen.
    pub fn learn_with_strength(&self, support: &Support) -> (Learned, f64) {
        let (solution, strength) = self.choose(support);
        let head = Head::new(support.combine(&solution.coefficients), solution.bias);
        (Learned { head, left_out: solution.left_out }, strength)
    }

    /// Learns at a given strength λ > 0, with the exact leave-one-out logits.
    pub fn learn_at(support: &Support, strength: f64) -> Learned {
        let solution = solve(support, strength);
        Learned { head: Head::new(support.combine(&solution.coefficients), solution.bias), left_out: solution.left_out }
    }

    /// The head alone at a given strength λ > 0: in n × n or in d × d, whichever is smaller.
    pub fn fit(support: &Support, strength: f64) -> Head {
        let (mut weights, mut bias) = if support.len() <= support.dimension() {
            fit_dual(support, strength)
        } else {
            fit_primal(support, strength)
        };
        let fairness = Fairness::new(support, strength / support.shot());
        let factors = fairness.factors(support.counts(), fairness.scatter.variance());
        for (mut row, factor) in weights.outer_iter_mut().zip(&factors) {
            row.mapv_inplace(|w| (f64::from(w) * factor) as f32);
        }
        fairness.apply(&mut bias, &factors);
        Head::new(weights, bias)
    }

    fn choose(&self, support: &Support) -> (Solution, f64) {
        let expected = self.prior.strength(support);
        let judge = |strength: f64| {
            let solution = solve(support, strength);
            let factor = temperature(&solution.left_out, support, self.prior.ridge_factor(support, strength));
            let pull = (libm::log(strength / expected) / STRENGTH_SPREAD).powi(2) / 2.0;
            let (loss, known) = log_loss(&solution.left_out, support, factor);
            (known, loss + pull, solution, strength)
        };
        let start = judge(expected);
        if start.0 == 0 {
            return (start.2, start.3);
        }
        // Downhill in both directions from the prior's strength: the loss has one valley in practice, and every strength
        // costs a factorisation.
        let weaker = STRENGTHS.into_iter().rev().filter(|&strength| strength < expected);
        let stronger = STRENGTHS.into_iter().filter(|&strength| strength > expected);
        let mut best = start;
        for direction in [weaker.collect::<Vec<_>>(), stronger.collect()] {
            for next in direction.into_iter().map(judge) {
                if next.1 >= best.1 {
                    break;
                }
                best = next;
            }
        }
        (best.2, best.3)
    }
}

/// What categories with few examples are owed.
struct Fairness {
    scatter: Scatter,
    /// Squared distance of each example from its category's mean.
    distances: Vec<f64>,
    /// Mean square of an example.
    square: f64,
    /// μ.
    penalty: f64,
    /// What an item of no category scores: −1/C.
    nothing: f64,
}

impl Fairness {
    /// Cost O(n d).
    fn new(support: &Support, penalty: f64) -> Self {
        let means = support.means();
        let squared = |i: usize, of: &dyn Fn(usize) -> f64| -> f64 {
            support.embedding(i).iter().enumerate().map(|(j, &x)| (f64::from(x) - of(j)).powi(2)).sum()
        };
        let distances = (0..support.len()).map(|i| squared(i, &|j| means[[support.labels()[i], j]])).collect();
        let square = (0..support.len()).map(|i| squared(i, &|_| 0.0)).sum::<f64>() / support.len() as f64;
        let scatter = Scatter::around(&means, support);
        Self { scatter, distances, square, penalty, nothing: -1.0 / support.categories() as f64 }
    }

    /// The geometric mean of all g over each category's, given the variance within categories; ones where there is no telling.
    fn factors(&self, counts: &[usize], variance: f64) -> Vec<f64> {
        if variance == 0.0 || self.square == 0.0 {
            return vec![1.0; counts.len()];
        }
        let common = (1.0 - variance / self.square).clamp(LEAST_COMMON, 1.0);
        let logs: Vec<f64> = counts
            .iter()
            .map(|&count| libm::log(common + (1.0 - common) / count as f64 + self.penalty / self.square))
            .collect();
        let middle = logs.iter().sum::<f64>() / logs.len() as f64;
        logs.into_iter().map(|log| libm::exp(log - middle)).collect()
    }

    /// The same for the examples without one, whose category has others.
    fn factors_without(&self, support: &Support, example: usize) -> Vec<f64> {
        let label = support.labels()[example];
        let mut counts = support.counts().to_vec();
        counts[label] -= 1;
        let scatter = self.scatter.without(self.distances[example], support.counts()[label] as f64);
        self.factors(&counts, scatter.variance())
    }

    fn apply(&self, scores: &mut Array1<f64>, factors: &[f64]) {
        scores
            .iter_mut()
            .zip(factors)
            .for_each(|(score, factor)| *score = (*score - self.nothing) * factor + self.nothing);
    }
}

fn targets(support: &Support) -> Array2<f64> {
    let rest = 1.0 / support.categories() as f64;
    let mut targets = Array2::from_elem((support.len(), support.categories()), -rest);
    for (example, &label) in support.labels().iter().enumerate() {
        targets[[example, label]] = 1.0 - rest;
    }
    targets
}

fn solve(support: &Support, strength: f64) -> Solution {
    let penalty = strength / support.shot();
    let n = support.len();
    let mut inverse = positive_definite(penalised(support, penalty)).solve(&Array2::eye(n));
    let sums = inverse.sum_axis(Axis(1));
    let total = sums.sum();
    for i in 0..n {
        inverse.row_mut(i).scaled_add(-sums[i] / total, &sums);
    }
    let targets = targets(support);
    let mut coefficients = arithmetic::times(&inverse, &targets);
    let mut bias = sums.dot(&targets) / total;
    let fairness = Fairness::new(support, penalty);
    let left_out = leave_one_out(support, penalty, &inverse, &coefficients, &targets, &fairness);
    let factors = fairness.factors(support.counts(), fairness.scatter.variance());
    for (mut column, factor) in coefficients.axis_iter_mut(Axis(1)).zip(&factors) {
        column *= *factor;
    }
    fairness.apply(&mut bias, &factors);
    Solution { coefficients, bias, left_out }
}

fn leave_one_out(
    support: &Support,
    penalty: f64,
    inverse: &Array2<f64>,
    coefficients: &Array2<f64>,
    targets: &Array2<f64>,
    fairness: &Fairness,
) -> LeftOut {
    let categories = support.categories();
    let mut left_out = LeftOut::unknown(support.len(), categories);
    for c in 0..categories {
        let members: Vec<usize> = (0..support.len()).filter(|&i| support.labels()[i] == c).collect();
        if members.len() < 2 {
            continue;
        }
        let own = inverse.select(Axis(0), &members).select(Axis(1), &members);
        let correction = positive_definite(Array2::eye(members.len()) - penalty * &own);
        let own = correction.solve(&own);
        let own_coefficients = correction.solve(&coefficients.select(Axis(0), &members));
        for (position, &i) in members.iter().enumerate() {
            let residual = &own_coefficients.row(position) / own[[position, position]];
            let mut logits = &targets.row(i) - &residual;
            fairness.apply(&mut logits, &fairness.factors_without(support, i));
            left_out.set(i, &logits);
        }
    }
    left_out
}

/// The same minimum without leave-one-out: one factorisation and C + 1 solves.
fn fit_dual(support: &Support, strength: f64) -> (Array2<f32>, Array1<f64>) {
    let n = support.len();
    let factor = positive_definite(penalised(support, strength / support.shot()));
    let targets = targets(support);
    let mut coefficients = factor.solve(&targets);
    let sums = factor.solve(&Array2::ones((n, 1))).column(0).to_owned();
    let bias = sums.dot(&targets) / sums.sum();
    for (c, mut column) in coefficients.axis_iter_mut(Axis(1)).enumerate() {
        column.scaled_add(-bias[c], &sums);
    }
    (support.combine(&coefficients), bias)
}

/// K + μ N.
fn penalised(support: &Support, penalty: f64) -> Array2<f64> {
    let mut matrix = support.gram().clone();
    for (i, &label) in support.labels().iter().enumerate() {
        matrix[[i, i]] += penalty * support.counts()[label] as f64;
    }
    matrix
}

/// The same minimum by the normal equations in d × d, for many examples.
fn fit_primal(support: &Support, strength: f64) -> (Array2<f32>, Array1<f64>) {
    let penalty = strength / support.shot();
    let (d, categories) = (support.dimension(), support.categories());
    let weights: Vec<f64> = support.labels().iter().map(|&label| 1.0 / support.counts()[label] as f64).collect();
    let mut mean = Array1::<f64>::zeros(d);
    for (i, weight) in weights.iter().enumerate() {
        let share = weight / categories as f64;
        mean.iter_mut().zip(support.embedding(i)).for_each(|(m, &x)| *m += share * f64::from(x));
    }
    let mut scatter = Array2::<f64>::zeros((d, d));
    let mut moments = Array2::<f64>::zeros((d, categories));
    let mut centred = vec![0.0; d];
    for (i, weight) in weights.iter().enumerate() {
        centred.iter_mut().zip(support.embedding(i)).zip(&mean).for_each(|((out, &x), &m)| *out = f64::from(x) - m);
        for j in 0..d {
            let factor = weight * centred[j];
            let row = &mut scatter.row_mut(j);
            let row = row.as_slice_mut().expect("standard layout");
            row[..=j].iter_mut().zip(&centred).for_each(|(sum, &x)| *sum += factor * x);
            moments[[j, support.labels()[i]]] += factor;
        }
    }
    scatter.diag_mut().mapv_inplace(|x| x + penalty);
    // Centred embeddings make the −1/C part of the targets vanish.
    let weights = positive_definite(scatter).solve(&moments);
    let bias = -mean.dot(&weights);
    (weights.t().mapv(|w| w as f32), bias)
}
