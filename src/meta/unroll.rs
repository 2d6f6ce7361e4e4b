//! How the loss on queries depends on the gradient learner's start and steps: exact derivatives through all its steps.
//!
//! An episode is kept as a [`Problem`]: kernels K_g between all its items and its examples, and per group the start
//! logits D_g. With P the logits of examples and queries, P_0 = τ Σ_g a_g D_g and P_{t+1} = P_t − (Σ_g α_tg K_g + β_t) E_t,
//! E_t the examples' weighted errors. The derivatives run that backwards: with R = ∂L/∂P_{t+1} and S_g = K_gᵀ R,
//! ∂L/∂α_tg = −⟨S_g, E_t⟩, ∂L/∂E_t = −Σ_g α_tg S_g − β_t 1ᵀR, and the softmax takes ∂L/∂E_t back to the examples' logits.
//! Cost O(T G N n C) for N items, n of them examples. The differentiation through inner steps is that of MAML (Finn et al.
//! 2017, arXiv:1703.03400), nothing of it left out.

use ndarray::{Array2, Axis};

use crate::{
    arithmetic,
    learner::{Groups, Start, Step, centred, errors, kernels, middle},
};

/// An episode as the gradient learner sees it.
pub(crate) struct Problem {
    /// By group, the rest last: N × n, the examples first.
    kernels: Vec<Array2<f64>>,
    /// By group: N × C, times the temperature.
    starts: Vec<Array2<f64>>,
    labels: Vec<usize>,
    counts: Vec<usize>,
    queries: Vec<usize>,
}

/// Start and step sizes, or derivatives by them.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Sizes {
    pub start: Vec<f64>,
    pub steps: Vec<Step>,
}

impl Problem {
    /// Of all items' products with each other (N × N) and coordinates along the directions (N × r), the examples first.
    pub fn new(
        groups: &Groups,
        (gram, coordinates): (&Array2<f64>, &Array2<f64>),
        labels: &[usize],
        queries: &[usize],
        temperature: f64,
    ) -> Self {
        let n = labels.len();
        let categories = labels.iter().max().map_or(0, |top| top + 1);
        let mut counts = vec![0; categories];
        labels.iter().for_each(|&label| counts[label] += 1);
        let kernels = kernels(Some((groups, coordinates)), &gram.select(Axis(1), &(0..n).collect::<Vec<_>>()));
        let starts = kernels.iter().map(|kernel| Start::new(kernel, labels, &counts).logits() * temperature).collect();
        let middle = middle(labels, &counts, None);
        let kernels = kernels.iter().map(|kernel| centred(kernel, &middle)).collect();
        Self { kernels, starts, labels: labels.to_vec(), counts, queries: queries.to_vec() }
    }

    fn examples(&self, logits: &Array2<f64>) -> Array2<f64> {
        logits.select(Axis(0), &(0..self.labels.len()).collect::<Vec<_>>())
    }

    /// The logits of all items after the steps, and every step's errors.
    fn descend(&self, sizes: &Sizes) -> (Array2<f64>, Vec<Array2<f64>>) {
        let mut logits = Array2::zeros(self.starts[0].dim());
        for (start, &a) in self.starts.iter().zip(&sizes.start) {
            logits.scaled_add(a, start);
        }
        let mut path = Vec::with_capacity(sizes.steps.len());
        for step in &sizes.steps {
            let errors = errors(&self.examples(&logits), &self.labels, &self.counts);
            for (kernel, &size) in self.kernels.iter().zip(&step.weights) {
                logits -= &(arithmetic::times(kernel, &errors) * size);
            }
            logits -= &(errors.sum_axis(Axis(0)) * step.bias);
            path.push(errors);
        }
        (logits, path)
    }

    /// The logits of the queries after the steps.
    pub fn query_logits(&self, sizes: &Sizes) -> Array2<f64> {
        let (logits, _) = self.descend(sizes);
        logits.select(Axis(0), &(self.labels.len()..logits.nrows()).collect::<Vec<_>>())
    }

    /// The mean log loss of the queries after the steps, and its derivatives by every size.
    pub fn loss(&self, sizes: &Sizes) -> (f64, Sizes) {
        let (n, categories) = (self.labels.len(), self.counts.len());
        let (logits, path) = self.descend(sizes);

        // ∂L/∂P after the last step: nothing for examples.
        let share = 1.0 / self.queries.len() as f64;
        let mut loss = 0.0;
        let mut slope = Array2::<f64>::zeros(logits.dim());
        for (q, &label) in self.queries.iter().enumerate() {
            let own = logits.row(n + q);
            loss += share * (arithmetic::log_sum_exp(own) - own[label]);
            let mut row = slope.row_mut(n + q);
            row.assign(&(arithmetic::softmax(own) * share));
            row[label] -= share;
        }
        let mut by = Sizes { start: Vec::new(), steps: Vec::with_capacity(path.len()) };
        for (step, errors) in sizes.steps.iter().zip(&path).rev() {
            let column_sums = slope.sum_axis(Axis(0));
            let mut by_errors = Array2::from_shape_fn((n, categories), |(_, c)| -step.bias * column_sums[c]);
            let mut by_weights = Vec::with_capacity(self.kernels.len());
            for (kernel, &size) in self.kernels.iter().zip(&step.weights) {
                let back = arithmetic::times(&kernel.t().as_standard_layout().into_owned(), &slope);
                by_weights.push(-(&back * errors).sum());
                by_errors.scaled_add(-size, &back);
            }
            let by_bias = -(&errors.sum_axis(Axis(0)) * &column_sums).sum();
            by.steps.push(Step { weights: by_weights, bias: by_bias });
            for i in 0..n {
                let label = self.labels[i];
                let weight = 1.0 / (self.counts[label] * categories) as f64;
                // E = w (p − onehot): ∂L/∂logit = w p (∂L/∂E − Σ p ∂L/∂E).
                let probability = |c: usize| errors[[i, c]] / weight + f64::from(u8::from(c == label));
                let mean: f64 = (0..categories).map(|c| probability(c) * by_errors[[i, c]]).sum();
                for c in 0..categories {
                    slope[[i, c]] += weight * probability(c) * (by_errors[[i, c]] - mean);
                }
            }
        }
        by.steps.reverse();
        by.start = self.starts.iter().map(|start| (start * &slope).sum()).collect();
        (loss, by)
    }
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use proptest::prelude::*;

