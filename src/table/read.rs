//! Text in, rows and named columns out.

use std::collections::{HashMap, HashSet};

use serde_json::Value;

use super::{Encoding, MAX_BYTES, MAX_COLUMNS, TableError, decode};

/// The one column of a file of lines.
const LINES_COLUMN: &str = "note";

/// How the rows of a file are written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Format {
    /// One note a line; empty lines are left out.
    Lines,
    /// A table of cells with a line of names on top (RFC 4180), its cells separated by commas, semicolons or tabs:
    /// whichever the first line has most of.
    Separated,
    /// A table whose cells are separated by tabs.
    Tabs,
    /// A JSON object a line; its keys are the columns.
    JsonLines,
}

impl Format {
    /// By the ending of a file's name; lines where it says nothing.
    pub fn of_name(name: &str) -> Self {
        let ending = name.rsplit_once('.').map_or("", |(_, ending)| ending).to_ascii_lowercase();
        match ending.as_str() {
            "csv" => Self::Separated,
            "tsv" | "tab" => Self::Tabs,
            "jsonl" | "ndjson" => Self::JsonLines,
            _ => Self::Lines,
        }
    }
}

/// One row of a table.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Row {
    /// The line of the file that it begins in, from 1.
    pub line: usize,
    /// As many cells as the table has columns.
    pub cells: Vec<String>,
}

/// Rows with named columns.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Table {
    /// How it was written.
    pub format: Format,
    /// How its text was encoded.
    pub encoding: Encoding,
    /// The columns' names, at least one.
    pub columns: Vec<String>,
    /// Its rows in order, at least one.
    pub rows: Vec<Row>,
    /// What could not be taken, one line each, naming the place.
    pub troubles: Vec<String>,
}

impl Table {
    /// Reads a file. What is wrong with a single row becomes one of the [`troubles`](Self::troubles), and the rest goes on.
    ///
    /// Cost O(bytes).
    ///
    /// # Errors
    /// The file is too large, no text, without a row, or its columns can't be told: see [`TableError`].
    pub fn read(bytes: &[u8], format: Format) -> Result<Self, TableError> {
        if bytes.len() > MAX_BYTES {
            return Err(TableError::TooLarge(bytes.len()));
        }
        let (text, encoding) = decode(bytes)?;
        let (columns, rows, troubles) = match format {
            Format::Lines => (vec![LINES_COLUMN.to_owned()], lines(&text), Vec::new()),
            Format::Separated => cells(&text, separator(&text))?,
            Format::Tabs => cells(&text, '\t')?,
            Format::JsonLines => json_lines(&text)?,
        };
        if rows.is_empty() && troubles.is_empty() {
            return Err(TableError::Empty);
        }
        Ok(Self { format, encoding, columns, rows, troubles })
    }

    /// The position of the column of that name, upper and lower case alike if no other has the very name; without a name,
    /// of the only one.
    ///
    /// # Errors
    /// [`TableError::NoSuchColumn`] and [`TableError::WhichColumn`].
    pub fn column(&self, name: Option<&str>) -> Result<usize, TableError> {
        let Some(name) = name else {
            return if self.columns.len() == 1 { Ok(0) } else { Err(TableError::WhichColumn(self.columns.clone())) };
        };
        let named = |same: &dyn Fn(&str) -> bool| self.columns.iter().position(|column| same(column));
        named(&|column| column == name)
            .or_else(|| named(&|column| column.trim().to_lowercase() == name.trim().to_lowercase()))
            .ok_or_else(|| TableError::NoSuchColumn { wanted: name.to_owned(), there: self.columns.clone() })
    }
}

fn lines(text: &str) -> Vec<Row> {
    (1..)
        .zip(text.lines())
        .filter(|(_, line)| !line.trim().is_empty())
        .map(|(line, note)| Row { line, cells: vec![note.to_owned()] })
        .collect()
}

/// The separator that the first line has most of outside quotation marks.
fn separator(text: &str) -> char {
    let mut quoted = false;
    let mut counts = [(',', 0), (';', 0), ('\t', 0)];
    for c in text.chars() {
        match c {
            '"' => quoted = !quoted,
            '\n' | '\r' if !quoted => break,
            _ if !quoted => counts.iter_mut().filter(|(mark, _)| *mark == c).for_each(|(_, count)| *count += 1),
            _ => {}
        }
    }
    // The first of equals.
    counts.into_iter().rev().max_by_key(|&(_, count)| count).map_or(',', |(mark, _)| mark)
}

