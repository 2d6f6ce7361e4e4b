//! The starter: what past piles taught, as one portable file.
//!
//! A ZIP archive of `starter.json` (format version, encoder, space, how many categories and items it was learned from, and
//! the lessons about learning: temperatures, strengths, shares and step sizes) and NPY arrays: `mean.npy` (d, float32: the mean of the category means), `directions.npy` (r × d, int8: each row a
//! direction times 127 over its largest entry) and `damping.npy` (r, float32: 1 takes a direction out,
//! 0 leaves it, down to −3 raises it). It holds no example and no category
//! name. What it can still reveal: what the past material looked like on the whole, and in which ways items of one
//! category differed; from few categories that may describe a single one, so [`Starter::write`] refuses below a limit.

use ndarray::{Array2, Axis};
use serde::{Deserialize, Serialize};

use crate::{
    archive::{self, Archive},
    error::{Error, Result},
    meta::{
        statistics::{Statistics, Sums},
        train::{HalfSpace, LEAST_CATEGORIES as LEAST_TO_LEARN, Lessons, Trained, stretched, train},
    },
    npy,
    prior::Prior,
    space::Space,
    whitening::{LEAST_DAMPING, MOST_DIRECTIONS, Whitening},
};

const VERSION: u32 = 2;

/// Below this many categories a starter is not shared unless asked otherwise.
pub const LEAST_CATEGORIES: usize = 8;

/// The largest part of a starter file that is read.
const PART_LIMIT: u64 = 8 << 20;

/// What past piles taught about a space.
#[derive(Debug, Clone, PartialEq)]
pub struct Starter {
    about: About,
    mean: Vec<f32>,
    whitening: Whitening,
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
struct About {
    version: u32,
    encoder: String,
    space: Space,
    categories: usize,
    items: usize,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    lessons: Option<Lessons>,
}

impl Starter {
    /// Learns from past piles. Cost O(d³).
    ///
    /// Refuses fewer than two categories, and categories with a single item each only. From fewer than
    /// [`train::LEAST_CATEGORIES`](crate::meta::train::LEAST_CATEGORIES) with two items only the space is learned
    /// ([`Starter::lessons`]).
    pub fn learn(statistics: &Statistics) -> Result<Self> {
        Self::learn_watched(statistics, &mut |_| true)
    }

    /// The same, telling `watch` the share of the work done, 0 to 1; where it answers false, the work stops with
    /// [`Error::Stopped`].
    pub fn learn_watched(statistics: &Statistics, watch: &mut dyn FnMut(f64) -> bool) -> Result<Self> {
        let (categories, items) = (statistics.categories(), statistics.items());
        if categories < 2 || statistics.freedom() == 0 {
            return Err(Error::TooLittleToLearn { categories, items });
        }
        let mut go_on = |share: f64| if watch(share) { Ok(()) } else { Err(Error::Stopped) };
        let whole = statistics.whole();
        let halves = statistics.halves();
        // Fewer can't give a lesson, and then their halves needn't be whitened.
        let teaches = statistics.sample().len() >= LEAST_TO_LEARN;
        let mut whitenings =
            learned(if teaches { vec![&whole, &halves[0], &halves[1]] } else { vec![&whole] }).into_iter();
        let mut next = || whitenings.next().expect("one for each sum");
        let whitening = next();
        go_on(0.6)?;
        let trained = if teaches {
            let spaces = halves
                .each_ref()
                .map(|half| HalfSpace { whitening: next(), mean: half.mean().mapv(|x| x as f32).to_vec() });
            train(statistics, spaces, &mut |share| watch(0.6 + 0.4 * share))?
        } else {
            None
        };
        let (whitening, lessons) = match trained {
            Some(Trained { stretch, lessons }) => (stretched(&whitening, &stretch), Some(lessons)),
            None => (whitening, None),
        };
        let about = About {
            version: VERSION,
            encoder: statistics.encoder().to_owned(),
            space: statistics.space(),
            categories,
            items,
            lessons,
        };
        Ok(Self { about, mean: whole.mean().mapv(|x| x as f32).to_vec(), whitening })
    }

    /// What past piles taught about learning, beside the space; `None` where they were too few.
    pub fn lessons(&self) -> Option<&Lessons> {
        self.about.lessons.as_ref()
    }

    /// What is known before the first example of the next pile.
    pub fn prior(&self) -> Prior {
        self.lessons().map_or_else(Prior::default, |lessons| lessons.prior(self.whitening.parts().0))
    }

    /// The encoder it belongs to.
    pub fn encoder(&self) -> &str {
        &self.about.encoder
    }

    /// The space it belongs to.
    pub fn space(&self) -> Space {
        self.about.space
    }

    /// Names what was learned: 16 hexadecimal digits (FNV-1a of the numbers, not cryptographic), the same after saving.
    pub fn identity(&self) -> String {
        let (directions, damping) = self.whitening.parts();
        let numbers = self.mean.iter().chain(damping).chain(directions);
        let lessons = serde_json::to_vec(&self.about.lessons).expect("plain data");
        let hash = numbers
            .flat_map(|x| x.to_bits().to_le_bytes())
            .chain(lessons)
            .fold(0xcbf2_9ce4_8422_2325_u64, |hash, byte| (hash ^ u64::from(byte)).wrapping_mul(0x0100_0000_01b3));
        format!("{hash:016x}")
    }

    /// How many categories it was learned from.
    pub fn categories(&self) -> usize {
        self.about.categories
    }

