//! Photos in folders: which files there are, and their embeddings.

use std::{
    collections::HashSet,
    fs,
    path::{Path, PathBuf},
    sync::atomic::{AtomicUsize, Ordering},
    thread,
};

use kenspeckle::encoder::{Encoder, PhotoEncoder, file_fingerprint};

use crate::console::{self, Failure};

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
    let bar = console::progress(parts.len(), what);
    let next = AtomicUsize::new(0);
    let workers = thread::available_parallelism().map_or(1, |cores| cores.get()).min(parts.len());
    // Plain threads: a pool's worker that waits for the encoder's own pool would pick up another photo meanwhile.
    let done: Vec<(usize, Result<Photo, String>)> = thread::scope(|scope| {
        let work = || {
            let encoder = encoder.clone();
            let mut done = Vec::new();
            while !console::stopped() {
                let index = next.fetch_add(1, Ordering::Relaxed);
                let Some(part) = parts.get(index) else { break };
                let name = shown(part);
                let outcome = match read_one(&encoder, &folder.join(part)) {
                    Ok((embedding, fingerprint)) => Ok(Photo { name, embedding, fingerprint }),
                    Err(reason) => Err(format!("{name}: {reason}")),
                };
                done.push((index, outcome));
                bar.inc(1);
            }
            done
        };
        let workers: Vec<_> = (0..workers).map(|_| scope.spawn(work)).collect();
        workers
            .into_iter()
            .flat_map(|worker| worker.join().unwrap_or_else(|panic| std::panic::resume_unwind(panic)))
            .collect()
    });
    bar.finish_and_clear();
    console::go_on()?;
    let mut in_order: Vec<Option<Result<Photo, String>>> = parts.iter().map(|_| None).collect();
    for (index, outcome) in done {
        in_order[index] = Some(outcome);
    }
    let mut photos = Vec::new();
    let mut troubles = Vec::new();
    for outcome in in_order.into_iter().flatten() {
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
