//! How accuracy grows with answers, and about how many more would reach a target.
//!
//! Nearest category means, learned from 1, 2, … answers a category drawn at random from those there are, sort the rest; that
//! gives the shape of the curve for little, since everything follows from the inner products of the examples. Its level comes from the
//! leave-one-out accuracy of the sorter itself. Accuracy is taken to grow on a straight line in log-odds over the logarithm of the
//! answers a category: learning curves follow power laws (Cortes, Jackel, Solla, Vapnik, Denker 1993; Hestness et al. 2017,
//! arXiv:1712.00409), which such lines resemble while errors are few.
//!
//! The range of an answer count comes from the ends of the level's 95 % Wilson interval with slopes two standard errors flatter and
//! steeper; the slope is held near a guessed one, as if from one more curve. Cost O(draws · shots · n²).

use rand::{SeedableRng, seq::SliceRandom};
use rand_chacha::ChaCha8Rng;
use serde::Serialize;

use super::{
    assessment::{CONFIDENCE, Share},
    interval::wilson,
};
use crate::support::Support;

/// Random choices of examples for each number of them.
const DRAWS: u64 = 6;

/// The most different numbers of answers that are tried.
const MOST_SHOTS: usize = 6;

/// Slope of log-odds over the logarithm of answers, and how sure that is, before there is a curve: a guess that nobody has
/// measured yet.
const USUAL_SLOPE: (f64, f64) = (0.8, 0.25);

/// No projection goes beyond this many times the answers there are.
const FARTHEST: f64 = 30.0;

/// A point of the curve.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
#[serde(rename_all = "camelCase")]
pub struct Point {
    /// Answers a tray.
    pub shot: usize,
    /// Accuracy of nearest category means, 0 to 1.
    pub accuracy: f64,
    /// How many items were sorted for it, draws together.
    pub sorted: usize,
}

/// What is foreseen after more answers.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Foreseen {
    /// More answers in all.
    pub more: f64,
    /// Accuracy, 0 to 1: if everything is on the slow side, most likely, and at best.
    pub low: f64,
    /// The likeliest accuracy.
    pub likely: f64,
    /// The highest accuracy.
    pub high: f64,
}

/// How accuracy grows with answers.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "camelCase")]
pub struct LearningCurve {
    /// The measured shape.
    pub points: Vec<Point>,
    /// Answers a tray, on average, that the level belongs to.
    pub shot: f64,
    /// How many trays there are.
    pub trays: usize,
    /// Leave-one-out accuracy with 95 % ends: the level.
    pub level: [f64; 3],
    /// Slope of log-odds over the logarithm of answers: flattest, likeliest, steepest.
    pub slope: [f64; 3],
    /// What is foreseen, from now to four times the answers there are.
    pub ahead: Vec<Foreseen>,
}

/// About how many more answers it takes.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
#[serde(rename_all = "camelCase")]
pub struct Projection {
    /// The accuracy aimed at.
    pub target: f64,
    /// More answers in all, the least that may do.
    pub low: f64,
    /// The likeliest number; `None` where it lies too far beyond what was seen to be told.
    pub likely: Option<f64>,
    /// The number that does even if everything is on the slow side; `None` where that can't be told.
    pub high: Option<f64>,
}

impl LearningCurve {
    /// The curve of examples that sort each other this well; `None` while no category has three or nothing was judged.
    pub fn new(support: &Support, share: &Share, seed: u64) -> Option<Self> {
        let most = support.counts().iter().copied().max()?;
        if most < 3 || share.judged == 0 {
            return None;
        }
        let step = (most - 1).div_ceil(MOST_SHOTS);
        let points: Vec<Point> = (1..most).step_by(step).filter_map(|shot| point(support, shot, seed)).collect();
        let level = wilson(share.right, share.judged, CONFIDENCE);
        // Half a case either way keeps a full score finite.
        let middle = (share.right as f64 + 0.5) / (share.judged as f64 + 1.0);
        let (slope, spread) = slope(&points);
        let mut curve = Self {
            points,
            shot: (support.shot() - 1.0).max(1.0),
            trays: support.categories(),
            level: [level.low.max(1e-3), middle, level.high.min(1.0 - 1e-3).max(middle)],
            slope: [(slope - 2.0 * spread).max(0.05), slope, slope + 2.0 * spread],
            ahead: Vec::new(),
        };
        curve.ahead = (4..=16).map(|quarters| curve.foreseen(f64::from(quarters) / 4.0)).collect();
        Some(curve)
    }

