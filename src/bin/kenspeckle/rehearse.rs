//! `kenspeckle rehearse`: labelled material in, how well the tool would sort it out.

use std::{
    collections::BTreeMap,
    num::NonZeroUsize,
    path::PathBuf,
    sync::{
        Arc,
        atomic::{AtomicU64, Ordering},
    },
    thread,
};

use clap::Args;
use kenspeckle::{
    LearnerKind, Settings, Sorter, Space,
    meta::{
        episode::{Design, Labelled},
        rehearse::{Contender, LEAST_VALUES, Played, Rehearsal, Summary},
    },
};

use crate::{
    console::{self, Failure},
    material::{self, Labelled as Read, Reading},
    output, plot, replay,
    report::Report,
    sort::read_starter,
};

/// The shots where the person names none, as far as counts allow.
const USUAL_SHOTS: [usize; 4] = [1, 2, 5, 10];

/// Categories an episode where the person names no number.
const USUAL_WAYS: usize = 5;

/// Find out how well this tool suits your material, from photos or notes whose category you know.
///
/// Draws small tasks from them again and again: a few categories with a few examples of each, and other items of the same
/// categories that are sorted as if nobody knew where they belong. Prints the share that came into their own category, for
/// each number of examples and each learner.
#[derive(Args)]
pub struct Rehearse {
    /// A folder that holds one folder of photos or of .txt files for each category, named like it, or a .txt file for each
    /// category with a note a line; a table of notes with --column and --category; or an .npy file of vectors.
    labelled: PathBuf,
    /// For an .npy file: a file with one category a line, in the same order.
    #[arg(long, value_name = "FILE.csv")]
    labels: Option<PathBuf>,
    #[command(flatten)]
    reading: Reading,
    /// How many categories a task has [default: 5, or as many as there are].
    #[arg(long, value_name = "NUMBER", value_parser = at_least::<2, 500>)]
    ways: Option<NonZeroUsize>,
    /// How many examples of each category are given [default: 1,2,5,10, as far as three quarters of the categories have
    /// that many and one more].
    #[arg(long, value_name = "NUMBER,…", value_delimiter = ',', value_parser = at_least::<1, 1000>)]
    shots: Vec<NonZeroUsize>,
    /// How many tasks are drawn.
    #[arg(long, default_value = "300", value_name = "NUMBER", value_parser = at_least::<LEAST_VALUES, 100_000>)]
    episodes: NonZeroUsize,
    /// How many other items of each category are sorted, as far as there are.
    #[arg(long, default_value = "15", value_name = "NUMBER", value_parser = at_least::<1, 1000>)]
    queries: NonZeroUsize,
    /// Spread examples and other items unevenly: each category has 0.66 times as many as the one before, and the numbers
    /// above are the mean.
    #[arg(long)]
    uneven: bool,
    /// Only this learner; give it several times for several [default: all].
    #[arg(long, value_name = "auto|prototype|ridge|gradient")]
    learner: Vec<LearnerKind>,
    /// Rehearse with this starter too (`kenspeckle learn` makes it), beside sorting without one. Take other piles for the
    /// starter than for the rehearsal: on what it was learned from it looks better than it is.
    #[arg(long, value_name = "FILE.starter")]
    starter: Option<PathBuf>,
    /// Sort without what the pile's own structure says too, for comparison.
    #[arg(long, conflicts_with = "starter")]
    one_by_one: bool,
    #[command(flatten)]
    whole: replay::Whole,
    /// Seed of everything that is drawn: the same seed gives the same result.
    #[arg(long, default_value_t = 1)]
    seed: u64,
    /// How many tasks are worked on at a time [default: one for each core]; the result doesn't depend on it.
    #[arg(long, value_name = "NUMBER", value_parser = at_least::<1, 256>)]
    threads: Option<NonZeroUsize>,
    /// Write JSON instead of a table.
    #[arg(long)]
    json: bool,
    /// Draw a picture too: the share that is sorted right over the number of examples.
    #[arg(long, value_name = "FILE.svg")]
    plot: Option<PathBuf>,
}

/// A whole number from `LEAST` to `MOST`, as typed.
pub fn at_least<const LEAST: usize, const MOST: usize>(text: &str) -> Result<NonZeroUsize, String> {
    text.trim()
        .parse()
        .ok()
        .filter(|number: &NonZeroUsize| (LEAST..=MOST).contains(&number.get()))
        .ok_or_else(|| format!("give a whole number from {LEAST} to {MOST}"))
}

/// Labelled material, checked and ready to be drawn from.
pub struct Material {
    /// The encoder's identity.
    pub encoder: String,
    /// The space of the embeddings.
    pub space: Space,
    /// What its items are called.
    pub noun: &'static str,
    /// Names, in order.
    pub categories: Vec<String>,
    /// One an item.
    pub embeddings: Vec<Vec<f32>>,
    /// Each item's position among the categories.
    pub labels: Vec<usize>,
    /// How many items could not be read.
    pub troubles: usize,
}

