//! The façade's part about trust: what is plausible, what is set aside, how well the answers sort each other, spot checks.

use std::collections::BTreeSet;

use ndarray::{Array2, ArrayView1};

use super::{Learnt, Sorter, Verdict};
use crate::{
    arithmetic::{dot, row, softmax},
    error::Result,
    learner::Learned,
    ledger::{Action, Answer},
    space::Centre,
    support::Support,
    trust::{
        Reason, Terms,
        assessment::Assessment,
        doubt::{self, Doubt},
        evidence::Evidence,
        learning_curve::LearningCurve,
        novelty::{Novelty, Scene},
        prediction_set::PredictionSets,
        spot_check::{Judgement, Plan, Sorted, SpotCheck},
    },
};

/// How far what was learned can be relied on.
#[derive(Debug, Clone)]
pub(super) struct Trusting {
    support: Support,
    /// The item of each example.
    items: Vec<usize>,
    evidence: Evidence,
    sets: PredictionSets,
    novelty: Novelty,
    threshold: Option<f64>,
}

impl Trusting {
    /// The verdict with what is to be said of its reliability; an item that the person spoke of is not set aside.
    pub(super) fn complete(
        &self,
        item: usize,
        verdict: Verdict,
        probabilities: ArrayView1<f64>,
        terms: &Terms,
    ) -> Verdict {
        if !matches!(verdict.answer, Answer::Open | Answer::Skipped) {
            return verdict;
        }
        let likeness = self.novelty.likeness(item);
        let set_aside = if self.threshold.is_some_and(|threshold| likeness < threshold) {
            let lonely = self.evidence.counts()[self.novelty.nearest(item)] == 1;
            Some(if lonely { Reason::TooLittle } else { Reason::Unlike })
        } else if terms.only_sure() {
            match self.sets.plausible(probabilities).len() {
                0 => Some(Reason::Unlike),
                1 => None,
                many if many == probabilities.len() && many > 2 => Some(Reason::TooLittle),
                _ => Some(Reason::Between),
            }
        } else {
            None
        };
        Verdict { set_aside, likeness, ..verdict }
    }
}

impl Sorter {
    /// What the person asks of the sorter's care.
    pub fn terms(&self) -> &Terms {
        &self.terms
    }

    /// Asks for another confidence or another share to set aside.
    pub fn set_terms(&mut self, terms: Terms) {
        self.terms = terms;
        self.learnt = None;
    }

    /// The trays that can't be ruled out for an item at the confidence of the terms, most probable first; only the answer's
    /// for an answered item. Empty where even the first choice is less probable than usual, and while fewer than two
    /// trays have an answer. What holds is said at [`crate::trust::prediction_set`].
    pub fn plausible(&mut self, item: usize) -> Result<Vec<usize>> {
        let item = self.pile.check(item)?;
        if let Answer::Tray(tray) = self.ledger.answer(item) {
            return Ok(vec![tray]);
        }
        let Learnt { trays, probabilities, trusting, .. } = self.learnt();
        Ok(match (probabilities, trusting) {
            (Some(probabilities), Some(trusting)) => {
                let set = trusting.sets.plausible(probabilities.row(item));
                set.into_iter().map(|category| trays[category]).collect()
            }
            _ => Vec::new(),
        })
    }

    /// The plausible trays of every item number, as [`Sorter::plausible`] gives them; none for removed items. Cost O(m C).
    pub fn plausible_sets(&mut self) -> Vec<Vec<usize>> {
        (0..self.pile.len()).map(|item| self.plausible(item).unwrap_or_default()).collect()
    }

    /// How well the answers sort each other; `None` while fewer than two trays have an answer.
    pub fn assessment(&mut self) -> Option<Assessment> {
        let seed = self.settings.seed;
        let Learnt { trays, trusting, .. } = self.learnt();
        let trusting = trusting.as_ref()?;
        let mut assessment = Assessment::new(&trusting.evidence, trays, &trusting.items, None);
        assessment.curve = LearningCurve::new(&trusting.support, &assessment.share, seed);
        Some(assessment)
    }

    /// Answers that may be wrong, the gravest first, without those that the person looked at again.
    pub fn doubts(&mut self) -> Vec<Doubt> {
        let earlier = self.ledger.changed_answers();
        let Learnt { trays, trusting, .. } = self.learnt();
        let mut doubts = trusting.as_ref().map_or_else(Vec::new, |trusting| {
            doubt::doubts(&trusting.evidence, &trusting.support, trays, &trusting.items, &earlier)
        });
        doubts.retain(|doubt| !self.ledger.is_kept(doubt.item));
        doubts
    }

    /// The items that the sorter itself put into a tray, with the tray: neither answered nor set aside.
    pub fn sorted(&mut self) -> Vec<Sorted> {
        let sorted = |(item, verdict): (usize, &Option<Verdict>)| {
            let verdict = verdict.as_ref()?;
            let open = matches!(verdict.answer, Answer::Open | Answer::Skipped) && verdict.set_aside.is_none();
            Some(Sorted { item, tray: verdict.tray.filter(|_| open)? })
        };
        self.verdicts().iter().enumerate().filter_map(sorted).collect()
    }

