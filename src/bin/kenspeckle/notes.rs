//! Notes in files: lines, tables, JSON lines or one a file; and their embeddings.

use std::{
    fs,
    path::{Path, PathBuf},
};

use kenspeckle::{
    encoder::NoteEncoder,
    table::{Encoding, Format, MAX_BYTES, Table, decode},
};

use crate::{
    console::{self, Failure},
    parallel, photos,
};

/// What the endings of files with notes are.
const ENDINGS: [&str; 6] = ["txt", "csv", "tsv", "tab", "jsonl", "ndjson"];

/// A note that has not been embedded yet.
pub struct Unread {
    /// How the person finds it: its line, or its path within the folder.
    pub name: String,
    /// What it says.
    pub text: String,
    /// Its row in the table, if it is from one.
    pub row: Option<usize>,
    /// Its category, where it is known.
    pub category: Option<String>,
}

/// A note with its embedding.
pub struct Note {
    /// As in [`Unread`].
    pub name: String,
    /// As in [`Unread`].
    pub row: Option<usize>,
    /// As in [`Unread`].
    pub category: Option<String>,
    /// As the encoder gives it.
    pub embedding: Vec<f32>,
    /// Names the note's text.
    pub fingerprint: String,
}

fn has_ending(path: &Path, endings: &[&str]) -> bool {
    path.extension().is_some_and(|own| endings.iter().any(|ending| own.eq_ignore_ascii_case(ending)))
}

/// Whether the path is a file of notes by its ending, or a folder of nothing but `.txt` files.
pub fn are_at(path: &Path) -> bool {
    if !path.is_dir() {
        return has_ending(path, &ENDINGS);
    }
    // What is wrong with the folder shows when it is read.
    photos::files_below(path)
        .is_ok_and(|parts| !parts.is_empty() && parts.iter().all(|part| has_ending(part, &ENDINGS[..1])))
}

fn bytes_of(path: &Path) -> Result<Vec<u8>, String> {
    let cannot = |error: std::io::Error| format!("it can't be read ({error})");
    let size = fs::metadata(path).map_err(cannot)?.len();
    if size > MAX_BYTES as u64 {
        return Err(format!("it has {} MB, more than notes take; divide it", size >> 20));
    }
    fs::read(path).map_err(cannot)
}

fn say_if_guessed(path: &Path, encoding: Encoding) {
    if encoding == Encoding::Windows1252 {
        console::say(&format!(
            "{}: read as Windows-1252, since it is not UTF-8; if letters come out wrong, save it as UTF-8",
            path.display()
        ));
    }
}

/// Reads a file of lines, a table or JSON lines, and says what could not be taken.
pub fn table(path: &Path) -> Result<Table, Failure> {
    let named = |reason: String| Failure::because(format!("{}: {reason}", path.display()));
    let bytes = bytes_of(path).map_err(named)?;
    let format = Format::of_name(&path.to_string_lossy());
    let table = Table::read(&bytes, format).map_err(|error| named(error.to_string()))?;
    say_if_guessed(path, table.encoding);
    table.troubles.iter().for_each(|trouble| console::say(&format!("{}: {trouble}", path.display())));
    Ok(table)
}

/// Where a row of a table is.
pub fn line(table: &Table, row: usize) -> String {
    format!("line {}", table.rows[row].line)
}

/// The notes in a column of the table; of the only one if none is named.
pub fn in_column(table: &Table, path: &Path, column: Option<&str>) -> Result<Vec<Unread>, Failure> {
    let column = position(table, path, column, "--column")?;
    let note = |row: usize| Unread {
        name: line(table, row),
        text: table.rows[row].cells[column].clone(),
        row: Some(row),
        category: None,
    };
    Ok((0..table.rows.len()).map(note).collect())
}

/// The position of the column that an option of the command line names.
pub fn position(table: &Table, path: &Path, column: Option<&str>, option: &str) -> Result<usize, Failure> {
    table.column(column).map_err(|error| Failure::because(format!("{}: {error} ({option} NAME)", path.display())))
}

/// The notes in these files of a folder, one each; and the lines about those that could not be read.
pub fn in_files(folder: &Path, parts: &[PathBuf]) -> (Vec<Unread>, Vec<String>) {
    let mut notes = Vec::new();
    let mut troubles = Vec::new();
    for part in parts {
        let name = photos::shown(part);
        let path = folder.join(part);
        match bytes_of(&path).and_then(|bytes| decode(&bytes).map_err(|error| error.to_string())) {
            Ok((text, encoding)) => {
                say_if_guessed(&path, encoding);
                notes.push(Unread { name, text, row: None, category: None });
            }
            Err(reason) => troubles.push(format!("{name}: {reason}")),
        }
    }
    (notes, troubles)
}

/// The notes' embeddings in order, and the lines about those that have none.
pub fn embed(encoder: &NoteEncoder, notes: Vec<Unread>, what: &str) -> Result<(Vec<Note>, Vec<String>), Failure> {
    let outcomes = parallel::each(
        notes.len(),
        what,
        || encoder.clone(),
        |encoder, index| {
            let Unread { name, text, row, category } = &notes[index];
            let read = encoder.read(text).map_err(|error| format!("{name}: {error}"))?;
            let note = Note {
                name: name.clone(),
                row: *row,
                category: category.clone(),
                embedding: read.embedding,
                fingerprint: read.fingerprint,
            };
            Ok((note, read.parts))
        },
    )?;
    let mut embedded = Vec::new();
    let mut troubles = Vec::new();
    let mut in_parts = 0;
    for outcome in outcomes {
        match outcome {
            Ok((note, parts)) => {
                in_parts += usize::from(parts > 1);
                embedded.push(note);
            }
            Err(trouble) => troubles.push(trouble),
        }
    }
    if in_parts > 0 {
        console::say(&format!(
            "{in_parts} {} longer than 254 tokens (about 180 words), read in parts and averaged",
            if in_parts == 1 { "note is" } else { "notes are" }
        ));
    }
    Ok((embedded, troubles))
}
