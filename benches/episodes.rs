//! How well each learner sorts a file of episodes.
//!
//! `cargo bench --features cli --bench episodes -- VECTORS.npy EPISODES.jsonl [--non-negative] [--starter=FILE]` prints one
//! JSON object: under `one by one` the learner alone, which sees each query by itself, and under `in the pile` the [`Sorter`],
//! whose pile is the episode's examples and queries. With the starter of that file there are also `one by one, with a starter`,
//! where every item is whitened and seen from the middle of the past piles, and `in the pile, with a starter`. In each, every
//! learner has its accuracy (0…1) and log loss (nats) in every episode, and the median time in milliseconds to learn one episode
//! and sort its queries. `pkg-scripts/bench` draws the episodes and makes the table.

use std::{
    collections::BTreeMap,
    error::Error,
    fs::File,
    io::{BufRead, BufReader},
    sync::Arc,
    time::Instant,
};

use kenspeckle::{LearnerKind, Prior, Settings, Sorter, Space, Starter, Support};
use ndarray::{Array2, Axis};
use serde::{Deserialize, Serialize};

/// A certain mistake costs this probability's log loss, not infinity. The scikit-learn side uses the same.
const LEAST_PROBABILITY: f64 = 1e-6;

#[derive(Deserialize)]
struct Header {
    way: usize,
}

#[derive(Deserialize)]
struct Episode {
    support: Vec<usize>,
    support_labels: Vec<usize>,
    query: Vec<usize>,
    query_labels: Vec<usize>,
}

#[derive(Default, Serialize)]
struct Measured {
    accuracy: Vec<f64>,
    log_loss: Vec<f64>,
    milliseconds: f64,
}

type Outcome<T> = Result<T, Box<dyn Error>>;

fn main() -> Outcome<()> {
    // Cargo adds `--bench`.
    let (flags, paths): (Vec<_>, Vec<_>) = std::env::args().skip(1).partition(|argument| argument.starts_with("--"));
    let [vectors, episodes] = paths.as_slice() else {
        return Err("usage: episodes VECTORS.npy EPISODES.jsonl [--non-negative] [--starter=FILE]".into());
    };
    let vectors: Array2<f32> = ndarray_npy::read_npy(vectors)?;
    let space = Space::new(vectors.ncols(), flags.iter().any(|flag| flag == "--non-negative"))?;
    let places = each_row(&vectors, |row| Ok(space.place(row)?))?;

    let mut lines = BufReader::new(File::open(episodes)?).lines();
    let header: Header = serde_json::from_str(&lines.next().ok_or("the file of episodes is empty")??)?;
    let episodes = lines.map(|line| Ok(serde_json::from_str(&line?)?)).collect::<Outcome<Vec<Episode>>>()?;

    let starter = match flags.iter().find_map(|flag| flag.strip_prefix("--starter=")) {
        Some(file) => Some(Arc::new(Starter::read(&std::fs::read(file)?)?)),
        None => None,
    };
    let started_places = starter.as_deref().map(|starter| from_the_past(starter, &places)).transpose()?;
    let mut results: BTreeMap<&str, BTreeMap<&str, Measured>> = BTreeMap::new();
    for kind in LearnerKind::ALL {
        let mut keep = |mode, measured| results.entry(mode).or_default().insert(kind.name(), measured);
        let settings = Settings { encoder: "benchmark".into(), space, learner: kind, seed: 1 };
        let plain = Sorter::new(settings.clone());
        keep(
            "one by one",
            measure(&episodes, |episode| one_by_one(kind, &Prior::default(), &places, episode, header.way))?,
        );
        keep("in the pile", measure(&episodes, |episode| in_the_pile(plain.clone(), &vectors, episode, header.way))?);
        if let (Some(starter), Some(places)) = (&starter, &started_places) {
            let settings = Settings { encoder: starter.encoder().into(), ..settings };
            let prior = starter.prior();
            let started = Sorter::with_starter(settings, starter.clone())?;
            let alone = measure(&episodes, |episode| one_by_one(kind, &prior, places, episode, header.way))?;
            let together = measure(&episodes, |episode| in_the_pile(started.clone(), &vectors, episode, header.way))?;
            keep("one by one, with a starter", alone);
            keep("in the pile, with a starter", together);
        }
    }
    println!("{}", serde_json::to_string(&results)?);
    Ok(())
}

