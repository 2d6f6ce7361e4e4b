//! The pile: every item's place in the space, and the pile's own centre.

use crate::{
    arithmetic::dot,
    error::{Error, Result},
    space::{Centre, Space},
};

/// Items by number, in order of arrival; a number is never used again.
#[derive(Debug, Clone)]
pub struct Pile {
    space: Space,
    places: Vec<f32>,
    present: Vec<bool>,
    sum: Vec<f64>,
}

impl Pile {
    /// An empty pile.
    pub fn new(space: Space) -> Self {
        Self { space, places: Vec::new(), present: Vec::new(), sum: vec![0.0; space.dimension()] }
    }

    /// The space that items are placed in.
    pub fn space(&self) -> Space {
        self.space
    }

    /// How many item numbers are in use, removed items included.
    pub fn len(&self) -> usize {
        self.present.len()
    }

    /// Whether no item was ever added.
    pub fn is_empty(&self) -> bool {
        self.present.is_empty()
    }

    /// Adds an item by its embedding and gives its number. Cost O(d).
    pub fn add(&mut self, embedding: &[f32]) -> Result<usize> {
        let place = self.space.place(embedding)?;
        self.sum.iter_mut().zip(&place).for_each(|(sum, &x)| *sum += f64::from(x));
        self.places.extend_from_slice(&place);
        self.present.push(true);
        Ok(self.len() - 1)
    }

    /// Takes an item out of the pile or puts it back.
    pub(crate) fn set_present(&mut self, item: usize, present: bool) {
        if self.present[item] != present {
            self.present[item] = present;
            let sign = if present { 1.0 } else { -1.0 };
            let d = self.space.dimension();
            let place = &self.places[item * d..(item + 1) * d];
            self.sum.iter_mut().zip(place).for_each(|(sum, &x)| *sum += sign * f64::from(x));
        }
    }

    /// Whether the item is in the pile.
    pub fn contains(&self, item: usize) -> bool {
        self.present.get(item).copied().unwrap_or(false)
    }

    /// The item's number if it is in the pile.
    pub(crate) fn check(&self, item: usize) -> Result<usize> {
        if self.contains(item) { Ok(item) } else { Err(Error::NoSuchItem(item)) }
    }

    /// Numbers of the items in the pile, in order.
    pub fn items(&self) -> impl Iterator<Item = usize> + '_ {
        (0..self.len()).filter(|&item| self.present[item])
    }

    /// The item's place: d numbers of unit length.
    pub fn place(&self, item: usize) -> &[f32] {
        let d = self.space.dimension();
        &self.places[item * d..(item + 1) * d]
    }

    /// The centre of the items in the pile.
    pub fn centre(&self) -> Centre {
        Centre::of_sum(&self.sum, self.present.iter().filter(|&&present| present).count())
    }

    /// Inner product of two items' places. Cost O(d).
    pub(crate) fn product(&self, a: usize, b: usize) -> f32 {
        dot(self.place(a), self.place(b))
    }
}
