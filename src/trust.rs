//! How far a sorting can be relied on: what is plausible for an item, what is unlike anything shown, how well the answers sort
//! each other, which of them are doubtful, and what a random sample shows.
//!
//! | module | what it computes |
//! | --- | --- |
//! | [`evidence`] | what the answers say of each other |
//! | [`prediction_set`] | the trays that can't be ruled out |
//! | [`novelty`] | how much an item is like something shown, and what is too little |
//! | [`calibration`] | whether probabilities keep their word |
//! | [`assessment`] | accuracy with its intervals, by tray and by confusion |
//! | [`learning_curve`] | how accuracy grows, and how many more answers a target takes |
//! | [`doubt`] | answers that the others contradict |
//! | [`interval`] | intervals for counted shares |
//! | [`spot_check`] | the random sample that backs a stated error rate |
//!
//! Only the spot check is a promise about the pile at hand, whatever the pile is. All else is learned from the answers and holds as far
//! as further items are like them.

pub mod assessment;
pub mod calibration;
pub mod doubt;
pub mod evidence;
pub mod interval;
pub mod learning_curve;
pub mod novelty;
pub mod prediction_set;
pub mod spot_check;

use ndarray::ArrayView1;
use serde::{Deserialize, Serialize};

use crate::error::{Error, Result};

/// What the person asks of the sorter's care.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "camelCase")]
pub struct Terms {
    confidence: f64,
    set_aside_share: f64,
    only_sure: bool,
}

impl Default for Terms {
    fn default() -> Self {
        Self { confidence: 0.9, set_aside_share: 0.05, only_sure: false }
    }
}

impl Terms {
    /// Plausible trays at this `confidence` (at least 0.5, below 1); about the share `set_aside_share` (0 to 0.5) of the items
    /// that do belong in a tray may be set aside for being unlike anything shown; `only_sure` also sets aside every item that
    /// has not exactly one plausible tray.
    pub fn new(confidence: f64, set_aside_share: f64, only_sure: bool) -> Result<Self> {
        if !(0.5..1.0).contains(&confidence) {
            return Err(Error::Terms(format!("the confidence must be at least 0.5 and below 1, and is {confidence}")));
        }
        if !(0.0..=0.5).contains(&set_aside_share) {
            return Err(Error::Terms(format!(
                "the share that may be set aside must be from 0 to 0.5, and is {set_aside_share}"
            )));
        }
        Ok(Self { confidence, set_aside_share, only_sure })
    }

    /// The confidence of plausible sets.
    pub fn confidence(&self) -> f64 {
        self.confidence
    }

    /// The share of known items that may be set aside.
    pub fn set_aside_share(&self) -> f64 {
        self.set_aside_share
    }

    /// Whether only items with exactly one plausible tray are sorted.
    pub fn only_sure(&self) -> bool {
        self.only_sure
    }
}

/// Why an item is set aside.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Reason {
    /// It is unlike anything shown.
    Unlike,
    /// More than one tray is plausible.
    Between,
    /// What it is most like has a single answer, or nothing can be ruled out.
    TooLittle,
}

impl Reason {
    /// The reason in words, as in a table.
    pub fn words(self) -> &'static str {
        match self {
            Self::Unlike => "unlike anything shown",
            Self::Between => "between trays",
            Self::TooLittle => "too little to judge by",
        }
    }
}

/// The most probable category, the first of equals, with its probability.
pub(crate) fn first(probabilities: ArrayView1<f64>) -> Option<(usize, f64)> {
    let category = crate::arithmetic::arg_max(probabilities)?;
    Some((category, probabilities[category]))
}
