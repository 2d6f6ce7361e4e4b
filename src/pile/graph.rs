//! The graph that joins each item of a pile with those most like it.
//!
//! Items are joined with their [`NEIGHBOURS`] nearest by the cosine c seen from the pile's centre, in either direction,
//! with weight c³; then every weight is divided by the roots of the two items' sums of weights, which gives the
//! symmetric matrix S whose eigenvalues lie in −1 … 1 (Zhou et al. 2004, "Learning with local and global consistency").

use crate::arithmetic::dot64;

/// How many of its nearest an item is joined with.
pub const NEIGHBOURS: usize = 10;

/// How far a label spreads: the share of an item's say that it has from its neighbours.
pub const SPREAD: f64 = 0.9;

/// A solve stops when the residual is this much smaller than what it was asked for.
const TOLERANCE: f64 = 1e-7;

/// Solves with a spread of 0.9 are done to [`TOLERANCE`] in fewer steps than this, by the bound for conjugate gradients.
const MOST_STEPS: usize = 60;

fn weight(cosine: f32) -> f64 {
    let cosine = f64::from(cosine);
    cosine * cosine * cosine
}

/// A symmetric, sparse, normalised matrix S over item numbers; items without a neighbour have an empty row.
#[derive(Debug, Clone, Default)]
pub struct Graph {
    starts: Vec<usize>,
    ends: Vec<u32>,
    weights: Vec<f64>,
    /// Of each item's own nearest, the most alike first, with cosines that are positive.
    nearest: Vec<Vec<(u32, f32)>>,
}

impl Graph {
    /// Of each item's nearest others with their cosines; those that aren't positive don't count. Cost O(n k log k).
    pub fn new(mut nearest: Vec<Vec<(u32, f32)>>) -> Self {
        let n = nearest.len();
        for (item, list) in nearest.iter_mut().enumerate() {
            list.retain(|&(other, cosine)| cosine > 0.0 && other as usize != item);
        }
        let mut rows: Vec<Vec<(u32, f64)>> = vec![Vec::new(); n];
        for (item, list) in nearest.iter().enumerate() {
            for &(other, cosine) in list {
                let weight = weight(cosine);
                rows[item].push((other, weight));
                rows[other as usize].push((item as u32, weight));
            }
        }
        for row in &mut rows {
            row.sort_unstable_by_key(|&(other, _)| other);
            row.dedup_by_key(|&mut (other, _)| other);
        }
        let inverse_root: Vec<f64> = rows
            .iter()
            .map(|row| row.iter().map(|&(_, weight)| weight).sum::<f64>())
            .map(|sum| if sum > 0.0 { 1.0 / sum.sqrt() } else { 0.0 })
            .collect();
        let mut graph = Self { starts: vec![0], ..Self::default() };
        for (item, row) in rows.iter().enumerate() {
            for &(other, weight) in row {
                graph.ends.push(other);
                graph.weights.push(inverse_root[item] * weight * inverse_root[other as usize]);
            }
            graph.starts.push(graph.ends.len());
        }
        graph.nearest = nearest;
        graph
    }

    /// An item's own nearest, the most alike first, with the third powers of their cosines; others may be joined with it
    /// because it is among theirs.
    pub fn nearest(&self, item: usize) -> impl Iterator<Item = (usize, f64)> + '_ {
        self.nearest[item].iter().map(|&(other, cosine)| (other as usize, weight(cosine)))
    }

    /// How many item numbers it spans.
    pub fn len(&self) -> usize {
        self.starts.len().saturating_sub(1)
    }

    /// Whether it spans nothing.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// The items joined with this one, with the entries of S.
    pub fn neighbours(&self, item: usize) -> impl Iterator<Item = (usize, f64)> + '_ {
        let range = self.starts[item]..self.starts[item + 1];
        self.ends[range.clone()].iter().map(|&end| end as usize).zip(self.weights[range].iter().copied())
    }

    /// Walks of up to two steps from an item to itself: Σ over t ≤ 2 of (0.9 S)^t. Cost O(k).
    pub fn returning(&self, item: usize) -> f64 {
        1.0 + SPREAD * SPREAD * self.neighbours(item).map(|(_, weight)| weight * weight).sum::<f64>()
    }

    /// Solves (I − 0.9 S) x = b for a sparse b, by conjugate gradients. Cost O(steps · n k).
    pub fn solve(&self, ones: &[usize]) -> Vec<f64> {
        let n = self.len();
        let mut x = vec![0.0; n];
        let mut residual = vec![0.0; n];
        for &item in ones {
            residual[item] = 1.0;
        }
        let mut direction = residual.clone();
        let mut image = vec![0.0; n];
        let mut square = dot64(&residual, &residual);
        let enough = square * TOLERANCE * TOLERANCE;
        for _ in 0..MOST_STEPS {
            if square <= enough {
                break;
            }
            self.apply(&direction, &mut image);
            let step = square / dot64(&direction, &image);
            for i in 0..n {
                x[i] += step * direction[i];
                residual[i] -= step * image[i];
            }
            let next = dot64(&residual, &residual);
            let keep = next / square;
            square = next;
            for i in 0..n {
                direction[i] = residual[i] + keep * direction[i];
            }
        }
        x
    }

    /// (I − 0.9 S) x.
    fn apply(&self, x: &[f64], image: &mut [f64]) {
        for item in 0..self.len() {
            let sum: f64 = self.neighbours(item).map(|(other, weight)| weight * x[other]).sum();
            image[item] = x[item] - SPREAD * sum;
        }
    }
}
