//! The pile: every item's place in the space, the pile's own centre, and its structure.

pub mod graph;
pub mod neighbours;
pub mod propagation;

use std::sync::Arc;

use crate::{
    arithmetic::dot,
    error::{Error, Result},
    space::{Centre, Space},
    starter::Starter,
};

/// Items by number, in order of arrival; a number is never used again.
#[derive(Debug, Clone)]
pub struct Pile {
    space: Space,
    starter: Option<Arc<Starter>>,
    /// What past piles had in the middle, whitened like the places.
    past: Option<Vec<f32>>,
    places: Vec<f32>,
    squares: Vec<f32>,
    present: Vec<bool>,
    sum: Vec<f64>,
}

impl Pile {
    /// An empty pile.
    pub fn new(space: Space) -> Self {
        Self {
            space,
            starter: None,
            past: None,
            places: Vec::new(),
            squares: Vec::new(),
            present: Vec::new(),
            sum: vec![0.0; space.dimension()],
        }
    }

    /// An empty pile whose items are placed by what past piles taught. Refuses a starter of another space.
    pub fn with_starter(space: Space, starter: Arc<Starter>) -> Result<Self> {
        if starter.space() != space {
            return Err(Error::StarterUnreadable("it was made for embeddings of another form".into()));
        }
        let mut past = starter.mean().to_vec();
        starter.whitening().apply(&mut past);
        Ok(Self { starter: Some(starter), past: Some(past), ..Self::new(space) })
    }

    /// What past piles taught, if anything.
    pub fn starter(&self) -> Option<&Arc<Starter>> {
        self.starter.as_ref()
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

    /// Adds an item by its embedding and gives its number. Cost O(d), and O(r d) with a starter of r directions.
    pub fn add(&mut self, embedding: &[f32]) -> Result<usize> {
        let mut place = self.space.place(embedding)?;
        if let Some(starter) = &self.starter {
            starter.whitening().apply(&mut place);
        }
        self.squares.push(dot(&place, &place));
        self.sum.iter_mut().zip(&place).for_each(|(sum, &x)| *sum += f64::from(x));
        self.places.extend_from_slice(&place);
        self.present.push(true);
        Ok(self.len() - 1)
    }

    /// Takes the items out of the pile that are `removed` and puts the others back. Cost O(n d) if anything changes: the
    /// sum is taken anew, so that an item that went and came back leaves no trace in it. Tells whether anything changed.
    pub(crate) fn set_removed(&mut self, removed: impl Fn(usize) -> bool) -> bool {
        let present: Vec<bool> = (0..self.len()).map(|item| !removed(item)).collect();
        if present == self.present {
            return false;
        }
        self.present = present;
        let mut sum = vec![0.0; self.space.dimension()];
        for item in self.items() {
            sum.iter_mut().zip(self.place(item)).for_each(|(sum, &x)| *sum += f64::from(x));
        }
        self.sum = sum;
        true
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

    /// The item's place: d numbers, of unit length without a starter.
    pub fn place(&self, item: usize) -> &[f32] {
        let d = self.space.dimension();
        &self.places[item * d..(item + 1) * d]
    }

    /// The centre of the items in the pile.
    pub fn centre(&self) -> Centre {
        Centre::of_sum(&self.sum, self.present.iter().filter(|&&present| present).count(), self.past.as_deref())
    }

    /// An item's inner product with the centre and inverse distance from it. Cost O(d).
    pub(crate) fn seen_from(&self, centre: &Centre, item: usize) -> (f32, f32) {
        let product = centre.product(self.place(item));
        (product, centre.inverse_distance(self.squares[item], product))
    }

    /// Inner product of two items' places. Cost O(d).
    pub(crate) fn product(&self, a: usize, b: usize) -> f32 {
        dot(self.place(a), self.place(b))
    }
}
