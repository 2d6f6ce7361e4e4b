//! The façade: from embeddings and answers to verdicts and the next question.

mod asking;
mod trusting;

use std::sync::Arc;

use ndarray::Array2;
use serde::{Deserialize, Serialize};

use crate::{
    arithmetic::{dot, row, softmax},
    error::{Error, Result},
    head::Head,
    learner::{Learned, LearnerKind},
    ledger::{Action, Answer, Ledger},
    pile::{
        Pile,
        graph::Graph,
        neighbours::Neighbours,
        propagation::{Propagation, Sight},
    },
    prior::Prior,
    space::{CENTRE_CAUTION, Centre, Space},
    starter::Starter,
    support::Support,
    trust::{Reason, Terms},
};
pub use asking::{STRIP, STRIP_APART, STRIP_DUE, STRIP_SURE, Strip};
use trusting::Trusting;

/// The newest version of the saved state.
const STATE_VERSION: u32 = 1;

/// What a sorter is made for; it stays the same for the sorter's life.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Settings {
    /// The encoder's identity, so that embeddings of different encoders never meet.
    pub encoder: String,
    /// The space of its embeddings.
    pub space: Space,
    /// Which learner sorts.
    pub learner: LearnerKind,
    /// The seed of everything that is drawn.
    pub seed: u64,
}

/// What the sorter says of one item.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Verdict {
    /// The tray, or `None` while there are fewer than two trays with an answer and for an item that the person put in
    /// none.
    pub tray: Option<usize>,
    /// How probable that tray is, 0 to 1; 1 for an answered item, 0 without a tray.
    pub probability: f64,
    /// The second choice with its probability.
    pub runner_up: Option<(usize, f64)>,
    /// Why the item is set aside rather than left in that tray, if it is.
    pub set_aside: Option<Reason>,
    /// How much the item is like what it is most like, −1 to 1; 0 while nothing can be said.
    pub likeness: f64,
    /// What the person said.
    pub answer: Answer,
}

impl Verdict {
    /// How unsure: 0 where the first choice is certain, 1 where the second is as probable.
    fn unsure(&self) -> f64 {
        match self.runner_up {
            Some((_, second)) => 1.0 - (self.probability - second),
            None => 1.0,
        }
    }
}

#[derive(Serialize, Deserialize)]
struct State {
    version: u32,
    settings: Settings,
    #[serde(default)]
    terms: Terms,
    /// The identity of the starter.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    starter: Option<String>,
    ledger: Ledger,
}

/// What was learned from the answers as they are, and everything that follows from it.
#[derive(Debug, Clone)]
struct Learnt {
    /// Tray of each category of the head.
    trays: Vec<usize>,
    /// The logits of every item, n × C; no head while there are fewer than two trays with an answer.
    probabilities: Option<Array2<f64>>,
    verdicts: Vec<Option<Verdict>>,
    /// How far that can be relied on; `None` with the probabilities.
    trusting: Option<Trusting>,
}

/// Sorts a pile by the answers given so far.
///
/// ```
/// use kenspeckle::{LearnerKind, Settings, Sorter, Space};
///
/// let settings = Settings {
///     encoder: "my own two numbers".into(),
///     space: Space::new(2, false)?,
///     learner: LearnerKind::Auto,
///     seed: 1,
/// };
/// let mut sorter = Sorter::new(settings);
/// for embedding in [[1.0, 0.1], [0.9, 0.2], [-0.1, 1.0], [0.2, 0.8]] {
///     sorter.add_item(&embedding)?;
/// }
/// let (flat, tall) = (sorter.add_tray("flat")?, sorter.add_tray("tall")?);
/// sorter.answer(0, flat)?;
/// sorter.answer(2, tall)?;
/// assert_eq!(sorter.verdict(1)?.tray, Some(flat));
/// assert_eq!(sorter.verdict(3)?.tray, Some(tall));
/// # Ok::<(), kenspeckle::Error>(())
/// ```
#[derive(Debug, Clone)]
pub struct Sorter {
    settings: Settings,
    prior: Prior,
    pile: Pile,
    ledger: Ledger,
    terms: Terms,
    neighbours: Neighbours,
    /// The graph of the items that are in the pile now.
    graph: Option<Graph>,
    propagation: Propagation,
    one_by_one: bool,
    learnt: Option<Learnt>,
}

