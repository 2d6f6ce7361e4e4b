//! `kenspeckle rehearse --answers`: the whole job replayed on labelled material, asked questions beside random order.

use std::{io::Write, num::NonZeroUsize, path::Path, sync::Arc};

use clap::Args;
use kenspeckle::{
    LearnerKind, Settings, Sorter,
    meta::{
        episode::Labelled,
        rehearse::Estimate,
        replay::{Course, Order, Plan, Player, Replay, answers_needed},
    },
};
use serde_json::{Value, json};

use crate::{
    console::{self, Failure},
    output,
    plot::{self, Curve, Picture},
    rehearse::{Material, at_least, play_all},
    sort::read_starter,
};

/// Options of the replay of the whole job.
#[derive(Args)]
pub struct Whole {
    /// Replay the whole job instead, with the known categories as the person: from a pile without any answer to this many,
    /// as this tool asks and in random order.
    #[arg(long, value_name = "NUMBER", value_parser = at_least::<1, 10_000>)]
    pub answers: Option<NonZeroUsize>,
    /// With --answers: how many categories a pile has.
    #[arg(long, default_value = "8", value_name = "NUMBER", value_parser = at_least::<2, 500>)]
    categories: NonZeroUsize,
    /// With --answers: how many items a pile has, as far as its categories have them.
    #[arg(long, default_value = "400", value_name = "NUMBER", value_parser = at_least::<10, 20_000>)]
    size: NonZeroUsize,
    /// With --answers: how many items of other categories lie in the pile; they are answered “none of these”.
    #[arg(long, default_value_t = 0, value_name = "NUMBER")]
    strays: usize,
    /// With --answers: how many piles are drawn.
    #[arg(long, default_value = "20", value_name = "NUMBER", value_parser = at_least::<2, 10_000>)]
    repeats: NonZeroUsize,
}

/// What the replay shares with other rehearsals.
pub struct Options<'a> {
    /// Answers a pile.
    pub answers: NonZeroUsize,
    /// Whether categories are uneven.
    pub uneven: bool,
    /// Seed of everything drawn.
    pub seed: u64,
    /// How the tool learns.
    pub learner: LearnerKind,
    /// A starter to begin with.
    pub starter: Option<&'a Path>,
    /// Piles at a time.
    pub threads: Option<NonZeroUsize>,
    /// JSON instead of text.
    pub json: bool,
    /// Where a picture goes.
    pub plot: Option<&'a Path>,
}

const PLAYERS: [&str; 3] = ["asked", "random order", "random, one by one"];

impl Whole {
    /// Replays and reports.
    pub fn run(&self, material: &Material, labelled: Labelled, options: &Options) -> Result<(), Failure> {
        let plan = Plan {
            categories: self.categories,
            size: self.size,
            uneven: options.uneven,
            strays: self.strays,
            answers: options.answers,
            seed: options.seed,
        };
        let starter = options.starter.map(read_starter).transpose()?.map(Arc::new);
        let sorter = |learner| {
            let settings =
                Settings { encoder: material.encoder.clone(), space: material.space, learner, seed: options.seed };
            match &starter {
                Some(starter) => Sorter::with_starter(settings, starter.clone()),
                None => Ok(Sorter::new(settings)),
            }
            .map_err(Failure::because)
        };
        let player = |name: &str, sorter, order| Player { name: name.to_owned(), sorter, order };
        let players = [
            player(PLAYERS[0], sorter(options.learner)?, Order::Asked),
            player(PLAYERS[1], sorter(options.learner)?, Order::Random),
            player(PLAYERS[2], sorter(LearnerKind::Ridge)?.one_by_one(), Order::Random),
        ];
        let taking_part = labelled.categories();
        let replay = Replay::new(&material.embeddings, labelled, plan, &players).map_err(|error| {
            Failure::because(format!(
                "{error}: --categories {} needs as many with two {} or more, of {taking_part}",
                self.categories, material.noun
            ))
        })?;
        let played = play_all(self.repeats.get(), options.threads, |number| replay.play(number))?;
        let report = Report { material, replay: &replay, played: &played };
        if let Some(path) = options.plot {
            let picture = report.picture();
            output::write_whole(path, |file| file.write_all(picture.as_bytes()).map_err(|error| error.to_string()))?;
        }
        let text = if options.json { report.json() } else { report.text() };
        output::show(text.as_bytes()).map_err(Failure::because)?;
        if let Some(path) = options.plot {
            console::say(&format!("the picture is in {}", path.display()));
        }
        Ok(())
    }
}

struct Report<'a> {
    material: &'a Material,
    replay: &'a Replay<'a>,
    /// By pile, then by player.
    played: &'a [Vec<Course>],
}

