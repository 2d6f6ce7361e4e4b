//! `kenspeckle learn` as a person runs it: past piles in, a starter out, and a sort that needs fewer examples.
#![cfg(feature = "cli")]

use std::{
    fs,
    path::Path,
    process::{Command, Output},
};

use ndarray::Array2;
use ndarray_npy::write_npy;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use tempfile::TempDir;

const DIMENSION: usize = 16;

fn kenspeckle(folder: &Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_kenspeckle")).current_dir(folder).args(arguments).output().unwrap()
}

fn done(folder: &Path, arguments: &[&str]) -> String {
    let output = kenspeckle(folder, arguments);
    assert!(output.status.success(), "{arguments:?}: {}", String::from_utf8_lossy(&output.stderr));
    String::from_utf8(output.stdout).unwrap()
}

fn refused(folder: &Path, arguments: &[&str], parts: &[&str]) {
    let output = kenspeckle(folder, arguments);
    let said = String::from_utf8(output.stderr).unwrap();
    assert_eq!(output.status.code(), Some(1), "{arguments:?}: {said}");
    assert!(parts.iter().all(|part| said.contains(part)), "{said}");
    assert_eq!(said.lines().count(), 1, "{said}");
}

/// Items of each category differ wildly in the first half of their numbers; the categories differ in the second half.
fn write_pile(folder: &Path, name: &str, categories: usize, each: usize, seed: u64) {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let mut numbers = Vec::new();
    let mut labels = String::new();
    for category in 0..categories {
        let centre: Vec<f32> = (0..DIMENSION).map(|_| rng.random_range(-1.0..1.0)).collect();
        for _ in 0..each {
            numbers.extend((0..DIMENSION).map(|j| {
                if j < DIMENSION / 2 {
                    rng.random_range(-2.0_f32..2.0)
                } else {
                    centre[j] + rng.random_range(-0.3..0.3)
                }
            }));
            labels += &format!("{name} {category}\n");
        }
    }
    let array = Array2::from_shape_vec((categories * each, DIMENSION), numbers).unwrap();
    write_npy(folder.join(format!("{name}.npy")), &array).unwrap();
    fs::write(folder.join(format!("{name}.csv")), labels).unwrap();
}

fn past() -> TempDir {
    let folder = TempDir::new().unwrap();
    write_pile(folder.path(), "first", 12, 8, 1);
    write_pile(folder.path(), "second", 10, 6, 2);
    folder
}

#[test]
fn a_starter_makes_the_next_sort_better() {
    let folder = past();
    let root = folder.path();
    done(
        root,
        &["learn", "first.npy", "second.npy", "--labels", "first.csv", "--labels", "second.csv", "--out", "s.starter"],
    );
    let (mut plain, mut started) = (0, 0);
    for seed in 10..18 {
        write_pile(root, "new", 4, 20, seed);
        let all: Array2<f32> = ndarray_npy::read_npy(root.join("new.npy")).unwrap();
        write_npy(root.join("examples.npy"), &all.select(ndarray::Axis(0), &[0, 20, 40, 60])).unwrap();
        fs::write(root.join("labels.csv"), "0\n1\n2\n3\n").unwrap();
        let sort = ["sort", "new.npy", "--examples", "examples.npy", "--labels", "labels.csv"];
        let right = |table: String| {
            let truth = |row: &str| row.parse::<usize>().unwrap() / 20;
            table
                .lines()
                .skip(1)
                .map(|line| line.split(',').collect::<Vec<_>>())
                .filter(|f| truth(f[0]).to_string() == f[1])
                .count()
        };
        plain += right(done(root, &sort));
        started += right(done(root, &[&sort[..], &["--starter", "s.starter"]].concat()));
    }
    assert!(started > plain + 40, "{started} of 640 right with a starter, {plain} without");
}

