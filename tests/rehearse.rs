//! `kenspeckle rehearse` as a person runs it.
#![cfg(feature = "cli")]

mod program;

use std::{fs, path::Path, process::Command};

use ndarray::Array2;
use ndarray_npy::write_npy;
use program::{draw, kenspeckle, lines_with, said};
use serde_json::Value;
use tempfile::TempDir;

/// Signed vectors in `v.npy` and their categories in `l.csv`: as many of each category as `sizes` says, around its own axis.
fn vectors(sizes: &[(&str, usize)]) -> TempDir {
    let folder = TempDir::new().unwrap();
    let labels: Vec<usize> = sizes.iter().enumerate().flat_map(|(c, &(_, size))| vec![c; size]).collect();
    // Weyl's sequence: spread out, and without a trend over the items.
    let noise = |i: usize, j: usize| ((i * 8 + j + 1) as f32 * 0.618_034).fract() - 0.5;
    let array = Array2::from_shape_fn((labels.len(), 8), |(i, j)| noise(i, j) + if j == labels[i] { 0.6 } else { 0.0 });
    write_npy(folder.path().join("v.npy"), &array).unwrap();
    let lines: Vec<String> = labels.iter().map(|&label| format!("\"{}\"\n", sizes[label].0)).collect();
    fs::write(folder.path().join("l.csv"), lines.concat()).unwrap();
    folder
}

const VECTORS: [&str; 6] = ["rehearse", "v.npy", "--labels", "l.csv", "--episodes", "20"];

fn rehearse(folder: &TempDir, more: &[&str]) -> std::process::Output {
    kenspeckle(folder.path(), &[&VECTORS, more].concat())
}

fn json(folder: &TempDir, more: &[&str]) -> Value {
    let output = rehearse(folder, &[&["--json"], more].concat());
    assert!(output.status.success(), "{}", said(&output));
    serde_json::from_slice(&output.stdout).unwrap()
}

#[test]
fn photos_in_folders_are_rehearsed() {
    let folder = TempDir::new().unwrap();
    let root = folder.path();
    for (name, rings) in [("rings", true), ("stripes", false)] {
        fs::create_dir_all(root.join("known").join(name)).unwrap();
        for variant in 0..6 {
            draw(rings, variant).save(root.join(format!("known/{name}/{variant}.png"))).unwrap();
        }
    }
    let arguments = ["rehearse", "known", "--episodes", "10", "--json"];
    let output = kenspeckle(root, &arguments);
    assert_eq!(output.status.code(), Some(0), "{}", said(&output));
    let report: Value = serde_json::from_slice(&output.stdout).unwrap();
    assert_eq!(report["categories"], serde_json::json!({"rings": 6, "stripes": 6}));
    assert_eq!((&report["ways"], &report["shots"]), (&2.into(), &serde_json::json!([1, 2, 5])));
    // Rings and stripes look nothing alike; tests/cli.rs sorts them without a mistake by three examples each.
    for found in report["accuracy"].as_array().unwrap() {
        assert!(found["mean"].as_f64().unwrap() > 0.75, "{found}");
    }

    fs::write(root.join("known/rings/letter.jpg"), "not a picture").unwrap();
    fs::copy(root.join("known/rings/0.png"), root.join("known/rings/twin.png")).unwrap();
    let again = kenspeckle(root, &arguments);
    assert_eq!(again.status.code(), Some(3), "what can't be read is left out");
    assert_eq!(lines_with(&said(&again), &["known/rings/letter.jpg", "not a JPEG"]).len(), 1);
    let again: Value = serde_json::from_slice(&again.stdout).unwrap();
    assert_eq!(again["categories"]["rings"], 6, "the same file twice would be asked about with its answer known");
    assert_eq!(again["accuracy"], report["accuracy"]);
}

#[test]
fn the_result_depends_on_the_seed_and_not_on_the_threads() {
    let folder = vectors(&[("a", 20), ("b", 20), ("c", 20), ("d", 20), ("e", 20), ("f", 20)]);
    let one = rehearse(&folder, &["--seed", "5", "--threads", "1", "--plot", "1.svg"]);
    let four = rehearse(&folder, &["--seed", "5", "--threads", "4", "--plot", "4.svg"]);
    assert!(one.status.success(), "{}", said(&one));
    assert_eq!(one.stdout, four.stdout);
    let picture = |name| fs::read(folder.path().join(name)).unwrap();
    assert_eq!(picture("1.svg"), picture("4.svg"));
    assert_ne!(rehearse(&folder, &["--seed", "6"]).stdout, one.stdout);
}

