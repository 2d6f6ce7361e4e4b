//! The façade's part about asking: the next question, strips of look-alikes, and when to stop.

use super::{Sorter, Verdict};
use crate::{ask::Situation, forecast::Outlook, ledger::Answer};

/// Look-alikes that the sorter would all put into one tray, to be confirmed at one go.
#[derive(Debug, Clone, PartialEq)]
pub struct Strip {
    /// The tray.
    pub tray: usize,
    /// The items, the most helpful first.
    pub items: Vec<usize>,
    /// How much their answers help together, over what as many answers to single questions would, 0 to 1.
    pub worth: f64,
    /// Whether the time has come to offer it unasked: ten more answers are expected to bring less than [`STRIP_DUE`], and
    /// at least [`STRIP_APART`] single answers were given since the last strip.
    pub due: bool,
}

/// A strip of fewer saves no key press worth having; one of more is not looked at with care.
pub const STRIP: std::ops::RangeInclusive<usize> = 4..=12;

/// An item is in a strip only if its tray is at least this probable: where many must be taken out again, single questions
/// are quicker.
pub const STRIP_SURE: f64 = 0.5;

/// Strips are offered once ten more answers are expected to bring less than this share. Before, an answer to a single
/// question sorts more of the pile than one in a strip does.
pub const STRIP_DUE: f64 = 0.005;

/// Single questions between two strips: they find what strips, with what the sorter believes, can't.
pub const STRIP_APART: usize = 3;

impl Sorter {
    /// The item whose answer helps most; `None` when every item has an answer. Cost: that of [`Sorter::verdicts`] and of
    /// [`crate::ask`].
    pub fn next_question(&mut self) -> Option<usize> {
        self.next_questions(1).first().copied()
    }

    /// The items whose answers together help most, the most helpful first; fewer than `count` if fewer have no answer.
    pub fn next_questions(&mut self, count: usize) -> Vec<usize> {
        let open = self.open();
        self.choose(&open, count)
    }

    /// Look-alikes to confirm at one go: up to `count` items without an answer that the sorter would rather put into this
    /// tray than not, those whose answers together help most first. To confirm a strip the person must look at every
    /// item of it, so each of them counts as an answer.
    pub fn strip(&mut self, tray: usize, count: usize) -> Vec<usize> {
        let fits = |verdict: &Verdict| {
            verdict.answer == Answer::Open && verdict.tray == Some(tray) && verdict.probability > 0.5
        };
        let verdicts = self.verdicts();
        let fitting: Vec<usize> =
            (0..verdicts.len()).filter(|&item| verdicts[item].as_ref().is_some_and(fits)).collect();
        self.choose(&fitting, count)
    }

    /// How much of what has no answer is expected to be sorted right, and what ten more answers would bring; `None` while
    /// there are fewer than two trays with an answer or when every item has one.
    pub fn outlook(&mut self) -> Option<Outlook> {
        let verdicts = self.verdicts();
        let sure: Vec<f64> = verdicts
            .iter()
            .flatten()
            .filter(|verdict| matches!(verdict.answer, Answer::Open | Answer::Skipped) && verdict.tray.is_some())
            .map(|verdict| verdict.probability)
            .collect();
        let trays = self.learnt().trays.clone();
        let in_tray = |tray| self.ledger.answered().filter(|&(_, own)| own == tray).count();
        let single = trays.iter().filter(|&&tray| in_tray(tray) == 1).count();
        Outlook::new(&sure, self.answers(), trays.len(), single)
    }

    /// A strip for the tray where one helps most; `None` while fewer than two trays have an answer, or where no tray has enough
    /// items of which the sorter is sure enough. To confirm a strip the person must look at every item of it, so each of
    /// them counts as an answer. Cost: that of two questions.
    pub fn best_strip(&mut self) -> Option<Strip> {
        let fitting: Vec<(usize, usize)> = self
            .verdicts()
            .iter()
            .enumerate()
            .filter_map(|(item, verdict)| {
                let verdict = verdict.as_ref()?;
                let sure = verdict.probability > STRIP_SURE && verdict.set_aside.is_none();
                Some((verdict.tray.filter(|_| verdict.answer == Answer::Open && sure)?, item))
            })
            .collect();
        let trays = self.learnt().trays.clone();
        let group = |&tray: &usize| fitting.iter().filter(|&&(own, _)| own == tray).map(|&(_, item)| item).collect();
        let groups: Vec<Vec<usize>> = trays.iter().map(group).collect();
        let outlook = self.outlook()?;
        let due = outlook.after_more.expected - outlook.now.expected < STRIP_DUE
            && self.ledger.since_several() >= STRIP_APART;
        let open = self.open();
        self.with_situation(&open, |situation| {
            let (group, items, worth) = situation.choose_together(&groups, STRIP)?;
            Some(Strip { tray: trays[group], items, worth, due })
        })?
    }

    /// How many items have an answer of any kind, “none of these” and “can't tell” included.
    pub fn answers(&self) -> usize {
        self.pile.items().filter(|&item| self.ledger.answer(item) != Answer::Open).count()
    }

    /// Every item in the pile with its answer, or, without one, as if the sorter's verdict were the answer; items that have
    /// neither are left out.
    pub(crate) fn as_sorted(&mut self) -> Vec<(usize, Answer)> {
        let verdicts = self.verdicts();
        let answer = |item: usize| {
            let verdict = verdicts[item].as_ref()?;
            let sorted = match verdict.answer {
                Answer::Open => Answer::Tray(verdict.tray?),
                given => given,
            };
            Some((item, sorted))
        };
        (0..verdicts.len()).filter_map(answer).collect()
    }

    /// The share of `rest`, of what belongs in a tray, that the sorter puts there with these answers and no others; 1 for
    /// nothing. What was answered is forgotten.
    pub(crate) fn agreement_after(&mut self, answers: &[(usize, Answer)], rest: &[(usize, Answer)]) -> f64 {
        self.ledger = self.ledger.with_answers(answers);
        self.learnt = None;
        let verdicts = self.verdicts();
        let (mut same, mut all) = (0_u32, 0_u32);
        for &(item, answer) in rest {
            let Answer::Tray(tray) = answer else { continue };
            all += 1;
            same += u32::from(verdicts[item].is_some_and(|verdict| verdict.tray == Some(tray)));
        }
        if all == 0 { 1.0 } else { f64::from(same) / f64::from(all) }
    }

    fn open(&self) -> Vec<usize> {
        self.pile.items().filter(|&item| self.ledger.answer(item) == Answer::Open).collect()
    }

    fn choose(&mut self, candidates: &[usize], count: usize) -> Vec<usize> {
        self.with_situation(candidates, |situation| situation.choose(count)).unwrap_or_default()
    }

    /// `None` without a candidate.
    fn with_situation<T>(&mut self, candidates: &[usize], call: impl FnOnce(&Situation) -> T) -> Option<T> {
        if candidates.is_empty() {
            return None;
        }
        self.learnt();
        self.graph();
        let (learnt, graph) = (self.learnt.as_ref()?, self.graph.as_ref()?);
        let answered: Vec<usize> = self.pile.items().filter(|&item| self.ledger.answer(item) != Answer::Open).collect();
        let unsure: Vec<f64> =
            learnt.verdicts.iter().map(|verdict| verdict.as_ref().map_or(0.0, Verdict::unsure)).collect();
        let trays = learnt.trays.len();
        Some(call(&Situation { graph, answered: &answered, candidates, unsure: &unsure, trays }))
    }
}
