//! Who is near whom in a pile.

use crate::pile::Pile;

/// How many look-alikes an item has.
pub const NEIGHBOURS: usize = 10;

/// Beyond this many items nobody is compared with everybody: it would take too long and too much memory.
pub const MOST_ITEMS: usize = 4000;

/// Inner products of a pile's items with each other, kept while items arrive.
#[derive(Debug, Clone, Default)]
pub struct Neighbours {
    /// Row i holds the products with items 0 … i − 1.
    products: Vec<Vec<f32>>,
}

impl Neighbours {
    /// The nearest items of each, by the cosine seen from the pile's centre, with that cosine's third power as weight; empty for
    /// items that are not in the pile or have none at a positive cosine. Cost O(m d) for each item that has arrived since, and
    /// O(m²); memory 4 · m²/2 bytes.
    pub fn nearest(&mut self, pile: &Pile) -> Vec<Vec<(usize, f64)>> {
        let mut lists = vec![Vec::new(); pile.len()];
        if pile.len() > MOST_ITEMS {
            self.products = Vec::new();
            return lists;
        }
        for item in self.products.len()..pile.len() {
            self.products.push((0..item).map(|other| pile.product(item, other)).collect());
        }
        let centre = pile.centre();
        let items: Vec<usize> = pile.items().collect();
        let seen: Vec<(f32, f32)> = items.iter().map(|&item| pile.seen_from(&centre, item)).collect();
        for (at, &item) in items.iter().enumerate() {
            for (before, &other) in items[..at].iter().enumerate() {
                let cosine = f64::from(centre.cosine(self.products[item][other], seen[at], seen[before]));
                keep(&mut lists[item], other, cosine);
                keep(&mut lists[other], item, cosine);
            }
        }
        for (_, weight) in lists.iter_mut().flatten() {
            *weight = *weight * *weight * *weight;
        }
        lists
    }
}

/// Keeps the nearest few, the earlier of equals.
fn keep(list: &mut Vec<(usize, f64)>, other: usize, cosine: f64) {
    if cosine <= 0.0 || list.len() == NEIGHBOURS && list.last().is_some_and(|&(_, least)| cosine <= least) {
        return;
    }
    let place = list.partition_point(|&(_, nearer)| nearer >= cosine);
    list.insert(place, (other, cosine));
    list.truncate(NEIGHBOURS);
}
