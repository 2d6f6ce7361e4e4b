//! What the sorter says of its own reliability in a file of draws.
//!
//! `cargo bench --features cli --bench trust -- VECTORS.npy DRAWS.jsonl [--non-negative] [--starter=FILE]` prints one JSON
//! object a draw: for the queries, which are of the examples' categories, their probabilities, plausible sets, likeness and whether
//! they are set aside; the same likeness for the others, which are of categories that were never shown; and the examples
//! that are doubted, the gravest first. `pkg-scripts/bench trust` draws and makes the tables.

use std::{
    error::Error,
    fs::File,
    io::{BufRead, BufReader},
    sync::Arc,
    time::Instant,
};

use kenspeckle::{LearnerKind, Settings, Sorter, Space, Starter};
use ndarray::Array2;
use serde::{Deserialize, Serialize};

#[derive(Deserialize)]
struct Draw {
    way: usize,
    support: Vec<usize>,
    support_labels: Vec<usize>,
    query: Vec<usize>,
    other: Vec<usize>,
}

#[derive(Serialize)]
struct Said {
    probabilities: Vec<Vec<f64>>,
    plausible: Vec<Vec<usize>>,
    set_aside: Vec<bool>,
    likeness: Vec<f64>,
    other_likeness: Vec<f64>,
    other_set_aside: Vec<bool>,
    doubts: Vec<usize>,
    left_out_right: usize,
    left_out_judged: usize,
    milliseconds: f64,
}

type Outcome<T> = Result<T, Box<dyn Error>>;

fn main() -> Outcome<()> {
    // Cargo adds `--bench`.
    let (flags, paths): (Vec<_>, Vec<_>) = std::env::args().skip(1).partition(|argument| argument.starts_with("--"));
    let [vectors, draws] = paths.as_slice() else {
        return Err("usage: trust VECTORS.npy DRAWS.jsonl [--non-negative] [--starter=FILE]".into());
    };
    let vectors: Array2<f32> = ndarray_npy::read_npy(vectors)?;
    let space = Space::new(vectors.ncols(), flags.iter().any(|flag| flag == "--non-negative"))?;
    let settings = Settings { encoder: "benchmark".into(), space, learner: LearnerKind::Auto, seed: 1 };
    let plain = match flags.iter().find_map(|flag| flag.strip_prefix("--starter=")) {
        Some(file) => {
            let starter = Arc::new(Starter::read(&std::fs::read(file)?)?);
            let settings = Settings { encoder: starter.encoder().into(), ..settings };
            Sorter::with_starter(settings, starter)?
        }
        None => Sorter::new(settings),
    };
    for line in BufReader::new(File::open(draws)?).lines() {
        println!("{}", serde_json::to_string(&say(plain.clone(), &vectors, &serde_json::from_str(&line?)?)?)?);
    }
    Ok(())
}

fn say(mut sorter: Sorter, vectors: &Array2<f32>, draw: &Draw) -> Outcome<Said> {
    for &row in draw.support.iter().chain(&draw.query).chain(&draw.other) {
        sorter.add_item(&vectors.row(row).to_vec())?;
    }
    for label in 0..draw.way {
        // Trays are numbered as they come.
        sorter.add_tray(&label.to_string())?;
    }
    for (item, &label) in draw.support_labels.iter().enumerate() {
        sorter.answer(item, label)?;
    }
    let first = draw.support.len();
    let (mut probabilities, mut plausible) = (Vec::new(), Vec::new());
    for item in first..first + draw.query.len() {
        let mut row = vec![0.0; draw.way];
        for (tray, probability) in sorter.ranking(item)? {
            row[tray] = probability;
        }
        probabilities.push(row);
        plausible.push(sorter.plausible(item)?);
    }
    let start = Instant::now();
    let share = sorter.assessment().ok_or("two trays have an answer")?.share;
    let milliseconds = start.elapsed().as_secs_f64() * 1e3;
    let doubts = sorter.doubts().iter().map(|doubt| doubt.item).collect();
    let verdicts: Vec<_> = sorter.verdicts()[first..].iter().flatten().collect();
    let likeness: Vec<f64> = verdicts.iter().map(|verdict| verdict.likeness).collect();
    let set_aside: Vec<bool> = verdicts.iter().map(|verdict| verdict.set_aside.is_some()).collect();
    let known = draw.query.len();
    Ok(Said {
        probabilities,
        plausible,
        set_aside: set_aside[..known].to_vec(),
        likeness: likeness[..known].to_vec(),
        other_likeness: likeness[known..].to_vec(),
        other_set_aside: set_aside[known..].to_vec(),
        doubts,
        left_out_right: share.right,
        left_out_judged: share.judged,
        milliseconds,
    })
}
