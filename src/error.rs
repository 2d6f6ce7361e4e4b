//! The library's error type.

use crate::{encoder::EncoderError, table::TableError};

/// What can go wrong in the library; every message names the item and the remedy.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum Error {
    /// An item could not be turned into an embedding.
    #[error(transparent)]
    Encoder(#[from] EncoderError),
    /// A file of notes could not be read.
    #[error(transparent)]
    Table(#[from] TableError),
    /// An embedding has another length than the space.
    #[error("an embedding has {found} numbers where {expected} are expected; use one encoder for everything in a pile")]
    WrongDimension {
        /// The space's dimension.
        expected: usize,
        /// The embedding's length.
        found: usize,
    },
    /// The dimension is outside what the sorter supports.
    #[error("an embedding must have between 2 and 4096 numbers, not {0}")]
    DimensionOutOfRange(usize),
    /// An embedding holds NaN or an infinity.
    #[error("the embedding holds {value} at position {position}; only finite numbers can be sorted")]
    NotFinite {
        /// Index of the first such number.
        position: usize,
        /// The number itself.
        value: f32,
    },
    /// An embedding in a never-negative space holds a negative number.
    #[error(
        "the embedding holds {value} at position {position}, but this encoder's numbers are never negative; \
         declare it as signed or check where the embedding comes from"
    )]
    Negative {
        /// Index of the first such number.
        position: usize,
        /// The number itself.
        value: f32,
    },
    /// An embedding of zeros only has no direction.
    #[error("the embedding is all zeros, so it says nothing about the item; check where it comes from")]
    AllZero,
    /// Examples and labels don't match in number.
    #[error("there are {examples} examples but {labels} labels; give one label for each example")]
    LabelCount {
        /// How many examples.
        examples: usize,
        /// How many labels.
        labels: usize,
    },
    /// A label names no category.
    #[error("label {label} is outside the {categories} categories")]
    LabelOutOfRange {
        /// The label.
        label: usize,
        /// How many categories there are.
        categories: usize,
    },
    /// A category without examples can't be learned.
    #[error("category {0} has no example; give it at least one or leave it out")]
    NoExample(usize),
    /// With fewer than two categories there is nothing to tell apart.
    #[error("sorting needs at least two categories with an example each, and there is {0}")]
    TooFewCategories(usize),
    /// Embeddings or what was learned from them belong to another encoder.
    #[error(
        "this is for the encoder {found}, and {expected} is in use; embeddings of different encoders can't be mixed"
    )]
    OtherEncoder {
        /// The encoder in use.
        expected: String,
        /// The other one.
        found: String,
    },
    /// A starter file can't be used.
    #[error("this starter can't be used: {0}; make it again with `kenspeckle learn`")]
    StarterUnreadable(String),
    /// A file of sums can't be used.
    #[error("these sums can't be used: {0}; gather them again with `kenspeckle learn --partial`")]
    StatisticsUnreadable(String),
    /// A starter file comes from a newer version.
    #[error("this starter has version {found}, and this program reads up to version {known}; update the program")]
    StarterNewer {
        /// The starter's version.
        found: u32,
        /// The newest version known here.
        known: u32,
    },
    /// Too little to learn a starter from.
    #[error(
        "there are {items} items in {categories} categories, too little to learn from: a starter needs at least two \
         categories and one with two items; add past piles"
    )]
    TooLittleToLearn {
        /// Categories with an item.
        categories: usize,
        /// Items in all.
        items: usize,
    },
    /// The person stopped the work.
    #[error("stopped before it was done; nothing has changed")]
    Stopped,
    /// The sorter has no expectation of its own yet, or nothing left to expect.
    #[error("there is too little to tell yet: it takes answers in two trays, and items without an answer")]
    TooLittleToTell,
    /// A starter of few categories would tell too much of them.
    #[error(
        "a starter of {found} categories may tell what they were; it is only shared from {least} on: add past piles, \
         or lower the limit if it stays with you"
    )]
    TooFewToShare {
        /// Categories learned from.
        found: usize,
        /// The least that are shared.
        least: usize,
    },
    /// A tray's name is empty.
    #[error("a tray needs a name; type at least one letter")]
    TrayNameEmpty,
    /// A tray's name is already in use.
    #[error("there is already a tray named “{0}”; choose that one or another name")]
    TrayNameTaken(String),
    /// A tray's name is too long.
    #[error("a tray's name can have at most {limit} characters, and this one has {found}; shorten it")]
    TrayNameTooLong {
        /// The limit in characters.
        limit: usize,
        /// The name's length in characters.
        found: usize,
    },
    /// There is no such tray (any more).
    #[error("there is no tray number {0}; it may have been removed or merged")]
    NoSuchTray(usize),
    /// There is no such item (any more).
    #[error("there is no item number {0} in the pile; it may have been removed")]
    NoSuchItem(usize),
    /// A tray can't be merged into itself.
    #[error("a tray can't be merged into itself; choose another one")]
    MergeIntoItself,
    /// No sorting can keep such terms.
    #[error("these terms can't be kept: {0}")]
    Terms(String),
    /// A spot check can't be planned so.
    #[error("this spot check can't be planned: {0}")]
    SpotCheckPlan(String),
    /// No item was sorted.
    #[error("there is no sorted item to look at; a spot check needs a pile that has been sorted")]
    NothingToCheck,
    /// The item is not part of the sample.
    #[error("item {0} is not part of the sample; judge the items that were drawn")]
    NotInSample(usize),
    /// Part of the sample has not been looked at.
    #[error("{0} items of the sample have not been judged; a statement needs all of them")]
    SpotCheckUnfinished(usize),
    /// The embeddings of all items were needed.
    #[error("the pile has {items} items, but {found} embeddings came; give the embedding of every item, in order")]
    EmbeddingCount {
        /// How many items the pile has, those taken out included.
        items: usize,
        /// How many embeddings came.
        found: usize,
    },
    /// A saved state can't be read.
    #[error("the saved state can't be read ({0}); start a new pile, or restore it from a copy")]
    StateUnreadable(String),
    /// A saved state comes from a newer version.
    #[error("the saved state has version {found}, and this program reads up to version {known}; update the program")]
    StateNewer {
        /// The state's version.
        found: u32,
        /// The newest version known here.
        known: u32,
    },
}

