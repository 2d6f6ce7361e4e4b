//! The space in which items are compared.
//!
//! An encoder's numbers are made comparable once, when an item arrives: features that are never negative (they come
//! after a rectifier) are replaced by their square roots, which tames the few that are very large (power transform:
//! Hu, Gripon, Pateux 2021, arXiv:2006.03806); then every vector is scaled to unit Euclidean length. Learners see items
//! from the pile's own centre, again at unit length (centring: SimpleShot, Wang et al. 2019, arXiv:1911.04623): what all
//! items of a pile have in common says nothing about which tray they belong to.

use serde::{Deserialize, Serialize};

use crate::{
    arithmetic::dot,
    error::{Error, Result},
};

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

/// How many items of no particular kind stand beside a pile's own when its centre is taken, so that the centre of a few
/// items does not swallow what tells them apart.
pub(crate) const CENTRE_CAUTION: f64 = 2.0;

/// Below this distance from the centre an item has no direction that rounding has not made.
const NO_DIRECTION: f32 = 1e-5;

/// The point from which a pile's items are seen.
#[derive(Debug, Clone, PartialEq)]
pub struct Centre {
    mean: Vec<f32>,
    square: f32,
}

impl Centre {
    /// The centre of `count` places with this sum, drawn while they are few toward what past piles had in the middle, or
    /// toward the origin.
    pub(crate) fn of_sum(sum: &[f64], count: usize, past: Option<&[f32]>) -> Self {
        let weight = 1.0 / (count as f64 + CENTRE_CAUTION);
        let past = |j: usize| past.map_or(0.0, |past| f64::from(past[j]));
        let mean: Vec<f32> =
            sum.iter().enumerate().map(|(j, &x)| ((x + CENTRE_CAUTION * past(j)) * weight) as f32).collect();
        let square = dot(&mean, &mean);
        Self { mean, square }
    }

    /// The centre of these places, each of d numbers.
    pub fn of<'a>(places: impl IntoIterator<Item = &'a [f32]>) -> Self {
        let mut sum = Vec::new();
        let mut count = 0;
        for place in places {
            sum.resize(place.len(), 0.0);
            sum.iter_mut().zip(place).for_each(|(sum, &x)| *sum += f64::from(x));
            count += 1;
        }
        Self::of_sum(&sum, count, None)
    }

    /// The centre itself, d numbers.
    pub fn mean(&self) -> &[f32] {
        &self.mean
    }

    /// A place's inner product with the centre. Cost O(d).
    pub(crate) fn product(&self, place: &[f32]) -> f32 {
        dot(&self.mean, place)
    }

    /// One over the distance between a place and the centre, given the place's square and their inner product; 0 for a
    /// place in the centre, which has no direction from there.
    pub(crate) fn inverse_distance(&self, square: f32, product: f32) -> f32 {
        let distance = (square - 2.0 * product + self.square).max(0.0).sqrt();
        if distance < NO_DIRECTION { 0.0 } else { 1.0 / distance }
    }

    /// Cosine of the angle under which two places are seen from here, given their inner product, and each one's inner
    /// product with the centre and inverse distance from it.
    pub(crate) fn cosine(&self, product: f32, a: (f32, f32), b: (f32, f32)) -> f32 {
        (product - a.0 - b.0 + self.square) * a.1 * b.1
    }

    /// The direction from here to a place: unit length, or zeros for a place in the centre. Cost O(d).
    pub fn view(&self, place: &[f32]) -> Vec<f32> {
        let factor = self.inverse_distance(dot(place, place), self.product(place));
        place.iter().zip(&self.mean).map(|(&x, &m)| (x - m) * factor).collect()
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

    #[test]
    fn seen_from_the_centre_items_have_unit_length() {
        let places = [[1.0_f32, 0.0], [0.6, 0.8], [0.8, 0.6]];
        let sum: Vec<f64> = (0..2).map(|j| places.iter().map(|p| f64::from(p[j])).sum()).collect();
        let centre = Centre::of_sum(&sum, 3, None);
        for place in places {
            assert!((length(&centre.view(&place)) - 1.0).abs() < 1e-5);
        }
        let seen = |p: &[f32]| (centre.product(p), centre.inverse_distance(dot(p, p), centre.product(p)));
        let direct = dot(&centre.view(&places[0]), &centre.view(&places[1]));
        let folded = centre.cosine(dot(&places[0], &places[1]), seen(&places[0]), seen(&places[1]));
        assert!((direct - folded).abs() < 1e-5);
    }

    #[test]
    fn an_item_in_the_centre_has_no_direction() {
        let centre = Centre { mean: vec![0.6, 0.8], square: 1.0 };
        assert_eq!(centre.view(&[0.6, 0.8]), [0.0, 0.0]);
    }
}
