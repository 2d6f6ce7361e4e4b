//! `kenspeckle ask` as a person and as another program use it.
#![cfg(feature = "cli")]

use std::{
    fs,
    io::{BufRead, BufReader, Write},
    path::Path,
    process::{Child, ChildStdin, ChildStdout, Command, Stdio},
};

use ndarray::Array2;
use ndarray_npy::write_npy;
use serde_json::{Value, json};
use tempfile::TempDir;

const CATEGORIES: [&str; 3] = ["rims", "handles", "walls"];

/// 45 signed vectors around three axes in `v.npy`; an item's category is its number modulo three.
fn pile() -> TempDir {
    let folder = TempDir::new().unwrap();
    // Weyl's sequence: spread out, and without a trend over the items.
    let noise = |i: usize, j: usize| ((i * 8 + j + 1) as f32 * 0.618_034).fract() - 0.5;
    let array = Array2::from_shape_fn((45, 8), |(i, j)| noise(i, j) + if j == i % 3 { 1.2 } else { 0.0 });
    write_npy(folder.path().join("v.npy"), &array).unwrap();
    folder
}

struct Talk {
    child: Child,
    to: ChildStdin,
    from: BufReader<ChildStdout>,
}

impl Talk {
    fn begin(folder: &Path, more: &[&str]) -> Self {
        let mut child = Command::new(env!("CARGO_BIN_EXE_kenspeckle"))
            .current_dir(folder)
            .args(["ask", "v.npy", "--json"])
            .args(more)
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .stderr(Stdio::null())
            .spawn()
            .unwrap();
        let (to, from) = (child.stdin.take().unwrap(), BufReader::new(child.stdout.take().unwrap()));
        Self { child, to, from }
    }

    fn hear(&mut self) -> Value {
        let mut line = String::new();
        self.from.read_line(&mut line).unwrap();
        serde_json::from_str(&line).unwrap()
    }

    fn say(&mut self, wish: &Value) {
        writeln!(self.to, "{wish}").unwrap();
    }

    fn end(mut self) -> Option<i32> {
        drop(self.to);
        self.child.wait().unwrap().code()
    }
}

fn truth(item: &str) -> &'static str {
    CATEGORIES[item.parse::<usize>().unwrap() % 3]
}

#[test]
fn another_program_answers_stops_and_goes_on() {
    let folder = pile();
    let mut talk = Talk::begin(folder.path(), &[]);
    for answers in 0..9 {
        let question = talk.hear();
        assert_eq!(question["answers"], answers);
        let item = question["ask"].as_str().unwrap().to_owned();
        talk.say(&json!({ "do": "answer", "tray": truth(&item) }));
    }
    let question = talk.hear();
    assert_eq!(question["trays"].as_array().unwrap().len(), 3, "nine answers meet three trays");
    let now = question["outlook"]["now"].as_array().unwrap();
    assert!(now[0].as_f64() < now[2].as_f64());
    talk.say(&json!({ "do": "stop" }));
    assert_eq!(talk.end(), Some(0));

    let mut talk = Talk::begin(folder.path(), &["--out", "result.csv"]);
    assert_eq!(talk.hear(), question, "it goes on where it was left");
    talk.say(&json!({ "do": "strip", "tray": "rims", "count": 4 }));
    let strip = talk.hear();
    let items: Vec<&str> = strip["strip"].as_array().unwrap().iter().map(|item| item.as_str().unwrap()).collect();
    assert!(!items.is_empty() && items.len() <= 4 && items.iter().all(|item| truth(item) == "rims"));
    assert_eq!(talk.hear(), question, "a strip alone answers nothing");
    talk.say(&json!({ "do": "answer", "tray": "rims", "items": items }));
    assert_eq!(talk.hear()["answers"], 9 + items.len());
    talk.say(&json!({ "do": "undo" }));
    assert_eq!(talk.hear()["answers"], 9);
    assert_eq!(talk.end(), Some(0));

    let table = fs::read_to_string(folder.path().join("result.csv")).unwrap();
    let rows: Vec<Vec<&str>> = table.lines().skip(1).map(|line| line.split(',').collect()).collect();
    assert_eq!(rows.len(), 45);
    assert_eq!(rows.iter().filter(|row| row[3] == "yes").count(), 9);
    assert!(rows.iter().filter(|row| row[1] == truth(row[0])).count() >= 43);
}

#[test]
fn what_cannot_be_done_is_said_and_the_question_stands() {
    let folder = pile();
    let mut talk = Talk::begin(folder.path(), &[]);
    let question = talk.hear();
    for (wish, code) in [
        (json!({ "do": "dance" }), "not-understood"),
        (json!({ "do": "answer", "tray": " " }), "tray-name-empty"),
        (json!({ "do": "answer", "tray": "rims", "items": ["none such"] }), "no-such-item"),
        (json!({ "do": "strip", "tray": "rims" }), "no-such-tray"),
    ] {
        talk.say(&wish);
        assert_eq!(talk.hear()["error"], code);
        assert_eq!(talk.hear(), question);
    }
    assert_eq!(talk.end(), Some(0));
}

#[test]
fn answers_of_another_pile_are_refused() {
    let folder = pile();
    let path = folder.path();
    fs::write(path.join("v.npy.answers.json"), "{\"version\": 9, \"items\": [], \"state\": \"\"}").unwrap();
    let run = || {
        let output = Command::new(env!("CARGO_BIN_EXE_kenspeckle"))
            .current_dir(path)
            .args(["ask", "v.npy", "--json"])
            .output()
            .unwrap();
        (output.status.code(), String::from_utf8(output.stderr).unwrap())
    };
    let (code, said) = run();
    assert!(code == Some(1) && said.contains("version 9"), "{said}");
    fs::write(
        path.join("v.npy.answers.json"),
        "{\"version\": 1, \"items\": [{\"name\": \"99\", \"key\": \"0\"}], \"state\": \"{}\"}",
    )
    .unwrap();
    let (code, said) = run();
    assert!(code == Some(1) && said.contains("no longer in the pile"), "{said}");
}

#[test]
fn a_person_types_numbers_and_names() {
    let folder = pile();
    let mut child = Command::new(env!("CARGO_BIN_EXE_kenspeckle"))
        .current_dir(folder.path())
        .args(["ask", "v.npy"])
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::null())
        .spawn()
        .unwrap();
    child.stdin.take().unwrap().write_all("one\ntwo\n1\n-\n?\nu\nq\n".as_bytes()).unwrap();
    let output = child.wait_with_output().unwrap();
    assert_eq!(output.status.code(), Some(0));
    let shown = String::from_utf8(output.stdout).unwrap();
    assert!(shown.contains("4 answers"), "{shown}");
    let saved: Value =
        serde_json::from_str(&fs::read_to_string(folder.path().join("v.npy.answers.json")).unwrap()).unwrap();
    assert_eq!(saved["items"].as_array().unwrap().len(), 45);
}
