//! What meta-training needs from past piles, in a form that can be merged in any order.
//!
//! Two things are gathered. Sums: a category adds its mean and the scatter of its items around it. They are kept in two
//! halves, every other category of a pile in each, so that what is learned from one half can be tried on the other. And a
//! sample: up to [`SAMPLED_ITEMS`] items of some categories, from which small tasks are drawn. Which piles and categories
//! are in the sample follows from the smallest hashes of their content, so that shares of the past piles can be gathered
//! apart and give the same starter, but for rounding, as all of them at once. Cost O(d²) an item, memory O(d²).

use ndarray::{Array1, Array2};
use serde::{Deserialize, Serialize};

use crate::{
    archive::{self, Archive},
    error::{Error, Result},
    npy,
    space::Space,
};

const VERSION: u32 = 2;

/// The largest part of a file of sums: d (d + 1)/2 float64 for the most dimensions, and the header.
const PART_LIMIT: u64 = 4096 * 4097 / 2 * 8 + 4096;

/// The most items of one category in the sample.
pub const SAMPLED_ITEMS: usize = 12;

/// The most categories of one pile in the sample.
pub const SAMPLED_PILE: usize = 128;

/// The most categories in the sample.
pub const SAMPLED_CATEGORIES: usize = 384;

/// Sums over some categories.
#[derive(Debug, Clone)]
pub struct Sums {
    categories: usize,
    items: usize,
    /// Items beyond the first of each category: what the scatter is estimated from.
    freedom: usize,
    mean_sum: Array1<f64>,
    /// Lower triangle of Σ (x − mean_c)(x − mean_c)ᵀ.
    scatter: Array2<f64>,
}

impl Sums {
    fn new(d: usize) -> Self {
        Self { categories: 0, items: 0, freedom: 0, mean_sum: Array1::zeros(d), scatter: Array2::zeros((d, d)) }
    }

    fn add(&mut self, places: &[Vec<f32>]) {
        let d = self.mean_sum.len();
        let mut mean = vec![0.0_f64; d];
        for place in places {
            mean.iter_mut().zip(place).for_each(|(m, &x)| *m += f64::from(x) / places.len() as f64);
        }
        let centred: Vec<Vec<f64>> =
            places.iter().map(|place| place.iter().zip(&mean).map(|(&x, &m)| f64::from(x) - m).collect()).collect();
        let scatter = self.scatter.as_slice_mut().expect("standard layout by construction");
        // Row by row, so that the matrix passes through the cache once a category and not once an item.
        for (j, row) in scatter.chunks_exact_mut(d).enumerate() {
            for centred in &centred {
                let factor = centred[j];
                row[..=j].iter_mut().zip(centred).for_each(|(sum, &x)| *sum += factor * x);
            }
        }
        self.mean_sum.iter_mut().zip(&mean).for_each(|(sum, &m)| *sum += m);
        self.categories += 1;
        self.items += places.len();
        self.freedom += places.len() - 1;
    }

    fn merge(&mut self, other: &Self) {
        self.categories += other.categories;
        self.items += other.items;
        self.freedom += other.freedom;
        self.mean_sum += &other.mean_sum;
        self.scatter += &other.scatter;
    }

    /// How many categories were added.
    pub fn categories(&self) -> usize {
        self.categories
    }

    /// How many items they had.
    pub fn items(&self) -> usize {
        self.items
    }

    /// How many items tell of the scatter within categories: all but one of each category.
    pub fn freedom(&self) -> usize {
        self.freedom
    }

    /// The mean over category means, d numbers; zeros without a category.
    pub fn mean(&self) -> Array1<f64> {
        &self.mean_sum / self.categories.max(1) as f64
    }

    /// The pooled covariance within categories, d × d; zeros without a second item in any category.
    pub fn covariance(&self) -> Array2<f64> {
        let mut covariance = &self.scatter / self.freedom.max(1) as f64;
        for i in 0..covariance.nrows() {
            for j in 0..i {
                covariance[[j, i]] = covariance[[i, j]];
            }
        }
        covariance
    }
}

/// A category in the sample.
#[derive(Debug, Clone, PartialEq)]
pub struct Sampled {
    pile: u64,
    category: u64,
    half: usize,
    places: Vec<Vec<f32>>,
}

impl Sampled {
    /// Which pile it belongs to: the same number for categories of the same pile.
    pub fn pile(&self) -> u64 {
        self.pile
    }

