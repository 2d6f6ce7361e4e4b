//! `kenspeckle sort`: a pile and a few examples in, every item's tray out.

use std::{
    collections::{BTreeMap, HashMap},
    path::{Path, PathBuf},
    sync::Arc,
};

use clap::Args;
use kenspeckle::{
    LearnerKind, Settings, Sorter, Starter,
    table::{Format, Table},
};
use serde::Serialize;

use crate::{
    console::{self, Failure},
    labelled::Example,
    material::{self, Labelled, Pile, Reading},
    output,
};

/// Sort a pile by a few examples of each category.
///
/// Prints a table with one line for each item of the pile: its name, the tray it belongs in, and how probable that is
/// (0 to 1). A pile that is a table comes back with all of its columns and these two more. Two to five examples of each
/// category are a good start; sort again with more where the result is not sure.
#[derive(Args)]
pub struct Sort {
    /// The pile: a folder of photos (JPEG, PNG, WebP, GIF, BMP, in any depth); notes, one a line in a .txt file, in a column
    /// of a table (.csv, .tsv, .jsonl), or each in a .txt file of its own in a folder; or an .npy file of vectors.
    pile: PathBuf,
    /// The examples, of the same kind: a folder that holds one folder of photos or of .txt files for each category, named like
    /// it, or a .txt file for each category with a note a line; a table with a column of categories; or an .npy file.
    #[arg(long)]
    examples: PathBuf,
    #[command(flatten)]
    reading: Reading,
    /// For examples in an .npy file: a file with one category a line, in the same order.
    #[arg(long, value_name = "FILE.csv")]
    labels: Option<PathBuf>,
    /// How to learn: auto weighs the others by how well each does on the examples.
    #[arg(long, default_value = "auto", value_name = "auto|prototype|ridge|gradient")]
    learner: LearnerKind,
    /// Seed of everything that is drawn: the same seed gives the same result.
    #[arg(long, default_value_t = 1)]
    seed: u64,
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

#[derive(Serialize)]
struct Sorted<'a> {
    item: &'a str,
    tray: &'a str,
    probability: f64,
    /// The row of the table it is from.
    #[serde(skip)]
    row: Option<usize>,
    /// That row's cells by column.
    #[serde(skip_serializing_if = "BTreeMap::is_empty")]
    columns: BTreeMap<&'a str, &'a str>,
}

#[derive(Serialize)]
struct Report<'a> {
    encoder: &'a str,
    learner: LearnerKind,
    seed: u64,
    trays: BTreeMap<&'a str, usize>,
    unreadable: usize,
    items: &'a [Sorted<'a>],
}

impl Sort {
    /// Runs the command and tells how many items could not be read.
    pub fn run(self) -> Result<usize, Failure> {
        let (pile, examples) =
            material::pile_and_examples(&self.pile, &self.examples, self.labels.as_deref(), &self.reading)?;
        let mut troubles = pile.troubles + examples.troubles;
        let settings =
            Settings { encoder: pile.encoder.clone(), space: pile.space, learner: self.learner, seed: self.seed };
        let mut sorter = match &self.starter {
            Some(path) => read_starter(path).and_then(|starter| {
                let other = |error| Failure::because(format!("{}: {error}", path.display()));
                Sorter::with_starter(settings, Arc::new(starter)).map_err(other)
            })?,
            None => Sorter::new(settings),
        };
        let numbers = add_pile(&mut sorter, &pile, &mut troubles);
        let trays = add_examples(&mut sorter, &examples, &mut troubles)?;
        if numbers.is_empty() {
            return Err(Failure::because(format!("{}: no item of the pile could be read", self.pile.display())));
        }
        console::go_on()?;

        let names: HashMap<usize, &str> = trays.iter().map(|(name, &tray)| (tray, name.as_str())).collect();
        let verdicts = sorter.verdicts();
        let mut items = Vec::with_capacity(numbers.len());
        for (number, index) in numbers {
            let item = &pile.items[index];
            let verdict =
                verdicts[number].as_ref().and_then(|verdict| Some((*names.get(&verdict.tray?)?, verdict.probability)));
            let (tray, probability) =
                verdict.ok_or_else(|| Failure::because(format!("{}: it got no tray", item.name)))?;
            let columns = match (&pile.table, item.row) {
                (Some(table), Some(row)) if self.json => columns_of(table, row),
                _ => BTreeMap::new(),
            };
            items.push(Sorted { item: &item.name, tray, probability, row: item.row, columns });
        }
        self.write(&pile, &trays, &items, troubles)?;
        Ok(troubles)
    }

