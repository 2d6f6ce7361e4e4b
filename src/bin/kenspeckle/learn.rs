//! `kenspeckle learn`: past piles in, a starter out.

use std::{collections::BTreeMap, fs, path::PathBuf};

use clap::Args;
use kenspeckle::{
    Space, Starter,
    meta::{self, statistics::Statistics},
    starter::LEAST_CATEGORIES,
};

use crate::{
    console::{self, Failure},
    labelled::Example,
    material::{self, Kind, Reading},
    output,
};

/// Learn from piles already sorted, so that the next one of the same kind needs fewer examples.
///
/// Writes a starter: one file of about 300 KB that `sort --starter` takes. It holds none of the items and no names, but it
/// describes the past material on the whole, so think before you give it to others.
#[derive(Args)]
pub struct Learn {
    /// Past piles: folders that hold one folder of photos or of .txt files for each category; tables of notes (.csv, .tsv,
    /// .jsonl) with --column and --category; .npy files of vectors, each with --labels; or files that `learn --partial`
    /// wrote. All by one encoder.
    #[arg(required = true)]
    past: Vec<PathBuf>,
    /// For each past pile in an .npy file, in the same order: a file with one category a line.
    #[arg(long, value_name = "FILE.csv")]
    labels: Vec<PathBuf>,
    #[command(flatten)]
    reading: Reading,
    /// The starter file to write.
    #[arg(long, value_name = "FILE.starter")]
    out: PathBuf,
    /// Refuse to write a starter of fewer categories: it could tell what they were.
    #[arg(long, default_value_t = LEAST_CATEGORIES, value_name = "COUNT")]
    min_categories: usize,
    /// Write the sums over these piles instead, to be merged by another `learn` later.
    #[arg(long)]
    partial: bool,
}

impl Learn {
    /// Runs the command and tells how many items could not be read.
    pub fn run(self) -> Result<usize, Failure> {
        let mut labels = self.labels.iter();
        let mut gathered: Option<Statistics> = None;
        let mut troubles = 0;
        for past in &self.past {
            let kind = Kind::of(past);
            let (statistics, unread) = if kind != Kind::Photos || past.is_dir() {
                let labels = if kind == Kind::Vectors { labels.next() } else { None };
                let read = material::labelled(past, labels.map(PathBuf::as_path), &self.reading, "past pile")?;
                let (statistics, unusable) = gather(&read.encoder, read.space, read.examples)?;
                (statistics, read.troubles + unusable)
            } else {
                let named = |reason: String| Failure::because(format!("{}: {reason}", past.display()));
                let file = fs::read(past).map_err(|error| named(format!("it can't be read ({error})")))?;
                (Statistics::read(&file).map_err(|error| named(error.to_string()))?, 0)
            };
            troubles += unread;
            match &mut gathered {
                None => gathered = Some(statistics),
                Some(gathered) => gathered
                    .merge(&statistics)
                    .map_err(|error| Failure::because(format!("{}: {error}", past.display())))?,
            }
            console::go_on()?;
        }
        if labels.next().is_some() {
            return Err(Failure::because("there are more --labels than .npy files; give one for each"));
        }
        let Some(gathered) = gathered else { return Err(Failure::because("there is no past pile to learn from")) };
        let (categories, items) = (gathered.categories(), gathered.items());
        let mut taught = true;
        let file = if self.partial {
            gathered.write()
        } else {
            let bar = console::progress(100, "learning");
            let starter = Starter::learn_watched(&gathered, &mut |share| {
                bar.set_position((100.0 * share) as u64);
                console::go_on().is_ok()
            });
            bar.finish_and_clear();
            console::go_on()?;
            let starter = starter.map_err(Failure::because)?;
            taught = starter.lessons().is_some();
            starter.write(self.min_categories).map_err(Failure::because)?
        };
        console::go_on()?;
        output::write_whole(&self.out, |out| std::io::Write::write_all(out, &file).map_err(|error| error.to_string()))?;
        let what = if self.partial { "the sums" } else { "the starter" };
        console::say(&format!(
            "learned from {items} items in {categories} categories; {what} ({} KB) in {}",
            file.len().div_ceil(1000),
            self.out.display()
        ));
        if !taught {
            console::say(&format!(
                "that was too little to learn how to learn from: it takes {} categories with two items each; the starter knows \
                 how categories scatter, and nothing of steps and temperatures",
                meta::train::LEAST_CATEGORIES
            ));
        }
        Ok(troubles)
    }
}

/// The sums over these examples, and how many could not be used.
fn gather(encoder: &str, space: Space, examples: Vec<Example>) -> Result<(Statistics, usize), Failure> {
    let mut categories: BTreeMap<String, Vec<Vec<f32>>> = BTreeMap::new();
    let mut unusable = 0;
    for Example { item, category } in examples {
        match space.place(&item.embedding) {
            Ok(_) => categories.entry(category).or_default().push(item.embedding),
            Err(error) => {
                console::say(&format!("item {}: {error}", item.name));
                unusable += 1;
            }
        }
    }
    let bar = console::progress(categories.len(), "gathering");
    let mut statistics = Statistics::new(encoder, space);
    let pile = categories.values().map(|items| items.iter().map(Vec::as_slice));
    let outcome = statistics.add_pile_watched(pile, |done| {
        bar.set_position(done as u64);
        console::go_on().is_ok()
    });
    bar.finish_and_clear();
    console::go_on()?;
    outcome.map_err(Failure::because)?;
    Ok((statistics, unusable))
}
