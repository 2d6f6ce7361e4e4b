//! Embeds photos with an encoder file: `embed_photos ENCODER.onnx OUT.npy PHOTO…`.
//!
//! `OUT.npy` holds one row a photo, in the order given; a photo that can't be read ends the run.

use std::{env, fs, process::ExitCode, time::Instant};

use kenspeckle::encoder::{Encoder, PhotoEncoder};

fn main() -> ExitCode {
    let arguments: Vec<String> = env::args().skip(1).collect();
    let [encoder, out, photos @ ..] = arguments.as_slice() else {
        eprintln!("usage: embed_photos ENCODER.onnx OUT.npy PHOTO…");
        return ExitCode::from(2);
    };
    match embed(encoder, out, photos) {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => {
            eprintln!("embed_photos: {error}");
            ExitCode::FAILURE
        }
    }
}

fn embed(encoder: &str, out: &str, photos: &[String]) -> Result<(), String> {
    let named = |name: &str, error: &dyn std::fmt::Display| format!("{name}: {error}");
    let file = fs::read(encoder).map_err(|error| named(encoder, &error))?;
    let began = Instant::now();
    let encoder = PhotoEncoder::from_bytes(&file).map_err(|error| named(encoder, &error))?;
    eprintln!("{} loaded in {:.0} ms", encoder.identity(), began.elapsed().as_secs_f64() * 1e3);

    let mut values = Vec::new();
    let began = Instant::now();
    for photo in photos {
        let file = fs::read(photo).map_err(|error| named(photo, &error))?;
        values.extend(encoder.embed(&file).map_err(|error| named(photo, &error))?);
    }
    eprintln!("{:.1} ms a photo", began.elapsed().as_secs_f64() * 1e3 / photos.len().max(1) as f64);
    fs::write(out, npy(&values, photos.len(), encoder.dimension())).map_err(|error| named(out, &error))
}

/// A NumPy array file, version 1.0: the header is padded so that the values begin at a multiple of 64 bytes.
fn npy(values: &[f32], rows: usize, columns: usize) -> Vec<u8> {
    let mut header = format!("{{'descr': '<f4', 'fortran_order': False, 'shape': ({rows}, {columns}), }}");
    while (10 + header.len() + 1) % 64 != 0 {
        header.push(' ');
    }
    header.push('\n');
    let mut file = b"\x93NUMPY\x01\0".to_vec();
    file.extend((header.len() as u16).to_le_bytes());
    file.extend(header.as_bytes());
    file.extend(values.iter().flat_map(|value| value.to_le_bytes()));
    file
}
