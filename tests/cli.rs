//! The program as a person runs it: real files in, tables, exit codes and messages out.
#![cfg(feature = "cli")]

mod program;

use std::{
    collections::BTreeMap,
    fs,
    path::{Path, PathBuf},
    process::{Command, Output},
};

use ndarray::{Array1, Array2, Array3, array};
use ndarray_npy::write_npy;
use program::{draw, kenspeckle, lines_with, said};
use tempfile::TempDir;

/// A table as item → (tray, probability).
fn table(text: &str) -> BTreeMap<String, (String, f64)> {
    let mut rows = csv::Reader::from_reader(text.as_bytes());
    assert_eq!(rows.headers().unwrap(), vec!["item", "tray", "probability", "plausible", "set aside"]);
    rows.records()
        .map(|row| row.unwrap())
        .map(|row| (row[0].to_owned(), (row[1].to_owned(), row[2].parse().unwrap())))
        .collect()
}

/// `pile/` with ten photos, `examples/{rings,stripes}/` with three each.
fn photos() -> TempDir {
    let folder = TempDir::new().unwrap();
    let root = folder.path();
    for (name, rings) in [("rings", true), ("stripes", false)] {
        fs::create_dir_all(root.join("examples").join(name)).unwrap();
        fs::create_dir_all(root.join("pile/box")).unwrap();
        for variant in 0..3 {
            draw(rings, variant).save(root.join(format!("examples/{name}/{variant}.png"))).unwrap();
        }
        for variant in 3..8 {
            let place = if variant < 6 { "pile" } else { "pile/box" };
            draw(rings, variant).save(root.join(format!("{place}/{name}-{variant}.jpg"))).unwrap();
        }
    }
    folder
}

fn sort_photos(folder: &TempDir, more: &[&str]) -> Output {
    kenspeckle(folder.path(), &[&["sort", "pile", "--examples", "examples"], more].concat())
}

#[test]
fn a_folder_is_sorted_by_examples() {
    let folder = photos();
    let output = sort_photos(&folder, &["--set-aside-share", "0"]);
    assert_eq!(output.status.code(), Some(0), "{}", said(&output));
    let table = table(std::str::from_utf8(&output.stdout).unwrap());
    assert_eq!(table.len(), 10);
    assert!(table.contains_key("box/rings-6.jpg"));
    for (item, (tray, probability)) in &table {
        assert!(item.contains(tray.as_str()), "{item} went to {tray}");
        assert!((0.5..=1.0).contains(probability));
    }
    assert_eq!(lines_with(&said(&output), &["10 items sorted", "rings 5", "stripes 5"]).len(), 1);
}

/// Vectors around four directions, five examples of each; the pile has four more of each and four of a fifth direction.
fn directions(folder: &Path) {
    let row = |direction: usize, k: usize| -> Vec<f32> {
        let off = |j: usize| ((direction * 31 + k * 17 + j * 7) % 11) as f32 / 40.0 - 0.125;
        (0..8).map(|j| f32::from(u8::from(j == direction)) + off(j)).collect()
    };
    let array = |rows: Vec<Vec<f32>>| Array2::from_shape_fn((rows.len(), 8), |(i, j)| rows[i][j]);
    let grid = |directions: usize, from: usize, to: usize| -> Vec<Vec<f32>> {
        (0..directions).flat_map(|d| (from..to).map(move |k| row(d, k))).collect()
    };
    write_npy(folder.join("examples.npy"), &array(grid(4, 0, 5))).unwrap();
    write_npy(folder.join("pile.npy"), &array(grid(5, 5, 9))).unwrap();
    let labels: String = (0..20).map(|k| format!("{}\n", ["north", "east", "south", "west"][k / 5])).collect();
    fs::write(folder.join("labels.csv"), labels).unwrap();
}

const SORT: [&str; 6] = ["sort", "pile.npy", "--examples", "examples.npy", "--labels", "labels.csv"];

