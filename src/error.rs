//! The library's error type.

/// What can go wrong in the library; every message names the item and the remedy.
#[derive(Debug, thiserror::Error)]
pub enum Error {
    /// An item could not be turned into an embedding.
    #[error(transparent)]
    Encoder(#[from] crate::encoder::EncoderError),
}

/// The library's result type.
pub type Result<T, E = Error> = std::result::Result<T, E>;
