//! Rehearsing: sorting labelled material as if its labels weren't known, to find out beforehand how well it will go.
//!
//! Every contender, an empty [`Sorter`] with its learner and whatever it was told beforehand, sorts the same episodes, so
//! that differences between contenders are paired. An episode's examples and queries are the sorter's whole pile, as they
//! are when a person sorts. [`Rehearsal::play`] plays one episode and depends on nothing but its number: whoever calls it may
//! spread the numbers over threads, and hands what was played to [`Summary::new`] in order of number.

use std::collections::BTreeMap;

use crate::{
    error::Result,
    meta::episode::{Design, Episode, Episodes, Labelled},
    sorter::Sorter,
};

/// One that takes part in the rehearsal.
#[derive(Debug, Clone)]
pub struct Contender {
    /// What it is called in the report.
    pub name: String,
    /// A sorter without items or trays; a copy of it sorts each episode.
    pub sorter: Sorter,
}

/// A mean with its 95 % interval.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Estimate {
    /// The mean.
    pub mean: f64,
    /// Half the width of the 95 % interval; infinite for fewer than [`LEAST_VALUES`] values.
    pub half_width: f64,
}

/// An interval needs at least this many values.
pub const LEAST_VALUES: usize = 10;

impl Estimate {
    /// The mean of independent values, with Student's t interval. Cost O(n).
    pub fn of(values: &[f64]) -> Self {
        let n = values.len() as f64;
        let mean = values.iter().sum::<f64>() / n;
        if values.len() < LEAST_VALUES {
            return Self { mean, half_width: f64::INFINITY };
        }
        let variance = values.iter().map(|value| (value - mean) * (value - mean)).sum::<f64>() / (n - 1.0);
        Self { mean, half_width: t_quantile(n - 1.0) * (variance / n).sqrt() }
    }

    /// Whether the interval leaves out zero.
    pub fn is_clear(&self) -> bool {
        self.mean.abs() > self.half_width
    }
}

/// The 97.5 % quantile of Student's t for ν ≥ 9 degrees of freedom, by the expansion in 1/ν of Abramowitz and Stegun
/// (1964), 26.7.5; its relative error is below 10⁻⁵ there.
fn t_quantile(freedom: f64) -> f64 {
    const Z: f64 = 1.959_963_984_540_054;
    let square = Z * Z;
    let terms = [
        (square + 1.0) / 4.0,
        ((5.0 * square + 16.0) * square + 3.0) / 96.0,
        (((3.0 * square + 19.0) * square + 17.0) * square - 15.0) / 384.0,
        ((((79.0 * square + 776.0) * square + 1482.0) * square - 1920.0) * square - 945.0) / 92_160.0,
    ];
    // Horner's rule in 1/ν.
    let series = terms.iter().rev().fold(0.0, |sum, term| (sum + term) / freedom);
    Z * (1.0 + series)
}

/// A query that the first contender put into a wrong tray.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
struct Mistake {
    shot: usize,
    truth: usize,
    said: usize,
}

/// How one episode went.
#[derive(Debug, Clone, PartialEq)]
pub struct Played {
    /// Share of the queries that came into their own tray, by contender and shot.
    accuracy: Vec<Vec<f64>>,
    /// The episode's categories, each with its number of queries.
    queries: Vec<(usize, usize)>,
    mistakes: Vec<Mistake>,
}

/// Labelled material, the episodes drawn from it, and the contenders.
#[derive(Debug, Clone)]
pub struct Rehearsal<'a> {
    embeddings: &'a [Vec<f32>],
    episodes: Episodes,
    shots: usize,
    contenders: &'a [Contender],
}

impl<'a> Rehearsal<'a> {
    /// A rehearsal with items by number: their embeddings, and their categories in `labelled`.
    ///
    /// Refuses fewer than two categories with [`Design::least_items`].
    pub fn new(
        embeddings: &'a [Vec<f32>],
        labelled: Labelled,
        design: &Design,
        contenders: &'a [Contender],
    ) -> Result<Self> {
        let episodes = Episodes::new(labelled, design)?;
        Ok(Self { embeddings, episodes, shots: design.shots().len(), contenders })
    }

