//! Meta-training: the prior that would have served small tasks from past piles best.
//!
//! Tasks are drawn within one past pile, in the space as a starter from the *other* half of the categories would make it, so
//! that no task is whitened by itself. Learned are, by the log loss of the queries: how much each group of directions counts
//! beside what whitening alone would say (where categories differ along the directions in which their items do, whitening
//! takes too much away); in the space so corrected, how far prototypes shrink; by examples
//! a category the temperatures, the ridge learner's strength and the shares of the learners in the mix; and the gradient
//! learner's start and step sizes by group of directions, by exact derivatives through its steps ([`super::unroll`]) with
//! Adam (Kingma, Ba 2015, arXiv:1412.6980). Each is held near its usual value, the less the more items there were; the
//! gradient learner's are only kept if tasks that they weren't fitted to confirm them. Temperatures and shares are kept
//! halfway between what suited the past best and the usual: the next pile may be of another kind. (With a starter from drawn
//! icons, halfway cost other drawn icons 0.2 points at one example a category, and gave stamps back 0.5 to 0.9 points and a
//! log loss of 0.80 for 0.86.)

use std::sync::Arc;

use ndarray::{Array2, Axis};
use serde::{Deserialize, Serialize};

use super::{
    episode::{Design, Episode, Episodes, Labelled, Labelling},
    statistics::{Sampled, Statistics},
    unroll::{Problem, Sizes},
};
use crate::{
    arithmetic::{self, dot, log_sum_exp},
    error::{Error, Result},
    learner::{Descent, Groups, Prototype, Ridge, Step},
    prior::{ByShot, Prior, SHOTS, usual_prototype_factor},
    space::{CENTRE_CAUTION, Centre},
    support::Support,
    whitening::{LEAST_DAMPING, Whitening},
};

/// Fewer categories teach nothing about how to learn: two in each half make the smallest task.
pub const LEAST_CATEGORIES: usize = 4;

/// How many items count as much as one that depends on no other.
const ITEMS_AS_ONE: f64 = 3.0;

/// Where groups of directions end: each holds about as much scatter as the next.
const GROUP_ENDS: [usize; 6] = [8, 16, 32, 64, 128, 256];

/// How many tasks are drawn, each at every shot that the piles have the items for.
const DRAWS: usize = 120;

/// One task in so many checks the steps instead of teaching them.
const CHECKED: usize = 4;

/// Steps that the gradient learner is taught.
const STEPS: usize = 10;

/// Examples in the largest task that teaches steps.
const MOST_EXAMPLES: usize = 60;

const ROUNDS: usize = 150;
const BATCH: usize = 12;
const RATE: f64 = 0.05;

const SHRINKAGES: [f64; 5] = [0.0, 0.25, 0.5, 1.0, 2.0];
const STRENGTHS: [f64; 7] = [0.01, 0.03, 0.1, 0.3, 1.0, 3.0, 10.0];

/// Standard deviations of logarithms before there is evidence.
const TEMPERATURE_SPREAD: f64 = 0.7;
const STRENGTH_SPREAD: f64 = 1.5;
const SIZE_SPREAD: f64 = 1.0;
const STRETCH_SPREAD: f64 = 2.0;

/// What a share of 1 too much in the mix costs before there is evidence, in nats.
const PREFERENCE_WEIGHT: f64 = 4.0;

/// What past piles taught about learning.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Lessons {
    /// How many categories the tasks were drawn from, and how many tasks.
    pub categories: usize,
    /// How many tasks were drawn.
    pub tasks: usize,
    shrinkage: f64,
    ridge_strength: ByShot,
    prototype_temperature: ByShot,
    ridge_temperature: ByShot,
    preference: [ByShot; 3],
    /// The gradient learner's sizes, if they were confirmed.
    descent: Option<(Vec<f64>, Vec<Step>)>,
}

