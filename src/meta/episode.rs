//! Episodes: small tasks drawn from labelled items, to try out or to teach how to learn.
//!
//! An episode is a few categories (its way) with a few examples of each (its shot) and queries, items of the same
//! categories whose label is kept back (Vinyals et al. 2016, arXiv:1606.04080; uneven counts: Triantafillou et al. 2020,
//! arXiv:1903.03096). Each [`Draw`] gives one episode for every shot, with the same categories and queries and with the
//! examples of the smaller shots among those of the larger: what differs between shots is then the shot alone.

use std::num::NonZeroUsize;

use rand::{
    SeedableRng,
    seq::{SliceRandom, index},
};
use rand_chacha::ChaCha8Rng;

use crate::error::{Error, Result};

/// In uneven episodes each category has this times as many items as the one before.
const UNEVEN_RATIO: f64 = 0.66;

/// The share of each of so many categories, the first the largest: equal, or each [`UNEVEN_RATIO`] times the one before.
/// Products and sums only, so that rounding falls the same way everywhere.
pub(super) fn shares(ways: usize, uneven: bool) -> Vec<f64> {
    let ratio = if uneven { UNEVEN_RATIO } else { 1.0 };
    let weights: Vec<f64> = std::iter::successors(Some(1.0), |weight| Some(weight * ratio)).take(ways).collect();
    let whole: f64 = weights.iter().sum();
    weights.into_iter().map(|weight| weight / whole).collect()
}

/// Items by category.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Labelled {
    members: Vec<Vec<usize>>,
}

impl Labelled {
    /// Items 0, 1, 2 … by their labels, which are category numbers below `categories`.
    pub fn new(labels: &[usize], categories: usize) -> Result<Self> {
        let mut members = vec![Vec::new(); categories];
        for (item, &label) in labels.iter().enumerate() {
            members.get_mut(label).ok_or(Error::LabelOutOfRange { label, categories })?.push(item);
        }
        Ok(Self { members })
    }

    /// How many categories there are, those without an item included.
    pub fn categories(&self) -> usize {
        self.members.len()
    }

    /// The items of a category, in order.
    pub fn members(&self, category: usize) -> &[usize] {
        &self.members[category]
    }

    /// Splits by category, never by item: the second part holds `share` (0 to 1, rounded to whole categories) of the
    /// categories with an item, the first the others. Both keep the category numbers; a category is empty in one of them.
    pub fn split(&self, share: f64, seed: u64) -> (Self, Self) {
        let mut filled: Vec<usize> = (0..self.categories()).filter(|&c| !self.members[c].is_empty()).collect();
        filled.shuffle(&mut ChaCha8Rng::seed_from_u64(seed));
        let second = (share.clamp(0.0, 1.0) * filled.len() as f64).round() as usize;
        let (mut kept, mut held_out) = (self.clone(), self.clone());
        for (position, &category) in filled.iter().enumerate() {
            let emptied = if position < second { &mut kept } else { &mut held_out };
            emptied.members[category].clear();
        }
        (kept, held_out)
    }
}

/// What episodes look like.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Design {
    /// Categories an episode; fewer where fewer have enough items.
    pub ways: NonZeroUsize,
    /// Examples a category, in any order.
    pub shots: Vec<NonZeroUsize>,
    /// Queries a category, as far as it has the items.
    pub queries: NonZeroUsize,
    /// Whether examples and queries are spread unevenly: each category has 0.66 times as many as the one before, but at
    /// least one and at most what it has; `shots` and `queries` are then the mean.
    pub uneven: bool,
    /// Seed of everything that is drawn.
    pub seed: u64,
}

impl Design {
    /// The shots in ascending order, each once.
    pub fn shots(&self) -> Vec<usize> {
        let mut shots: Vec<usize> = self.shots.iter().map(|shot| shot.get()).collect();
        shots.sort_unstable();
        shots.dedup();
        shots
    }

    /// How many items a category must have to take part: the examples of the largest shot and one query.
    pub fn least_items(&self) -> usize {
        self.shots().last().copied().unwrap_or(0) + 1
    }

    /// How many items each of an episode's categories gets when there are `mean` a category.
    fn spread(&self, mean: usize, ways: usize) -> Vec<usize> {
        if !self.uneven {
            return vec![mean; ways];
        }
        let all = (mean * ways) as f64;
        shares(ways, true).iter().map(|share| ((share * all).round() as usize).max(1)).collect()
    }
}

/// An item of an episode.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Labelling {
    /// The item's number among the labelled items.
    pub item: usize,
    /// The position of its category within the episode (0 … way − 1).
    pub label: usize,
}

