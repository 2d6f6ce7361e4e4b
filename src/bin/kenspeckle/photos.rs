//! Photos in folders: which files there are, and their embeddings.

use std::{
    collections::HashSet,
    fs,
    path::{Path, PathBuf},
};

use kenspeckle::encoder::{Encoder, PhotoEncoder, file_fingerprint};

use crate::{console::Failure, parallel};

/// The largest file that is read as a photo.
const FILE_LIMIT: u64 = 512 << 20;

/// How deep folders are followed.
const DEPTH_LIMIT: usize = 32;

/// A photo with its embedding.
pub struct Photo {
    /// Its path within the folder, with `/` between the parts.
    pub name: String,
    /// As the encoder gives it.
    pub embedding: Vec<f32>,
    /// Names the content of the file.
    pub fingerprint: String,
}

/// Every file below the folder, as paths within it, in order of name; links are followed, hidden files left out.
pub fn files_below(folder: &Path) -> Result<Vec<PathBuf>, Failure> {
    if folder.is_file() {
        return Err(Failure::because(format!("{}: this is a file; name the folder it is in", folder.display())));
    }
    let mut found = Vec::new();
    let mut seen: HashSet<PathBuf> = fs::canonicalize(folder).into_iter().collect();
    let mut open = vec![(PathBuf::new(), 0)];
    while let Some((part, depth)) = open.pop() {
        let here = folder.join(&part);
        let unreadable = |error| Failure::because(format!("{}: can't list this folder ({error})", here.display()));
        for entry in fs::read_dir(&here).map_err(unreadable)? {
            let entry = entry.map_err(unreadable)?;
            if entry.file_name().to_string_lossy().starts_with('.') {
                continue;
            }
            let part = part.join(entry.file_name());
            // A link that leads nowhere is listed too: reading it says what is wrong with it.
            let Ok(kind) = fs::metadata(folder.join(&part)) else {
                found.push(part);
                continue;
            };
            if kind.is_dir() {
                // A link can lead back to where it came from.
                let first = fs::canonicalize(folder.join(&part)).is_ok_and(|real| seen.insert(real));
                if first && depth < DEPTH_LIMIT {
                    open.push((part, depth + 1));
                }
            } else if kind.is_file() {
                found.push(part);
            }
        }
    }
    found.sort();
    Ok(found)
}

/// A path within a folder as it is shown and written: the same on every system.
pub fn shown(part: &Path) -> String {
    part.iter().map(|p| p.to_string_lossy()).collect::<Vec<_>>().join("/")
}

/// The embeddings of these files of the folder, in order; and the lines about those that could not be read.
pub fn embed(folder: &Path, parts: &[PathBuf], what: &str) -> Result<(Vec<Photo>, Vec<String>), Failure> {
    let encoder = PhotoEncoder::bundled().map_err(Failure::because)?;
    let outcomes = parallel::each(
        parts.len(),
        what,
        || encoder.clone(),
        |encoder, index| {
            let name = shown(&parts[index]);
            match read_one(encoder, &folder.join(&parts[index])) {
                Ok((embedding, fingerprint)) => Ok(Photo { name, embedding, fingerprint }),
                Err(reason) => Err(format!("{name}: {reason}")),
            }
        },
    )?;
    let mut photos = Vec::new();
    let mut troubles = Vec::new();
    for outcome in outcomes {
        match outcome {
            Ok(photo) => photos.push(photo),
            Err(trouble) => troubles.push(trouble),
        }
    }
    Ok((photos, troubles))
}

fn read_one(encoder: &PhotoEncoder, path: &Path) -> Result<(Vec<f32>, String), String> {
    let cannot = |error: std::io::Error| format!("it can't be read ({error})");
    let size = fs::metadata(path).map_err(cannot)?.len();
    if size > FILE_LIMIT {
        return Err(format!("it has {} MB, more than any photo; leave it out", size >> 20));
    }
    let bytes = fs::read(path).map_err(cannot)?;
    let embedding = encoder.embed(&bytes).map_err(|error| error.to_string())?;
    Ok((embedding, file_fingerprint(&bytes)))
}
