//! The sorter for JavaScript.

use serde::{Deserialize, Serialize};
use wasm_bindgen::prelude::*;

use super::{OrThrow, js_error, starter::GivenStarter};
use crate::{LearnerKind, Settings, Space, forecast, ledger::Answer, sorter, trust::Reason};

pub(super) fn to_js(value: &impl Serialize) -> JsValue {
    serde_wasm_bindgen::to_value(value).unwrap_or(JsValue::UNDEFINED)
}

#[wasm_bindgen(typescript_custom_section)]
const TYPES: &str = r#"
export type LearnerName = "auto" | "prototype" | "ridge" | "gradient";

/** What a sorter is made for. */
export interface SorterOptions {
  /** The encoder's identity: embeddings of different encoders never meet in one sorter. */
  encoder: string;
  /** Numbers in an embedding, 2 to 4096. */
  dimension: number;
  /** Whether the encoder never gives a negative number. */
  nonNegative: boolean;
  /** Which learner sorts; "auto" if left out. */
  learner?: LearnerName;
  /** Seed of everything that is drawn, a whole number from 0; 1 if left out. */
  seed?: number;
  /** What past piles taught, to start from. The sorter keeps a share: the caller still frees its own. */
  starter?: Starter;
}

export interface Tray {
  tray: number;
  name: string;
  /** Items that the person put in. */
  answers: number;
}

/** One entry an item number. */
export interface Verdicts {
  /** The tray; −1 not sorted, −2 the item was removed. */
  tray: Int32Array;
  /** 0 to 1; 1 for answered items, 0 without a tray. */
  probability: Float32Array;
  /** Second choice or −1. */
  runnerUp: Int32Array;
  runnerUpProbability: Float32Array;
  /** 0 sorted by the sorter, 1 answered, 2 answered "none of these", 3 "can't tell", 4 removed. */
  status: Uint8Array;
  /** Why it is set aside rather than left in the tray: 0 it is not, 1 unlike anything shown, 2 between trays, 3 too little to judge by. */
  setAside: Uint8Array;
  /** How much it is like what it is most like, −1 to 1; 0 while nothing can be said. */
  likeness: Float32Array;
}

export interface RankedTray {
  tray: number;
  probability: number;
}

/** Shares from 0 to 1; the interval holds the truth in about 95 of 100 piles. */
export interface ShareRange {
  low: number;
  expected: number;
  high: number;
}

/** How much of what has no answer is sorted right, now and after ten more answers to the sorter's own questions. */
export interface Outlook {
  now: ShareRange;
  afterTenMore: ShareRange;
}

export type ActionName =
  | "answer" | "none" | "skip" | "withdraw" | "add-tray" | "rename-tray" | "merge-trays" | "remove-tray" | "remove-item"
  | "keep" | "spot-check";
"#;

#[wasm_bindgen]
extern "C" {
    /// Options from JavaScript.
    #[wasm_bindgen(typescript_type = "SorterOptions")]
    pub type SorterOptions;
    #[wasm_bindgen(method, getter, catch)]
    fn starter(this: &SorterOptions) -> Result<Option<GivenStarter>, JsValue>;
    /// Trays for JavaScript.
    #[wasm_bindgen(typescript_type = "Tray[]")]
    pub type Trays;
    /// Verdicts for JavaScript.
    #[wasm_bindgen(typescript_type = "Verdicts")]
    pub type Verdicts;
    /// A ranking for JavaScript.
    #[wasm_bindgen(typescript_type = "RankedTray[]")]
    pub type RankedTrays;
    /// An outlook for JavaScript.
    #[wasm_bindgen(typescript_type = "Outlook | undefined")]
    pub type Outlook;
    /// An action's name.
    #[wasm_bindgen(typescript_type = "ActionName | undefined")]
    pub type ActionName;
}

#[derive(Deserialize)]
#[serde(rename_all = "camelCase")]
struct Options {
    encoder: String,
    dimension: usize,
    non_negative: bool,
    #[serde(default)]
    learner: LearnerKind,
    #[serde(default = "first_seed")]
    seed: f64,
}

fn first_seed() -> f64 {
    1.0
}

#[derive(Serialize)]
struct Tray<'a> {
    tray: usize,
    name: &'a str,
    answers: usize,
}

