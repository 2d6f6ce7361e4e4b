//! Vectors in `.npy` files, and the labels and names that go with them.

use std::{
    fs::{self, File},
    path::{Path, PathBuf},
};

use kenspeckle::space::DIMENSIONS;
use ndarray::{Array2, Ix2, OwnedRepr};
use ndarray_npy::{ReadNpyExt, ReadableElement, WriteNpyExt};
use serde::{Deserialize, Serialize};

use crate::console::Failure;

/// The longest header of an `.npy` file that is looked at.
const HEADER_LIMIT: usize = 1 << 16;

/// Whether a path names an `.npy` file.
pub fn is_npy(path: &Path) -> bool {
    path.extension().is_some_and(|extension| extension.eq_ignore_ascii_case("npy"))
}

/// Reads an array of items × numbers, f32 or f64.
pub fn read(path: &Path) -> Result<Array2<f32>, Failure> {
    let trouble = |reason: String| Failure::because(format!("{}: {reason}", path.display()));
    let bytes = fs::read(path).map_err(|error| trouble(format!("it can't be read ({error})")))?;
    let header = Header::of(&bytes).ok_or_else(|| {
        trouble("it is not an .npy file of float32 or float64 numbers (little-endian); write it with numpy.save after .astype('float32')".into())
    })?;
    let [items, dimension] = header.shape[..] else {
        return Err(trouble(format!(
            "it holds an array of {} dimensions, {:?}, where items × numbers is expected; reshape it to two",
            header.shape.len(),
            header.shape
        )));
    };
    if items == 0 {
        return Err(trouble("it holds no item".into()));
    }
    if !DIMENSIONS.contains(&dimension) {
        let (least, most) = DIMENSIONS.into_inner();
        return Err(trouble(format!("its vectors have {dimension} numbers, and {least} to {most} can be sorted")));
    }
    let width = if header.double { 8 } else { 4 };
    if items.checked_mul(dimension).and_then(|cells| cells.checked_mul(width)) != Some(bytes.len() - header.length) {
        return Err(trouble(format!(
            "it is cut off or damaged: it should hold {items} × {dimension} numbers and does not; write it anew"
        )));
    }
    let damaged = |error: ndarray_npy::ReadNpyError| {
        trouble(format!("it can't be read ({error}); write it anew with numpy.save"))
    };
    let array = if header.double {
        load::<f64>(&bytes).map_err(damaged)?.mapv(|x| x as f32)
    } else {
        load::<f32>(&bytes).map_err(damaged)?
    };
    Ok(array.as_standard_layout().into_owned())
}

fn load<T: ReadableElement>(bytes: &[u8]) -> Result<ndarray::ArrayBase<OwnedRepr<T>, Ix2>, ndarray_npy::ReadNpyError> {
    Array2::<T>::read_npy(bytes)
}

/// What the header says, looked at before anything is allocated for it.
struct Header {
    double: bool,
    shape: Vec<usize>,
    length: usize,
}

impl Header {
    /// Format: numpy.lib.format, NEP 1.
    fn of(bytes: &[u8]) -> Option<Self> {
        let rest = bytes.strip_prefix(b"\x93NUMPY")?;
        let (start, length) = match rest.first()? {
            1 => (10, usize::from(u16::from_le_bytes(rest.get(2..4)?.try_into().ok()?))),
            2 | 3 => (12, usize::try_from(u32::from_le_bytes(rest.get(2..6)?.try_into().ok()?)).ok()?),
            _ => return None,
        };
        if length > HEADER_LIMIT {
            return None;
        }
        let text = std::str::from_utf8(bytes.get(start..start + length)?).ok()?;
        let double = match text.split("'descr':").nth(1)?.split('\'').nth(1)? {
            "<f4" => false,
            "<f8" => true,
            _ => return None,
        };
        let shape = text.split("'shape':").nth(1)?.split_once('(')?.1.split_once(')')?.0;
        let shape =
            shape.split(',').map(str::trim).filter(|n| !n.is_empty()).map(|n| n.parse().ok()).collect::<Option<_>>()?;
        Some(Self { double, shape, length: start + length })
    }
}

/// Writes items × numbers.
pub fn write(array: &Array2<f32>, file: &File) -> Result<(), String> {
    array.write_npy(std::io::BufWriter::new(file)).map_err(|error| error.to_string())
}

/// Reads one category a line, in the order of the examples; quotes as in RFC 4180, if there are any.
pub fn read_labels(path: &Path) -> Result<Vec<String>, Failure> {
    let trouble = |reason: String| Failure::because(format!("{}: {reason}", path.display()));
    let bytes = fs::read(path).map_err(|error| trouble(format!("it can't be read ({error})")))?;
    let text = String::from_utf8(bytes).map_err(|_| trouble("it is not UTF-8 text; save it as UTF-8".into()))?;
    let mut labels = Vec::new();
    for (line, row) in text.trim_start_matches('\u{feff}').lines().enumerate() {
        let mut reader = csv::ReaderBuilder::new().has_headers(false).flexible(true).from_reader(row.as_bytes());
        let label = match reader.records().next() {
            Some(Ok(record)) => record.get(0).unwrap_or("").trim().to_owned(),
            _ => String::new(),
        };
        if label.is_empty() {
            return Err(trouble(format!("line {} names no category; write one category a line", line + 1)));
        }
        labels.push(label);
    }
    Ok(labels)
}

/// The names beside an `.npy` file that `kenspeckle embed` wrote, if they are there and as many as the items.
pub fn names_beside(path: &Path, items: usize) -> Option<Vec<String>> {
    let mut rows = csv::Reader::from_path(path.with_extension("names.csv")).ok()?;
    let names: Vec<String> = rows.records().map(|row| row.ok()?.get(0).map(str::to_owned)).collect::<Option<_>>()?;
    (names.len() == items).then_some(names)
}

/// What is kept beside an `.npy` file about where its vectors come from.
#[derive(Serialize, Deserialize)]
#[serde(rename_all = "camelCase")]
pub struct Origin {
    /// The identity of the encoder.
    pub encoder: String,
    /// Numbers in a vector.
    pub numbers: usize,
    /// Whether none of them is ever below zero.
    pub non_negative: bool,
}

/// Where an origin is kept: `FILE.encoder.json` for `FILE.npy`.
pub fn origin_path(path: &Path) -> PathBuf {
    path.with_extension("encoder.json")
}

/// What `kenspeckle embed` wrote beside an `.npy` file about the encoder, if it is there.
pub fn origin_beside(path: &Path) -> Result<Option<Origin>, Failure> {
    let path = origin_path(path);
    let trouble = |reason: String| {
        Failure::because(format!("{}: {reason}; embed the items again, or delete this file", path.display()))
    };
    let bytes = match fs::read(&path) {
        Ok(bytes) => bytes,
        Err(error) if error.kind() == std::io::ErrorKind::NotFound => return Ok(None),
        Err(error) => return Err(trouble(format!("it can't be read ({error})"))),
    };
    serde_json::from_slice(&bytes).map(Some).map_err(|error| trouble(format!("it does not name an encoder ({error})")))
}
