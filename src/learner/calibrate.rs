//! One number that makes a head's probabilities fit: the temperature.
//!
//! Logits are multiplied by the factor t that minimises the leave-one-out log loss, held near the prior's own guess while
//! there is little evidence: Σ_i −log p_i(t) + (log t/t₀)²/(2σ²). Temperature scaling: Guo et al. 2017 (arXiv:1706.04599).
//! Cost O(n C) a trial, 40 trials.

use super::{Learned, LeftOut};
use crate::{arithmetic, prior::TEMPERATURE_SPREAD, support::Support};

/// The summed log loss of leave-one-out logits times `factor`, and how many examples it is summed over.
///
/// Each category weighs the same, however many examples it has, so that probabilities fit an even pile.
pub fn log_loss(left_out: &LeftOut, support: &Support, factor: f64) -> (f64, usize) {
    let mut judged = vec![0_usize; support.categories()];
    left_out.iter().for_each(|(example, _)| judged[support.labels()[example]] += 1);
    let mut sum = 0.0;
    let mut weight_sum = 0.0;
    let mut known = 0;
    for (example, logits) in left_out.iter() {
        let label = support.labels()[example];
        let weight = 1.0 / judged[label] as f64;
        let scaled = logits.mapv(|x| x * factor);
        sum += weight * (arithmetic::log_sum_exp(scaled.view()) - scaled[label]);
        weight_sum += weight;
        known += 1;
    }
    if known == 0 { (0.0, 0) } else { (sum / weight_sum * known as f64, known) }
}

/// Scales a learned head to the temperature that fits its leave-one-out logits, starting from `guess`; and the factor.
pub fn calibrate(learned: Learned, support: &Support, guess: f64) -> (Learned, f64) {
    let factor = temperature(&learned.left_out, support, guess);
    (Learned { head: learned.head.scaled(factor), left_out: learned.left_out.scaled(factor) }, factor)
}

/// The factor itself, between `guess`/20 and 20 · `guess`.
pub(super) fn temperature(left_out: &LeftOut, support: &Support, guess: f64) -> f64 {
    if left_out.known() == 0 {
        return guess;
    }
    let objective = |log_ratio: f64| {
        let pull = (log_ratio / TEMPERATURE_SPREAD).powi(2) / 2.0;
        log_loss(left_out, support, guess * libm::exp(log_ratio)).0 + pull
    };
    // Convex in t and smooth in log t with one minimum in practice; golden section needs no derivative.
    let (mut low, mut high) = (-3.0, 3.0);
    let golden = (5.0_f64.sqrt() - 1.0) / 2.0;
    let mut inner_low = high - golden * (high - low);
    let mut inner_high = low + golden * (high - low);
    let (mut at_low, mut at_high) = (objective(inner_low), objective(inner_high));
    for _ in 0..24 {
        if at_low <= at_high {
            high = inner_high;
            (inner_high, at_high) = (inner_low, at_low);
            inner_low = high - golden * (high - low);
            at_low = objective(inner_low);
        } else {
            low = inner_low;
            (inner_low, at_low) = (inner_high, at_high);
            inner_high = low + golden * (high - low);
            at_high = objective(inner_high);
        }
    }
    guess * libm::exp((low + high) / 2.0)
}