type Parsed = (Vec<String>, Vec<Row>, Vec<String>);

/// RFC 4180: a cell may stand in quotation marks, doubled inside; any line ending will do. A quotation mark within a cell
/// that did not begin with one is a letter like others.
fn cells(text: &str, separator: char) -> Result<Parsed, TableError> {
    let mut records = Vec::new();
    let mut rest = text.chars().peekable();
    let mut line = 1;
    while rest.peek().is_some() {
        let begun = line;
        let mut record = Vec::new();
        loop {
            let mut cell = String::new();
            if rest.next_if_eq(&'"').is_some() {
                let opened = line;
                loop {
                    match rest.next() {
                        Some('"') if rest.next_if_eq(&'"').is_some() => cell.push('"'),
                        Some('"') => break,
                        Some(c) => {
                            line += usize::from(c == '\n');
                            cell.push(c);
                        }
                        None => return Err(TableError::OpenQuote(opened)),
                    }
                }
            }
            while let Some(c) = rest.next_if(|&c| c != separator && c != '\n' && c != '\r') {
                cell.push(c);
            }
            record.push(cell);
            if rest.next_if_eq(&separator).is_none() {
                break;
            }
        }
        rest.next_if_eq(&'\r');
        rest.next_if_eq(&'\n');
        line += 1;
        // A line with nothing on it is no row.
        if record.len() > 1 || record.iter().any(|cell| !cell.is_empty()) {
            records.push(Row { line: begun, cells: record });
        }
    }
    let mut records = records.into_iter();
    let columns = records.next().ok_or(TableError::Empty)?.cells;
    check_columns(&columns)?;
    let mut rows = Vec::new();
    let mut troubles = Vec::new();
    for mut row in records {
        if row.cells.len() > columns.len() {
            troubles.push(format!(
                "line {}: it has {} cells where the first line names {}; put cells that hold “{}” in quotation marks",
                row.line,
                row.cells.len(),
                columns.len(),
                if separator == '\t' { "a tab".to_owned() } else { separator.to_string() }
            ));
            continue;
        }
        // Spreadsheets leave out empty cells at the end.
        row.cells.resize(columns.len(), String::new());
        rows.push(row);
    }
    Ok((columns, rows, troubles))
}

fn check_columns(columns: &[String]) -> Result<(), TableError> {
    if columns.len() > MAX_COLUMNS {
        return Err(TableError::Header(format!("it has {} where {MAX_COLUMNS} is the most", columns.len())));
    }
    let mut seen = HashSet::new();
    // A column of row numbers often has no name.
    let mut named = columns.iter().filter(|name| !name.trim().is_empty()).peekable();
    if named.peek().is_none() {
        return Err(TableError::Header("none has one".into()));
    }
    for name in named {
        if !seen.insert(name) {
            return Err(TableError::Header(format!("two are called “{name}”")));
        }
    }
    Ok(())
}