impl Sorter {
    /// A sorter with an empty pile and no trays.
    pub fn new(settings: Settings) -> Self {
        Self {
            prior: Prior::default(),
            pile: Pile::new(settings.space),
            ledger: Ledger::default(),
            terms: Terms::default(),
            neighbours: Neighbours::default(),
            graph: None,
            propagation: Propagation::default(),
            one_by_one: false,
            learnt: None,
            settings,
        }
    }

    /// A sorter that starts from what past piles taught. Refuses a starter of another encoder.
    pub fn with_starter(settings: Settings, starter: Arc<Starter>) -> Result<Self> {
        if starter.encoder() != settings.encoder {
            return Err(Error::OtherEncoder { expected: settings.encoder, found: starter.encoder().to_owned() });
        }
        let prior = starter.prior();
        let pile = Pile::with_starter(settings.space, starter)?;
        Ok(Self { prior, pile, ..Self::new(settings) })
    }

    /// The same sorter judging every item by itself, without what the pile's own structure says. For comparisons; the
    /// saved state does not keep it.
    pub fn one_by_one(mut self) -> Self {
        self.one_by_one = true;
        self.learnt = None;
        self
    }

    /// What past piles taught, if anything.
    pub fn starter(&self) -> Option<&Arc<Starter>> {
        self.pile.starter()
    }

    /// What the sorter was made for.
    pub fn settings(&self) -> &Settings {
        &self.settings
    }

    /// How many item numbers are in use, removed items included.
    pub fn items(&self) -> usize {
        self.pile.len()
    }

    /// Adds an item by its embedding (d finite numbers) and gives its number: 0, 1, 2 … in order of arrival, never used
    /// again. Cost O(d).
    pub fn add_item(&mut self, embedding: &[f32]) -> Result<usize> {
        let item = self.pile.add(embedding)?;
        let same = self.ledger.add_item();
        debug_assert_eq!(item, same);
        self.graph = None;
        self.learnt = None;
        Ok(item)
    }

    /// Trays, answers and the log of actions.
    pub fn ledger(&self) -> &Ledger {
        &self.ledger
    }

    fn change<T>(&mut self, action: impl FnOnce(&mut Ledger) -> Result<T>) -> Result<T> {
        let outcome = action(&mut self.ledger)?;
        self.learnt = None;
        Ok(outcome)
    }

    /// Takes an item out of the pile.
    pub fn remove_item(&mut self, item: usize) -> Result<()> {
        self.change(|ledger| ledger.remove_item(item))?;
        self.follow_ledger();
        Ok(())
    }

    /// Makes a tray and gives its number, never used again. Names are 1 to 120 characters and unique without regard to
    /// case.
    pub fn add_tray(&mut self, name: &str) -> Result<usize> {
        self.change(|ledger| ledger.add_tray(name))
    }

    /// Gives a tray another name.
    pub fn rename_tray(&mut self, tray: usize, name: &str) -> Result<()> {
        self.change(|ledger| ledger.rename_tray(tray, name))
    }

    /// Moves all answers of one tray into another; the emptied tray is gone.
    pub fn merge_trays(&mut self, from: usize, into: usize) -> Result<()> {
        self.change(|ledger| ledger.merge_trays(from, into))
    }

    /// Removes a tray; its answers are open again.
    pub fn remove_tray(&mut self, tray: usize) -> Result<()> {
        self.change(|ledger| ledger.remove_tray(tray))
    }

    /// The person's answer: this item belongs in that tray.
    pub fn answer(&mut self, item: usize, tray: usize) -> Result<()> {
        self.change(|ledger| ledger.put(item, tray))
    }

    /// The same answer for several items, as one action.
    pub fn answer_all(&mut self, items: &[usize], tray: usize) -> Result<()> {
        self.change(|ledger| ledger.put_all(items, tray))
    }

    /// Makes a tray for this item, as one action; gives the tray's number.
    pub fn answer_new(&mut self, item: usize, name: &str) -> Result<usize> {
        self.answer_all_new(&[item], name)
    }

    /// Makes a tray for several items, as one action; gives the tray's number.
    pub fn answer_all_new(&mut self, items: &[usize], name: &str) -> Result<usize> {
        self.change(|ledger| ledger.put_in_new(items, name))
    }

