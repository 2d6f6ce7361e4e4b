//! Which item to ask about next.
//!
//! Facility location: ask about the item that most improves how well every item is represented by one that was asked
//! about, Σ_i u_i · max over asked k of s(i, k), which greedy choice does to within 1 − 1/e of the best (Wei, Iyer, Bilmes
//! 2015, proceedings.mlr.press/v37/wei15). s is how closely the pile's graph of look-alikes joins two items,
//! K_ik / √(K_ii K_kk) with K = I + 0.9 S + (0.9 S)², walks of up to two steps: a group of look-alikes counts as one
//! wherever it lies. (Three and four steps, and all of them, ask no better.) u_i is how unsure the sorter is of item i, once it has something to go by; before, every item counts
//! the same, which is what finds trays that nobody has met yet. Neither depends on the order of earlier questions.
//!
//! A question costs O(n k²) for k neighbours an item.

use std::ops::RangeInclusive;

use crate::pile::graph::{Graph, SPREAD};

/// What the sorter knows of the items that may be asked about.
pub struct Situation<'a> {
    /// Who is like whom.
    pub graph: &'a Graph,
    /// Items with an answer of any kind: they need no question and cover what is like them.
    pub answered: &'a [usize],
    /// Items that may be asked about, in order.
    pub candidates: &'a [usize],
    /// How unsure the sorter is of each item number, 0 sure … 1 can't tell; 0 for items that are not in the pile.
    pub unsure: &'a [f64],
    /// How many trays have an answer.
    pub trays: usize,
}

impl Situation<'_> {
    /// Whether there are answers enough for the sorter's doubts to mean something.
    fn has_a_clue(&self) -> bool {
        self.trays >= 2 && 2 * self.answered.len() >= 3 * self.trays
    }

    /// The items whose answers help most, each chosen as if those before it were answered; the first of several that
    /// help the same. Fewer than `count` if there are no more candidates.
    pub fn choose(&self, count: usize) -> Vec<usize> {
        let mut cover = Cover::of(self);
        let mut bounds = cover.bounds();
        cover.choose(&mut bounds, count).into_iter().map(|(item, _)| item).collect()
    }

    /// Of groups of candidates, each at least as many as the least of `sizes`, the one whose best few answers help most, with
    /// these items and how their help compares with that of as many questions that are free to come from anywhere, 0 to 1;
    /// the first of several that help the same. `None` if no group is large enough. Cost: that of two questions, and
    /// little for each group.
    pub fn choose_together(
        &self,
        groups: &[Vec<usize>],
        sizes: RangeInclusive<usize>,
    ) -> Option<(usize, Vec<usize>, f64)> {
        let mut cover = Cover::of(self);
        let free = cover.bounds();
        let help = |chosen: &[(usize, f64)]| chosen.iter().map(|&(_, gain)| gain).sum::<f64>();
        let mut best: Option<(usize, Vec<(usize, f64)>)> = None;
        for (number, group) in groups.iter().enumerate().filter(|(_, group)| group.len() >= *sizes.start()) {
            let mut bounds: Vec<(usize, f64)> =
                free.iter().copied().filter(|(item, _)| group.binary_search(item).is_ok()).collect();
            let chosen = cover.choose(&mut bounds, *sizes.end());
            let mean = |chosen: &[(usize, f64)]| help(chosen) / chosen.len() as f64;
            if best.as_ref().is_none_or(|(_, most)| mean(&chosen) > mean(most)) {
                best = Some((number, chosen));
            }
        }
        let (number, chosen) = best.filter(|(_, chosen)| chosen.len() >= *sizes.start())?;
        let most = help(&cover.choose(&mut free.clone(), chosen.len()));
        let share = if most > 0.0 { help(&chosen) / most } else { 1.0 };
        Some((number, chosen.into_iter().map(|(item, _)| item).collect(), share))
    }
}

/// How well each item is represented by those with an answer.
struct Cover<'a> {
    situation: &'a Situation<'a>,
    walk: Walk,
    /// √K_ii.
    root: Vec<f64>,
    cover: Vec<f64>,
    clue: bool,
}

impl<'a> Cover<'a> {
    fn of(situation: &'a Situation<'a>) -> Self {
        let n = situation.graph.len();
        let root = (0..n).map(|item| situation.graph.returning(item).sqrt()).collect();
        let mut cover = Self { situation, walk: Walk::new(n), root, cover: vec![0.0; n], clue: situation.has_a_clue() };
        for &item in situation.answered {
            cover.take_in(item);
        }
        cover
    }

