//! `kenspeckle sort`: a pile and a few examples in, every item's tray out.

use std::{
    collections::{BTreeMap, HashMap},
    path::{Path, PathBuf},
    sync::Arc,
};

use clap::Args;
use kenspeckle::{
    LearnerKind, Settings, Sorter, Space, Starter,
    encoder::{Encoder, PhotoEncoder},
};
use serde::Serialize;

use crate::{
    console::{self, Failure},
    labelled::{self, Example, Item},
    output, photos, vectors,
};

/// Sort a pile by a few examples of each category.
///
/// Prints a table with one line for each item of the pile: its name, the tray it belongs in, and how probable that is
/// (0 to 1). Two to five examples of each category are a good start; sort again with more where the result is not sure.
#[derive(Args)]
pub struct Sort {
    /// The pile: a folder of photos (JPEG, PNG, WebP, GIF, BMP, in any depth), or an .npy file of vectors.
    pile: PathBuf,
    /// The examples: a folder that holds one folder of photos for each category, named like it; or an .npy file with
    /// vectors of the same kind as the pile's.
    #[arg(long)]
    examples: PathBuf,
    /// For examples in an .npy file: a file with one category a line, in the same order.
    #[arg(long, value_name = "FILE.csv")]
    labels: Option<PathBuf>,
    /// How to learn: auto weighs the others by how well each does on the examples.
    #[arg(long, default_value = "auto", value_name = "auto|prototype|ridge|gradient")]
    learner: LearnerKind,
    /// Seed of everything that is drawn: the same seed gives the same result.
    #[arg(long, default_value_t = 1)]
    seed: u64,
    /// Vectors have a sign even if no number happens to be negative (by default, vectors without any negative number are
    /// compared by their square roots, which suits what comes after a rectifier).
    #[arg(long)]
    signed: bool,
    /// A starter from past piles of the same kind (`kenspeckle learn` makes it): fewer examples are needed with one.
    #[arg(long, value_name = "FILE.starter")]
    starter: Option<PathBuf>,
    /// Write the table to this file instead of showing it.
    #[arg(long, value_name = "FILE.csv")]
    out: Option<PathBuf>,
    /// Write JSON instead of a table.
    #[arg(long)]
    json: bool,
}

/// What was read, and what could not be.
struct Material {
    encoder: String,
    space: Space,
    pile: Vec<Item>,
    examples: Vec<Example>,
    troubles: usize,
}

#[derive(Serialize)]
struct Sorted<'a> {
    item: &'a str,
    tray: &'a str,
    probability: f64,
}

#[derive(Serialize)]
struct Report<'a> {
    encoder: &'a str,
    learner: LearnerKind,
    seed: u64,
    trays: BTreeMap<&'a str, usize>,
    unreadable: usize,
    items: Vec<Sorted<'a>>,
}

impl Sort {
    /// Runs the command and tells how many items could not be read.
    pub fn run(self) -> Result<usize, Failure> {
        let mut material = match (vectors::is_npy(&self.pile), vectors::is_npy(&self.examples)) {
            (false, false) => self.read_photos()?,
            (true, true) => self.read_vectors()?,
            _ => {
                return Err(Failure::because(
                    "the pile and the examples must both be folders of photos or both be .npy files; \
                     `kenspeckle embed` turns photos into an .npy file",
                ));
            }
        };
        let settings = Settings {
            encoder: material.encoder.clone(),
            space: material.space,
            learner: self.learner,
            seed: self.seed,
        };
        let mut sorter = match &self.starter {
            Some(path) => read_starter(path).and_then(|starter| {
                let other = |error| Failure::because(format!("{}: {error}", path.display()));
                Sorter::with_starter(settings, Arc::new(starter)).map_err(other)
            })?,
            None => Sorter::new(settings),
        };
        let pile = add_pile(&mut sorter, &mut material);
        let trays = add_examples(&mut sorter, &mut material)?;
        if pile.is_empty() {
            return Err(Failure::because(format!("{}: no item of the pile could be read", self.pile.display())));
        }
        console::go_on()?;

        let names: HashMap<usize, &str> = trays.iter().map(|(name, &tray)| (tray, name.as_str())).collect();
        let verdicts = sorter.verdicts();
        let mut items = Vec::with_capacity(pile.len());
        for (number, name) in &pile {
            let verdict =
                verdicts[*number].as_ref().and_then(|verdict| Some((*names.get(&verdict.tray?)?, verdict.probability)));
            let (tray, probability) = verdict.ok_or_else(|| Failure::because(format!("{name}: it got no tray")))?;
            items.push(Sorted { item: name, tray, probability });
        }
        self.write(&material, &trays, items)?;
        Ok(material.troubles)
    }

    fn read_photos(&self) -> Result<Material, Failure> {
        let parts = photos::files_below(&self.pile)?;
        if parts.is_empty() {
            return Err(Failure::because(format!(
                "{}: there is no file in this folder; name the folder with the pile",
                self.pile.display()
            )));
        }
        let (examples, mut troubles) = labelled::photos(&self.examples, "examples")?;
        let (pile, unreadable) = photos::embed(&self.pile, &parts, "pile")?;
        troubles.extend(labelled::within(&self.pile, unreadable));
        troubles.iter().for_each(|trouble| console::say(trouble));
        repeated_in_pile(&pile);

        let encoder = PhotoEncoder::bundled().map_err(Failure::because)?;
        let space = Space::new(encoder.dimension(), encoder.non_negative()).map_err(Failure::because)?;
        let (examples, disputed) = labelled::without_disputed(examples);
        Ok(Material {
            encoder: encoder.identity().to_owned(),
            space,
            pile: pile.into_iter().map(|photo| Item { name: photo.name, embedding: photo.embedding }).collect(),
            examples,
            troubles: troubles.len() + disputed,
        })
    }