#[test]
fn what_was_never_shown_is_set_aside() {
    let folder = TempDir::new().unwrap();
    directions(folder.path());
    let output = kenspeckle(folder.path(), &SORT);
    let text = std::str::from_utf8(&output.stdout).unwrap();
    let table = table(text);
    for unknown in 16..20 {
        assert_eq!(table[&unknown.to_string()].0, "", "{text}");
        assert!(lines_with(text, &[&format!("{unknown},,"), "unlike anything shown"]).len() == 1, "{text}");
    }
    assert!(table.values().filter(|(tray, _)| tray.is_empty()).count() <= 6, "{text}");
    assert_eq!(lines_with(&said(&output), &["set aside", "says why"]).len(), 1);
    for (option, value) in [("--confidence", "1.5"), ("--confidence", "0.3"), ("--set-aside-share", "0.9")] {
        let refused = kenspeckle(folder.path(), &[&SORT[..], &[option, value]].concat());
        assert_eq!((refused.status.code(), lines_with(&said(&refused), &["terms"]).len()), (Some(1), 1));
    }
}

#[test]
fn examples_are_assessed_and_the_misplaced_one_is_named() {
    let folder = TempDir::new().unwrap();
    directions(folder.path());
    // The second example of the north is filed under south.
    let labels = fs::read_to_string(folder.path().join("labels.csv")).unwrap();
    fs::write(folder.path().join("labels.csv"), labels.replacen("north\nnorth", "north\nsouth", 1)).unwrap();
    let assess = ["assess", "examples.npy", "--labels", "labels.csv"];
    let output = kenspeckle(folder.path(), &assess);
    assert_eq!(output.status.code(), Some(0), "{}", said(&output));
    let text = std::str::from_utf8(&output.stdout).unwrap();
    assert_eq!(lines_with(text, &["20 examples in 4 categories", "19 of 20 right", "95.0 %"]).len(), 1, "{text}");
    assert_eq!(lines_with(text, &["south taken for north: 1"]).len(), 1, "{text}");
    assert_eq!(lines_with(text, &["1: south, rather north"]).len(), 1, "{text}");
    assert_eq!(lines_with(text, &["To sort 95.0 % right"]).len(), 1, "{text}");
    let json = kenspeckle(folder.path(), &[&assess[..], &["--json"]].concat());
    let json: serde_json::Value = serde_json::from_slice(&json.stdout).unwrap();
    let confusion = serde_json::json!({"tray": "south", "takenFor": "north", "items": ["1"]});
    assert_eq!(json["confusions"], serde_json::json!([confusion]));
    assert_eq!((&json["doubts"][0]["item"], &json["doubts"][0]["rather"]), (&"1".into(), &"north".into()));
    assert_eq!(json["projection"]["target"], 0.95);
}

#[test]
fn every_learner_writes_the_same_table_again() {
    let folder = photos();
    for learner in ["auto", "prototype", "ridge", "gradient"] {
        let first = sort_photos(&folder, &["--learner", learner, "--seed", "3", "--out", "a.csv"]);
        let second = sort_photos(&folder, &["--learner", learner, "--seed", "3", "--out", "b.csv"]);
        assert!(first.status.success() && second.status.success());
        assert!(first.stdout.is_empty(), "the table goes to the file alone");
        let read = |name| fs::read_to_string(folder.path().join(name)).unwrap();
        assert_eq!(read("a.csv"), read("b.csv"));
        assert_eq!(table(&read("a.csv")).len(), 10);
    }
}

#[test]
fn json_holds_the_same_result() {
    let folder = photos();
    let csv = table(std::str::from_utf8(&sort_photos(&folder, &[]).stdout).unwrap());
    let json: serde_json::Value = serde_json::from_slice(&sort_photos(&folder, &["--json"]).stdout).unwrap();
    assert_eq!(json["terms"], serde_json::json!({"confidence": 0.9, "setAsideShare": 0.05, "onlySure": false}));
    let count = |tray: &str| csv.values().filter(|(own, _)| own == tray).count();
    assert_eq!(json["trays"], serde_json::json!({"rings": count("rings"), "stripes": count("stripes")}));
    assert_eq!(json["set_aside"], count(""));
    assert_eq!(json["learner"], "auto");
    for item in json["items"].as_array().unwrap() {
        let (tray, probability) = &csv[item["item"].as_str().unwrap()];
        assert_eq!(item["tray"].as_str().unwrap_or_default(), tray.as_str());
        assert_eq!(item["tray"].is_null(), item["set_aside"].is_string());
        assert!((item["probability"].as_f64().unwrap() - probability).abs() < 1e-4);
    }
}