#[test]
fn sums_gathered_apart_make_the_same_starter() {
    let folder = past();
    let root = folder.path();
    let both = ["learn", "first.npy", "second.npy", "--labels", "first.csv", "--labels", "second.csv"];
    done(root, &[&both[..], &["--out", "whole.starter"]].concat());
    for name in ["first", "second"] {
        let (npy, csv, part) = (format!("{name}.npy"), format!("{name}.csv"), format!("{name}.part"));
        done(root, &["learn", &npy, "--labels", &csv, "--partial", "--out", &part]);
    }
    for (order, out) in [(["first.part", "second.part"], "a.starter"), (["second.part", "first.part"], "b.starter")] {
        done(root, &["learn", order[0], order[1], "--out", out]);
        let read = |name: &str| kenspeckle::Starter::read(&fs::read(root.join(name)).unwrap()).unwrap();
        let (whole, merged) = (read("whole.starter"), read(out));
        assert_eq!((whole.categories(), whole.items()), (merged.categories(), merged.items()));
        let close = |a: &[f32], b: &[f32]| a.iter().zip(b).all(|(a, b)| (a - b).abs() < 1e-5);
        assert!(close(whole.mean(), merged.mean()));
        assert!(close(whole.whitening().parts().1, merged.whitening().parts().1));
    }
}

#[test]
fn a_starter_names_no_category_and_holds_no_item() {
    let folder = past();
    let root = folder.path();
    done(root, &["learn", "first.npy", "--labels", "first.csv", "--out", "s.starter"]);
    let file = fs::read(root.join("s.starter")).unwrap();
    let starter = kenspeckle::Starter::read(&file).unwrap();
    assert_eq!(starter.categories(), 12);
    assert!(!String::from_utf8_lossy(&file).contains("first"));
    // A fixed size whatever was learned from: there is no place for items.
    done(
        root,
        &["learn", "first.npy", "second.npy", "--labels", "first.csv", "--labels", "second.csv", "--out", "t.starter"],
    );
    let other = fs::metadata(root.join("t.starter")).unwrap().len();
    assert!(other.abs_diff(file.len() as u64) < 64);
}

#[test]
fn what_cannot_be_learned_from_is_refused_by_name() {
    let folder = past();
    let root = folder.path();
    write_pile(root, "few", 3, 5, 3);
    write_pile(root, "single", 9, 1, 4);
    fs::write(root.join("words.part"), "no sums").unwrap();
    refused(root, &["learn", "first.npy", "--out", "x.starter"], &["first.npy", "--labels"]);
    refused(root, &["learn", "few.npy", "--labels", "few.csv", "--out", "x.starter"], &["3 categories", "8"]);
    refused(
        root,
        &["learn", "single.npy", "--labels", "single.csv", "--out", "x.starter"],
        &["too little to learn from"],
    );
    refused(root, &["learn", "words.part", "--out", "x.starter"], &["words.part", "ZIP"]);
    refused(root, &["learn", "missing.part", "--out", "x.starter"], &["missing.part", "can't be read"]);
    let sort = ["sort", "first.npy", "--examples", "few.npy", "--labels", "few.csv", "--starter"];
    refused(root, &[&sort[..], &["words.part"]].concat(), &["words.part", "starter"]);
    assert!(!root.join("x.starter").exists());
    done(root, &["learn", "few.npy", "--labels", "few.csv", "--out", "few.starter", "--min-categories", "2"]);
}

#[test]
fn a_rehearsal_shows_what_the_starter_is_worth() {
    let folder = past();
    let root = folder.path();
    write_pile(root, "new", 8, 20, 30);
    done(
        root,
        &["learn", "first.npy", "second.npy", "--labels", "first.csv", "--labels", "second.csv", "--out", "s.starter"],
    );
    let rehearse = ["rehearse", "new.npy", "--labels", "new.csv", "--starter", "s.starter", "--shots", "1"];
    let text = done(root, &[&rehearse[..], &["--learner", "auto", "--episodes", "60"]].concat());
    let share = |name: &str| -> f64 {
        let line = text.lines().find(|line| line.trim_start().starts_with(name)).unwrap();
        line.trim_start()[name.len()..].split_whitespace().next().unwrap().parse().unwrap()
    };
    assert!(share("auto + starter") > share("auto ") + 5.0, "{text}");
}