    /// In which half its sums are, 0 or 1.
    pub fn half(&self) -> usize {
        self.half
    }

    /// The places of 2 to [`SAMPLED_ITEMS`] of its items.
    pub fn places(&self) -> &[Vec<f32>] {
        &self.places
    }
}

/// What was gathered from past piles.
#[derive(Debug, Clone)]
pub struct Statistics {
    encoder: String,
    space: Space,
    halves: [Sums; 2],
    /// In order of pile and category.
    sample: Vec<Sampled>,
}

impl Statistics {
    /// Nothing yet, for embeddings of this encoder in this space.
    pub fn new(encoder: impl Into<String>, space: Space) -> Self {
        let d = space.dimension();
        Self { encoder: encoder.into(), space, halves: [Sums::new(d), Sums::new(d)], sample: Vec::new() }
    }

    /// Which encoder the embeddings are of.
    pub fn encoder(&self) -> &str {
        &self.encoder
    }

    /// The space of the embeddings.
    pub fn space(&self) -> Space {
        self.space
    }

    /// How many categories were added.
    pub fn categories(&self) -> usize {
        self.halves.iter().map(Sums::categories).sum()
    }

    /// How many items they had.
    pub fn items(&self) -> usize {
        self.halves.iter().map(Sums::items).sum()
    }

    /// How many items tell of the scatter within categories: all but one of each category.
    pub fn freedom(&self) -> usize {
        self.halves.iter().map(Sums::freedom).sum()
    }

    /// The sums over every other category of each pile, and over the others.
    pub fn halves(&self) -> &[Sums; 2] {
        &self.halves
    }

    /// The sums over all categories.
    pub fn whole(&self) -> Sums {
        let mut whole = self.halves[0].clone();
        whole.merge(&self.halves[1]);
        whole
    }

    /// The categories from which small tasks are drawn.
    pub fn sample(&self) -> &[Sampled] {
        &self.sample
    }

    /// Adds one pile: the embeddings of its items by category. A bad embedding, or a category without an item, is refused
    /// and nothing is added. Cost O(d²) an item.
    pub fn add_pile<'a, Items>(&mut self, categories: impl IntoIterator<Item = Items>) -> Result<()>
    where
        Items: IntoIterator<Item = &'a [f32]>,
    {
        self.add_pile_watched(categories, |_| true)
    }

    /// The same, telling `watch` after every category how many are done; where it answers false, the work stops with
    /// [`Error::Stopped`] and nothing is added.
    pub fn add_pile_watched<'a, Items>(
        &mut self,
        categories: impl IntoIterator<Item = Items>,
        mut watch: impl FnMut(usize) -> bool,
    ) -> Result<()>
    where
        Items: IntoIterator<Item = &'a [f32]>,
    {
        let mut placed: Vec<(u64, Vec<Vec<f32>>)> = Vec::new();
        for (number, items) in categories.into_iter().enumerate() {
            let places = items.into_iter().map(|e| self.space.place(e)).collect::<Result<Vec<_>>>()?;
            if places.is_empty() {
                return Err(Error::NoExample(number));
            }
            placed.push((fingerprint(places.iter().flatten()), places));
        }
        // By content, so that neither names nor the order in which categories come matter.
        placed.sort_by(|a, b| a.0.cmp(&b.0).then_with(|| total_order(&a.1, &b.1)));
        let pile = mixed(placed.iter().fold(0, |sum: u64, (category, _)| sum.wrapping_add(*category)));
        let mut added = Self::new(self.encoder.clone(), self.space);
        for (number, (category, places)) in placed.into_iter().enumerate() {
            let half = number % 2;
            added.halves[half].add(&places);
            if places.len() >= 2 && added.sample.len() < SAMPLED_PILE {
                let places = places.into_iter().take(SAMPLED_ITEMS).collect();
                added.sample.push(Sampled { pile, category, half, places });
            }
            if !watch(number + 1) {
                return Err(Error::Stopped);
            }
        }
        self.merge(&added)
    }

    /// Adds what was gathered from other piles. Refuses another encoder or space.
    pub fn merge(&mut self, other: &Self) -> Result<()> {
        if self.encoder != other.encoder || self.space != other.space {
            return Err(Error::OtherEncoder { expected: self.encoder.clone(), found: other.encoder.clone() });
        }
        self.halves.iter_mut().zip(&other.halves).for_each(|(half, other)| half.merge(other));
        self.sample.extend(other.sample.iter().cloned());
        self.sample.sort_by(|a, b| {
            (a.pile, a.category).cmp(&(b.pile, b.category)).then_with(|| total_order(&a.places, &b.places))
        });
        // Whole piles, as many as fit: a pile that doesn't fit beside those before it will not when more come.
        let mut kept = 0;
        for pile in self.sample.chunk_by(|a, b| a.pile == b.pile) {
            if kept + pile.len() > SAMPLED_CATEGORIES {
                break;
            }
            kept += pile.len();
        }
        self.sample.truncate(kept);
        Ok(())
    }
}