    fn write(
        &self,
        pile: &Pile,
        trays: &BTreeMap<String, usize>,
        items: &[Sorted],
        troubles: usize,
    ) -> Result<(), Failure> {
        let mut counts: BTreeMap<&str, usize> = trays.keys().map(|name| (name.as_str(), 0)).collect();
        for item in items {
            *counts.entry(item.tray).or_default() += 1;
        }
        let put = |to: &mut dyn std::io::Write| -> Result<(), String> {
            if self.json {
                let report = Report {
                    encoder: &pile.encoder,
                    learner: self.learner,
                    seed: self.seed,
                    trays: counts.clone(),
                    unreadable: troubles,
                    items,
                };
                serde_json::to_writer_pretty(&mut *to, &report).map_err(|error| error.to_string())?;
                return writeln!(to).map_err(|error| error.to_string());
            }
            if let Some(table) = &pile.table {
                return output::table(to, table_rows(table, items));
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

/// A row's cells by column.
fn columns_of(table: &Table, row: usize) -> BTreeMap<&str, &str> {
    table.columns.iter().zip(&table.rows[row].cells).map(|(name, cell)| (name.as_str(), cell.as_str())).collect()
}

/// Every row of the table as it came, with its tray and probability; both are empty where the note could not be read.
fn table_rows<'a>(table: &'a Table, items: &'a [Sorted]) -> impl Iterator<Item = Vec<String>> + 'a {
    let free = |name: &str| {
        let mut name = name.to_owned();
        while table.columns.contains(&name) {
            name.push('\'');
        }
        name
    };
    let header = table.columns.iter().cloned().chain(["tray", "probability"].map(free)).collect();
    let by_row: HashMap<usize, &Sorted> = items.iter().filter_map(|item| Some((item.row?, item))).collect();
    // What was a table is handed back cell by cell as it came; a line becomes a cell only here.
    let kept = |cell: &String| if table.format == Format::Lines { output::cell(cell) } else { cell.clone() };
    let rows = (0..table.rows.len()).map(move |row| {
        let (tray, probability) = match by_row.get(&row) {
            Some(sorted) => (output::cell(sorted.tray), format!("{:.4}", sorted.probability)),
            None => (String::new(), String::new()),
        };
        table.rows[row].cells.iter().map(kept).chain([tray, probability]).collect()
    });
    std::iter::once(header).chain(rows)
}

/// Adds the pile; gives the number in the sorter and the position in the pile of each item that could be added.
fn add_pile(sorter: &mut Sorter, pile: &Pile, troubles: &mut usize) -> Vec<(usize, usize)> {
    let mut added = Vec::with_capacity(pile.items.len());
    for (index, item) in pile.items.iter().enumerate() {
        match sorter.add_item(&item.embedding) {
            Ok(number) => added.push((number, index)),
            Err(error) => {
                console::say(&format!("item {} of the pile: {error}", item.name));
                *troubles += 1;
            }
        }
    }
    added
}

/// Adds the examples to the trays of their categories; gives each tray's number.
fn add_examples(
    sorter: &mut Sorter,
    labelled: &Labelled,
    troubles: &mut usize,
) -> Result<BTreeMap<String, usize>, Failure> {
    let mut trays = BTreeMap::new();
    for Example { item, category } in &labelled.examples {
        let number = match sorter.add_item(&item.embedding) {
            Ok(number) => number,
            Err(error) => {
                console::say(&format!("example {}: {error}", item.name));
                *troubles += 1;
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
