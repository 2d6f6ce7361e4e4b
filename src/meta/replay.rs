//! Replaying the whole job on labelled material: the true labels are the person.
//!
//! A pile is drawn, questions are asked one after the other, each is answered with the item's true category — a new tray
//! where the person meets the category for the first time, “none of these” for a stray — and after so many answers it is
//! counted how much of what has no answer is sorted right. Every player gets the same piles and, where it asks in random
//! order, the same order, so that differences between players are paired. [`Replay::play`] depends on nothing but the
//! pile's number.

use std::num::NonZeroUsize;

use rand::{SeedableRng, seq::SliceRandom, seq::index};
use rand_chacha::ChaCha8Rng;

use crate::{
    error::{Error, Result},
    forecast::Outlook,
    meta::episode::{Labelled, shares},
    sorter::Sorter,
};

/// What piles are drawn and how long they are answered.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Plan {
    /// Categories a pile.
    pub categories: NonZeroUsize,
    /// Items a pile, as far as its categories have them; strays not counted.
    pub size: NonZeroUsize,
    /// Whether each category has 0.66 times as many items as the one before, but at least one. The categories with the
    /// most items go first, and the whole pile gets smaller where they have too few, so that the ratio stays.
    pub uneven: bool,
    /// How many items of other categories lie in the pile; they belong in no tray.
    pub strays: usize,
    /// How many answers are given.
    pub answers: NonZeroUsize,
    /// Seed of everything that is drawn.
    pub seed: u64,
}

/// A pile with what is known of it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Drawn {
    /// Numbers among the labelled items, in the order they arrive.
    pub items: Vec<usize>,
    /// The position of each item's category within the pile; `None` for strays.
    pub truth: Vec<Option<usize>>,
    /// Positions in random order.
    pub shuffled: Vec<usize>,
}

/// In which order the person answers.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Order {
    /// As the sorter asks.
    Asked,
    /// At random.
    Random,
}

/// Who sorts, and what it is asked.
#[derive(Debug, Clone)]
pub struct Player {
    /// What it is called in the report.
    pub name: String,
    /// A sorter without items or trays; a copy of it sorts each pile.
    pub sorter: Sorter,
    /// The order of its questions.
    pub order: Order,
}

/// How a pile stands after so many answers.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Moment {
    /// Answers given.
    pub answers: usize,
    /// The share sorted right of the items that have no answer and are no strays, 0 to 1; 1 if there are none.
    pub rest: f64,
    /// The share of the whole pile without strays that is in its own tray, answered items included.
    pub whole: f64,
    /// Categories met so far.
    pub met: usize,
    /// What the sorter itself expected.
    pub outlook: Option<Outlook>,
}

/// How one player fared with one pile.
#[derive(Debug, Clone, PartialEq)]
pub struct Course {
    /// After each number of answers in [`Replay::moments`].
    pub moments: Vec<Moment>,
    /// How many answers it took until every category was met; `None` if that did not happen.
    pub all_met: Option<usize>,
}

/// Labelled material, the piles drawn from it, and the players.
#[derive(Debug, Clone)]
pub struct Replay<'a> {
    embeddings: &'a [Vec<f32>],
    labelled: Labelled,
    plan: Plan,
    players: &'a [Player],
    /// Categories that take part, those with the most items first.
    taking_part: Vec<usize>,
}

impl<'a> Replay<'a> {
    /// Replays with items by number: their embeddings, and their categories in `labelled`.
    ///
    /// In even piles the categories that have their full share take part, or, if they are too few, as many of the largest
    /// as needed. Refuses fewer categories with two items than the plan asks for.
    pub fn new(embeddings: &'a [Vec<f32>], labelled: Labelled, plan: Plan, players: &'a [Player]) -> Result<Self> {
        let size = |category: usize| labelled.members(category).len();
        let mut usable: Vec<usize> = (0..labelled.categories()).filter(|&category| size(category) >= 2).collect();
        if usable.len() < plan.categories.get().max(2) {
            return Err(Error::TooFewCategories(usable.len()));
        }
        usable.sort_by_key(|&category| std::cmp::Reverse(size(category)));
        if !plan.uneven {
            let share = plan.size.get() / plan.categories;
            let full = usable.iter().filter(|&&category| size(category) >= share).count();
            usable.truncate(full.max(plan.categories.get()));
        }
        Ok(Self { embeddings, labelled, plan, players, taking_part: usable })
    }

    /// What is played.
    pub fn plan(&self) -> &Plan {
        &self.plan
    }

    /// The numbers of answers after which it is counted: every one up to one a category, then four times as often.
    pub fn moments(&self) -> Vec<usize> {
        let step = (self.plan.categories.get() / 4).max(1);
        (1..=self.plan.answers.get())
            .filter(|answers| answers % step == 0 || *answers == self.plan.answers.get())
            .collect()
    }

