//! The space in which items are compared.
//!
//! An encoder's numbers are made comparable once, when an item arrives: features that are never negative (they come
//! after a rectifier) are replaced by their square roots, which tames the few that are very large (power transform:
//! Hu, Gripon, Pateux 2021, arXiv:2006.03806); then every vector is scaled to unit Euclidean length.

use serde::{Deserialize, Serialize};

use crate::error::{Error, Result};

/// The smallest and largest embedding the sorter takes.
pub const DIMENSIONS: std::ops::RangeInclusive<usize> = 2..=4096;

/// Maps an encoder's embeddings to the unit vectors that learners see.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub struct Space {
    dimension: usize,
    non_negative: bool,
}

impl Space {
    /// A space for embeddings of `dimension` numbers (2 to 4096).
    ///
    /// `non_negative` states that the encoder never gives a negative number.
    pub fn new(dimension: usize, non_negative: bool) -> Result<Self> {
        if !DIMENSIONS.contains(&dimension) {
            return Err(Error::DimensionOutOfRange(dimension));
        }
        Ok(Self { dimension, non_negative })
    }

    /// How many numbers an embedding has.
    pub fn dimension(&self) -> usize {
        self.dimension
    }

    /// Whether embeddings are never negative.
    pub fn non_negative(&self) -> bool {
        self.non_negative
    }

    /// The embedding's place in this space: `dimension` numbers of unit Euclidean length. Cost O(d).
    ///
    /// Refuses an embedding of another length, one that holds NaN or an infinity, one of zeros only and, in a
    /// never-negative space, one with a negative number.
    pub fn place(&self, embedding: &[f32]) -> Result<Vec<f32>> {
        if embedding.len() != self.dimension {
            return Err(Error::WrongDimension { expected: self.dimension, found: embedding.len() });
        }
        if let Some(position) = embedding.iter().position(|x| !x.is_finite()) {
            return Err(Error::NotFinite { position, value: embedding[position] });
        }
        if self.non_negative
            && let Some(position) = embedding.iter().position(|&x| x < 0.0)
        {
            return Err(Error::Negative { position, value: embedding[position] });
        }
        // f64 holds the square of every finite f32, however large or small.
        let tamed = |x: f32| if self.non_negative { f64::from(x).sqrt() } else { f64::from(x) };
        let length = embedding.iter().map(|&x| tamed(x).powi(2)).sum::<f64>().sqrt();
        if length == 0.0 {
            return Err(Error::AllZero);
        }
        Ok(embedding.iter().map(|&x| (tamed(x) / length) as f32).collect())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn length(v: &[f32]) -> f64 {
        v.iter().map(|&x| f64::from(x).powi(2)).sum::<f64>().sqrt()
    }

    #[test]
    fn square_root_then_unit_length() {
        let space = Space::new(3, true).unwrap();
        let placed = space.place(&[9.0, 16.0, 0.0]).unwrap();
        // Roots 3, 4, 0 have length 5.
        assert_eq!(placed, [0.6, 0.8, 0.0]);
    }

    #[test]
    fn signed_embeddings_keep_their_direction() {
        let space = Space::new(2, false).unwrap();
        assert_eq!(space.place(&[-3.0, 4.0]).unwrap(), [-0.6, 0.8]);
    }

    #[test]
    fn extreme_scales_still_have_unit_length() {
        for scale in [1e-38_f32, 1e-30, 1.0, 1e30, 1e38] {
            for non_negative in [true, false] {
                let placed = Space::new(3, non_negative).unwrap().place(&[scale, 2.0 * scale, 0.5 * scale]).unwrap();
                assert!((length(&placed) - 1.0).abs() < 1e-6, "{scale} {non_negative}");
            }
        }
    }

    #[test]
    fn refusals_name_the_reason() {
        let space = Space::new(2, true).unwrap();
        assert_eq!(space.place(&[1.0]).unwrap_err().code(), "wrong-dimension");
        assert_eq!(space.place(&[1.0, f32::NAN]).unwrap_err().code(), "not-finite");
        assert_eq!(space.place(&[1.0, f32::INFINITY]).unwrap_err().code(), "not-finite");
        assert_eq!(space.place(&[1.0, -1.0]).unwrap_err().code(), "negative");
        assert_eq!(space.place(&[0.0, 0.0]).unwrap_err().code(), "all-zero");
        assert_eq!(Space::new(1, true).unwrap_err().code(), "dimension-out-of-range");
        assert_eq!(Space::new(4097, true).unwrap_err().code(), "dimension-out-of-range");
    }
}
