//! Trust for JavaScript: terms, plausible trays, the assessment, doubts and spot checks.

use serde::{Deserialize, Serialize, de::DeserializeOwned};
use wasm_bindgen::prelude::*;

use super::{OrThrow, js_error, sorter::Sorter};
use crate::trust::{
    Terms,
    spot_check::{self, Judgement, Plan},
};

#[wasm_bindgen(typescript_custom_section)]
const TYPES: &str = r#"
/** What the person asks of the sorter's care. */
export interface Terms {
  /** Plausible trays hold the right one about as often as this says: at least 0.5, below 1. */
  confidence: number;
  /** About this share of the items that do belong in a tray may be set aside, 0 to 0.5. */
  setAsideShare: number;
  /** Whether every item that has not exactly one plausible tray is set aside too. */
  onlySure: boolean;
}

/** A closed interval of shares, each 0 to 1. */
export interface Interval { low: number; high: number }

/** So many of so many. */
export interface Share {
  right: number;
  judged: number;
  /** The share itself; `null` if nothing was judged. */
  value: number | null;
  /** 95 %, to look at (Wilson). */
  wilson: Interval;
  /** 95 %, to promise by (Clopper and Pearson). */
  exact: Interval;
}

export interface Assessment {
  answers: number;
  share: Share;
  trays: { tray: number; answers: number; share: Share }[];
  /** Answers of one tray that the others put into another, the most frequent first, with their item numbers. */
  confusions: { tray: number; takenFor: number; items: number[] }[];
  /** `null` if nothing could be judged. */
  calibration: Calibration | null;
  /** Trays with a single answer, of which nothing can be known yet. */
  unknown: number[];
  /** Accuracy by answers a tray; `null` while no tray has three. */
  curve: LearningCurve | null;
}

export interface Calibration {
  /** Expected calibration error, 0 to 1. */
  error: number;
  /** 0 to 2. */
  brier: number;
  /** In nats. */
  logLoss: number;
  /** By probability of the first choice, those that hold an item: mean probability, share right with its 95 % interval. */
  bins: { from: number; to: number; items: number; said: number; right: number; wilson: Interval }[];
}

export interface LearningCurve {
  /** The shape: accuracy of nearest means after so many answers a tray. */
  points: { shot: number; accuracy: number; sorted: number }[];
  /** Answers a tray that the level belongs to. */
  shot: number;
  trays: number;
  /** Leave-one-out accuracy: lower end, middle, upper end. */
  level: [number, number, number];
  /** Slope of log-odds over the logarithm of answers: flattest, likeliest, steepest. */
  slope: [number, number, number];
  /** Accuracy after so many more answers in all, from now to four times the answers there are. */
  ahead: { more: number; low: number; likely: number; high: number }[];
}

/** The plausible trays of all items, most probable first: those of item i are `trays[starts[i]]` to before `trays[starts[i + 1]]`. */
export interface PlausibleSets { starts: Uint32Array; trays: Uint32Array }

/** About how many more answers, over all trays, reach the target. */
export interface Projection {
  target: number;
  low: number;
  /** `null` where it can't be told. */
  likely: number | null;
  high: number | null;
}

export interface Doubt {
  item: number;
  /** The tray that the person named. */
  tray: number;
  /** The tray that something else speaks for. */
  rather: number;
  /** How sure the others are of that, −1 to 1. */
  weight: number;
  why: "contradicted" | "duplicate" | "changed";
  /** The near-duplicate, where that is why. */
  other?: number;
}

/** What a spot check is to show, and how. */
export interface SpotCheckPlan {
  /** The share of wrong items that is tolerated, 0 up to 1. */
  tolerance: number;
  /** Between 0 and 1. */
  confidence: number;
  /** How many of those looked at may be wrong; 0 if left out. */
  allowed?: number;
  /** Whether each tray gives its share of the sample; false if left out. */
  byTray?: boolean;
}

/** Right, wrong and in no other tray, can't be told, or the tray where it belongs. */
export type Judgement = "right" | "wrong" | "untold" | { belongs: number };

export interface Sampled { item: number; tray: number; judgement: Judgement | null }

export interface Statement {
  /** The sentence to sign. */
  sentence: string;
  /** Whether no more than the tolerated share can be wrong, at the confidence. */
  holds: boolean;
  items: number;
  lookedAt: number;
  wrong: number;
  untold: number;
  /** At most this many items are in the wrong tray now. */
  atMost: number;
  /** The same as a share of the items. */
  share: number;
  confidence: number;
  tolerance: number;
  stratified: boolean;
  seed: number;
  date: string;
  trays: { tray: number; items: number; lookedAt: number; wrong: number; untold: number }[];
}
"#;

