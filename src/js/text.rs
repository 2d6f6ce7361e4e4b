//! Notes: a text in, an embedding out; files of notes in, rows out.

use serde::Serialize;
use wasm_bindgen::prelude::*;

use super::js_error;
use crate::{
    encoder::{self, Encoder, EncoderError},
    table::{self, Format},
};

fn thrown(error: EncoderError) -> JsValue {
    js_error(error.code(), &error.to_string())
}

/// Turns notes into embeddings. Reading one note takes a while and blocks: run it in a worker.
#[wasm_bindgen]
pub struct NoteEncoder(encoder::NoteEncoder);

#[wasm_bindgen]
impl NoteEncoder {
    /// Reads the encoder file, `encoders/text.onnx`.
    ///
    /// Throws "encoder-file" when the file is damaged or another one.
    #[wasm_bindgen(constructor)]
    pub fn new(file: Vec<u8>) -> Result<NoteEncoder, JsValue> {
        encoder::NoteEncoder::from_bytes(file).map(Self).map_err(thrown)
    }

    /// Numbers in an embedding.
    #[wasm_bindgen(getter)]
    pub fn dimension(&self) -> usize {
        self.0.dimension()
    }

    /// Names the network and its file: embeddings with different identities can't be compared.
    #[wasm_bindgen(getter)]
    pub fn identity(&self) -> String {
        self.0.identity().to_owned()
    }

    /// Whether no number of an embedding is ever below zero.
    #[wasm_bindgen(getter = nonNegative)]
    pub fn non_negative(&self) -> bool {
        self.0.non_negative()
    }

    /// Reads one note. More than 254 tokens (about 180 words) are read in parts and averaged.
    ///
    /// Throws "note-empty" or "note-too-long"; the message is a clause about the note, to put after its name and a colon.
    pub fn read(&self, note: &str) -> Result<Note, JsValue> {
        self.0.read(note).map(Note).map_err(thrown)
    }
}

/// What is kept of one note.
#[wasm_bindgen]
pub struct Note(encoder::Note);

#[wasm_bindgen]
impl Note {
    /// The note's numbers, as many as the encoder's dimension; of unit length.
    pub fn embedding(&self) -> Vec<f32> {
        self.0.embedding.clone()
    }

    /// Tokens in the note: mostly short words and parts of longer ones.
    #[wasm_bindgen(getter)]
    pub fn tokens(&self) -> usize {
        self.0.tokens
    }

    /// Parts the note was read in: 1 unless it is long.
    #[wasm_bindgen(getter)]
    pub fn parts(&self) -> usize {
        self.0.parts
    }

    /// 32 hexadecimal digits that stand for the note's text, white space around it aside.
    #[wasm_bindgen(getter)]
    pub fn fingerprint(&self) -> String {
        self.0.fingerprint.clone()
    }
}

#[wasm_bindgen(typescript_custom_section)]
const TYPES: &str = r#"
/** A file of notes with all of its columns. */
export interface NoteTable {
  /** The columns' names; a file of lines has one, "note". */
  columns: string[];
  /** One array a row, as many cells as columns. */
  rows: string[][];
  /** The line of the file that each row begins in, from 1. */
  lines: number[];
  /** "UTF-8", "UTF-16", or "Windows-1252" where it was guessed: then letters may be wrong. */
  encoding: string;
  /** What could not be taken: one sentence each, which begins with the line. */
  troubles: string[];
}
"#;

#[wasm_bindgen]
extern "C" {
    /// See `NoteTable`.
    #[wasm_bindgen(typescript_type = "NoteTable")]
    pub type NoteTable;
}

#[derive(Serialize)]
struct Table {
    columns: Vec<String>,
    rows: Vec<Vec<String>>,
    lines: Vec<usize>,
    encoding: &'static str,
    troubles: Vec<String>,
}

/// Reads a file of notes: `.csv`, `.tsv` and `.tab` as tables, `.jsonl` and `.ndjson` as JSON lines, all else line by line.
///
/// Throws "file-too-large", "not-text", "table-empty" or "table-unreadable"; the message is a clause about the file.
#[wasm_bindgen(js_name = readNoteTable)]
pub fn read_note_table(bytes: &[u8], name: &str) -> Result<NoteTable, JsValue> {
    let table = table::Table::read(bytes, Format::of_name(name)).map_err(|e| js_error(e.code(), &e.to_string()))?;
    let (lines, rows) = table.rows.into_iter().map(|row| (row.line, row.cells)).unzip();
    let encoding = table.encoding.name();
    let table = Table { columns: table.columns, rows, lines, encoding, troubles: table.troubles };
    let table = serde_wasm_bindgen::to_value(&table).map_err(|e| js_error("table-unreadable", &e.to_string()))?;
    Ok(table.into())
}
