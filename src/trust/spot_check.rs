//! The spot check: a random sample that backs a stated error rate.
//!
//! A sorted pile of N items holds K wrong ones. After n items drawn at random, k of them wrong, every K is ruled out for which so
//! few would have turned up with a probability of at most 1 − confidence; the largest K that is left is the bound. Drawing from a
//! finite pile without putting back, the number of wrong ones is hypergeometric, and the bound exact: whatever K is, the
//! statement is true with at least the stated confidence. Wrong items that were looked at are corrected, so that K − k are left.
//!
//! With a sample from each tray the number of wrong ones is a sum of hypergeometric variables. Each of those is distributed like a
//! sum of independent trials (Vatutin, Mikhailov 1982), and of all such sums with one mean μ the binomial makes few
//! successes the most likely, up to μ − 1 of them (Hoeffding 1956, 10.1214/aoms/1177728178). That gives a bound that holds
//! however the wrong items are spread over the trays; it is a little wider, since it gains nothing from the pile being finite.
//!
//! What the confidence rests on: the number to look at is fixed before the first is looked at, all of them are judged, and the
//! sorting that was drawn from is the one that is used. Looking on until the result pleases is no spot check: to look at
//! more, draw again.
//!
//! Sampling until no error is allowed: 59 items show at most 5 %, and 299 at most 1 %, at 95 % confidence in a large pile
//! (common practice, no source).

use std::fmt;

use rand::{SeedableRng, seq::index};
use rand_chacha::ChaCha8Rng;
use serde::{Deserialize, Serialize};

use super::interval::binomial_at_most;
use crate::error::{Error, Result};

/// Keeps a sample apart from whatever else is drawn with the same seed.
const STREAM: u64 = 0x5b07;

/// Probabilities that are equal but for rounding count as equal.
const ROUNDING: f64 = 1e-12;

/// What is to be shown, and how.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "camelCase")]
pub struct Plan {
    tolerance: f64,
    confidence: f64,
    allowed: usize,
    by_tray: bool,
}

impl Plan {
    /// A plan to show that at most the share `tolerance` (0 up to 1) is wrong, at this `confidence` (between 0 and 1), if at
    /// most `allowed` of those looked at are; `by_tray` draws from each tray its share.
    pub fn new(tolerance: f64, confidence: f64, allowed: usize, by_tray: bool) -> Result<Self> {
        if !(0.0..1.0).contains(&tolerance) {
            return Err(Error::SpotCheckPlan(format!("the tolerance must be from 0 up to 1, and is {tolerance}")));
        }
        if !(confidence > 0.0 && confidence < 1.0) {
            return Err(Error::SpotCheckPlan(format!("the confidence must be between 0 and 1, and is {confidence}")));
        }
        Ok(Self { tolerance, confidence, allowed, by_tray })
    }

    /// The share of wrong items that is tolerated.
    pub fn tolerance(&self) -> f64 {
        self.tolerance
    }

    /// The confidence of the statement.
    pub fn confidence(&self) -> f64 {
        self.confidence
    }

    /// How many of those looked at may be wrong.
    pub fn allowed(&self) -> usize {
        self.allowed
    }

    /// Whether each tray gives its share of the sample.
    pub fn by_tray(&self) -> bool {
        self.by_tray
    }

    /// How many items to look at in a pile whose trays hold these many: enough that, with no more wrong ones than allowed, at
    /// most the tolerated share is left wrong. One number a tray when drawing by tray, one in all otherwise. Cost about
    /// O(log² N).
    ///
    /// ```
    /// use kenspeckle::trust::spot_check::Plan;
    ///
    /// let plan = Plan::new(0.05, 0.95, 0, false)?;
    /// assert_eq!(plan.sample_sizes(&[1_000_000]), [59]);
    /// # Ok::<(), kenspeckle::Error>(())
    /// ```
    pub fn sample_sizes(&self, trays: &[usize]) -> Vec<usize> {
        let items: usize = trays.iter().sum();
        let tolerated = (self.tolerance * items as f64 + 1e-9).floor() as usize;
        let enough = |sizes: &[usize]| {
            let bound = Bound { trays: if self.by_tray { trays } else { &[items] }, looked_at: sizes };
            let wrong = self.allowed.min(sizes.iter().sum());
            bound.rules_out(tolerated + wrong + 1, wrong, self.confidence)
        };
        let sizes = |sample: usize| -> Vec<usize> {
            if !self.by_tray {
                return vec![sample];
            }
            trays.iter().map(|&tray| (sample * tray).div_ceil(items.max(1))).collect()
        };
        let (mut low, mut high) = (0, items);
        while low < high {
            let middle = (low + high) / 2;
            if enough(&sizes(middle)) {
                high = middle;
            } else {
                low = middle + 1;
            }
        }
        sizes(low)
    }
}