    /// How many items they had.
    pub fn items(&self) -> usize {
        self.about.items
    }

    /// The mean of the category means, d numbers.
    pub fn mean(&self) -> &[f32] {
        &self.mean
    }

    /// What is taken out of the space.
    pub fn whitening(&self) -> &Whitening {
        &self.whitening
    }

    /// The file's bytes, the same for the same starter. Refuses fewer than `least_categories`
    /// ([`LEAST_CATEGORIES`] unless the person decides otherwise).
    pub fn write(&self, least_categories: usize) -> Result<Vec<u8>> {
        if self.about.categories < least_categories {
            return Err(Error::TooFewToShare { found: self.about.categories, least: least_categories });
        }
        let (directions, damping) = self.whitening.parts();
        let parts = [
            ("starter.json", serde_json::to_vec_pretty(&self.about).expect("plain data")),
            ("mean.npy", npy::write_f32(&[self.mean.len()], &self.mean)),
            (
                "directions.npy",
                npy::write_i8(
                    &[directions.nrows(), directions.ncols()],
                    packed(directions).as_slice().expect("standard layout"),
                ),
            ),
            ("damping.npy", npy::write_f32(&[damping.len()], damping)),
        ];
        Ok(archive::write(&parts))
    }

    /// Reads a starter file. Every part is bounded and checked.
    pub fn read(file: &[u8]) -> Result<Self> {
        let unreadable = |reason: String| Error::StarterUnreadable(reason);
        let mut archive = Archive::open(file).map_err(unreadable)?;
        let mut part = |name: &str| archive.part(name, PART_LIMIT).map_err(unreadable);
        let json = part("starter.json")?;
        #[derive(Deserialize)]
        struct Version {
            version: u32,
        }
        let damaged = |error: serde_json::Error| unreadable(format!("starter.json can't be read ({error})"));
        let Version { version } = serde_json::from_slice(&json).map_err(damaged)?;
        if version > VERSION {
            return Err(Error::StarterNewer { found: version, known: VERSION });
        }
        let about: About = serde_json::from_slice(&json).map_err(damaged)?;
        if !about.lessons.as_ref().is_none_or(Lessons::is_sound) {
            return Err(unreadable("its lessons hold numbers that can't be".into()));
        }
        let space = Space::new(about.space.dimension(), about.space.non_negative())?;
        let d = space.dimension();
        let wrong = |name: &str| unreadable(format!("{name} has another form than it should"));
        let (shape, mean) = npy::read_f32(&part("mean.npy")?).ok_or_else(|| wrong("mean.npy"))?;
        if shape != [d] || !mean.iter().all(|x| x.is_finite() && x.abs() <= 1.0) {
            return Err(wrong("mean.npy"));
        }
        let (shape, damping) = npy::read_f32(&part("damping.npy")?).ok_or_else(|| wrong("damping.npy"))?;
        if shape.len() != 1
            || shape[0] > MOST_DIRECTIONS
            || !damping.iter().all(|&x| (LEAST_DAMPING..=1.0).contains(&f64::from(x)))
        {
            return Err(wrong("damping.npy"));
        }
        let (shape, directions) = npy::read_i8(&part("directions.npy")?).ok_or_else(|| wrong("directions.npy"))?;
        if shape != [damping.len(), d] {
            return Err(wrong("directions.npy"));
        }
        let directions = Array2::from_shape_vec((damping.len(), d), directions).map_err(|_| wrong("directions.npy"))?;
        if directions.outer_iter().any(|row| row.iter().all(|&x| x == 0)) {
            return Err(wrong("directions.npy"));
        }
        Ok(Self { about, mean, whitening: Whitening::new(unpacked(&directions), damping) })
    }
}

/// The whitenings of these sums, side by side where there are threads.
fn learned(sums: Vec<&Sums>) -> Vec<Whitening> {
    // What a file can hold is what is used from the start, so that saving changes nothing.
    let learn = |sums: &Sums| {
        let learned = Whitening::learn(sums, MOST_DIRECTIONS);
        let (directions, damping) = learned.parts();
        Whitening::new(unpacked(&packed(directions)), damping.to_vec())
    };
    #[cfg(target_family = "wasm")]
    return sums.into_iter().map(learn).collect();
    #[cfg(not(target_family = "wasm"))]
    std::thread::scope(|scope| {
        let threads: Vec<_> = sums.into_iter().map(|sums| scope.spawn(move || learn(sums))).collect();
        threads.into_iter().map(|thread| thread.join().expect("whitening doesn't panic")).collect()
    })
}

/// Each row in whole numbers from −127 to 127.
fn packed(directions: &Array2<f32>) -> Array2<i8> {
    let mut packed = Array2::zeros(directions.dim());
    for (row, mut out) in directions.outer_iter().zip(packed.outer_iter_mut()) {
        let largest = row.iter().fold(f32::MIN_POSITIVE, |top, x| top.max(x.abs()));
        out.zip_mut_with(&row, |out, &x| *out = (x / largest * 127.0).round() as i8);
    }
    packed
}

/// Rows of unit length.
fn unpacked(packed: &Array2<i8>) -> Array2<f32> {
    let mut directions = packed.mapv(f32::from);
    for mut row in directions.axis_iter_mut(Axis(0)) {
        let length = row.iter().map(|&x| f64::from(x).powi(2)).sum::<f64>().sqrt();
        row.mapv_inplace(|x| (f64::from(x) / length) as f32);
    }
    directions
}
