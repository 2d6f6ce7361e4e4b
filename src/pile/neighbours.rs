//! Who is near whom in a pile.
//!
//! Up to [`EXACT`] items the inner products of all pairs are kept while items arrive, and who is nearest is exact. Beyond
//! that, the likeliest [`CANDIDATES`] are found by sketches, products with [`SKETCH`] random vectors of signs, whose angles
//! differ from the items' by some 1/√64 (Charikar 2002; Achlioptas 2003), and only these are compared exactly. Sketches
//! are seen from the centre of the items that were there when the pile last outgrew its size by a quarter, so that the
//! result depends on the items and their order, never on when it was asked for.

use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;

use super::{
    Pile,
    graph::{Graph, NEIGHBOURS},
};
use crate::{arithmetic::dot, space::Centre};

/// Up to this many items all pairs are compared exactly.
pub const EXACT: usize = 2048;

/// Numbers in a sketch.
pub const SKETCH: usize = 64;

/// How many of an item's likeliest neighbours are compared exactly.
pub const CANDIDATES: usize = 32;

/// Inner products of a pile's items with each other, kept while items arrive.
#[derive(Debug, Clone)]
pub struct Neighbours {
    exact: usize,
    /// Row i holds the products with items 0 … i − 1; empty once there are more than [`EXACT`].
    products: Vec<Vec<f32>>,
    sketches: Option<Sketches>,
}

impl Default for Neighbours {
    fn default() -> Self {
        Self { exact: EXACT, products: Vec::new(), sketches: None }
    }
}

impl Neighbours {
    /// Takes in items that have arrived since. Cost O(n d) an item up to [`EXACT`] items; beyond that O((n + d) · 64) an
    /// item and, whenever the pile has grown by a quarter, O(n² · 64).
    pub fn catch_up(&mut self, pile: &Pile) {
        if pile.len() <= self.exact {
            for item in self.products.len()..pile.len() {
                self.products.push((0..item).map(|other| pile.product(item, other)).collect());
            }
            return;
        }
        self.products = Vec::new();
        self.sketches.get_or_insert_with(|| Sketches::new(pile.space().dimension())).catch_up(pile, self.exact);
    }

    /// The graph of the items that are in the pile. Cost O(n²) up to [`EXACT`] items; beyond that O(n · 32 d) the first
    /// time and O(n · 32) for items known from before.
    pub fn graph(&mut self, pile: &Pile) -> Graph {
        let centre = pile.centre();
        let seen: Vec<(f32, f32)> = (0..pile.len())
            .map(|item| if pile.contains(item) { pile.seen_from(&centre, item) } else { (0.0, 0.0) })
            .collect();
        let mut nearest: Vec<Vec<(u32, f32)>> = vec![Vec::with_capacity(NEIGHBOURS + 1); pile.len()];
        match &mut self.sketches {
            None => {
                let items: Vec<usize> = pile.items().collect();
                for (place, &a) in items.iter().enumerate() {
                    for &b in &items[..place] {
                        let cosine = centre.cosine(self.products[a][b], seen[a], seen[b]);
                        keep_nearest(&mut nearest[a], b as u32, cosine, NEIGHBOURS);
                        keep_nearest(&mut nearest[b], a as u32, cosine, NEIGHBOURS);
                    }
                }
            }
            Some(sketches) => {
                for a in pile.items() {
                    for candidate in &mut sketches.candidates[a] {
                        let b = candidate.item as usize;
                        if pile.contains(b) {
                            let product = *candidate.product.get_or_insert_with(|| pile.product(a, b));
                            keep_nearest(
                                &mut nearest[a],
                                candidate.item,
                                centre.cosine(product, seen[a], seen[b]),
                                NEIGHBOURS,
                            );
                        }
                    }
                }
            }
        }
        Graph::new(nearest)
    }
}

/// Keeps the nearest few, the earlier of equals.
fn keep_nearest(list: &mut Vec<(u32, f32)>, other: u32, cosine: f32, few: usize) {
    if list.len() == few && list.last().is_some_and(|&(_, least)| cosine <= least) {
        return;
    }
    let place = list.partition_point(|&(_, nearer)| nearer >= cosine);
    list.insert(place, (other, cosine));
    list.truncate(few);
}

#[derive(Debug, Clone, Copy)]
struct Candidate {
    item: u32,
    /// The cosine of the sketches.
    likely: f32,
    /// The items' inner product, once it was needed.
    product: Option<f32>,
}

#[derive(Debug, Clone)]
struct Sketches {
    /// [`SKETCH`] rows of d signs.
    signs: Vec<f32>,
    /// Of each item's place, [`SKETCH`] numbers an item.
    raw: Vec<f32>,
    /// The same seen from the centre, at unit length.
    seen: Vec<f32>,
    /// How many items the centre is that of.
    base: usize,
    centre: Vec<f32>,
    candidates: Vec<Vec<Candidate>>,
}

impl Sketches {
    fn new(dimension: usize) -> Self {
        // One fixed draw for every pile: what is near whom is no matter of chance between two runs.
        let mut rng = ChaCha8Rng::seed_from_u64(0x6b65_6e73);
        let signs = (0..SKETCH * dimension).map(|_| if rng.next_u32() & 1 == 0 { 1.0 } else { -1.0 }).collect();
        Self { signs, raw: Vec::new(), seen: Vec::new(), base: 0, centre: Vec::new(), candidates: Vec::new() }
    }

