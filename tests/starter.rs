//! What past piles taught: learned, saved, read, used.

use std::sync::Arc;

use kenspeckle::{
    LearnerKind, Settings, Sorter, Space, Starter, meta::statistics::Statistics, trust::Terms, whitening::Whitening,
};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

const DIMENSION: usize = 20;

/// Items differ between categories in the last twelve numbers, and within every category wildly in the first eight.
fn item(centre: &[f32], rng: &mut ChaCha8Rng) -> Vec<f32> {
    (0..DIMENSION)
        .map(|j| if j < 8 { rng.random_range(-2.0..2.0) } else { centre[j] + rng.random_range(-0.3..0.3) })
        .collect()
}

fn centres(count: usize, rng: &mut ChaCha8Rng) -> Vec<Vec<f32>> {
    (0..count).map(|_| (0..DIMENSION).map(|_| rng.random_range(-1.0..1.0)).collect()).collect()
}

fn space() -> Space {
    Space::new(DIMENSION, false).unwrap()
}

fn statistics(categories: usize, each: usize, seed: u64) -> Statistics {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let mut statistics = Statistics::new("test", space());
    let pile: Vec<Vec<Vec<f32>>> = centres(categories, &mut rng)
        .iter()
        .map(|centre| (0..each).map(|_| item(centre, &mut rng)).collect())
        .collect();
    statistics.add_pile(pile.iter().map(|items| items.iter().map(Vec::as_slice))).unwrap();
    statistics
}

fn settings() -> Settings {
    Settings { encoder: "test".into(), space: space(), learner: LearnerKind::Auto, seed: 1 }
}

/// Share of a pile of new categories sorted right after one example of each.
fn share_right(starter: Option<&Arc<Starter>>, seed: u64) -> f64 {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let mut sorter = match starter {
        Some(starter) => Sorter::with_starter(settings(), starter.clone()).unwrap(),
        None => Sorter::new(settings()),
    };
    let mut truth = Vec::new();
    let centres = centres(5, &mut rng);
    for number in 0..100 {
        let category = number % 5;
        sorter.add_item(&item(&centres[category], &mut rng)).unwrap();
        truth.push(category);
    }
    let trays: Vec<usize> = (0..5).map(|c| sorter.answer_new(c, &format!("category {c}")).unwrap()).collect();
    let verdicts = sorter.verdicts();
    (5..100).filter(|&i| verdicts[i].unwrap().tray == Some(trays[truth[i]])).count() as f64 / 95.0
}

#[test]
fn a_starter_helps_new_categories_of_the_same_kind() {
    let starter = Arc::new(Starter::learn(&statistics(30, 8, 1)).unwrap());
    let mean = |starter: Option<&Arc<Starter>>| (100..120).map(|seed| share_right(starter, seed)).sum::<f64>() / 20.0;
    let (with, without) = (mean(Some(&starter)), mean(None));
    assert!(with > without + 0.1, "{with} with, {without} without");
}

#[test]
fn a_file_brings_back_the_same_starter() {
    let starter = Starter::learn(&statistics(12, 5, 2)).unwrap();
    let file = starter.write(8).unwrap();
    let back = Starter::read(&file).unwrap();
    assert_eq!(back, starter);
    assert_eq!(back.identity(), starter.identity());
    assert_eq!(back.write(8).unwrap(), file);
    assert_eq!((back.categories(), back.items(), back.encoder()), (12, 60, "test"));
}

#[test]
fn a_starter_of_1280_dimensions_is_small() {
    let mut rng = ChaCha8Rng::seed_from_u64(3);
    let space = Space::new(1280, true).unwrap();
    let mut statistics = Statistics::new("photos", space);
    let mut items =
        || -> Vec<Vec<f32>> { (0..9).map(|_| (0..1280).map(|_| rng.random_range(0.0_f32..1.0)).collect()).collect() };
    let pile: Vec<Vec<Vec<f32>>> = (0..40).map(|_| items()).collect();
    statistics.add_pile(pile.iter().map(|items| items.iter().map(Vec::as_slice))).unwrap();
    let starter = Starter::learn(&statistics).unwrap();
    assert_eq!(starter.whitening().rank(), 256);
    let size = starter.write(8).unwrap().len();
    assert!(size <= 400_000, "{size} bytes");
}

