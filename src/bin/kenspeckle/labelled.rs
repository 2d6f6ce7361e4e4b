//! Examples by category: photos in a folder for each, or vectors with a file of labels.

use std::{
    collections::{HashMap, HashSet},
    path::{Path, PathBuf},
};

use ndarray::Array2;

use crate::{
    console::{self, Failure},
    photos::{self, Photo},
    vectors,
};

/// An item of a pile or an example, ready to be added.
pub struct Item {
    /// As the person knows it.
    pub name: String,
    /// As its encoder gives it.
    pub embedding: Vec<f32>,
    /// Its row in the table it is from, if it is from one.
    pub row: Option<usize>,
}

impl Item {
    /// An item that is from no table.
    pub fn new(name: String, embedding: Vec<f32>) -> Self {
        Self { name, embedding, row: None }
    }
}

/// An item whose category is known.
pub struct Example {
    /// The item itself.
    pub item: Item,
    /// Its category's name.
    pub category: String,
}

/// The photos in the category folders of this folder, in order of name; and the lines about what could not be taken.
pub fn photos(folder: &Path, what: &str) -> Result<(Vec<Photo>, Vec<String>), Failure> {
    let (parts, mut troubles) = example_files(folder)?;
    let (photos, unreadable) = photos::embed(folder, &parts, what)?;
    troubles.extend(within(folder, unreadable));
    Ok((photos, troubles))
}

/// Lines about what lies within a folder, with the folder's name.
pub fn within(folder: &Path, lines: Vec<String>) -> Vec<String> {
    lines.into_iter().map(|line| format!("{}/{line}", folder.display())).collect()
}

/// The files in the category folders, and lines about what lies outside them or about folders with nothing in them.
fn example_files(folder: &Path) -> Result<(Vec<PathBuf>, Vec<String>), Failure> {
    let all = photos::files_below(folder)?;
    let (inside, loose): (Vec<_>, Vec<_>) = all.into_iter().partition(|part| part.components().count() > 1);
    let mut troubles: Vec<String> = loose
        .iter()
        .map(|part| {
            format!(
                "{}/{}: it lies outside the category folders; put it into the folder of its category",
                folder.display(),
                photos::shown(part)
            )
        })
        .collect();
    let with_files: HashSet<_> = inside.iter().filter_map(|part| part.iter().next()).collect();
    let entries = std::fs::read_dir(folder)
        .map_err(|error| Failure::because(format!("{}: can't list this folder ({error})", folder.display())))?;
    let mut empty: Vec<String> = entries
        .flatten()
        .filter(|entry| entry.path().is_dir() && !with_files.contains(entry.file_name().as_os_str()))
        .map(|entry| entry.file_name().to_string_lossy().into_owned())
        .filter(|name| !name.starts_with('.'))
        .collect();
    empty.sort();
    troubles.extend(empty.iter().map(|name| {
        format!(
            "{}/{name}: this category has no example; put at least one photo in, or remove the folder",
            folder.display()
        )
    }));
    if inside.is_empty() {
        return Err(Failure::because(format!(
            "{}: there is no example in it; make one folder for each category there, with a few photos in each",
            folder.display()
        )));
    }
    Ok((inside, troubles))
}

/// The folder that an item's name begins with.
pub fn folder_of(name: &str) -> String {
    name.split('/').next().unwrap_or("").to_owned()
}

/// Examples with their fingerprints: the same content in one category counts once, and in several categories not at all.
/// Also how many contents there are in several. `what` is what the person calls one of them.
pub fn without_disputed(found: Vec<(Example, String)>, what: &str) -> (Vec<Example>, usize) {
    let mut places: HashMap<String, Vec<(String, String)>> = HashMap::new();
    for (example, fingerprint) in &found {
        let place = (example.item.name.clone(), example.category.clone());
        places.entry(fingerprint.clone()).or_default().push(place);
    }
    let mut disputed = 0;
    let mut examples = Vec::new();
    for (example, fingerprint) in found {
        // Met before, so told and counted before.
        let Some(same) = places.remove(&fingerprint) else { continue };
        let names = same.iter().map(|(name, _)| name.as_str()).collect::<Vec<_>>().join(" and ");
        if same.iter().any(|(_, category)| *category != example.category) {
            console::say(&format!(
                "{names}: the same {what} is in several categories, so none of them counts; keep it in one"
            ));
            disputed += 1;
            continue;
        }
        if same.len() > 1 {
            console::say(&format!("{names}: the same {what}; it counts once"));
        }
        examples.push(example);
    }
    (examples, disputed)
}

/// The rows of an array, named by the file of names beside it or else by their numbers.
pub fn items(array: &Array2<f32>, path: &Path) -> Vec<Item> {
    let names = vectors::names_beside(path, array.nrows());
    let name = |row: usize| names.as_ref().map_or_else(|| row.to_string(), |names| names[row].clone());
    array.outer_iter().enumerate().map(|(row, numbers)| Item::new(name(row), numbers.to_vec())).collect()
}

/// The rows of the array in `path`, each with its category from the file of labels.
pub fn vectors(array: &Array2<f32>, path: &Path, labels: &Path) -> Result<Vec<Example>, Failure> {
    let categories = vectors::read_labels(labels)?;
    if categories.len() != array.nrows() {
        return Err(Failure::because(format!(
            "{} names {} categories but {} holds {} examples; give one category a line for each example",
            labels.display(),
            categories.len(),
            path.display(),
            array.nrows()
        )));
    }
    Ok(items(array, path).into_iter().zip(categories).map(|(item, category)| Example { item, category }).collect())
}