    /// The person looked at a doubted answer again and says where the item belongs, the same tray or another: it isn't doubted
    /// again unless it is answered anew. One action.
    pub fn settle_doubt(&mut self, item: usize, tray: usize) -> Result<()> {
        self.change(|ledger| ledger.settle(item, tray))
    }

    /// The person's answer: none of these.
    pub fn answer_none(&mut self, item: usize) -> Result<()> {
        self.change(|ledger| ledger.put_in_none(item))
    }

    /// The person can't tell: the item is still sorted but not asked about again.
    pub fn skip(&mut self, item: usize) -> Result<()> {
        self.change(|ledger| ledger.skip(item))
    }

    /// Takes an answer back.
    pub fn withdraw(&mut self, item: usize) -> Result<()> {
        self.change(|ledger| ledger.withdraw(item))
    }

    /// Undoes the last action and says which it was.
    pub fn undo(&mut self) -> Option<Action> {
        let action = self.ledger.undo();
        self.follow_ledger();
        action
    }

    /// Does the last undone action again and says which it was.
    pub fn redo(&mut self) -> Option<Action> {
        let action = self.ledger.redo();
        self.follow_ledger();
        action
    }

    fn follow_ledger(&mut self) {
        if self.pile.set_removed(|item| self.ledger.is_removed(item)) {
            self.graph = None;
        }
        self.learnt = None;
    }

    /// The verdict of every item number; `None` for removed items.
    ///
    /// Learns anew if anything changed: O(n² d + n³) for n answers, and O(m C d) for m items and C trays; and anew who is
    /// near whom if the pile changed, O(m d) for each item that has arrived and O(m²).
    pub fn verdicts(&mut self) -> &[Option<Verdict>] {
        &self.learnt().verdicts
    }

    /// One item's verdict.
    pub fn verdict(&mut self, item: usize) -> Result<Verdict> {
        let item = self.pile.check(item)?;
        self.learnt().verdicts[item].ok_or(Error::NoSuchItem(item))
    }

    /// Every tray that has an answer, most probable first, for one item; empty while there are fewer than two.
    pub fn ranking(&mut self, item: usize) -> Result<Vec<(usize, f64)>> {
        let item = self.pile.check(item)?;
        let learnt = self.learnt();
        let Some(probabilities) = &learnt.probabilities else { return Ok(Vec::new()) };
        let mut ranking: Vec<(usize, f64)> =
            learnt.trays.iter().copied().zip(probabilities.row(item).iter().copied()).collect();
        ranking.sort_by(|a, b| b.1.total_cmp(&a.1));
        Ok(ranking)
    }

    /// The graph of the items in the pile, made anew if they changed.
    fn graph(&mut self) -> &Graph {
        self.neighbours.catch_up(&self.pile);
        self.graph.get_or_insert_with(|| {
            self.propagation = Propagation::default();
            self.neighbours.graph(&self.pile)
        })
    }

    fn learnt(&mut self) -> &Learnt {
        if self.learnt.is_none() {
            self.learnt = Some(self.learn());
        }
        self.learnt.as_ref().expect("just learnt")
    }

    /// What a spot check found teaches only with the next answer: until then the sorting is the one that it is a statement about.
    fn learn(&mut self) -> Learnt {
        if self.ledger.last() != Some(Action::SpotCheck) {
            return self.learn_from_answers();
        }
        self.ledger.undo();
        let mut learnt = self.learn_from_answers();
        self.ledger.redo();
        for (item, verdict) in learnt.verdicts.iter_mut().enumerate() {
            let Some(verdict) = verdict else { continue };
            match self.ledger.answer(item) {
                answer if answer == verdict.answer => {}
                answer @ (Answer::Open | Answer::Skipped) => verdict.answer = answer,
                Answer::Tray(_) | Answer::None => *verdict = self.judge(item, &[], None),
            }
        }
        learnt
    }