impl Lessons {
    /// The prior that these lessons make of the usual one, with a starter's directions (r × d).
    pub fn prior(&self, directions: &Array2<f32>) -> Prior {
        let descent = match &self.descent {
            Some((start, steps)) => Descent::new(Arc::new(groups(directions)), start.clone(), steps.clone()),
            None => Prior::default().descent,
        };
        Prior {
            shrinkage: self.shrinkage,
            ridge_strength: self.ridge_strength,
            prototype_temperature: self.prototype_temperature,
            ridge_temperature: self.ridge_temperature,
            preference: Some(self.preference),
            descent,
            ..Prior::default()
        }
    }

    /// Whether all numbers are such as training gives.
    pub(crate) fn is_sound(&self) -> bool {
        let positive = |value: &ByShot| value.0.iter().all(|x| x.is_finite() && *x > 0.0);
        let size = |x: &f64| x.is_finite() && (0.0..1e6).contains(x);
        let shares = |k: usize| self.preference.iter().map(|share| share.0[k]).sum::<f64>();
        let preference = self.preference.iter().flat_map(|share| share.0).all(|x| (0.0..=1.0).contains(&x))
            && (0..SHOTS.len()).all(|k| (shares(k) - 1.0).abs() < 1e-6);
        let descent = self.descent.as_ref().is_none_or(|(start, steps)| {
            let groups = GROUP_ENDS.len() + 1;
            let step = |step: &Step| step.weights.len() == groups && step.weights.iter().chain([&step.bias]).all(size);
            start.len() == groups && start.iter().all(size) && steps.len() <= STEPS && steps.iter().all(step)
        });
        (0.0..1e3).contains(&self.shrinkage)
            && positive(&self.ridge_strength)
            && positive(&self.prototype_temperature)
            && positive(&self.ridge_temperature)
            && preference
            && descent
    }
}

fn groups(directions: &Array2<f32>) -> Groups {
    Groups::new(directions.clone(), group_ends(directions.nrows()))
}

fn group_ends(rank: usize) -> Vec<usize> {
    let mut ends: Vec<usize> = GROUP_ENDS.iter().map(|&end| end.min(rank)).collect();
    // Directions beyond the last end, if ever there are, belong to the last group.
    *ends.last_mut().expect("there are groups") = rank;
    ends
}

/// Categories of one pile and half, in the space that the other half makes.
struct Field<'a> {
    places: Vec<Vec<f32>>,
    /// The places' products with each other and with the whitened mean of the other half.
    products: Array2<f64>,
    with_past: Vec<f64>,
    /// The places' and the mean's coordinates along the directions.
    coordinates: Array2<f64>,
    past_coordinates: Array2<f64>,
    groups: Arc<Groups>,
    episodes: Vec<Episodes>,
    shots: Vec<usize>,
    past: &'a [f32],
}

/// A task, as the learners see it.
struct Task {
    /// Position in [`SHOTS`].
    shot: usize,
    support: Support,
    query_rows: Array2<f32>,
    queries: Vec<usize>,
    /// Products of all its items with each other, and their coordinates, the examples first.
    gram: Array2<f64>,
    coordinates: Array2<f64>,
    /// The other half's directions.
    groups: Arc<Groups>,
}

/// One half's whitening and mean.
pub(crate) struct HalfSpace {
    pub whitening: Whitening,
    pub mean: Vec<f32>,
}

impl HalfSpace {
    /// The mean, whitened.
    fn past(&self) -> Vec<f32> {
        let mut past = self.mean.clone();
        self.whitening.apply(&mut past);
        past
    }
}

/// What training gives.
pub(crate) struct Trained {
    /// What each group of directions counts beside what whitening says, as a factor on lengths.
    pub stretch: Vec<f64>,
    /// What was learned in the space so corrected.
    pub lessons: Lessons,
}

