//! `kenspeckle spot-check`: a random sample of a sorted pile, and the sentence that it backs.

use std::{
    collections::{BTreeSet, HashMap},
    path::{Path, PathBuf},
};

use clap::Args;
use kenspeckle::trust::spot_check::{Judgement, Plan, Sorted, SpotCheck, Statement};

use crate::{
    console::{self, Failure},
    output,
};

/// Look at a random sample of a sorted pile and state its error rate.
///
/// First draws the items to look at into a table with a column `right`. Look at each item and write there yes, no, the name of
/// the tray where it belongs, or ? if nobody can tell. Then give the table with --judged: the program says what it shows. The
/// statement is about this very result with the corrections of the sample; decide on tolerance and confidence before you look,
/// and look at every item that was drawn.
#[derive(Args)]
pub struct SpotCheckCommand {
    /// The result of `kenspeckle sort`: a table with a column tray. Items without a tray don't count.
    results: PathBuf,
    /// The share of sorted items that may be in the wrong tray.
    #[arg(long, default_value_t = 0.05, value_name = "SHARE")]
    tolerance: f64,
    /// How sure the statement shall be.
    #[arg(long, default_value_t = 0.95, value_name = "SHARE")]
    confidence: f64,
    /// How many of the items looked at may be wrong: more to look at, but one mistake does not spoil it.
    #[arg(long, default_value_t = 0, value_name = "NUMBER")]
    allowed: usize,
    /// Draw from every tray its share, at least one item.
    #[arg(long)]
    by_tray: bool,
    /// Seed of the draw [default: another one each time; it is written into the table].
    #[arg(long)]
    seed: Option<u64>,
    /// Write the sample to this file instead of showing it.
    #[arg(long, value_name = "FILE.csv", conflicts_with = "judged")]
    out: Option<PathBuf>,
    /// The sample with the column `right` filled in.
    #[arg(long, value_name = "FILE.csv")]
    judged: Option<PathBuf>,
    /// With --judged: write the result with its corrections to this file; items that were wrong without another tray named
    /// have none there.
    #[arg(long, value_name = "FILE.csv", requires = "judged")]
    corrected: Option<PathBuf>,
    /// With --judged: write what was found as JSON instead of a sentence.
    #[arg(long, requires = "judged")]
    json: bool,
}

/// A table that was read, with the places of the columns that matter.
struct Table {
    header: csv::StringRecord,
    rows: Vec<csv::StringRecord>,
}

impl Table {
    fn read(path: &Path) -> Result<Self, Failure> {
        let trouble = |reason: String| Failure::because(format!("{}: {reason}", path.display()));
        let bytes = std::fs::read(path).map_err(|error| trouble(format!("it can't be read ({error})")))?;
        let bytes = bytes.strip_prefix("\u{feff}".as_bytes()).unwrap_or(&bytes);
        let mut reader = csv::Reader::from_reader(bytes);
        let damaged = |error: csv::Error| trouble(format!("it is no table ({error})"));
        let header = reader.headers().map_err(damaged)?.clone();
        let rows = reader.records().collect::<Result<_, _>>().map_err(damaged)?;
        Ok(Self { header, rows })
    }

    /// The last column of this name: a table that was sorted may have had one before.
    fn last_column(&self, path: &Path, name: &str) -> Result<usize, Failure> {
        self.header.iter().collect::<Vec<_>>().iter().rposition(|column| column.trim() == name).ok_or_else(|| {
            Failure::because(format!("{}: it has no column “{name}”; name it in the first line", path.display()))
        })
    }
}

/// The sorted items of a result, by position, and the names behind the numbers.
struct Results {
    table: Table,
    tray_column: usize,
    /// What else tells the person which item it is: columns of the table that was sorted.
    shown: Vec<usize>,
    /// The item of every row: its name or, in a table that was sorted, the row's number from 1.
    items: Vec<String>,
    trays: Vec<String>,
    sorting: Vec<Sorted>,
}

