//! All learners together, weighed by how well each does on the examples themselves.
//!
//! The heads are linear, so a mix of their calibrated logits is one head again. The shares are the ones, in steps of a
//! tenth, with the least leave-one-out log loss, held near the prior's preference as if that had been seen on a few
//! examples; with one example a category there is no leave-one-out and the preference alone decides.
//!
//! Cost: the sum of the members' and O(66 n C) exponentials.

use super::{Learned, LeftOut, Recipe, calibrate, log_loss};
use crate::{head::Head, prior::Prior, support::Support};

/// Up to this n³ C the gradient learner takes part: judging it costs some ten times as much, and with that many examples
/// ridge is not behind.
const GRADIENT_LIMIT: usize = 5_000_000;

/// Shares are multiples of one in this many.
const GRAIN: usize = 10;

/// The learner that mixes the others.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Auto<'a> {
    /// The preference between the members, and their own settings.
    pub prior: &'a Prior,
}

impl Auto<'_> {
    /// Learned and calibrated, with what it takes to fit the same mix to other examples.
    pub(super) fn judge(&self, support: &Support) -> (Learned, Vec<Recipe>) {
        type Judge = fn(&Prior, &Support) -> (Learned, Recipe);
        let mut judges: Vec<Judge> = vec![Recipe::prototype, Recipe::ridge];
        if support.len().pow(3) * support.categories() <= GRADIENT_LIMIT {
            judges.push(Recipe::gradient);
        }
        let (members, recipes): (Vec<_>, Vec<_>) = judges.into_iter().map(|judge| judge(self.prior, support)).unzip();
        let shares = self.shares(&members, support);
        let head = Head::mixed(members.iter().map(|m| &m.head).zip(shares.iter().copied())).expect("there are members");
        let (learned, factor) = calibrate(Learned { head, left_out: mix(&members, &shares) }, support, 1.0);
        let recipes = recipes.into_iter().zip(shares).map(|(recipe, share)| recipe.scaled(share * factor)).collect();
        (learned, recipes)
    }
}

impl Auto<'_> {
    fn shares(&self, members: &[Learned], support: &Support) -> Vec<f64> {
        let preference = &self.prior.preference(support)[..members.len()];
        let whole: f64 = preference.iter().sum();
        let preference: Vec<f64> = preference.iter().map(|share| share / whole).collect();
        if members.iter().all(|m| m.left_out.known() == 0) {
            return preference;
        }
        let mut best = (f64::INFINITY, preference.clone());
        for shares in simplex(members.len()) {
            let (loss, _) = log_loss(&mix(members, &shares), support, 1.0);
            // A Dirichlet-like pull: distance from the preference costs as so many examples' evidence would.
            let distance: f64 = shares.iter().zip(&preference).map(|(s, p)| (s - p).powi(2)).sum();
            let objective = loss + self.prior.preference_weight * distance;
            if objective < best.0 {
                best = (objective, shares);
            }
        }
        best.1
    }
}

/// Every way to share one among so many members in whole grains.
fn simplex(members: usize) -> Vec<Vec<f64>> {
    let mut ways = vec![(Vec::new(), GRAIN)];
    for _ in 1..members {
        let grow = |(way, rest): (Vec<usize>, usize)| {
            (0..=rest).map(move |k| ([&way[..], &[k]].concat(), rest - k)).collect::<Vec<_>>()
        };
        ways = ways.into_iter().flat_map(grow).collect();
    }
    let share = |k: usize| k as f64 / GRAIN as f64;
    ways.into_iter().map(|(way, rest)| way.into_iter().chain([rest]).map(share).collect()).collect()
}

/// Leave-one-out logits in the given shares, for examples that every member could judge.
fn mix(members: &[Learned], shares: &[f64]) -> LeftOut {
    let mut mixed = members[0].left_out.clone().scaled(shares[0]);
    for (member, &share) in members.iter().zip(shares).skip(1) {
        mixed.logits.scaled_add(share, &member.left_out.logits);
        mixed.known.iter_mut().zip(&member.left_out.known).for_each(|(known, &also)| *known &= also);
    }
    mixed
}
