//! Trays and answers, and every change to them with its way back.
//!
//! A [`Change`] holds what it needs to be undone; an entry of the log is the changes of one action by the person.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use crate::error::{Error, Result};

/// Most characters in a tray's name.
pub const NAME_LIMIT: usize = 120;

/// What the person said of an item.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Answer {
    /// Nothing yet.
    #[default]
    Open,
    /// It belongs in this tray.
    Tray(usize),
    /// It belongs in none of the trays.
    None,
    /// The person can't tell.
    Skipped,
}

/// A tray: its number is its place in the ledger and is never used again.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Tray {
    /// The name people read.
    pub name: String,
    /// Whether it is still there: not removed and not merged into another.
    pub live: bool,
}

/// What a change did, named after the action it belongs to.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Action {
    /// An item was put into a tray.
    Answer,
    /// An item was declared to belong in no tray.
    None,
    /// The person could not tell.
    Skip,
    /// An answer was taken back.
    Withdraw,
    /// A tray was made.
    AddTray,
    /// A tray got another name.
    RenameTray,
    /// One tray went into another.
    MergeTrays,
    /// A tray was removed.
    RemoveTray,
    /// An item was taken out of the pile.
    RemoveItem,
    /// A doubted answer was looked at again and stays.
    Keep,
    /// The items of a spot check got what the person said of them.
    SpotCheck,
}

impl Action {
    /// The kebab-case name.
    pub fn name(self) -> &'static str {
        match self {
            Self::Answer => "answer",
            Self::None => "none",
            Self::Skip => "skip",
            Self::Withdraw => "withdraw",
            Self::AddTray => "add-tray",
            Self::RenameTray => "rename-tray",
            Self::MergeTrays => "merge-trays",
            Self::RemoveTray => "remove-tray",
            Self::RemoveItem => "remove-item",
            Self::Keep => "keep",
            Self::SpotCheck => "spot-check",
        }
    }
}

#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
enum Change {
    Answered { item: usize, from: Answer, to: Answer },
    TrayMade { tray: usize },
    TrayGone { tray: usize },
    Renamed { tray: usize, from: String, to: String },
    ItemGone { item: usize },
    Kept { item: usize, from: Option<usize>, to: Option<usize> },
}

#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
struct Entry {
    action: Action,
    changes: Vec<Change>,
}

/// The trays, the answers, and the log of what was done.
#[derive(Debug, Clone, Default, PartialEq, Eq, Serialize, Deserialize)]
pub struct Ledger {
    trays: Vec<Tray>,
    answers: Vec<Answer>,
    removed: Vec<bool>,
    /// Items whose answer was doubted and stays, with its tray.
    #[serde(default, skip_serializing_if = "BTreeMap::is_empty")]
    kept: BTreeMap<usize, usize>,
    done: Vec<Entry>,
    undone: Vec<Entry>,
}

impl Ledger {
    /// Makes room for one more item and gives its number.
    pub(crate) fn add_item(&mut self) -> usize {
        self.answers.push(Answer::Open);
        self.removed.push(false);
        self.answers.len() - 1
    }

    /// How many item numbers are in use.
    pub fn items(&self) -> usize {
        self.answers.len()
    }

    /// The answer for an item.
    pub fn answer(&self, item: usize) -> Answer {
        self.answers[item]
    }

    /// Whether the item was taken out of the pile.
    pub fn is_removed(&self, item: usize) -> bool {
        self.removed[item]
    }

    /// The trays that are there, by number, in the order they were made.
    pub fn trays(&self) -> impl Iterator<Item = (usize, &str)> {
        self.trays.iter().enumerate().filter(|(_, tray)| tray.live).map(|(number, tray)| (number, tray.name.as_str()))
    }

