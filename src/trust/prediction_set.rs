//! Plausible trays: those that can't be ruled out at the chosen confidence.
//!
//! A tray is plausible for an item if its probability is not below what the examples, each judged by the others, gave their own
//! tray in all but the share 1 − confidence of cases (split by category once one has 2/(1 − confidence) examples that could be
//! judged, so that the confidence then holds tray by tray). The set may be empty: then even the first choice is less
//! probable than is usual, and the item may be something new.
//!
//! What holds: if further items are drawn like the examples, the set holds the right tray about as often as the confidence says,
//! on average over piles. No bound holds whatever the data: leave-one-out scores come from heads that had one example less than the
//! one that judges the item, which makes the sets a little too large with few examples (the jackknife of Barber, Candès, Ramdas,
//! Tibshirani 2021, arXiv:1905.02928, whose jackknife+ and the cross-conformal sets of Vovk 2015 are never below 1 − 2α).
//! Examples that were asked for because they cover the pile are not a random draw; they are harder than most, which makes the
//! sets larger still.
//!
//! While few examples could be judged, the sets lean on the probabilities themselves: as if [`PRIOR_WORTH`] items of the pile had
//! been judged and came out exactly as probable as said. Cost O(n C + m C log m).

use ndarray::ArrayView1;

use super::evidence::{Evidence, lower_quantile};

/// How many judged examples the probabilities' own word is worth.
const PRIOR_WORTH: f64 = 16.0;

/// The least probability at which each category is plausible.
#[derive(Debug, Clone, PartialEq)]
pub struct PredictionSets {
    least: Vec<f64>,
}

impl PredictionSets {
    /// Learns the thresholds for a confidence (0 to 1) from what the examples say of each other and from the probabilities of
    /// the items of the pile.
    pub fn new<'a>(evidence: &Evidence, pile: impl IntoIterator<Item = ArrayView1<'a, f64>>, confidence: f64) -> Self {
        let alpha = 1.0 - confidence;
        let mut own: Vec<Vec<f64>> = vec![Vec::new(); evidence.categories()];
        for (_, label, probabilities) in evidence.judged() {
            own[label].push(probabilities[label]);
        }
        let pooled = Weighted::new(own.iter().flatten().copied(), pile).threshold(alpha);
        let enough = 2.0 / alpha - 1e-9;
        let least = own
            .into_iter()
            .map(|mut own| {
                own.sort_by(f64::total_cmp);
                if own.len() as f64 >= enough { lower_quantile(&own, alpha).unwrap_or(0.0) } else { pooled }
            })
            .collect();
        Self { least }
    }

    /// The plausible categories, most probable first.
    pub fn plausible(&self, probabilities: ArrayView1<f64>) -> Vec<usize> {
        let mut set: Vec<usize> =
            (0..self.least.len()).filter(|&category| probabilities[category] >= self.least[category]).collect();
        set.sort_by(|&a, &b| probabilities[b].total_cmp(&probabilities[a]));
        set
    }

    /// The least probability at which a category is plausible.
    pub fn least(&self, category: usize) -> f64 {
        self.least[category]
    }
}

/// Probabilities of the right category, each with its weight.
struct Weighted(Vec<(f64, f64)>);

impl Weighted {
    fn new<'a>(judged: impl Iterator<Item = f64>, pile: impl IntoIterator<Item = ArrayView1<'a, f64>>) -> Self {
        let mut values: Vec<(f64, f64)> = judged.map(|value| (value, 1.0)).collect();
        let judged = values.len();
        for row in pile {
            // Were the probabilities exact, each category would be the right one as often as its own says.
            values.extend(row.iter().map(|&p| (p, p)));
        }
        let said: f64 = values[judged..].iter().map(|(_, weight)| weight).sum();
        values[judged..].iter_mut().for_each(|(_, weight)| *weight *= PRIOR_WORTH / said.max(1e-12));
        values.sort_by(|a, b| a.0.total_cmp(&b.0));
        Self(values)
    }

    /// The value below which the share `alpha` of the weight lies. As far as the threshold rests on the probabilities' own word, half
    /// a judged item more is reckoned to lie below everything.
    fn threshold(&self, alpha: f64) -> f64 {
        let whole: f64 = self.0.iter().map(|(_, weight)| weight).sum();
        let goal = alpha * whole - 0.5 * PRIOR_WORTH / whole.max(PRIOR_WORTH);
        let mut below = 0.0;
        for &(value, weight) in &self.0 {
            if below + weight > goal {
                return if goal < 0.0 { 0.0 } else { value };
            }
            below += weight;
        }
        self.0.last().map_or(0.0, |&(value, _)| value)
    }
}