impl Results {
    fn read(path: &Path) -> Result<Self, Failure> {
        let table = Table::read(path)?;
        // A table that had such a column before it was sorted has got another one, with an apostrophe.
        let is_tray = |name: &str| name.trim_end_matches('\'') == "tray";
        let header: Vec<&str> = table.header.iter().collect();
        let tray_column =
            header.iter().rposition(|name| is_tray(name)).map_or_else(|| table.last_column(path, "tray"), Ok)?;
        let found = &header[tray_column..];
        let sorted_photos = found.len() == table.header.len() - 1 && &table.header[0] == "item";
        let items: Vec<String> = match sorted_photos {
            true => table.rows.iter().map(|row| row[0].to_owned()).collect(),
            false => (1..=table.rows.len()).map(|row| row.to_string()).collect(),
        };
        let shown = if sorted_photos { Vec::new() } else { (0..tray_column).collect() };
        let mut seen = BTreeSet::new();
        if let Some(twice) = items.iter().find(|item| !seen.insert(item.as_str())) {
            return Err(Failure::because(format!(
                "{}: the item “{twice}” is there twice; every item must have a line of its own",
                path.display()
            )));
        }
        let names: BTreeSet<&str> = table.rows.iter().map(|row| &row[tray_column]).filter(|t| !t.is_empty()).collect();
        let trays: Vec<String> = names.into_iter().map(str::to_owned).collect();
        let place = |row: &csv::StringRecord| trays.binary_search_by(|tray| tray.as_str().cmp(&row[tray_column])).ok();
        let sorting =
            table.rows.iter().enumerate().filter_map(|(item, row)| Some(Sorted { item, tray: place(row)? })).collect();
        Ok(Self { table, tray_column, shown, items, trays, sorting })
    }
}

impl SpotCheckCommand {
    /// Runs the command; nothing is ever left unread.
    pub fn run(self) -> Result<usize, Failure> {
        let plan = Plan::new(self.tolerance, self.confidence, self.allowed, self.by_tray).map_err(Failure::because)?;
        let results = Results::read(&self.results)?;
        match &self.judged {
            None => self.draw(plan, &results)?,
            Some(judged) => self.state(plan, results, judged)?,
        }
        Ok(0)
    }

    /// What was drawn and how, so that the table itself tells.
    fn recipe(&self, seed: u64) -> String {
        let by_tray = if self.by_tray { ", by tray" } else { "" };
        format!(
            "seed {seed}, tolerance {}, confidence {}, allowed {}{by_tray}",
            self.tolerance, self.confidence, self.allowed
        )
    }

    fn draw(&self, plan: Plan, results: &Results) -> Result<(), Failure> {
        let seed = self.seed.unwrap_or_else(|| {
            let since = std::time::SystemTime::now().duration_since(std::time::UNIX_EPOCH);
            // Ten digits are easy to copy and enough that no two draws are alike.
            since.map_or(1, |since| (since.as_nanos() % 10_000_000_000) as u64)
        });
        let check = SpotCheck::draw(plan, results.sorting.clone(), seed).map_err(Failure::because)?;
        let recipe = self.recipe(seed);
        let shown = |row: &csv::StringRecord| -> Vec<String> {
            results.shown.iter().map(|&column| row[column].to_owned()).collect()
        };
        let whole = |first: &str, shown: Vec<String>, rest: [&str; 3]| -> Vec<String> {
            std::iter::once(first.to_owned()).chain(shown).chain(rest.map(str::to_owned)).collect()
        };
        let header = whole("item", shown(&results.table.header), ["tray", "right", "draw"]);
        let rows = check.sample().map(|(sorted, _)| {
            let row = &results.table.rows[sorted.item];
            whole(&results.items[sorted.item], shown(row), [&results.trays[sorted.tray], "", &recipe])
        });
        let mut text = Vec::new();
        output::table(&mut text, std::iter::once(header).chain(rows)).map_err(Failure::because)?;
        let looked_at = check.left();
        match &self.out {
            Some(path) => output::write_whole(path, |file| {
                std::io::Write::write_all(file, &text).map_err(|error| error.to_string())
            })?,
            None => output::show(&text).map_err(Failure::because)?,
        }
        let file = self.out.as_ref().map_or("FILE.csv".into(), |path| path.display().to_string());
        console::say(&format!(
            "look at these {looked_at} of {} sorted items (seed {seed}); write yes, no, the right tray or ? into the column \
             “right”, then run the same command with --judged {file} in place of --out",
            results.sorting.len()
        ));
        Ok(())
    }