    /// How many items a spot check of the sorting as it is now would look at.
    pub fn spot_check_size(&mut self, plan: &Plan) -> Result<usize> {
        Ok(self.spot_check(*plan, 0)?.left())
    }

    /// Draws a spot check from the sorting as it is now. It holds that sorting still: what it shows is about it and its
    /// corrections, not about what later answers change.
    pub fn spot_check(&mut self, plan: Plan, seed: u64) -> Result<SpotCheck> {
        SpotCheck::draw(plan, self.sorted(), seed)
    }

    /// Takes what the person said of the items of a spot check as answers, as one action: right and belonging elsewhere as the
    /// tray, wrong as none of these, what can't be told as that. Items and trays that are gone since are left out.
    ///
    /// Until anything else is answered, the rest of the pile stays sorted as it was when the check was drawn, so that
    /// the statement is about what is there.
    pub fn answer_checked(&mut self, check: &SpotCheck) -> Result<()> {
        let live: Vec<usize> = self.ledger.trays().map(|(tray, _)| tray).collect();
        let answer = |(sorted, judgement): (Sorted, Option<Judgement>)| {
            let answer = match judgement? {
                Judgement::Right => Answer::Tray(sorted.tray),
                Judgement::Belongs(tray) => Answer::Tray(tray),
                Judgement::Wrong => Answer::None,
                Judgement::Untold => Answer::Skipped,
            };
            let gone = matches!(answer, Answer::Tray(tray) if !live.contains(&tray));
            (self.pile.contains(sorted.item) && !gone).then_some((sorted.item, answer))
        };
        let answers: Vec<(usize, Answer)> = check.sample().filter_map(answer).collect();
        self.change(|ledger| ledger.put_each(Action::SpotCheck, &answers))
    }

    /// Whether a spot check is a statement about the sorting as it is now: every item that it is about is where the check left
    /// it, no other is sorted, and nothing was answered since it was finished.
    pub fn is_about_now(&mut self, check: &SpotCheck) -> bool {
        if self.ledger.last() != Some(Action::SpotCheck) {
            return false;
        }
        let judged: BTreeSet<usize> =
            check.sample().filter(|(_, said)| said.is_some()).map(|(sorted, _)| sorted.item).collect();
        let corrected = check.corrected();
        let about: BTreeSet<usize> = corrected.iter().map(|&(item, _)| item).collect();
        let others = self.sorted().iter().any(|sorted| !about.contains(&sorted.item));
        let verdicts = self.verdicts();
        let stays = |&(item, tray): &(usize, Option<usize>)| {
            let verdict = verdicts.get(item).copied().flatten();
            verdict.is_some_and(|verdict| {
                let by_person = matches!(verdict.answer, Answer::Tray(_) | Answer::None);
                let as_left = if judged.contains(&item) { verdict.answer != Answer::Open } else { !by_person };
                verdict.tray == tray && verdict.set_aside.is_none() && as_left
            })
        };
        !others && corrected.iter().all(stays)
    }

    pub(super) fn trusting(
        &mut self,
        trays: &[usize],
        centre: &Centre,
        support: Support,
        learned: &Learned,
        (probabilities, heard): (&Array2<f64>, f64),
    ) -> Trusting {
        let items: Vec<usize> = self.ledger.answered().map(|(item, _)| item).collect();
        let mut evidence = Evidence::new(support.labels(), trays.len());
        for (example, logits) in learned.left_out.iter() {
            let mut own = softmax(logits);
            // As the item would be sorted: with the pile's share in it.
            if let Some(said) = self.propagation.left_out(items[example], support.labels()[example])
                && heard > 0.0
            {
                own.iter_mut().zip(said).for_each(|(own, said)| *own += heard * (said - *own));
            }
            evidence.set(example, own.view());
        }
        self.graph();
        let (pile, ledger, graph) = (&self.pile, &self.ledger, &self.graph);
        let open = |&item: &usize| matches!(ledger.answer(item), Answer::Open | Answer::Skipped);
        let rows = pile.items().filter(open).map(|item| probabilities.row(item));
        let sets = PredictionSets::new(&evidence, rows, self.terms.confidence());

        let means = support.means().mapv(|x| x as f32);
        let means_view = means.view();
        let offsets: Vec<f32> = (0..trays.len()).map(|c| dot(row(&means_view, c), centre.mean())).collect();
        let mut with_means = Array2::zeros((pile.len(), trays.len()));
        for item in pile.items() {
            let (place, (_, factor)) = (pile.place(item), pile.seen_from(centre, item));
            for c in 0..trays.len() {
                with_means[[item, c]] = f64::from((dot(row(&means_view, c), place) - offsets[c]) * factor);
            }
        }
        let cosine = |a: usize, b: usize| {
            let seen = |item| pile.seen_from(centre, item);
            f64::from(centre.cosine(pile.product(a, b), seen(a), seen(b)))
        };
        let novelty = Novelty::new(&Scene {
            support: &support,
            examples: &items,
            items: pile.len(),
            with_means,
            cosine: &cosine,
            neighbours: &|item| graph.iter().flat_map(|graph| graph.nearest(item)).collect(),
        });
        let threshold = novelty.threshold(self.terms.set_aside_share());
        Trusting { support, items, evidence, sets, novelty, threshold }
    }
}
