//! Learners: from a support set to a head.
//!
//! Each learner is one file: what it computes, when to use it, its cost and its source. [`Auto`] looks at how well each
//! does on the examples themselves and mixes them.

mod auto;
mod calibrate;
mod gradient;
mod prototype;
mod ridge;

use std::str::FromStr;

use ndarray::{Array1, Array2};
use serde::{Deserialize, Serialize};

pub use auto::Auto;
pub use calibrate::{calibrate, log_loss};
pub use gradient::Gradient;
pub use prototype::Prototype;
pub use ridge::{DUAL_LIMIT, Ridge};

use crate::{head::Head, prior::Prior, support::Support};

/// Learns a head from examples.
pub trait Learner {
    /// Learns from the support set: a head, and what the same learner says of each example when that one is left out.
    fn learn(&self, support: &Support) -> Learned;
}

/// What a learner made of a support set.
#[derive(Debug, Clone)]
pub struct Learned {
    /// The head.
    pub head: Head,
    /// Leave-one-out logits of the examples.
    pub left_out: LeftOut,
}

/// Logits for each example from a head that never saw it.
#[derive(Debug, Clone)]
pub struct LeftOut {
    logits: Array2<f64>,
    known: Vec<bool>,
}

impl LeftOut {
    fn unknown(examples: usize, categories: usize) -> Self {
        Self { logits: Array2::zeros((examples, categories)), known: vec![false; examples] }
    }

    fn set(&mut self, example: usize, logits: &Array1<f64>) {
        self.logits.row_mut(example).assign(logits);
        self.known[example] = true;
    }

    /// The example's logits (C), or `None` where its category has no other example to judge by.
    pub fn get(&self, example: usize) -> Option<ndarray::ArrayView1<'_, f64>> {
        self.known[example].then(|| self.logits.row(example))
    }

    /// The examples that could be judged, with their logits.
    pub fn iter(&self) -> impl Iterator<Item = (usize, ndarray::ArrayView1<'_, f64>)> {
        (0..self.known.len()).filter_map(|i| Some((i, self.get(i)?)))
    }

    /// How many examples could be judged.
    pub fn known(&self) -> usize {
        self.known.iter().filter(|&&known| known).count()
    }

    fn scaled(mut self, factor: f64) -> Self {
        self.logits *= factor;
        self
    }
}

/// Which learner to use.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Default, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum LearnerKind {
    /// All of them, weighed by how well each does on the examples.
    #[default]
    Auto,
    /// Nearest category mean.
    Prototype,
    /// Ridge regression to the categories.
    Ridge,
    /// A few gradient steps from the prototypes.
    Gradient,
}

impl LearnerKind {
    /// Every kind, in the order of the documentation.
    pub const ALL: [Self; 4] = [Self::Auto, Self::Prototype, Self::Ridge, Self::Gradient];

    /// The kind's name as people write it.
    pub fn name(self) -> &'static str {
        match self {
            Self::Auto => "auto",
            Self::Prototype => "prototype",
            Self::Ridge => "ridge",
            Self::Gradient => "gradient",
        }
    }

    /// Learns with this kind of learner and calibrates the result: the head's probabilities are meant to be taken at
    /// their word.
    pub fn learn(self, support: &Support, prior: &Prior) -> Learned {
        match self {
            Self::Auto => Auto { prior }.learn(support),
            Self::Prototype => {
                calibrate(prior.prototype().learn(support), support, prior.prototype_temperature(support))
            }
            Self::Ridge => prior.ridge().calibrated(support),
            Self::Gradient => calibrate(prior.gradient().learn(support), support, 1.0),
        }
    }
}

impl FromStr for LearnerKind {
    type Err = String;

    fn from_str(name: &str) -> Result<Self, Self::Err> {
        Self::ALL
            .into_iter()
            .find(|kind| kind.name() == name)
            .ok_or_else(|| format!("there is no learner “{name}”; choose auto, prototype, ridge or gradient"))
    }
}
