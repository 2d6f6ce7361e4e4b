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
    trust::{Reason, Terms},
};
use serde::Serialize;

use crate::{
    console::{self, Failure},
    labelled::Example,
    material::{self, Pile, Reading},
    output,
};

/// Sort a pile by a few examples of each category.
///
/// Prints a table with one line for each item of the pile: its name, the tray it belongs in, how probable that is
/// (0 to 1), the trays that are plausible, and why it is set aside, if it is: then it has no tray. A pile that is a table comes
/// back with all of its columns and these four more. Two to five examples of each category are a good start; sort again with
/// more where the result is not sure.
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
    /// How sure plausible trays shall be: the right one is among them about as often as this says, for items like the examples.
    #[arg(long, default_value_t = Terms::default().confidence(), value_name = "SHARE")]
    confidence: f64,
    /// About how many of the items that do belong in a tray may be set aside, so that what was never shown is not forced into
    /// one; 0 sets nothing aside.
    #[arg(long, default_value_t = Terms::default().set_aside_share(), value_name = "SHARE")]
    set_aside_share: f64,
    /// Set aside every item that has not exactly one plausible tray, too.
    #[arg(long)]
    only_sure: bool,
    /// Write the table to this file instead of showing it.
    #[arg(long, value_name = "FILE.csv")]
    out: Option<PathBuf>,
    /// Write JSON instead of a table.
    #[arg(long)]
    json: bool,
}

/// What the table gains.
const COLUMNS: [&str; 4] = ["tray", "probability", "plausible", "set aside"];

#[derive(Serialize)]
struct Sorted<'a> {
    item: &'a str,
    /// None for an item that is set aside.
    tray: Option<&'a str>,
    probability: f64,
    plausible: Vec<&'a str>,
    set_aside: Option<Reason>,
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
    terms: Terms,
    trays: BTreeMap<&'a str, usize>,
    set_aside: usize,
    unreadable: usize,
    items: &'a [Sorted<'a>],
}

impl Sort {
    /// Runs the command and tells how many items could not be read.
    pub fn run(self) -> Result<usize, Failure> {
        let terms = Terms::new(self.confidence, self.set_aside_share, self.only_sure).map_err(Failure::because)?;
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
        sorter.set_terms(terms);
        let numbers = add_pile(&mut sorter, &pile, &mut troubles);
        let (trays, _) = add_examples(&mut sorter, &examples.examples, &mut troubles)?;
        if numbers.is_empty() {
            return Err(Failure::because(format!("{}: no item of the pile could be read", self.pile.display())));
        }
        console::go_on()?;

        let names: HashMap<usize, &str> = trays.iter().map(|(name, &tray)| (tray, name.as_str())).collect();
        let name = |tray: usize| names.get(&tray).copied();
        let mut items = Vec::with_capacity(numbers.len());
        for (number, index) in numbers {
            let item = &pile.items[index];
            let verdict = sorter.verdict(number).map_err(Failure::because)?;
            let plausible = sorter.plausible(number).map_err(Failure::because)?;
            let tray = verdict.tray.and_then(name);
            let tray = tray.ok_or_else(|| Failure::because(format!("{}: it got no tray", item.name)))?;
            let columns = match (&pile.table, item.row) {
                (Some(table), Some(row)) if self.json => columns_of(table, row),
                _ => BTreeMap::new(),
            };
            items.push(Sorted {
                item: &item.name,
                tray: verdict.set_aside.is_none().then_some(tray),
                probability: verdict.probability,
                plausible: plausible.into_iter().filter_map(name).collect(),
                set_aside: verdict.set_aside,
                row: item.row,
                columns,
            });
        }
        self.write(&pile, terms, &trays, &items, troubles)?;
        Ok(troubles)
    }