    /// The episodes that are played.
    pub fn episodes(&self) -> &Episodes {
        &self.episodes
    }

    /// Plays the episode of this number at every shot with every contender. Refuses what the contenders' sorters refuse
    /// to take. Cost: that of [`Sorter::verdicts`] for each shot and contender.
    pub fn play(&self, number: u64) -> Result<Played> {
        let draw = self.episodes.draw(number);
        let mut accuracy = vec![Vec::with_capacity(self.shots); self.contenders.len()];
        let mut mistakes = Vec::new();
        let mut queries: Vec<(usize, usize)> = Vec::new();
        for shot in 0..self.shots {
            let episode = draw.at(shot);
            queries = episode.categories.iter().map(|&category| (category, 0)).collect();
            episode.queries.iter().for_each(|query| queries[query.label].1 += 1);
            for (position, contender) in self.contenders.iter().enumerate() {
                let said = self.sort(contender, &episode)?;
                let right =
                    episode.queries.iter().zip(&said).filter(|(query, said)| Some(query.label) == **said).count();
                accuracy[position].push(right as f64 / said.len() as f64);
                if position == 0 {
                    let category = |label: usize| episode.categories[label];
                    mistakes.extend(episode.queries.iter().zip(said).filter_map(|(query, said)| {
                        let (truth, said) = (category(query.label), category(said?));
                        (truth != said).then_some(Mistake { shot, truth, said })
                    }));
                }
            }
        }
        Ok(Played { accuracy, queries, mistakes })
    }

    /// The label that the contender gives each query; `None` where it sets the query aside.
    fn sort(&self, contender: &Contender, episode: &Episode) -> Result<Vec<Option<usize>>> {
        let mut sorter = contender.sorter.clone();
        let mut add = |item: usize| sorter.add_item(&self.embeddings[item]);
        let queries = episode.queries.iter().map(|query| add(query.item)).collect::<Result<Vec<_>>>()?;
        let examples = episode.support.iter().map(|example| add(example.item)).collect::<Result<Vec<_>>>()?;
        let trays = (0..episode.categories.len())
            .map(|label| sorter.add_tray(&label.to_string()))
            .collect::<Result<Vec<_>>>()?;
        for (number, example) in examples.into_iter().zip(&episode.support) {
            sorter.answer(number, trays[example.label])?;
        }
        let verdicts = sorter.verdicts();
        let label = |tray: Option<usize>| trays.iter().position(|&known| Some(known) == tray);
        Ok(queries.into_iter().map(|number| verdicts[number].and_then(|verdict| label(verdict.tray))).collect())
    }
}

/// Two categories that are taken for each other.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Confusion {
    /// The categories' numbers, the smaller first.
    pub categories: (usize, usize),
    /// How many queries of either were put with the other.
    pub mistakes: usize,
    /// How many queries of either there were in episodes that had both.
    pub queries: usize,
}

impl Confusion {
    /// The share of queries that were put with the other category.
    pub fn share(&self) -> f64 {
        self.mistakes as f64 / self.queries as f64
    }

    /// The lower end of the share's 95 % interval (Wilson 1927), so that few queries don't make a pair stand out.
    fn surely(&self) -> f64 {
        const Z_SQUARE: f64 = 3.841_458_820_694_124;
        let (n, p) = (self.queries as f64, self.share());
        let spread = (Z_SQUARE * (p * (1.0 - p) / n + Z_SQUARE / (4.0 * n * n))).sqrt();
        (p + Z_SQUARE / (2.0 * n) - spread) / (1.0 + Z_SQUARE / n)
    }
}

/// What came out.
#[derive(Debug, Clone)]
pub struct Summary<'a> {
    played: &'a [Played],
}