/// Learns from the sample and the space that either half makes. `None` where there is too little: fewer than
/// [`LEAST_CATEGORIES`] categories with two items. `watch` is told the share done, 0 to 1, and stops the work with
/// [`Error::Stopped`] by answering false.
pub(crate) fn train(
    statistics: &Statistics,
    mut spaces: [HalfSpace; 2],
    watch: &mut dyn FnMut(f64) -> bool,
) -> Result<Option<Trained>> {
    let mut go_on = |share: f64| if watch(share) { Ok(()) } else { Err(Error::Stopped) };
    let (tasks, categories) = tasks(statistics, &spaces)?;
    if tasks.is_empty() || categories < LEAST_CATEGORIES {
        return Ok(None);
    }
    go_on(0.1)?;
    let beyond = |one: &Sampled| one.places().len() - 1;
    let weight = statistics.sample().iter().map(beyond).sum::<usize>() as f64 / ITEMS_AS_ONE;
    let stretch = Evidence { weight, tasks: &tasks }.tune_space(&mut |share| go_on(0.1 + 0.2 * share))?;
    spaces.iter_mut().for_each(|space| space.whitening = stretched(&space.whitening, &stretch));

    let (tasks, categories) = self::tasks(statistics, &spaces)?;
    let evidence = Evidence { weight, tasks: &tasks };
    let mut prior = Prior::default();
    evidence.tune_prototypes(&mut prior);
    go_on(0.4)?;
    evidence.tune_ridge(&mut prior);
    go_on(0.5)?;
    let descent = evidence.tune_descent(&prior, &mut |share| go_on(0.5 + 0.4 * share))?;
    let preference = evidence.preference(&prior, descent.as_ref().unwrap_or(&usual_sizes()));
    go_on(1.0)?;
    let lessons = Lessons {
        categories,
        tasks: tasks.len(),
        shrinkage: prior.shrinkage,
        ridge_strength: prior.ridge_strength,
        prototype_temperature: halfway(prior.prototype_temperature),
        ridge_temperature: halfway(prior.ridge_temperature),
        preference,
        descent: descent.map(|Sizes { start, steps }| (start, steps)),
    };
    Ok(Some(Trained { stretch, lessons }))
}

/// The whitening with every group of directions stretched.
pub(crate) fn stretched(whitening: &Whitening, stretch: &[f64]) -> Whitening {
    let (directions, damping) = whitening.parts();
    let ends = group_ends(directions.nrows());
    let group = |direction: usize| ends.iter().position(|&end| direction < end).expect("ends cover all directions");
    let damping = damping
        .iter()
        .enumerate()
        .map(|(k, &damping)| (1.0 - (1.0 - f64::from(damping)) * stretch[group(k)]).max(LEAST_DAMPING) as f32)
        .collect();
    Whitening::new(directions.clone(), damping)
}

impl<'a> Field<'a> {
    /// `None` where the categories make no task.
    fn new(categories: &[&Sampled], whitening: &Whitening, past: &'a [f32]) -> Result<Option<Self>> {
        if categories.len() < 2 {
            return Ok(None);
        }
        // Shots for which most categories have the items, and one over.
        let has = |shot: usize| categories.iter().filter(|one| one.places().len() > shot).count();
        let shots: Vec<usize> =
            SHOTS.into_iter().filter(|&shot| has(shot) >= 2 && 4 * has(shot) >= 3 * categories.len()).collect();
        if shots.is_empty() {
            return Ok(None);
        }
        let labels: Vec<usize> =
            categories.iter().enumerate().flat_map(|(c, one)| vec![c; one.places().len()]).collect();
        let number = |n: usize| std::num::NonZeroUsize::new(n).expect("not zero");
        let labelled = Labelled::new(&labels, categories.len())?;
        let episodes = [(5, false), (10, false), (5, true), (10, true)]
            .into_iter()
            .map(|(ways, uneven)| {
                let shots = shots.iter().map(|&shot| number(shot)).collect();
                let design = Design { ways: number(ways), shots, queries: number(5), uneven, seed: 1 };
                Episodes::new(labelled.clone(), &design)
            })
            .collect::<Result<Vec<_>>>()?;

        let mut rows = Vec::with_capacity(labels.len() * past.len());
        for place in categories.iter().flat_map(|one| one.places()) {
            let mut place = place.clone();
            whitening.apply(&mut place);
            rows.extend(place);
        }
        let rows = Array2::from_shape_vec((labels.len(), past.len()), rows).expect("as many as counted");
        let groups = groups(whitening.parts().0);
        let past_row = Array2::from_shape_vec((1, past.len()), past.to_vec()).expect("one row");
        Ok(Some(Self {
            products: arithmetic::gram(rows.view()),
            with_past: rows
                .outer_iter()
                .map(|row| f64::from(dot(row.as_slice().expect("standard layout"), past)))
                .collect(),
            coordinates: groups.coordinates(rows.view()),
            past_coordinates: groups.coordinates(past_row.view()),
            places: rows.outer_iter().map(|row| row.to_vec()).collect(),
            groups: Arc::new(groups),
            episodes,
            shots,
            past,
        }))
    }