/// A small task.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Episode {
    /// The categories' numbers among the labelled ones, by label.
    pub categories: Vec<usize>,
    /// The examples, at least one of each category.
    pub support: Vec<Labelling>,
    /// The items to sort, at least one of each category; none of them is an example.
    pub queries: Vec<Labelling>,
}

#[derive(Debug, Clone)]
struct Group {
    category: usize,
    queries: Vec<usize>,
    /// The examples of the largest shot.
    support: Vec<usize>,
}

/// The episodes that one draw gives, one for each shot.
#[derive(Debug, Clone)]
pub struct Draw {
    groups: Vec<Group>,
    /// By shot, then by label.
    counts: Vec<Vec<usize>>,
}

impl Draw {
    /// The episode at the shot in this position of [`Design::shots`].
    pub fn at(&self, shot: usize) -> Episode {
        let counts = &self.counts[shot];
        let labelled = |items: &[usize], label: usize| -> Vec<Labelling> {
            items.iter().map(|&item| Labelling { item, label }).collect()
        };
        let groups = || self.groups.iter().enumerate();
        Episode {
            categories: self.groups.iter().map(|group| group.category).collect(),
            support: groups()
                .flat_map(|(label, group)| labelled(&group.support[..counts[label].min(group.support.len())], label))
                .collect(),
            queries: groups().flat_map(|(label, group)| labelled(&group.queries, label)).collect(),
        }
    }
}

/// Draws episodes from labelled items.
#[derive(Debug, Clone)]
pub struct Episodes {
    labelled: Labelled,
    taking_part: Vec<usize>,
    ways: usize,
    /// Examples by shot, then by label.
    counts: Vec<Vec<usize>>,
    /// Queries by label.
    queries: Vec<usize>,
    seed: u64,
}

impl Episodes {
    /// Episodes of this design. Categories with fewer than [`Design::least_items`] don't take part; refuses fewer than
    /// two that do.
    pub fn new(labelled: Labelled, design: &Design) -> Result<Self> {
        let least = design.least_items();
        let taking_part: Vec<usize> =
            (0..labelled.categories()).filter(|&category| labelled.members(category).len() >= least).collect();
        let ways = design.ways.get().min(taking_part.len());
        if ways < 2 {
            return Err(Error::TooFewCategories(ways));
        }
        let counts = design.shots().iter().map(|&shot| design.spread(shot, ways)).collect();
        let queries = design.spread(design.queries.get(), ways);
        Ok(Self { labelled, taking_part, ways, counts, queries, seed: design.seed })
    }

    /// The categories that take part, in order.
    pub fn taking_part(&self) -> &[usize] {
        &self.taking_part
    }

    /// How many categories an episode has.
    pub fn ways(&self) -> usize {
        self.ways
    }

    /// The draw of this number: the same for the same seed and number, whatever was drawn before.
    pub fn draw(&self, number: u64) -> Draw {
        let mut rng = ChaCha8Rng::seed_from_u64(self.seed);
        rng.set_stream(number);
        let chosen = index::sample(&mut rng, self.taking_part.len(), self.ways);
        let most = self.counts.last();
        let groups = chosen
            .iter()
            .enumerate()
            .map(|(label, position)| {
                let category = self.taking_part[position];
                let members = self.labelled.members(category);
                let support = most.map_or(0, |counts| counts[label]).min(members.len() - 1);
                let queries = self.queries[label].min(members.len() - support);
                let items = index::sample(&mut rng, members.len(), queries + support).into_iter();
                let mut items: Vec<usize> = items.map(|position| members[position]).collect();
                let support = items.split_off(queries);
                Group { category, queries: items, support }
            })
            .collect();
        Draw { groups, counts: self.counts.clone() }
    }
}

#[cfg(test)]
mod tests {
    use std::collections::HashSet;

    use proptest::prelude::*;

    use super::*;

    fn nonzero(number: usize) -> NonZeroUsize {
        NonZeroUsize::new(number).unwrap()
    }

    fn labels(sizes: &[usize]) -> Vec<usize> {
        // Interleaved, as labels in a file are.
        (0..sizes.iter().copied().max().unwrap_or(0))
            .flat_map(|round| (0..sizes.len()).filter(move |&category| round < sizes[category]).collect::<Vec<_>>())
            .collect()
    }

    fn design() -> impl Strategy<Value = Design> {
        (2_usize..7, prop::collection::vec(1_usize..6, 1..4), 1_usize..8, any::<bool>(), any::<u64>()).prop_map(
            |(ways, shots, queries, uneven, seed)| Design {
                ways: nonzero(ways),
                shots: shots.into_iter().map(nonzero).collect(),
                queries: nonzero(queries),
                uneven,
                seed,
            },
        )
    }

