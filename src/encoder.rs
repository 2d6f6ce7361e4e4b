//! From an item's bytes to its embedding.

/// Why an item could not be embedded, or an encoder file not be used.
#[derive(Debug, thiserror::Error)]
pub enum EncoderError {}
