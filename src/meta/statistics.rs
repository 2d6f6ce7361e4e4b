//! What meta-training needs from past piles, in sums that can be added up in any order.
//!
//! A category adds its mean and the scatter of its items around it; nothing of a single item is kept. Sums of disjoint
//! categories merge by addition, so that shares of the past piles can be gathered apart and give the same starter, but
//! for rounding. Cost O(d²) an item, memory O(d²).

use ndarray::{Array1, Array2};
use serde::{Deserialize, Serialize};

use crate::{
    archive::{self, Archive},
    error::{Error, Result},
    npy,
    space::Space,
};

const VERSION: u32 = 1;

/// The largest part of a file of sums: d (d + 1)/2 float64 for the most dimensions, and the header.
const PART_LIMIT: u64 = 4096 * 4097 / 2 * 8 + 4096;

/// Sums over the categories of past piles.
#[derive(Debug, Clone)]
pub struct Statistics {
    encoder: String,
    space: Space,
    categories: usize,
    items: usize,
    /// Items beyond the first of each category: what the scatter is estimated from.
    freedom: usize,
    mean_sum: Array1<f64>,
    /// Lower triangle of Σ (x − mean_c)(x − mean_c)ᵀ.
    scatter: Array2<f64>,
}

impl Statistics {
    /// No categories yet, for embeddings of this encoder in this space.
    pub fn new(encoder: impl Into<String>, space: Space) -> Self {
        let d = space.dimension();
        Self {
            encoder: encoder.into(),
            space,
            categories: 0,
            items: 0,
            freedom: 0,
            mean_sum: Array1::zeros(d),
            scatter: Array2::zeros((d, d)),
        }
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

    /// Adds one category by the embeddings of its items. A bad embedding is refused and nothing is added.
    pub fn add_category<'a>(&mut self, embeddings: impl IntoIterator<Item = &'a [f32]>) -> Result<()> {
        let places = embeddings.into_iter().map(|e| self.space.place(e)).collect::<Result<Vec<_>>>()?;
        if places.is_empty() {
            return Err(Error::NoExample(self.categories));
        }
        let d = self.space.dimension();
        let mut mean = vec![0.0_f64; d];
        for place in &places {
            mean.iter_mut().zip(place).for_each(|(m, &x)| *m += f64::from(x) / places.len() as f64);
        }
        let mut centred = vec![0.0_f64; d];
        let scatter = self.scatter.as_slice_mut().expect("standard layout by construction");
        for place in &places {
            centred.iter_mut().zip(place).zip(&mean).for_each(|((out, &x), &m)| *out = f64::from(x) - m);
            for (j, row) in scatter.chunks_exact_mut(d).enumerate() {
                let factor = centred[j];
                row[..=j].iter_mut().zip(&centred).for_each(|(sum, &x)| *sum += factor * x);
            }
        }
        self.mean_sum.iter_mut().zip(&mean).for_each(|(sum, &m)| *sum += m);
        self.categories += 1;
        self.items += places.len();
        self.freedom += places.len() - 1;
        Ok(())
    }