impl<'a> Summary<'a> {
    /// Of at least one episode, in order of number.
    pub fn new(played: &'a [Played]) -> Self {
        Self { played }
    }

    fn estimate(&self, value: impl Fn(&Played) -> f64) -> Estimate {
        Estimate::of(&self.played.iter().map(value).collect::<Vec<_>>())
    }

    /// The share of queries that a contender sorts right at a shot, 0 to 1. Contenders and shots go by position.
    pub fn accuracy(&self, contender: usize, shot: usize) -> Estimate {
        self.estimate(|played| played.accuracy[contender][shot])
    }

    /// By how much a contender's share is larger than another's in the same episodes, −1 to 1.
    pub fn difference(&self, contender: usize, other: usize, shot: usize) -> Estimate {
        self.estimate(|played| played.accuracy[contender][shot] - played.accuracy[other][shot])
    }

    /// The pairs of categories that the first contender confuses at a shot, the most confused first.
    pub fn confusions(&self, shot: usize) -> Vec<Confusion> {
        let mut mistakes: BTreeMap<(usize, usize), usize> = BTreeMap::new();
        for mistake in self.played.iter().flat_map(|played| &played.mistakes).filter(|mistake| mistake.shot == shot) {
            *mistakes.entry(pair(mistake.truth, mistake.said)).or_default() += 1;
        }
        let mut queries: BTreeMap<(usize, usize), usize> = BTreeMap::new();
        for played in self.played {
            for (position, &(category, count)) in played.queries.iter().enumerate() {
                for &(other, others) in &played.queries[..position] {
                    *queries.entry(pair(category, other)).or_default() += count + others;
                }
            }
        }
        let mut confusions: Vec<Confusion> = mistakes
            .into_iter()
            .map(|(categories, mistakes)| Confusion { categories, mistakes, queries: queries[&categories] })
            .collect();
        confusions.sort_by(|a, b| b.surely().total_cmp(&a.surely()).then(a.categories.cmp(&b.categories)));
        confusions
    }
}

fn pair(a: usize, b: usize) -> (usize, usize) {
    (a.min(b), a.max(b))
}

#[cfg(test)]
mod tests {
    use std::num::NonZeroUsize;

    use super::*;
    use crate::{LearnerKind, Settings, Space};

    /// scipy 1.17.1, `scipy.stats.t.ppf(0.975, ν)`.
    #[test]
    fn the_t_quantile_is_that_of_scipy() {
        for (freedom, expected) in [
            (9.0, 2.262_157_162_798_205),
            (14.0, 2.144_786_687_917_804),
            (29.0, 2.045_229_642_132_703),
            (299.0, 1.967_929_669_065_67),
            (999.0, 1.962_341_461_133_449_3),
        ] {
            let relative = t_quantile(freedom) / expected - 1.0;
            assert!(relative.abs() < 1e-5, "{freedom}: {relative}");
        }
    }

    const FIRST: [f64; 12] = [0.72, 0.8, 0.68, 0.76, 0.92, 0.84, 0.6, 0.88, 0.8, 0.64, 0.76, 0.72];
    const SECOND: [f64; 12] = [0.76, 0.8, 0.64, 0.8, 0.88, 0.88, 0.64, 0.84, 0.84, 0.68, 0.72, 0.8];

    /// scipy 1.17.1, `scipy.stats.ttest_1samp(values, 0).confidence_interval(0.95)` of the values and of their differences.
    #[test]
    fn intervals_are_those_of_scipy() {
        let played: Vec<Played> = FIRST
            .iter()
            .zip(SECOND)
            .map(|(&a, b)| Played { accuracy: vec![vec![a], vec![b]], queries: vec![], mistakes: vec![] })
            .collect();
        let summary = Summary::new(&played);
        for (estimate, mean, half_width) in [
            (summary.accuracy(0, 0), 0.76, 0.060_337_315_640_866_085),
            (summary.difference(1, 0, 0), 0.013_333_333_333_333_336, 0.027_272_271_458_321_812),
        ] {
            assert!((estimate.mean - mean).abs() < 1e-12);
            assert!((estimate.half_width / half_width - 1.0).abs() < 1e-5, "{estimate:?}");
        }
        assert!(summary.accuracy(0, 0).is_clear() && !summary.difference(1, 0, 0).is_clear());
        assert_eq!(Estimate::of(&FIRST[..9]).half_width, f64::INFINITY);
    }

