//! After the fact: how many answers in random order would have brought as much?
//!
//! Nobody knows the truth of a pile that was just sorted, so several possible truths are drawn: where the person answered, the
//! answer; elsewhere a tray by the sorter's own probabilities, moved on the scale of log odds so that the share it is right
//! about is what [`Sorter::outlook`] expects, at evenly spread places of its interval. Look-alikes share their luck, since that
//! is how sorters err: the normal number behind an item's draw is partly its own and partly that of its look-alikes. In each
//! possible truth the same sorter then answers in a random order of its own, until it is right about as large a share of
//! what has no answer as the person's answers are.
//!
//! The trays as they are now can't stand for the truth: a sorter that is given its own mistakes as answers soon repeats them,
//! and random order would look two to four times as good as it is.

use std::num::NonZeroUsize;

use rand::{Rng, SeedableRng, seq::SliceRandom};
use rand_chacha::ChaCha8Rng;

use crate::{
    error::{Error, Result},
    forecast::Range,
    ledger::Answer,
    sorter::Sorter,
};

/// How it is estimated.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Plan {
    /// How many possible truths are drawn, each with a random order.
    pub truths: NonZeroUsize,
    /// How much of an item's luck is that of its look-alikes, 0 to 1.
    pub alike: f64,
    /// Seed of all that is drawn.
    pub seed: u64,
}

impl Default for Plan {
    fn default() -> Self {
        Self { truths: NonZeroUsize::new(9).expect("not zero"), alike: 0.5, seed: 1 }
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
    /// About four of five possible truths lie between these; an end that was not reached is `None`.
    pub interval: (Option<f64>, Option<f64>),
    /// The most answers that were tried: half the pile.
    pub tried: usize,
    /// What the sorter expected after the person's answers.
    pub own: Vec<Point>,
    /// The mean over the possible truths, in random order.
    pub in_random_order: Vec<Point>,
}

/// A truth with an order of its items, the share of it that the person's answers sort right, and that of random order after
/// each number of answers.
struct World {
    order: Vec<(usize, Answer)>,
    reached: f64,
    right: Vec<f64>,
}

impl Hindsight {
    /// Replays the pile in random orders. `watch` hears how much is done, 0 to 1, and stops it by `false`.
    ///
    /// Refuses with [`Error::TooLittleToTell`] where the sorter has no outlook, and with [`Error::Stopped`]. Deterministic
    /// for a sorter and a plan. Cost: that of [`Sorter::verdicts`] for each truth and each of some 20 numbers of answers.
    pub fn new(sorter: &Sorter, plan: Plan, watch: &mut dyn FnMut(f64) -> bool) -> Result<Self> {
        let mut sorter = sorter.clone();
        let reached = sorter.outlook().ok_or(Error::TooLittleToTell)?.now;
        let given = sorter.answers();
        let mut worlds: Vec<World> =
            (0..plan.truths.get()).map(|number| draw(&mut sorter, &plan, reached, number)).collect();
        let tried = worlds.first().map_or(0, |world| world.order.len() / 2);
        let numbers = numbers(tried.max(given));
        let steps = (numbers.len() * (worlds.len() + 1)) as f64;
        let mut heard = 0.0;
        let mut tell = || {
            heard += 1.0;
            if watch(f64::min(heard / steps, 1.0)) { Ok(()) } else { Err(Error::Stopped) }
        };
        let own = history(sorter.clone(), &numbers, &mut tell)?;
        let mut in_random_order: Vec<Point> = Vec::new();
        for &answers in numbers.iter().filter(|&&answers| answers <= tried) {
            for world in &mut worlds {
                let (asked, rest) = world.order.split_at(answers);
                world.right.push(sorter.agreement_after(asked, rest));
                tell()?;
            }
            in_random_order
                .push(Point { answers, right: mean(worlds.iter().map(|world| world.right[world.right.len() - 1])) });
            let there = worlds.iter().filter(|world| world.right.iter().any(|&right| right >= world.reached)).count();
            if 10 * there >= 9 * worlds.len() && in_random_order.iter().any(|point| point.right >= target(&worlds)) {
                break;
            }
        }
        watch(1.0);
        let at: Vec<usize> = in_random_order.iter().map(|point| point.answers).collect();
        let heights: Vec<f64> = in_random_order.iter().map(|point| point.right).collect();
        let random = crossing(&at, &heights, target(&worlds));
        let mut needed: Vec<f64> =
            worlds.iter().map(|world| crossing(&at, &world.right, world.reached).unwrap_or(f64::INFINITY)).collect();
        needed.sort_by(f64::total_cmp);
        let out = needed.len() / 10;
        let end = |needed: f64| needed.is_finite().then_some(needed);
        // The mean over truths need not lie among the truths that are not the farthest out.
        let least = end(needed[out]).map(|least| random.map_or(least, |random| least.min(random)));
        let most = end(needed[needed.len() - 1 - out]).and_then(|most| random.map(|random| most.max(random)));
        Ok(Self { given, reached, random, interval: (least, most), tried, own, in_random_order })
    }
}

fn target(worlds: &[World]) -> f64 {
    mean(worlds.iter().map(|world| world.reached))
}

fn mean(values: impl ExactSizeIterator<Item = f64>) -> f64 {
    let count = values.len() as f64;
    values.sum::<f64>() / count
}

/// The truth of this number, at its place in the outlook's interval.
fn draw(sorter: &mut Sorter, plan: &Plan, reached: Range, number: usize) -> World {
    let mut rng = ChaCha8Rng::seed_from_u64(plan.seed);
    rng.set_stream(number as u64);
    // From −1 to 1, the middle of the interval in the middle.
    let place = (2.0 * number as f64 + 1.0) / plan.truths.get() as f64 - 1.0;
    // Halfway out: evenly spread places of a normal distribution would lie near the middle more often than at the ends.
    let end = if place < 0.0 { reached.low } else { reached.high };
    let right = reached.expected + 0.5 * place.abs() * (end - reached.expected);
    let (mut order, reached) = sorter.possible_truth(right, plan.alike, &mut || normal(&mut rng));
    order.shuffle(&mut rng);
    World { order, reached, right: Vec::new() }
}

/// A normal number (Box and Muller 1958).
fn normal(rng: &mut impl Rng) -> f64 {
    let uniform = |bits: u64| ((bits >> 11) as f64 + 0.5) / (1_u64 << 53) as f64;
    let (length, angle) = (uniform(rng.next_u64()), uniform(rng.next_u64()));
    (-2.0 * libm::log(length)).sqrt() * libm::cos(std::f64::consts::TAU * angle)
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