    fn tasks(&self, number: usize) -> Result<Vec<Task>> {
        let draw = self.episodes[number % self.episodes.len()].draw(number as u64);
        (0..self.shots.len())
            .map(|position| {
                let Episode { categories, support, queries } = draw.at(position);
                let members: Vec<usize> = support.iter().chain(&queries).map(|one| one.item).collect();
                let mut sum = vec![0.0; self.past.len()];
                for &item in &members {
                    sum.iter_mut().zip(&self.places[item]).for_each(|(sum, &x)| *sum += f64::from(x));
                }
                let centre = Centre::of_sum(&sum, members.len(), Some(self.past));
                let rows = |items: &[Labelling]| {
                    let rows: Vec<f32> = items.iter().flat_map(|one| centre.view(&self.places[one.item])).collect();
                    Array2::from_shape_vec((items.len(), self.past.len()), rows).expect("as many as counted")
                };
                let labels: Vec<usize> = support.iter().map(|one| one.label).collect();
                let (gram, coordinates) = self.seen_from_the_middle(&members);
                Ok(Task {
                    shot: SHOTS.iter().position(|&shot| shot == self.shots[position]).expect("one of them"),
                    support: Support::new(rows(&support), labels, categories.len())?,
                    query_rows: rows(&queries),
                    queries: queries.iter().map(|one| one.label).collect(),
                    gram,
                    coordinates,
                    groups: self.groups.clone(),
                })
            })
            .collect()
    }

    /// Products and coordinates of these items as seen from their centre, without their d numbers: what [`Centre`] does.
    fn seen_from_the_middle(&self, members: &[usize]) -> (Array2<f64>, Array2<f64>) {
        let weight = 1.0 / (members.len() as f64 + CENTRE_CAUTION);
        let products = self.products.select(Axis(0), members).select(Axis(1), members);
        let coordinates = self.coordinates.select(Axis(0), members);
        let with_past: Vec<f64> = members.iter().map(|&item| self.with_past[item]).collect();
        let past_square = self.past.iter().map(|&x| f64::from(x).powi(2)).sum::<f64>();
        let with_centre: Vec<f64> = products
            .outer_iter()
            .zip(&with_past)
            .map(|(row, past)| (row.sum() + CENTRE_CAUTION * past) * weight)
            .collect();
        let square = (with_centre.iter().sum::<f64>()
            + CENTRE_CAUTION * (with_past.iter().sum::<f64>() + CENTRE_CAUTION * past_square) * weight)
            * weight;
        let factors: Vec<f64> = (0..members.len())
            .map(|i| {
                let distance = (products[[i, i]] - 2.0 * with_centre[i] + square).max(0.0).sqrt();
                if distance < 1e-5 { 0.0 } else { 1.0 / distance }
            })
            .collect();
        let gram = Array2::from_shape_fn(products.dim(), |(i, j)| {
            (products[[i, j]] - with_centre[i] - with_centre[j] + square) * factors[i] * factors[j]
        });
        let middle: Vec<f64> = (0..coordinates.ncols())
            .map(|k| (coordinates.column(k).sum() + CENTRE_CAUTION * self.past_coordinates[[0, k]]) * weight)
            .collect();
        let coordinates =
            Array2::from_shape_fn(coordinates.dim(), |(i, k)| (coordinates[[i, k]] - middle[k]) * factors[i]);
        (gram, coordinates)
    }
}