    fn state(&self, plan: Plan, mut results: Results, path: &Path) -> Result<(), Failure> {
        let trouble = |reason: String| Failure::because(format!("{}: {reason}", path.display()));
        let table = Table::read(path)?;
        let (item, right, draw) = (0, table.last_column(path, "right")?, table.last_column(path, "draw")?);
        let recipe = table.rows.first().map(|row| row[draw].to_owned()).unwrap_or_default();
        let seed = recipe.strip_prefix("seed ").and_then(|rest| rest.split(',').next()?.parse().ok());
        let seed: u64 = seed.ok_or_else(|| {
            trouble("its column “draw” does not say how it was drawn; fill in the table that `spot-check` wrote".into())
        })?;
        if recipe != self.recipe(seed) || self.seed.is_some_and(|own| own != seed) {
            return Err(trouble(format!(
                "it was drawn with {recipe}, and the command line now says {}; give the same",
                self.recipe(self.seed.unwrap_or(seed))
            )));
        }
        let mut check = SpotCheck::draw(plan, results.sorting.clone(), seed).map_err(Failure::because)?;
        let numbers: HashMap<&str, usize> =
            results.items.iter().enumerate().map(|(number, item)| (item.as_str(), number)).collect();
        for row in &table.rows {
            let name = &row[item];
            let Some(&number) = numbers.get(name) else {
                return Err(trouble(format!(
                    "the item “{name}” is not in {}; judge the sample of this result",
                    self.results.display()
                )));
            };
            let judgement = match row[right].trim() {
                "" => return Err(trouble(format!("the item “{name}” is not judged; a statement needs all of them"))),
                "?" => Judgement::Untold,
                word if word.eq_ignore_ascii_case("yes") || word.eq_ignore_ascii_case("y") => Judgement::Right,
                word if word.eq_ignore_ascii_case("no") || word.eq_ignore_ascii_case("n") => Judgement::Wrong,
                tray => {
                    let known = results.trays.iter().position(|known| known == tray);
                    Judgement::Belongs(known.unwrap_or_else(|| {
                        results.trays.push(tray.to_owned());
                        results.trays.len() - 1
                    }))
                }
            };
            check.judge(number, Some(judgement)).map_err(|_| {
                trouble(format!(
                    "the item “{name}” was not drawn from {}; the result has changed since, so draw anew",
                    self.results.display()
                ))
            })?;
        }
        let statement = check.statement(&today()).map_err(Failure::because)?;
        if let Some(path) = &self.corrected {
            write_corrected(path, &results, &check)?;
        }
        self.show(&results, &statement)
    }

    fn show(&self, results: &Results, statement: &Statement) -> Result<(), Failure> {
        let text = if self.json {
            let mut value = serde_json::to_value(statement).map_err(Failure::because)?;
            value["sentence"] = statement.to_string().into();
            value["holds"] = statement.holds().into();
            for tray in value["trays"].as_array_mut().into_iter().flatten() {
                tray["tray"] =
                    tray["tray"].as_u64().map_or("".into(), |number| results.trays[number as usize].as_str().into());
            }
            serde_json::to_string_pretty(&value).map_err(Failure::because)?
        } else {
            statement.to_string()
        };
        output::show(format!("{text}\n").as_bytes()).map_err(Failure::because)?;
        if !statement.holds() {
            console::say(&format!(
                "that is more than the {} % tolerated: answer more items, sort again, and draw a new sample",
                statement.tolerance * 100.0
            ));
        }
        Ok(())
    }
}

/// The result with the sample's corrections.
fn write_corrected(path: &Path, results: &Results, check: &SpotCheck) -> Result<(), Failure> {
    let trays: HashMap<usize, Option<usize>> = check.corrected().into_iter().collect();
    let header: Vec<String> = results.table.header.iter().map(str::to_owned).collect();
    let rows = results.table.rows.iter().enumerate().map(|(number, row)| {
        let mut cells: Vec<String> = row.iter().map(str::to_owned).collect();
        if let Some(tray) = trays.get(&number) {
            cells[results.tray_column] = tray.map_or(String::new(), |tray| output::cell(&results.trays[tray]));
        }
        cells
    });
    output::write_whole(path, |file| output::table(file, std::iter::once(header).chain(rows)))
}

/// Today's date in UTC, as ISO 8601 writes it.
fn today() -> String {
    time::OffsetDateTime::now_utc().date().to_string()
}