#[wasm_bindgen]
extern "C" {
    /// Terms for and from JavaScript.
    #[wasm_bindgen(typescript_type = "Terms")]
    pub type JsTerms;
    /// An assessment for JavaScript.
    #[wasm_bindgen(typescript_type = "Assessment | undefined")]
    pub type JsAssessment;
    /// A projection for JavaScript.
    #[wasm_bindgen(typescript_type = "Projection | undefined")]
    pub type JsProjection;
    /// Doubts for JavaScript.
    #[wasm_bindgen(typescript_type = "Doubt[]")]
    pub type JsDoubts;
    /// A plan from JavaScript.
    #[wasm_bindgen(typescript_type = "SpotCheckPlan")]
    pub type JsPlan;
    /// A judgement from JavaScript.
    #[wasm_bindgen(typescript_type = "Judgement | null")]
    pub type JsJudgement;
    /// A sample for JavaScript.
    #[wasm_bindgen(typescript_type = "Sampled[]")]
    pub type JsSample;
    /// A statement for JavaScript.
    #[wasm_bindgen(typescript_type = "Statement")]
    pub type JsStatement;
    /// Plausible sets for JavaScript.
    #[wasm_bindgen(typescript_type = "PlausibleSets")]
    pub type JsPlausibleSets;
    /// A corrected sorting for JavaScript.
    #[wasm_bindgen(typescript_type = "{ item: number; tray: number | null }[]")]
    pub type JsSorting;
    /// A plan for JavaScript.
    #[wasm_bindgen(typescript_type = "Required<SpotCheckPlan>")]
    pub type JsPlanned;
}

/// Plain objects and arrays, with `null` for what isn't there.
fn plain(value: &impl Serialize) -> JsValue {
    value.serialize(&serde_wasm_bindgen::Serializer::json_compatible()).unwrap_or(JsValue::UNDEFINED)
}

fn read<T: DeserializeOwned>(value: JsValue, what: &str) -> Result<T, JsValue> {
    serde_wasm_bindgen::from_value(value)
        .map_err(|error| js_error("options", &format!("{what} can't be used: {error}")))
}

fn plan(value: JsPlan) -> Result<Plan, JsValue> {
    #[derive(Deserialize)]
    #[serde(rename_all = "camelCase")]
    struct Asked {
        tolerance: f64,
        confidence: f64,
        #[serde(default)]
        allowed: usize,
        #[serde(default)]
        by_tray: bool,
    }
    let Asked { tolerance, confidence, allowed, by_tray } = read(value.into(), "the plan of the spot check")?;
    Plan::new(tolerance, confidence, allowed, by_tray).or_throw()
}

#[wasm_bindgen]
impl Sorter {
    /// What the person asks of the sorter's care.
    #[wasm_bindgen(getter)]
    pub fn terms(&self) -> JsTerms {
        plain(self.0.terms()).into()
    }

    /// Asks for another confidence or another share to set aside. Throws "options" and "terms".
    #[wasm_bindgen(js_name = setTerms)]
    pub fn set_terms(&mut self, terms: JsTerms) -> Result<(), JsValue> {
        let terms: Terms = read(terms.into(), "the terms")?;
        let terms = Terms::new(terms.confidence(), terms.set_aside_share(), terms.only_sure()).or_throw()?;
        self.0.set_terms(terms);
        Ok(())
    }

    /// The trays that can't be ruled out for an item, most probable first; may be empty.
    pub fn plausible(&mut self, item: usize) -> Result<Vec<usize>, JsValue> {
        self.0.plausible(item).or_throw()
    }

    /// The plausible trays of all items at once.
    #[wasm_bindgen(js_name = plausibleSets)]
    pub fn plausible_sets(&mut self) -> JsPlausibleSets {
        let sets = self.0.plausible_sets();
        let mut starts = vec![0_u32];
        let mut trays = Vec::new();
        for set in sets {
            trays.extend(set.into_iter().map(|tray| tray as u32));
            starts.push(trays.len() as u32);
        }
        let object = js_sys::Object::new();
        // Setting a property on a fresh object can't fail.
        let _ = js_sys::Reflect::set(&object, &"starts".into(), &js_sys::Uint32Array::from(&starts[..]));
        let _ = js_sys::Reflect::set(&object, &"trays".into(), &js_sys::Uint32Array::from(&trays[..]));
        JsValue::from(object).into()
    }

    /// How well the answers sort each other; `undefined` while fewer than two trays have an answer.
    pub fn assessment(&mut self) -> JsAssessment {
        self.0.assessment().map_or(JsValue::UNDEFINED, |assessment| plain(&assessment)).into()
    }

    /// About how many more answers reach this accuracy (above 0, below 1); `undefined` while no tray has three.
    #[wasm_bindgen(js_name = moreAnswers)]
    pub fn more_answers(&mut self, target: f64) -> JsProjection {
        let curve = self.0.assessment().and_then(|assessment| assessment.curve);
        curve.map_or(JsValue::UNDEFINED, |curve| plain(&curve.more_answers(target))).into()
    }

