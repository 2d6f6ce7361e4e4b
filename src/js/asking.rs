//! Asking for JavaScript: strips on offer, and what random order would have taken.

use serde::Serialize;
use wasm_bindgen::prelude::*;

use super::{
    OrThrow,
    sorter::{ShareRange, Sorter, to_js},
    starter::{OnProgress, Teller},
};
use crate::meta::hindsight::{Hindsight, Plan, Point};

#[wasm_bindgen(typescript_custom_section)]
const TYPES: &str = r#"
/** Items that the sorter would all put into one tray, to be confirmed at one go with `answerAll`. */
export interface Strip {
  tray: number;
  /** The most helpful first. The person must look at each of them, so each counts as an answer. */
  items: number[];
  /** Whether the time has come to offer it unasked: before, single questions sort more of the pile with as many answers. */
  due: boolean;
}

/** A pile after so many answers. */
export interface HindsightPoint {
  answers: number;
  /** Of the items without an answer, the share expected to be sorted right, 0 to 1. */
  right: number;
}

/** How many answers in random order would have brought as much. An estimate: nobody knows the truth of the pile. */
export interface Hindsight {
  /** Answers that the person gave, "none of these" and "can't tell" included. */
  given: number;
  /** The share expected right by now. */
  reached: ShareRange;
  /** Answers in random order for as much; `undefined`: more than `tried`. */
  random: number | undefined;
  /** The same for the ends of `reached`. */
  least: number | undefined;
  most: number | undefined;
  /** The most answers in random order that were looked at. */
  tried: number;
  own: HindsightPoint[];
  inRandomOrder: HindsightPoint[];
}
"#;

#[wasm_bindgen]
extern "C" {
    /// A strip for JavaScript.
    #[wasm_bindgen(typescript_type = "Strip | undefined")]
    pub type BestStrip;
    /// The comparison for JavaScript.
    #[wasm_bindgen(typescript_type = "Hindsight")]
    pub type HindsightShown;
}

#[derive(Serialize)]
struct StripShown {
    tray: usize,
    items: Vec<usize>,
    due: bool,
}

#[derive(Serialize)]
struct PointShown {
    answers: usize,
    right: f64,
}

#[derive(Serialize)]
#[serde(rename_all = "camelCase")]
struct Shown {
    given: usize,
    reached: ShareRange,
    random: Option<f64>,
    least: Option<f64>,
    most: Option<f64>,
    tried: usize,
    own: Vec<PointShown>,
    in_random_order: Vec<PointShown>,
}

fn points(points: &[Point]) -> Vec<PointShown> {
    points.iter().map(|&Point { answers, right }| PointShown { answers, right }).collect()
}

#[wasm_bindgen]
impl Sorter {
    /// Look-alikes to confirm at one go instead of the next question: those of the tray where that helps most, 4 to 12;
    /// `undefined` if there are none.
    #[wasm_bindgen(js_name = bestStrip)]
    pub fn best_strip(&mut self) -> BestStrip {
        let shown = |crate::Strip { tray, items, due, .. }| to_js(&StripShown { tray, items, due });
        self.0.best_strip().map_or(JsValue::UNDEFINED, shown).into()
    }

    /// How many answers in random order would have brought as much as those that were given. Takes as long as some hundred
    /// answers; `onProgress` hears how much is done, 0 to 1. Drawn from the sorter's seed, which changes nothing else.
    ///
    /// Throws "too-little-to-tell" while there is no outlook.
    pub fn hindsight(
        &self,
        #[wasm_bindgen(js_name = onProgress)] on_progress: Option<OnProgress>,
    ) -> Result<HindsightShown, JsValue> {
        let teller = Teller::new(on_progress);
        let plan = Plan { seed: self.0.settings().seed, ..Plan::default() };
        let found = Hindsight::new(&self.0, plan, &mut |done| teller.tell(done)).or_throw()?;
        let shown = Shown {
            given: found.given,
            reached: found.reached.into(),
            random: found.random,
            least: found.interval.0,
            most: found.interval.1,
            tried: found.tried,
            own: points(&found.own),
            in_random_order: points(&found.in_random_order),
        };
        Ok(to_js(&shown).into())
    }
}
