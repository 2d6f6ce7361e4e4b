//! Kenspeckle.
pub mod encoder;
pub mod error;
pub use error::{Error, Result};
#[cfg(target_family = "wasm")]
mod js;
