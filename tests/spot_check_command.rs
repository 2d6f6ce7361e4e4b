//! `kenspeckle spot-check` as a person runs it: a table out, judged, and the sentence that it backs.
#![cfg(feature = "cli")]

#[allow(dead_code, reason = "other tests use the rest of it")]
mod program;

use std::{fs, path::Path};

use program::{kenspeckle, said};
use tempfile::TempDir;

/// A result of 200 items in three trays and 10 without one.
fn results() -> TempDir {
    let folder = TempDir::new().unwrap();
    let rows = (0..210).map(|i| match i {
        200.. => format!("shelf/{i}.jpg,,0.3000\r\n"),
        _ => format!("shelf/{i}.jpg,{},0.9000\r\n", ["'=odd", "\"round, flat\"", "square"][i % 3]),
    });
    fs::write(folder.path().join("result.csv"), format!("item,tray,probability\r\n{}", rows.collect::<String>()))
        .unwrap();
    folder
}

/// Fills in the column `right` of sample.csv by position.
fn judge(folder: &Path, right: impl Fn(usize) -> &'static str) -> usize {
    let mut reader = csv::Reader::from_path(folder.join("sample.csv")).unwrap();
    assert_eq!(reader.headers().unwrap(), vec!["item", "tray", "right", "draw"]);
    let rows: Vec<csv::StringRecord> = reader.records().map(Result::unwrap).collect();
    let mut writer = csv::Writer::from_path(folder.join("judged.csv")).unwrap();
    writer.write_record(["item", "tray", "right", "draw"]).unwrap();
    for (position, row) in rows.iter().enumerate() {
        assert!(!row[1].is_empty(), "only sorted items are drawn");
        writer.write_record([&row[0], &row[1], right(position), &row[3]]).unwrap();
    }
    writer.flush().unwrap();
    rows.len()
}

const DRAW: [&str; 7] = ["spot-check", "result.csv", "--tolerance", "0.05", "--confidence", "0.95", "--seed=4711"];

fn run(folder: &TempDir, more: &[&str]) -> std::process::Output {
    kenspeckle(folder.path(), &[&DRAW[..], more].concat())
}

#[test]
fn a_clean_sample_gives_the_sentence() {
    let folder = results();
    let drawn = run(&folder, &["--out", "sample.csv"]);
    assert_eq!(drawn.status.code(), Some(0), "{}", said(&drawn));
    // scipy 1.17.1: hypergeom.cdf(0, 200, 11, 47) = 0.0481, and with 46 it is 0.0518.
    assert_eq!(judge(folder.path(), |_| "yes"), 47);
    let stated = run(&folder, &["--judged", "judged.csv"]);
    assert_eq!(stated.status.code(), Some(0), "{}", said(&stated));
    let sentence = String::from_utf8(stated.stdout).unwrap();
    let known = "At most 5.0 % of the 200 sorted items are in the wrong tray (95 % confidence, 47 looked at, 0 wrong, seed \
                 4711, 20";
    assert!(sentence.starts_with(known), "{sentence}");
}

#[test]
fn mistakes_are_corrected_and_reported() {
    let folder = results();
    run(&folder, &["--by-tray", "--out", "sample.csv"]);
    judge(folder.path(), |position| ["no", "a new tray", "?", "YES"][position.min(3)]);
    let stated = run(&folder, &["--by-tray", "--judged", "judged.csv", "--corrected", "corrected.csv", "--json"]);
    assert_eq!(stated.status.code(), Some(0), "{}", said(&stated));
    let value: serde_json::Value = serde_json::from_slice(&stated.stdout).unwrap();
    assert_eq!((&value["wrong"], &value["untold"], &value["holds"]), (&2.into(), &1.into(), &false.into()));
    assert_eq!(value["trays"][0]["tray"], "'=odd");
    assert!(said(&stated).contains("draw a new sample"), "{}", said(&stated));
    let corrected = fs::read_to_string(folder.path().join("corrected.csv")).unwrap();
    let trays: Vec<String> =
        csv::Reader::from_reader(corrected.as_bytes()).records().map(|row| row.unwrap()[1].to_owned()).collect();
    assert_eq!(trays.iter().filter(|tray| tray.is_empty()).count(), 11);
    assert_eq!(trays.iter().filter(|tray| *tray == "a new tray").count(), 1);
}

#[test]
fn what_does_not_fit_is_refused() {
    let folder = results();
    run(&folder, &["--out", "sample.csv"]);
    judge(folder.path(), |position| if position == 7 { "" } else { "yes" });
    let unfinished = run(&folder, &["--judged", "judged.csv"]);
    assert_eq!(unfinished.status.code(), Some(1));
    assert!(said(&unfinished).contains("is not judged"), "{}", said(&unfinished));
    judge(folder.path(), |_| "yes");
    for (more, words) in [(&["--allowed", "2"][..], "give the same"), (&["--by-tray"][..], "give the same")] {
        let refused = run(&folder, &[more, &["--judged", "judged.csv"]].concat());
        assert_eq!(refused.status.code(), Some(1));
        assert!(said(&refused).contains(words), "{}", said(&refused));
    }
    // Another result: what was drawn is not what would be drawn from it.
    let text = fs::read_to_string(folder.path().join("result.csv")).unwrap();
    let fewer: Vec<&str> = text.lines().take(150).collect();
    fs::write(folder.path().join("result.csv"), fewer.join("\r\n")).unwrap();
    let refused = run(&folder, &["--judged", "judged.csv"]);
    assert_eq!(refused.status.code(), Some(1));
    let words = said(&refused);
    assert!(words.contains("draw anew") || words.contains("judge the sample of this result"), "{words}");
    fs::write(folder.path().join("twice.csv"), "item,tray\r\na,b\r\na,c\r\n").unwrap();
    let refused = kenspeckle(folder.path(), &["spot-check", "twice.csv"]);
    assert!(said(&refused).contains("“a” is there twice"), "{}", said(&refused));
}
