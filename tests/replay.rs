//! Replaying the whole job: what piles are drawn, what is counted, and that asking pays.

use std::{collections::HashSet, num::NonZeroUsize};

use kenspeckle::{
    LearnerKind, Settings, Sorter, Space,
    meta::{
        episode::Labelled,
        replay::{Course, Moment, Order, Plan, Player, Replay, answers_needed},
    },
};
use proptest::prelude::*;

fn number(number: usize) -> NonZeroUsize {
    NonZeroUsize::new(number).unwrap()
}

fn plan(categories: usize, size: usize, uneven: bool, strays: usize, answers: usize) -> Plan {
    Plan { categories: number(categories), size: number(size), uneven, strays, answers: number(answers), seed: 7 }
}

/// Vectors of 12 numbers around one axis a category, so many of each.
fn material(sizes: &[usize], signal: f32) -> (Vec<Vec<f32>>, Vec<usize>) {
    let labels: Vec<usize> = sizes.iter().enumerate().flat_map(|(label, &size)| vec![label; size]).collect();
    // Weyl's sequence: spread out, and without a trend over the items.
    let noise = |i: usize, j: usize| ((i * 12 + j + 1) as f32 * 0.618_034).fract() - 0.5;
    let vector = |(i, &label): (usize, &usize)| {
        (0..12).map(|j| noise(i, j) + if j == label { signal } else { 0.0 }).collect::<Vec<f32>>()
    };
    (labels.iter().enumerate().map(vector).collect(), labels)
}

fn players() -> Vec<Player> {
    let settings = Settings {
        encoder: "test".into(),
        space: Space::new(12, false).unwrap(),
        learner: LearnerKind::Ridge,
        seed: 1,
    };
    let player = |name: &str, order| Player { name: name.into(), sorter: Sorter::new(settings.clone()), order };
    vec![player("asked", Order::Asked), player("random", Order::Random)]
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn piles_are_what_the_plan_says(
        sizes in prop::collection::vec(2_usize..40, 4..9),
        categories in 2_usize..5,
        size in 10_usize..80,
        uneven in any::<bool>(),
        strays in 0_usize..9,
        pile in 0_u64..50,
    ) {
        let (embeddings, labels) = material(&sizes, 1.0);
        let labelled = Labelled::new(&labels, sizes.len()).unwrap();
        let plan = plan(categories, size, uneven, strays, 5);
        let replay = Replay::new(&embeddings, labelled, plan, &[]).unwrap();
        let drawn = replay.draw(pile);
        prop_assert_eq!(&drawn, &replay.draw(pile));
        prop_assert_eq!(drawn.items.iter().collect::<HashSet<_>>().len(), drawn.items.len(), "an item came twice");
        let mut order = drawn.shuffled.clone();
        order.sort_unstable();
        prop_assert_eq!(order, (0..drawn.items.len()).collect::<Vec<_>>());
        let mut counts = vec![0; categories];
        let mut of = vec![None; categories];
        for (&item, truth) in drawn.items.iter().zip(&drawn.truth) {
            if let Some(label) = *truth {
                counts[label] += 1;
                prop_assert!(of[label].is_none_or(|category| category == labels[item]), "a label is one category");
                of[label] = Some(labels[item]);
            }
        }
        prop_assert!(counts.iter().all(|&count| count >= 1));
        for (item, truth) in drawn.items.iter().zip(&drawn.truth) {
            if truth.is_none() {
                prop_assert!(!of.contains(&Some(labels[*item])), "a stray belongs to none of the categories");
            }
        }
        prop_assert!(drawn.truth.iter().filter(|truth| truth.is_none()).count() <= strays);
        if uneven {
            for pair in counts.windows(2) {
                // Rounding by at most a half on either side.
                prop_assert!(pair[1] <= pair[0] && (pair[1] as f64 - 0.66 * pair[0] as f64).abs() <= 0.84 || pair[1] == 1);
            }
        } else {
            let share = (size as f64 / categories as f64).round() as usize;
            prop_assert!(counts.iter().all(|&count| count <= share));
        }
    }
}

#[test]
fn asking_finds_every_category_sooner_and_sorts_with_fewer_answers() {
    let (embeddings, labels) = material(&[60; 10], 0.7);
    let labelled = Labelled::new(&labels, 10).unwrap();
    let players = players();
    let replay = Replay::new(&embeddings, labelled, plan(6, 120, true, 4, 24), &players).unwrap();
    let courses: Vec<Vec<Course>> = (0..6).map(|pile| replay.play(pile).unwrap()).collect();
    assert_eq!(replay.play(3).unwrap(), courses[3], "a pile doesn't depend on those before");
    let mean = |player: usize| {
        let last = |course: &Vec<Course>| course[player].moments.last().unwrap().rest;
        courses.iter().map(last).sum::<f64>() / 6.0
    };
    let met = |player: usize| courses.iter().map(|course| course[player].all_met.unwrap_or(25)).sum::<usize>();
    assert!(mean(0) > mean(1), "{} {}", mean(0), mean(1));
    assert!(met(0) < met(1), "{} {}", met(0), met(1));
    for moment in courses.iter().flatten().flat_map(|course| &course.moments) {
        assert!(moment.whole >= moment.rest, "answered items are in their own tray");
        assert!(moment.met <= 6);
    }
}

#[test]
fn answers_are_read_off_the_mean_curve() {
    let course = |shares: [f64; 3]| Course {
        moments: shares
            .into_iter()
            .enumerate()
            .map(|(at, rest)| Moment { answers: 4 * (at + 1), rest, whole: rest, met: 2, outlook: None })
            .collect(),
        all_met: Some(2),
    };
    let courses = [course([0.4, 0.6, 0.9]), course([0.2, 0.8, 0.9])];
    // Means 0.3, 0.7, 0.9 after 4, 8 and 12 answers.
    assert_eq!(answers_needed(courses.iter(), 0.3), Some(4.0));
    assert!((answers_needed(courses.iter(), 0.5).unwrap() - 6.0).abs() < 1e-12);
    assert!((answers_needed(courses.iter(), 0.8).unwrap() - 10.0).abs() < 1e-12);
    assert_eq!(answers_needed(courses.iter(), 0.95), None);
    assert_eq!(answers_needed([].iter(), 0.5), None);
}

#[test]
fn too_few_categories_are_refused() {
    let (embeddings, labels) = material(&[5, 1, 5], 1.0);
    let labelled = Labelled::new(&labels, 3).unwrap();
    let refusal = Replay::new(&embeddings, labelled, plan(3, 10, false, 0, 5), &[]).unwrap_err();
    assert_eq!(refusal.code(), "too-few-categories");
}
