//! `kenspeckle embed`: photos in, an `.npy` file of vectors out.

use std::path::PathBuf;

use clap::Args;
use ndarray::Array2;

use crate::{
    console::{self, Failure},
    output, photos, vectors,
};

/// Turn photos into vectors for use elsewhere.
///
/// Writes one row of 1280 numbers (never negative, float32) for each photo, in order of name, and FILE.names.csv beside it
/// with the photos' names in the same order. Photos that look alike get vectors that point the same way.
#[derive(Args)]
pub struct Embed {
    /// A folder of photos: JPEG, PNG, WebP, GIF or BMP, in any depth.
    photos: PathBuf,
    /// The .npy file to write.
    #[arg(long, value_name = "FILE.npy")]
    out: PathBuf,
}

impl Embed {
    /// Runs the command and tells how many photos could not be read.
    pub fn run(self) -> Result<usize, Failure> {
        let parts = photos::files_below(&self.photos)?;
        if parts.is_empty() {
            return Err(Failure::because(format!("{}: there is no file in this folder", self.photos.display())));
        }
        let (found, troubles) = photos::embed(&self.photos, &parts, "embedding")?;
        troubles.iter().for_each(|trouble| console::say(trouble));
        let Some(first) = found.first() else {
            return Err(Failure::because(format!(
                "{}: none of its files is a photo that can be read",
                self.photos.display()
            )));
        };
        let dimension = first.embedding.len();
        let array = Array2::from_shape_fn((found.len(), dimension), |(i, j)| found[i].embedding[j]);
        console::go_on()?;
        output::write_whole(&self.out, |file| vectors::write(&array, file))?;
        let header = vec!["item".to_owned()];
        let rows = std::iter::once(header).chain(found.iter().map(|photo| vec![photo.name.clone()]));
        let names = self.out.with_extension("names.csv");
        output::write_whole(&names, |file| output::table(file, rows))?;
        console::say(&format!(
            "{} photos, {dimension} numbers each, in {}; their names in {}",
            found.len(),
            self.out.display(),
            names.display()
        ));
        Ok(troubles.len())
    }
}
