//! Piles and labelled material of any kind: photos, notes or vectors, with the encoder they belong to.

use std::{collections::HashMap, path::Path};

use clap::Args;
use kenspeckle::{
    Space,
    encoder::{Encoder, NoteEncoder, PhotoEncoder},
    table::Table,
};
use ndarray::Array2;

use crate::{
    console::{self, Failure},
    labelled::{self, Example, Item},
    notes, photos, vectors,
};

/// How to read what was named on the command line.
#[derive(Args, Clone)]
pub struct Reading {
    /// For a table of notes (.csv, .tsv, .jsonl): the column that holds the notes.
    #[arg(long, value_name = "NAME")]
    pub column: Option<String>,
    /// For a table of notes whose category is known: the column that holds the category. Rows without one are left out.
    #[arg(long, value_name = "NAME")]
    pub category: Option<String>,
    /// Vectors have a sign even if no number happens to be negative (by default, vectors without any negative number are
    /// compared by their square roots, which suits what comes after a rectifier).
    #[arg(long)]
    pub signed: bool,
    /// What the encoder of the vectors is called, so that they never meet those of another one [default: what `kenspeckle
    /// embed` wrote beside the .npy file, or “vectors”].
    #[arg(long, value_name = "NAME")]
    pub encoder: Option<String>,
}

/// What an item is before it is a vector.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Kind {
    /// A picture file.
    Photos,
    /// A text.
    Notes,
    /// Numbers already.
    Vectors,
}

impl Kind {
    /// By the name of the file, or what is in the folder.
    pub fn of(path: &Path) -> Self {
        if vectors::is_npy(path) {
            Self::Vectors
        } else if notes::are_at(path) {
            Self::Notes
        } else {
            Self::Photos
        }
    }

    /// What several of them are called.
    pub fn noun(self) -> &'static str {
        match self {
            Self::Photos => "photos",
            Self::Notes => "notes",
            Self::Vectors => "vectors",
        }
    }
}

/// A pile, read.
pub struct Pile {
    /// What its items are.
    pub kind: Kind,
    /// The identity of their encoder.
    pub encoder: String,
    /// The space their encoder asks for.
    pub space: Space,
    /// Those that could be read, in order.
    pub items: Vec<Item>,
    /// How many could not be read.
    pub troubles: usize,
    /// The table they are from, if they are.
    pub table: Option<Table>,
}

/// Material whose categories are known, read.
pub struct Labelled {
    /// What its items are.
    pub kind: Kind,
    /// The identity of their encoder.
    pub encoder: String,
    /// The space their encoder asks for.
    pub space: Space,
    /// Those that could be read, in order.
    pub examples: Vec<Example>,
    /// How many could not be read.
    pub troubles: usize,
}

/// The program's text encoder, and the identity and space that come with it.
struct Text {
    encoder: NoteEncoder,
    identity: String,
    space: Space,
}

impl Text {
    fn load() -> Result<Self, Failure> {
        let encoder = NoteEncoder::bundled().map_err(Failure::because)?;
        let space = Space::new(encoder.dimension(), encoder.non_negative()).map_err(Failure::because)?;
        Ok(Self { identity: encoder.identity().to_owned(), encoder, space })
    }
}

fn photo_space() -> Result<(String, Space), Failure> {
    let encoder = PhotoEncoder::bundled().map_err(Failure::because)?;
    let space = Space::new(encoder.dimension(), encoder.non_negative()).map_err(Failure::because)?;
    Ok((encoder.identity().to_owned(), space))
}

fn say_all(troubles: &[String]) {
    troubles.iter().for_each(|trouble| console::say(trouble));
}

fn nothing_in(path: &Path) -> Failure {
    Failure::because(format!("{}: there is no file in this folder; name the folder with the pile", path.display()))
}

/// Reads a pile of any kind.
pub fn pile(path: &Path, reading: &Reading) -> Result<Pile, Failure> {
    let kind = Kind::of(path);
    match kind {
        Kind::Vectors => {
            let array = vectors::read(path)?;
            let (encoder, space) = vector_space(&[(path, &array)], reading)?;
            Ok(Pile { kind, encoder, space, items: labelled::items(&array, path), troubles: 0, table: None })
        }
        Kind::Photos => {
            let parts = photos::files_below(path)?;
            if parts.is_empty() {
                return Err(nothing_in(path));
            }
            let (found, troubles) = photos::embed(path, &parts, "pile")?;
            say_all(&labelled::within(path, troubles.clone()));
            say_repeated(&found);
            let (encoder, space) = photo_space()?;
            let items = found.into_iter().map(|photo| Item::new(photo.name, photo.embedding)).collect();
            Ok(Pile { kind, encoder, space, items, troubles: troubles.len(), table: None })
        }
        Kind::Notes => {
            let text = Text::load()?;
            let (unread, troubles, table) = notes_of(path, reading)?;
            let (found, unusable) = notes::embed(&text.encoder, unread, "pile")?;
            say_all(&named(path, &unusable));
            let item = |note: notes::Note| Item { row: note.row, ..Item::new(note.name, note.embedding) };
            let items = found.into_iter().map(item).collect();
            let troubles = troubles + unusable.len();
            Ok(Pile { kind, encoder: text.identity, space: text.space, items, troubles, table })
        }
    }
}

