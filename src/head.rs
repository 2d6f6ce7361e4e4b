//! The head: what a learner makes of the examples, one logit for each category.

use ndarray::{Array1, Array2, ArrayView2};

use crate::arithmetic;

/// A linear map from a unit-length embedding to logits: `weights · z + bias`.
#[derive(Debug, Clone, PartialEq)]
pub struct Head {
    weights: Array2<f32>,
    bias: Array1<f64>,
}

impl Head {
    /// A head with `weights` (C × d) and `bias` (C).
    pub(crate) fn new(weights: Array2<f32>, bias: Array1<f64>) -> Self {
        debug_assert_eq!(weights.nrows(), bias.len());
        Self { weights: weights.as_standard_layout().into_owned(), bias }
    }

    /// How many categories (C).
    pub fn categories(&self) -> usize {
        self.bias.len()
    }

    /// The weights, C × d.
    pub fn weights(&self) -> ArrayView2<'_, f32> {
        self.weights.view()
    }

    /// The bias of each category.
    pub fn bias(&self) -> &Array1<f64> {
        &self.bias
    }

    /// The logits of m queries (m × d), m × C. Cost O(m C d).
    ///
    /// # Panics
    /// If the queries have another dimension than the head.
    pub fn logits(&self, queries: ArrayView2<f32>) -> Array2<f64> {
        assert_eq!(queries.ncols(), self.weights.ncols(), "queries and head have one dimension");
        let queries = queries.as_standard_layout();
        arithmetic::products(queries.view(), self.weights.view()).mapv(f64::from) + &self.bias
    }

    /// The probability of each category for m queries (m × d): m × C, each row adding up to 1. Cost O(m C d).
    pub fn probabilities(&self, queries: ArrayView2<f32>) -> Array2<f64> {
        let mut logits = self.logits(queries);
        for mut row in logits.outer_iter_mut() {
            let probabilities = arithmetic::softmax(row.view());
            row.assign(&probabilities);
        }
        logits
    }

    /// The same head with its logits multiplied by `factor`.
    pub(crate) fn scaled(mut self, factor: f64) -> Self {
        self.weights.mapv_inplace(|w| (f64::from(w) * factor) as f32);
        self.bias *= factor;
        self
    }

    /// The same head with these numbers (C) added to its logits.
    pub(crate) fn shifted(mut self, by: &Array1<f64>) -> Self {
        self.bias += by;
        self
    }

    /// The weighted sum of heads: logits are mixed in the same shares.
    pub(crate) fn mixed<'a>(parts: impl IntoIterator<Item = (&'a Head, f64)>) -> Option<Self> {
        let mut parts = parts.into_iter();
        let (first, share) = parts.next()?;
        let mut weights = first.weights.mapv(|w| f64::from(w) * share);
        let mut bias = first.bias.mapv(|b| b * share);
        for (head, share) in parts {
            ndarray::Zip::from(&mut weights).and(&head.weights).for_each(|sum, &w| *sum += share * f64::from(w));
            bias.scaled_add(share, &head.bias);
        }
        Some(Self { weights: weights.mapv(|w| w as f32), bias })
    }
}