    fn of(&self, place: &[f32]) -> impl Iterator<Item = f32> + '_ {
        let place = place.to_vec();
        self.signs.chunks_exact(place.len()).map(move |signs| dot(signs, &place))
    }

    fn catch_up(&mut self, pile: &Pile, exact: usize) {
        for item in self.raw.len() / SKETCH..pile.len() {
            let sketch: Vec<f32> = self.of(pile.place(item)).collect();
            self.raw.extend(sketch);
        }
        let mut base = exact.max(1);
        while base + base.div_ceil(4) <= pile.len() {
            base += base.div_ceil(4);
        }
        if base != self.base {
            self.base = base;
            let centre = Centre::of((0..base).map(|item| pile.place(item)));
            self.centre = self.of(centre.mean()).collect();
            self.seen.clear();
            self.candidates.clear();
        }
        for item in self.candidates.len()..pile.len() {
            let raw = &self.raw[item * SKETCH..(item + 1) * SKETCH];
            let centred: Vec<f32> = raw.iter().zip(&self.centre).map(|(&x, &m)| x - m).collect();
            let length = dot(&centred, &centred).sqrt();
            let factor = if length > 0.0 { 1.0 / length } else { 0.0 };
            let sketch: Vec<f32> = centred.iter().map(|&x| x * factor).collect();
            let mut own = Vec::with_capacity(CANDIDATES + 1);
            for (other, earlier) in self.seen.chunks_exact(SKETCH).enumerate() {
                let likely = dot(earlier, &sketch);
                keep_likely(&mut own, other as u32, likely);
                keep_likely(&mut self.candidates[other], item as u32, likely);
            }
            self.seen.extend(sketch);
            self.candidates.push(own);
        }
    }
}

fn keep_likely(list: &mut Vec<Candidate>, item: u32, likely: f32) {
    if list.len() == CANDIDATES && list.last().is_some_and(|last| likely <= last.likely) {
        return;
    }
    let place = list.partition_point(|earlier| earlier.likely >= likely);
    list.insert(place, Candidate { item, likely, product: None });
    list.truncate(CANDIDATES);
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::Space;

    /// Around a few middles, by Weyl's sequence.
    fn embedding(item: usize, dimension: usize) -> Vec<f32> {
        let noise = |j: usize| ((item * dimension + j + 1) as f32 * 0.618_034).fract() - 0.5;
        (0..dimension).map(|j| noise(j) + if j % 7 == item % 7 { 0.4 } else { 0.0 }).collect()
    }

    fn pile(items: usize, dimension: usize) -> Pile {
        let mut pile = Pile::new(Space::new(dimension, false).unwrap());
        for item in 0..items {
            pile.add(&embedding(item, dimension)).unwrap();
        }
        pile
    }

    fn edges(graph: &Graph) -> Vec<Vec<usize>> {
        (0..graph.len()).map(|item| graph.neighbours(item).map(|(other, _)| other).collect()).collect()
    }

    #[test]
    fn sketches_find_most_of_the_nearest() {
        let pile = pile(300, 40);
        let graph = |exact: usize| {
            let mut neighbours = Neighbours { exact, ..Neighbours::default() };
            neighbours.catch_up(&pile);
            neighbours.graph(&pile)
        };
        let (exact, sketched) = (edges(&graph(300)), edges(&graph(100)));
        let all: usize = exact.iter().map(Vec::len).sum();
        let found: usize =
            exact.iter().zip(&sketched).map(|(a, b)| a.iter().filter(|item| b.contains(item)).count()).sum();
        assert!(found as f64 > 0.7 * all as f64, "{found} of {all}");
    }

    /// The graph depends on the items, not on when it was asked for.
    #[test]
    fn arriving_one_by_one_or_at_once_is_the_same() {
        let whole = pile(260, 24);
        let mut at_once = Neighbours { exact: 100, ..Neighbours::default() };
        at_once.catch_up(&whole);
        let mut growing = Neighbours { exact: 100, ..Neighbours::default() };
        let mut part = Pile::new(whole.space());
        for item in 0..260 {
            part.add(&embedding(item, 24)).unwrap();
            growing.catch_up(&part);
            if item % 37 == 0 {
                growing.graph(&part);
            }
        }
        let (a, b) = (at_once.graph(&whole), growing.graph(&part));
        for item in 0..260 {
            assert_eq!(a.neighbours(item).collect::<Vec<_>>(), b.neighbours(item).collect::<Vec<_>>());
        }
    }

    #[test]
    fn removed_items_have_no_neighbours() {
        for exact in [20, 100] {
            let mut pile = pile(60, 12);
            let mut neighbours = Neighbours { exact, ..Neighbours::default() };
            pile.set_removed(|item| item % 3 == 0);
            neighbours.catch_up(&pile);
            let graph = neighbours.graph(&pile);
            for (item, near) in edges(&graph).into_iter().enumerate() {
                assert!(near.iter().all(|other| other % 3 != 0 && item % 3 != 0));
            }
        }
    }
}