#[test]
fn the_text_and_the_json_say_the_same() {
    let folder = vectors(&[("a", 20), ("b", 20), ("c", 20), ("d\u{1b}[31m", 20)]);
    let report = json(&folder, &["--shots", "1,3", "--ways", "3"]);
    let output = rehearse(&folder, &["--shots", "3,1,3", "--ways", "3"]);
    let text = String::from_utf8(output.stdout).unwrap();
    assert!(!text.contains('\u{1b}'), "a category's name is no command for the terminal");
    assert!(text.starts_with("20 times, 3 of 4 categories were drawn (80 vectors in all)"), "{text}");
    let find = |table: &str, learner: &str, shot: u64| {
        let rows = report[table].as_array().unwrap();
        rows.iter().find(|row| row["learner"] == learner && row["shot"] == shot).unwrap().clone()
    };
    for learner in ["auto", "prototype", "ridge", "gradient"] {
        let row = text.lines().find(|line| line.trim_start().starts_with(learner)).unwrap();
        let cells: Vec<f64> = row.split_whitespace().filter_map(|word| word.parse().ok()).collect();
        for (at, shot) in [(0, 1), (2, 3)] {
            let mean = find("accuracy", learner, shot)["mean"].as_f64().unwrap();
            assert!((cells[at] - 100.0 * mean).abs() <= 0.051, "{learner}: {row}");
        }
    }
    for learner in ["prototype", "ridge", "gradient"] {
        let mean = |table: &str, learner| find(table, learner, 3)["mean"].as_f64().unwrap();
        let difference = mean("accuracy", learner) - mean("accuracy", "auto");
        assert!((mean("difference", learner) - difference).abs() < 1e-12, "paired or not, the means agree");
    }
    let only = json(&folder, &["--learner", "ridge", "--learner", "auto", "--shots", "1"]);
    assert_eq!(only["accuracy"].as_array().unwrap().len(), 2);
    assert_eq!(only["difference"][0]["to"], "auto");
}

#[test]
fn the_picture_is_well_formed_and_describes_itself() {
    let folder = vectors(&[("<a>", 20), ("b & c", 20), ("d", 20)]);
    for shots in ["1,2,5", "4"] {
        let output = rehearse(&folder, &["--plot", "p.svg", "--shots", shots]);
        assert!(output.status.success(), "{}", said(&output));
        let svg = fs::read_to_string(folder.path().join("p.svg")).unwrap();
        let document = roxmltree::Document::parse(&svg).unwrap();
        let root = document.root_element();
        assert_eq!(root.tag_name().namespace(), Some("http://www.w3.org/2000/svg"));
        assert_eq!(root.attribute("role"), Some("img"));
        let named = |id: &str| document.descendants().find(|node| node.attribute("id") == Some(id)).unwrap();
        for id in root.attribute("aria-labelledby").unwrap().split_whitespace() {
            assert!(!named(id).text().unwrap().is_empty());
        }
        let description = named("desc").text().unwrap();
        let words: Vec<&str> = document.descendants().filter_map(|node| node.text()).collect();
        for learner in ["auto", "prototype", "ridge", "gradient"] {
            assert!(description.contains(&format!("{learner}: ")));
            assert!(words.contains(&learner), "{learner} has a label");
        }
        assert!(!svg.contains("NaN") && !svg.contains("inf") && !svg.contains("url("));
    }
}

#[test]
fn categories_with_too_few_items_are_named_and_the_rest_goes_on() {
    let folder = vectors(&[("a", 12), ("b", 12), ("small", 3), ("tiny", 1), ("e", 12)]);
    let output = rehearse(&folder, &["--shots", "5", "--json"]);
    assert_eq!(output.status.code(), Some(0), "{}", said(&output));
    assert_eq!(lines_with(&said(&output), &["left out", "6 vectors", "small (3)", "tiny (1)"]).len(), 1);
    let report: Value = serde_json::from_slice(&output.stdout).unwrap();
    assert_eq!(report["ways"], 3);
    assert_eq!(report["left_out"], serde_json::json!({"small": 3, "tiny": 1}));
    // By default the shots give way before the categories do.
    assert_eq!(json(&folder, &[])["shots"], serde_json::json!([1]));
}

