//! Which item to ask about next.
//!
//! Facility location: ask about the item that most improves how well every item is represented by one that was asked
//! about, Σ_i max over asked k of s(i, k)₊, with s the cosine seen from the pile's centre (Wei, Iyer, Bilmes 2015,
//! proceedings.mlr.press/v37/wei15). Once there are three answers for two trays, similarities are cubed, which asks for
//! finer cover, and an item's gain is weighted by how unsure the sorter is of it.
//!
//! Items beyond [`ANCHORS`] are represented by a seeded sample of that size. A question costs O(n · anchors); an item's
//! arrival costs O(anchors · d).

use rand::{SeedableRng, seq::index};
use rand_chacha::ChaCha8Rng;

use crate::{pile::Pile, space::Centre};

/// How many items stand for the whole pile.
pub const ANCHORS: usize = 512;

/// What the sorter knows of the items that may be asked about.
pub struct Situation<'a> {
    /// Items with an answer of any kind: they need no question and cover what is like them.
    pub answered: &'a [usize],
    /// Items that may be asked about, each with how unsure the sorter is of it (0 sure … 1 can't tell).
    pub candidates: &'a [(usize, f64)],
    /// How many trays have an answer.
    pub trays: usize,
}

/// Chooses questions; keeps the inner products between items and anchors.
#[derive(Debug, Clone)]
pub struct Asker {
    seed: u64,
    anchors: Vec<usize>,
    /// One row an item: inner products with the anchors.
    products: Vec<Vec<f32>>,
    chosen_at: usize,
}

impl Asker {
    /// An asker whose sample of anchors is drawn with `seed`.
    pub fn new(seed: u64) -> Self {
        Self { seed, anchors: Vec::new(), products: Vec::new(), chosen_at: 0 }
    }

    /// Takes in items that have arrived since.
    fn catch_up(&mut self, pile: &Pile) {
        let n = pile.len();
        if n <= ANCHORS {
            for item in self.products.len()..n {
                for (other, row) in self.products.iter_mut().enumerate() {
                    row.push(pile.product(other, item));
                }
                self.products.push((0..=item).map(|other| pile.product(item, other)).collect());
            }
            self.anchors = (0..n).collect();
            self.chosen_at = n;
        } else if n > self.chosen_at + self.chosen_at / 4 {
            // A sample drawn while the pile was smaller would overlook what came last.
            let mut rng = ChaCha8Rng::seed_from_u64(self.seed ^ n as u64);
            self.anchors = index::sample(&mut rng, n, ANCHORS).into_vec();
            self.anchors.sort_unstable();
            self.products.clear();
            self.chosen_at = n;
        }
        for item in self.products.len()..n {
            self.products.push(self.anchors.iter().map(|&anchor| pile.product(item, anchor)).collect());
        }
    }

    /// The item whose answer helps most, the first of several; `None` if there is no candidate.
    pub fn next(&mut self, pile: &Pile, centre: &Centre, situation: &Situation) -> Option<usize> {
        self.catch_up(pile);
        let seen = |item: usize| pile.seen_from(centre, item);
        let anchors: Vec<(usize, (f32, f32))> = self
            .anchors
            .iter()
            .enumerate()
            .filter(|&(_, &anchor)| pile.contains(anchor))
            .map(|(column, &anchor)| (column, seen(anchor)))
            .collect();
        let fine = 2 * situation.answered.len() >= 3 * situation.trays.max(2);
        let similarity = |item: usize, own: (f32, f32), (column, anchor): (usize, (f32, f32))| {
            let cosine = f64::from(centre.cosine(self.products[item][column], own, anchor)).max(0.0);
            if fine { cosine * cosine * cosine } else { cosine }
        };

        let mut cover = vec![0.0_f64; anchors.len()];
        for &item in situation.answered {
            let own = seen(item);
            for (covered, &anchor) in cover.iter_mut().zip(&anchors) {
                *covered = covered.max(similarity(item, own, anchor));
            }
        }
        let mut best: Option<(usize, f64)> = None;
        for &(item, unsure) in situation.candidates {
            let own = seen(item);
            let gain: f64 = cover
                .iter()
                .zip(&anchors)
                .map(|(&covered, &anchor)| (similarity(item, own, anchor) - covered).max(0.0))
                .sum();
            let worth = if fine { gain * unsure } else { gain };
            if best.is_none_or(|(_, most)| worth > most) {
                best = Some((item, worth));
            }
        }
        best.map(|(item, _)| item)
    }
}