    /// The pile of this number: the same for the same seed and number, whatever was drawn before.
    pub fn draw(&self, number: u64) -> Drawn {
        let mut rng = ChaCha8Rng::seed_from_u64(self.plan.seed);
        rng.set_stream(number);
        let ways = self.plan.categories.get();
        let mut chosen = index::sample(&mut rng, self.taking_part.len(), ways).into_vec();
        // The largest first; chance decides what is which in an even pile.
        if self.plan.uneven {
            chosen.sort_unstable();
        }
        let members = |position: usize| self.labelled.members(self.taking_part[position]);
        let shares = shares(ways, self.plan.uneven);
        let size = self.plan.size.get() as f64;
        let size = if self.plan.uneven {
            let fits = |(&position, share): (&usize, &f64)| members(position).len() as f64 / share;
            chosen.iter().zip(&shares).map(fits).fold(size, f64::min)
        } else {
            size
        };
        let mut labelled: Vec<(usize, Option<usize>)> = Vec::new();
        for (label, (&position, share)) in chosen.iter().zip(&shares).enumerate() {
            let members = members(position);
            let count = ((size * share).round() as usize).clamp(1, members.len());
            let drawn = index::sample(&mut rng, members.len(), count);
            labelled.extend(drawn.into_iter().map(|place| (members[place], Some(label))));
        }
        let others: Vec<usize> = (0..self.labelled.categories())
            .filter(|category| !chosen.iter().any(|&position| self.taking_part[position] == *category))
            .flat_map(|category| self.labelled.members(category).iter().copied())
            .collect();
        let strays = index::sample(&mut rng, others.len(), self.plan.strays.min(others.len()));
        labelled.extend(strays.into_iter().map(|place| (others[place], None)));
        labelled.shuffle(&mut rng);
        let mut shuffled: Vec<usize> = (0..labelled.len()).collect();
        shuffled.shuffle(&mut rng);
        let (items, truth) = labelled.into_iter().unzip();
        Drawn { items, truth, shuffled }
    }

    /// Lets every player sort the pile of this number. Refuses what the players' sorters refuse to take. Cost: that of
    /// [`Sorter::next_question`] for each answer of those that ask.
    pub fn play(&self, number: u64) -> Result<Vec<Course>> {
        let drawn = self.draw(number);
        self.players.iter().map(|player| self.course(player, &drawn)).collect()
    }

    fn course(&self, player: &Player, drawn: &Drawn) -> Result<Course> {
        let mut sorter = player.sorter.clone();
        let items =
            drawn.items.iter().map(|&item| sorter.add_item(&self.embeddings[item])).collect::<Result<Vec<_>>>()?;
        let mut trays: Vec<Option<usize>> = vec![None; self.plan.categories.get()];
        let mut open = vec![true; items.len()];
        let mut moments = Vec::new();
        let mut all_met = None;
        let counted = self.moments();
        let mut shuffled = drawn.shuffled.iter().copied();
        for answers in 1..=self.plan.answers.get().min(items.len()) {
            let next = match player.order {
                Order::Asked => sorter.next_question().and_then(|asked| items.iter().position(|&item| item == asked)),
                Order::Random => shuffled.next(),
            };
            let Some(position) = next else { break };
            match drawn.truth[position] {
                None => sorter.answer_none(items[position])?,
                Some(label) => match trays[label] {
                    Some(tray) => sorter.answer(items[position], tray)?,
                    None => trays[label] = Some(sorter.answer_new(items[position], &label.to_string())?),
                },
            }
            open[position] = false;
            let met = trays.iter().filter(|tray| tray.is_some()).count();
            if met == trays.len() && all_met.is_none() {
                all_met = Some(answers);
            }
            if counted.binary_search(&answers).is_ok() {
                moments.push(count(&mut sorter, drawn, &items, &open, &trays, answers));
            }
        }
        Ok(Course { moments, all_met })
    }
}

fn count(
    sorter: &mut Sorter,
    drawn: &Drawn,
    items: &[usize],
    open: &[bool],
    trays: &[Option<usize>],
    answers: usize,
) -> Moment {
    let outlook = sorter.outlook();
    let verdicts = sorter.verdicts();
    let (mut right, mut rest, mut answered) = (0, 0, 0);
    for (position, label) in drawn.truth.iter().enumerate() {
        let Some(label) = *label else { continue };
        if !open[position] {
            answered += 1;
            continue;
        }
        rest += 1;
        let said = verdicts[items[position]].and_then(|verdict| verdict.tray);
        right += usize::from(said.is_some() && said == trays[label]);
    }
    Moment {
        answers,
        rest: if rest == 0 { 1.0 } else { right as f64 / rest as f64 },
        whole: (right + answered) as f64 / (rest + answered) as f64,
        met: trays.iter().filter(|tray| tray.is_some()).count(),
        outlook,
    }
}

/// How many answers a player needs until its mean share of the rest reaches `share`, between two moments by a straight
/// line; `None` if it doesn't. Every course must have the same moments, as those of one [`Replay`] have.
pub fn answers_needed<'c>(courses: impl Iterator<Item = &'c Course> + Clone, share: f64) -> Option<f64> {
    let moments = courses.clone().map(|course| course.moments.len()).min()?;
    let mean = |at: usize| {
        let (sum, count) = courses.clone().fold((0.0, 0), |(sum, n), course| (sum + course.moments[at].rest, n + 1));
        sum / f64::from(count)
    };
    let answers = |at: usize| courses.clone().next().map_or(0.0, |course| course.moments[at].answers as f64);
    let mut before: Option<(f64, f64)> = None;
    for at in 0..moments {
        let here = (answers(at), mean(at));
        if here.1 >= share {
            return Some(match before {
                None => here.0,
                Some((answers, reached)) => answers + (here.0 - answers) * (share - reached) / (here.1 - reached),
            });
        }
        before = Some(here);
    }
    None
}