    /// Items answered with a tray, in order, with the tray.
    pub fn answered(&self) -> impl Iterator<Item = (usize, usize)> + '_ {
        self.answers.iter().enumerate().filter_map(|(item, answer)| match answer {
            Answer::Tray(tray) if !self.removed[item] => Some((item, *tray)),
            _ => None,
        })
    }

    /// Items whose answer names another tray than an earlier answer did, with the earlier tray; trays that are gone don't count.
    pub(crate) fn changed_answers(&self) -> Vec<(usize, usize)> {
        let mut earlier = BTreeMap::new();
        for change in self.done.iter().filter(|entry| entry.action == Action::Answer).flat_map(|entry| &entry.changes) {
            if let Change::Answered { item, from: Answer::Tray(tray), .. } = change {
                earlier.insert(*item, *tray);
            }
        }
        let differs = |&(item, tray): &(usize, usize)| {
            matches!(self.answers[item], Answer::Tray(now) if now != tray) && self.trays[tray].live
        };
        earlier.into_iter().filter(|&(item, _)| !self.removed[item]).filter(differs).collect()
    }

    /// Whether the person looked at the item's answer again and left it as it is.
    pub fn is_kept(&self, item: usize) -> bool {
        self.kept.get(&item).is_some_and(|&tray| self.answers[item] == Answer::Tray(tray))
    }

    /// The person looked at a doubted answer again and says where the item belongs; another answer later ends that. One
    /// action, whether the answer changes or stays.
    pub fn settle(&mut self, item: usize, tray: usize) -> Result<()> {
        let (item, tray) = (self.present(item)?, self.live(tray)?);
        let (from, to) = (self.answers[item], Answer::Tray(tray));
        let kept = Change::Kept { item, from: self.kept.get(&item).copied(), to: Some(tray) };
        if from != to {
            self.record(Action::Answer, vec![Change::Answered { item, from, to }, kept]);
        } else if !self.is_kept(item) {
            self.record(Action::Keep, vec![kept]);
        }
        Ok(())
    }

    /// Gives several items an answer each, as one action that counts as done even if no answer is new.
    pub(crate) fn put_each(&mut self, action: Action, answers: &[(usize, Answer)]) -> Result<()> {
        for &(item, to) in answers {
            self.present(item)?;
            if let Answer::Tray(tray) = to {
                self.live(tray)?;
            }
        }
        let change = |&(item, to): &(usize, Answer)| Change::Answered { item, from: self.answers[item], to };
        self.record(action, answers.iter().map(change).collect());
        Ok(())
    }

    /// What was done last and not undone.
    pub(crate) fn last(&self) -> Option<Action> {
        self.done.last().map(|entry| entry.action)
    }

    /// How many actions spoke of one item since the last that answered several; all of them if none did.
    pub(crate) fn since_several(&self) -> usize {
        let answered = |change: &&Change| matches!(change, Change::Answered { .. });
        let items = |entry: &Entry| entry.changes.iter().filter(answered).count();
        let spoken = |entry: &&Entry| matches!(entry.action, Action::Answer | Action::None | Action::Skip);
        self.done
            .iter()
            .rev()
            .filter(spoken)
            .map(items)
            .take_while(|&items| items < 2)
            .filter(|&items| items == 1)
            .count()
    }

    /// The same items and trays with these answers and no others, and without a log.
    pub(crate) fn with_answers(&self, answers: &[(usize, Answer)]) -> Self {
        let mut own = vec![Answer::Open; self.answers.len()];
        answers.iter().for_each(|&(item, answer)| own[item] = answer);
        Self { trays: self.trays.clone(), answers: own, removed: self.removed.clone(), ..Self::default() }
    }

    fn live(&self, tray: usize) -> Result<usize> {
        if self.trays.get(tray).is_some_and(|t| t.live) { Ok(tray) } else { Err(Error::NoSuchTray(tray)) }
    }

    fn present(&self, item: usize) -> Result<usize> {
        if self.removed.get(item) == Some(&false) { Ok(item) } else { Err(Error::NoSuchItem(item)) }
    }

    /// The name without blanks around it, if it can be a tray's name; `except` may already have it.
    fn free_name(&self, name: &str, except: Option<usize>) -> Result<String> {
        let name = name.trim();
        if name.is_empty() {
            return Err(Error::TrayNameEmpty);
        }
        let length = name.chars().count();
        if length > NAME_LIMIT {
            return Err(Error::TrayNameTooLong { limit: NAME_LIMIT, found: length });
        }
        let folded = name.to_lowercase();
        match self.trays().find(|&(number, other)| Some(number) != except && other.to_lowercase() == folded) {
            Some((_, other)) => Err(Error::TrayNameTaken(other.to_owned())),
            None => Ok(name.to_owned()),
        }
    }

    fn set(&mut self, action: Action, item: usize, to: Answer) -> Result<()> {
        let item = self.present(item)?;
        let from = self.answers[item];
        if from != to {
            self.record(action, vec![Change::Answered { item, from, to }]);
        }
        Ok(())
    }

    /// Puts an item into a tray; moves it if it was in another.
    pub fn put(&mut self, item: usize, tray: usize) -> Result<()> {
        let tray = self.live(tray)?;
        self.set(Action::Answer, item, Answer::Tray(tray))
    }

    /// Puts several items into a tray as one action.
    pub fn put_all(&mut self, items: &[usize], tray: usize) -> Result<()> {
        let to = Answer::Tray(self.live(tray)?);
        for &item in items {
            self.present(item)?;
        }
        let change = |&item: &usize| Change::Answered { item, from: self.answers[item], to };
        let moved = |item: &&usize| self.answers[**item] != to;
        let changes: Vec<Change> = items.iter().filter(moved).map(change).collect();
        if !changes.is_empty() {
            self.record(Action::Answer, changes);
        }
        Ok(())
    }

    /// Makes a tray and puts items into it as one action; gives the tray's number.
    pub fn put_in_new(&mut self, items: &[usize], name: &str) -> Result<usize> {
        for &item in items {
            self.present(item)?;
        }
        let name = self.free_name(name, None)?;
        let tray = self.make(name);
        let answered = |&item: &usize| Change::Answered { item, from: self.answers[item], to: Answer::Tray(tray) };
        let changes = std::iter::once(Change::TrayMade { tray }).chain(items.iter().map(answered)).collect();
        self.record(Action::Answer, changes);
        Ok(tray)
    }

    /// Declares that an item belongs in no tray.
    pub fn put_in_none(&mut self, item: usize) -> Result<()> {
        self.set(Action::None, item, Answer::None)
    }

    /// Notes that the person can't tell.
    pub fn skip(&mut self, item: usize) -> Result<()> {
        self.set(Action::Skip, item, Answer::Skipped)
    }

    /// Takes an answer back.
    pub fn withdraw(&mut self, item: usize) -> Result<()> {
        self.set(Action::Withdraw, item, Answer::Open)
    }

    fn make(&mut self, name: String) -> usize {
        // A tray that was made and undone leaves its number behind: numbers are never used again.
        self.trays.push(Tray { name, live: false });
        self.trays.len() - 1
    }

    /// Makes a tray and gives its number.
    pub fn add_tray(&mut self, name: &str) -> Result<usize> {
        let name = self.free_name(name, None)?;
        let tray = self.make(name);
        self.record(Action::AddTray, vec![Change::TrayMade { tray }]);
        Ok(tray)
    }

    /// Gives a tray another name.
    pub fn rename_tray(&mut self, tray: usize, name: &str) -> Result<()> {
        let tray = self.live(tray)?;
        let to = self.free_name(name, Some(tray))?;
        let from = self.trays[tray].name.clone();
        if from != to {
            self.record(Action::RenameTray, vec![Change::Renamed { tray, from, to }]);
        }
        Ok(())
    }

    /// Moves all answers of one tray into another; the emptied tray is gone.
    pub fn merge_trays(&mut self, from: usize, into: usize) -> Result<()> {
        let (from, into) = (self.live(from)?, self.live(into)?);
        if from == into {
            return Err(Error::MergeIntoItself);
        }
        let mut changes = self.emptied(from, Answer::Tray(into));
        changes.push(Change::TrayGone { tray: from });
        self.record(Action::MergeTrays, changes);
        Ok(())
    }

    /// Removes a tray; its answers are open again.
    pub fn remove_tray(&mut self, tray: usize) -> Result<()> {
        let tray = self.live(tray)?;
        let mut changes = self.emptied(tray, Answer::Open);
        changes.push(Change::TrayGone { tray });
        self.record(Action::RemoveTray, changes);
        Ok(())
    }

    fn emptied(&self, tray: usize, to: Answer) -> Vec<Change> {
        let own = |(item, &answer): (usize, &Answer)| (answer == Answer::Tray(tray)).then_some(item);
        let from = Answer::Tray(tray);
        self.answers.iter().enumerate().filter_map(own).map(|item| Change::Answered { item, from, to }).collect()
    }

    /// Takes an item out of the pile.
    pub fn remove_item(&mut self, item: usize) -> Result<()> {
        let item = self.present(item)?;
        self.record(Action::RemoveItem, vec![Change::ItemGone { item }]);
        Ok(())
    }

    fn record(&mut self, action: Action, changes: Vec<Change>) {
        changes.iter().for_each(|change| self.apply(change, true));
        self.done.push(Entry { action, changes });
        self.undone.clear();
    }

    fn apply(&mut self, change: &Change, forward: bool) {
        match change {
            Change::Answered { item, from, to } => self.answers[*item] = if forward { *to } else { *from },
            Change::TrayMade { tray } => self.trays[*tray].live = forward,
            Change::TrayGone { tray } => self.trays[*tray].live = !forward,
            Change::Renamed { tray, from, to } => self.trays[*tray].name.clone_from(if forward { to } else { from }),
            Change::ItemGone { item } => self.removed[*item] = forward,
            Change::Kept { item, from, to } => match if forward { to } else { from } {
                Some(tray) => drop(self.kept.insert(*item, *tray)),
                None => drop(self.kept.remove(item)),
            },
        }
    }

    /// Undoes the last action and says which it was; `None` if there is none.
    pub fn undo(&mut self) -> Option<Action> {
        let entry = self.done.pop()?;
        entry.changes.iter().rev().for_each(|change| self.apply(change, false));
        let action = entry.action;
        self.undone.push(entry);
        Some(action)
    }

    /// Does the last undone action again and says which it was; `None` if there is none.
    pub fn redo(&mut self) -> Option<Action> {
        let entry = self.undone.pop()?;
        entry.changes.iter().for_each(|change| self.apply(change, true));
        let action = entry.action;
        self.done.push(entry);
        Some(action)
    }

    /// Whether there is something to undo.
    pub fn can_undo(&self) -> bool {
        !self.done.is_empty()
    }

    /// Whether there is something to redo.
    pub fn can_redo(&self) -> bool {
        !self.undone.is_empty()
    }

    /// Whether every number in it names something that is there, as after reading it from outside.
    pub(crate) fn is_consistent(&self) -> bool {
        let tray_ok = |answer: &Answer| !matches!(answer, Answer::Tray(tray) if *tray >= self.trays.len());
        let change_ok = |change: &Change| match change {
            Change::Answered { item, from, to } => *item < self.answers.len() && tray_ok(from) && tray_ok(to),
            Change::TrayMade { tray } | Change::TrayGone { tray } | Change::Renamed { tray, .. } => {
                *tray < self.trays.len()
            }
            Change::ItemGone { item } => *item < self.answers.len(),
            Change::Kept { item, .. } => *item < self.answers.len(),
        };
        let live_ok = |answer: &Answer| !matches!(answer, Answer::Tray(tray) if !self.trays[*tray].live);
        self.removed.len() == self.answers.len()
            && self.kept.keys().all(|&item| item < self.answers.len())
            && self.answers.iter().all(|answer| tray_ok(answer) && live_ok(answer))
            && self.done.iter().chain(&self.undone).flat_map(|entry| &entry.changes).all(change_ok)
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    type Visible = (Vec<(usize, String)>, Vec<Answer>, Vec<bool>, BTreeMap<usize, usize>);

    fn visible(ledger: &Ledger) -> Visible {
        let trays = ledger.trays().map(|(number, name)| (number, name.to_owned())).collect();
        (trays, ledger.answers.clone(), ledger.removed.clone(), ledger.kept.clone())
    }

    fn act(ledger: &mut Ledger, (what, a, b): (u8, usize, usize)) {
        // Refusals are part of the play: a refused action must change nothing.
        let before = visible(ledger);
        let refused = match what {
            0 => ledger.put(a, b).is_err(),
            1 => ledger.put_in_none(a).is_err(),
            2 => ledger.skip(a).is_err(),
            3 => ledger.withdraw(a).is_err(),
            4 => ledger.add_tray(&format!("t{b}")).is_err(),
            5 => ledger.rename_tray(b, &format!("t{a}")).is_err(),
            6 => ledger.merge_trays(a, b).is_err(),
            7 => ledger.remove_tray(b).is_err(),
            8 => ledger.remove_item(a).is_err(),
            9 => ledger.put_in_new(&[a, (a + 1) % 6], &format!("n{b}")).is_err(),
            10 => ledger.settle(a, b).is_err(),
            11 => ledger.put_each(Action::SpotCheck, &[(a, Answer::Tray(b)), ((a + 1) % 6, Answer::Skipped)]).is_err(),
            _ => ledger.put_all(&[a, (a + 1) % 6], b).is_err(),
        };
        if refused {
            assert_eq!(visible(ledger), before);
        }
    }

    proptest! {
        #[test]
        fn everything_can_be_undone_and_done_again(actions in prop::collection::vec((0_u8..=12, 0_usize..6, 0_usize..4), 1..40)) {
            let mut ledger = Ledger::default();
            (0..6).for_each(|_| { ledger.add_item(); });
            let mut steps = vec![visible(&ledger)];
            for action in actions {
                act(&mut ledger, action);
                prop_assert!(ledger.is_consistent());
                if ledger.done.len() == steps.len() {
                    steps.push(visible(&ledger));
                }
            }
            for expected in steps.iter().rev().skip(1) {
                prop_assert!(ledger.undo().is_some());
                prop_assert_eq!(&visible(&ledger), expected);
            }
            prop_assert!(ledger.undo().is_none());
            for expected in steps.iter().skip(1) {
                prop_assert!(ledger.redo().is_some());
                prop_assert_eq!(&visible(&ledger), expected);
            }
            prop_assert!(ledger.redo().is_none());
        }
    }

    #[test]
    fn names_are_trimmed_and_told_apart_without_regard_to_case() {
        let mut ledger = Ledger::default();
        let tray = ledger.add_tray("  Rim sherds ").unwrap();
        assert_eq!(ledger.trays().next(), Some((tray, "Rim sherds")));
        assert_eq!(ledger.add_tray("RIM SHERDS").unwrap_err().code(), "tray-name-taken");
        assert_eq!(ledger.add_tray(" \t").unwrap_err().code(), "tray-name-empty");
        assert_eq!(ledger.add_tray(&"x".repeat(121)).unwrap_err().code(), "tray-name-too-long");
        ledger.rename_tray(tray, "rim sherds").unwrap();
        ledger.remove_tray(tray).unwrap();
        assert!(ledger.add_tray("Rim sherds").is_ok());
    }
}
