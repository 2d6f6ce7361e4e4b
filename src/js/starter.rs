//! What past piles taught, for JavaScript: gathered, learned, saved and read.

use std::sync::Arc;

use serde::Deserialize;
use wasm_bindgen::prelude::*;

use super::{OrThrow, js_error};
use crate::{
    Error, Space,
    meta::statistics::Statistics,
    starter::{self, LEAST_CATEGORIES},
};

#[wasm_bindgen(typescript_custom_section)]
const TYPES: &str = r#"
/** Which embeddings past piles are gathered from. */
export interface PastPilesOptions {
  /** The encoder's identity: embeddings of different encoders never teach together. */
  encoder: string;
  /** Numbers in an embedding, 2 to 4096. */
  dimension: number;
  /** Whether the encoder never gives a negative number. */
  nonNegative: boolean;
}
"#;

#[wasm_bindgen]
extern "C" {
    /// Options from JavaScript.
    #[wasm_bindgen(typescript_type = "PastPilesOptions")]
    pub type PastPilesOptions;
    /// Is told how much of learning is done, 0 to 1.
    #[wasm_bindgen(typescript_type = "(done: number) => void")]
    pub type OnProgress;
    /// A starter that JavaScript holds.
    #[wasm_bindgen(typescript_type = "Starter")]
    pub type GivenStarter;

    #[wasm_bindgen(method, catch, js_name = share)]
    fn share(this: &GivenStarter) -> Result<Starter, JsValue>;
}

impl GivenStarter {
    /// The starter behind it, which JavaScript keeps.
    pub(super) fn get(&self) -> Result<Arc<starter::Starter>, JsValue> {
        let shared =
            self.share().map_err(|_| js_error("options", "the starter must be a Starter that was not freed"))?;
        Ok(shared.0)
    }
}

#[derive(Deserialize)]
#[serde(rename_all = "camelCase")]
struct Options {
    encoder: String,
    dimension: usize,
    non_negative: bool,
}

/// Gathers what past piles teach. Calls are synchronous, and gathering and learning take seconds: use it in a worker.
#[wasm_bindgen]
pub struct PastPiles(Statistics);

#[wasm_bindgen]
impl PastPiles {
    /// No past pile yet.
    ///
    /// Throws "options" when they are incomplete and "dimension-out-of-range".
    #[wasm_bindgen(constructor)]
    pub fn new(options: PastPilesOptions) -> Result<PastPiles, JsValue> {
        let Options { encoder, dimension, non_negative } = serde_wasm_bindgen::from_value(options.into())
            .map_err(|error| js_error("options", &format!("the options of past piles can't be used: {error}")))?;
        let space = Space::new(dimension, non_negative).or_throw()?;
        Ok(Self(Statistics::new(encoder, space)))
    }

    /// Reads what `bytes` wrote. Throws "statistics-unreadable" and "dimension-out-of-range".
    pub fn read(file: &[u8]) -> Result<PastPiles, JsValue> {
        Statistics::read(file).map(Self).or_throw()
    }

    /// Adds a finished pile: the embeddings of its items, one after the other, and for each item the number of its
    /// category in this pile. Items with a negative number are left out. Cost O(d²) an item.
    ///
    /// Throws "label-count", "not-finite", "negative" and "all-zero"; nothing is added then.
    #[wasm_bindgen(js_name = addPile)]
    pub fn add_pile(
        &mut self,
        embeddings: &[f32],
        labels: &[i32],
        #[wasm_bindgen(js_name = onProgress)] on_progress: Option<OnProgress>,
    ) -> Result<(), JsValue> {
        add_pile(&mut self.0, embeddings, labels, Teller::new(on_progress)).or_throw()
    }

    /// Adds what was gathered from other past piles, as `bytes` wrote it.
    ///
    /// Throws "statistics-unreadable" and "other-encoder"; nothing is added then.
    pub fn merge(&mut self, gathered: &[u8]) -> Result<(), JsValue> {
        Statistics::read(gathered).and_then(|other| self.0.merge(&other)).or_throw()
    }

    /// What was gathered, as a file to be merged later. It holds the embeddings of some items: keep it, don't share it.
    pub fn bytes(&self) -> Vec<u8> {
        self.0.write()
    }

