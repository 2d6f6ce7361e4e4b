//! The façade as a program uses it: add, answer, sort, undo, save, restore.

use kenspeckle::{LearnerKind, Settings, Sorter, Space};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

const DIMENSION: usize = 24;

fn settings(learner: LearnerKind) -> Settings {
    Settings { encoder: "test".into(), space: Space::new(DIMENSION, false).unwrap(), learner, seed: 5 }
}

/// `categories` clouds of unlike size around their own directions; embeddings and the truth.
fn clouds(categories: usize, items: usize, seed: u64) -> Vec<(Vec<f32>, usize)> {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let centres: Vec<Vec<f32>> =
        (0..categories).map(|_| (0..DIMENSION).map(|_| rng.random_range(-1.0_f32..1.0)).collect()).collect();
    (0..items)
        .map(|i| {
            // Squares make some categories much larger than others.
            let truth = (i * i) % (categories * 2) % categories;
            let item = centres[truth].iter().map(|x| x + rng.random_range(-0.7_f32..0.7)).collect();
            (item, truth)
        })
        .collect()
}

fn filled(learner: LearnerKind, items: &[(Vec<f32>, usize)]) -> Sorter {
    let mut sorter = Sorter::new(settings(learner));
    for (embedding, _) in items {
        sorter.add_item(embedding).unwrap();
    }
    sorter
}

/// Answers with the truth, `count` times, whatever the sorter asks; trays are named after the categories.
fn answer(sorter: &mut Sorter, items: &[(Vec<f32>, usize)], count: usize) {
    for _ in 0..count {
        let Some(item) = sorter.next_question() else { break };
        let name = format!("category {}", items[item].1);
        let known = sorter.ledger().trays().find(|(_, n)| *n == name).map(|(tray, _)| tray);
        match known {
            Some(tray) => sorter.answer(item, tray).unwrap(),
            None => {
                sorter.answer_new(item, &name).unwrap();
            }
        }
    }
}

fn share_right(sorter: &mut Sorter, items: &[(Vec<f32>, usize)]) -> f64 {
    let names: Vec<(usize, String)> = sorter.ledger().trays().map(|(tray, name)| (tray, name.to_owned())).collect();
    let verdicts = sorter.verdicts();
    let right = items.iter().zip(verdicts).filter(|((_, truth), verdict)| {
        let tray = verdict.and_then(|verdict| verdict.tray);
        names.iter().any(|(number, name)| Some(*number) == tray && *name == format!("category {truth}"))
    });
    right.count() as f64 / items.len() as f64
}

#[test]
fn a_few_answers_sort_a_pile_of_clouds() {
    let items = clouds(6, 300, 1);
    for learner in LearnerKind::ALL {
        let mut sorter = filled(learner, &items);
        answer(&mut sorter, &items, 18);
        let share = share_right(&mut sorter, &items);
        assert!(share > 0.95, "{learner:?}: {share}");
    }
}

#[test]
fn nothing_is_sorted_before_there_are_two_trays() {
    let items = clouds(3, 30, 2);
    let mut sorter = filled(LearnerKind::Auto, &items);
    assert!(sorter.verdicts().iter().all(|verdict| verdict.unwrap().tray.is_none()));
    assert!(sorter.ranking(0).unwrap().is_empty());
    let tray = sorter.answer_new(0, "one").unwrap();
    let verdicts = sorter.verdicts();
    assert_eq!(verdicts[0].unwrap().tray, Some(tray));
    assert!(verdicts[1..].iter().all(|verdict| verdict.unwrap().tray.is_none()));
    sorter.add_tray("two, still empty").unwrap();
    assert!(sorter.verdict(5).unwrap().tray.is_none());
}

#[test]
fn every_item_is_asked_about_once_and_then_no_more() {
    let items = clouds(3, 25, 3);
    let mut sorter = filled(LearnerKind::Auto, &items);
    let mut asked = Vec::new();
    while let Some(item) = sorter.next_question() {
        asked.push(item);
        match asked.len() % 5 {
            0 => sorter.skip(item).unwrap(),
            1 => sorter.answer_none(item).unwrap(),
            _ => {
                let name = format!("category {}", items[item].1);
                let known = sorter.ledger().trays().find(|(_, n)| *n == name).map(|(tray, _)| tray);
                match known {
                    Some(tray) => sorter.answer(item, tray).unwrap(),
                    None => drop(sorter.answer_new(item, &name).unwrap()),
                }
            }
        }
    }
    asked.sort_unstable();
    assert_eq!(asked, (0..25).collect::<Vec<_>>());
}