#[test]
fn too_little_is_refused_and_so_is_sharing_few_categories() {
    assert_eq!(Starter::learn(&statistics(1, 9, 1)).unwrap_err().code(), "too-little-to-learn");
    assert_eq!(Starter::learn(&statistics(9, 1, 1)).unwrap_err().code(), "too-little-to-learn");
    let small = Starter::learn(&statistics(3, 4, 1)).unwrap();
    assert_eq!(small.write(8).unwrap_err().code(), "too-few-to-share");
    assert!(small.write(3).is_ok());
}

#[test]
fn a_starter_meets_only_its_own_encoder() {
    let starter = Arc::new(Starter::learn(&statistics(9, 4, 1)).unwrap());
    let other = Settings { encoder: "another".into(), ..settings() };
    assert_eq!(Sorter::with_starter(other, starter.clone()).unwrap_err().code(), "other-encoder");
    let wider = Settings { space: Space::new(DIMENSION + 1, false).unwrap(), ..settings() };
    assert_eq!(Sorter::with_starter(wider, starter).unwrap_err().code(), "starter-unreadable");
}

#[test]
fn a_saved_sorter_asks_for_its_starter() {
    let starter = Arc::new(Starter::learn(&statistics(9, 4, 1)).unwrap());
    let another = Arc::new(Starter::learn(&statistics(9, 4, 2)).unwrap());
    let mut sorter = Sorter::with_starter(settings(), starter.clone()).unwrap();
    let embedding: Vec<f32> = (0..DIMENSION).map(|j| j as f32 - 7.0).collect();
    sorter.add_item(&embedding).unwrap();
    let state = sorter.state();
    assert!(Sorter::restore(&state, &embedding, Some(starter.clone())).is_ok());
    for wrong in [None, Some(another)] {
        assert_eq!(Sorter::restore(&state, &embedding, wrong).unwrap_err().code(), "state-unreadable");
    }
    let plain = Sorter::new(settings()).state();
    assert_eq!(Sorter::restore(&plain, &[], Some(starter)).unwrap_err().code(), "state-unreadable");
}

#[test]
fn damaged_files_are_refused_without_a_panic() {
    let file = Starter::learn(&statistics(9, 4, 1)).unwrap().write(8).unwrap();
    for cut in (0..file.len()).step_by(7) {
        assert!(Starter::read(&file[..cut]).is_err());
    }
    let mut rng = ChaCha8Rng::seed_from_u64(4);
    for _ in 0..400 {
        let mut bent = file.clone();
        for _ in 0..3 {
            let place = rng.random_range(0..bent.len());
            bent[place] ^= 1 << rng.random_range(0..8);
        }
        // A flipped bit in an unread field changes nothing; anything that is read must be checked.
        if let Ok(starter) = Starter::read(&bent) {
            assert!(starter.mean().iter().all(|x| x.is_finite()));
        }
    }
    let newer = {
        let mut statistics = statistics(9, 4, 1);
        statistics.merge(&self::statistics(9, 4, 2)).unwrap();
        Starter::learn(&statistics).unwrap()
    };
    assert_eq!(newer.categories(), 18);
}

/// Categories that differ along the very directions in which their items do: whitening alone takes away what tells them
/// apart, and past tasks must say so.
fn flat_pile(categories: usize, each: usize, rng: &mut ChaCha8Rng) -> Vec<Vec<Vec<f32>>> {
    (0..categories)
        .map(|_| {
            let centre: Vec<f32> = (0..DIMENSION).map(|_| rng.random_range(-1.0..1.0)).collect();
            let item = |rng: &mut ChaCha8Rng| {
                (0..DIMENSION)
                    .map(|j| {
                        if j < 8 { 3.0 * centre[j] + rng.random_range(-1.2..1.2) } else { rng.random_range(-0.5..0.5) }
                    })
                    .collect()
            };
            (0..each).map(|_| item(rng)).collect()
        })
        .collect()
}

