//! The prior: what is known before the first example of a new task.
//!
//! Its default values are a compromise, chosen by eye on drawn icons (the names that are not held out for testing), stamps
//! and digits at 5, 10 and 20 ways and 1 to 5 shots. `pkg-scripts/bench accuracy` prints what they reach; of its sets only
//! the held-out icons had no say in them.

use serde::{Deserialize, Serialize};

use crate::{
    learner::{Gradient, Prototype, Ridge},
    support::Support,
};

/// Settings that learners start from.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Prior {
    /// How many examples the common mean counts for when prototypes are drawn toward it (κ ≥ 0).
    pub shrinkage: f64,
    /// The ridge learner's strength λ > 0 before there is evidence.
    pub ridge_strength: f64,
    /// The factor on squared distances at the gradient learner's start and in the prototype learner before there is
    /// evidence; `None` follows the number of examples a category.
    pub start_temperature: Option<f64>,
    /// The gradient learner's step size.
    pub step_size: f64,
    /// How many steps the gradient learner takes (at most 20).
    pub steps: usize,
    /// How much of the pile's centre is known beyond the examples themselves, 0 to 1. Nearest prototypes need it.
    pub centre_known: f64,
    /// How strongly the mix of learners is held to the preference, in nats for a share of 1 too much.
    pub preference_weight: f64,
}

impl Default for Prior {
    fn default() -> Self {
        Self {
            shrinkage: 0.0,
            ridge_strength: 0.1,
            start_temperature: None,
            step_size: 20.0,
            steps: 10,
            centre_known: 0.0,
            preference_weight: 20.0,
        }
    }
}

/// How sure a temperature before there is evidence is: the standard deviation of its logarithm.
pub(crate) const TEMPERATURE_SPREAD: f64 = 0.35;

impl Prior {
    pub(crate) fn prototype(&self) -> Prototype {
        Prototype { shrinkage: self.shrinkage }
    }

    pub(crate) fn ridge(&self) -> Ridge<'_> {
        Ridge { prior: self }
    }

    pub(crate) fn gradient(&self) -> Gradient<'_> {
        Gradient { prior: self }
    }

    /// The shares of prototype, ridge and gradient in the mix before there is evidence; they add up to 1.
    ///
    /// Seen from the centre of an even pile, nearest prototypes are best at one example a category; seen from that of an
    /// uneven one, which lies aside, or with more examples, ridge is.
    pub(crate) fn preference(&self, support: &Support) -> [f64; 3] {
        let shot = support.shot();
        let gradient = 0.1 * (1.0 - 1.0 / shot);
        let prototype = 0.1 * (1.0 - 1.0 / shot) + 0.5 * self.centre_known / (shot * shot);
        [prototype, 1.0 - prototype - gradient, gradient]
    }

    /// The factor that turns squared distances to prototypes into logits: distances between unit vectors shrink as
    /// prototypes become means of more examples, so it grows with the shot.
    pub(crate) fn prototype_temperature(&self, support: &Support) -> f64 {
        self.start_temperature.unwrap_or_else(|| 6.0 * libm::pow(support.shot(), 0.36))
    }

    /// The factor that turns ridge scores into logits.
    pub(crate) fn ridge_temperature(&self, support: &Support, strength: f64) -> f64 {
        10.5 * (1.0 + strength / support.shot().sqrt()) * libm::pow(support.categories() as f64 / 5.0, 0.1)
    }
}