fn total_order(a: &[Vec<f32>], b: &[Vec<f32>]) -> std::cmp::Ordering {
    let (a, b) = (a.iter().flatten(), b.iter().flatten());
    a.zip(b).map(|(x, y)| x.total_cmp(y)).find(|order| order.is_ne()).unwrap_or(std::cmp::Ordering::Equal)
}

/// FNV-1a of the numbers' bits, mixed.
fn fingerprint<'a>(numbers: impl Iterator<Item = &'a f32>) -> u64 {
    let bytes = numbers.flat_map(|x| x.to_bits().to_le_bytes());
    mixed(bytes.fold(0xcbf2_9ce4_8422_2325, |hash, byte| (hash ^ u64::from(byte)).wrapping_mul(0x0100_0000_01b3)))
}

/// Spreads a hash over all bits (the finaliser of MurmurHash3, Appleby, public domain).
fn mixed(mut hash: u64) -> u64 {
    for factor in [0xff51_afd7_ed55_8ccd, 0xc4ce_b9fe_1a85_ec53] {
        hash = (hash ^ (hash >> 33)).wrapping_mul(factor);
    }
    hash ^ (hash >> 33)
}

/// What `statistics.json` in the file says.
#[derive(Serialize, Deserialize)]
struct About {
    version: u32,
    encoder: String,
    space: Space,
    halves: [Counts; 2],
    sample: Vec<AboutSampled>,
}

#[derive(Serialize, Deserialize)]
struct Counts {
    categories: usize,
    items: usize,
    freedom: usize,
}

#[derive(Serialize, Deserialize)]
struct AboutSampled {
    /// Hexadecimal: JSON numbers have 53 bits in many readers.
    pile: String,
    category: String,
    half: usize,
    items: usize,
}

impl Statistics {
    /// What was gathered as a file: a ZIP archive of `statistics.json`, for each half `mean_sum_N.npy` (d, float64) and
    /// `scatter_N.npy` (the lower triangle by rows, float64), and `sample.npy` (items × d, float32).
    ///
    /// It holds items of past piles, if no names, and is meant for merging, not for sharing.
    pub fn write(&self) -> Vec<u8> {
        let about = About {
            version: VERSION,
            encoder: self.encoder.clone(),
            space: self.space,
            halves: self.halves.each_ref().map(|half| Counts {
                categories: half.categories,
                items: half.items,
                freedom: half.freedom,
            }),
            sample: self
                .sample
                .iter()
                .map(|one| AboutSampled {
                    pile: format!("{:016x}", one.pile),
                    category: format!("{:016x}", one.category),
                    half: one.half,
                    items: one.places.len(),
                })
                .collect(),
        };
        let d = self.space.dimension();
        let triangle = |half: &Sums| -> Vec<u8> {
            let numbers: Vec<f64> =
                (0..d).flat_map(|i| (0..=i).map(move |j| (i, j))).map(|place| half.scatter[place]).collect();
            npy::write_f64(&[numbers.len()], &numbers)
        };
        let sample: Vec<f32> = self.sample.iter().flat_map(|one| one.places.iter().flatten().copied()).collect();
        let [first, second] = &self.halves;
        archive::write(&[
            ("statistics.json", serde_json::to_vec_pretty(&about).expect("plain data")),
            ("mean_sum_0.npy", npy::write_f64(&[d], &first.mean_sum.to_vec())),
            ("scatter_0.npy", triangle(first)),
            ("mean_sum_1.npy", npy::write_f64(&[d], &second.mean_sum.to_vec())),
            ("scatter_1.npy", triangle(second)),
            ("sample.npy", npy::write_f32(&[sample.len() / d, d], &sample)),
        ])
    }