#[derive(Serialize)]
struct RankedTray {
    tray: usize,
    probability: f64,
}

#[derive(Serialize)]
pub(super) struct ShareRange {
    low: f64,
    expected: f64,
    high: f64,
}

impl From<forecast::Range> for ShareRange {
    fn from(range: forecast::Range) -> Self {
        Self { low: range.low, expected: range.expected, high: range.high }
    }
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct OutlookShown {
    now: ShareRange,
    after_ten_more: ShareRange,
}

/// Sorts a pile by the answers given so far. Calls are synchronous: use it in a worker.
#[wasm_bindgen]
pub struct Sorter(pub(super) sorter::Sorter);

#[wasm_bindgen]
impl Sorter {
    /// A sorter with an empty pile and no trays.
    ///
    /// Throws "options" when they are incomplete, "dimension-out-of-range", and "other-encoder" or "starter-unreadable"
    /// for a starter that was made for other embeddings.
    #[wasm_bindgen(constructor)]
    pub fn new(options: SorterOptions) -> Result<Sorter, JsValue> {
        // What is no object has no starter either, and is refused below.
        let starter = options.starter().unwrap_or_default().map(|given| given.get()).transpose()?;
        let options: Options = serde_wasm_bindgen::from_value(options.into())
            .map_err(|error| js_error("options", &format!("the sorter's options can't be used: {error}")))?;
        if !(options.seed >= 0.0 && options.seed.fract() == 0.0 && options.seed <= 9_007_199_254_740_991.0) {
            return Err(js_error("options", "the sorter's seed must be a whole number from 0 to 2^53 − 1"));
        }
        let space = Space::new(options.dimension, options.non_negative).or_throw()?;
        let Options { encoder, learner, seed, .. } = options;
        let settings = Settings { encoder, space, learner, seed: seed as u64 };
        match starter {
            Some(starter) => sorter::Sorter::with_starter(settings, starter).map(Self).or_throw(),
            None => Ok(Self(sorter::Sorter::new(settings))),
        }
    }

    /// Adds an item by its embedding and gives its number: 0, 1, 2 … in order of arrival, never used again.
    ///
    /// Throws "wrong-dimension", "not-finite", "negative" and "all-zero"; nothing is added then.
    #[wasm_bindgen(js_name = addItem)]
    pub fn add_item(&mut self, embedding: &[f32]) -> Result<usize, JsValue> {
        self.0.add_item(embedding).or_throw()
    }

    /// Takes an item out of the pile.
    #[wasm_bindgen(js_name = removeItem)]
    pub fn remove_item(&mut self, item: usize) -> Result<(), JsValue> {
        self.0.remove_item(item).or_throw()
    }

    /// Makes a tray and gives its number. Throws "tray-name-empty", "tray-name-taken", "tray-name-too-long".
    #[wasm_bindgen(js_name = addTray)]
    pub fn add_tray(&mut self, name: &str) -> Result<usize, JsValue> {
        self.0.add_tray(name).or_throw()
    }

    /// Gives a tray another name.
    #[wasm_bindgen(js_name = renameTray)]
    pub fn rename_tray(&mut self, tray: usize, name: &str) -> Result<(), JsValue> {
        self.0.rename_tray(tray, name).or_throw()
    }

    /// Moves all answers of one tray into another; the emptied tray is gone.
    #[wasm_bindgen(js_name = mergeTrays)]
    pub fn merge_trays(&mut self, from: usize, into: usize) -> Result<(), JsValue> {
        self.0.merge_trays(from, into).or_throw()
    }

    /// Removes a tray; its answers are open again.
    #[wasm_bindgen(js_name = removeTray)]
    pub fn remove_tray(&mut self, tray: usize) -> Result<(), JsValue> {
        self.0.remove_tray(tray).or_throw()
    }

    /// This item belongs in that tray.
    pub fn answer(&mut self, item: usize, tray: usize) -> Result<(), JsValue> {
        self.0.answer(item, tray).or_throw()
    }

    /// These items belong in that tray: one action, undone as one.
    #[wasm_bindgen(js_name = answerAll)]
    pub fn answer_all(&mut self, items: &[u32], tray: usize) -> Result<(), JsValue> {
        let items: Vec<usize> = items.iter().map(|&item| item as usize).collect();
        self.0.answer_all(&items, tray).or_throw()
    }

