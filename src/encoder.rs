//! From an item's bytes to its embedding.

#[cfg(any(feature = "photo", feature = "text"))]
mod fingerprint;
#[cfg(feature = "text")]
mod language;
#[cfg(feature = "photo")]
mod network;
#[cfg(feature = "photo")]
mod photo;
#[cfg(feature = "photo")]
mod picture;
#[cfg(feature = "text")]
mod text;
#[cfg(feature = "text")]
mod tokens;

#[cfg(any(feature = "photo", feature = "text"))]
pub use fingerprint::file_fingerprint;
#[cfg(feature = "photo")]
pub use photo::{Photo, PhotoEncoder};
#[cfg(feature = "text")]
pub use text::{Note, NoteEncoder};

/// Most pixels a picture may have: more than any camera takes, little enough for a browser's memory.
pub const MAX_PIXELS: u64 = 100_000_000;
/// Most pixels a picture may have across or down.
pub const MAX_SIDE: u32 = 30_000;
/// Most characters a note may have, about sixty pages: a longer text is no note but a book.
pub const MAX_CHARACTERS: usize = 100_000;

/// A frozen network that turns one item into numbers, alike for items that look alike.
///
/// Nothing is learnt here: categories are learnt from the embeddings.
pub trait Encoder {
    /// What is embedded, as it is stored: `[u8]` for the bytes of a picture file, `str` for a note.
    type Item: ?Sized;

    /// Names the network and the file it was read from. Embeddings with different identities can't be compared.
    fn identity(&self) -> &str;

    /// Numbers in an embedding, at least 1.
    fn dimension(&self) -> usize;

    /// Whether no number of any embedding is ever below zero.
    fn non_negative(&self) -> bool;

    /// The item's embedding: `dimension` finite numbers.
    ///
    /// # Errors
    /// The item is damaged, too large, or not of this encoder's kind.
    fn embed(&self, item: &Self::Item) -> Result<Vec<f32>, EncoderError>;
}

/// Why an item could not be embedded, or an encoder file not be used.
///
/// A message is a clause about "it", the file that the caller names first: `"{name}: {error}"`.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum EncoderError {
    /// The file has no bytes, or the frame no pixels.
    #[error("it is empty; copy it again from where it came from")]
    ImageEmpty,
    /// The file's content is not one of the picture formats that can be read.
    #[error("it is {found}, not a JPEG, PNG, WebP, GIF or BMP picture; save it as one of these or leave it out")]
    NotAnImage {
        /// What the content looks like instead, with its article.
        found: &'static str,
    },
    /// More pixels than are worth the memory; the file's header says so and nothing was decoded.
    #[error("it has {width} × {height} pixels; at most {} million pixels and {MAX_SIDE} to a side can be read: make a smaller copy of it", MAX_PIXELS / 1_000_000)]
    ImageTooLarge {
        /// Pixels across.
        width: u32,
        /// Pixels down.
        height: u32,
    },
    /// The picture's size is allowed, but this device has not the memory to decode it.
    #[error("its {width} × {height} pixels don't fit into the memory that is left; make a smaller copy of it")]
    NoMemory {
        /// Pixels across.
        width: u32,
        /// Pixels down.
        height: u32,
    },
    /// A picture format by its first bytes, but the rest can't be decoded.
    #[error(
        "this {format} picture is cut off or damaged ({reason}); copy it again from where it came from, or save it anew with a picture program"
    )]
    ImageUnreadable {
        /// The format's name.
        format: &'static str,
        /// What the decoder met.
        reason: String,
    },
    /// A sound file in a variant of its format that is not supported.
    #[error("this {format} picture is of a kind that can't be read ({reason}); save it as an ordinary JPEG or PNG")]
    ImageUnsupported {
        /// The format's name.
        format: &'static str,
        /// The variant.
        reason: String,
    },
    /// Pixels handed over do not fill the frame they were said to fill.
    #[error(
        "a frame of {width} × {height} pixels takes 4 bytes a pixel, but {bytes} bytes came; pass the RGBA bytes of one whole frame"
    )]
    FrameSize {
        /// Pixels across.
        width: u32,
        /// Pixels down.
        height: u32,
        /// Bytes that came.
        bytes: usize,
    },
    /// A note has no letter, digit or sign.
    #[error("there is no text in it; write something or leave it out")]
    NoteEmpty,
    /// A note with more text than is worth the time.
    #[error("it has {0} characters, and a note can have at most {MAX_CHARACTERS}; divide it or leave it out")]
    NoteTooLong(usize),
    /// The encoder file is not what this encoder runs.
    #[error("this encoder file can't be used: {0}; take the encoder file of that name that came with this version")]
    EncoderFile(String),
}

impl EncoderError {
    /// A short fixed name of the kind of error, for programs.
    pub fn code(&self) -> &'static str {
        match self {
            Self::ImageEmpty => "image-empty",
            Self::NotAnImage { .. } => "not-an-image",
            Self::ImageTooLarge { .. } | Self::NoMemory { .. } => "image-too-large",
            Self::ImageUnreadable { .. } | Self::ImageUnsupported { .. } | Self::FrameSize { .. } => "image-unreadable",
            Self::NoteEmpty => "note-empty",
            Self::NoteTooLong(_) => "note-too-long",
            Self::EncoderFile(_) => "encoder-file",
        }
    }
}

/// One thread an encoder: items are many, so they run side by side rather than the parts of one.
#[cfg(any(feature = "photo", feature = "text"))]
fn one_thread() -> std::sync::Arc<rten::ThreadPool> {
    std::sync::Arc::new(rten::ThreadPool::with_num_threads(1))
}
