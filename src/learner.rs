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
pub use gradient::{Descent, Gradient, Groups, Step};
pub(crate) use gradient::{Start, centred, errors, kernels, middle};
use prototype::Decided;
pub use prototype::Prototype;
pub use ridge::Ridge;

use crate::{arithmetic::Cholesky, head::Head, prior::Prior, support::Support};

/// Up to this many examples, or two of each category, every one is judged by leaving it out.
pub const JUDGED_LIMIT: usize = 200;

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

    /// The same for the examples with these numbers among `examples`; the others are unknown.
    fn placed(&self, members: &[usize], examples: usize) -> Self {
        let mut placed = Self::unknown(examples, self.logits.ncols());
        for (position, &example) in members.iter().enumerate() {
            if let Some(logits) = self.get(position) {
                placed.set(example, &logits.to_owned());
            }
        }
        placed
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
    ///
    /// Beyond [`JUDGED_LIMIT`] examples a spread-out part of about that size decides on everything that leave-one-out
    /// decides, and the head is then fitted to all of them; only the gradient learner keeps to the part.
    pub fn learn(self, support: &Support, prior: &Prior) -> Learned {
        with_shares(self.learn_fairly(support, prior), support, prior.counts_as_shares)
    }

    /// The same, to an item of each category as good as to one of any other.
    fn learn_fairly(self, support: &Support, prior: &Prior) -> Learned {
        let limit = JUDGED_LIMIT.max(2 * support.categories());
        if support.len() <= limit {
            return self.judge(support, prior).0;
        }
        let (part, members) = support.spread(limit);
        let (judged, recipes) = self.judge(&part, prior);
        let heads: Vec<Head> = recipes.into_iter().map(|recipe| recipe.fit(prior, &part, support)).collect();
        let head = Head::mixed(heads.iter().map(|head| (head, 1.0))).expect("every kind has a recipe");
        Learned { head, left_out: judged.left_out.placed(&members, support.len()) }
    }

    fn judge(self, support: &Support, prior: &Prior) -> (Learned, Vec<Recipe>) {
        let (learned, recipe) = match self {
            Self::Auto => return Auto { prior }.judge(support),
            Self::Prototype => Recipe::prototype(prior, support),
            Self::Ridge => Recipe::ridge(prior, support),
            Self::Gradient => Recipe::gradient(prior, support),
        };
        (learned, vec![recipe])
    }
}

/// Adds what counts say of shares: the log of each category's count, beside the mean, times `trust`. An example left out
/// still counts, lest its own category seem rarer for it.
fn with_shares(learned: Learned, support: &Support, trust: f64) -> Learned {
    let log_shares: Array1<f64> =
        support.counts().iter().map(|&count| trust * libm::log(count as f64 / support.shot())).collect();
    let Learned { head, mut left_out } = learned;
    left_out.logits += &log_shares;
    Learned { head: head.shifted(&log_shares), left_out }
}

/// Factors a matrix that is positive definite but for the rounding of f32 products.
fn positive_definite(matrix: Array2<f64>) -> Cholesky {
    let largest = matrix.diag().iter().copied().fold(1e-30, f64::max);
    let mut lift = 0.0;
    loop {
        let mut lifted = matrix.clone();
        lifted.diag_mut().mapv_inplace(|x| x + lift);
        if let Some(factor) = Cholesky::new(lifted) {
            return factor;
        }
        // Finite numbers: a lift above the rounding error must come, and soon.
        lift = if lift == 0.0 { 1e-7 * largest } else { 10.0 * lift };
    }
}

/// What leave-one-out decided about a learner: enough to fit it to more examples without judging again.
#[derive(Debug, Clone)]
enum Recipe {
    Prototype { decided: Decided, factor: f64 },
    Ridge { strength: f64, factor: f64 },
    Gradient { head: Head },
}

impl Recipe {
    fn prototype(prior: &Prior, support: &Support) -> (Learned, Self) {
        let (learned, decided) = Prototype::learn_chosen(prior, support);
        let (learned, factor) = calibrate(learned, support, prior.prototype_factor(support));
        (learned, Self::Prototype { decided, factor })
    }

    fn ridge(prior: &Prior, support: &Support) -> (Learned, Self) {
        let (learned, strength) = prior.ridge().learn_with_strength(support);
        let (learned, factor) = calibrate(learned, support, prior.ridge_factor(support, strength));
        (learned, Self::Ridge { strength, factor })
    }

    fn gradient(prior: &Prior, support: &Support) -> (Learned, Self) {
        let (learned, _) = calibrate(prior.gradient().learn(support), support, 1.0);
        let head = learned.head.clone();
        (learned, Self::Gradient { head })
    }

    /// The same with logits multiplied by `by`.
    fn scaled(self, by: f64) -> Self {
        match self {
            Self::Prototype { decided, factor } => Self::Prototype { decided, factor: factor * by },
            Self::Ridge { strength, factor } => Self::Ridge { strength, factor: factor * by },
            Self::Gradient { head } => Self::Gradient { head: head.scaled(by) },
        }
    }

    /// Fits to all examples what was decided on a part of them.
    fn fit(self, prior: &Prior, part: &Support, support: &Support) -> Head {
        match self {
            Self::Prototype { decided: Decided { regularisation, variance }, factor } => {
                // Distances shrink as prototypes become means of more examples.
                let growth = prior.prototype_factor(support) / prior.prototype_factor(part);
                let prototype = Prototype { regularisation, ..prior.prototype(support) };
                prototype.fit_with(support, variance).scaled(factor * growth)
            }
            Self::Ridge { strength, factor } => Ridge::fit(support, strength).scaled(factor),
            Self::Gradient { head } => head,
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