impl Rehearse {
    /// Every chosen learner without a starter and, if there is one, with it.
    fn contenders(&self, material: &Material) -> Result<Vec<Contender>, Failure> {
        let chosen = |kind: &LearnerKind| self.learner.is_empty() || self.learner.contains(kind);
        let settings =
            |learner| Settings { encoder: material.encoder.clone(), space: material.space, learner, seed: self.seed };
        let kinds: Vec<LearnerKind> = LearnerKind::ALL.into_iter().filter(chosen).collect();
        let mut contenders: Vec<Contender> = kinds
            .iter()
            .map(|&kind| Contender { name: kind.name().to_owned(), sorter: Sorter::new(settings(kind)) })
            .collect();
        if self.one_by_one {
            let alone = |contender: &Contender| Contender {
                name: format!("{}, one by one", contender.name),
                sorter: contender.sorter.clone().one_by_one(),
            };
            contenders.extend(contenders.iter().map(alone).collect::<Vec<_>>());
        }
        if let Some(path) = &self.starter {
            let starter = Arc::new(read_starter(path)?);
            for kind in kinds {
                let sorter = Sorter::with_starter(settings(kind), starter.clone())
                    .map_err(|error| Failure::because(format!("{}: {error}", path.display())))?;
                contenders.push(Contender { name: format!("{} + starter", kind.name()), sorter });
            }
        }
        Ok(contenders)
    }

    /// The contenders with a starter beside their twins without one: those stand first, in the same order.
    fn twins(&self, contenders: usize) -> Vec<(usize, usize)> {
        let without = if self.starter.is_some() { contenders / 2 } else { contenders };
        (without..contenders).map(|with| (with, with - without)).collect()
    }

    /// Runs the command and tells how many items could not be read.
    pub fn run(self) -> Result<usize, Failure> {
        let read = material::labelled(&self.labelled, self.labels.as_deref(), &self.reading, "examples")?;
        let material = self.gather(read)?;
        let labelled = Labelled::new(&material.labels, material.categories.len()).map_err(Failure::because)?;
        if let Some(answers) = self.whole.answers {
            let options = replay::Options {
                answers,
                uneven: self.uneven,
                seed: self.seed,
                learner: self.learner.first().copied().unwrap_or_default(),
                starter: self.starter.as_deref(),
                threads: self.threads,
                json: self.json,
                plot: self.plot.as_deref(),
            };
            self.whole.run(&material, labelled, &options)?;
            return Ok(material.troubles);
        }
        let sizes: Vec<usize> = (0..labelled.categories()).map(|category| labelled.members(category).len()).collect();
        let design = self.design(&material, &sizes)?;
        say_left_out(&material, &sizes, &design);

        let contenders = self.contenders(&material)?;
        let rehearsal =
            Rehearsal::new(&material.embeddings, labelled, &design, &contenders).map_err(Failure::because)?;
        let played = self.play(&rehearsal)?;

        let least = design.least_items();
        let names = |enough: bool| {
            let of = |(name, &size): (&String, &usize)| ((size >= least) == enough).then(|| (name.clone(), size));
            material.categories.iter().zip(&sizes).filter_map(of).collect::<BTreeMap<_, _>>()
        };
        let report = Report {
            encoder: &material.encoder,
            noun: material.noun,
            categories: &material.categories,
            taking_part: names(true),
            left_out: names(false),
            unreadable: material.troubles,
            design: &design,
            ways: rehearsal.episodes().ways(),
            contenders: contenders.iter().map(|contender| contender.name.as_str()).collect(),
            twins: self.twins(contenders.len()),
            episodes: played.len(),
            summary: Summary::new(&played),
        };
        if let Some(path) = &self.plot {
            let picture = plot::draw(&report);
            output::write_whole(path, |file| {
                std::io::Write::write_all(file, picture.as_bytes()).map_err(|error| error.to_string())
            })?;
        }
        let text = if self.json { report.json() } else { report.text() };
        output::show(text.as_bytes()).map_err(Failure::because)?;
        if let Some(path) = &self.plot {
            console::say(&format!("the picture is in {}", path.display()));
        }
        Ok(material.troubles)
    }

    /// Checks every item at the door, so that no episode meets one that can't be sorted.
    fn gather(&self, read: Read) -> Result<Material, Failure> {
        let noun = read.kind.noun();
        let Read { encoder, space, examples, mut troubles, .. } = read;
        let (examples, refused): (Vec<_>, Vec<_>) = examples
            .into_iter()
            .map(|example| {
                let refusal = space.place(&example.item.embedding).err();
                (example, refusal)
            })
            .partition(|(_, refusal)| refusal.is_none());
        for (example, refusal) in refused {
            let reason = refusal.map_or_else(String::new, |reason| reason.to_string());
            console::say(&format!("item {}: {reason}", example.item.name));
            troubles += 1;
        }
        let mut categories: Vec<String> = examples.iter().map(|(example, _)| example.category.clone()).collect();
        categories.sort();
        categories.dedup();
        if categories.len() < 2 {
            let there = match categories.first() {
                Some(only) => format!("there is only “{only}”"),
                None => "there is none".to_owned(),
            };
            return Err(Failure::because(format!(
                "{}: rehearsing needs {noun} of at least two categories, and {there}; add another one",
                self.labelled.display()
            )));
        }
        let position = |category: &String| categories.binary_search(category).unwrap_or_default();
        let (labels, embeddings) =
            examples.into_iter().map(|(example, _)| (position(&example.category), example.item.embedding)).unzip();
        Ok(Material { encoder, space, noun, categories, embeddings, labels, troubles })
    }

