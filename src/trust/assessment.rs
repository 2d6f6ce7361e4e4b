//! How well the examples so far sort each other, and what that promises.

use ndarray::ArrayView1;
use serde::Serialize;

use super::{
    calibration::{Calibration, calibration},
    evidence::Evidence,
    first,
    interval::{Interval, clopper_pearson, wilson},
    learning_curve::LearningCurve,
};

/// The confidence of every interval of an assessment.
pub const CONFIDENCE: f64 = 0.95;

/// So many of so many, with its 95 % intervals.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
#[serde(rename_all = "camelCase")]
pub struct Share {
    /// How many were right.
    pub right: usize,
    /// How many were judged.
    pub judged: usize,
    /// The share itself; `None` if nothing was judged.
    pub value: Option<f64>,
    /// Wilson's interval, to look at.
    pub wilson: Interval,
    /// Clopper and Pearson's interval, to promise by.
    pub exact: Interval,
}

impl Share {
    fn of(right: usize, judged: usize) -> Self {
        Self {
            right,
            judged,
            value: (judged > 0).then(|| right as f64 / judged as f64),
            wilson: wilson(right, judged, CONFIDENCE),
            exact: clopper_pearson(right, judged, CONFIDENCE),
        }
    }
}

/// One category's part.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "camelCase")]
pub struct TrayAssessment {
    /// The tray.
    pub tray: usize,
    /// How many answers it has; with a single one nothing can be known of it yet.
    pub answers: usize,
    /// How many of its answers the others put into it.
    pub share: Share,
}

/// Answers of one tray that the others put into another.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
#[serde(rename_all = "camelCase")]
pub struct Confusion {
    /// The tray that the person named.
    pub tray: usize,
    /// The tray that the other answers speak for.
    pub taken_for: usize,
    /// The items.
    pub items: Vec<usize>,
}

/// What can be said of a sorting from its answers alone: each is judged by the others.
///
/// The judged answers are as hard as items that were asked about: usually harder than the rest of the pile, so the rest is
/// sorted better than this says, as far as it holds nothing but what the trays are for.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "camelCase")]
pub struct Assessment {
    /// How many answers there are.
    pub answers: usize,
    /// How many of those that could be judged are right.
    pub share: Share,
    /// The same by tray.
    pub trays: Vec<TrayAssessment>,
    /// What is confused with what, the most frequent first.
    pub confusions: Vec<Confusion>,
    /// Whether the probabilities keep their word; `None` if nothing could be judged.
    pub calibration: Option<Calibration>,
    /// Trays with a single answer, of which nothing can be known yet.
    pub unknown: Vec<usize>,
    /// Accuracy by answers a tray, and how many more would do; `None` while no tray has three.
    pub curve: Option<LearningCurve>,
}

impl Assessment {
    /// Of examples with the tray of each category and the item of each example. Cost O(n C).
    pub fn new(evidence: &Evidence, trays: &[usize], items: &[usize], curve: Option<LearningCurve>) -> Self {
        let categories = evidence.categories();
        let (mut judged, mut right) = (vec![0; categories], vec![0; categories]);
        let mut confusions: Vec<Confusion> = Vec::new();
        for (example, label, probabilities) in evidence.judged() {
            let Some((taken_for, _)) = first(probabilities) else { continue };
            judged[label] += 1;
            if taken_for == label {
                right[label] += 1;
                continue;
            }
            let (tray, taken_for) = (trays[label], trays[taken_for]);
            match confusions.iter_mut().find(|pair| pair.tray == tray && pair.taken_for == taken_for) {
                Some(pair) => pair.items.push(items[example]),
                None => confusions.push(Confusion { tray, taken_for, items: vec![items[example]] }),
            }
        }
        confusions.sort_by_key(|pair| std::cmp::Reverse(pair.items.len()));
        let rows = evidence.judged().map(|(_, label, row): (usize, usize, ArrayView1<f64>)| (label, row));
        Self {
            answers: evidence.len(),
            share: Share::of(right.iter().sum(), judged.iter().sum()),
            trays: (0..categories)
                .map(|c| TrayAssessment {
                    tray: trays[c],
                    answers: evidence.counts()[c],
                    share: Share::of(right[c], judged[c]),
                })
                .collect(),
            confusions,
            calibration: calibration(rows),
            unknown: (0..categories).filter(|&c| evidence.counts()[c] == 1).map(|c| trays[c]).collect(),
            curve,
        }
    }
}