#[test]
fn undo_brings_back_the_same_verdicts() {
    let items = clouds(4, 60, 4);
    let mut sorter = filled(LearnerKind::Auto, &items);
    answer(&mut sorter, &items, 12);
    let before = sorter.verdicts().to_vec();
    let trays: Vec<usize> = sorter.ledger().trays().map(|(tray, _)| tray).collect();
    sorter.merge_trays(trays[0], trays[1]).unwrap();
    sorter.remove_item(7).unwrap();
    assert!(sorter.verdict(7).is_err());
    assert!(sorter.verdicts()[7].is_none());
    sorter.remove_tray(trays[1]).unwrap();
    assert_ne!(sorter.verdicts(), before);
    for expected in ["remove-tray", "remove-item", "merge-trays"] {
        assert_eq!(sorter.undo().unwrap().name(), expected);
    }
    let after = sorter.verdicts().to_vec();
    for (a, b) in before.iter().zip(&after) {
        let (a, b) = (a.unwrap(), b.unwrap());
        assert_eq!((a.tray, a.answer), (b.tray, b.answer));
        assert!((a.probability - b.probability).abs() < 1e-5);
    }
}

#[test]
fn what_is_saved_comes_back_with_its_log() {
    let items = clouds(4, 60, 6);
    let mut sorter = filled(LearnerKind::Ridge, &items);
    answer(&mut sorter, &items, 9);
    sorter.remove_item(3).unwrap();
    let state = sorter.state();
    let mut embeddings: Vec<f32> = items.iter().flat_map(|(item, _)| item.clone()).collect();
    let mut back = Sorter::restore(&state, &embeddings, None).unwrap();
    assert_eq!(back.ledger(), sorter.ledger());
    assert_eq!(back.settings(), sorter.settings());
    let (a, b) = (sorter.verdicts().to_vec(), back.verdicts().to_vec());
    for (a, b) in a.iter().zip(&b) {
        assert_eq!(a.map(|v| v.tray), b.map(|v| v.tray));
    }
    assert_eq!(back.undo().unwrap().name(), "remove-item");

    // An item that arrived after the state was saved is kept.
    embeddings.extend(&items[0].0);
    assert_eq!(Sorter::restore(&state, &embeddings, None).unwrap().items(), 61);
}

#[test]
fn states_that_do_not_fit_are_refused_by_name() {
    let items = clouds(3, 10, 7);
    let mut sorter = filled(LearnerKind::Auto, &items);
    answer(&mut sorter, &items, 4);
    let state = sorter.state();
    let embeddings: Vec<f32> = items.iter().flat_map(|(item, _)| item.clone()).collect();
    let code = |state: &str, embeddings: &[f32]| Sorter::restore(state, embeddings, None).unwrap_err().code();
    assert_eq!(code("{", &embeddings), "state-unreadable");
    assert_eq!(code(&state[..state.len() / 2], &embeddings), "state-unreadable");
    assert_eq!(code(&state, &embeddings[DIMENSION..]), "state-unreadable");
    assert_eq!(code(&state, &embeddings[1..]), "state-unreadable");
    assert_eq!(code(&state.replacen("\"version\":1", "\"version\":9", 1), &embeddings), "state-newer");
    assert_eq!(code(&state.replacen("{\"tray\":0}", "{\"tray\":77}", 1), &embeddings), "state-unreadable");
    assert_eq!(code(&state.replacen("\"dimension\":24", "\"dimension\":0", 1), &embeddings), "dimension-out-of-range");
    let mut broken = embeddings;
    broken[5] = f32::NAN;
    assert_eq!(code(&state, &broken), "not-finite");
}

#[test]
fn a_refused_item_leaves_the_sorter_as_it_was() {
    let items = clouds(3, 12, 8);
    let mut sorter = filled(LearnerKind::Auto, &items);
    answer(&mut sorter, &items, 6);
    let before = sorter.verdicts().to_vec();
    for bad in [vec![0.0; DIMENSION], vec![f32::NAN; DIMENSION], vec![1.0; DIMENSION + 1], vec![]] {
        assert!(sorter.add_item(&bad).is_err());
    }
    assert!(sorter.answer(99, 0).is_err());
    assert!(sorter.answer(0, 99).is_err());
    assert_eq!(sorter.verdicts(), before);
    assert_eq!(sorter.items(), 12);
}

#[test]
fn piles_too_large_to_compare_all_pairs_are_asked_about() {
    let items = clouds(5, kenspeckle::pile::neighbours::EXACT + 300, 9);
    let mut sorter = filled(LearnerKind::Auto, &items);
    answer(&mut sorter, &items, 15);
    assert!(share_right(&mut sorter, &items) > 0.9);
    let mut again = filled(LearnerKind::Auto, &items);
    answer(&mut again, &items, 15);
    assert_eq!(sorter.verdicts(), again.verdicts(), "the same seed gives the same questions and the same result");
}