#[test]
fn whitening_is_corrected_where_it_would_take_away_what_matters() {
    let mut rng = ChaCha8Rng::seed_from_u64(5);
    let mut statistics = Statistics::new("test", space());
    let pile = flat_pile(24, 10, &mut rng);
    statistics.add_pile(pile.iter().map(|items| items.iter().map(Vec::as_slice))).unwrap();
    let starter = Arc::new(Starter::learn(&statistics).unwrap());
    let plain = Whitening::learn(&statistics.whole(), 256);
    assert!(starter.whitening().parts().1[0] < plain.parts().1[0] - 0.1, "{:?}", starter.whitening().parts().1);

    let (mut without, mut with, mut items) = (0, 0, 0);
    for _ in 0..30 {
        let pile = flat_pile(5, 12, &mut rng);
        let right = |mut sorter: Sorter| {
            let truth: Vec<usize> = (0..60).map(|i| i % 5).collect();
            for (i, &category) in truth.iter().enumerate() {
                sorter.add_item(&pile[category][i / 5]).unwrap();
            }
            let trays: Vec<usize> = (0..5).map(|c| sorter.answer_new(c, &format!("category {c}")).unwrap()).collect();
            let verdicts = sorter.verdicts();
            (5..60).filter(|&i| verdicts[i].unwrap().tray == Some(trays[truth[i]])).count()
        };
        without += right(Sorter::new(settings()));
        with += right(Sorter::with_starter(settings(), starter.clone()).unwrap());
        items += 55;
    }
    assert!(with + items / 100 >= without, "of {items}: {with} with the starter, {without} without");
}

#[test]
fn one_small_pile_already_gives_lessons_and_fewer_say_that_there_are_none() {
    let starter = Starter::learn(&statistics(4, 6, 1)).unwrap();
    assert_eq!(starter.lessons().unwrap().categories, 4);
    let few = Starter::learn(&statistics(3, 6, 1)).unwrap();
    assert!(few.lessons().is_none());
    assert_eq!(few.prior(), kenspeckle::Prior::default());
}

#[test]
fn learning_tells_how_far_it_is_and_can_be_stopped() {
    let statistics = statistics(12, 5, 1);
    let mut told = Vec::new();
    Starter::learn_watched(&statistics, &mut |share| {
        told.push(share);
        true
    })
    .unwrap();
    assert!(told.is_sorted() && told.len() > 20 && told.iter().all(|share| (0.0..=1.0).contains(share)), "{told:?}");
    assert_eq!(Starter::learn_watched(&statistics, &mut |share| share < 0.7).unwrap_err().code(), "stopped");
}

#[test]
fn a_starter_changes_under_a_pile_and_back() {
    let starter = Arc::new(Starter::learn(&statistics(9, 4, 1)).unwrap());
    let mut rng = ChaCha8Rng::seed_from_u64(5);
    let centres = centres(2, &mut rng);
    let embeddings: Vec<Vec<f32>> = (0..8).map(|number| item(&centres[number % 2], &mut rng)).collect();
    let filled = |mut sorter: Sorter| {
        for embedding in &embeddings {
            sorter.add_item(embedding).unwrap();
        }
        for item in 0..2 {
            sorter.answer_new(item, &format!("category {item}")).unwrap();
        }
        sorter.remove_item(7).unwrap();
        sorter.set_terms(Terms::new(0.8, 0.2, true).unwrap());
        sorter
    };
    let mut with = filled(Sorter::with_starter(settings(), starter.clone()).unwrap());
    let mut without = filled(Sorter::new(settings()));
    let mut sorter = with.clone();
    let all = embeddings.concat();
    assert_eq!(sorter.change_starter(&all[1..], None).unwrap_err().code(), "embedding-count");
    sorter.change_starter(&all, None).unwrap();
    assert_eq!(sorter.verdicts(), without.verdicts());
    assert_eq!(sorter.state(), without.state());
    sorter.change_starter(&all, Some(starter)).unwrap();
    assert_eq!(sorter.verdicts(), with.verdicts());
    assert_eq!(sorter.state(), with.state());
}