/// Notes at a path, how many could not be read, and their table.
fn notes_of(path: &Path, reading: &Reading) -> Result<(Vec<notes::Unread>, usize, Option<Table>), Failure> {
    if path.is_dir() {
        let (unread, troubles) = notes::in_files(path, &photos::files_below(path)?);
        say_all(&labelled::within(path, troubles.clone()));
        return Ok((unread, troubles.len(), None));
    }
    let table = notes::table(path)?;
    let unread = notes::in_column(&table, path, reading.column.as_deref())?;
    Ok((unread, table.troubles.len(), Some(table)))
}

/// Reads material of any kind whose categories are known: photos or notes in a folder for each category, notes in a file of
/// lines named like each category, a table with a column of categories, or vectors with a file of labels.
pub fn labelled(path: &Path, labels: Option<&Path>, reading: &Reading, what: &str) -> Result<Labelled, Failure> {
    let kind = Kind::of(path);
    if let (Some(labels), true) = (labels, kind != Kind::Vectors) {
        return Err(Failure::because(format!(
            "{}: --labels goes with an .npy file; the categories of {} are named by their folders or, in a table, by --category",
            labels.display(),
            kind.noun()
        )));
    }
    match kind {
        Kind::Vectors => {
            let labels = labels.ok_or_else(|| without_labels(path))?;
            let array = vectors::read(path)?;
            let (encoder, space) = vector_space(&[(path, &array)], reading)?;
            let examples = labelled::vectors(&array, path, labels)?;
            Ok(Labelled { kind, encoder, space, examples, troubles: 0 })
        }
        Kind::Photos => {
            let (found, troubles) = labelled::photos(path, what)?;
            say_all(&troubles);
            let (encoder, space) = photo_space()?;
            let examples = found
                .into_iter()
                .map(|photo| {
                    let category = labelled::folder_of(&photo.name);
                    (Example { item: Item::new(photo.name, photo.embedding), category }, photo.fingerprint)
                })
                .collect();
            let (examples, disputed) = labelled::without_disputed(examples, "file");
            Ok(Labelled { kind, encoder, space, examples, troubles: troubles.len() + disputed })
        }
        Kind::Notes => {
            let text = Text::load()?;
            let (found, troubles) = labelled_notes(path, reading)?;
            let (found, unusable) = notes::embed(&text.encoder, found, what)?;
            say_all(&named(path, &unusable));
            let examples = found
                .into_iter()
                .filter_map(|note| {
                    let item = Item::new(note.name, note.embedding);
                    Some((Example { item, category: note.category? }, note.fingerprint))
                })
                .collect();
            let (examples, disputed) = labelled::without_disputed(examples, "note");
            let troubles = troubles + unusable.len() + disputed;
            Ok(Labelled { kind, encoder: text.identity, space: text.space, examples, troubles })
        }
    }
}

/// Lines about places in a file or folder, with its name.
fn named(path: &Path, lines: &[String]) -> Vec<String> {
    let mark = if path.is_dir() { "/" } else { ": " };
    lines.iter().map(|line| format!("{}{mark}{line}", path.display())).collect()
}