/// What a sample of these sizes from trays of these sizes says.
struct Bound<'a> {
    trays: &'a [usize],
    looked_at: &'a [usize],
}

impl Bound<'_> {
    /// Whether `total` wrong items in the pile would show so few in the sample too seldom.
    fn rules_out(&self, total: usize, wrong: usize, confidence: f64) -> bool {
        let (items, sample): (usize, usize) = (self.trays.iter().sum(), self.looked_at.iter().sum());
        if total > items - (sample - wrong.min(sample)) || total < wrong {
            return true;
        }
        let least = 1.0 - confidence + ROUNDING;
        if let ([items], [sample]) = (self.trays, self.looked_at) {
            return hypergeometric_at_most(wrong, *items, total, *sample) <= least;
        }
        if sample == items {
            return total != wrong;
        }
        let share = |(&tray, &looked_at): (&usize, &usize)| looked_at as f64 / tray as f64;
        let filled = self.trays.iter().zip(self.looked_at).filter(|&(&tray, _)| tray > 0);
        let least_share = filled.map(share).fold(1.0, f64::min);
        let mean = least_share * total as f64;
        wrong as f64 <= mean - 1.0 && binomial_at_most(wrong, sample, (mean / sample as f64).min(1.0)) <= least
    }

    /// The most wrong items that are not ruled out.
    fn most(&self, wrong: usize, confidence: f64) -> usize {
        let (mut low, mut high) = (wrong, self.trays.iter().sum::<usize>());
        while low < high {
            let middle = (low + high).div_ceil(2);
            if self.rules_out(middle, wrong, confidence) {
                high = middle - 1;
            } else {
                low = middle;
            }
        }
        low
    }
}

/// P(X ≤ count) for X the wrong ones in a sample of `sample` from `items` of which `total` are wrong. Cost O(count).
pub fn hypergeometric_at_most(count: usize, items: usize, total: usize, sample: usize) -> f64 {
    let log_ways = |of: usize, chosen: usize| {
        let log_factorial = |n: usize| libm::lgamma(n as f64 + 1.0);
        log_factorial(of) - log_factorial(chosen) - log_factorial(of - chosen)
    };
    let least = (sample + total).saturating_sub(items);
    let most = count.min(total).min(sample);
    if count >= total.min(sample) {
        return 1.0;
    }
    let all = log_ways(items, sample);
    (least..=most).map(|k| libm::exp(log_ways(total, k) + log_ways(items - total, sample - k) - all)).sum()
}

/// The most wrong items that a pile of `items` holds, at this one-sided confidence, when `wrong` of `looked_at` drawn at
/// random are.
///
/// # Panics
/// If more were looked at than there are, or more were wrong than looked at.
pub fn most_wrong(items: usize, looked_at: usize, wrong: usize, confidence: f64) -> usize {
    assert!(
        wrong <= looked_at && looked_at <= items,
        "a sample is part of the pile, and the wrong ones are part of it"
    );
    Bound { trays: &[items], looked_at: &[looked_at] }.most(wrong, confidence)
}

/// What the person says of an item of the sample.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Judgement {
    /// It is in the right tray.
    Right,
    /// It is in the wrong tray and belongs in none or in one that is not named: it is taken out.
    Wrong,
    /// It belongs in this tray.
    Belongs(usize),
    /// The person can't tell: it counts as wrong, and stays where it is.
    Untold,
}

/// A sorted item: its number and its tray's.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub struct Sorted {
    /// The item's number.
    pub item: usize,
    /// The tray it was sorted into.
    pub tray: usize,
}

/// A sample drawn from a sorting that is held still, and what the person said of it.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SpotCheck {
    plan: Plan,
    seed: u64,
    sorting: Vec<Sorted>,
    /// Positions in `sorting`, in the order in which they are shown.
    sample: Vec<usize>,
    judgements: Vec<Option<Judgement>>,
}

