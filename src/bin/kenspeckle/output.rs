//! Files that are there whole or not at all, and tables that no spreadsheet mistakes for formulas.

use std::{
    fs::{self, File},
    io::{self, Write},
    path::Path,
};

use crate::console::Failure;

/// Writes a file through a neighbour that takes its place only when it is complete.
pub fn write_whole(path: &Path, write: impl FnOnce(&mut File) -> Result<(), String>) -> Result<(), Failure> {
    let trouble = |reason: String| Failure::because(format!("{}: it can't be written ({reason})", path.display()));
    // What a link points to is written; what is no ordinary file (a device, a pipe) takes the bytes as they come.
    let target = fs::canonicalize(path).unwrap_or_else(|_| path.to_owned());
    let path = target.as_path();
    if fs::metadata(path).is_ok_and(|there| !there.is_file()) {
        return fs::OpenOptions::new()
            .write(true)
            .open(path)
            .map_err(|error| error.to_string())
            .and_then(|mut file| write(&mut file))
            .map_err(trouble);
    }
    let name = path.file_name().ok_or_else(|| trouble("it names no file".into()))?;
    let mut part = name.to_os_string();
    part.push(format!(".{}.part", std::process::id()));
    let part = path.with_file_name(part);
    let outcome = File::create(&part)
        .map_err(|error| error.to_string())
        .and_then(|mut file| {
            write(&mut file)?;
            file.flush().and_then(|()| file.sync_all()).map_err(|error| error.to_string())
        })
        .and_then(|()| fs::rename(&part, path).map_err(|error| error.to_string()));
    outcome.map_err(|reason| {
        // Best effort: the reason matters more than a leftover.
        let _ = fs::remove_file(&part);
        trouble(reason)
    })
}

/// Writes to standard output. A reader that has had enough (`| head`) is no failure.
pub fn show(text: &[u8]) -> Result<(), String> {
    let mut out = io::stdout().lock();
    match out.write_all(text).and_then(|()| out.flush()) {
        Err(error) if error.kind() != io::ErrorKind::BrokenPipe => Err(format!("the result can't be shown ({error})")),
        _ => Ok(()),
    }
}

/// A table cell that no spreadsheet takes for a formula: one that starts like one gets an apostrophe in front.
pub fn cell(text: &str) -> String {
    if text.starts_with(['=', '+', '-', '@', '\t', '\r']) { format!("'{text}") } else { text.to_owned() }
}

/// Writes an RFC 4180 table.
pub fn table<'a>(to: impl Write, rows: impl IntoIterator<Item = Vec<String>> + 'a) -> Result<(), String> {
    let mut writer = csv::WriterBuilder::new().terminator(csv::Terminator::CRLF).from_writer(to);
    for row in rows {
        writer.write_record(&row).map_err(|error| error.to_string())?;
    }
    writer.flush().map_err(|error| error.to_string())
}