#[test]
fn what_cannot_be_read_is_named_and_the_rest_is_sorted() {
    let folder = photos();
    let root = folder.path();
    let pictures = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/pictures");
    fs::write(root.join("pile/letter.jpg"), "not a picture at all").unwrap();
    fs::write(root.join("pile/empty.png"), "").unwrap();
    fs::copy(pictures.join("huge.png"), root.join("pile/huge.png")).unwrap();
    let whole = fs::read(root.join("pile/rings-3.jpg")).unwrap();
    fs::write(root.join("pile/cut.jpg"), &whole[..whole.len() / 2]).unwrap();
    fs::copy(root.join("pile/rings-3.jpg"), root.join("pile/twin.jpg")).unwrap();
    fs::create_dir(root.join("examples/nothing")).unwrap();
    fs::copy(root.join("pile/rings-3.jpg"), root.join("examples/loose.jpg")).unwrap();
    fs::copy(root.join("pile/rings-4.jpg"), root.join("examples/rings/disputed.jpg")).unwrap();
    fs::copy(root.join("pile/rings-4.jpg"), root.join("examples/stripes/disputed.jpg")).unwrap();

    let output = sort_photos(&folder, &[]);
    let said = said(&output);
    assert_eq!(output.status.code(), Some(3), "{said}");
    for (name, why) in [
        ("pile/letter.jpg", "not a JPEG"),
        ("pile/empty.png", "empty"),
        ("pile/huge.png", "20000 × 20000"),
        ("pile/cut.jpg", "cut off or damaged"),
        ("twin.jpg", "the same file as rings-3.jpg"),
        ("examples/nothing", "no example"),
        ("examples/loose.jpg", "outside the category folders"),
        ("rings/disputed.jpg and stripes/disputed.jpg", "several categories"),
    ] {
        assert_eq!(lines_with(&said, &[name, why]).len(), 1, "{name}: {said}");
    }
    assert_eq!(table(std::str::from_utf8(&output.stdout).unwrap()).len(), 11);
}

#[test]
fn what_makes_sorting_impossible_is_said_in_one_line() {
    let folder = photos();
    let root = folder.path();
    fs::create_dir_all(root.join("hollow/one")).unwrap();
    fs::create_dir_all(root.join("single/rings")).unwrap();
    fs::create_dir_all(root.join("words")).unwrap();
    fs::copy(root.join("pile/rings-3.jpg"), root.join("single/rings/a.jpg")).unwrap();
    fs::write(root.join("words/a.jpg"), "words").unwrap();
    let cases: [(&[&str], &[&str]); 6] = [
        (&["sort", "hollow", "--examples", "examples"], &["hollow", "no file"]),
        (&["sort", "missing", "--examples", "examples"], &["missing", "can't list"]),
        (&["sort", "pile", "--examples", "hollow"], &["hollow", "no example"]),
        (&["sort", "pile", "--examples", "single"], &["at least two categories", "rings"]),
        (&["embed", "words", "--out", "w.npy"], &["words", "none of its files"]),
        (&["embed", "pile", "--out", "no/such/folder/p.npy"], &["p.npy", "can't be written"]),
    ];
    for (arguments, parts) in cases {
        let output = kenspeckle(root, arguments);
        assert_eq!(output.status.code(), Some(1), "{arguments:?}: {}", said(&output));
        assert_eq!(lines_with(&said(&output), parts).len(), 1, "{arguments:?}: {}", said(&output));
        assert!(output.stdout.is_empty());
    }
    let unknown = kenspeckle(root, &["sort", "pile", "--examples", "examples", "--learner", "magic"]);
    assert_eq!(unknown.status.code(), Some(2));
    assert!(said(&unknown).contains("auto, prototype, ridge or gradient"));
}