    fn learn_from_answers(&mut self) -> Learnt {
        let mut trays: Vec<usize> = self.ledger.answered().map(|(_, tray)| tray).collect();
        trays.sort_unstable();
        trays.dedup();
        let centre = self.pile.centre();
        let (probabilities, trusting) = match self.support(&trays, &centre) {
            Some(support) => {
                let learned = self.learned(&support);
                let mut probabilities = self.probabilities(&learned.head, &centre);
                let heard = self.hear_the_pile(&trays, &support, &learned, &mut probabilities);
                let trusting = self.trusting(&trays, &centre, support, &learned, (&probabilities, heard));
                (Some(probabilities), Some(trusting))
            }
            None => (None, None),
        };
        let verdicts = (0..self.pile.len())
            .map(|item| {
                let ranked =
                    probabilities.as_ref().map(|all| best_two(all.row(item).as_slice().expect("standard layout")));
                self.pile.contains(item).then(|| {
                    let verdict = self.judge(item, &trays, ranked);
                    match (&trusting, &probabilities) {
                        (Some(trusting), Some(all)) => trusting.complete(item, verdict, all.row(item), &self.terms),
                        _ => verdict,
                    }
                })
            })
            .collect();
        Learnt { trays, probabilities, verdicts, trusting }
    }

    /// The answered items by category, in order, for the trays that have an answer, if there are at least two.
    fn support(&self, trays: &[usize], centre: &Centre) -> Option<Support> {
        let d = self.settings.space.dimension();
        let mut numbers = Vec::new();
        let mut labels = Vec::new();
        for (item, tray) in self.ledger.answered() {
            numbers.extend(centre.view(self.pile.place(item)));
            labels.push(trays.binary_search(&tray).ok()?);
        }
        let rows = Array2::from_shape_vec((labels.len(), d), numbers).ok()?;
        // Fewer than two trays is the one refusal that can happen here, and then there is nothing to tell apart.
        Support::new(rows, labels, trays.len()).ok()
    }

    fn learned(&self, support: &Support) -> Learned {
        let others = self.pile.items().count().saturating_sub(support.len()) as f64;
        let prior = Prior { centre_known: others / (others + CENTRE_CAUTION), ..self.prior.clone() };
        self.settings.learner.learn(support, &prior)
    }

    /// Mixes what the pile's own structure says into the probabilities of all items, as far as the answers bear it out; and
    /// its share in the mix, 0 to 1.
    fn hear_the_pile(
        &mut self,
        trays: &[usize],
        support: &Support,
        learned: &Learned,
        probabilities: &mut Array2<f64>,
    ) -> f64 {
        if self.one_by_one {
            return 0.0;
        }
        let mut members = vec![Vec::new(); trays.len()];
        for ((item, _), &label) in self.ledger.answered().zip(support.labels()) {
            members[label].push(item);
        }
        self.graph();
        let Some(graph) = &self.graph else { return 0.0 };
        self.propagation.update(graph, &members);
        let sights =
            self.ledger.answered().zip(support.labels()).enumerate().filter_map(|(example, ((item, _), &label))| {
                let learner = softmax(learned.left_out.get(example)?)[label];
                let pile = self.propagation.left_out(item, label)?[label];
                Some(Sight { learner, pile })
            });
        let weight = Sight::weight(sights);
        for item in self.pile.items() {
            if let Some(said) = self.propagation.probabilities(item) {
                for (probability, said) in probabilities.row_mut(item).iter_mut().zip(said) {
                    *probability += weight * (said - *probability);
                }
            }
        }
        weight
    }

    /// Probabilities of all items, seen from the centre without moving any: W (u − μ)/‖u − μ‖ + b.
    fn probabilities(&self, head: &Head, centre: &Centre) -> Array2<f64> {
        let weights = head.weights();
        let categories = head.categories();
        let offsets: Vec<f32> = (0..categories).map(|c| dot(row(&weights, c), centre.mean())).collect();
        let mut probabilities = Array2::zeros((self.pile.len(), categories));
        for item in self.pile.items() {
            let place = self.pile.place(item);
            let (_, factor) = self.pile.seen_from(centre, item);
            let logits = ndarray::Array1::from_shape_fn(categories, |c| {
                f64::from((dot(row(&weights, c), place) - offsets[c]) * factor) + head.bias()[c]
            });
            probabilities.row_mut(item).assign(&softmax(logits.view()));
        }
        probabilities
    }

    fn judge(&self, item: usize, trays: &[usize], ranked: Option<((usize, f64), (usize, f64))>) -> Verdict {
        let answer = self.ledger.answer(item);
        let nothing = Verdict { tray: None, probability: 0.0, runner_up: None, set_aside: None, likeness: 0.0, answer };
        match (answer, ranked) {
            (Answer::Tray(tray), _) => Verdict { tray: Some(tray), probability: 1.0, ..nothing },
            (Answer::None, _) | (_, None) => nothing,
            (Answer::Open | Answer::Skipped, Some((first, second))) => Verdict {
                tray: Some(trays[first.0]),
                probability: first.1,
                runner_up: Some((trays[second.0], second.1)),
                ..nothing
            },
        }
    }

