//! `kenspeckle assess`: examples in, how well they sort each other out.

use std::{collections::BTreeMap, fmt::Write, path::PathBuf, sync::Arc};

use clap::Args;
use kenspeckle::{
    LearnerKind, Settings, Sorter,
    trust::{
        assessment::{Assessment, Share},
        doubt::{Doubt, Why},
        learning_curve::Projection,
    },
};

use crate::{
    console::{self, Failure},
    material::{self, Reading},
    output,
    sort::{add_examples, read_starter},
};

/// Find out how far your examples can be relied on, and which of them may be in the wrong folder.
///
/// Each example is judged by the others, as if it were an item to sort: how many come out right, with the interval that so few
/// can promise, what is confused with what, whether the probabilities keep their word, and about how many more examples
/// it takes. Then it lists the examples that the others contradict, the gravest first.
#[derive(Args)]
pub struct Assess {
    /// A folder that holds one folder of photos or of .txt files for each category, named like it, or a .txt file for each
    /// category with a note a line; a table of notes with a column of categories; or an .npy file of vectors.
    examples: PathBuf,
    #[command(flatten)]
    reading: Reading,
    /// For an .npy file: a file with one category a line, in the same order.
    #[arg(long, value_name = "FILE.csv")]
    labels: Option<PathBuf>,
    /// How to learn: auto weighs the others by how well each does on the examples.
    #[arg(long, default_value = "auto", value_name = "auto|prototype|ridge|gradient")]
    learner: LearnerKind,
    /// A starter from past piles of the same kind (`kenspeckle learn` makes it).
    #[arg(long, value_name = "FILE.starter")]
    starter: Option<PathBuf>,
    /// The share sorted right that the number of further examples is told for.
    #[arg(long, default_value = "0.95", value_name = "SHARE", value_parser = target)]
    target: f64,
    /// Seed of everything that is drawn: the same seed gives the same result.
    #[arg(long, default_value_t = 1)]
    seed: u64,
    /// Write JSON instead of text.
    #[arg(long)]
    json: bool,
}

fn target(text: &str) -> Result<f64, String> {
    let share = text.trim().parse().ok().filter(|share| (0.01..=0.999).contains(share));
    share.ok_or_else(|| "give a share from 0.01 to 0.999".to_owned())
}

/// What things are called.
struct Names {
    trays: BTreeMap<usize, String>,
    items: BTreeMap<usize, String>,
}

impl Assess {
    /// Runs the command and tells how many items could not be read.
    pub fn run(self) -> Result<usize, Failure> {
        let read = material::labelled(&self.examples, self.labels.as_deref(), &self.reading, "examples")?;
        let mut troubles = read.troubles;
        let settings = Settings { encoder: read.encoder, space: read.space, learner: self.learner, seed: self.seed };
        let mut sorter = match &self.starter {
            Some(path) => read_starter(path).and_then(|starter| {
                let other = |error| Failure::because(format!("{}: {error}", path.display()));
                Sorter::with_starter(settings, Arc::new(starter)).map_err(other)
            })?,
            None => Sorter::new(settings),
        };
        let (trays, items) = add_examples(&mut sorter, &read.examples, &mut troubles)?;
        let names = Names { trays: trays.into_iter().map(|(name, tray)| (tray, name)).collect(), items };
        console::go_on()?;
        let Some(assessment) = sorter.assessment() else {
            return Err(Failure::because("fewer than two categories have an example"));
        };
        let doubts = sorter.doubts();
        let projection = assessment.curve.as_ref().map(|curve| curve.more_answers(self.target));
        let text = if self.json {
            json(&assessment, projection, &doubts, &names)?
        } else {
            text(&assessment, projection, &doubts, &names)
        };
        output::show(text.as_bytes()).map_err(Failure::because)?;
        Ok(troubles)
    }
}

fn percent(share: f64) -> String {
    format!("{:.1} %", 100.0 * share)
}

fn share(share: &Share) -> String {
    let Some(value) = share.value else { return "not known yet".into() };
    format!(
        "{} of {} right, {} (95 %: {} to {})",
        share.right,
        share.judged,
        percent(value),
        percent(share.wilson.low),
        percent(share.wilson.high)
    )
}