/// Halfway to 1, as factors go.
fn halfway(factors: ByShot) -> ByShot {
    ByShot(factors.0.map(f64::sqrt))
}

/// The usual descent's sizes, the same for every group.
fn usual_sizes() -> Sizes {
    let groups = GROUP_ENDS.len() + 1;
    let usual = &Prior::default().descent;
    let step = |step: &Step| Step { weights: vec![step.weights[0]; groups], bias: step.bias };
    Sizes { start: vec![1.0; groups], steps: usual.steps().iter().map(step).collect() }
}

/// Tasks from every pile and half, as many as it has a share of the categories; and how many categories these are.
fn tasks(statistics: &Statistics, spaces: &[HalfSpace; 2]) -> Result<(Vec<Task>, usize)> {
    let pasts = spaces.each_ref().map(HalfSpace::past);
    let mut fields = Vec::new();
    let mut categories = 0;
    for pile in statistics.sample().chunk_by(|a, b| a.pile() == b.pile()) {
        for half in 0..2 {
            let own: Vec<&Sampled> = pile.iter().filter(|one| one.half() == half).collect();
            if let Some(field) = Field::new(&own, &spaces[1 - half].whitening, &pasts[1 - half])? {
                categories += own.len();
                fields.push((own.len(), field));
            }
        }
    }
    let mut tasks = Vec::new();
    let mut passed = 0;
    for (own, field) in &fields {
        let (from, to) = (passed * DRAWS / categories, (passed + own) * DRAWS / categories);
        passed += own;
        for number in from..to.max(from + 1) {
            tasks.extend(field.tasks(number)?);
        }
    }
    Ok((tasks, categories))
}

/// Tasks and how much their mean loss counts for: as so many independent items.
struct Evidence<'a> {
    weight: f64,
    tasks: &'a [Task],
}

impl Task {
    fn problem(&self, temperature: f64) -> Problem {
        let products = (&self.gram, &self.coordinates);
        Problem::new(&self.groups, products, self.support.labels(), &self.queries, temperature)
    }

    /// The mean log loss of the queries by their logits times a factor.
    fn loss(&self, logits: &Array2<f64>, factor: f64) -> f64 {
        let one = |(row, &label): (ndarray::ArrayView1<f64>, &usize)| {
            let scaled = row.mapv(|x| x * factor);
            log_sum_exp(scaled.view()) - scaled[label]
        };
        logits.outer_iter().zip(&self.queries).map(one).sum::<f64>() / self.queries.len() as f64
    }
}