    fn take_in(&mut self, item: usize) {
        self.walk.from(self.situation.graph, item);
        for &near in &self.walk.touched {
            let near = near as usize;
            self.cover[near] = self.cover[near].max(self.walk.sum[near] / (self.root[near] * self.root[item]));
        }
    }

    fn gain(&mut self, item: usize) -> f64 {
        self.walk.from(self.situation.graph, item);
        self.walk
            .touched
            .iter()
            .map(|&near| {
                let near = near as usize;
                let more = (self.walk.sum[near] / (self.root[near] * self.root[item]) - self.cover[near]).max(0.0);
                if self.clue { more * self.situation.unsure[near] } else { more }
            })
            .sum()
    }

    /// What each candidate would bring by itself: what it brings beside others is no more.
    fn bounds(&mut self) -> Vec<(usize, f64)> {
        self.situation.candidates.iter().map(|&item| (item, self.gain(item))).collect()
    }

    /// Items with what each adds to those before it; the cover is as before afterwards.
    fn choose(&mut self, bounds: &mut Vec<(usize, f64)>, count: usize) -> Vec<(usize, f64)> {
        let before = self.cover.clone();
        let mut chosen = Vec::new();
        while chosen.len() < count {
            let mut best: Option<(usize, f64)> = None;
            for (place, (item, bound)) in bounds.iter_mut().enumerate() {
                // Gains only fall while others are chosen, so an old gain bounds the new one from above.
                if best.is_some_and(|(_, most)| *bound <= most) {
                    continue;
                }
                if !chosen.is_empty() {
                    *bound = self.gain(*item);
                }
                if best.is_none_or(|(_, most)| *bound > most) {
                    best = Some((place, *bound));
                }
            }
            let Some((place, gain)) = best else { break };
            let (item, _) = bounds.remove(place);
            self.take_in(item);
            chosen.push((item, gain));
        }
        self.cover = before;
        chosen
    }
}

/// Walks of up to two steps from one item: its column of I + 0.9 S + (0.9 S)².
struct Walk {
    /// By item number.
    sum: Vec<f64>,
    /// The items with a sum, in the order they were reached.
    touched: Vec<u32>,
}

impl Walk {
    fn new(n: usize) -> Self {
        Self { sum: vec![0.0; n], touched: Vec::new() }
    }

    fn from(&mut self, graph: &Graph, item: usize) {
        for &old in &self.touched {
            self.sum[old as usize] = 0.0;
        }
        self.touched.clear();
        self.reach(item, 1.0);
        for (near, weight) in graph.neighbours(item) {
            let weight = SPREAD * weight;
            self.reach(near, weight);
            for (far, onward) in graph.neighbours(near) {
                self.reach(far, weight * SPREAD * onward);
            }
        }
    }

