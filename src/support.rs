//! The support set: the examples a person gave, checked once at the door.

use std::sync::OnceLock;

use ndarray::{Array2, ArrayView2};

use crate::{
    arithmetic,
    error::{Error, Result},
};

/// Examples with their categories: at least two categories, at least one example in each, finite numbers.
#[derive(Debug, Clone)]
pub struct Support {
    embeddings: Array2<f32>,
    labels: Vec<usize>,
    counts: Vec<usize>,
    gram: OnceLock<Array2<f64>>,
}

impl Support {
    /// A support set of n examples.
    ///
    /// `embeddings` is n × d, each row a place in a [`Space`](crate::Space); `labels` holds n category numbers below
    /// `categories`. Refuses fewer than two categories, a category without an example, a label out of range, numbers
    /// of examples and labels that differ, and numbers that aren't finite.
    pub fn new(embeddings: Array2<f32>, labels: Vec<usize>, categories: usize) -> Result<Self> {
        if embeddings.nrows() != labels.len() {
            return Err(Error::LabelCount { examples: embeddings.nrows(), labels: labels.len() });
        }
        if categories < 2 {
            return Err(Error::TooFewCategories(categories));
        }
        if let Some(position) = embeddings.iter().position(|x| !x.is_finite()) {
            let value = embeddings[[position / embeddings.ncols(), position % embeddings.ncols()]];
            return Err(Error::NotFinite { position: position % embeddings.ncols(), value });
        }
        let mut counts = vec![0; categories];
        for &label in &labels {
            *counts.get_mut(label).ok_or(Error::LabelOutOfRange { label, categories })? += 1;
        }
        if let Some(empty) = counts.iter().position(|&count| count == 0) {
            return Err(Error::NoExample(empty));
        }
        let embeddings = embeddings.as_standard_layout().into_owned();
        Ok(Self { embeddings, labels, counts, gram: OnceLock::new() })
    }

    /// How many examples (n).
    pub fn len(&self) -> usize {
        self.labels.len()
    }

    /// Never true: a support set has examples.
    pub fn is_empty(&self) -> bool {
        false
    }

    /// How many categories (C ≥ 2).
    pub fn categories(&self) -> usize {
        self.counts.len()
    }

    /// How many numbers an embedding has (d).
    pub fn dimension(&self) -> usize {
        self.embeddings.ncols()
    }

    /// The examples, n × d.
    pub fn embeddings(&self) -> ArrayView2<'_, f32> {
        self.embeddings.view()
    }

    /// One example's embedding.
    pub fn embedding(&self, example: usize) -> &[f32] {
        let d = self.dimension();
        &self.embeddings.as_slice().expect("standard layout by construction")[example * d..(example + 1) * d]
    }

    /// The category of each example.
    pub fn labels(&self) -> &[usize] {
        &self.labels
    }

    /// How many examples each category has, all at least one.
    pub fn counts(&self) -> &[usize] {
        &self.counts
    }

    /// Inner products between all examples, n × n. Computed once, cost O(n² d).
    pub fn gram(&self) -> &Array2<f64> {
        self.gram.get_or_init(|| arithmetic::gram(self.embeddings.view()))
    }

    /// The sum over examples of `coefficients` (n × C) times embedding, as C × d in f32. Cost O(n C d).
    pub fn combine(&self, coefficients: &Array2<f64>) -> Array2<f32> {
        self.combine_exactly(coefficients).mapv(|x| x as f32)
    }

    /// The same in f64.
    pub(crate) fn combine_exactly(&self, coefficients: &Array2<f64>) -> Array2<f64> {
        let mut sums = Array2::<f64>::zeros((coefficients.ncols(), self.dimension()));
        for (example, row) in coefficients.outer_iter().enumerate() {
            for (&factor, mut sum) in row.iter().zip(sums.outer_iter_mut()) {
                if factor != 0.0 {
                    sum.iter_mut().zip(self.embedding(example)).for_each(|(s, &x)| *s += factor * f64::from(x));
                }
            }
        }
        sums
    }

    /// n × C coefficients whose combination is every category's mean.
    pub fn mean_coefficients(&self) -> Array2<f64> {
        let mut coefficients = Array2::zeros((self.len(), self.categories()));
        for (example, &label) in self.labels.iter().enumerate() {
            coefficients[[example, label]] = 1.0 / self.counts[label] as f64;
        }
        coefficients
    }

    /// Every category's mean, C × d. Cost O(n d).
    pub fn means(&self) -> Array2<f64> {
        let mut means = Array2::zeros((self.categories(), self.dimension()));
        for (example, &label) in self.labels.iter().enumerate() {
            let share = 1.0 / self.counts[label] as f64;
            means.row_mut(label).iter_mut().zip(self.embedding(example)).for_each(|(m, &x)| *m += share * f64::from(x));
        }
        means
    }

    /// Examples a category, on average (≥ 1).
    pub fn shot(&self) -> f64 {
        self.len() as f64 / self.categories() as f64
    }

    /// At most about `size` examples (two of every category that has them, whatever the size), spread evenly over the
    /// categories and over each category's order; and their numbers here.
    pub fn spread(&self, size: usize) -> (Self, Vec<usize>) {
        let quota = (size / self.categories()).max(2);
        let mut own = vec![Vec::new(); self.categories()];
        self.labels.iter().enumerate().for_each(|(example, &label)| own[label].push(example));
        let mut members = Vec::new();
        for own in own {
            let take = quota.min(own.len());
            members.extend((0..take).map(|k| own[k * own.len() / take]));
        }
        let labels = members.iter().map(|&i| self.labels[i]).collect();
        let rows = self.embeddings.select(ndarray::Axis(0), &members);
        let part = Self::new(rows, labels, self.categories()).expect("part of a support set with every category in it");
        (part, members)
    }

    /// The support set without one example, or `None` where its category would be left empty.
    pub fn without(&self, example: usize) -> Option<Self> {
        if self.counts[self.labels[example]] == 1 {
            return None;
        }
        let keep: Vec<usize> = (0..self.len()).filter(|&i| i != example).collect();
        let labels = keep.iter().map(|&i| self.labels[i]).collect();
        let embeddings = self.embeddings.select(ndarray::Axis(0), &keep);
        Self::new(embeddings, labels, self.categories()).ok()
    }
}

#[cfg(test)]
mod tests {
    use ndarray::array;

    use super::*;

    #[test]
    fn the_door_refuses_what_learners_cannot_use() {
        let two = array![[1.0_f32, 0.0], [0.0, 1.0]];
        let code = |e: Array2<f32>, l: Vec<usize>, c| Support::new(e, l, c).unwrap_err().code();
        assert_eq!(code(two.clone(), vec![0], 2), "label-count");
        assert_eq!(code(two.clone(), vec![0, 0], 1), "too-few-categories");
        assert_eq!(code(two.clone(), vec![0, 2], 2), "label-out-of-range");
        assert_eq!(code(two.clone(), vec![0, 0], 2), "no-example");
        assert_eq!(code(array![[1.0_f32, f32::NAN], [0.0, 1.0]], vec![0, 1], 2), "not-finite");
        assert!(Support::new(two, vec![1, 0], 2).is_ok());
    }
}