#[test]
fn embedded_photos_sort_as_the_photos_do() {
    let folder = photos();
    let root = folder.path();
    for name in ["pile", "examples"] {
        let output = kenspeckle(root, &["embed", name, "--out", &format!("{name}.npy")]);
        assert!(output.status.success(), "{}", said(&output));
    }
    let vectors: Array2<f32> = ndarray_npy::read_npy(root.join("pile.npy")).unwrap();
    assert_eq!(vectors.dim(), (10, 1280));
    assert!(vectors.iter().all(|x| *x >= 0.0));
    fs::write(root.join("labels.csv"), "rings\nrings\nrings\nstripes\nstripes\nstripes\n").unwrap();
    let output = kenspeckle(root, &["sort", "pile.npy", "--examples", "examples.npy", "--labels", "labels.csv"]);
    assert!(output.status.success(), "{}", said(&output));
    let by_vector = table(std::str::from_utf8(&output.stdout).unwrap());
    let by_photo = table(std::str::from_utf8(&sort_photos(&folder, &[]).stdout).unwrap());
    assert_eq!(by_vector, by_photo);
}

/// Two clouds of signed vectors in `pile.npy` and `examples.npy`, and `labels.csv`.
fn vectors() -> TempDir {
    let folder = TempDir::new().unwrap();
    let root = folder.path();
    write_npy(root.join("pile.npy"), &array![[1.0_f32, 0.2, -0.1], [-0.1, 1.0, 0.3], [0.9, -0.1, 0.0]]).unwrap();
    write_npy(root.join("examples.npy"), &array![[1.0_f64, 0.1, 0.0], [0.0, 1.0, 0.1]]).unwrap();
    fs::write(root.join("labels.csv"), "flat\n\"tall, thin\"\n").unwrap();
    folder
}

const SORT_VECTORS: [&str; 6] = ["sort", "pile.npy", "--examples", "examples.npy", "--labels", "labels.csv"];

#[test]
fn vectors_are_sorted_by_row() {
    let folder = vectors();
    let output = kenspeckle(folder.path(), &SORT_VECTORS);
    assert_eq!(output.status.code(), Some(0), "{}", said(&output));
    let table = table(std::str::from_utf8(&output.stdout).unwrap());
    let trays: Vec<&str> = ["0", "1", "2"].iter().map(|row| table[*row].0.as_str()).collect();
    assert_eq!(trays, ["flat", "tall, thin", "flat"]);
}

