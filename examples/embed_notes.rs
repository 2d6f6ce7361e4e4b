//! Embeds notes: `embed_notes ENCODER.onnx NOTES.json OUT.npy TOKENS.json`; `-` for OUT or TOKENS leaves that file out.
//! NOTES.json holds an array of strings.

use std::{env, error::Error, fs};

use kenspeckle::encoder::{Encoder, NoteEncoder};

fn main() -> Result<(), Box<dyn Error>> {
    let arguments: Vec<String> = env::args().skip(1).collect();
    let [encoder, notes, out, tokens] = arguments.as_slice() else {
        return Err("usage: embed_notes ENCODER.onnx NOTES.json OUT.npy|- TOKENS.json|-".into());
    };
    let encoder = NoteEncoder::from_bytes(fs::read(encoder)?)?;
    let notes: Vec<String> = serde_json::from_slice(&fs::read(notes)?)?;
    if tokens != "-" {
        let rows: Vec<Vec<i32>> = notes.iter().map(|note| encoder.tokens(note).unwrap_or_default()).collect();
        fs::write(tokens, serde_json::to_vec(&rows)?)?;
    }
    if out != "-" {
        let mut numbers = Vec::with_capacity(notes.len() * encoder.dimension());
        for note in &notes {
            numbers.extend(encoder.embed(note)?);
        }
        let shape = (notes.len(), encoder.dimension());
        ndarray_npy::write_npy(out, &ndarray::Array2::from_shape_vec(shape, numbers)?)?;
    }
    Ok(())
}
