//! How well each learner sorts a file of episodes, item by item.
//!
//! `cargo bench --features cli --bench episodes -- VECTORS.npy EPISODES.jsonl [--non-negative]` prints one JSON object:
//! for each learner its accuracy (0…1) and log loss (nats) in every episode, and the median time in milliseconds to learn one
//! episode and sort its queries. `pkg-scripts/bench` draws the episodes and makes the table.

use std::{
    collections::BTreeMap,
    error::Error,
    fs::File,
    io::{BufRead, BufReader},
    time::Instant,
};

use kenspeckle::{LearnerKind, Prior, Space, Support};
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

fn main() -> Result<(), Box<dyn Error>> {
    // Cargo adds `--bench`.
    let (flags, paths): (Vec<_>, Vec<_>) = std::env::args().skip(1).partition(|argument| argument.starts_with("--"));
    let [vectors, episodes] = paths.as_slice() else {
        return Err("usage: episodes VECTORS.npy EPISODES.jsonl [--non-negative]".into());
    };
    let vectors: Array2<f32> = ndarray_npy::read_npy(vectors)?;
    let space = Space::new(vectors.ncols(), flags.iter().any(|flag| flag == "--non-negative"))?;
    let mut placed = vectors;
    for mut row in placed.rows_mut() {
        let place = space.place(&row.to_vec())?;
        row.iter_mut().zip(place).for_each(|(value, new)| *value = new);
    }

    let mut lines = BufReader::new(File::open(episodes)?).lines();
    let header: Header = serde_json::from_str(&lines.next().ok_or("the file of episodes is empty")??)?;
    let episodes = lines.map(|line| Ok(serde_json::from_str(&line?)?)).collect::<Result<Vec<Episode>, Box<dyn Error>>>()?;

    let prior = Prior::default();
    let mut results = BTreeMap::new();
    for kind in LearnerKind::ALL {
        let mut measured = Measured::default();
        let mut times = Vec::new();
        for episode in &episodes {
            let examples = placed.select(Axis(0), &episode.support);
            let queries = placed.select(Axis(0), &episode.query);
            let start = Instant::now();
            let support = Support::new(examples, episode.support_labels.clone(), header.way)?;
            let probabilities = kind.learn(&support, &prior).head.probabilities(queries.view());
            times.push(start.elapsed().as_secs_f64() * 1e3);
            let (mut right, mut loss) = (0.0, 0.0);
            for (row, &label) in probabilities.outer_iter().zip(&episode.query_labels) {
                let most = row.iter().enumerate().max_by(|a, b| a.1.total_cmp(b.1)).map(|(category, _)| category);
                right += f64::from(u8::from(most == Some(label)));
                loss -= row[label].max(LEAST_PROBABILITY).ln();
            }
            let count = episode.query_labels.len() as f64;
            measured.accuracy.push(right / count);
            measured.log_loss.push(loss / count);
        }
        times.sort_by(f64::total_cmp);
        measured.milliseconds = times[times.len() / 2];
        results.insert(kind.name(), measured);
    }
    println!("{}", serde_json::to_string(&results)?);
    Ok(())
}