    use super::*;
    use crate::{
        Prior, Support,
        learner::{Descent, Learner},
        prior::{ByShot, usual_prototype_factor},
    };

    /// Rows, labels of the examples, labels of the queries.
    fn episodes() -> impl Strategy<Value = (Array2<f32>, Vec<usize>, Vec<usize>)> {
        (prop::collection::vec(1_usize..4, 2..4), 1_usize..4).prop_flat_map(|(counts, queries)| {
            let labels: Vec<usize> = counts.iter().enumerate().flat_map(|(c, &n)| vec![c; n]).collect();
            let queries: Vec<usize> = (0..counts.len() * queries).map(|q| q % counts.len()).collect();
            let rows = labels.len() + queries.len();
            prop::collection::vec(-1.0_f32..1.0, rows * 6).prop_map(move |numbers| {
                (Array2::from_shape_vec((rows, 6), numbers).unwrap(), labels.clone(), queries.clone())
            })
        })
    }

    fn sizes() -> impl Strategy<Value = Sizes> {
        let steps = prop::collection::vec(prop::collection::vec(0.0_f64..3.0, 4), 1..5);
        (prop::collection::vec(0.3_f64..2.0, 3), steps).prop_map(|(start, steps)| Sizes {
            start,
            steps: steps.into_iter().map(|step| Step { weights: step[..3].to_vec(), bias: step[3] }).collect(),
        })
    }

    fn groups() -> Groups {
        let directions = Array2::from_shape_fn((3, 6), |(k, j)| if j == k { 0.96_f32 } else { 0.0 });
        Groups::new(directions, vec![1, 3])
    }

    fn problem(rows: &Array2<f32>, labels: &[usize], queries: &[usize]) -> Problem {
        let products = (&arithmetic::gram(rows.view()), &groups().coordinates(rows.view()));
        Problem::new(&groups(), products, labels, queries, 1.5)
    }

    fn numbers(sizes: &Sizes) -> Vec<f64> {
        let steps = sizes.steps.iter().flat_map(|step| step.weights.iter().copied().chain([step.bias]));
        sizes.start.iter().copied().chain(steps).collect()
    }

    fn changed(sizes: &Sizes, number: usize, by: f64) -> Sizes {
        let mut sizes = sizes.clone();
        let steps = sizes.steps.iter_mut().flat_map(|step| step.weights.iter_mut().chain([&mut step.bias]));
        *sizes.start.iter_mut().chain(steps).nth(number).unwrap() += by;
        sizes
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 64, failure_persistence: None, ..ProptestConfig::default() })]

        #[test]
        fn derivatives_are_those_of_finite_differences((rows, labels, queries) in episodes(), sizes in sizes()) {
            let problem = problem(&rows, &labels, &queries);
            let claimed = numbers(&problem.loss(&sizes).1);
            for (number, claimed) in claimed.into_iter().enumerate() {
                let at = |by: f64| problem.loss(&changed(&sizes, number, by)).0;
                // Fourth-order central difference.
                let h = 1e-3;
                let measured = (8.0 * (at(h) - at(-h)) - (at(2.0 * h) - at(-2.0 * h))) / (12.0 * h);
                prop_assert!((claimed - measured).abs() < 1e-6 * (1.0 + measured.abs()), "{number}: {claimed} {measured}");
            }
        }

        /// What is differentiated is what the learner does.
        #[test]
        fn the_loss_is_the_learners((rows, labels, queries) in episodes(), sizes in sizes()) {
            let loss = problem(&rows, &labels, &queries).loss(&sizes).0;
            let n = labels.len();
            let categories = labels.iter().max().unwrap() + 1;
            let part = |range: std::ops::Range<usize>| rows.select(Axis(0), &range.collect::<Vec<_>>());
            let support = Support::new(part(0..n), labels.clone(), categories).unwrap();
            let prior = Prior {
                descent: Descent::new(Arc::new(groups()), sizes.start.clone(), sizes.steps.clone()),
                prototype_temperature: ByShot::even(1.5 / usual_prototype_factor(support.shot())),
                ..Prior::default()
            };
            let head = crate::learner::Gradient { prior: &prior }.learn(&support).head;
            let probabilities = head.probabilities(part(n..rows.nrows()).view());
            let expected: f64 = queries.iter().enumerate().map(|(q, &label)| -probabilities[[q, label]].ln()).sum();
            prop_assert!((loss - expected / queries.len() as f64).abs() < 1e-4 * (1.0 + loss), "{loss} {expected}");
        }
    }
}