    /// Adds the sums of other categories. Refuses those of another encoder or space.
    pub fn merge(&mut self, other: &Self) -> Result<()> {
        if self.encoder != other.encoder || self.space != other.space {
            return Err(Error::OtherEncoder { expected: self.encoder.clone(), found: other.encoder.clone() });
        }
        self.categories += other.categories;
        self.items += other.items;
        self.freedom += other.freedom;
        self.mean_sum += &other.mean_sum;
        self.scatter += &other.scatter;
        Ok(())
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

/// What `statistics.json` in a file of sums says.
#[derive(Serialize, Deserialize)]
struct About {
    version: u32,
    encoder: String,
    space: Space,
    categories: usize,
    items: usize,
    freedom: usize,
}

impl Statistics {
    /// The sums as a file: a ZIP archive of `statistics.json`, `mean_sum.npy` (d, float64) and `scatter.npy` (the lower
    /// triangle by rows, float64). It tells more than a starter does and is meant for merging, not for sharing.
    pub fn write(&self) -> Vec<u8> {
        let about = About {
            version: VERSION,
            encoder: self.encoder.clone(),
            space: self.space,
            categories: self.categories,
            items: self.items,
            freedom: self.freedom,
        };
        let d = self.space.dimension();
        let triangle: Vec<f64> =
            (0..d).flat_map(|i| (0..=i).map(move |j| (i, j))).map(|place| self.scatter[place]).collect();
        archive::write(&[
            ("statistics.json", serde_json::to_vec_pretty(&about).expect("plain data")),
            ("mean_sum.npy", npy::write_f64(&[d], &self.mean_sum.to_vec())),
            ("scatter.npy", npy::write_f64(&[triangle.len()], &triangle)),
        ])
    }

    /// Reads a file of sums. Every part is bounded and checked.
    pub fn read(file: &[u8]) -> Result<Self> {
        let unreadable = |reason: String| Error::StatisticsUnreadable(reason);
        let mut archive = Archive::open(file).map_err(unreadable)?;
        let mut part = |name: &str| archive.part(name, PART_LIMIT).map_err(unreadable);
        let about: About = serde_json::from_slice(&part("statistics.json")?)
            .map_err(|error| unreadable(format!("statistics.json can't be read ({error})")))?;
        if about.version > VERSION {
            return Err(unreadable(format!("it has version {} and this program reads up to {VERSION}", about.version)));
        }
        let space = Space::new(about.space.dimension(), about.space.non_negative())?;
        let d = space.dimension();
        let mut numbers = |name: &str, count: usize| -> Result<Vec<f64>> {
            match npy::read_f64(&part(name)?) {
                Some((shape, numbers)) if shape == [count] && numbers.iter().all(|x| x.is_finite()) => Ok(numbers),
                _ => Err(unreadable(format!("{name} has another form than it should"))),
            }
        };
        let mean_sum = numbers("mean_sum.npy", d)?;
        let triangle = numbers("scatter.npy", d * (d + 1) / 2)?;
        let About { encoder, categories, items, freedom, .. } = about;
        if items < categories || items - categories != freedom {
            return Err(unreadable("its counts contradict each other".into()));
        }
        let mut scatter = Array2::zeros((d, d));
        for (i, mut row) in scatter.outer_iter_mut().enumerate() {
            let start = i * (i + 1) / 2;
            row.iter_mut().zip(&triangle[start..=start + i]).for_each(|(cell, &x)| *cell = x);
        }
        Ok(Self { encoder, space, categories, items, freedom, mean_sum: mean_sum.into(), scatter })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn rows(seed: usize, n: usize) -> Vec<Vec<f32>> {
        (0..n).map(|i| (0..3).map(|j| ((seed * 31 + i * 17 + j * 7) % 23) as f32 - 11.0).collect()).collect()
    }

    fn gathered(categories: &[Vec<Vec<f32>>]) -> Statistics {
        let mut statistics = Statistics::new("e", Space::new(3, false).unwrap());
        for category in categories {
            statistics.add_category(category.iter().map(Vec::as_slice)).unwrap();
        }
        statistics
    }

    #[test]
    fn shares_merge_to_the_whole_in_any_order() {
        let categories: Vec<_> = (0..7).map(|c| rows(c, 2 + c % 3)).collect();
        let whole = gathered(&categories);
        let parts = [gathered(&categories[..2]), gathered(&categories[2..3]), gathered(&categories[3..])];
        for order in [[0, 1, 2], [2, 0, 1], [1, 2, 0]] {
            let mut merged = parts[order[0]].clone();
            let mut rest = parts[order[1]].clone();
            rest.merge(&parts[order[2]]).unwrap();
            merged.merge(&rest).unwrap();
            assert_eq!((merged.categories(), merged.items(), merged.freedom()), (7, whole.items(), whole.freedom()));
            assert!((&merged.mean() - &whole.mean()).iter().all(|x| x.abs() < 1e-12));
            assert!((&merged.covariance() - &whole.covariance()).iter().all(|x| x.abs() < 1e-12));
        }
    }

    #[test]
    fn the_covariance_is_the_textbook_one() {
        let categories = [rows(1, 5), rows(2, 4)];
        let statistics = gathered(&categories);
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
        assert!((&statistics.covariance() - &expected).iter().all(|x| x.abs() < 1e-12));
    }

    #[test]
    fn what_does_not_belong_is_refused_whole() {
        let mut statistics = gathered(&[rows(1, 3)]);
        let before = statistics.mean();
        assert!(statistics.add_category([[1.0_f32, 2.0, 3.0].as_slice(), &[f32::NAN, 0.0, 0.0]]).is_err());
        assert!(statistics.add_category([]).is_err());
        let other = Statistics::new("another", statistics.space());
        assert_eq!(statistics.merge(&other).unwrap_err().code(), "other-encoder");
        assert_eq!((statistics.categories(), statistics.items()), (1, 3));
        assert_eq!(statistics.mean(), before);
    }

    #[test]
    fn a_file_brings_back_the_same_sums() {
        let statistics = gathered(&[rows(1, 3), rows(2, 4)]);
        let file = statistics.write();
        let back = Statistics::read(&file).unwrap();
        assert_eq!(back.write(), file);
        assert_eq!(back.covariance(), statistics.covariance());
        for cut in (0..file.len()).step_by(5) {
            assert_eq!(Statistics::read(&file[..cut]).unwrap_err().code(), "statistics-unreadable");
        }
    }
}