    fn write(
        &self,
        pile: &Pile,
        terms: Terms,
        trays: &BTreeMap<String, usize>,
        items: &[Sorted],
        troubles: usize,
    ) -> Result<(), Failure> {
        let mut counts: BTreeMap<&str, usize> = trays.keys().map(|name| (name.as_str(), 0)).collect();
        for tray in items.iter().filter_map(|item| item.tray) {
            *counts.entry(tray).or_default() += 1;
        }
        let set_aside = items.iter().filter(|item| item.set_aside.is_some()).count();
        let put = |to: &mut dyn std::io::Write| -> Result<(), String> {
            if self.json {
                let report = Report {
                    encoder: &pile.encoder,
                    learner: self.learner,
                    seed: self.seed,
                    terms,
                    trays: counts.clone(),
                    set_aside,
                    unreadable: troubles,
                    items,
                };
                serde_json::to_writer_pretty(&mut *to, &report).map_err(|error| error.to_string())?;
                return writeln!(to).map_err(|error| error.to_string());
            }
            if let Some(table) = &pile.table {
                return output::table(to, table_rows(table, items));
            }
            let header = std::iter::once("item").chain(COLUMNS).map(str::to_owned).collect();
            let row = |i: &Sorted| std::iter::once(output::cell(i.item)).chain(i.cells()).collect();
            output::table(to, std::iter::once(header).chain(items.iter().map(row)))
        };
        match &self.out {
            Some(path) => output::write_whole(path, |file| put(file))?,
            None => {
                let mut text = Vec::new();
                put(&mut text).and_then(|()| output::show(&text)).map_err(Failure::because)?;
            }
        }
        let unsure = items.iter().filter(|item| item.tray.is_some() && item.probability < 0.5).count();
        let shares: Vec<String> = counts.iter().map(|(tray, count)| format!("{tray} {count}")).collect();
        console::say(&format!("{} items sorted: {}", items.len() - set_aside, shares.join(", ")));
        if set_aside > 0 {
            console::say(&format!("{set_aside} set aside; the last column of the table says why"));
        }
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

/// Every row of the table as it came, with what was found; that is empty where the note could not be read.
fn table_rows<'a>(table: &'a Table, items: &'a [Sorted]) -> impl Iterator<Item = Vec<String>> + 'a {
    let free = |name: &str| {
        let mut name = name.to_owned();
        while table.columns.contains(&name) {
            name.push('\'');
        }
        name
    };
    let header = table.columns.iter().cloned().chain(COLUMNS.map(free)).collect();
    let by_row: HashMap<usize, &Sorted> = items.iter().filter_map(|item| Some((item.row?, item))).collect();
    // What was a table is handed back cell by cell as it came; a line becomes a cell only here.
    let kept = |cell: &String| if table.format == Format::Lines { output::cell(cell) } else { cell.clone() };
    let rows = (0..table.rows.len()).map(move |row| {
        let found = by_row.get(&row).map_or_else(Default::default, |sorted| sorted.cells());
        table.rows[row].cells.iter().map(kept).chain(found).collect()
    });
    std::iter::once(header).chain(rows)
}

impl Sorted<'_> {
    /// What a table says of it, in the order of [`COLUMNS`].
    fn cells(&self) -> [String; 4] {
        [
            output::cell(self.tray.unwrap_or_default()),
            format!("{:.4}", self.probability),
            output::cell(&self.plausible.join("; ")),
            self.set_aside.map_or_else(String::new, |reason| reason.words().to_owned()),
        ]
    }
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

/// The number of each tray by its name, and the name of each example by its item number.
pub type Added = (BTreeMap<String, usize>, BTreeMap<usize, String>);

/// Adds the examples to the trays of their categories; counts those that could not be added as troubles.
pub fn add_examples(sorter: &mut Sorter, examples: &[Example], troubles: &mut usize) -> Result<Added, Failure> {
    let (mut trays, mut items) = (BTreeMap::new(), BTreeMap::new());
    for Example { item, category } in examples {
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
        items.insert(number, item.name.clone());
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
    Ok((trays, items))
}
