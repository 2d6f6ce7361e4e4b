//! Do probabilities keep their word?
//!
//! Expected calibration error: items are put into ten bins of equal width by the probability of their first choice; in each
//! the mean probability is held against the share that was right; the differences are averaged with the bins' shares (Naeini,
//! Cooper, Hauskrecht 2015; Guo et al. 2017, arXiv:1706.04599). Brier score: the squared distance between the probabilities and
//! the truth, summed over the categories, 0 to 2 (Brier 1950). Log loss in nats. Cost O(n C).

use ndarray::ArrayView1;
use serde::Serialize;

use super::{
    assessment::CONFIDENCE,
    interval::{Interval, wilson},
};

/// Bins of the expected calibration error.
const BINS: usize = 10;

/// A certain mistake costs this probability's log loss, not infinity.
const LEAST_PROBABILITY: f64 = 1e-6;

/// Items whose first choice is about as probable: what was said of them and what came out.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Bin {
    /// From this probability on.
    pub from: f64,
    /// Up to this one.
    pub to: f64,
    /// How many items there are in it.
    pub items: usize,
    /// Their mean probability.
    pub said: f64,
    /// The share of them that was right.
    pub right: f64,
    /// Wilson's 95 % interval of that share.
    pub wilson: Interval,
}

/// How far probabilities can be taken at their word.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "camelCase")]
pub struct Calibration {
    /// Expected calibration error, 0 to 1.
    pub error: f64,
    /// Brier score, 0 to 2.
    pub brier: f64,
    /// Log loss in nats.
    pub log_loss: f64,
    /// The bins that hold an item, by probability.
    pub bins: Vec<Bin>,
}

/// Of items with their true category and probabilities; `None` of no item.
pub fn calibration<'a>(items: impl IntoIterator<Item = (usize, ArrayView1<'a, f64>)>) -> Option<Calibration> {
    let mut bins = [(0.0, 0_usize, 0_usize); BINS];
    let (mut brier, mut log_loss, mut count) = (0.0, 0.0, 0.0);
    for (label, probabilities) in items {
        let (first, top) = super::first(probabilities)?;
        let bin = &mut bins[((top * BINS as f64) as usize).min(BINS - 1)];
        bin.0 += top;
        bin.1 += usize::from(first == label);
        bin.2 += 1;
        let square: f64 = probabilities.iter().map(|p| p * p).sum();
        brier += square - 2.0 * probabilities[label] + 1.0;
        log_loss -= libm::log(probabilities[label].max(LEAST_PROBABILITY));
        count += 1.0;
    }
    if count == 0.0 {
        return None;
    }
    let error = bins.iter().map(|&(sum, right, _)| (sum - right as f64).abs()).sum::<f64>() / count;
    let bins = bins
        .iter()
        .enumerate()
        .filter(|(_, bin)| bin.2 > 0)
        .map(|(place, &(sum, right, items))| Bin {
            from: place as f64 / BINS as f64,
            to: (place + 1) as f64 / BINS as f64,
            items,
            said: sum / items as f64,
            right: right as f64 / items as f64,
            wilson: wilson(right, items, CONFIDENCE),
        })
        .collect();
    Some(Calibration { error, brier: brier / count, log_loss: log_loss / count, bins })
}
