//! What the examples say of each other: each one's probabilities by a learner that never saw it.

use ndarray::{Array2, ArrayView1};

/// Examples with their categories and the probabilities that the others give them.
#[derive(Debug, Clone)]
pub struct Evidence {
    labels: Vec<usize>,
    counts: Vec<usize>,
    probabilities: Array2<f64>,
    known: Vec<bool>,
}

impl Evidence {
    /// Examples with these categories (0 … C − 1), none judged yet.
    pub fn new(labels: &[usize], categories: usize) -> Self {
        let mut counts = vec![0; categories];
        labels.iter().for_each(|&label| counts[label] += 1);
        Self {
            labels: labels.to_vec(),
            counts,
            probabilities: Array2::zeros((labels.len(), categories)),
            known: vec![false; labels.len()],
        }
    }

    /// Sets the probabilities (C, adding up to 1) that the others give this example.
    pub fn set(&mut self, example: usize, probabilities: ArrayView1<f64>) {
        self.probabilities.row_mut(example).assign(&probabilities);
        self.known[example] = true;
    }

    /// How many examples there are.
    pub fn len(&self) -> usize {
        self.labels.len()
    }

    /// Whether there is no example.
    pub fn is_empty(&self) -> bool {
        self.labels.is_empty()
    }

    /// How many categories there are (C).
    pub fn categories(&self) -> usize {
        self.counts.len()
    }

    /// How many examples each category has.
    pub fn counts(&self) -> &[usize] {
        &self.counts
    }

    /// The category of each example.
    pub fn labels(&self) -> &[usize] {
        &self.labels
    }

    /// The examples that could be judged: number, category, probabilities.
    pub fn judged(&self) -> impl Iterator<Item = (usize, usize, ArrayView1<'_, f64>)> {
        (0..self.len())
            .filter(|&example| self.known[example])
            .map(|example| (example, self.labels[example], self.probabilities.row(example)))
    }
}

/// The value below which the share `level` (0 to 1) of further values falls, on average, given `sorted` ones of the same
/// kind: between the order statistics around `level` · (n + 1). `None` where the sample is too small to tell, below 1.
pub(crate) fn lower_quantile(sorted: &[f64], level: f64) -> Option<f64> {
    let place = level * (sorted.len() + 1) as f64;
    let below = place.floor() as usize;
    let first = *sorted.get(below.checked_sub(1)?)?;
    let second = sorted.get(below).copied().unwrap_or(first);
    Some(first + (place - below as f64) * (second - first))
}