/// The array with `change` made of each row.
fn each_row(rows: &Array2<f32>, change: impl Fn(&[f32]) -> Outcome<Vec<f32>>) -> Outcome<Array2<f32>> {
    let changed = rows.outer_iter().map(|row| change(&row.to_vec())).collect::<Outcome<Vec<_>>>()?;
    Ok(Array2::from_shape_vec(rows.raw_dim(), changed.concat())?)
}

/// Places as a starter alone shows them, with no other item of the pile known: whitened, seen from the whitened mean of the
/// past piles, at unit length.
fn from_the_past(starter: &Starter, places: &Array2<f32>) -> Outcome<Array2<f32>> {
    let mut middle = starter.mean().to_vec();
    starter.whitening().apply(&mut middle);
    each_row(places, |place| {
        let mut seen = place.to_vec();
        starter.whitening().apply(&mut seen);
        seen.iter_mut().zip(&middle).for_each(|(x, &m)| *x -= m);
        let length = seen.iter().map(|&x| f64::from(x).powi(2)).sum::<f64>().sqrt();
        Ok(seen.iter().map(|&x| (f64::from(x) / length.max(1e-12)) as f32).collect())
    })
}

/// Scores what `sort` says of each episode: the probability of each category (way) for each query, and the milliseconds taken.
fn measure(episodes: &[Episode], sort: impl Fn(&Episode) -> Outcome<(Vec<Vec<f64>>, f64)>) -> Outcome<Measured> {
    let mut measured = Measured::default();
    let mut times = Vec::new();
    for episode in episodes {
        let (probabilities, milliseconds) = sort(episode)?;
        let (mut right, mut loss) = (0.0, 0.0);
        for (row, &label) in probabilities.iter().zip(&episode.query_labels) {
            let most = (0..row.len()).max_by(|&a, &b| row[a].total_cmp(&row[b]));
            right += f64::from(u8::from(most == Some(label)));
            loss -= row[label].max(LEAST_PROBABILITY).ln();
        }
        let count = episode.query_labels.len() as f64;
        measured.accuracy.push(right / count);
        measured.log_loss.push(loss / count);
        times.push(milliseconds);
    }
    times.sort_by(f64::total_cmp);
    measured.milliseconds = times[times.len() / 2];
    Ok(measured)
}

fn one_by_one(
    kind: LearnerKind,
    prior: &Prior,
    places: &Array2<f32>,
    episode: &Episode,
    way: usize,
) -> Outcome<(Vec<Vec<f64>>, f64)> {
    let examples = places.select(Axis(0), &episode.support);
    let queries = places.select(Axis(0), &episode.query);
    let start = Instant::now();
    let support = Support::new(examples, episode.support_labels.clone(), way)?;
    let probabilities = kind.learn(&support, prior).head.probabilities(queries.view());
    let milliseconds = start.elapsed().as_secs_f64() * 1e3;
    Ok((probabilities.outer_iter().map(|row| row.to_vec()).collect(), milliseconds))
}

fn in_the_pile(
    mut sorter: Sorter,
    vectors: &Array2<f32>,
    episode: &Episode,
    way: usize,
) -> Outcome<(Vec<Vec<f64>>, f64)> {
    for &row in episode.support.iter().chain(&episode.query) {
        sorter.add_item(&vectors.row(row).to_vec())?;
    }
    let trays = (0..way).map(|label| sorter.add_tray(&label.to_string())).collect::<kenspeckle::Result<Vec<_>>>()?;
    for (item, &label) in episode.support_labels.iter().enumerate() {
        sorter.answer(item, trays[label])?;
    }
    let start = Instant::now();
    sorter.verdicts();
    let milliseconds = start.elapsed().as_secs_f64() * 1e3;
    let mut probabilities = Vec::new();
    for item in episode.support.len()..sorter.items() {
        let mut row = vec![0.0; way];
        for (tray, probability) in sorter.ranking(item)? {
            row[trays.iter().position(|&known| known == tray).ok_or("the sorter named an unknown tray")?] = probability;
        }
        probabilities.push(row);
    }
    Ok((probabilities, milliseconds))
}