impl Evidence<'_> {
    fn at(&self, shot: usize) -> impl Iterator<Item = (usize, &Task)> {
        self.tasks.iter().enumerate().filter(move |(_, task)| task.shot == shot)
    }

    /// The summed evidence against logits that are multiplied by a factor at this shot; 0 where no task has it.
    fn against(&self, shot: usize, logits: &[Array2<f64>], factor: impl Fn(&Task) -> f64) -> f64 {
        let losses: Vec<f64> = self.at(shot).map(|(i, task)| task.loss(&logits[i], factor(task))).collect();
        if losses.is_empty() { 0.0 } else { losses.iter().sum::<f64>() / losses.len() as f64 * self.weight }
    }

    /// The factor beside the usual one that suits these logits best at this shot, and what speaks against it.
    fn temperature(&self, shot: usize, logits: &[Array2<f64>], usual: impl Fn(&Task) -> f64) -> (f64, f64) {
        let objective = |log: f64| {
            let factor = libm::exp(log);
            self.against(shot, logits, |task| usual(task) * factor) + (log / TEMPERATURE_SPREAD).powi(2) / 2.0
        };
        let (mut best, mut least) = (0.0, objective(0.0));
        // A grid, twice refined: the loss has one valley, and a grid never leaves it.
        for step in [0.3, 0.1, 0.03] {
            let middle: f64 = best;
            for k in -6..=6 {
                let log = middle + step * f64::from(k);
                let value = objective(log);
                if value < least {
                    (best, least) = (log, value);
                }
            }
        }
        (libm::exp(best), least)
    }

    /// The value at every shot; shots without tasks take after the nearest below, or above.
    fn by_shot(&self, value: impl Fn(usize) -> f64) -> ByShot {
        let known: Vec<Option<f64>> =
            (0..SHOTS.len()).map(|shot| self.at(shot).next().is_some().then(|| value(shot))).collect();
        let nearest = |shot: usize| {
            let below = known[..=shot].iter().rev().flatten().next();
            below.or_else(|| known[shot..].iter().flatten().next()).copied().expect("there are tasks")
        };
        ByShot(std::array::from_fn(nearest))
    }

    fn tune_prototypes(&self, prior: &mut Prior) {
        let mut best = f64::INFINITY;
        for shrinkage in SHRINKAGES {
            let logits: Vec<Array2<f64>> = self
                .tasks
                .iter()
                .map(|task| {
                    Prototype { shrinkage, ..prior.prototype(&task.support) }
                        .fit(&task.support)
                        .logits(task.query_rows.view())
                })
                .collect();
            let usual = |task: &Task| usual_prototype_factor(task.support.shot());
            let against: f64 = (0..SHOTS.len()).map(|shot| self.temperature(shot, &logits, usual).1).sum();
            if against + shrinkage < best {
                best = against + shrinkage;
                prior.shrinkage = shrinkage;
                prior.prototype_temperature = self.by_shot(|shot| self.temperature(shot, &logits, usual).0);
            }
        }
    }

    fn tune_ridge(&self, prior: &mut Prior) {
        let usual_strength = prior.ridge_strength;
        let plain = prior.clone();
        let mut best = [(f64::INFINITY, 0.0, 1.0); SHOTS.len()];
        for strength in STRENGTHS {
            let logits: Vec<Array2<f64>> = self
                .tasks
                .iter()
                .map(|task| Ridge::fit(&task.support, strength).logits(task.query_rows.view()))
                .collect();
            for (shot, best) in best.iter_mut().enumerate() {
                let usual = |task: &Task| plain.ridge_factor(&task.support, strength);
                let (factor, against) = self.temperature(shot, &logits, usual);
                let pull = (libm::log(strength / usual_strength.0[shot]) / STRENGTH_SPREAD).powi(2) / 2.0;
                if against + pull < best.0 {
                    *best = (against + pull, strength, factor);
                }
            }
        }
        prior.ridge_strength = self.by_shot(|shot| best[shot].1);
        prior.ridge_temperature = self.by_shot(|shot| best[shot].2);
    }

    /// How much each group of directions is stretched so that nearest prototypes do best, at every shot with the
    /// temperature that suits it.
    fn tune_space(&self, watch: &mut dyn FnMut(f64) -> Result<()>) -> Result<Vec<f64>> {
        let groups = GROUP_ENDS.len() + 1;
        let problems: Vec<(usize, Problem)> = self
            .tasks
            .iter()
            .map(|task| (task.shot, task.problem(usual_prototype_factor(task.support.shot()))))
            .collect();
        // Logarithms of squared stretches by group, the rest last, and of the temperature by shot.
        let mut logs = vec![0.0; groups + SHOTS.len()];
        let mut adam = Adam::new(logs.len());
        for round in 0..ROUNDS {
            let weight = |k: usize| 1.0 / if k < groups { STRETCH_SPREAD.powi(2) } else { TEMPERATURE_SPREAD.powi(2) };
            let mut slope: Vec<f64> = logs.iter().enumerate().map(|(k, x)| x * weight(k) / self.weight).collect();
            for k in 0..BATCH {
                let (shot, problem) = &problems[(round * BATCH + k) % problems.len()];
                let temperature = logs[groups + shot];
                let start: Vec<f64> = logs[..groups].iter().map(|&x| libm::exp(x + temperature)).collect();
                let by = problem.loss(&Sizes { start: start.clone(), steps: Vec::new() }).1.start;
                for (group, (by, a)) in by.iter().zip(&start).enumerate() {
                    slope[group] += by * a / BATCH as f64;
                    slope[groups + shot] += by * a / BATCH as f64;
                }
            }
            adam.step(&mut logs, &slope, RATE * (1.0 - round as f64 / ROUNDS as f64));
            watch((round + 1) as f64 / ROUNDS as f64)?;
        }
        let rest = logs[groups - 1];
        Ok(logs[..groups - 1].iter().map(|log| libm::exp((log - rest) / 2.0)).collect())
    }

    /// The gradient learner's sizes, or `None` where they don't do better on tasks that they weren't fitted to.
    fn tune_descent(&self, prior: &Prior, watch: &mut dyn FnMut(f64) -> Result<()>) -> Result<Option<Sizes>> {
        let usual = &usual_sizes().steps[0];
        let groups = GROUP_ENDS.len() + 1;
        let small = self.tasks.iter().filter(|task| task.support.len() <= MOST_EXAMPLES);
        let (mut taught, mut checked) = (Vec::new(), Vec::new());
        for (number, task) in small.enumerate() {
            let problem = task.problem(prior.prototype_factor(&task.support));
            if number % CHECKED == CHECKED - 1 { &mut checked } else { &mut taught }.push(problem);
        }
        if checked.is_empty() {
            return Ok(None);
        }
        // Logarithms: start by group, then for every step by group and the bias; beside the usual sizes.
        let count = groups + STEPS * (groups + 1);
        let sizes = |logs: &[f64]| {
            let (start, steps) = logs.split_at(groups);
            let start = start.iter().map(|&x| libm::exp(x)).collect();
            let step = |logs: &[f64]| {
                let weights = logs.iter().zip(&usual.weights).map(|(&x, size)| size * libm::exp(x)).collect();
                Step { weights, bias: usual.bias * libm::exp(logs[groups]) }
            };
            Sizes { start, steps: steps.chunks_exact(groups + 1).map(step).collect() }
        };
        let flat = |sizes: &Sizes| -> Vec<f64> {
            let steps = sizes.steps.iter().flat_map(|step| step.weights.iter().copied().chain([step.bias]));
            sizes.start.iter().copied().chain(steps).collect()
        };
        let loss = |problems: &[Problem], logs: &[f64]| {
            problems.iter().map(|problem| problem.loss(&sizes(logs)).0).sum::<f64>() / problems.len() as f64
        };

        let mut logs = vec![0.0; count];
        let mut adam = Adam::new(count);
        for round in 0..ROUNDS {
            let now = sizes(&logs);
            let values = flat(&now);
            let mut slope: Vec<f64> = logs.iter().map(|x| x / (SIZE_SPREAD * SIZE_SPREAD * self.weight)).collect();
            for k in 0..BATCH {
                // Strides through all tasks, whatever their number.
                let problem = &taught[(round * BATCH + k) % taught.len()];
                let by = flat(&problem.loss(&now).1);
                // By the logarithm: times the value.
                slope.iter_mut().zip(by.iter().zip(&values)).for_each(|(s, (b, v))| *s += b * v / BATCH as f64);
            }
            let rate = RATE * (1.0 - round as f64 / ROUNDS as f64);
            adam.step(&mut logs, &slope, rate);
            watch((round + 1) as f64 / ROUNDS as f64)?;
        }
        if loss(&checked, &logs) >= loss(&checked, &vec![0.0; count]) {
            return Ok(None);
        }
        Ok(Some(sizes(&logs)))
    }

    /// The shares of prototype, ridge and gradient by shot, halfway between the best and the usual.
    fn preference(&self, prior: &Prior, sizes: &Sizes) -> [ByShot; 3] {
        let members: [Vec<Array2<f64>>; 3] = [
            self.logits(|task| {
                prior.prototype(&task.support).fit(&task.support).logits(task.query_rows.view())
                    * prior.prototype_factor(&task.support)
            }),
            self.logits(|task| {
                let strength = prior.strength(&task.support);
                Ridge::fit(&task.support, strength).logits(task.query_rows.view())
                    * prior.ridge_factor(&task.support, strength)
            }),
            self.logits(|task| task.problem(prior.prototype_factor(&task.support)).query_logits(sizes)),
        ];
        let usual = |shot: usize| {
            let known = Prior { centre_known: 1.0, preference: None, ..Prior::default() };
            known.preference_at(SHOTS[shot] as f64)
        };
        let best = |shot: usize| {
            if self.at(shot).next().is_none() {
                return usual(shot);
            }
            let mut best = (f64::INFINITY, usual(shot));
            for first in 0..=10 {
                for second in 0..=10 - first {
                    let shares = [first, second, 10 - first - second].map(|share| f64::from(share) / 10.0);
                    let losses: Vec<f64> = self
                        .at(shot)
                        .map(|(i, task)| {
                            let mut mixed = &members[0][i] * shares[0];
                            mixed.scaled_add(shares[1], &members[1][i]);
                            mixed.scaled_add(shares[2], &members[2][i]);
                            task.loss(&mixed, 1.0)
                        })
                        .collect();
                    let loss = losses.iter().sum::<f64>() / losses.len() as f64 * self.weight;
                    let distance: f64 = shares.iter().zip(usual(shot)).map(|(a, b)| (a - b).powi(2)).sum();
                    let against = loss + PREFERENCE_WEIGHT * distance;
                    if against < best.0 {
                        best = (against, shares);
                    }
                }
            }
            std::array::from_fn(|member| 0.5 * (best.1[member] + usual(shot)[member]))
        };
        let by_shot: [[f64; 3]; SHOTS.len()] = std::array::from_fn(best);
        std::array::from_fn(|member| ByShot(by_shot.map(|shares| shares[member])))
    }

    fn logits(&self, of: impl Fn(&Task) -> Array2<f64>) -> Vec<Array2<f64>> {
        self.tasks.iter().map(of).collect()
    }
}

/// Adam with its usual decay rates, 0.9 and 0.999.
struct Adam {
    first: Vec<f64>,
    second: Vec<f64>,
    round: i32,
}

impl Adam {
    fn new(count: usize) -> Self {
        Self { first: vec![0.0; count], second: vec![0.0; count], round: 0 }
    }

    fn step(&mut self, values: &mut [f64], slope: &[f64], rate: f64) {
        self.round += 1;
        let (a, b) = (0.9, 0.999);
        let (a_left, b_left) = (1.0 - libm::pow(a, self.round.into()), 1.0 - libm::pow(b, self.round.into()));
        for (i, &g) in slope.iter().enumerate() {
            self.first[i] = a * self.first[i] + (1.0 - a) * g;
            self.second[i] = b * self.second[i] + (1.0 - b) * g * g;
            values[i] -= rate * (self.first[i] / a_left) / ((self.second[i] / b_left).sqrt() + 1e-8);
        }
    }
}