impl SpotCheck {
    /// Draws the sample that the plan needs from the items that were sorted: the same for the same seed and sorting.
    ///
    /// Refuses an empty sorting.
    pub fn draw(plan: Plan, sorting: Vec<Sorted>, seed: u64) -> Result<Self> {
        if sorting.is_empty() {
            return Err(Error::NothingToCheck);
        }
        let mut rng = ChaCha8Rng::seed_from_u64(seed);
        rng.set_stream(STREAM);
        let trays = members(&sorting);
        let counts: Vec<usize> = trays.iter().map(|(_, members)| members.len()).collect();
        let sizes = plan.sample_sizes(&counts);
        let mut sample: Vec<usize> = if plan.by_tray {
            let drawn = trays.iter().zip(&sizes).flat_map(|((_, members), &size)| {
                index::sample(&mut rng, members.len(), size).into_iter().map(|k| members[k]).collect::<Vec<_>>()
            });
            drawn.collect()
        } else {
            index::sample(&mut rng, sorting.len(), sizes[0]).into_vec()
        };
        if plan.by_tray {
            // Shown tray by tray, so that one tray's items are looked at together.
            sample.sort_by_key(|&position| sorting[position].tray);
        }
        let judgements = vec![None; sample.len()];
        Ok(Self { plan, seed, sorting, sample, judgements })
    }

    /// The spot check that was saved as JSON, its parts checked against each other.
    pub fn restore(state: &str) -> Result<Self> {
        let unreadable = |reason: String| Error::StateUnreadable(reason);
        let saved: Self = serde_json::from_str(state).map_err(|error| unreadable(error.to_string()))?;
        let Plan { tolerance, confidence, allowed, by_tray } = saved.plan;
        let plan = Plan::new(tolerance, confidence, allowed, by_tray)?;
        let drawn = Self::draw(plan, saved.sorting.clone(), saved.seed)?;
        if drawn.sample != saved.sample || saved.judgements.len() != saved.sample.len() {
            return Err(unreadable("its sample is not the one that its seed draws".into()));
        }
        Ok(saved)
    }

    /// What is to be shown.
    pub fn plan(&self) -> &Plan {
        &self.plan
    }

    /// The seed of the draw.
    pub fn seed(&self) -> u64 {
        self.seed
    }

    /// How many sorted items it is about.
    pub fn items(&self) -> usize {
        self.sorting.len()
    }

    /// The items to look at, in order, with what was said of them.
    pub fn sample(&self) -> impl Iterator<Item = (Sorted, Option<Judgement>)> + '_ {
        self.sample.iter().map(|&position| self.sorting[position]).zip(self.judgements.iter().copied())
    }

    /// The person's judgement of an item of the sample; `None` takes it back. Naming the tray it is in says that it is right.
    pub fn judge(&mut self, item: usize, judgement: Option<Judgement>) -> Result<()> {
        let place = self.sample.iter().position(|&position| self.sorting[position].item == item);
        let place = place.ok_or(Error::NotInSample(item))?;
        let own = self.sorting[self.sample[place]].tray;
        self.judgements[place] =
            judgement.map(|said| if said == Judgement::Belongs(own) { Judgement::Right } else { said });
        Ok(())
    }

    /// How many items are still to be looked at.
    pub fn left(&self) -> usize {
        self.judgements.iter().filter(|judgement| judgement.is_none()).count()
    }

    /// The sorting as it is after the corrections: every item with its tray, or without where the person took it out.
    pub fn corrected(&self) -> Vec<(usize, Option<usize>)> {
        let mut sorting: Vec<(usize, Option<usize>)> =
            self.sorting.iter().map(|sorted| (sorted.item, Some(sorted.tray))).collect();
        for (&position, judgement) in self.sample.iter().zip(&self.judgements) {
            match judgement {
                Some(Judgement::Wrong) => sorting[position].1 = None,
                Some(Judgement::Belongs(tray)) => sorting[position].1 = Some(*tray),
                Some(Judgement::Right | Judgement::Untold) | None => {}
            }
        }
        sorting
    }

    /// What the sample shows, with the date that the caller gives. Refuses while items are left to be looked at.
    pub fn statement(&self, date: &str) -> Result<Statement> {
        if self.left() > 0 {
            return Err(Error::SpotCheckUnfinished(self.left()));
        }
        let trays = members(&self.sorting);
        let mut by_tray: Vec<TrayChecked> = trays
            .iter()
            .map(|(tray, members)| TrayChecked { tray: *tray, items: members.len(), looked_at: 0, wrong: 0, untold: 0 })
            .collect();
        for (sorted, judgement) in self.sample() {
            let position = trays.binary_search_by_key(&sorted.tray, |&(tray, _)| tray);
            let Some(tray) = position.ok().and_then(|position| by_tray.get_mut(position)) else { continue };
            tray.looked_at += 1;
            tray.wrong += usize::from(matches!(judgement, Some(Judgement::Wrong | Judgement::Belongs(_))));
            tray.untold += usize::from(matches!(judgement, Some(Judgement::Untold)));
        }
        let sum = |count: fn(&TrayChecked) -> usize| by_tray.iter().map(count).sum::<usize>();
        let (looked_at, wrong, untold) = (sum(|t| t.looked_at), sum(|t| t.wrong), sum(|t| t.untold));
        let (counts, sizes): (Vec<usize>, Vec<usize>) = if self.plan.by_tray {
            by_tray.iter().map(|tray| (tray.items, tray.looked_at)).unzip()
        } else {
            (vec![self.sorting.len()], vec![looked_at])
        };
        let most = Bound { trays: &counts, looked_at: &sizes }.most(wrong + untold, self.plan.confidence);
        Ok(Statement {
            items: self.sorting.len(),
            looked_at,
            wrong,
            untold,
            at_most: most - wrong,
            confidence: self.plan.confidence,
            tolerance: self.plan.tolerance,
            stratified: self.plan.by_tray,
            seed: self.seed,
            date: date.to_owned(),
            trays: by_tray,
        })
    }
}