    /// scipy 1.17.1, `scipy.stats.binomtest(9, 120).proportion_ci(method="wilson").low`.
    #[test]
    fn few_queries_do_not_make_a_pair_stand_out() {
        let confusion = |mistakes, queries| Confusion { categories: (0, 1), mistakes, queries };
        assert!((confusion(9, 120).surely() - 0.039_957_115_396_020_29).abs() < 1e-12);
        assert!(confusion(1, 4).surely() < confusion(20, 120).surely());
    }

    #[test]
    fn confusions_count_both_ways_and_only_episodes_with_both() {
        let wrong = |truth, said| Mistake { shot: 0, truth, said };
        let one = |queries: &[(usize, usize)], mistakes: &[Mistake]| Played {
            accuracy: vec![],
            queries: queries.to_vec(),
            mistakes: mistakes.to_vec(),
        };
        let played = [
            one(&[(4, 10), (2, 8)], &[wrong(4, 2), wrong(2, 4), wrong(4, 2)]),
            one(&[(2, 10), (1, 10)], &[wrong(1, 2)]),
            one(&[(4, 10), (1, 10)], &[Mistake { shot: 1, truth: 4, said: 1 }]),
        ];
        let expected = [
            Confusion { categories: (2, 4), mistakes: 3, queries: 18 },
            Confusion { categories: (1, 2), mistakes: 1, queries: 20 },
        ];
        assert_eq!(Summary::new(&played).confusions(0), expected);
    }

    /// Categories that lie apart are sorted without a mistake, and labels that mean nothing no better than by chance.
    #[test]
    fn material_that_suits_and_material_that_does_not() {
        let settings =
            |learner| Settings { encoder: "test".into(), space: Space::new(8, false).unwrap(), learner, seed: 1 };
        let contenders =
            LearnerKind::ALL.map(|kind| Contender { name: kind.name().into(), sorter: Sorter::new(settings(kind)) });
        let number = |n| NonZeroUsize::new(n).unwrap();
        let design =
            Design { ways: number(4), shots: vec![number(1), number(4)], queries: number(6), uneven: false, seed: 3 };
        // Weyl's sequence: spread out, and without a trend over the items.
        let noise = |i: usize, j: usize| ((i * 8 + j + 1) as f32 * 0.618_034).fract() - 0.5;
        let items = |signal: f32| -> Vec<Vec<f32>> {
            (0..80).map(|i| (0..8).map(|j| noise(i, j) + if j == i % 4 { signal } else { 0.0 }).collect()).collect()
        };
        let labels: Vec<usize> = (0..80).map(|i| i % 4).collect();
        for (signal, expected, tolerance) in [(20.0, 1.0, 0.0), (0.0, 0.25, 0.1)] {
            let embeddings = items(signal);
            let labelled = Labelled::new(&labels, 4).unwrap();
            let rehearsal = Rehearsal::new(&embeddings, labelled, &design, &contenders).unwrap();
            let played: Vec<Played> = (0..40).map(|number| rehearsal.play(number).unwrap()).collect();
            assert_eq!(rehearsal.play(17).unwrap(), played[17], "an episode doesn't depend on those before");
            let summary = Summary::new(&played);
            for contender in 0..4 {
                for shot in 0..2 {
                    let mean = summary.accuracy(contender, shot).mean;
                    assert!((mean - expected).abs() <= tolerance, "{signal} {contender} {shot}: {mean}");
                }
            }
            assert_eq!(summary.confusions(1).is_empty(), signal > 0.0);
        }
    }
}
