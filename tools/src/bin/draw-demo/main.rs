//! Draws the demo pile: `draw-demo OUT_DIR [--seed N] [--count N]`.
//!
//! The pictures and `index.json` (title, about, and for each file the tray it belongs in, or null for a stray) are all
//! that the page needs. The same seed draws the same pile, byte for byte.

mod bench;
mod camera;
mod dice;
mod field;
mod material;
mod math;
mod noise;
mod pile;
mod scene;
mod solid;
mod stray;
mod tally;

use std::{
    env, fs,
    path::{Path, PathBuf},
    process::ExitCode,
};

use image::{ExtendedColorType, codecs::jpeg::JpegEncoder};
use rayon::prelude::*;
use serde_json::json;

use crate::{dice::Dice, noise::Noise};

/// The seed of the pile that ships.
const SEED: u64 = 1731;
const QUALITY: u8 = 64;

struct Order {
    out: PathBuf,
    seed: u64,
    count: usize,
}

fn main() -> ExitCode {
    let order = match order(env::args().skip(1)) {
        Ok(order) => order,
        Err(problem) => {
            eprintln!("draw-demo: {problem}\nusage: draw-demo OUT_DIR [--seed N] [--count N]");
            return ExitCode::from(2);
        }
    };
    match draw(&order) {
        Ok(summary) => {
            println!("{summary}");
            ExitCode::SUCCESS
        }
        Err(problem) => {
            eprintln!("draw-demo: {problem}");
            ExitCode::FAILURE
        }
    }
}

fn order(mut args: impl Iterator<Item = String>) -> Result<Order, String> {
    let (mut out, mut seed, mut count) = (None, SEED, usize::MAX);
    while let Some(arg) = args.next() {
        match arg.as_str() {
            "--seed" => seed = number(&arg, args.next())?,
            "--count" => count = number(&arg, args.next())?,
            _ if arg.starts_with('-') => return Err(format!("there is no option {arg}")),
            _ if out.is_some() => return Err(format!("a second folder, {arg}: give one")),
            _ => out = Some(PathBuf::from(arg)),
        }
    }
    Ok(Order { out: out.ok_or("name the folder to draw into")?, seed, count })
}

fn number<T: std::str::FromStr>(option: &str, value: Option<String>) -> Result<T, String> {
    value.and_then(|v| v.parse().ok()).ok_or_else(|| format!("{option} needs a whole number after it"))
}

fn draw(order: &Order) -> Result<String, String> {
    let failed = |path: &Path, e: std::io::Error| format!("can't write {}: {e}", path.display());
    fs::create_dir_all(&order.out).map_err(|e| failed(&order.out, e))?;
    let noise = Noise::new(order.seed);
    let mut finds = pile::finds(order.seed);
    finds.truncate(order.count);
    let drawn: Vec<(String, usize)> = finds
        .par_iter()
        .enumerate()
        .map(|(i, find)| {
            let number = i + 1;
            let pixels = find.draw(&noise, &mut Dice::new(order.seed, number as u64));
            let mut bytes = Vec::new();
            JpegEncoder::new_with_quality(&mut bytes, QUALITY)
                .encode(&pixels, scene::SIDE as u32, scene::SIDE as u32, ExtendedColorType::Rgb8)
                .map_err(|e| format!("can't encode picture {number}: {e}"))?;
            let name = format!("find-{number:04}.jpg");
            let path = order.out.join(&name);
            fs::write(&path, &bytes).map_err(|e| failed(&path, e))?;
            Ok((name, bytes.len()))
        })
        .collect::<Result<_, String>>()?;
    let total: usize = drawn.iter().map(|(_, size)| size).sum();
    let items: Vec<_> =
        drawn.iter().zip(&finds).map(|((name, _), find)| json!({ "file": name, "tray": find.tray() })).collect();
    let count = items.len();
    let index = json!({ "title": pile::TITLE, "about": pile::ABOUT, "items": items });
    let path = order.out.join("index.json");
    fs::write(&path, format!("{index:#}\n")).map_err(|e| failed(&path, e))?;
    Ok(format!("{count} pictures, {:.2} MB, in {}", total as f64 / 1e6, order.out.display()))
}