    /// How many categories were added.
    #[wasm_bindgen(getter)]
    pub fn categories(&self) -> usize {
        self.0.categories()
    }

    /// How many items they had.
    #[wasm_bindgen(getter)]
    pub fn items(&self) -> usize {
        self.0.items()
    }

    /// Learns a starter. Cost O(d³): seconds at 1280 dimensions.
    ///
    /// Throws "too-little-to-learn" for fewer than two categories, or when none has two items.
    pub fn learn(
        &self,
        #[wasm_bindgen(js_name = onProgress)] on_progress: Option<OnProgress>,
    ) -> Result<Starter, JsValue> {
        let teller = Teller::new(on_progress);
        let learned = starter::Starter::learn_watched(&self.0, &mut |done| teller.tell(done)).or_throw()?;
        teller.tell(1.0);
        Ok(Starter(Arc::new(learned)))
    }
}

/// Tells JavaScript how much is done.
pub(super) struct Teller(Option<js_sys::Function>);

impl Teller {
    pub(super) fn new(on_progress: Option<OnProgress>) -> Self {
        Self(on_progress.map(|given| JsValue::from(given).unchecked_into()))
    }

    /// Always true: the work goes on, whatever the listener throws.
    pub(super) fn tell(&self, done: f64) -> bool {
        if let Some(listener) = &self.0 {
            let _ = listener.call1(&JsValue::UNDEFINED, &done.into());
        }
        true
    }
}

fn add_pile(statistics: &mut Statistics, embeddings: &[f32], labels: &[i32], teller: Teller) -> Result<(), Error> {
    let d = statistics.space().dimension();
    if embeddings.len() != labels.len() * d {
        return Err(Error::LabelCount { examples: embeddings.len() / d, labels: labels.len() });
    }
    let mut items: Vec<(i32, &[f32])> = labels.iter().copied().zip(embeddings.chunks_exact(d)).collect();
    items.retain(|&(label, _)| label >= 0);
    items.sort_by_key(|&(label, _)| label);
    let categories: Vec<_> = items.chunk_by(|a, b| a.0 == b.0).collect();
    let all = categories.len() as f64;
    let pile = categories.iter().map(|category| category.iter().map(|&(_, embedding)| embedding));
    statistics.add_pile_watched(pile, |done| teller.tell(done as f64 / all))
}

/// What past piles taught: for a sorter to start from, or for a file.
#[wasm_bindgen]
pub struct Starter(Arc<starter::Starter>);

#[wasm_bindgen]
impl Starter {
    /// Reads a starter file. Throws "starter-unreadable" and "starter-newer".
    pub fn read(file: &[u8]) -> Result<Starter, JsValue> {
        starter::Starter::read(file).map(|read| Self(Arc::new(read))).or_throw()
    }

    /// The starter as a file, at most 400 KB at 1280 dimensions.
    ///
    /// Throws "too-few-to-share" when it was learned from fewer than `minCategories`, 8 if left out: it could tell what
    /// they were. Give a lower number only for a file that stays with the person.
    pub fn bytes(
        &self,
        #[wasm_bindgen(js_name = minCategories)] min_categories: Option<usize>,
    ) -> Result<Vec<u8>, JsValue> {
        self.0.write(min_categories.unwrap_or(LEAST_CATEGORIES)).or_throw()
    }

    /// Another handle on the same starter; each is freed by itself.
    pub fn share(&self) -> Starter {
        Self(self.0.clone())
    }

    /// How many categories it was learned from.
    #[wasm_bindgen(getter)]
    pub fn categories(&self) -> usize {
        self.0.categories()
    }

    /// How many items they had.
    #[wasm_bindgen(getter)]
    pub fn items(&self) -> usize {
        self.0.items()
    }

    /// The encoder it belongs to.
    #[wasm_bindgen(getter)]
    pub fn encoder(&self) -> String {
        self.0.encoder().to_owned()
    }

    /// Names what was learned: 16 hexadecimal digits, the same after saving.
    #[wasm_bindgen(getter)]
    pub fn identity(&self) -> String {
        self.0.identity()
    }
}