    /// Starts from another starter, or from none: the items keep their numbers, trays, answers and the log stay, and
    /// everything is sorted anew. Takes the embeddings of all items in order (items × d), since an item's place depends on
    /// the starter. Cost as for adding the items. On an error nothing is changed.
    pub fn change_starter(&mut self, embeddings: &[f32], starter: Option<Arc<Starter>>) -> Result<()> {
        let d = self.settings.space.dimension();
        if embeddings.len() != self.pile.len() * d {
            return Err(Error::EmbeddingCount { items: self.pile.len(), found: embeddings.len() / d });
        }
        let mut fresh = match starter {
            Some(starter) => Self::with_starter(self.settings.clone(), starter)?,
            None => Self::new(self.settings.clone()),
        };
        for embedding in embeddings.chunks_exact(d) {
            fresh.pile.add(embedding)?;
        }
        fresh.ledger = self.ledger.clone();
        fresh.terms = self.terms;
        fresh.one_by_one = self.one_by_one;
        fresh.follow_ledger();
        *self = fresh;
        Ok(())
    }

    /// Settings, trays, answers and the log as JSON; embeddings are kept by whoever keeps the items.
    pub fn state(&self) -> String {
        let state = State {
            version: STATE_VERSION,
            settings: self.settings.clone(),
            terms: self.terms,
            starter: self.starter().map(|starter| starter.identity()),
            ledger: self.ledger.clone(),
        };
        serde_json::to_string(&state).expect("plain data")
    }

    /// The sorter that was saved, given the embeddings of all its items in order (items × d).
    ///
    /// More embeddings than the state knows items are taken as items that arrived since.
    pub fn restore(state: &str, embeddings: &[f32], starter: Option<Arc<Starter>>) -> Result<Self> {
        #[derive(Deserialize)]
        struct Version {
            version: u32,
        }
        let unreadable = |error: serde_json::Error| Error::StateUnreadable(error.to_string());
        let Version { version } = serde_json::from_str(state).map_err(unreadable)?;
        if version > STATE_VERSION {
            return Err(Error::StateNewer { found: version, known: STATE_VERSION });
        }
        let State { settings, terms, ledger, starter: needed, .. } = serde_json::from_str(state).map_err(unreadable)?;
        if needed != starter.as_ref().map(|starter| starter.identity()) {
            let reason = match needed {
                Some(identity) => format!("it needs the starter {identity}"),
                None => "it was made without a starter".into(),
            };
            return Err(Error::StateUnreadable(reason));
        }
        let space = Space::new(settings.space.dimension(), settings.space.non_negative())?;
        let d = space.dimension();
        if !ledger.is_consistent() {
            return Err(Error::StateUnreadable("it names trays or items that it does not have".into()));
        }
        if !embeddings.len().is_multiple_of(d) || embeddings.len() / d < ledger.items() {
            let held = embeddings.len() / d;
            return Err(Error::StateUnreadable(format!(
                "it has {} items but {held} embeddings came with it",
                ledger.items()
            )));
        }
        let mut sorter = match starter {
            Some(starter) => Self::with_starter(settings, starter)?,
            None => Self::new(settings),
        };
        for embedding in embeddings.chunks_exact(d) {
            sorter.pile.add(embedding)?;
        }
        sorter.ledger = ledger;
        sorter.terms = Terms::new(terms.confidence(), terms.set_aside_share(), terms.only_sure())?;
        while sorter.ledger.items() < sorter.pile.len() {
            sorter.ledger.add_item();
        }
        sorter.follow_ledger();
        Ok(sorter)
    }
}

/// The two largest values with their positions, the first of equals first.
fn best_two(values: &[f64]) -> ((usize, f64), (usize, f64)) {
    let mut first = (0, f64::NEG_INFINITY);
    let mut second = (0, f64::NEG_INFINITY);
    for (position, &value) in values.iter().enumerate() {
        if value > first.1 {
            second = first;
            first = (position, value);
        } else if value > second.1 {
            second = (position, value);
        }
    }
    (first, second)
}