#[test]
fn what_makes_rehearsing_impossible_is_said_in_one_line() {
    type Spoil = fn(&Path);
    let keep: Spoil = |_| ();
    let cases: [(Spoil, &[&str], &[&str]); 7] = [
        (keep, &["--shots", "50"], &["v.npy", "too few vectors", "51 or more", "largest has 8", "--shots"]),
        (keep, &["--ways", "4"], &["--ways 4", "more categories than there are", "3 of 3"]),
        (|root| fs::write(root.join("l.csv"), "a\n".repeat(24)).unwrap(), &[], &["at least two categories", "“a”"]),
        (|root| fs::write(root.join("l.csv"), "a\nb\n").unwrap(), &[], &["l.csv", "2 categories", "24 examples"]),
        (|root| fs::write(root.join("l.csv"), "a\n\"\"\nb\n").unwrap(), &[], &["l.csv", "line 2", "no category"]),
        (|root| fs::remove_file(root.join("l.csv")).unwrap(), &[], &["l.csv", "can't be read"]),
        (keep, &["--plot", "no/such/folder/p.svg"], &["p.svg", "can't be written"]),
    ];
    for (spoil, more, parts) in cases {
        let folder = vectors(&[("a", 8), ("b", 8), ("c", 8)]);
        spoil(folder.path());
        let output = rehearse(&folder, more);
        assert_eq!(output.status.code(), Some(1), "{parts:?}: {}", said(&output));
        assert_eq!(lines_with(&said(&output), parts).len(), 1, "{parts:?}: {}", said(&output));
        assert!(output.stdout.is_empty());
    }
    let folder = vectors(&[("a", 8), ("b", 8)]);
    let output = kenspeckle(folder.path(), &VECTORS[..2]);
    assert_eq!(lines_with(&said(&output), &["v.npy", "--labels"]).len(), 1);
    let output = kenspeckle(folder.path(), &["rehearse", ".", "--labels", "l.csv"]);
    assert_eq!(lines_with(&said(&output), &["--labels goes with an .npy file"]).len(), 1);
    for (option, value) in [("--shots", "0"), ("--ways", "1"), ("--episodes", "3"), ("--queries", "many")] {
        let output = kenspeckle(folder.path(), &[&VECTORS[..4], &[option, value]].concat());
        assert_eq!(output.status.code(), Some(2));
        assert_eq!(lines_with(&said(&output), &[option, "whole number from"]).len(), 1, "{}", said(&output));
    }
}

#[test]
fn vectors_that_are_no_numbers_are_left_out_by_row() {
    let folder = vectors(&[("a", 12), ("b", 12)]);
    let path = folder.path().join("v.npy");
    let mut array: Array2<f32> = ndarray_npy::read_npy(&path).unwrap();
    array[[3, 1]] = f32::NAN;
    array.row_mut(14).fill(0.0);
    write_npy(&path, &array).unwrap();
    let output = rehearse(&folder, &["--json"]);
    assert_eq!(output.status.code(), Some(3));
    assert_eq!(lines_with(&said(&output), &["item 3:", "NaN"]).len(), 1);
    assert_eq!(lines_with(&said(&output), &["item 14:", "all zeros"]).len(), 1);
    let report: Value = serde_json::from_slice(&output.stdout).unwrap();
    assert_eq!(report["categories"], serde_json::json!({"a": 11, "b": 11}));
    assert_eq!(report["unreadable"], 2);
}

#[test]
fn uneven_tasks_are_other_tasks() {
    let folder = vectors(&[("a", 40), ("b", 40), ("c", 40)]);
    let (even, uneven) = (json(&folder, &[]), json(&folder, &["--uneven"]));
    assert_eq!(uneven["uneven"], true);
    assert_ne!(even["accuracy"], uneven["accuracy"]);
}

#[cfg(unix)]
#[test]
fn stopping_leaves_nothing_behind() {
    let folder = vectors(&[("a", 40), ("b", 40), ("c", 40)]);
    let child = Command::new(env!("CARGO_BIN_EXE_kenspeckle"))
        .current_dir(folder.path())
        .args(["rehearse", "v.npy", "--labels", "l.csv", "--episodes", "100000", "--plot", "p.svg"])
        .stdout(std::process::Stdio::piped())
        .stderr(std::process::Stdio::piped())
        .spawn()
        .unwrap();
    std::thread::sleep(std::time::Duration::from_millis(700));
    Command::new("kill").args(["-INT", &child.id().to_string()]).status().unwrap();
    let output = child.wait_with_output().unwrap();
    assert_eq!(output.status.code(), Some(130), "{}", said(&output));
    assert_eq!(lines_with(&said(&output), &["stopped", "nothing was written"]).len(), 1);
    assert!(output.stdout.is_empty() && !folder.path().join("p.svg").exists());
}
