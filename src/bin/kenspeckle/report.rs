//! What a rehearsal found: as text for people and as JSON for programs.

use std::{collections::BTreeMap, fmt::Write};

use kenspeckle::meta::{
    episode::Design,
    rehearse::{Estimate, Summary},
};
use serde_json::{Value, json};

use crate::{console::plain, rehearse::examples};

/// How many pairs of confused categories the text names.
const PAIRS: usize = 5;

/// What a rehearsal found, and of what.
pub struct Report<'a> {
    /// The encoder's identity.
    pub encoder: &'a str,
    /// What the items are called.
    pub noun: &'a str,
    /// The categories' names by number.
    pub categories: &'a [String],
    /// The categories that took part, with their number of items.
    pub taking_part: BTreeMap<String, usize>,
    /// The categories with too few items.
    pub left_out: BTreeMap<String, usize>,
    /// How many items could not be read.
    pub unreadable: usize,
    /// What the episodes looked like.
    pub design: &'a Design,
    /// How many categories an episode had.
    pub ways: usize,
    /// The contenders' names; the others are compared with the first.
    pub contenders: Vec<&'a str>,
    /// Contenders with a starter, each with the one that differs from it in nothing else, by position.
    pub twins: Vec<(usize, usize)>,
    /// How many episodes were played.
    pub episodes: usize,
    /// The numbers.
    pub summary: Summary<'a>,
}

