//! `kenspeckle ask`: the pile is sorted by answering what the tool asks, at a terminal or by another program.

use std::{
    collections::HashMap,
    io::BufRead,
    path::{Path, PathBuf},
    process::Command,
    sync::Arc,
};

use clap::Args;
use kenspeckle::{LearnerKind, Settings, Sorter, Space, ledger::Answer};
use serde::{Deserialize, Serialize};
use serde_json::{Value, json};

use crate::{
    console::{self, Failure, plain},
    material::{self, Kind, Reading},
    notes, output,
    sort::read_starter,
};

/// The newest version of the file of answers.
const VERSION: u32 = 1;

/// The largest file of answers that is read.
const FILE_LIMIT: u64 = 256 << 20;

/// Sort a pile by answering questions: the tool asks about the items whose answers help most.
///
/// Shows one item after the other; type the number of its tray, or a name to make a new tray, and Enter. Every answer is
/// saved at once, and the same command goes on where it was left. With --json, another program answers: see --help.
#[derive(Args)]
#[command(after_help = "\
With --json one JSON object is written on a line for each question:
  {\"ask\": ITEM, \"text\": …, \"trays\": [{\"name\": …, \"probability\": …}, …], \"answers\": 7, \"outlook\": {…}}   or   {\"done\": true, …}
and one is read from a line for each answer (without \"items\" it is about the item that was asked):
  {\"do\": \"answer\", \"tray\": NAME}   {\"do\": \"answer\", \"tray\": NAME, \"items\": [ITEM, …]}   {\"do\": \"none\"}   {\"do\": \"skip\"}
  {\"do\": \"strip\", \"tray\": NAME, \"count\": 12}   {\"do\": \"undo\"}   {\"do\": \"redo\"}   {\"do\": \"stop\"}
What can't be done is answered with {\"error\": CODE, \"message\": …}, and the question stands.")]
pub struct Ask {
    /// The pile: a folder of photos or of .txt files, a file of notes (.txt with a note a line, .csv, .tsv, .jsonl), or an
    /// .npy file of vectors.
    pile: PathBuf,
    #[command(flatten)]
    reading: Reading,
    /// Where answers are kept [default: beside the pile, named like it with .answers.json].
    #[arg(long, value_name = "FILE.json")]
    answers: Option<PathBuf>,
    /// Show each photo with this program, which is given its path (for instance xdg-open, open, or chafa for a terminal).
    #[arg(long, value_name = "PROGRAM")]
    open: Option<PathBuf>,
    /// How to learn.
    #[arg(long, default_value = "auto", value_name = "auto|prototype|ridge|gradient")]
    learner: LearnerKind,
    /// Seed of everything that is drawn.
    #[arg(long, default_value_t = 1)]
    seed: u64,
    /// A starter from past piles of the same kind.
    #[arg(long, value_name = "FILE.starter")]
    starter: Option<PathBuf>,
    /// Write every item's tray to this file when the questions end.
    #[arg(long, value_name = "FILE.csv")]
    out: Option<PathBuf>,
    /// Speak JSON lines with another program on standard input and output.
    #[arg(long)]
    json: bool,
}

/// An item of the pile.
struct Item {
    known: Known,
    /// What it says, if it is a note.
    text: Option<String>,
    embedding: Vec<f32>,
}

/// How an item is known.
#[derive(Clone, Serialize, Deserialize)]
struct Known {
    /// To the person.
    name: String,
    /// To the program, by what is in it: a file that was renamed or a row that moved is still the same item.
    key: String,
}

#[derive(Serialize, Deserialize)]
struct Saved {
    version: u32,
    /// By item number.
    items: Vec<Known>,
    state: String,
}

/// Names an embedding: the same for the same content read by the same encoder. (FNV-1a, 64 bits.)
fn key(embedding: &[f32]) -> String {
    let step = |hash: u64, byte: u8| (hash ^ u64::from(byte)).wrapping_mul(0x0100_0000_01b3);
    let hash = embedding.iter().flat_map(|x| x.to_le_bytes()).fold(0xcbf2_9ce4_8422_2325, step);
    format!("{hash:016x}")
}

/// What the person or the other program wants.
#[derive(Deserialize)]
#[serde(tag = "do", rename_all = "kebab-case", deny_unknown_fields)]
enum Wish {
    Answer {
        tray: String,
        #[serde(default)]
        items: Vec<String>,
    },
    None {
        #[serde(default)]
        items: Vec<String>,
    },
    Skip {
        #[serde(default)]
        items: Vec<String>,
    },
    Strip {
        tray: String,
        #[serde(default = "usual_strip")]
        count: usize,
    },
    Undo,
    Redo,
    Stop,
}

fn usual_strip() -> usize {
    12
}

struct Session {
    sorter: Sorter,
    /// By item number.
    known: Vec<Known>,
    /// What each says, for notes.
    texts: Vec<Option<String>>,
    file: PathBuf,
}

impl Ask {
    /// Runs the command and tells how many items could not be read.
    pub fn run(self) -> Result<usize, Failure> {
        let (mut session, troubles) = self.begin()?;
        let stdin = std::io::stdin();
        let mut lines = stdin.lock().lines();
        let mut strip: Option<(String, Vec<usize>)> = None;
        loop {
            console::go_on()?;
            let asked = match &strip {
                Some((_, items)) => items.first().copied(),
                None => session.sorter.next_question(),
            };
            if self.json {
                output::show(session.question(asked).as_bytes()).map_err(Failure::because)?
            } else {
                self.show(&mut session, asked, strip.as_ref())?
            }
            let Some(item) = asked else { break };
            let Some(line) = lines.next() else { break };
            let line = line.map_err(|error| Failure::because(format!("the answer can't be read ({error})")))?;
            if line.trim().is_empty() {
                continue;
            }
            let wish = if self.json {
                serde_json::from_str(&line).map(Some).map_err(|error| ("not-understood".to_owned(), error.to_string()))
            } else {
                session.typed(line.trim(), item, &mut strip)
            };
            let outcome = match wish {
                Ok(Some(Wish::Stop)) => break,
                Ok(Some(wish)) => session.fulfil(wish, item).map(Some),
                Ok(None) => Ok(None),
                Err(refusal) => Err(refusal),
            };
            match outcome {
                Ok(Some(reply)) => {
                    if self.json && !reply.is_null() {
                        output::show(format!("{reply}\n").as_bytes()).map_err(Failure::because)?;
                    }
                    session.save()?;
                }
                Ok(None) => {}
                Err((code, message)) if self.json => {
                    let reply = json!({ "error": code, "message": message });
                    output::show(format!("{reply}\n").as_bytes()).map_err(Failure::because)?;
                }
                Err((_, message)) => console::say(&message),
            }
        }
        session.save()?;
        if let Some(path) = &self.out {
            session.write(path)?;
            console::say(&format!("the result is in {}", path.display()));
        }
        console::say(&format!("the answers are in {}; the same command goes on from there", session.file.display()));
        Ok(troubles)
    }

    fn begin(&self) -> Result<(Session, usize), Failure> {
        let (encoder, space, mut items, troubles) = self.read()?;
        let file = self.answers.clone().unwrap_or_else(|| {
            let mut name = self.pile.as_os_str().to_string_lossy().trim_end_matches(['/', '\\']).to_owned();
            name.push_str(".answers.json");
            PathBuf::from(name)
        });
        let starter = self.starter.as_deref().map(read_starter).transpose()?.map(Arc::new);
        let named = |error: &dyn std::fmt::Display| Failure::because(format!("{}: {error}", file.display()));
        let sorter = if file.exists() {
            let saved = read_saved(&file)?;
            let mut places: HashMap<&str, usize> = HashMap::new();
            for (place, item) in items.iter().enumerate() {
                places.entry(&item.known.key).or_insert(place);
            }
            let mut order = Vec::with_capacity(items.len());
            for Known { name, key } in &saved.items {
                let Some(&place) = places.get(key.as_str()) else {
                    return Err(named(&format!(
                        "an item it has answers for is no longer in the pile ({name}); put it back, or start anew with --answers ANOTHER.json"
                    )));
                };
                order.push(place);
            }
            let known: std::collections::HashSet<usize> = order.iter().copied().collect();
            order.extend((0..items.len()).filter(|place| !known.contains(place)));
            let mut open: Vec<Option<Item>> = items.into_iter().map(Some).collect();
            items = order.into_iter().filter_map(|place| open[place].take()).collect();
            let embeddings: Vec<f32> = items.iter().flat_map(|item| item.embedding.iter().copied()).collect();
            let sorter = Sorter::restore(&saved.state, &embeddings, starter).map_err(|error| named(&error))?;
            if sorter.settings().encoder != encoder || sorter.settings().space != space {
                return Err(named(&"its answers are for another kind of pile; name the pile they are for"));
            }
            sorter
        } else {
            let settings = Settings { encoder, space, learner: self.learner, seed: self.seed };
            let mut sorter = match starter {
                Some(starter) => Sorter::with_starter(settings, starter).map_err(Failure::because)?,
                None => Sorter::new(settings),
            };
            for item in &items {
                sorter
                    .add_item(&item.embedding)
                    .map_err(|error| Failure::because(format!("{}: {error}", item.known.name)))?;
            }
            sorter
        };
        let (known, texts) = items.into_iter().map(|item| (item.known, item.text)).unzip();
        Ok((Session { sorter, known, texts, file }, troubles))
    }

    fn read(&self) -> Result<(String, Space, Vec<Item>, usize), Failure> {
        let pile = material::pile(&self.pile, &self.reading)?;
        let column = match &pile.table {
            Some(table) => Some(notes::position(table, &self.pile, self.reading.column.as_deref(), "--column")?),
            None => None,
        };
        let mut troubles = pile.troubles;
        let mut times: HashMap<String, usize> = HashMap::new();
        let mut items = Vec::new();
        for item in pile.items {
            if let Err(error) = pile.space.place(&item.embedding) {
                console::say(&format!("item {}: {error}", item.name));
                troubles += 1;
                continue;
            }
            let text = match (&pile.table, column, item.row) {
                (Some(table), Some(column), Some(row)) => Some(table.rows[row].cells[column].clone()),
                _ if pile.kind == Kind::Notes => std::fs::read_to_string(self.pile.join(&item.name)).ok(),
                _ => None,
            };
            let mut key = key(&item.embedding);
            // The same content twice is two items: the second is told apart by its count.
            let times = times.entry(key.clone()).or_default();
            *times += 1;
            if *times > 1 {
                key = format!("{key} {times}");
            }
            items.push(Item { known: Known { name: item.name, key }, text, embedding: item.embedding });
        }
        if items.is_empty() {
            return Err(Failure::because(format!("{}: no item of the pile could be read", self.pile.display())));
        }
        Ok((pile.encoder, pile.space, items, troubles))
    }

    /// Shows the question to a person.
    fn show(
        &self,
        session: &mut Session,
        asked: Option<usize>,
        strip: Option<&(String, Vec<usize>)>,
    ) -> Result<(), Failure> {
        let Some(item) = asked else {
            return output::show(b"Every item has an answer.\n").map_err(Failure::because);
        };
        let mut text = session.standing();
        if let Some((tray, items)) = strip {
            text += &format!("\nDo these all go to {}?\n", plain(tray));
            for (place, &item) in items.iter().enumerate() {
                let note = session.texts[item].as_deref().map_or(String::new(), |note| format!(": {}", note.trim()));
                text += &format!("  {:>2}  {}\n", place + 1, plain(&(session.known[item].name.clone() + &note)));
            }
            text += "Enter y for all, the numbers of those that don't, or n for none of it: ";
        } else {
            text += &format!("\n{}\n", plain(&session.known[item].name));
            if let Some(note) = &session.texts[item] {
                text += &format!("  {}\n", plain(note.trim()));
            }
            for (place, (name, probability)) in session.choices(item).iter().enumerate() {
                let sure = probability.map_or(String::new(), |p| format!("  {:.0} %", 100.0 * p));
                text += &format!("  {:>2}  {}{sure}\n", place + 1, plain(name));
            }
            text += "Number or new name; - none of these, ? can't tell, = NUMBER several alike, u undo, q stop: ";
            if let Some(program) = &self.open
                && Kind::of(&self.pile) == Kind::Photos
            {
                let path = self.pile.join(&session.known[item].name);
                // Left running: a viewer may stay open while the person answers.
                if let Err(error) = Command::new(program).arg(path).spawn() {
                    console::say(&format!("{}: it can't be started ({error})", program.display()));
                }
            }
        }
        output::show(text.as_bytes()).map_err(Failure::because)
    }
}

fn read_saved(file: &Path) -> Result<Saved, Failure> {
    let named = |reason: String| Failure::because(format!("{}: {reason}", file.display()));
    let size = std::fs::metadata(file).map_err(|error| named(format!("it can't be read ({error})")))?.len();
    if size > FILE_LIMIT {
        return Err(named(format!("it has {} MB, too much for answers; name another file with --answers", size >> 20)));
    }
    let bytes = std::fs::read(file).map_err(|error| named(format!("it can't be read ({error})")))?;
    let saved: Saved = serde_json::from_slice(&bytes).map_err(|error| {
        named(format!("it holds no answers that can be read ({error}); name another file with --answers"))
    })?;
    if saved.version > VERSION {
        return Err(named(format!(
            "it has version {}, and this program reads up to {VERSION}; update it",
            saved.version
        )));
    }
    Ok(saved)
}

type Refusal = (String, String);

fn refused(error: kenspeckle::Error) -> Refusal {
    (error.code().to_owned(), error.to_string())
}

fn counted(answers: usize) -> String {
    if answers == 1 { "1 answer".into() } else { format!("{answers} answers") }
}

impl Session {
    fn save(&self) -> Result<(), Failure> {
        let saved = Saved { version: VERSION, items: self.known.clone(), state: self.sorter.state() };
        output::write_whole(&self.file, |file| serde_json::to_writer(file, &saved).map_err(|error| error.to_string()))
    }

    /// The trays, most probable first for this item, then those without an answer.
    fn choices(&mut self, item: usize) -> Vec<(String, Option<f64>)> {
        let ranking = self.sorter.ranking(item).unwrap_or_default();
        let trays: Vec<(usize, String)> =
            self.sorter.ledger().trays().map(|(tray, name)| (tray, name.to_owned())).collect();
        let name = |tray: usize| trays.iter().find(|(number, _)| *number == tray).map(|(_, name)| name.clone());
        let mut choices: Vec<(String, Option<f64>)> =
            ranking.iter().filter_map(|&(tray, p)| Some((name(tray)?, Some(p)))).collect();
        let ranked = |tray: usize| ranking.iter().any(|&(other, _)| other == tray);
        choices.extend(trays.iter().filter(|(tray, _)| !ranked(*tray)).map(|(_, name)| (name.clone(), None)));
        choices
    }

    fn answers(&self) -> usize {
        let ledger = self.sorter.ledger();
        (0..ledger.items()).filter(|&item| !ledger.is_removed(item) && ledger.answer(item) != Answer::Open).count()
    }

    /// How far the job is, in one line.
    fn standing(&mut self) -> String {
        let answers = self.answers();
        match self.sorter.outlook() {
            None => format!("\n{}.", counted(answers)),
            Some(outlook) => {
                let (now, later) = (outlook.now, outlook.after_more);
                format!(
                    "\n{}; about {:.0} % of the rest is sorted right ({:.0}–{:.0} %), ten more would make it about {:.0} %.",
                    counted(answers),
                    100.0 * now.expected,
                    100.0 * now.low,
                    100.0 * now.high,
                    100.0 * later.expected
                )
            }
        }
    }

    fn question(&mut self, asked: Option<usize>) -> String {
        let answers = self.answers();
        let range = |range: kenspeckle::forecast::Range| json!([range.low, range.expected, range.high]);
        let outlook = self
            .sorter
            .outlook()
            .map(|outlook| json!({ "now": range(outlook.now), "after_ten_more": range(outlook.after_more) }));
        let line = match asked {
            None => json!({ "done": true, "answers": answers, "outlook": outlook }),
            Some(item) => {
                let trays: Vec<Value> = self
                    .choices(item)
                    .into_iter()
                    .map(|(name, probability)| json!({ "name": name, "probability": probability }))
                    .collect();
                json!({ "ask": self.known[item].name, "text": self.texts[item], "trays": trays, "answers": answers, "outlook": outlook })
            }
        };
        format!("{line}\n")
    }

    fn tray(&self, name: &str) -> Option<usize> {
        let folded = name.trim().to_lowercase();
        self.sorter.ledger().trays().find(|(_, known)| known.to_lowercase() == folded).map(|(tray, _)| tray)
    }

    fn items(&self, names: &[String], asked: usize) -> Result<Vec<usize>, Refusal> {
        if names.is_empty() {
            return Ok(vec![asked]);
        }
        let number = |name: &String| {
            let found = self.known.iter().position(|known| known.name == *name);
            found.ok_or_else(|| ("no-such-item".to_owned(), format!("there is no item “{name}” in the pile")))
        };
        names.iter().map(number).collect()
    }

    /// Does what is wished; gives what there is to tell.
    fn fulfil(&mut self, wish: Wish, asked: usize) -> Result<Value, Refusal> {
        match wish {
            Wish::Answer { tray, items } => {
                let items = self.items(&items, asked)?;
                match self.tray(&tray) {
                    Some(tray) => self.sorter.answer_all(&items, tray).map_err(refused)?,
                    None => {
                        let made = self.sorter.answer_new(items[0], &tray).map_err(refused)?;
                        self.sorter.answer_all(&items, made).map_err(refused)?;
                    }
                }
            }
            Wish::None { items } => {
                for item in self.items(&items, asked)? {
                    self.sorter.answer_none(item).map_err(refused)?;
                }
            }
            Wish::Skip { items } => {
                for item in self.items(&items, asked)? {
                    self.sorter.skip(item).map_err(refused)?;
                }
            }
            Wish::Strip { tray, count } => {
                let Some(number) = self.tray(&tray) else {
                    return Err(("no-such-tray".to_owned(), format!("there is no tray “{tray}”")));
                };
                let items: Vec<&str> =
                    self.sorter.strip(number, count).into_iter().map(|item| self.known[item].name.as_str()).collect();
                return Ok(json!({ "strip": items, "tray": tray }));
            }
            Wish::Undo => {
                self.sorter.undo();
            }
            Wish::Redo => {
                self.sorter.redo();
            }
            Wish::Stop => {}
        }
        Ok(Value::Null)
    }

    /// What a person typed; `None` if it only changed what is shown.
    fn typed(
        &mut self,
        text: &str,
        item: usize,
        strip: &mut Option<(String, Vec<usize>)>,
    ) -> Result<Option<Wish>, Refusal> {
        let unclear = |message: &str| ("not-understood".to_owned(), message.to_owned());
        if let Some((tray, items)) = strip.take() {
            let names = |items: &[usize]| items.iter().map(|&item| self.known[item].name.clone()).collect::<Vec<_>>();
            return match text {
                "n" => Ok(None),
                "y" => Ok(Some(Wish::Answer { tray, items: names(&items) })),
                numbers => {
                    let out: Option<Vec<usize>> = numbers
                        .split([' ', ','])
                        .filter(|part| !part.is_empty())
                        .map(|part| part.parse().ok().filter(|number| (1..=items.len()).contains(number)))
                        .collect();
                    let Some(out) = out else {
                        *strip = Some((tray, items));
                        return Err(unclear("type y, n, or the numbers of those that don't belong there"));
                    };
                    let rest: Vec<usize> = (0..items.len())
                        .filter(|place| !out.contains(&(place + 1)))
                        .map(|place| items[place])
                        .collect();
                    if rest.is_empty() { Ok(None) } else { Ok(Some(Wish::Answer { tray, items: names(&rest) })) }
                }
            };
        }
        let choices = self.choices(item);
        let chosen = |text: &str| match text.trim().parse::<usize>() {
            Ok(number) => match choices.get(number.wrapping_sub(1)) {
                Some((name, _)) => Ok(name.clone()),
                None => Err(unclear(&format!("there is no tray with the number {number} here"))),
            },
            Err(_) => Ok(text.trim().to_owned()),
        };
        Ok(Some(match text {
            "-" => Wish::None { items: Vec::new() },
            "?" => Wish::Skip { items: Vec::new() },
            "u" => Wish::Undo,
            "q" => Wish::Stop,
            text if text.starts_with('=') => {
                let tray = chosen(&text[1..])?;
                let number = self.tray(&tray).ok_or_else(|| unclear("name a tray that is there, by its number"))?;
                let items = self.sorter.strip(number, usual_strip());
                if items.is_empty() {
                    return Err(unclear("nothing else is likely enough to go there"));
                }
                *strip = Some((tray, items));
                return Ok(None);
            }
            text => Wish::Answer { tray: chosen(text)?, items: Vec::new() },
        }))
    }

    fn write(&mut self, path: &Path) -> Result<(), Failure> {
        let trays: HashMap<usize, String> =
            self.sorter.ledger().trays().map(|(tray, name)| (tray, name.to_owned())).collect();
        let verdicts = self.sorter.verdicts().to_vec();
        let header = ["item", "tray", "probability", "answered"].map(str::to_owned).to_vec();
        let rows = self.known.iter().zip(&verdicts).filter_map(|(known, verdict)| {
            let verdict = (*verdict)?;
            let sorted = verdict.tray.filter(|_| verdict.set_aside.is_none());
            let tray = sorted.and_then(|tray| trays.get(&tray)).map_or("", String::as_str);
            let answered = if matches!(verdict.answer, Answer::Tray(_) | Answer::None) { "yes" } else { "no" };
            Some(vec![
                output::cell(&known.name),
                output::cell(tray),
                format!("{:.4}", verdict.probability),
                answered.to_owned(),
            ])
        });
        let rows: Vec<Vec<String>> = std::iter::once(header).chain(rows).collect();
        output::write_whole(path, |file| output::table(file, rows))
    }
}
