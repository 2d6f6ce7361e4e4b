//! The text encoder: tokens as the reference library gives them, parts of long notes, and what is refused.

#![cfg(feature = "cli")]

use std::sync::OnceLock;

use kenspeckle::encoder::{Encoder, NoteEncoder};
use proptest::prelude::*;
use serde::Deserialize;

fn encoder() -> &'static NoteEncoder {
    static ENCODER: OnceLock<NoteEncoder> = OnceLock::new();
    ENCODER.get_or_init(|| NoteEncoder::bundled().unwrap())
}

fn cosine(a: &[f32], b: &[f32]) -> f64 {
    a.iter().zip(b).map(|(&x, &y)| f64::from(x) * f64::from(y)).sum()
}

#[derive(Deserialize)]
struct Recorded {
    cases: Vec<Case>,
}

#[derive(Deserialize)]
struct Case {
    text: String,
    tokens: Vec<String>,
}

/// Values of the `tokenizers` library, written and checked by pkg-scripts/reference/check_text.py.
#[test]
fn tokens_are_those_of_the_reference() {
    let recorded: Recorded = serde_json::from_str(include_str!("data/tokens.json")).unwrap();
    assert!(recorded.cases.len() >= 10);
    for case in recorded.cases {
        let rows = encoder().tokens(&case.text).unwrap();
        let tokens: Vec<&str> = rows.iter().map(|&row| encoder().token(row).unwrap()).collect();
        assert_eq!(tokens, case.tokens, "{:?}", case.text);
    }
}

#[test]
fn like_notes_point_the_same_way() {
    // Published with the network: "A man is eating food." and "A man is eating a piece of bread." have 0.7553
    // (sentence-transformers documentation, semantic textual similarity; the value from memory).
    let [food, bread] =
        ["A man is eating food.", "A man is eating a piece of bread."].map(|n| encoder().embed(n).unwrap());
    assert!((cosine(&food, &food) - 1.0).abs() < 1e-6);
    assert!((cosine(&food, &bread) - 0.7553).abs() < 0.01, "{}", cosine(&food, &bread));
}

#[test]
fn long_notes_are_read_in_parts() {
    let sentence = "the tide was lower than the table says ";
    let whole = encoder().read(sentence).unwrap();
    assert_eq!((whole.tokens, whole.parts), (8, 1));
    let fits = encoder().read(&"tide ".repeat(254)).unwrap();
    assert_eq!((fits.tokens, fits.parts), (254, 1));
    let long = encoder().read(&"tide ".repeat(255)).unwrap();
    assert_eq!((long.tokens, long.parts), (255, 2));
    // No part is cut within a word where there is a space.
    let pieces = encoder().read(&"kenspeckle ".repeat(200)).unwrap();
    let each = encoder().tokens("kenspeckle").unwrap().len();
    assert!(each > 1 && pieces.parts >= 200 * each / 254, "{} tokens in {} parts", pieces.tokens, pieces.parts);
    // Two parts with the same text have the mean of either.
    let twice = encoder().read(&sentence.repeat(60)).unwrap();
    let once = encoder().read(&sentence.repeat(30)).unwrap();
    assert_eq!((twice.parts, once.parts), (2, 1));
    assert!(cosine(&twice.embedding, &once.embedding) > 0.999_999);
}

#[test]
fn a_note_that_says_nothing_or_is_a_book_is_refused() {
    for note in ["", " \n\t ", "\u{200b}\u{feff}\0"] {
        assert_eq!(encoder().read(note).unwrap_err().code(), "note-empty", "{note:?}");
    }
    assert_eq!(encoder().read(&"a ".repeat(50_001)).unwrap_err().code(), "note-too-long");
    for file in [Vec::new(), vec![0; 100], std::fs::read("www/encoders/photo.onnx").unwrap()] {
        assert_eq!(NoteEncoder::from_bytes(file).map(|_| ()).unwrap_err().code(), "encoder-file");
    }
}

#[test]
fn the_fingerprint_is_of_the_text() {
    let [one, same, other] = ["stuck zip", " stuck zip\n", "stuck zips"].map(|note| encoder().read(note).unwrap());
    assert_eq!(one.fingerprint, same.fingerprint);
    assert_ne!(one.fingerprint, other.fingerprint);
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    /// No text makes the tokenizer fail, and every token is a row of the table.
    #[test]
    fn any_text_has_tokens(text in any::<String>()) {
        if let Ok(tokens) = encoder().tokens(&text) {
            prop_assert!(tokens.iter().all(|&row| encoder().token(row).is_some()));
        }
    }
}