impl Report<'_> {
    fn row(&self, name: &str, cell: impl Fn(usize) -> String) -> String {
        let width = self.contenders.iter().map(|name| name.chars().count()).max().unwrap_or(0).max(LEADING.len());
        let cells: String = (0..self.design.shots().len()).map(|shot| format!("{:>15}", cell(shot))).collect();
        format!("  {name:<width$}{cells}\n")
    }

    /// Tables and what they mean, for people.
    pub fn text(&self) -> String {
        let shots = self.design.shots();
        let (noun, ways) = (self.noun, self.ways);
        let items: usize = self.taking_part.values().sum();
        let uneven = if self.design.uneven { ", unevenly spread" } else { "" };
        let mut text = format!(
            "{} times, {ways} of {} categories were drawn ({items} {noun} in all), with a few examples of each\n\
             and up to {} other {noun} of each to sort{uneven}.\n\n\
             Sorted right, in % (± half the 95 % interval):\n",
            self.episodes,
            self.taking_part.len(),
            self.design.queries,
        );
        text += &self.row(LEADING, |shot| shots[shot].to_string());
        for (position, name) in self.contenders.iter().enumerate() {
            text += &self.row(name, |shot| {
                let Estimate { mean, half_width } = self.summary.accuracy(position, shot);
                format!("{:.1} ± {:.1}", 100.0 * mean, 100.0 * half_width)
            });
        }
        if self.contenders.len() > 1 {
            let first = self.contenders[0];
            let _ = writeln!(text, "\nBetter (+) or worse (−) than {first} on the same {noun}, in points:");
            for (position, name) in self.contenders.iter().enumerate().skip(1) {
                text += &self.row(name, |shot| {
                    let Estimate { mean, half_width } = self.summary.difference(position, 0, shot);
                    format!("{} ± {:.1}", signed(100.0 * mean), 100.0 * half_width)
                });
            }
        }
        if !self.twins.is_empty() {
            let _ = writeln!(text, "\nWhat the starter adds (+) or takes (−), each learner against itself, in points:");
            for &(with, without) in &self.twins {
                text += &self.row(self.contenders[without], |shot| {
                    let Estimate { mean, half_width } = self.summary.difference(with, without, shot);
                    format!("{} ± {:.1}", signed(100.0 * mean), 100.0 * half_width)
                });
            }
        }
        text += &self.confused();
        text + &self.meaning()
    }

    fn confused(&self) -> String {
        let shots = self.design.shots();
        let (last, most) = (shots.len() - 1, shots[shots.len() - 1]);
        let confusions = self.summary.confusions(last);
        if confusions.is_empty() {
            return format!("\nWith {} of each, {} confused nothing.\n", examples(most), self.contenders[0]);
        }
        let mut text = format!(
            "\nMost often confused by {} with {} of each (share of the two that is put with the other):\n",
            self.contenders[0],
            examples(most)
        );
        for confusion in confusions.iter().take(PAIRS) {
            let (a, b) = confusion.categories;
            let _ = writeln!(
                text,
                "  {:>3.0} %  {} and {}",
                100.0 * confusion.share(),
                plain(&self.categories[a]),
                plain(&self.categories[b])
            );
        }
        text
    }

    /// One sentence for someone who reads no tables.
    fn meaning(&self) -> String {
        let shots = self.design.shots();
        // About five examples are what a person gives without much ado.
        let shot = shots.iter().rposition(|&shot| shot <= 5).unwrap_or(0);
        let right = 100.0 * self.summary.accuracy(0, shot).mean;
        format!(
            "\nWhat this means: with {} of each of {} such categories, {} puts about {right:.0} of 100 other {} where you\n\
             would; chance alone would put {:.0} there. The intervals are for these {}; others may be easier or harder.\n",
            examples(shots[shot]),
            self.ways,
            self.contenders[0],
            self.noun,
            100.0 / self.ways as f64,
            self.noun,
        )
    }

    /// The same as JSON, with every pair of confused categories.
    pub fn json(&self) -> String {
        let shots = self.design.shots();
        let interval = |estimate: Estimate, least: f64| {
            let Estimate { mean, half_width } = estimate;
            json!([(mean - half_width).max(least), (mean + half_width).min(1.0)])
        };
        let mut starter = Vec::new();
        for &(with, without) in &self.twins {
            for (at, shot) in shots.iter().enumerate() {
                let found = self.summary.difference(with, without, at);
                starter.push(json!({
                    "learner": self.contenders[without], "shot": shot, "mean": found.mean,
                    "interval": interval(found, -1.0),
                }));
            }
        }
        let mut accuracy = Vec::new();
        let mut difference = Vec::new();
        for (position, name) in self.contenders.iter().enumerate() {
            for (at, shot) in shots.iter().enumerate() {
                let found = self.summary.accuracy(position, at);
                accuracy.push(json!({
                    "learner": name, "shot": shot, "mean": found.mean, "interval": interval(found, 0.0),
                }));
                if position > 0 {
                    let found = self.summary.difference(position, 0, at);
                    difference.push(json!({
                        "learner": name, "to": self.contenders[0], "shot": shot, "mean": found.mean,
                        "interval": interval(found, -1.0),
                    }));
                }
            }
        }
        let confused: Vec<Value> = self
            .summary
            .confusions(shots.len() - 1)
            .iter()
            .map(|confusion| {
                let (a, b) = confusion.categories;
                json!({
                    "categories": [self.categories[a], self.categories[b]],
                    "mistakes": confusion.mistakes, "queries": confusion.queries,
                })
            })
            .collect();
        let report = json!({
            "encoder": self.encoder,
            "categories": self.taking_part,
            "left_out": self.left_out,
            "unreadable": self.unreadable,
            "episodes": self.episodes,
            "ways": self.ways,
            "shots": shots,
            "queries": self.design.queries,
            "uneven": self.design.uneven,
            "seed": self.design.seed,
            "accuracy": accuracy,
            "difference": difference,
            "starter_adds": starter,
            "confused": { "learner": self.contenders[0], "shot": shots[shots.len() - 1], "pairs": confused },
        });
        format!("{report:#}\n")
    }
}

const LEADING: &str = "examples of each";

/// One decimal, with a sign where it is not zero.
fn signed(number: f64) -> String {
    match format!("{number:.1}").strip_prefix('-') {
        Some("0.0") => "0.0".into(),
        Some(rest) => format!("−{rest}"),
        None if format!("{number:.1}") == "0.0" => "0.0".into(),
        None => format!("+{number:.1}"),
    }
}
