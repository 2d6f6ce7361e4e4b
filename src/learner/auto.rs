//! All learners together, weighed by how well each does on the examples themselves.
//!
//! The heads are linear, so a mix of their calibrated logits is one head again. The shares are the ones, in steps of a
//! tenth, with the least leave-one-out log loss, held near the prior's preference as if that had been seen on a few
//! examples; with one example a category there is no leave-one-out and the preference alone decides.
//!
//! Cost: the sum of the members' and O(66 n C) exponentials.

use super::{Learned, LeftOut, Recipe, calibrate, log_loss};
use crate::{head::Head, prior::Prior, support::Support};

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
        let judged = [Recipe::prototype, Recipe::ridge, Recipe::gradient].map(|judge| judge(self.prior, support));
        let recipes = judged.each_ref().map(|(_, recipe)| recipe.clone());
        let members = judged.map(|(learned, _)| learned);
        let shares = self.shares(&members, support);
        let head = Head::mixed(members.iter().map(|m| &m.head).zip(shares)).expect("there are members");
        let (learned, factor) = calibrate(Learned { head, left_out: mix(&members, &shares) }, support, 1.0);
        let recipes = recipes.into_iter().zip(shares).map(|(recipe, share)| recipe.scaled(share * factor)).collect();
        (learned, recipes)
    }
}

impl Auto<'_> {
    fn shares(&self, members: &[Learned; 3], support: &Support) -> [f64; 3] {
        let preference = self.prior.preference(support);
        if members.iter().all(|m| m.left_out.known() == 0) {
            return preference;
        }
        let mut best = (f64::INFINITY, preference);
        for shares in simplex() {
            let (loss, _) = log_loss(&mix(members, &shares), support, 1.0);
            // A Dirichlet-like pull: distance from the preference costs as so many examples' evidence would.
            let distance: f64 = shares.iter().zip(preference).map(|(s, p)| (s - p).powi(2)).sum();
            let objective = loss + self.prior.preference_weight * distance;
            if objective < best.0 {
                best = (objective, shares);
            }
        }
        best.1
    }
}

fn simplex() -> impl Iterator<Item = [f64; 3]> {
    let share = |k: usize| k as f64 / GRAIN as f64;
    (0..=GRAIN).flat_map(move |a| (0..=GRAIN - a).map(move |b| [share(a), share(b), share(GRAIN - a - b)]))
}

/// Leave-one-out logits in the given shares, for examples that every member could judge.
fn mix(members: &[Learned; 3], shares: &[f64; 3]) -> LeftOut {
    let [first, rest @ ..] = members;
    let mut mixed = first.left_out.clone().scaled(shares[0]);
    for (member, &share) in rest.iter().zip(&shares[1..]) {
        mixed.logits.scaled_add(share, &member.left_out.logits);
        mixed.known.iter_mut().zip(&member.left_out.known).for_each(|(known, &also)| *known &= also);
    }
    mixed
}