#[test]
fn vectors_that_cannot_be_sorted_are_refused_by_name() {
    type Spoil = fn(&Path);
    let cases: [(Spoil, &[&str]); 10] = [
        (|root| write_npy(root.join("pile.npy"), &Array1::<f32>::ones(6)).unwrap(), &["pile.npy", "1 dimensions"]),
        (
            |root| write_npy(root.join("pile.npy"), &Array3::<f32>::ones((2, 3, 4))).unwrap(),
            &["pile.npy", "3 dimensions"],
        ),
        (|root| write_npy(root.join("pile.npy"), &Array2::<f32>::ones((2, 5))).unwrap(), &["5 numbers", "3"]),
        (|root| write_npy(root.join("pile.npy"), &Array2::<f32>::ones((2, 1))).unwrap(), &["pile.npy", "1 numbers"]),
        (|root| write_npy(root.join("pile.npy"), &Array2::<f32>::ones((0, 3))).unwrap(), &["pile.npy", "no item"]),
        (|root| write_npy(root.join("pile.npy"), &Array2::<u8>::ones((2, 3))).unwrap(), &["pile.npy", "float32"]),
        (|root| fs::write(root.join("pile.npy"), "no numbers").unwrap(), &["pile.npy", "not an .npy file"]),
        (
            |root| {
                // A header that promises far more than the file holds.
                let file = fs::read(root.join("pile.npy")).unwrap();
                let mut huge = file.clone();
                let place = file.windows(6).position(|w| w == b"(3, 3)").unwrap();
                let longer = b"(9999999999, 3), }";
                huge[place..place + longer.len()].copy_from_slice(longer);
                fs::write(root.join("pile.npy"), huge).unwrap();
            },
            &["pile.npy", "cut off or damaged"],
        ),
        (|root| fs::write(root.join("labels.csv"), "flat\n").unwrap(), &["labels.csv", "1 categories", "2 examples"]),
        (|root| fs::write(root.join("labels.csv"), "flat\nflat\n").unwrap(), &["at least two categories", "flat"]),
    ];
    for (spoil, parts) in cases {
        let folder = vectors();
        spoil(folder.path());
        let output = kenspeckle(folder.path(), &SORT_VECTORS);
        assert_eq!(output.status.code(), Some(1), "{parts:?}: {}", said(&output));
        assert_eq!(lines_with(&said(&output), parts).len(), 1, "{parts:?}: {}", said(&output));
    }
    let folder = vectors();
    let output = kenspeckle(folder.path(), &SORT_VECTORS[..4]);
    assert_eq!(lines_with(&said(&output), &["--labels"]).len(), 1);
    let output = kenspeckle(folder.path(), &["sort", "pile.npy", "--examples", "."]);
    assert_eq!(lines_with(&said(&output), &["both"]).len(), 1);
}

#[test]
fn single_vectors_that_are_no_numbers_are_left_out_by_row() {
    let folder = vectors();
    let bad = array![
        [1.0_f32, 0.2, -0.1],
        [f32::NAN, 1.0, 0.3],
        [0.0, 0.0, 0.0],
        [0.1, f32::INFINITY, 0.0],
        [-0.1, 1.0, 0.3]
    ];
    write_npy(folder.path().join("pile.npy"), &bad).unwrap();
    let output = kenspeckle(folder.path(), &SORT_VECTORS);
    let said = said(&output);
    assert_eq!(output.status.code(), Some(3));
    for (row, why) in [("item 1 ", "NaN"), ("item 2 ", "all zeros"), ("item 3 ", "inf")] {
        assert_eq!(lines_with(&said, &[row, why]).len(), 1, "{said}");
    }
    let rows: Vec<String> = table(std::str::from_utf8(&output.stdout).unwrap()).into_keys().collect();
    assert_eq!(rows, ["0", "4"]);
}

#[test]
fn names_become_neither_formulas_nor_terminal_commands() {
    let folder = photos();
    let root = folder.path();
    fs::rename(root.join("pile/rings-3.jpg"), root.join("pile/=HYPERLINK(1).jpg")).unwrap();
    fs::rename(root.join("examples/rings"), root.join("examples/+rings")).unwrap();
    fs::write(root.join("pile/bell\x1b[31m\x07.jpg"), "x").unwrap();
    let output = sort_photos(&folder, &[]);
    assert!(!output.stderr.contains(&0x1b) && !output.stderr.contains(&0x07));
    let table = table(std::str::from_utf8(&output.stdout).unwrap());
    assert_eq!(table["'=HYPERLINK(1).jpg"].0, "'+rings");
}

#[cfg(unix)]
#[test]
fn stopping_leaves_nothing_behind() {
    let folder = TempDir::new().unwrap();
    let root: PathBuf = folder.path().into();
    fs::create_dir(root.join("many")).unwrap();
    for variant in 0..400 {
        draw(variant % 2 == 0, variant).save(root.join(format!("many/{variant}.jpg"))).unwrap();
    }
    let child = Command::new(env!("CARGO_BIN_EXE_kenspeckle"))
        .current_dir(&root)
        .args(["embed", "many", "--out", "m.npy"])
        .stderr(std::process::Stdio::piped())
        .spawn()
        .unwrap();
    std::thread::sleep(std::time::Duration::from_millis(700));
    Command::new("kill").args(["-INT", &child.id().to_string()]).status().unwrap();
    let output = child.wait_with_output().unwrap();
    assert_eq!(output.status.code(), Some(130), "{}", said(&output));
    assert_eq!(lines_with(&said(&output), &["stopped", "nothing was written"]).len(), 1);
    let left: Vec<_> = fs::read_dir(&root).unwrap().map(|entry| entry.unwrap().file_name()).collect();
    assert_eq!(left, ["many"]);
}

