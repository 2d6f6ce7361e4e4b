//! Labels spread over the pile, and the questions that follow, against values computed elsewhere; and what must hold for
//! any pile.

use kenspeckle::{
    LearnerKind, Settings, Sorter, Space,
    pile::{
        Pile,
        graph::Graph,
        neighbours::Neighbours,
        propagation::{Propagation, Sight},
    },
};
use proptest::prelude::*;
use serde::Deserialize;

#[derive(Deserialize)]
struct Reference {
    vectors: Vec<Vec<f32>>,
    answers: Vec<(usize, usize)>,
    spread: Vec<Vec<f64>>,
    chosen: Vec<usize>,
}

fn reference() -> Reference {
    serde_json::from_str(include_str!("data/propagation.json")).unwrap()
}

fn graph(vectors: &[Vec<f32>]) -> Graph {
    let mut pile = Pile::new(Space::new(vectors[0].len(), false).unwrap());
    vectors.iter().for_each(|vector| {
        pile.add(vector).unwrap();
    });
    let mut neighbours = Neighbours::default();
    neighbours.catch_up(&pile);
    neighbours.graph(&pile)
}

fn members(answers: &[(usize, usize)], categories: usize) -> Vec<Vec<usize>> {
    let of = |category| answers.iter().filter(|answer| answer.1 == category).map(|answer| answer.0).collect();
    (0..categories).map(of).collect()
}

fn sorter(vectors: &[Vec<f32>]) -> Sorter {
    let space = Space::new(vectors[0].len(), false).unwrap();
    let mut sorter = Sorter::new(Settings { encoder: "test".into(), space, learner: LearnerKind::Auto, seed: 1 });
    vectors.iter().for_each(|vector| {
        sorter.add_item(vector).unwrap();
    });
    sorter
}

/// scikit-learn 1.9.1, `LabelSpreading` with the same affinity (pkg-scripts/reference/propagation_values.py).
#[test]
fn labels_spread_as_in_scikit_learn() {
    let reference = reference();
    let graph = graph(&reference.vectors);
    let columns: Vec<Vec<f64>> = members(&reference.answers, 4).iter().map(|members| graph.solve(members)).collect();
    for (item, expected) in reference.spread.iter().enumerate() {
        let sum: f64 = columns.iter().map(|column| column[item]).sum();
        for (column, expected) in columns.iter().zip(expected) {
            assert!((column[item] / sum - expected).abs() < 1e-4, "item {item}");
        }
    }
}

/// numpy 2.4.6, greedy facility location over the whole kernel (pkg-scripts/reference/propagation_values.py).
#[test]
fn questions_are_those_of_the_whole_matrix() {
    let reference = reference();
    let mut sorter = sorter(&reference.vectors);
    assert_eq!(sorter.next_questions(12), reference.chosen);
    assert_eq!(sorter.next_question(), Some(reference.chosen[0]));
}

/// What is left out in closed form is what spreading without that answer gives.
#[test]
fn leaving_an_answer_out_is_spreading_without_it() {
    let reference = reference();
    let graph = graph(&reference.vectors);
    let mut all = Propagation::default();
    all.update(&graph, &members(&reference.answers, 4));
    for &(item, category) in &reference.answers {
        let others: Vec<(usize, usize)> = reference.answers.iter().copied().filter(|answer| answer.0 != item).collect();
        let mut without = Propagation::default();
        without.update(&graph, &members(&others, 4));
        let closed = all.left_out(item, category).unwrap();
        let refit = without.probabilities(item).unwrap();
        closed.iter().zip(&refit).for_each(|(a, b)| assert!((a - b).abs() < 1e-5, "{closed:?} {refit:?}"));
    }
}

#[test]
fn an_update_is_the_same_as_starting_anew() {
    let reference = reference();
    let graph = graph(&reference.vectors);
    let mut growing = Propagation::default();
    for count in 4..=reference.answers.len() {
        growing.update(&graph, &members(&reference.answers[..count], 4));
    }
    let mut anew = Propagation::default();
    anew.update(&graph, &members(&reference.answers, 4));
    for item in 0..reference.vectors.len() {
        assert_eq!(growing.probabilities(item), anew.probabilities(item));
    }
}

#[test]
fn the_weight_follows_the_evidence() {
    let sights = |learner, pile, count| (0..count).map(move |_| Sight { learner, pile });
    assert_eq!(Sight::weight([]), 0.5);
    assert_eq!(Sight::weight(sights(0.9, 0.9, 50)), 0.5);
    assert!(Sight::weight(sights(0.9, 0.1, 50)) < 0.1);
    assert!(Sight::weight(sights(0.1, 0.9, 50)) > 0.9);
    assert!((0.3..0.5).contains(&Sight::weight(sights(0.9, 0.6, 12))));
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(24))]

    /// Whatever is answered in whatever order: probabilities are probabilities, no question comes twice, a strip holds
    /// open items of its tray only, and what was saved asks the same.
    #[test]
    fn any_order_of_answers_is_taken(answers in prop::collection::vec((0_usize..60, 0_usize..5), 0..30), count in 1_usize..9) {
        let reference = reference();
        let mut sorter = sorter(&reference.vectors);
        let trays: Vec<usize> = (0..4).map(|tray| sorter.add_tray(&tray.to_string()).unwrap()).collect();
        for &(item, tray) in &answers {
            match trays.get(tray) {
                Some(&tray) => sorter.answer(item, tray).unwrap(),
                None => sorter.answer_none(item).unwrap(),
            }
        }
        for item in 0..60 {
            let ranking = sorter.ranking(item).unwrap();
            let sum: f64 = ranking.iter().map(|(_, p)| p).sum();
            prop_assert!(ranking.is_empty() || (sum - 1.0).abs() < 1e-9);
            prop_assert!(ranking.iter().all(|(_, p)| (0.0..=1.0 + 1e-12).contains(p)));
        }
        let asked = sorter.next_questions(count);
        let mut distinct = asked.clone();
        distinct.sort_unstable();
        distinct.dedup();
        prop_assert_eq!(distinct.len(), asked.len());
        prop_assert!(asked.iter().all(|item| answers.iter().all(|(answered, _)| answered != item)));
        for &tray in &trays {
            for item in sorter.strip(tray, count) {
                let verdict = sorter.verdict(item).unwrap();
                prop_assert!(verdict.tray == Some(tray) && verdict.answer == kenspeckle::ledger::Answer::Open);
            }
        }
        if let Some(outlook) = sorter.outlook() {
            for range in [outlook.now, outlook.after_more] {
                prop_assert!(0.0 <= range.low && range.low <= range.expected && range.expected <= range.high && range.high <= 1.0);
            }
            prop_assert!(outlook.after_more.expected >= outlook.now.expected);
        }
        let flat: Vec<f32> = reference.vectors.concat();
        let mut back = Sorter::restore(&sorter.state(), &flat, None).unwrap();
        prop_assert_eq!(back.verdicts().to_vec(), sorter.verdicts().to_vec());
        prop_assert_eq!(back.next_questions(count), asked);
    }
}