    fn read_vectors(&self) -> Result<Material, Failure> {
        let Some(labels) = &self.labels else {
            return Err(Failure::because(
                "examples in an .npy file need --labels FILE.csv, one category a line in the same order",
            ));
        };
        let pile = vectors::read(&self.pile)?;
        let examples = vectors::read(&self.examples)?;
        if pile.ncols() != examples.ncols() {
            return Err(Failure::because(format!(
                "the pile's vectors have {} numbers and the examples' {}; use vectors of one encoder",
                pile.ncols(),
                examples.ncols()
            )));
        }
        let negative = pile.iter().chain(&examples).any(|&x| x < 0.0);
        let space = Space::new(pile.ncols(), !negative && !self.signed).map_err(Failure::because)?;
        let examples = labelled::vectors(&examples, &self.examples, labels)?;
        Ok(Material {
            encoder: "vectors".into(),
            space,
            pile: labelled::items(&pile, &self.pile),
            examples,
            troubles: 0,
        })
    }

    fn write(&self, material: &Material, trays: &BTreeMap<String, usize>, items: Vec<Sorted>) -> Result<(), Failure> {
        let mut counts: BTreeMap<&str, usize> = trays.keys().map(|name| (name.as_str(), 0)).collect();
        for item in &items {
            *counts.entry(item.tray).or_default() += 1;
        }
        let put = |to: &mut dyn std::io::Write| -> Result<(), String> {
            if self.json {
                let report = Report {
                    encoder: &material.encoder,
                    learner: self.learner,
                    seed: self.seed,
                    trays: counts.clone(),
                    unreadable: material.troubles,
                    items: items
                        .iter()
                        .map(|i| Sorted { item: i.item, tray: i.tray, probability: i.probability })
                        .collect(),
                };
                serde_json::to_writer_pretty(&mut *to, &report).map_err(|error| error.to_string())?;
                return writeln!(to).map_err(|error| error.to_string());
            }
            let header = ["item", "tray", "probability"].map(str::to_owned).to_vec();
            let row = |i: &Sorted| vec![output::cell(i.item), output::cell(i.tray), format!("{:.4}", i.probability)];
            output::table(to, std::iter::once(header).chain(items.iter().map(row)))
        };
        match &self.out {
            Some(path) => output::write_whole(path, |file| put(file))?,
            None => {
                let mut text = Vec::new();
                put(&mut text).and_then(|()| output::show(&text)).map_err(Failure::because)?;
            }
        }
        let unsure = items.iter().filter(|item| item.probability < 0.5).count();
        let shares: Vec<String> = counts.iter().map(|(tray, count)| format!("{tray} {count}")).collect();
        console::say(&format!("{} items sorted: {}", items.len(), shares.join(", ")));
        if unsure > 0 {
            console::say(&format!(
                "{unsure} of them less than half sure; a few more examples of the trays in question help most"
            ));
        }
        if let Some(path) = &self.out {
            console::say(&format!("the result is in {}", path.display()));
        }
        Ok(())
    }
}

/// Reads a starter file.
pub fn read_starter(path: &Path) -> Result<Starter, Failure> {
    let named = |reason: String| Failure::because(format!("{}: {reason}", path.display()));
    let file = std::fs::read(path).map_err(|error| named(format!("it can't be read ({error})")))?;
    Starter::read(&file).map_err(|error| named(error.to_string()))
}

/// Says which photos of the pile are the same file; they are sorted all the same.
fn repeated_in_pile(pile: &[photos::Photo]) {
    let mut first: HashMap<&str, &str> = HashMap::new();
    for photo in pile {
        match first.get(photo.fingerprint.as_str()) {
            Some(earlier) => console::say(&format!("{}: the same file as {earlier}", photo.name)),
            None => {
                first.insert(&photo.fingerprint, &photo.name);
            }
        }
    }
}

/// Adds the pile; gives the number and name of each item that could be added.
fn add_pile(sorter: &mut Sorter, material: &mut Material) -> Vec<(usize, String)> {
    let mut added = Vec::with_capacity(material.pile.len());
    for item in &material.pile {
        match sorter.add_item(&item.embedding) {
            Ok(number) => added.push((number, item.name.clone())),
            Err(error) => {
                console::say(&format!("item {} of the pile: {error}", item.name));
                material.troubles += 1;
            }
        }
    }
    added
}

/// Adds the examples to the trays of their categories; gives each tray's number.
fn add_examples(sorter: &mut Sorter, material: &mut Material) -> Result<BTreeMap<String, usize>, Failure> {
    let mut trays = BTreeMap::new();
    for Example { item, category } in &material.examples {
        let number = match sorter.add_item(&item.embedding) {
            Ok(number) => number,
            Err(error) => {
                console::say(&format!("example {}: {error}", item.name));
                material.troubles += 1;
                continue;
            }
        };
        let named = |error| Failure::because(format!("category “{category}”: {error}"));
        let tray = match trays.get(category) {
            Some(&tray) => tray,
            None => {
                let tray = sorter.add_tray(category).map_err(named)?;
                trays.insert(category.clone(), tray);
                tray
            }
        };
        sorter.answer(number, tray).map_err(named)?;
    }
    if trays.len() < 2 {
        let there = match trays.keys().next() {
            Some(only) => format!("there is only “{only}”"),
            None => "there is none".to_owned(),
        };
        return Err(Failure::because(format!(
            "sorting needs examples of at least two categories, and {there}; add examples of another one"
        )));
    }
    Ok(trays)
}