impl Error {
    /// A short kebab-case name that programs can test; it stays the same when a message is reworded.
    pub fn code(&self) -> &'static str {
        match self {
            Error::Encoder(error) => error.code(),
            Error::Table(error) => error.code(),
            Error::WrongDimension { .. } => "wrong-dimension",
            Error::DimensionOutOfRange(_) => "dimension-out-of-range",
            Error::NotFinite { .. } => "not-finite",
            Error::Negative { .. } => "negative",
            Error::AllZero => "all-zero",
            Error::LabelCount { .. } => "label-count",
            Error::LabelOutOfRange { .. } => "label-out-of-range",
            Error::NoExample(_) => "no-example",
            Error::TooFewCategories(_) => "too-few-categories",
            Error::OtherEncoder { .. } => "other-encoder",
            Error::StarterUnreadable(_) => "starter-unreadable",
            Error::StatisticsUnreadable(_) => "statistics-unreadable",
            Error::StarterNewer { .. } => "starter-newer",
            Error::TooLittleToLearn { .. } => "too-little-to-learn",
            Error::Stopped => "stopped",
            Error::TooLittleToTell => "too-little-to-tell",
            Error::TooFewToShare { .. } => "too-few-to-share",
            Error::TrayNameEmpty => "tray-name-empty",
            Error::TrayNameTaken(_) => "tray-name-taken",
            Error::TrayNameTooLong { .. } => "tray-name-too-long",
            Error::NoSuchTray(_) => "no-such-tray",
            Error::NoSuchItem(_) => "no-such-item",
            Error::MergeIntoItself => "merge-into-itself",
            Error::Terms(_) => "terms",
            Error::SpotCheckPlan(_) => "spot-check-plan",
            Error::NothingToCheck => "nothing-to-check",
            Error::NotInSample(_) => "not-in-sample",
            Error::SpotCheckUnfinished(_) => "spot-check-unfinished",
            Error::EmbeddingCount { .. } => "embedding-count",
            Error::StateUnreadable(_) => "state-unreadable",
            Error::StateNewer { .. } => "state-newer",
        }
    }
}

/// The library's result type.
pub type Result<T, E = Error> = std::result::Result<T, E>;