    /// Reads such a file. Every part is bounded and checked.
    pub fn read(file: &[u8]) -> Result<Self> {
        let unreadable = |reason: String| Error::StatisticsUnreadable(reason);
        let mut archive = Archive::open(file).map_err(unreadable)?;
        let mut part = |name: &str| archive.part(name, PART_LIMIT).map_err(unreadable);
        let json = part("statistics.json")?;
        let damaged = |error: serde_json::Error| unreadable(format!("statistics.json can't be read ({error})"));
        #[derive(Deserialize)]
        struct Version {
            version: u32,
        }
        let Version { version } = serde_json::from_slice(&json).map_err(damaged)?;
        if version != VERSION {
            return Err(unreadable(format!(
                "it has version {version} and this program reads {VERSION}; gather the piles again"
            )));
        }
        let about: About = serde_json::from_slice(&json).map_err(damaged)?;
        let space = Space::new(about.space.dimension(), about.space.non_negative())?;
        let d = space.dimension();
        let form = |name: &str| unreadable(format!("{name} has another form than it should"));
        let mut halves = [Sums::new(d), Sums::new(d)];
        for (number, (half, counts)) in halves.iter_mut().zip(&about.halves).enumerate() {
            let mut numbers = |name: &str, count: usize| -> Result<Vec<f64>> {
                match npy::read_f64(&part(name)?) {
                    Some((shape, numbers)) if shape == [count] && numbers.iter().all(|x| x.is_finite()) => Ok(numbers),
                    _ => Err(form(name)),
                }
            };
            if counts.items < counts.categories || counts.items - counts.categories != counts.freedom {
                return Err(unreadable("its counts contradict each other".into()));
            }
            half.categories = counts.categories;
            half.items = counts.items;
            half.freedom = counts.freedom;
            half.mean_sum = numbers(&format!("mean_sum_{number}.npy"), d)?.into();
            let triangle = numbers(&format!("scatter_{number}.npy"), d * (d + 1) / 2)?;
            for (i, mut row) in half.scatter.outer_iter_mut().enumerate() {
                let start = i * (i + 1) / 2;
                row.iter_mut().zip(&triangle[start..=start + i]).for_each(|(cell, &x)| *cell = x);
            }
        }
        let (shape, numbers) = npy::read_f32(&part("sample.npy")?).ok_or_else(|| form("sample.npy"))?;
        // Places have unit length.
        if shape.len() != 2 || shape[1] != d || !numbers.iter().all(|x| x.abs() <= 1.001) {
            return Err(form("sample.npy"));
        }
        let mut rows = numbers.chunks_exact(d).map(<[f32]>::to_vec);
        let mut sample = Vec::new();
        for one in about.sample {
            let number = |text: &str| u64::from_str_radix(text, 16).map_err(|_| form("statistics.json"));
            let places: Vec<Vec<f32>> = rows.by_ref().take(one.items.min(SAMPLED_ITEMS)).collect();
            if one.half > 1 || places.len() != one.items || places.len() < 2 {
                return Err(form("sample.npy"));
            }
            sample.push(Sampled { pile: number(&one.pile)?, category: number(&one.category)?, half: one.half, places });
        }
        if sample.len() > SAMPLED_CATEGORIES || rows.next().is_some() {
            return Err(form("sample.npy"));
        }
        Ok(Self { encoder: about.encoder, space, halves, sample })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn rows(seed: usize, n: usize) -> Vec<Vec<f32>> {
        (0..n).map(|i| (0..3).map(|j| ((seed * 31 + i * 17 + j * 7) % 23) as f32 - 11.0).collect()).collect()
    }

    fn gathered(piles: &[Vec<Vec<Vec<f32>>>]) -> Statistics {
        let mut statistics = Statistics::new("e", Space::new(3, false).unwrap());
        for pile in piles {
            statistics.add_pile(pile.iter().map(|category| category.iter().map(Vec::as_slice))).unwrap();
        }
        statistics
    }

    /// Piles of 1 to 90 categories with 1 to 14 items each: more than the sample holds.
    fn piles() -> Vec<Vec<Vec<Vec<f32>>>> {
        (0..9).map(|p| (0..p * p + 1 + 10 * p).map(|c| rows(100 * p + c, 1 + (p + c) % 14)).collect()).collect()
    }

    #[test]
    fn shares_merge_to_the_whole_in_any_order() {
        let piles = piles();
        let whole = gathered(&piles);
        let parts = [gathered(&piles[..2]), gathered(&piles[2..7]), gathered(&piles[7..])];
        for order in [[0, 1, 2], [2, 0, 1], [1, 2, 0]] {
            let mut merged = parts[order[0]].clone();
            let mut rest = parts[order[1]].clone();
            rest.merge(&parts[order[2]]).unwrap();
            merged.merge(&rest).unwrap();
            assert_eq!(
                (merged.categories(), merged.items(), merged.freedom()),
                (whole.categories(), whole.items(), whole.freedom())
            );
            assert_eq!(merged.sample(), whole.sample());
            for (merged, whole) in merged.halves().iter().zip(whole.halves()) {
                assert!((&merged.mean() - &whole.mean()).iter().all(|x| x.abs() < 1e-12));
                assert!((&merged.covariance() - &whole.covariance()).iter().all(|x| x.abs() < 1e-12));
            }
        }
        assert!(whole.sample().len() <= SAMPLED_CATEGORIES && whole.sample().len() > SAMPLED_CATEGORIES / 2);
    }

    #[test]
    fn the_order_of_categories_does_not_matter() {
        let mut pile: Vec<_> = (0..20).map(|c| rows(c, 2 + c % 3)).collect();
        let straight = gathered(std::slice::from_ref(&pile));
        pile.reverse();
        let turned = gathered(std::slice::from_ref(&pile));
        assert_eq!(straight.sample(), turned.sample());
        assert_eq!(straight.write(), turned.write());
        let halves = straight.halves().each_ref().map(Sums::categories);
        assert_eq!(halves, [10, 10]);
    }

    #[test]
    fn the_covariance_is_the_textbook_one() {
        let categories = [rows(1, 5), rows(2, 4)];
        let statistics = gathered(&[categories.to_vec()]);
        let space = statistics.space();
        let mut expected = Array2::<f64>::zeros((3, 3));
        for category in &categories {
            let placed: Vec<Vec<f32>> = category.iter().map(|row| space.place(row).unwrap()).collect();
            for a in 0..3 {
                for b in 0..3 {
                    let mean = |j: usize| placed.iter().map(|row| f64::from(row[j])).sum::<f64>() / placed.len() as f64;
                    let product = |row: &Vec<f32>| (f64::from(row[a]) - mean(a)) * (f64::from(row[b]) - mean(b));
                    expected[[a, b]] += placed.iter().map(product).sum::<f64>() / 7.0;
                }
            }
        }
        assert!((&statistics.whole().covariance() - &expected).iter().all(|x| x.abs() < 1e-12));
    }

    #[test]
    fn what_does_not_belong_is_refused_whole() {
        let mut statistics = gathered(&[vec![rows(1, 3)]]);
        let before = statistics.write();
        let good = rows(5, 2);
        let bad = [vec![1.0_f32, 2.0, 3.0], vec![f32::NAN, 0.0, 0.0]];
        let slices = |rows: &[Vec<f32>]| rows.to_vec();
        let pile = [slices(&good), slices(&bad)];
        assert!(statistics.add_pile(pile.iter().map(|c| c.iter().map(Vec::as_slice))).is_err());
        assert_eq!(statistics.add_pile([Vec::<&[f32]>::new()]).unwrap_err().code(), "no-example");
        let stopped = statistics.add_pile_watched([good.iter().map(Vec::as_slice)], |_| false);
        assert_eq!(stopped.unwrap_err().code(), "stopped");
        let other = Statistics::new("another", statistics.space());
        assert_eq!(statistics.merge(&other).unwrap_err().code(), "other-encoder");
        assert_eq!(statistics.write(), before);
    }

    #[test]
    fn a_file_brings_back_the_same() {
        let statistics = gathered(&[vec![rows(1, 3), rows(2, 4), rows(3, 1)], vec![rows(4, 14), rows(5, 2)]]);
        let file = statistics.write();
        let back = Statistics::read(&file).unwrap();
        assert_eq!(back.write(), file);
        assert_eq!(back.sample(), statistics.sample());
        assert_eq!(back.whole().covariance(), statistics.whole().covariance());
        for cut in (0..file.len()).step_by(5) {
            assert_eq!(Statistics::read(&file[..cut]).unwrap_err().code(), "statistics-unreadable");
        }
    }
}
