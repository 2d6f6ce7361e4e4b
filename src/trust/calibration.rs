//! Do probabilities keep their word?
//!
//! Expected calibration error: items are put into ten bins of equal width by the probability of their first choice; in each
//! the mean probability is held against the share that was right; the differences are averaged with the bins' shares (Naeini,
//! Cooper, Hauskrecht 2015; Guo et al. 2017, arXiv:1706.04599). Brier score: the squared distance between the probabilities and
//! the truth, summed over the categories, 0 to 2 (Brier 1950). Log loss in nats. Cost O(n C).

use ndarray::ArrayView1;
use serde::Serialize;

/// Bins of the expected calibration error.
const BINS: usize = 10;

/// A certain mistake costs this probability's log loss, not infinity.
const LEAST_PROBABILITY: f64 = 1e-6;

/// How far probabilities can be taken at their word.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
#[serde(rename_all = "camelCase")]
pub struct Calibration {
    /// Expected calibration error, 0 to 1.
    pub error: f64,
    /// Brier score, 0 to 2.
    pub brier: f64,
    /// Log loss in nats.
    pub log_loss: f64,
}

/// Of items with their true category and probabilities; `None` of no item.
pub fn calibration<'a>(items: impl IntoIterator<Item = (usize, ArrayView1<'a, f64>)>) -> Option<Calibration> {
    let mut bins = [(0.0, 0.0); BINS];
    let (mut brier, mut log_loss, mut count) = (0.0, 0.0, 0.0);
    for (label, probabilities) in items {
        let (first, top) = super::first(probabilities)?;
        let bin = &mut bins[((top * BINS as f64) as usize).min(BINS - 1)];
        bin.0 += top;
        bin.1 += f64::from(u8::from(first == label));
        let square: f64 = probabilities.iter().map(|p| p * p).sum();
        brier += square - 2.0 * probabilities[label] + 1.0;
        log_loss -= libm::log(probabilities[label].max(LEAST_PROBABILITY));
        count += 1.0;
    }
    if count == 0.0 {
        return None;
    }
    let error = bins.iter().map(|(sum, right)| (sum - right).abs()).sum::<f64>() / count;
    Some(Calibration { error, brier: brier / count, log_loss: log_loss / count })
}
