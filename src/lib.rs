//! Kenspeckle sorts a pile of items into categories that exist only in their owner's head, from a handful of examples.
//!
//! bytes → [`encoder`] → embedding → [`space`] → [`learner`] (support set → [`head`]) → verdicts, with [`Sorter`] owning
//! the path. Programs need only the façade: make a [`Sorter`], add items and trays, answer, and read the verdicts.
//!
//! | module | what it holds |
//! | --- | --- |
//! | [`encoder`] | photos and notes in, embeddings out |
//! | [`table`] | lines, tables and JSON lines in, notes with their columns out |
//! | [`space`] | the unit vectors in which items are compared, and the pile's own centre |
//! | [`support`] | the examples, checked once at the door |
//! | [`learner`] | nearest prototype, ridge, a few gradient steps, and the mix of them |
//! | [`head`] | what is learned: one logit a category |
//! | [`prior`] | what is known before the first example |
//! | [`starter`] | what past piles taught, as one file |
//! | [`whitening`] | how past categories scattered, taken out of the space |
//! | [`pile`] | the items, their centre, and what their likeness says |
//! | [`trust`] | how far the result can be relied on |
//! | [`ask`] | which item's answer helps most |
//! | [`forecast`] | how much of the pile is sorted right, and what more answers would bring |
//! | [`ledger`] | trays and answers, with undo and redo |
//! | [`sorter`] | the façade |
//! | [`meta`] | sums over past piles, small tasks drawn from labelled material, and rehearsing on them |
//!
//! The same input gives the same bits natively and in WebAssembly: sums run in one fixed order ([`arithmetic`]).

mod archive;
pub mod arithmetic;
pub mod ask;
pub mod encoder;
mod error;
pub mod forecast;
pub mod head;
pub mod learner;
pub mod ledger;
pub mod meta;
mod npy;
pub mod pile;
pub mod prior;
pub mod sorter;
pub mod space;
pub mod starter;
pub mod support;
pub mod table;
pub mod trust;
pub mod whitening;

#[cfg(target_family = "wasm")]
mod js;

pub use error::{Error, Result};
pub use forecast::Outlook;
pub use head::Head;
pub use learner::LearnerKind;
pub use prior::Prior;
pub use sorter::{Settings, Sorter, Strip, Verdict};
pub use space::Space;
pub use starter::Starter;
pub use support::Support;

/// The README's example is run as a test.
#[cfg(doctest)]
#[doc = include_str!("../README.md")]
pub struct ReadmeExamples;
