//! ZIP archives in memory: the same parts give the same bytes, and reading is bounded.

use std::io::{Cursor, Read, Write};

use zip::{CompressionMethod, DateTime, ZipArchive, ZipWriter, write::SimpleFileOptions};

/// An archive of these named parts.
pub(crate) fn write(parts: &[(&str, Vec<u8>)]) -> Vec<u8> {
    let mut archive = ZipWriter::new(Cursor::new(Vec::new()));
    let options = SimpleFileOptions::default()
        .compression_method(CompressionMethod::Deflated)
        .last_modified_time(DateTime::default());
    for (name, bytes) in parts {
        archive.start_file(*name, options).expect("a new name in memory");
        archive.write_all(bytes).expect("memory takes it");
    }
    archive.finish().expect("memory takes it").into_inner()
}

/// An archive to read from; what is wrong is told in words.
pub(crate) struct Archive<'a>(ZipArchive<Cursor<&'a [u8]>>);

impl<'a> Archive<'a> {
    /// The archive in these bytes.
    pub(crate) fn open(file: &'a [u8]) -> Result<Self, String> {
        ZipArchive::new(Cursor::new(file)).map(Self).map_err(|_| "it is not a ZIP archive, or is cut off".into())
    }

    /// A part of at most `limit` bytes; whatever size it claims, no more than that is taken.
    pub(crate) fn part(&mut self, name: &str, limit: u64) -> Result<Vec<u8>, String> {
        let entry = self.0.by_name(name).map_err(|_| format!("it has no {name}"))?;
        let mut bytes = Vec::new();
        entry.take(limit + 1).read_to_end(&mut bytes).map_err(|_| format!("{name} is damaged"))?;
        if bytes.len() as u64 > limit {
            return Err(format!("{name} is larger than it can be"));
        }
        Ok(bytes)
    }
}
