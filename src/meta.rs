//! Learning across piles: small tasks drawn from labelled material, and how well sorting does on them.

pub mod episode;
pub mod rehearse;
