//! Notes as people keep them: lines of text, tables and JSON lines, with every column kept to be handed back.

mod decode;
mod read;

pub use decode::{Encoding, decode};
pub use read::{Format, Row, Table};

/// Most bytes of a file that is read as notes.
pub const MAX_BYTES: usize = 256 << 20;
/// Most columns a table may have.
pub const MAX_COLUMNS: usize = 1000;

/// Why a file can't be read as notes. A message is a clause about "it", the file that the caller names first.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum TableError {
    /// More bytes than are worth the memory.
    #[error("it has {} MB, and at most {} can be read; divide it", .0 >> 20, MAX_BYTES >> 20)]
    TooLarge(usize),
    /// The bytes are no text in an encoding that is known here.
    #[error("it is not text in UTF-8, UTF-16 or Windows-1252 ({0}); save it as UTF-8")]
    NotText(String),
    /// No row with anything in it.
    #[error("there is no note in it; write one a line")]
    Empty,
    /// A cell that starts with a quotation mark never ends.
    #[error(
        "the quotation mark that opens a cell in line {0} is never closed; close it, or double the ones inside a cell"
    )]
    OpenQuote(usize),
    /// A column has no name, or two have the same.
    #[error("its first line has to name the columns, each by another name, and {0}; add or mend that line")]
    Header(String),
    /// There is no column of that name.
    #[error("there is no column “{wanted}” in it; choose one of: {}", there.join(", "))]
    NoSuchColumn {
        /// The column asked for.
        wanted: String,
        /// The columns there are.
        there: Vec<String>,
    },
    /// Several columns and none named.
    #[error("it has several columns; say which holds the notes: {}", .0.join(", "))]
    WhichColumn(Vec<String>),
}

impl TableError {
    /// A short fixed name of the kind of error, for programs.
    pub fn code(&self) -> &'static str {
        match self {
            Self::TooLarge(_) => "file-too-large",
            Self::NotText(_) => "not-text",
            Self::Empty => "table-empty",
            Self::OpenQuote(_) | Self::Header(_) => "table-unreadable",
            Self::NoSuchColumn { .. } => "no-such-column",
            Self::WhichColumn(_) => "which-column",
        }
    }
}
