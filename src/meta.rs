//! Learning across piles: what past piles teach, small tasks drawn from labelled material, and how well sorting does on
//! them.

pub mod episode;
pub mod hindsight;
pub mod rehearse;
pub mod replay;
pub mod statistics;
pub mod train;
mod unroll;