/// Notes with their categories, and how many could not be read.
fn labelled_notes(path: &Path, reading: &Reading) -> Result<(Vec<notes::Unread>, usize), Failure> {
    if !path.is_dir() {
        let table = notes::table(path)?;
        let Some(category) = reading.category.as_deref() else {
            return Err(Failure::because(format!(
                "{}: say which column holds the categories: --category NAME ({})",
                path.display(),
                table.columns.join(", ")
            )));
        };
        let category = notes::position(&table, path, Some(category), "--category")?;
        let unread = notes::in_column(&table, path, reading.column.as_deref())?;
        let found: Vec<_> = unread
            .into_iter()
            .zip(&table.rows)
            .map(|(note, row)| (note, row.cells[category].trim()))
            .filter(|(_, category)| !category.is_empty())
            .map(|(note, category)| notes::Unread { category: Some(category.to_owned()), ..note })
            .collect();
        let left_out = table.rows.len() - found.len();
        if left_out > 0 {
            console::say(&format!("{}: {left_out} rows name no category and are left out", path.display()));
        }
        return Ok((found, table.troubles.len()));
    }
    let (inside, loose): (Vec<_>, Vec<_>) =
        photos::files_below(path)?.into_iter().partition(|part| part.components().count() > 1);
    let (unread, troubles) = notes::in_files(path, &inside);
    say_all(&labelled::within(path, troubles.clone()));
    let mut found: Vec<_> = unread
        .into_iter()
        .map(|note| notes::Unread { category: Some(labelled::folder_of(&note.name)), ..note })
        .collect();
    // A file of lines is a category by itself, named like it.
    for part in loose {
        let table = notes::table(&path.join(&part))?;
        let category = part.file_stem().map(|stem| stem.to_string_lossy().into_owned()).unwrap_or_default();
        for mut note in notes::in_column(&table, path, None)? {
            note.name = format!("{}, {}", photos::shown(&part), note.name);
            note.category = Some(category.clone());
            found.push(note);
        }
    }
    Ok((found, troubles.len()))
}

/// The encoder's identity and the space of these vectors, taken together.
pub fn vector_space(arrays: &[(&Path, &Array2<f32>)], reading: &Reading) -> Result<(String, Space), Failure> {
    let mut encoder = reading.encoder.clone();
    let mut non_negative = None;
    for (path, array) in arrays {
        let Some(origin) = vectors::origin_beside(path)? else { continue };
        if origin.numbers != array.ncols() {
            return Err(Failure::because(format!(
                "{}: its vectors have {} numbers and the file beside it says {}; embed the items again",
                path.display(),
                array.ncols(),
                origin.numbers
            )));
        }
        if reading.encoder.is_none() {
            if let Some(other) = encoder.as_ref().filter(|&other| *other != origin.encoder) {
                return Err(Failure::because(format!(
                    "{}: its vectors are by the encoder {}, and the others by {other}; embed all items with one encoder",
                    path.display(),
                    origin.encoder
                )));
            }
            encoder = Some(origin.encoder);
        }
        non_negative = Some(non_negative.unwrap_or(true) && origin.non_negative);
    }
    let without_sign = || arrays.iter().all(|(_, array)| array.iter().all(|&x| x >= 0.0));
    let non_negative = !reading.signed && non_negative.unwrap_or(true) && without_sign();
    let dimension = arrays.first().map_or(0, |(_, array)| array.ncols());
    let space = Space::new(dimension, non_negative).map_err(Failure::because)?;
    Ok((encoder.unwrap_or_else(|| "vectors".into()), space))
}

/// A pile and examples to sort it by, in one space.
pub fn pile_and_examples(
    pile_path: &Path,
    examples_path: &Path,
    labels: Option<&Path>,
    reading: &Reading,
) -> Result<(Pile, Labelled), Failure> {
    let (kind, other) = (Kind::of(pile_path), Kind::of(examples_path));
    if kind != other {
        return Err(Failure::because(format!(
            "the pile holds {} and the examples {}: both must be of one kind; `kenspeckle embed` turns photos and notes into \
             vectors (.npy)",
            kind.noun(),
            other.noun()
        )));
    }
    if kind != Kind::Vectors {
        // Read first: there are few of them, and what is wrong with them is soon told.
        let examples = labelled(examples_path, labels, reading, "examples")?;
        return Ok((pile(pile_path, reading)?, examples));
    }
    let labels = labels.ok_or_else(|| without_labels(examples_path))?;
    let (numbers, known) = (vectors::read(pile_path)?, vectors::read(examples_path)?);
    if numbers.ncols() != known.ncols() {
        return Err(Failure::because(format!(
            "the pile's vectors have {} numbers and the examples' {}; use vectors of one encoder",
            numbers.ncols(),
            known.ncols()
        )));
    }
    let (encoder, space) = vector_space(&[(pile_path, &numbers), (examples_path, &known)], reading)?;
    let examples = labelled::vectors(&known, examples_path, labels)?;
    let items = labelled::items(&numbers, pile_path);
    Ok((
        Pile { kind, encoder: encoder.clone(), space, items, troubles: 0, table: None },
        Labelled { kind, encoder, space, examples, troubles: 0 },
    ))
}

fn without_labels(path: &Path) -> Failure {
    Failure::because(format!(
        "{}: an .npy file needs --labels FILE.csv, one category a line in the same order",
        path.display()
    ))
}

/// Says which photos of the pile are the same file; they are sorted all the same.
fn say_repeated(pile: &[photos::Photo]) {
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