    /// With this many times the answers.
    fn foreseen(&self, times: f64) -> Foreseen {
        let accuracy =
            |end: usize| 1.0 / (1.0 + libm::exp(-logit(self.level[end]) - self.slope[end] * libm::log(times)));
        let more = (times - 1.0) * self.shot * self.trays as f64;
        Foreseen { more, low: accuracy(0), likely: accuracy(1), high: accuracy(2) }
    }

    /// About how many more answers, over all trays, reach this accuracy (above 0, below 1).
    pub fn more_answers(&self, target: f64) -> Projection {
        let more = |level: f64, slope: f64| {
            let times = libm::exp(((logit(target) - logit(level)) / slope).max(0.0));
            (times <= FARTHEST).then(|| ((times - 1.0) * self.shot * self.trays as f64).ceil())
        };
        Projection {
            target,
            low: more(self.level[2], self.slope[2]).unwrap_or(FARTHEST * self.shot * self.trays as f64),
            likely: more(self.level[1], self.slope[1]),
            high: more(self.level[0], self.slope[0]),
        }
    }
}

fn logit(share: f64) -> f64 {
    let share = share.clamp(1e-4, 1.0 - 1e-4);
    libm::log(share / (1.0 - share))
}

/// Sorts what is left when `shot` examples of each category that has more are chosen.
fn point(support: &Support, shot: usize, seed: u64) -> Option<Point> {
    let gram = support.gram();
    let categories = support.categories();
    let mut members = vec![Vec::new(); categories];
    support.labels().iter().enumerate().for_each(|(example, &label)| members[label].push(example));
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    rng.set_stream(shot as u64);
    let (mut right, mut sorted) = (0, 0);
    for _ in 0..DRAWS {
        for own in &mut members {
            own.shuffle(&mut rng);
        }
        let chosen: Vec<&[usize]> = members.iter().map(|own| &own[..shot.min(own.len())]).collect();
        // ‖m_c‖² less the part that few examples add, as the prototype learner reckons.
        let squares: Vec<f64> = chosen
            .iter()
            .map(|chosen| {
                let count = (chosen.len() * chosen.len()) as f64;
                chosen.iter().flat_map(|&i| chosen.iter().map(move |&j| gram[[i, j]])).sum::<f64>() / count
            })
            .collect();
        for (label, own) in members.iter().enumerate() {
            for &example in own.iter().skip(shot) {
                let score = |c: usize| {
                    let product: f64 = chosen[c].iter().map(|&i| gram[[example, i]]).sum();
                    2.0 * product / chosen[c].len() as f64 - squares[c]
                };
                let scores: Vec<f64> = (0..categories).map(score).collect();
                right += usize::from(crate::arithmetic::arg_max(&scores) == Some(label));
                sorted += 1;
            }
        }
    }
    (sorted > 0).then(|| Point { shot, accuracy: right as f64 / sorted as f64, sorted })
}

/// The slope of the log-odds over the logarithm of the shot, drawn toward the usual one, and its standard error.
fn slope(points: &[Point]) -> (f64, f64) {
    let (usual, spread) = USUAL_SLOPE;
    // A draw's items are the same few examples again: they count once.
    let weight = |point: &Point| {
        let n = point.sorted as f64 / DRAWS as f64;
        let share = (point.accuracy * n + 0.5) / (n + 1.0);
        (libm::log(point.shot as f64), logit(share), n * share * (1.0 - share))
    };
    let rows: Vec<(f64, f64, f64)> = points.iter().map(weight).collect();
    let whole: f64 = rows.iter().map(|row| row.2).sum();
    if rows.len() < 2 || whole <= 0.0 {
        return USUAL_SLOPE;
    }
    let x = rows.iter().map(|row| row.2 * row.0).sum::<f64>() / whole;
    let y = rows.iter().map(|row| row.2 * row.1).sum::<f64>() / whole;
    let precision: f64 = rows.iter().map(|row| row.2 * (row.0 - x).powi(2)).sum();
    let product: f64 = rows.iter().map(|row| row.2 * (row.0 - x) * (row.1 - y)).sum();
    let prior = 1.0 / (spread * spread);
    ((product + prior * usual) / (precision + prior), (1.0 / (precision + prior)).sqrt())
}