/// Every tray with the positions of its items, by number.
fn members(sorting: &[Sorted]) -> Vec<(usize, Vec<usize>)> {
    let mut trays = std::collections::BTreeMap::<usize, Vec<usize>>::new();
    for (position, sorted) in sorting.iter().enumerate() {
        trays.entry(sorted.tray).or_default().push(position);
    }
    trays.into_iter().collect()
}

/// One tray's part in a spot check.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
#[serde(rename_all = "camelCase")]
pub struct TrayChecked {
    /// The tray's number.
    pub tray: usize,
    /// How many items were sorted into it.
    pub items: usize,
    /// How many of them were looked at.
    pub looked_at: usize,
    /// How many of those were wrong.
    pub wrong: usize,
    /// Of how many the person could not tell.
    pub untold: usize,
}

/// What a spot check shows. Its text is a sentence that one can sign.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "camelCase")]
pub struct Statement {
    /// How many items were sorted.
    pub items: usize,
    /// How many of them were looked at.
    pub looked_at: usize,
    /// How many of those were wrong; they are corrected.
    pub wrong: usize,
    /// Of how many the person could not tell; they count as wrong and are not corrected.
    pub untold: usize,
    /// At most this many items are in the wrong tray now.
    pub at_most: usize,
    /// The statement's confidence.
    pub confidence: f64,
    /// The tolerated share.
    pub tolerance: f64,
    /// Whether each tray gave its share of the sample.
    pub stratified: bool,
    /// The seed of the draw.
    pub seed: u64,
    /// The date that the caller gave.
    pub date: String,
    /// Each tray's part.
    pub trays: Vec<TrayChecked>,
}

impl Statement {
    /// At most this share of the items is in the wrong tray now.
    pub fn share(&self) -> f64 {
        self.at_most as f64 / self.items as f64
    }

    /// Whether that is no more than what is tolerated.
    pub fn holds(&self) -> bool {
        self.share() <= self.tolerance + ROUNDING
    }
}

/// A share in percent with one digit, rounded up: what is stated is never less than what was shown.
fn percent_up(count: usize, of: usize) -> String {
    let tenths = (count * 1000).div_ceil(of.max(1));
    format!("{}.{} %", tenths / 10, tenths % 10)
}

/// A confidence in percent with as many digits as it has, up to three.
fn percent(share: f64) -> String {
    let text = format!("{:.3}", share * 100.0);
    format!("{} %", text.trim_end_matches('0').trim_end_matches('.'))
}

impl fmt::Display for Statement {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Self { items, looked_at, wrong, seed, date, .. } = self;
        let share = percent_up(self.at_most, *items);
        let confidence = percent(self.confidence);
        let corrected = if *wrong > 0 { " and corrected" } else { "" };
        let untold = if self.untold > 0 { format!(", {} can't be told", self.untold) } else { String::new() };
        let drawn = if self.stratified { " drawn by tray" } else { "" };
        if looked_at == items {
            return write!(
                f,
                "At most {share} of the {items} sorted items are in the wrong tray (all of them looked at, {wrong} \
                 wrong{corrected}{untold}, {date})"
            );
        }
        write!(
            f,
            "At most {share} of the {items} sorted items are in the wrong tray ({confidence} confidence, {looked_at} looked \
             at{drawn}, {wrong} wrong{corrected}{untold}, seed {seed}, {date})"
        )
    }
}