impl Report<'_> {
    fn courses(&self, player: usize) -> impl Iterator<Item = &Course> + Clone {
        self.played.iter().map(move |courses| &courses[player])
    }

    /// The moments that every pile lasted to.
    fn moments(&self) -> Vec<usize> {
        let least = self.played.iter().flatten().map(|course| course.moments.len()).min().unwrap_or(0);
        self.replay.moments().into_iter().take(least).collect()
    }

    fn rest(&self, player: usize, at: usize) -> Estimate {
        Estimate::of(&self.courses(player).map(|course| course.moments[at].rest).collect::<Vec<_>>())
    }

    /// The mean share that the plain sorter reaches at six answers a category, or at its last.
    fn usual(&self) -> (usize, f64) {
        let moments = self.moments();
        let six = 6 * self.replay.plan().categories.get();
        let at = moments.iter().rposition(|&answers| answers <= six).unwrap_or(0);
        (moments[at], self.rest(2, at).mean)
    }

    fn all_met(&self, player: usize) -> Option<f64> {
        let counts: Option<Vec<usize>> = self.courses(player).map(|course| course.all_met).collect();
        counts.map(|counts| counts.iter().sum::<usize>() as f64 / counts.len() as f64)
    }

    fn text(&self) -> String {
        let plan = self.replay.plan();
        let moments = self.moments();
        let noun = self.material.noun;
        let mut text = format!(
            "{} piles of {} categories, about {} {noun} each{}{}, answered from nothing on.\n\n\
             Sorted right of what has no answer, in % (± half the 95 % interval, which fewer than ten piles can't tell):\n  {:<22}",
            self.played.len(),
            plan.categories,
            plan.size,
            if plan.uneven { ", unevenly spread" } else { "" },
            if plan.strays > 0 { format!(", with {} strays", plan.strays) } else { String::new() },
            "answers",
        );
        let wanted = [1, 2, 3, 4, 6].map(|times| times * plan.categories.get());
        let columns: Vec<usize> = (0..moments.len()).filter(|&at| wanted.contains(&moments[at])).collect();
        columns.iter().for_each(|&at| text += &format!("{:>14}", moments[at]));
        text.push('\n');
        for (player, name) in PLAYERS.iter().enumerate() {
            text += &format!("  {name:<22}");
            for &at in &columns {
                let Estimate { mean, half_width } = self.rest(player, at);
                let interval =
                    if half_width.is_finite() { format!(" ± {:.1}", 100.0 * half_width) } else { String::new() };
                text += &format!("{:>14}", format!("{:.1}{interval}", 100.0 * mean));
            }
            text.push('\n');
        }
        let (answers, share) = self.usual();
        text += &format!("\nAnswers needed for {:.0} % (what “{}” reaches with {answers}):", 100.0 * share, PLAYERS[2]);
        for (player, name) in PLAYERS.iter().enumerate() {
            let needed = answers_needed(self.courses(player), share);
            text += &format!(" {name} {}.", needed.map_or("more".into(), |needed| format!("{needed:.0}")));
        }
        text += "\nAnswers until every category was met:";
        for (player, name) in PLAYERS.iter().enumerate().take(2) {
            let met = self.all_met(player);
            text += &format!(" {name} {}.", met.map_or("not in every pile".into(), |met| format!("{met:.0}")));
        }
        text + "\n"
    }

    fn picture(&self) -> String {
        let moments = self.moments();
        let curve = |(player, name): (usize, &&str)| {
            let point = |(at, &answers): (usize, &usize)| {
                let Estimate { mean, half_width } = self.rest(player, at);
                let half = if half_width.is_finite() { half_width } else { 0.0 };
                (answers, 100.0 * mean, 100.0 * (mean - half).max(0.0), 100.0 * (mean + half).min(1.0))
            };
            Curve { name: (*name).to_owned(), points: moments.iter().enumerate().map(point).collect() }
        };
        let plan = self.replay.plan();
        plot::svg(&Picture {
            title: "Sorted right, by number of answers",
            subtitle: format!(
                "{} piles of {} categories; bands are 95 % intervals",
                self.played.len(),
                plan.categories
            ),
            description: self.text(),
            axis: "answers",
            curves: PLAYERS.iter().enumerate().map(curve).collect(),
        })
    }

    fn json(&self) -> String {
        let plan = self.replay.plan();
        let (answers, share) = self.usual();
        let players: Vec<Value> = PLAYERS
            .iter()
            .enumerate()
            .map(|(player, name)| {
                let moments = self.moments();
                let curve = moments.iter().enumerate().map(|(at, answers)| {
                    let Estimate { mean, half_width } = self.rest(player, at);
                    json!({
                        "answers": answers, "mean": mean,
                        "interval": [(mean - half_width).max(0.0), (mean + half_width).min(1.0)],
                    })
                });
                let piles = self.courses(player).map(|course| {
                    json!({
                        "all_met": course.all_met,
                        "answers": column(course, |moment| json!(moment.answers)),
                        "rest": column(course, |moment| json!(moment.rest)),
                        "whole": column(course, |moment| json!(moment.whole)),
                        "met": column(course, |moment| json!(moment.met)),
                        "expected": column(course, |moment| json!(moment.outlook.map(|outlook| {
                            let range = |range: kenspeckle::forecast::Range| [range.low, range.expected, range.high];
                            json!({
                                "claimed": outlook.claimed, "now": range(outlook.now),
                                "after_more": range(outlook.after_more),
                            })
                        }))),
                    })
                });
                json!({
                    "name": name,
                    "needed": answers_needed(self.courses(player), share),
                    "all_met": self.all_met(player),
                    "curve": curve.collect::<Vec<_>>(),
                    "piles": piles.collect::<Vec<_>>(),
                })
            })
            .collect();
        let piles: Vec<Value> = (0..self.played.len() as u64)
            .map(|number| {
                let drawn = self.replay.draw(number);
                json!({ "items": drawn.items, "truth": drawn.truth, "shuffled": drawn.shuffled })
            })
            .collect();
        let report = json!({
            "encoder": self.material.encoder,
            "categories": plan.categories, "size": plan.size, "uneven": plan.uneven, "strays": plan.strays,
            "seed": plan.seed, "repeats": self.played.len(),
            "target": { "share": share, "answers": answers, "player": PLAYERS[2] },
            "players": players,
            "piles": piles,
        });
        format!("{report}\n")
    }
}

fn column(course: &Course, value: impl Fn(&kenspeckle::meta::replay::Moment) -> Value) -> Vec<Value> {
    course.moments.iter().map(value).collect()
}