    /// Makes a tray for this item: one action, undone as one. Gives the tray's number.
    #[wasm_bindgen(js_name = answerNew)]
    pub fn answer_new(&mut self, item: usize, name: &str) -> Result<usize, JsValue> {
        self.0.answer_new(item, name).or_throw()
    }

    /// The person looked at a doubted answer again: the item belongs in this tray, the same or another, and isn't doubted again
    /// unless it is answered anew.
    #[wasm_bindgen(js_name = settleDoubt)]
    pub fn settle_doubt(&mut self, item: usize, tray: usize) -> Result<(), JsValue> {
        self.0.settle_doubt(item, tray).or_throw()
    }

    /// Makes a tray for these items: one action, undone as one. Gives the tray's number.
    #[wasm_bindgen(js_name = answerAllNew)]
    pub fn answer_all_new(&mut self, items: &[u32], name: &str) -> Result<usize, JsValue> {
        let items: Vec<usize> = items.iter().map(|&item| item as usize).collect();
        self.0.answer_all_new(&items, name).or_throw()
    }

    /// None of these: the person sets the item aside.
    #[wasm_bindgen(js_name = answerNone)]
    pub fn answer_none(&mut self, item: usize) -> Result<(), JsValue> {
        self.0.answer_none(item).or_throw()
    }

    /// Can't tell: not asked again, still sorted.
    pub fn skip(&mut self, item: usize) -> Result<(), JsValue> {
        self.0.skip(item).or_throw()
    }

    /// Takes the answer back.
    pub fn withdraw(&mut self, item: usize) -> Result<(), JsValue> {
        self.0.withdraw(item).or_throw()
    }

    /// Undoes the last action; gives its name, or `undefined` if there is none.
    pub fn undo(&mut self) -> ActionName {
        JsValue::from(self.0.undo().map(|action| action.name())).into()
    }

    /// Does the last undone action again; gives its name, or `undefined` if there is none.
    pub fn redo(&mut self) -> ActionName {
        JsValue::from(self.0.redo().map(|action| action.name())).into()
    }

    /// Whether there is something to undo.
    #[wasm_bindgen(getter = canUndo)]
    pub fn can_undo(&self) -> bool {
        self.0.ledger().can_undo()
    }

    /// Whether there is something to redo.
    #[wasm_bindgen(getter = canRedo)]
    pub fn can_redo(&self) -> bool {
        self.0.ledger().can_redo()
    }

    /// The trays in the order they were made.
    pub fn trays(&self) -> Trays {
        let ledger = self.0.ledger();
        let count = |tray| ledger.answered().filter(|&(_, answered)| answered == tray).count();
        let trays: Vec<Tray> = ledger.trays().map(|(tray, name)| Tray { tray, name, answers: count(tray) }).collect();
        to_js(&trays).into()
    }

    /// What the sorter says of every item. Learns anew if anything changed.
    pub fn verdicts(&mut self) -> Verdicts {
        let verdicts = self.0.verdicts();
        let column = |pick: &dyn Fn(&sorter::Verdict) -> f64, removed: f64| -> Vec<f64> {
            verdicts.iter().map(|verdict| verdict.as_ref().map_or(removed, pick)).collect()
        };
        let whole =
            |numbers: Vec<f64>| js_sys::Int32Array::from(&numbers.iter().map(|&x| x as i32).collect::<Vec<_>>()[..]);
        let real =
            |numbers: Vec<f64>| js_sys::Float32Array::from(&numbers.iter().map(|&x| x as f32).collect::<Vec<_>>()[..]);
        let tray = |tray: Option<usize>| tray.map_or(-1.0, |tray| tray as f64);
        let status = |verdict: &sorter::Verdict| match verdict.answer {
            Answer::Open => 0.0,
            Answer::Tray(_) => 1.0,
            Answer::None => 2.0,
            Answer::Skipped => 3.0,
        };
        let bytes: Vec<u8> = column(&status, 4.0).iter().map(|&x| x as u8).collect();
        let reason = |verdict: &sorter::Verdict| match verdict.set_aside {
            None => 0.0,
            Some(Reason::Unlike) => 1.0,
            Some(Reason::Between) => 2.0,
            Some(Reason::TooLittle) => 3.0,
        };
        let reasons: Vec<u8> = column(&reason, 0.0).iter().map(|&x| x as u8).collect();
        let columns: [(&str, JsValue); 7] = [
            ("tray", whole(column(&|v| tray(v.tray), -2.0)).into()),
            ("probability", real(column(&|v| v.probability, 0.0)).into()),
            ("runnerUp", whole(column(&|v| tray(v.runner_up.map(|(tray, _)| tray)), -1.0)).into()),
            ("runnerUpProbability", real(column(&|v| v.runner_up.map_or(0.0, |(_, p)| p), 0.0)).into()),
            ("status", js_sys::Uint8Array::from(&bytes[..]).into()),
            ("setAside", js_sys::Uint8Array::from(&reasons[..]).into()),
            ("likeness", real(column(&|v| v.likeness, 0.0)).into()),
        ];
        let object = js_sys::Object::new();
        for (name, column) in columns {
            // Setting a property on a fresh object can't fail.
            let _ = js_sys::Reflect::set(&object, &name.into(), &column);
        }
        JsValue::from(object).into()
    }

