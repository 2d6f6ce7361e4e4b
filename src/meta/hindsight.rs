//! After the fact: how many answers in random order would have brought as much?
//!
//! Nobody knows the truth of a pile that was just sorted. So the trays as they are now, answers and the sorter's verdicts,
//! stand for it: the same sorter is given them in random order, several times anew, and after so many answers it is counted on
//! how many of the items without an answer it agrees with them. The share that it disagrees on is not the share that it
//! sorts wrong: the trays are partly wrong themselves, and a sorter that is given its own mistakes as answers soon repeats
//! them. Where it was truly as often right as they are, it disagreed on about half as much to one and a half times as much as
//! [`Sorter::outlook`] expects them to have wrong, and in the middle on about as much; `docs/asking.md` has what was measured. So
//! the answers are sought at which the disagreement comes down to that ([`DISAGREE`]).
//!
//! Truths drawn from the sorter's probabilities, each answered in random order, did worse: no sorter can learn mistakes that
//! chance made, so random order seemed not to get there at all where it truly did.

use std::num::NonZeroUsize;

use rand::{SeedableRng, seq::SliceRandom};
use rand_chacha::ChaCha8Rng;

use crate::{
    error::{Error, Result},
    forecast::Range,
    ledger::Answer,
    sorter::Sorter,
};

/// How often a sorter disagrees with trays that are right as often as itself, over how often they are wrong: with most
/// disagreement first, which gives the fewest answers, then in the middle, then with least.
pub const DISAGREE: [f64; 3] = [1.5, 1.0, 0.5];

/// How it is estimated.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Plan {
    /// In how many random orders.
    pub orders: NonZeroUsize,
    /// Seed of the orders.
    pub seed: u64,
}

impl Default for Plan {
    fn default() -> Self {
        Self { orders: NonZeroUsize::new(6).expect("not zero"), seed: 1 }
    }
}

/// The pile after so many answers.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Point {
    /// Answers given.
    pub answers: usize,
    /// The share expected right of the items without an answer, 0 to 1.
    pub right: f64,
}

/// What random order would have taken.
#[derive(Debug, Clone, PartialEq)]
pub struct Hindsight {
    /// Answers that the person gave, “none of these” and “can't tell” included.
    pub given: usize,
    /// Of the items without an answer, the share expected right now.
    pub reached: Range,
    /// Answers in random order that would have reached as much; `None`: more than [`Hindsight::tried`].
    pub random: Option<f64>,
    /// The same with the most and the least disagreement that was found; an end that was not reached is `None`.
    pub interval: (Option<f64>, Option<f64>),
    /// The most answers that were tried: half the pile.
    pub tried: usize,
    /// What the sorter expected after the person's answers.
    pub own: Vec<Point>,
    /// The same in random order, estimated from the disagreement.
    pub in_random_order: Vec<Point>,
}

impl Hindsight {
    /// Replays the pile in random orders. `watch` hears how much is done, 0 to 1, and stops it by `false`.
    ///
    /// Refuses with [`Error::TooLittleToTell`] where the sorter has no outlook, and with [`Error::Stopped`]. Deterministic
    /// for a sorter and a plan. Cost: that of [`Sorter::verdicts`] for each order and each of some 20 numbers of answers.
    pub fn new(sorter: &Sorter, plan: Plan, watch: &mut dyn FnMut(f64) -> bool) -> Result<Self> {
        let mut sorter = sorter.clone();
        let reached = sorter.outlook().ok_or(Error::TooLittleToTell)?.now;
        let given = sorter.answers();
        let orders: Vec<Vec<(usize, Answer)>> = (0..plan.orders.get())
            .map(|order| {
                let mut rng = ChaCha8Rng::seed_from_u64(plan.seed);
                rng.set_stream(order as u64);
                let mut shuffled = sorter.as_sorted();
                shuffled.shuffle(&mut rng);
                shuffled
            })
            .collect();
        let tried = orders[0].len() / 2;
        let numbers = numbers(tried.max(given));
        let steps = (numbers.len() * (orders.len() + 1)) as f64;
        let mut heard = 0.0;
        let mut tell = || {
            heard += 1.0;
            if watch(f64::min(heard / steps, 1.0)) { Ok(()) } else { Err(Error::Stopped) }
        };
        let own = history(sorter.clone(), &numbers, &mut tell)?;
        let wrong = 1.0 - reached.expected;
        let needs = DISAGREE.map(|ratio| 1.0 - ratio * wrong);
        let (mut at, mut agreement): (Vec<usize>, Vec<f64>) = (Vec::new(), Vec::new());
        for &answers in numbers.iter().filter(|&&answers| answers <= tried) {
            let mut sum = 0.0;
            for order in &orders {
                let (asked, rest) = order.split_at(answers);
                sum += sorter.agreement_after(asked, rest);
                tell()?;
            }
            at.push(answers);
            agreement.push(sum / orders.len() as f64);
            if agreement.last().is_some_and(|&agreed| agreed >= needs[2]) {
                break;
            }
        }
        watch(1.0);
        let [least, random, most] = needs.map(|need| crossing(&at, &agreement, need));
        let right = |agreed: f64| (1.0 - (1.0 - agreed) / DISAGREE[1]).max(0.0);
        // Beyond what the person's answers reached, agreeing with their trays says nothing of being right.
        let there = agreement.iter().position(|&agreed| agreed >= needs[1]).map_or(at.len(), |first| first + 1);
        let point = |(&answers, &agreed): (&usize, &f64)| Point { answers, right: right(agreed) };
        let in_random_order = at.iter().zip(&agreement).take(there).map(point).collect();
        Ok(Self { given, reached, random, interval: (least, most), tried, own, in_random_order })
    }
}

/// What the sorter expected after these numbers of answers, and expects now: the log of actions, backwards.
fn history(mut sorter: Sorter, numbers: &[usize], tell: &mut dyn FnMut() -> Result<()>) -> Result<Vec<Point>> {
    let given = sorter.answers();
    let mut points: Vec<Point> = Vec::new();
    loop {
        let answers = sorter.answers();
        let wanted = answers == given || numbers.contains(&answers);
        // Of several moments with as many answers the last counts: before it, answers were taken back or changed.
        if wanted && points.last().is_none_or(|point| answers < point.answers) {
            points.extend(sorter.outlook().map(|outlook| Point { answers, right: outlook.now.expected }));
            tell()?;
        }
        if sorter.undo().is_none() {
            points.reverse();
            return Ok(points);
        }
    }
}

/// 2, 3, 4 … each about a fifth more than the one before.
fn numbers(most: usize) -> Vec<usize> {
    let mut numbers = vec![2];
    while let Some(&last) = numbers.last().filter(|&&last| last < most) {
        numbers.push((last + last.div_ceil(5)).min(most));
    }
    numbers
}

/// Where a curve first reaches a height, by a straight line between two of its points; `None` if it doesn't.
pub fn crossing(at: &[usize], heights: &[f64], height: f64) -> Option<f64> {
    let first = heights.iter().position(|&one| one >= height)?;
    let here = at[first] as f64;
    let Some(before) = first.checked_sub(1) else { return Some(here) };
    let (from, low) = (at[before] as f64, heights[before]);
    Some(from + (here - from) * (height - low) / (heights[first] - low))
}
