//! Doubts: answers that the other answers contradict.
//!
//! Each answer is judged by the others; those that the others would have put elsewhere come first where they are surest of it: by
//! the margin between the tray they speak for and the one that was named (Northcutt, Jiang, Chuang 2021, arXiv:1911.00068,
//! rank by "normalized margin"). Near-duplicates in different trays can't both be right, and an item that was answered twice
//! differently may be answered wrongly still. Cost O(n C + n²).

use serde::Serialize;

use super::{evidence::Evidence, first};
use crate::support::Support;

/// From this cosine on, seen from the pile's centre, two items are all but the same picture or note. By eye.
const NEAR_DUPLICATE: f64 = 0.95;

/// Why an answer is doubted.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case", tag = "why")]
pub enum Why {
    /// The other answers speak for another tray.
    Contradicted,
    /// A near-duplicate lies in another tray.
    Duplicate {
        /// The near-duplicate.
        other: usize,
    },
    /// It was answered differently before.
    Changed,
}

/// An answer that may be wrong.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
#[serde(rename_all = "camelCase")]
pub struct Doubt {
    /// The item.
    pub item: usize,
    /// The tray that the person named.
    pub tray: usize,
    /// The tray that something else speaks for.
    pub rather: usize,
    /// How sure the others are of that: the probability of `rather` less that of `tray`, −1 to 1.
    pub weight: f64,
    /// Why.
    #[serde(flatten)]
    pub why: Why,
}

/// Doubts, the gravest first, each item once. `earlier` holds items that were answered differently before, with the earlier tray.
pub fn doubts(
    evidence: &Evidence,
    support: &Support,
    trays: &[usize],
    items: &[usize],
    earlier: &[(usize, usize)],
) -> Vec<Doubt> {
    let mut doubts: Vec<Doubt> = Vec::new();
    let mut margins = vec![None; evidence.len()];
    for (example, label, probabilities) in evidence.judged() {
        let others = probabilities.iter().enumerate().filter(|&(category, _)| category != label);
        let Some((rather, top)) =
            others.map(|(category, &p)| (category, p)).max_by(|a, b| a.1.total_cmp(&b.1).then(b.0.cmp(&a.0)))
        else {
            continue;
        };
        margins[example] = Some(top - probabilities[label]);
        if first(probabilities).is_some_and(|(category, _)| category != label) {
            doubts.push(Doubt {
                item: items[example],
                tray: trays[label],
                rather: trays[rather],
                weight: top - probabilities[label],
                why: Why::Contradicted,
            });
        }
    }
    let gram = support.gram();
    for a in 0..support.len() {
        for b in 0..support.len() {
            let (label, other) = (support.labels()[a], support.labels()[b]);
            if label == other || gram[[a, b]] < NEAR_DUPLICATE {
                continue;
            }
            // Of the two the one is named that the rest speaks against more; both, where nothing tells.
            let against = |example: usize| margins[example].unwrap_or(0.0);
            if against(a) < against(b) {
                continue;
            }
            doubts.push(Doubt {
                item: items[a],
                tray: trays[label],
                rather: trays[other],
                weight: 1.0,
                why: Why::Duplicate { other: items[b] },
            });
        }
    }
    for &(item, rather) in earlier {
        if let Some(example) = items.iter().position(|&own| own == item) {
            let tray = trays[support.labels()[example]];
            if tray != rather {
                doubts.push(Doubt { item, tray, rather, weight: margins[example].unwrap_or(0.0), why: Why::Changed });
            }
        }
    }
    doubts.sort_by(|a, b| b.weight.total_cmp(&a.weight).then(a.item.cmp(&b.item)));
    let mut seen = std::collections::HashSet::new();
    doubts.retain(|doubt| seen.insert(doubt.item));
    doubts
}