    /// Answers that may be wrong, the gravest first.
    pub fn doubts(&mut self) -> JsDoubts {
        plain(&self.0.doubts()).into()
    }

    /// How many items a spot check of the sorting as it is now would look at.
    #[wasm_bindgen(js_name = spotCheckSize)]
    pub fn spot_check_size(&mut self, plan: JsPlan) -> Result<usize, JsValue> {
        let plan = self::plan(plan)?;
        self.0.spot_check_size(&plan).or_throw()
    }

    /// Draws a spot check from the sorting as it is now, which it holds still. The seed is a whole number from 0.
    ///
    /// Throws "options", "spot-check-plan" and "nothing-to-check".
    #[wasm_bindgen(js_name = spotCheck)]
    pub fn spot_check(&mut self, plan: JsPlan, seed: f64) -> Result<SpotCheck, JsValue> {
        if !(seed >= 0.0 && seed.fract() == 0.0 && seed <= 9_007_199_254_740_991.0) {
            return Err(js_error("options", "the seed of a spot check must be a whole number from 0 to 2^53 − 1"));
        }
        let plan = self::plan(plan)?;
        self.0.spot_check(plan, seed as u64).map(SpotCheck).or_throw()
    }

    /// Takes what the person said of the items of a spot check as answers: one action, undone as one. Items and trays that are
    /// gone since are left out. Until anything else is answered, the rest of the pile stays sorted as it was.
    #[wasm_bindgen(js_name = answerChecked)]
    pub fn answer_checked(&mut self, check: &SpotCheck) -> Result<(), JsValue> {
        self.0.answer_checked(&check.0).or_throw()
    }

    /// Whether a spot check is a statement about the sorting as it is now.
    #[wasm_bindgen(js_name = isAboutNow)]
    pub fn is_about_now(&mut self, check: &SpotCheck) -> bool {
        self.0.is_about_now(&check.0)
    }
}

/// A random sample of a sorting, what the person said of it, and the sentence that it backs.
#[wasm_bindgen]
pub struct SpotCheck(spot_check::SpotCheck);

#[wasm_bindgen]
impl SpotCheck {
    /// The items to look at, in order, with what was said of them.
    pub fn sample(&self) -> JsSample {
        #[derive(Serialize)]
        struct Sampled {
            item: usize,
            tray: usize,
            judgement: Option<Judgement>,
        }
        let sample: Vec<Sampled> = self
            .0
            .sample()
            .map(|(sorted, judgement)| Sampled { item: sorted.item, tray: sorted.tray, judgement })
            .collect();
        plain(&sample).into()
    }

    /// The person's judgement of an item of the sample; `null` takes it back. Throws "options" and "not-in-sample".
    pub fn judge(&mut self, item: usize, judgement: JsJudgement) -> Result<(), JsValue> {
        let judgement: Option<Judgement> = read(judgement.into(), "the judgement")?;
        self.0.judge(item, judgement).or_throw()
    }

    /// What it is to show, and how.
    #[wasm_bindgen(getter)]
    pub fn plan(&self) -> JsPlanned {
        plain(self.0.plan()).into()
    }

    /// How many sorted items it is about.
    #[wasm_bindgen(getter)]
    pub fn items(&self) -> usize {
        self.0.items()
    }

    /// How many items are still to be looked at.
    #[wasm_bindgen(getter)]
    pub fn left(&self) -> usize {
        self.0.left()
    }

    /// What the sample shows, dated as the caller says. Throws "spot-check-unfinished".
    pub fn statement(&self, date: &str) -> Result<JsStatement, JsValue> {
        #[derive(Serialize)]
        struct Stated<'a> {
            sentence: String,
            holds: bool,
            share: f64,
            #[serde(flatten)]
            statement: &'a spot_check::Statement,
        }
        let statement = self.0.statement(date).or_throw()?;
        let stated = Stated {
            sentence: statement.to_string(),
            holds: statement.holds(),
            share: statement.share(),
            statement: &statement,
        };
        Ok(plain(&stated).into())
    }

    /// The sorting with the sample's corrections; `null` for items that were taken out.
    pub fn corrected(&self) -> JsSorting {
        #[derive(Serialize)]
        struct Corrected {
            item: usize,
            tray: Option<usize>,
        }
        let sorting: Vec<Corrected> =
            self.0.corrected().into_iter().map(|(item, tray)| Corrected { item, tray }).collect();
        plain(&sorting).into()
    }

    /// Everything as JSON, to be kept.
    pub fn state(&self) -> String {
        serde_json::to_string(&self.0).unwrap_or_default()
    }

    /// The spot check that was kept. Throws "state-unreadable".
    pub fn restore(state: &str) -> Result<SpotCheck, JsValue> {
        spot_check::SpotCheck::restore(state).map(SpotCheck).or_throw()
    }
}