fn json_lines(text: &str) -> Result<Parsed, TableError> {
    let mut columns: Vec<String> = Vec::new();
    let mut positions: HashMap<String, usize> = HashMap::new();
    let mut rows: Vec<Row> = Vec::new();
    let mut troubles = Vec::new();
    for (line, written) in (1..).zip(text.lines()).filter(|(_, written)| !written.trim().is_empty()) {
        let fields = match serde_json::from_str(written) {
            Ok(Value::Object(fields)) => fields,
            Ok(_) => {
                troubles.push(format!("line {line}: it is not a JSON object; write {{\"{LINES_COLUMN}\": \"…\"}}"));
                continue;
            }
            Err(error) => {
                troubles
                    .push(format!("line {line}: it is not JSON (column {}); write one object a line", error.column()));
                continue;
            }
        };
        let mut cells = vec![String::new(); columns.len()];
        for (key, value) in fields {
            let position = *positions.entry(key).or_insert_with_key(|key| {
                columns.push(key.clone());
                columns.len() - 1
            });
            cells.resize(columns.len(), String::new());
            cells[position] = match value {
                Value::Null => String::new(),
                Value::String(text) => text,
                other => other.to_string(),
            };
        }
        rows.push(Row { line, cells });
    }
    if columns.is_empty() {
        return Err(TableError::Empty);
    }
    check_columns(&columns)?;
    for row in &mut rows {
        row.cells.resize(columns.len(), String::new());
    }
    Ok((columns, rows, troubles))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn cells_of(table: &Table) -> Vec<Vec<&str>> {
        table.rows.iter().map(|row| row.cells.iter().map(String::as_str).collect()).collect()
    }

    #[test]
    fn lines_are_notes() {
        let table = Table::read(b"first, with a comma\r\n\r\n  \nsecond \"quoted\"\n", Format::Lines).unwrap();
        assert_eq!(cells_of(&table), [["first, with a comma"], ["second \"quoted\""]]);
        assert_eq!(table.rows[1].line, 4);
        assert_eq!(table.column(None), Ok(0));
    }

    #[test]
    fn quoted_cells_hold_anything() {
        let text = "id,note,by\r\n1,\"stuck, \"\"half\"\" way\r\nagain\",Ann\n2,5\" nail\n\n3,,\n";
        let table = Table::read(text.as_bytes(), Format::Separated).unwrap();
        let expected = [["1", "stuck, \"half\" way\r\nagain", "Ann"], ["2", "5\" nail", ""], ["3", "", ""]];
        assert_eq!(cells_of(&table), expected);
        assert_eq!(table.rows.iter().map(|row| row.line).collect::<Vec<_>>(), [2, 4, 6]);
        assert_eq!(table.column(Some("note")), Ok(1));
        assert_eq!(table.column(Some(" Note ")), Ok(1));
        assert_eq!(table.column(None).unwrap_err().code(), "which-column");
        assert_eq!(table.column(Some("text")).unwrap_err().code(), "no-such-column");
    }

    /// Spreadsheets in many countries write semicolons into files that end in .csv.
    #[test]
    fn the_separator_is_found() {
        for (text, format) in [
            ("a;b\n1;2,5", Format::Separated),
            ("a\tb\n1\t2,5", Format::Separated),
            ("a;b;\"c,d,e,f\"\n1;2,5;", Format::Separated),
            ("\"a;;;\",b\n1,\"2,5\"", Format::Separated),
            ("a\tb,c,d\n1\t2,5", Format::Tabs),
        ] {
            let table = Table::read(text.as_bytes(), format).unwrap();
            assert_eq!(table.rows[0].cells[..2], ["1", "2,5"], "{text}");
        }
    }

    #[test]
    fn a_bad_row_is_named_and_the_rest_goes_on() {
        let table = Table::read(b"a,b\n1,2\n1,2,3\n4,5\n", Format::Separated).unwrap();
        assert_eq!(cells_of(&table), [["1", "2"], ["4", "5"]]);
        assert!(table.troubles[0].starts_with("line 3: "), "{:?}", table.troubles);
        let table = Table::read(b"{\"a\": 1}\n[]\n{\"a\": \n{\"b\": \"x\", \"a\": null}\n", Format::JsonLines).unwrap();
        assert_eq!(table.columns, ["a", "b"]);
        assert_eq!(cells_of(&table), [["1", ""], ["", "x"]]);
        assert_eq!(table.troubles.len(), 2);
        assert!(table.troubles[1].starts_with("line 3: "), "{:?}", table.troubles);
    }

    #[test]
    fn tables_that_cannot_be_told_are_refused() {
        for (text, format, code) in [
            ("", Format::Lines, "table-empty"),
            (" \n\n", Format::Lines, "table-empty"),
            ("a,b\n", Format::Separated, "table-empty"),
            ("a,\"b\n1,2\n", Format::Separated, "table-unreadable"),
            (",\n1,2\n", Format::Separated, "table-unreadable"),
            ("a,a\n1,2\n", Format::Separated, "table-unreadable"),
        ] {
            assert_eq!(Table::read(text.as_bytes(), format).unwrap_err().code(), code, "{text}");
        }
    }

    #[test]
    fn the_ending_names_the_format() {
        let formats = ["a.b/notes.CSV", "notes.tsv", "notes.ndjson", "notes.txt", "notes"].map(Format::of_name);
        assert_eq!(formats, [Format::Separated, Format::Tabs, Format::JsonLines, Format::Lines, Format::Lines]);
    }
}