    fn reach(&mut self, item: usize, weight: f64) {
        if self.sum[item] == 0.0 {
            self.touched.push(item as u32);
        }
        self.sum[item] += weight;
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    /// K = I + 0.9 S + (0.9 S)² as a whole matrix, normalised.
    fn kernel(graph: &Graph) -> Vec<Vec<f64>> {
        let n = graph.len();
        let mut s = vec![vec![0.0; n]; n];
        for (item, row) in s.iter_mut().enumerate() {
            graph.neighbours(item).for_each(|(other, weight)| row[other] = 0.9 * weight);
        }
        let square = |i: usize, j: usize| (0..n).map(|k| s[i][k] * s[k][j]).sum::<f64>();
        let k = |i: usize, j: usize| f64::from(u8::from(i == j)) + s[i][j] + square(i, j);
        (0..n).map(|i| (0..n).map(|j| k(i, j) / (k(i, i) * k(j, j)).sqrt()).collect()).collect()
    }

    fn worth(kernel: &[Vec<f64>], unsure: &[f64], asked: &[usize]) -> f64 {
        let cover = |i: usize| asked.iter().map(|&k| kernel[i][k]).fold(0.0, f64::max);
        (0..kernel.len()).map(|i| unsure[i] * cover(i)).sum()
    }

    proptest! {
        /// Every choice adds as much as the best does by trying all, with the whole kernel written out.
        #[test]
        fn each_choice_is_the_best_by_brute_force(
            cosines in prop::collection::vec(0.05_f32..1.0, 60),
            unsure in prop::collection::vec(0.05_f64..1.0, 12),
            first in 0_usize..12,
            trays in 0_usize..3,
        ) {
            let nearest: Vec<Vec<(u32, f32)>> = (0..12_usize)
                .map(|i| (1..4).map(|j| (((i * 5 + j * j) % 12) as u32, cosines[i * 5 + j])).collect())
                .collect();
            let graph = Graph::new(nearest);
            let kernel = kernel(&graph);
            let candidates: Vec<usize> = (0..12).filter(|&item| item != first).collect();
            let situation =
                Situation { graph: &graph, answered: &[first], candidates: &candidates, unsure: &unsure, trays };
            let chosen = situation.choose(5);
            prop_assert_eq!(chosen.len(), 5);
            // One answer is no clue yet: every item counts the same.
            let weights = [1.0; 12];
            let mut asked = vec![first];
            for item in chosen {
                let gain = |j: usize| {
                    worth(&kernel, &weights, &[&asked[..], &[j]].concat()) - worth(&kernel, &weights, &asked)
                };
                let best = candidates.iter().filter(|j| !asked.contains(j)).map(|&j| gain(j)).fold(0.0, f64::max);
                prop_assert!(gain(item) >= best - 1e-12);
                asked.push(item);
            }
        }

        /// Of the groups the one whose greedy choice adds most an item, and its share of what free questions add: by the
        /// whole kernel written out.
        #[test]
        fn the_best_group_is_the_best_by_brute_force(
            cosines in prop::collection::vec(0.05_f32..1.0, 60),
            split in prop::collection::vec(0_usize..3, 11),
        ) {
            let nearest: Vec<Vec<(u32, f32)>> = (0..12_usize)
                .map(|i| (1..4).map(|j| (((i * 5 + j * j) % 12) as u32, cosines[i * 5 + j])).collect())
                .collect();
            let graph = Graph::new(nearest);
            let kernel = kernel(&graph);
            let candidates: Vec<usize> = (1..12).collect();
            let groups: Vec<Vec<usize>> = (0..3).map(|g| (1..12).filter(|&item| split[item - 1] == g).collect()).collect();
            let situation =
                Situation { graph: &graph, answered: &[0], candidates: &candidates, unsure: &[1.0; 12], trays: 0 };
            let greedy = |from: &[usize], count: usize| {
                let mut asked = vec![0];
                for _ in 0..count.min(from.len()) {
                    let open = from.iter().filter(|j| !asked.contains(j));
                    let worth = |j: usize| worth(&kernel, &[1.0; 12], &[&asked[..], &[j]].concat());
                    let next = open.copied().fold((0, -1.0), |best, j| if worth(j) > best.1 + 1e-12 { (j, worth(j)) } else { best }).0;
                    asked.push(next);
                }
                worth(&kernel, &[1.0; 12], &asked) - worth(&kernel, &[1.0; 12], &[0])
            };
            let mean = |group: &Vec<usize>| greedy(group, 4) / group.len().min(4) as f64;
            let best = groups.iter().filter(|group| group.len() >= 3).map(mean).fold(0.0, f64::max);
            match situation.choose_together(&groups, 3..=4) {
                None => prop_assert!(groups.iter().all(|group| group.len() < 3)),
                Some((number, items, share)) => {
                    prop_assert!((mean(&groups[number]) - best).abs() < 1e-9);
                    prop_assert_eq!(items.len(), groups[number].len().min(4));
                    prop_assert!(items.iter().all(|item| groups[number].contains(item)));
                    let free = greedy(&candidates, items.len());
                    prop_assert!((share - greedy(&groups[number], items.len()) / free).abs() < 1e-9, "{share}");
                }
            }
        }

        #[test]
        fn doubts_count_once_there_is_a_clue(unsure in prop::collection::vec(0.05_f64..1.0, 12)) {
            let nearest: Vec<Vec<(u32, f32)>> =
                (0..12_u32).map(|i| (1..4).map(|j| ((i + j) % 12, 0.9 - 0.1 * j as f32)).collect()).collect();
            let graph = Graph::new(nearest);
            let kernel = kernel(&graph);
            let answered = [0, 4, 8];
            let candidates: Vec<usize> = (0..12).filter(|item| !answered.contains(item)).collect();
            let situation =
                Situation { graph: &graph, answered: &answered, candidates: &candidates, unsure: &unsure, trays: 2 };
            let asked = situation.choose(1)[0];
            let gain = |j: usize| worth(&kernel, &unsure, &[0, 4, 8, j]);
            let best = candidates.iter().map(|&j| gain(j)).fold(0.0, f64::max);
            prop_assert!(gain(asked) >= best - 1e-12);
        }
    }

    #[test]
    fn there_is_nothing_to_ask_without_candidates() {
        let graph = Graph::new(vec![vec![], vec![]]);
        let ask = |candidates: &[usize]| {
            Situation { graph: &graph, answered: &[], candidates, unsure: &[1.0, 1.0], trays: 0 }.choose(3)
        };
        assert_eq!(ask(&[]), Vec::<usize>::new());
        assert_eq!(ask(&[0, 1]), [0, 1], "items that are like nothing are asked about in order");
    }
}
