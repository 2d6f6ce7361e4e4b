//! A few gradient steps: a softmax head that starts at the prototypes and descends on the examples.
//!
//! Starts at the nearest-prototype head (without shrinkage) with the prior's temperature, then takes T ≤ 20 full-batch steps of size α down
//! the log loss, in which every category counts the same however uneven the counts. All of it happens in the span of the
//! examples (W = Aᵀ Z), so a step costs O(n² C) whatever the dimension. Leave-one-out repeats the steps without each
//! example: exact up to [`EXACT_LIMIT`] examples, beyond that in twelve groups.
//!
//! Use it where examples are plenty enough for prototypes to be crude and too few for a free fit. MAML: Finn et al. 2017
//! (arXiv:1703.03400); start at the prototypes: Triantafillou et al. 2020 (arXiv:1903.03096).

use ndarray::{Array1, Array2, Axis};

use super::{Learned, Learner, LeftOut};
use crate::{arithmetic, head::Head, prior::Prior, support::Support};

/// Up to this many examples, leave-one-out is exact.
pub const EXACT_LIMIT: usize = 48;

/// In how many groups examples are left out beyond that.
const GROUPS: usize = 12;

/// The few-step gradient learner.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Gradient<'a> {
    /// Step size, number of steps and the start's temperature.
    pub prior: &'a Prior,
}

impl Learner for Gradient<'_> {
    fn learn(&self, support: &Support) -> Learned {
        let everything: Vec<usize> = (0..support.len()).collect();
        let (coefficients, bias) = self.descend(support, &everything);
        let head = Head::new(support.combine(&coefficients), bias);
        Learned { head, left_out: self.leave_one_out(support) }
    }
}

impl Gradient<'_> {
    /// A (n × C, rows of left-out examples zero) and the bias after the steps on the `kept` examples.
    fn descend(&self, support: &Support, kept: &[usize]) -> (Array2<f64>, Array1<f64>) {
        let (n, categories) = (support.len(), support.categories());
        let gram = support.gram();
        let mut counts = vec![0_usize; categories];
        kept.iter().for_each(|&i| counts[support.labels()[i]] += 1);
        let weights: Vec<f64> = kept.iter().map(|&i| 1.0 / (counts[support.labels()[i]] * categories) as f64).collect();

        let mut means = Array2::<f64>::zeros((n, categories));
        for &i in kept {
            means[[i, support.labels()[i]]] = 1.0 / counts[support.labels()[i]] as f64;
        }
        let mut products = arithmetic::times(gram, &means);
        let squares = (&means * &products).sum_axis(Axis(0));
        let temperature = self.prior.prototype_temperature(support);
        let mut coefficients = means * (2.0 * temperature);
        let variance = variance(support, kept, &counts, &squares);
        let mut bias = Array1::from_shape_fn(categories, |c| temperature * (variance / counts[c] as f64 - squares[c]));
        products *= 2.0 * temperature;

        for _ in 0..self.prior.steps {
            let mut step = Array2::<f64>::zeros((n, categories));
            for (&i, &weight) in kept.iter().zip(&weights) {
                let mut error = arithmetic::softmax((&products.row(i) + &bias).view());
                error[support.labels()[i]] -= 1.0;
                step.row_mut(i).assign(&(error * (-self.prior.step_size * weight)));
            }
            bias += &step.sum_axis(Axis(0));
            products += &arithmetic::times(gram, &step);
            coefficients += &step;
        }
        (coefficients, bias)
    }

    fn leave_one_out(&self, support: &Support) -> LeftOut {
        let n = support.len();
        let gram = support.gram();
        let mut left_out = LeftOut::unknown(n, support.categories());
        let groups = if n <= EXACT_LIMIT { n } else { GROUPS };
        for group in 0..groups {
            let judged: Vec<usize> = group_members(support, group, groups);
            if judged.is_empty() {
                continue;
            }
            let kept: Vec<usize> = (0..n).filter(|i| !judged.contains(i)).collect();
            let (coefficients, bias) = self.descend(support, &kept);
            for &i in &judged {
                left_out.set(i, &(gram.row(i).dot(&coefficients) + &bias));
            }
        }
        left_out
    }
}

/// The pooled variance within categories of the kept examples, given each category's count and squared mean.
fn variance(support: &Support, kept: &[usize], counts: &[usize], squares: &Array1<f64>) -> f64 {
    let gram = support.gram();
    let total: f64 = kept.iter().map(|&i| gram[[i, i]]).sum();
    let between: f64 = counts.iter().zip(squares).map(|(&count, square)| count as f64 * square).sum();
    let freedom = kept.len() - counts.len();
    if freedom == 0 { 0.0 } else { (total - between).max(0.0) / freedom as f64 }
}

/// The examples of a group, never all of a category: examples are dealt out to the groups category by category.
fn group_members(support: &Support, group: usize, groups: usize) -> Vec<usize> {
    let mut seen = vec![0_usize; support.categories()];
    let mut dealt = 0;
    let mut members = Vec::new();
    for (i, &label) in support.labels().iter().enumerate() {
        let rank = seen[label];
        seen[label] += 1;
        dealt += 1;
        if support.counts()[label] < 2 {
            continue;
        }
        // One by one when there are as many groups as examples; else category by category, each in its own rotation.
        let place = if groups == support.len() { dealt - 1 } else { rank + label };
        if place % groups == group {
            members.push(i);
        }
    }
    members
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn groups_never_take_a_whole_category() {
        for counts in [[60, 2, 1], [30, 30, 30], [49, 1, 2]] {
            let labels: Vec<usize> = counts.iter().enumerate().flat_map(|(c, &n)| vec![c; n]).collect();
            let rows = Array2::from_shape_fn((labels.len(), 3), |(i, j)| ((i * 7 + j * 3) % 11) as f32);
            let support = Support::new(rows, labels, 3).unwrap();
            let groups = if support.len() <= EXACT_LIMIT { support.len() } else { GROUPS };
            let mut judged = vec![0; support.len()];
            for group in 0..groups {
                let members = group_members(&support, group, groups);
                for c in 0..3 {
                    let taken = members.iter().filter(|&&i| support.labels()[i] == c).count();
                    assert!(taken < support.counts()[c].max(1) || taken == 0);
                }
                members.iter().for_each(|&i| judged[i] += 1);
            }
            for (i, &times) in judged.iter().enumerate() {
                assert_eq!(times, usize::from(support.counts()[support.labels()[i]] > 1));
            }
        }
    }
}
