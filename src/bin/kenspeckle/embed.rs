//! `kenspeckle embed`: photos or notes in, an `.npy` file of vectors out.

use std::path::PathBuf;

use clap::Args;
use ndarray::Array2;

use crate::{
    console::{self, Failure},
    material::{self, Kind, Reading},
    output,
    vectors::{self, Origin},
};

/// Turn photos or notes into vectors for use elsewhere.
///
/// Writes one row of numbers (float32) for each photo, in order of name, or for each note, in order of line: 1280 numbers that
/// are never negative for photos, 384 signed ones for notes. FILE.names.csv beside it holds the items' names in the same order
/// and, for a table of notes, all of its columns; FILE.encoder.json says which encoder it was. Items that are alike get vectors
/// that point the same way.
#[derive(Args)]
pub struct Embed {
    /// A folder of photos (JPEG, PNG, WebP, GIF or BMP, in any depth), or notes: a .txt file with one a line, a table (.csv,
    /// .tsv, .jsonl), or a folder of .txt files with one each.
    pile: PathBuf,
    /// For a table of notes: the column that holds the notes.
    #[arg(long, value_name = "NAME")]
    column: Option<String>,
    /// The .npy file to write.
    #[arg(long, value_name = "FILE.npy")]
    out: PathBuf,
}

impl Embed {
    /// Runs the command and tells how many items could not be read.
    pub fn run(self) -> Result<usize, Failure> {
        let kind = Kind::of(&self.pile);
        if kind == Kind::Vectors {
            return Err(Failure::because(format!("{}: these are vectors already", self.pile.display())));
        }
        let reading = Reading { column: self.column, category: None, signed: false, encoder: None };
        let pile = material::pile(&self.pile, &reading)?;
        let Some(first) = pile.items.first() else {
            return Err(Failure::because(format!(
                "{}: none of its {} can be read",
                self.pile.display(),
                if kind == Kind::Photos { "files is a photo that" } else { "notes" }
            )));
        };
        let dimension = first.embedding.len();
        let array = Array2::from_shape_fn((pile.items.len(), dimension), |(i, j)| pile.items[i].embedding[j]);
        console::go_on()?;
        output::write_whole(&self.out, |file| vectors::write(&array, file))?;
        let columns = pile.table.as_ref().map_or(&[][..], |table| &table.columns);
        let header = std::iter::once("item".to_owned()).chain(columns.iter().cloned()).collect();
        let row = |item: &crate::labelled::Item| {
            let cells = pile.table.as_ref().zip(item.row).map_or(&[][..], |(table, row)| &table.rows[row].cells);
            std::iter::once(item.name.clone()).chain(cells.iter().cloned()).collect()
        };
        let names = self.out.with_extension("names.csv");
        output::write_whole(&names, |file| {
            output::table(file, std::iter::once(header).chain(pile.items.iter().map(row)))
        })?;
        let origin = Origin { encoder: pile.encoder, numbers: dimension, non_negative: pile.space.non_negative() };
        output::write_whole(&vectors::origin_path(&self.out), |file| {
            serde_json::to_writer_pretty(file, &origin).map_err(|error| error.to_string())
        })?;
        console::say(&format!(
            "{} {}, {dimension} numbers each, in {}; their names in {}",
            pile.items.len(),
            pile.kind.noun(),
            self.out.display(),
            names.display()
        ));
        Ok(pile.troubles)
    }
}