#[test]
fn help_tells_a_newcomer_how_to_start() {
    let folder = TempDir::new().unwrap();
    let help = String::from_utf8(kenspeckle(folder.path(), &["--help"]).stdout).unwrap();
    for part in ["Start with", "kenspeckle sort unsorted/ --examples sorted/", "Exit codes", "could hurt someone"] {
        assert!(help.contains(part), "{help}");
    }
}

#[cfg(unix)]
#[test]
fn links_are_followed_and_never_replaced() {
    use std::os::unix::fs::symlink;
    let folder = photos();
    let root = folder.path();
    fs::create_dir(root.join("linked")).unwrap();
    symlink(root.join("pile/rings-3.jpg"), root.join("linked/one.jpg")).unwrap();
    symlink(root.join("pile/box"), root.join("linked/more")).unwrap();
    symlink(root.join("linked"), root.join("linked/more/back")).unwrap();
    symlink(root.join("gone.jpg"), root.join("linked/nowhere.jpg")).unwrap();
    fs::write(root.join("target.csv"), "old").unwrap();
    symlink(root.join("target.csv"), root.join("out.csv")).unwrap();
    let output = kenspeckle(root, &["sort", "linked", "--examples", "examples", "--out", "out.csv"]);
    let said = said(&output);
    assert_eq!(output.status.code(), Some(3), "{said}");
    assert_eq!(lines_with(&said, &["nowhere.jpg", "can't be read"]).len(), 1, "{said}");
    let items: Vec<String> = table(&fs::read_to_string(root.join("target.csv")).unwrap()).into_keys().collect();
    let more = ["more/rings-6.jpg", "more/rings-7.jpg", "more/stripes-6.jpg", "more/stripes-7.jpg"];
    assert_eq!(items, [&more[..], &["one.jpg"]].concat());
    assert!(fs::symlink_metadata(root.join("out.csv")).unwrap().is_symlink());
}

#[cfg(unix)]
#[test]
fn what_is_no_ordinary_file_is_written_to_and_stays() {
    use std::os::unix::fs::FileTypeExt;
    let folder = vectors();
    let root = folder.path();
    assert!(Command::new("mkfifo").arg(root.join("pipe")).status().unwrap().success());
    let reader = std::thread::spawn({
        let pipe = root.join("pipe");
        move || fs::read_to_string(pipe).unwrap()
    });
    let output = kenspeckle(root, &[&SORT_VECTORS[..], &["--out", "pipe"]].concat());
    assert!(output.status.success(), "{}", said(&output));
    assert_eq!(table(&reader.join().unwrap()).len(), 3);
    assert!(fs::metadata(root.join("pipe")).unwrap().file_type().is_fifo());
}

#[test]
fn labels_are_one_a_line() {
    let folder = vectors();
    let labels = folder.path().join("labels.csv");
    fs::write(&labels, "\u{feff}flat\r\n\"tall, thin\"\r\n").unwrap();
    assert!(kenspeckle(folder.path(), &SORT_VECTORS).status.success());
    for (text, line) in [("flat\n\ntall\n", "line 2"), ("\nflat\n", "line 1")] {
        fs::write(&labels, text).unwrap();
        let output = kenspeckle(folder.path(), &SORT_VECTORS);
        assert_eq!(lines_with(&said(&output), &["labels.csv", line, "no category"]).len(), 1, "{}", said(&output));
    }
    fs::write(&labels, [0xff, 0xfe, b'f', 0]).unwrap();
    assert_eq!(lines_with(&said(&kenspeckle(folder.path(), &SORT_VECTORS)), &["labels.csv", "UTF-8"]).len(), 1);
}
