//! The prior: what is known before the first example of a new task.
//!
//! Its default values are a compromise, chosen by eye on drawn icons (the names that are not held out for testing), stamps
//! and digits at 5, 10 and 20 ways and 1 to 5 shots. `pkg-scripts/bench accuracy` prints what they reach; of its sets only
//! the held-out icons had no say in them. Past piles teach better ones ([`crate::meta::train`]).

use serde::{Deserialize, Serialize};

use crate::{
    learner::{Descent, Gradient, Prototype, Ridge},
    support::Support,
};

/// The numbers of examples a category at which [`ByShot`] has a value of its own.
pub const SHOTS: [usize; 4] = [1, 2, 5, 10];

/// A number that changes with the examples a category: its values at [`SHOTS`], in between by the logarithm of the
/// number of examples, beyond as at the ends.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(transparent)]
pub struct ByShot(pub [f64; SHOTS.len()]);

impl ByShot {
    /// The same at every shot.
    pub fn even(value: f64) -> Self {
        Self([value; SHOTS.len()])
    }

    /// The value at so many examples a category, on average.
    pub fn at(&self, shot: f64) -> f64 {
        let mut value = self.0[0];
        for (k, pair) in SHOTS.windows(2).enumerate() {
            let (from, to) = (pair[0] as f64, pair[1] as f64);
            let way = (libm::log(shot / from) / libm::log(to / from)).clamp(0.0, 1.0);
            value += way * (self.0[k + 1] - self.0[k]);
        }
        value
    }
}

/// Settings that learners start from.
#[derive(Debug, Clone, PartialEq)]
pub struct Prior {
    /// How many examples the common mean counts for when prototypes are drawn toward it (κ ≥ 0).
    pub shrinkage: f64,
    /// How much of an average direction's scatter within categories prototypes give every direction (ρ > 0), before there is
    /// evidence.
    pub regularisation: ByShot,
    /// The ridge learner's strength λ > 0 before there is evidence.
    pub ridge_strength: ByShot,
    /// What the usual factor on squared distances to prototypes is multiplied by.
    pub prototype_temperature: ByShot,
    /// What the usual factor on ridge scores is multiplied by.
    pub ridge_temperature: ByShot,
    /// Where the gradient learner starts and which steps it takes.
    pub descent: Descent,
    /// The shares of prototype, ridge and gradient in the mix before there is evidence; `None` is the usual preference.
    pub preference: Option<[ByShot; 3]>,
    /// How much of the pile's centre is known beyond the examples themselves, 0 to 1. Nearest prototypes need it.
    pub centre_known: f64,
    /// How far the examples' counts are taken for the categories' shares among items still to be sorted, 0 (not at all) to 1:
    /// categories get the logarithm of their count times this on their logits.
    pub counts_as_shares: f64,
    /// How strongly the mix of learners is held to the preference, in nats for a share of 1 too much.
    pub preference_weight: f64,
}

impl Default for Prior {
    fn default() -> Self {
        Self {
            shrinkage: 0.0,
            regularisation: ByShot::even(1.0),
            ridge_strength: ByShot([0.1, 0.1, 0.3, 0.5]),
            prototype_temperature: ByShot::even(1.0),
            ridge_temperature: ByShot::even(1.0),
            descent: Descent::even(10, 20.0, 2.0),
            preference: None,
            centre_known: 0.0,
            counts_as_shares: 0.5,
            preference_weight: 20.0,
        }
    }
}

/// How sure a temperature before there is evidence is: the standard deviation of its logarithm.
pub(crate) const TEMPERATURE_SPREAD: f64 = 0.35;

impl Prior {
    /// Nearest prototypes before there is evidence.
    pub(crate) fn prototype(&self, support: &Support) -> Prototype {
        Prototype { shrinkage: self.shrinkage, regularisation: self.regularisation.at(support.shot()) }
    }

    pub(crate) fn ridge(&self) -> Ridge<'_> {
        Ridge { prior: self }
    }

    pub(crate) fn gradient(&self) -> Gradient<'_> {
        Gradient { prior: self }
    }

    /// The shares of prototype, ridge and gradient in the mix before there is evidence; they add up to 1.
    ///
    /// With a metric of their own, from two examples a category on, prototypes are best on most piles, and least far behind on
    /// the others. With one they need the pile's centre, which lies aside where the pile is uneven; ridge stands by.
    pub(crate) fn preference(&self, support: &Support) -> [f64; 3] {
        self.preference_at(support.shot())
    }

    pub(crate) fn preference_at(&self, shot: f64) -> [f64; 3] {
        if let Some(learned) = &self.preference {
            return learned.each_ref().map(|share| share.at(shot));
        }
        let several = 1.0 - 1.0 / shot;
        let gradient = 0.05 * several;
        let prototype = (0.75 + 0.1 * self.centre_known) * several + 0.65 * self.centre_known * (1.0 - several);
        [prototype, 1.0 - prototype - gradient, gradient]
    }

    /// The factor that turns squared distances to prototypes into logits: distances between unit vectors shrink as
    /// prototypes become means of more examples, so it grows with the shot.
    pub(crate) fn prototype_factor(&self, support: &Support) -> f64 {
        self.prototype_temperature.at(support.shot()) * usual_prototype_factor(support.shot())
    }

    /// The factor that turns ridge scores into logits.
    pub(crate) fn ridge_factor(&self, support: &Support, strength: f64) -> f64 {
        let shot = support.shot();
        let usual = 10.5 * (1.0 + strength / shot.sqrt()) * libm::pow(support.categories() as f64 / 5.0, 0.1);
        self.ridge_temperature.at(shot) * usual
    }

    /// The ridge learner's strength before there is evidence.
    pub(crate) fn strength(&self, support: &Support) -> f64 {
        self.ridge_strength.at(support.shot())
    }
}

/// The factor on squared distances at so many examples a category, as far as nothing was learned.
pub fn usual_prototype_factor(shot: f64) -> f64 {
    6.0 * libm::pow(shot, 0.36)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn between_shots_by_the_logarithm() {
        let values = ByShot([1.0, 3.0, 2.0, 0.0]);
        for (shot, value) in
            [(0.5, 1.0), (1.0, 1.0), (2.0_f64.sqrt(), 2.0), (2.0, 3.0), (5.0, 2.0), (10.0, 0.0), (99.0, 0.0)]
        {
            assert!((values.at(shot) - value).abs() < 1e-12, "{shot}: {}", values.at(shot));
        }
    }
}