fn text(assessment: &Assessment, projection: Option<Projection>, doubts: &[Doubt], names: &Names) -> String {
    let tray = |number: &usize| names.trays.get(number).map_or("", String::as_str);
    let item = |number: &usize| names.items.get(number).map_or("", String::as_str);
    let mut text = format!(
        "{} examples in {} categories, each judged by the others: {}\n",
        assessment.answers,
        assessment.trays.len(),
        share(&assessment.share)
    );
    if assessment.share.judged > 0 {
        let _ = writeln!(
            text,
            "what so many can promise for items like them: at least {} right (95 %, Clopper and Pearson)",
            percent(assessment.share.exact.low)
        );
    }
    if let Some(calibration) = &assessment.calibration {
        let _ = writeln!(
            text,
            "probabilities: off by {} on average (expected calibration error); Brier score {:.3}, log loss {:.3}",
            percent(calibration.error),
            calibration.brier,
            calibration.log_loss
        );
    }
    text.push_str("\nBy category:\n");
    for one in &assessment.trays {
        let _ = writeln!(text, "  {}: {}", tray(&one.tray), share(&one.share));
    }
    if !assessment.unknown.is_empty() {
        let unknown: Vec<&str> = assessment.unknown.iter().map(tray).collect();
        let _ = writeln!(text, "\nNothing can be known yet of categories with one example: {}", unknown.join(", "));
    }
    if !assessment.confusions.is_empty() {
        text.push_str("\nConfused:\n");
        for pair in &assessment.confusions {
            let items: Vec<&str> = pair.items.iter().map(item).collect();
            let _ = writeln!(text, "  {} taken for {}: {}", tray(&pair.tray), tray(&pair.taken_for), items.join(", "));
        }
    }
    match projection {
        Some(projection) => {
            let _ = writeln!(text, "\nTo sort {} right: {}", percent(projection.target), more(&projection));
        }
        None => text.push_str("\nHow many more examples a target takes can't be told before a category has three.\n"),
    }
    if !doubts.is_empty() {
        text.push_str("\nPerhaps in the wrong folder, the gravest first:\n");
        for doubt in doubts {
            let why = match doubt.why {
                Why::Contradicted => "the others speak for it".to_owned(),
                Why::Duplicate { other } => format!("all but the same as {}", item(&other)),
                Why::Changed => "answered so before".to_owned(),
            };
            let _ = writeln!(
                text,
                "  {}: {}, rather {} ({why})",
                item(&doubt.item),
                tray(&doubt.tray),
                tray(&doubt.rather)
            );
        }
    }
    text
}

fn more(projection: &Projection) -> String {
    match (projection.low, projection.likely, projection.high) {
        (_, Some(0.0), Some(0.0)) => "the examples there are do".to_owned(),
        (low, Some(likely), Some(high)) => format!("about {likely} more examples in all ({low} to {high})"),
        (low, Some(likely), None) => {
            format!("about {likely} more examples in all (at least {low}; it may also take very many more)")
        }
        (low, None, _) => format!("at least {low} more examples in all; how many can't be told from these"),
    }
}

fn json(
    assessment: &Assessment,
    projection: Option<Projection>,
    doubts: &[Doubt],
    names: &Names,
) -> Result<String, Failure> {
    let mut value = serde_json::to_value(assessment).map_err(Failure::because)?;
    value["projection"] = serde_json::to_value(projection).map_err(Failure::because)?;
    value["doubts"] = serde_json::to_value(doubts).map_err(Failure::because)?;
    name(&mut value, names);
    Ok(serde_json::to_string_pretty(&value).map_err(Failure::because)? + "\n")
}

/// Puts names in the place of numbers.
fn name(value: &mut serde_json::Value, names: &Names) {
    let named = |number: &serde_json::Value, of: &BTreeMap<usize, String>| {
        number.as_u64().and_then(|number| of.get(&(number as usize))).map(|name| name.as_str().into())
    };
    match value {
        serde_json::Value::Array(values) => values.iter_mut().for_each(|value| name(value, names)),
        serde_json::Value::Object(fields) => {
            for (key, value) in fields {
                let of = match key.as_str() {
                    "tray" | "takenFor" | "rather" | "unknown" => Some(&names.trays),
                    "item" | "other" | "items" => Some(&names.items),
                    _ => None,
                };
                match (of, value) {
                    (Some(of), serde_json::Value::Array(numbers)) => {
                        numbers.iter_mut().for_each(|number| {
                            if let Some(name) = named(number, of) {
                                *number = name;
                            }
                        });
                    }
                    (Some(of), number) if number.is_number() => {
                        if let Some(name) = named(number, of) {
                            *number = name;
                        }
                    }
                    (_, other) => name(other, names),
                }
            }
        }
        _ => {}
    }
}