    proptest! {
        #[test]
        fn episodes_keep_what_they_promise(
            sizes in prop::collection::vec(0_usize..14, 2..9),
            design in design(),
            number in 0_u64..1000,
        ) {
            let labels = labels(&sizes);
            let enough = sizes.iter().filter(|&&size| size >= design.least_items()).count();
            let episodes = Episodes::new(Labelled::new(&labels, sizes.len()).unwrap(), &design);
            if enough < 2 {
                prop_assert_eq!(episodes.unwrap_err().code(), "too-few-categories");
                return Ok(());
            }
            let episodes = episodes.unwrap();
            prop_assert_eq!(episodes.taking_part().len(), enough);
            prop_assert_eq!(episodes.ways(), design.ways.get().min(enough));
            let draw = episodes.draw(number);
            let mut earlier: HashSet<usize> = HashSet::new();
            for (position, &shot) in design.shots().iter().enumerate() {
                let episode = draw.at(position);
                prop_assert_eq!(&episode, &episodes.draw(number).at(position));
                prop_assert_eq!(episode.categories.len(), episodes.ways());
                let items: HashSet<usize> = episode.support.iter().chain(&episode.queries).map(|one| one.item).collect();
                prop_assert_eq!(items.len(), episode.support.len() + episode.queries.len(), "an item came twice");
                for one in episode.support.iter().chain(&episode.queries) {
                    prop_assert_eq!(labels[one.item], episode.categories[one.label]);
                }
                for (label, &category) in episode.categories.iter().enumerate() {
                    let count = |side: &[Labelling]| side.iter().filter(|one| one.label == label).count();
                    let (examples, queries) = (count(&episode.support), count(&episode.queries));
                    prop_assert!(examples >= 1 && queries >= 1);
                    if !design.uneven {
                        prop_assert_eq!(examples, shot);
                        let spare = sizes[category] - design.shots().last().unwrap();
                        prop_assert_eq!(queries, design.queries.get().min(spare));
                    }
                }
                let now: HashSet<usize> = episode.support.iter().map(|one| one.item).collect();
                prop_assert!(earlier.is_subset(&now), "a smaller shot's examples are among a larger one's");
                earlier = now;
            }
        }

        #[test]
        fn a_split_never_divides_a_category(
            sizes in prop::collection::vec(0_usize..5, 1..20),
            share in 0.0_f64..=1.0,
            seed in any::<u64>(),
        ) {
            let all = Labelled::new(&labels(&sizes), sizes.len()).unwrap();
            let (kept, held_out) = all.split(share, seed);
            for category in 0..sizes.len() {
                let parts = [kept.members(category), held_out.members(category)];
                prop_assert!(parts.iter().any(|part| part.is_empty()));
                prop_assert_eq!(parts.concat(), all.members(category));
            }
            let filled = |part: &Labelled| (0..sizes.len()).filter(|&c| !part.members(c).is_empty()).count();
            prop_assert_eq!(filled(&held_out), (share * filled(&all) as f64).round() as usize);
            prop_assert_eq!(all.split(share, seed), (kept, held_out));
        }
    }

    #[test]
    fn every_category_and_item_gets_its_turn() {
        let design = Design { ways: nonzero(2), shots: vec![nonzero(1)], queries: nonzero(1), uneven: false, seed: 7 };
        let episodes = Episodes::new(Labelled::new(&labels(&[3; 5]), 5).unwrap(), &design).unwrap();
        let (mut examples, mut queries) = ([0; 15], [0; 15]);
        for number in 0..3000 {
            let episode = episodes.draw(number).at(0);
            episode.support.iter().for_each(|one| examples[one.item] += 1);
            episode.queries.iter().for_each(|one| queries[one.item] += 1);
        }
        // 3000 · 2 / 15 = 400 each, with a standard deviation of 18.6.
        for count in examples.into_iter().chain(queries) {
            assert!((300..=500).contains(&count), "{examples:?} {queries:?}");
        }
    }

    #[test]
    fn uneven_counts_fall_from_category_to_category() {
        let design = Design { ways: nonzero(5), shots: vec![nonzero(5)], queries: nonzero(15), uneven: true, seed: 1 };
        let episodes = Episodes::new(Labelled::new(&labels(&[60; 6]), 6).unwrap(), &design).unwrap();
        let episode = episodes.draw(0).at(0);
        let count = |side: &[Labelling], label| side.iter().filter(|one| one.label == label).count();
        let counts = |side: &[Labelling]| (0..5).map(|label| count(side, label)).collect::<Vec<_>>();
        // 25 · 0.66^k / (1 + 0.66 + … + 0.66⁴) = 9.72, 6.41, 4.23, 2.79, 1.84.
        assert_eq!(counts(&episode.support), [10, 6, 4, 3, 2]);
        assert_eq!(counts(&episode.queries), [29, 19, 13, 8, 6]);
    }
}