    /// The design that was asked for, or the usual one as far as the counts allow.
    fn design(&self, material: &Material, sizes: &[usize]) -> Result<Design, Failure> {
        let enough = |shot: usize| sizes.iter().filter(|&&size| size > shot).count();
        let (noun, place) = (material.noun, self.labelled.display());
        let shots = if self.shots.is_empty() {
            let wanted = self.ways.map_or(USUAL_WAYS.min(sizes.len()), NonZeroUsize::get);
            let usual = USUAL_SHOTS.into_iter();
            let shots: Vec<_> = usual
                .filter(|&shot| shot == 1 || (enough(shot) >= wanted && 4 * enough(shot) >= 3 * sizes.len()))
                .filter_map(NonZeroUsize::new)
                .collect();
            shots
        } else {
            self.shots.clone()
        };
        let design = Design {
            ways: self.ways.or(NonZeroUsize::new(USUAL_WAYS)).unwrap_or(NonZeroUsize::MIN),
            shots,
            queries: self.queries,
            uneven: self.uneven,
            seed: self.seed,
        };
        let least = design.least_items();
        let taking_part = enough(least - 1);
        if taking_part < 2 {
            let largest = sizes.iter().max().copied().unwrap_or(0);
            let remedy = if least > 2 { ", or ask for fewer with --shots" } else { "" };
            return Err(Failure::because(format!(
                "{place}: too few {noun}: rehearsing with {} of each needs at least two categories with {least} or more, \
                 and there {} (the largest has {largest}); add {noun}{remedy}",
                examples(least - 1),
                if taking_part == 1 { "is one" } else { "is none" },
            )));
        }
        if let Some(ways) = self.ways.filter(|ways| ways.get() > taking_part) {
            return Err(Failure::because(format!(
                "{place}: --ways {ways} asks for more categories than there are with {least} {noun} or more, \
                 {taking_part} of {}; ask for fewer categories or for fewer --shots, or add {noun}",
                sizes.len()
            )));
        }
        Ok(design)
    }

    /// Plays every episode, several at a time; the result is in order whoever played it.
    fn play(&self, rehearsal: &Rehearsal) -> Result<Vec<Played>, Failure> {
        play_all(self.episodes.get(), self.threads, |number| rehearsal.play(number))
    }
}

/// Plays numbers 0, 1, 2 … several at a time; the result is in order whoever played it.
pub fn play_all<T: Send>(
    episodes: usize,
    threads: Option<NonZeroUsize>,
    play: impl Fn(u64) -> kenspeckle::Result<T> + Sync,
) -> Result<Vec<T>, Failure> {
    let workers = threads.or_else(|| thread::available_parallelism().ok()).map_or(1, NonZeroUsize::get);
    let bar = console::progress(episodes, "rehearsing");
    let next = AtomicU64::new(0);
    let work = || {
        let mut done = Vec::new();
        while !console::stopped() {
            let number = next.fetch_add(1, Ordering::Relaxed);
            if number >= episodes as u64 {
                break;
            }
            done.push((number, play(number)));
            bar.inc(1);
        }
        done
    };
    let mut done: Vec<(u64, kenspeckle::Result<T>)> = thread::scope(|scope| {
        let workers: Vec<_> = (0..workers.min(episodes)).map(|_| scope.spawn(work)).collect();
        workers
            .into_iter()
            .flat_map(|worker| worker.join().unwrap_or_else(|panic| std::panic::resume_unwind(panic)))
            .collect()
    });
    bar.finish_and_clear();
    console::go_on()?;
    done.sort_by_key(|&(number, _)| number);
    done.into_iter().map(|(_, played)| played.map_err(Failure::because)).collect()
}

/// A number of examples, in words.
pub fn examples(number: usize) -> String {
    if number == 1 { "1 example".to_owned() } else { format!("{number} examples") }
}

/// Names the categories that have too few items, and what lets them take part.
fn say_left_out(material: &Material, sizes: &[usize], design: &Design) {
    let least = design.least_items();
    let few: Vec<String> = material
        .categories
        .iter()
        .zip(sizes)
        .filter(|&(_, &size)| size < least)
        .map(|(name, size)| format!("{name} ({size})"))
        .collect();
    if few.is_empty() {
        return;
    }
    let remedy = if least > 2 { "; fewer --shots, or more of them, let them take part" } else { "; add more of them" };
    console::say(&format!(
        "left out, since {} and another one to sort need {least} {}: {}{remedy}",
        examples(least - 1),
        material.noun,
        few.join(", ")
    ));
}
