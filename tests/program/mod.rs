//! Running the program, and photos for it to look at.

use std::{
    path::Path,
    process::{Command, Output},
};

use image::{Rgb, RgbImage};

/// Runs the program in this folder.
pub fn kenspeckle(folder: &Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_kenspeckle")).current_dir(folder).args(arguments).output().unwrap()
}

/// What it said on standard error.
pub fn said(output: &Output) -> String {
    String::from_utf8(output.stderr.clone()).unwrap()
}

/// Lines that mention all of these.
pub fn lines_with<'a>(text: &'a str, parts: &[&str]) -> Vec<&'a str> {
    text.lines().filter(|line| parts.iter().all(|part| line.contains(part))).collect()
}

/// Stripes or rings in changing colours, widths and places.
pub fn draw(rings: bool, variant: u32) -> RgbImage {
    let ink = Rgb([(variant * 53 % 200) as u8, (variant * 97 % 200) as u8, (variant * 31 % 200) as u8]);
    let paper = Rgb([235 - (variant * 11 % 60) as u8, 230, 225 - (variant * 17 % 60) as u8]);
    let width = 9 + variant % 5;
    let (x0, y0) = (90.0 + (variant % 7) as f32 * 4.0, 100.0 + (variant % 5) as f32 * 5.0);
    RgbImage::from_fn(200, 210, |x, y| {
        let along = if rings { (x as f32 - x0).hypot(y as f32 - y0) as u32 } else { x + y / 3 + variant };
        if (along / width).is_multiple_of(2) { ink } else { paper }
    })
}