    /// The item whose answer helps most, or `undefined` when every item has an answer.
    #[wasm_bindgen(js_name = nextQuestion)]
    pub fn next_question(&mut self) -> Option<usize> {
        self.0.next_question()
    }

    /// The items whose answers together help most, the most helpful first; fewer than `count` if fewer have no answer.
    #[wasm_bindgen(js_name = nextQuestions)]
    pub fn next_questions(&mut self, count: usize) -> Vec<u32> {
        self.0.next_questions(count).into_iter().map(|item| item as u32).collect()
    }

    /// Look-alikes to confirm at one go with `answerAll`: up to `count` items without an answer that the sorter would rather
    /// put into this tray than not. The person must look at each of them, so each counts as an answer.
    pub fn strip(&mut self, tray: usize, count: usize) -> Vec<u32> {
        self.0.strip(tray, count).into_iter().map(|item| item as u32).collect()
    }

    /// When to stop: what is sorted right by now and what ten more answers would bring; `undefined` while there are fewer
    /// than two trays with an answer, or when every item has one.
    pub fn outlook(&mut self) -> Outlook {
        let shown = |outlook: forecast::Outlook| {
            to_js(&OutlookShown { now: outlook.now.into(), after_ten_more: outlook.after_more.into() })
        };
        self.0.outlook().map_or(JsValue::UNDEFINED, shown).into()
    }

    /// Trays with an answer, most probable first; empty while there are fewer than two.
    pub fn ranking(&mut self, item: usize) -> Result<RankedTrays, JsValue> {
        let ranking: Vec<RankedTray> = self
            .0
            .ranking(item)
            .or_throw()?
            .into_iter()
            .map(|(tray, probability)| RankedTray { tray, probability })
            .collect();
        Ok(to_js(&ranking).into())
    }

    /// Options, trays, answers and the undo log as JSON, without embeddings.
    pub fn state(&self) -> String {
        self.0.state()
    }

    /// The identity of the starter, or `undefined`.
    #[wasm_bindgen(getter)]
    pub fn starter(&self) -> Option<String> {
        self.0.starter().map(|starter| starter.identity())
    }

    /// Starts from another starter, or from none: same items, trays and answers, sorted anew. Takes the embeddings of all
    /// items in order.
    ///
    /// Throws "other-encoder", "starter-unreadable", "embedding-count" and what `addItem` throws; nothing is changed then.
    #[wasm_bindgen(js_name = changeStarter)]
    pub fn change_starter(&mut self, embeddings: &[f32], starter: Option<GivenStarter>) -> Result<(), JsValue> {
        let starter = starter.map(|given| given.get()).transpose()?;
        self.0.change_starter(embeddings, starter).or_throw()
    }

    /// The sorter that was saved, with the embeddings of all its items in order, and with its starter if it had one.
    ///
    /// Embeddings beyond those that the state knows are items that arrived since. Throws "state-unreadable", also when the
    /// starter is missing or another one, "state-newer", and what `addItem` throws.
    pub fn restore(state: &str, embeddings: &[f32], starter: Option<GivenStarter>) -> Result<Sorter, JsValue> {
        let starter = starter.map(|given| given.get()).transpose()?;
        sorter::Sorter::restore(state, embeddings, starter).map(Self).or_throw()
    }
}
