//! Trust on made-up piles whose truth is known: likeness against refits, and promises against how often they hold.

use kenspeckle::{
    LearnerKind, Settings, Sorter, Space, Support,
    ledger::Answer,
    trust::{
        Reason, Terms,
        evidence::Evidence,
        interval::clopper_pearson,
        novelty::{Novelty, Scene},
        prediction_set::PredictionSets,
        spot_check::{Judgement, Plan},
    },
};
use ndarray::{Array1, Array2};
use rand::{Rng, RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

const DIMENSION: usize = 24;

/// Twelve uniform numbers make a normal one, near enough.
fn normal(rng: &mut impl Rng) -> f64 {
    (0..12).map(|_| rng.random_range(0.0..1.0)).sum::<f64>() - 6.0
}

/// An item of this category: its own direction, with scatter.
fn item(category: usize, scatter: f64, rng: &mut impl Rng) -> Vec<f32> {
    (0..DIMENSION).map(|j| (f64::from(u8::from(j == category)) + scatter * normal(rng)) as f32).collect()
}

fn settings(seed: u64) -> Settings {
    let space = Space::new(DIMENSION, false).unwrap();
    Settings { encoder: "test".into(), space, learner: LearnerKind::Auto, seed }
}

/// `known` categories with `shot` answers and `size` open items each, and `size` items of `unknown` further categories each;
/// the items come with their category.
fn pile(
    known: usize,
    unknown: usize,
    shot: usize,
    size: usize,
    scatter: f64,
    rng: &mut ChaCha8Rng,
) -> (Sorter, Vec<usize>) {
    let mut sorter = Sorter::new(settings(1));
    let mut categories = Vec::new();
    for category in 0..known {
        let tray = sorter.add_tray(&category.to_string()).unwrap();
        for _ in 0..shot {
            let number = sorter.add_item(&item(category, scatter, rng)).unwrap();
            sorter.answer(number, tray).unwrap();
            categories.push(category);
        }
    }
    for category in 0..known + unknown {
        for _ in 0..size {
            sorter.add_item(&item(category, scatter, rng)).unwrap();
            categories.push(category);
        }
    }
    (sorter, categories)
}

#[test]
fn likeness_of_an_example_is_that_of_a_refit_without_it() {
    let mut rng = ChaCha8Rng::seed_from_u64(3);
    let labels = [0, 0, 0, 1, 1, 2, 2, 2, 2, 3];
    let examples: Vec<usize> = (0..labels.len()).map(|k| 2 * k).collect();
    let mut rows = Array2::<f32>::zeros((30, DIMENSION));
    for number in 0..30 {
        let category = if number % 2 == 0 && number < 20 { labels[number / 2] } else { number % 5 };
        let place = Array1::from(item(category, 0.3, &mut rng));
        let length = place.dot(&place).sqrt();
        rows.row_mut(number).assign(&(place / length));
    }
    let support = Support::new(rows.select(ndarray::Axis(0), &examples), labels.to_vec(), 4).unwrap();
    let cosine = |a: usize, b: usize| -> f64 {
        rows.row(a).iter().zip(rows.row(b)).map(|(&x, &y)| f64::from(x) * f64::from(y)).sum()
    };
    let neighbours =
        |item: usize| -> Vec<(usize, f64)> { (1..4).map(|k| ((item + 2 * k + 1) % 30, k as f64)).collect() };
    let with_means = |support: &Support| {
        let means = support.means();
        Array2::from_shape_fn((30, support.categories()), |(item, c)| {
            rows.row(item).iter().zip(means.row(c)).map(|(&x, m)| f64::from(x) * m).sum()
        })
    };
    let scene = |support: &Support, examples: &[usize]| {
        Novelty::new(&Scene {
            support,
            examples,
            items: 30,
            with_means: with_means(support),
            cosine: &cosine,
            neighbours: &neighbours,
        })
    };
    let whole = scene(&support, &examples);

    // By hand: the example is an item like any other, with the cosine to means that it has no part in.
    let nearest = |item: usize, means: &Array2<f64>| -> f64 {
        let cosine = |mean: ndarray::ArrayView1<f64>| {
            let product: f64 = rows.row(item).iter().zip(mean).map(|(&x, m)| f64::from(x) * m).sum();
            product / mean.dot(&mean).sqrt()
        };
        means.outer_iter().map(cosine).fold(f64::NEG_INFINITY, f64::max)
    };
    let left_out: Vec<Option<f64>> =
        (0..labels.len()).map(|k| Some(nearest(examples[k], &support.without(k)?.means()))).collect();
    let judged: Vec<f64> = left_out.iter().flatten().copied().collect();
    let typical = judged.iter().sum::<f64>() / judged.len() as f64;
    let mut by_hand: Vec<f64> = (0..labels.len())
        .filter_map(|k| {
            let means = support.without(k)?.means();
            let own = |item: usize| match examples.iter().position(|&example| example == item) {
                Some(example) => left_out[example].unwrap_or(typical),
                None => nearest(item, &means),
            };
            let (sum, weights) = neighbours(examples[k])
                .into_iter()
                .fold((0.0, 0.0), |(sum, weights), (other, weight)| (sum + weight * own(other), weights + weight));
            Some(0.5 * left_out[k]? + 0.5 * sum / weights)
        })
        .collect();
    by_hand.sort_by(f64::total_cmp);
    assert_eq!(whole.known().len(), 9);
    for (ours, reference) in whole.known().iter().zip(&by_hand) {
        assert!((ours - reference).abs() < 1e-5, "{:?} is not {by_hand:?}", whole.known());
    }
}

#[test]
fn about_the_share_asked_for_is_set_aside_of_the_known_and_most_of_the_unknown() {
    let mut rng = ChaCha8Rng::seed_from_u64(11);
    for (share, low, high) in [(0.0, 0.0, 0.0), (0.05, 0.02, 0.09), (0.2, 0.12, 0.24)] {
        let (mut known, mut unknown, mut aside, mut aside_unknown) = (0, 0, 0, 0);
        for _ in 0..12 {
            let (mut sorter, categories) = pile(5, 4, 6, 12, 0.22, &mut rng);
            sorter.set_terms(Terms::new(0.9, share, false).unwrap());
            for (verdict, &category) in sorter.verdicts().iter().zip(&categories).skip(30) {
                let set_aside = usize::from(verdict.as_ref().unwrap().set_aside.is_some());
                if category < 5 {
                    (known, aside) = (known + 1, aside + set_aside);
                } else {
                    (unknown, aside_unknown) = (unknown + 1, aside_unknown + set_aside);
                }
            }
        }
        let (known, unknown) = (aside as f64 / f64::from(known), aside_unknown as f64 / f64::from(unknown));
        assert!((low..=high).contains(&known), "{share} asked for, {known} of the known set aside");
        assert!(share == 0.0 || unknown > 0.5, "{share} asked for, only {unknown} of the unknown set aside");
    }
}

#[test]
fn plausible_sets_hold_the_right_tray_about_as_often_as_they_say() {
    let mut rng = ChaCha8Rng::seed_from_u64(5);
    // With one example each nothing but the probabilities' own word backs a set, and these piles are not what that is tuned for.
    for (shot, confidence) in [(2, 0.9), (5, 0.9), (5, 0.7), (12, 0.8)] {
        let (mut covered, mut count) = (0, 0);
        for _ in 0..25 {
            let (mut sorter, categories) = pile(5, 0, shot, 12, 0.4, &mut rng);
            sorter.set_terms(Terms::new(confidence, 0.0, false).unwrap());
            for (number, category) in categories.iter().enumerate().skip(5 * shot) {
                covered += usize::from(sorter.plausible(number).unwrap().contains(category));
                count += 1;
            }
        }
        // 1 500 items in 25 piles; the piles differ, so twice the binomial's 99 % interval.
        let interval = clopper_pearson(covered, count, 0.99);
        let slack = interval.high - interval.low;
        let share = covered as f64 / count as f64;
        assert!(share > confidence - slack - 0.02 && share < confidence + 0.08, "{shot} shots, {confidence}: {share}");
    }
}

#[test]
fn with_enough_examples_each_tray_has_its_own_threshold() {
    // Category 0 is always surer than category 1.
    let labels: Vec<usize> = (0..60).map(|k| k % 2).collect();
    let mut evidence = Evidence::new(&labels, 2);
    for (example, &label) in labels.iter().enumerate() {
        let own = if label == 0 { 0.9 } else { 0.5 } + example as f64 / 1000.0;
        let row = if label == 0 { [own, 1.0 - own] } else { [1.0 - own, own] };
        evidence.set(example, Array1::from(row.to_vec()).view());
    }
    let sets = PredictionSets::new(&evidence, [], 0.9);
    // 30 examples each: the value between the third and the fourth from below, at 0.1 · 31 = 3.1.
    assert!((sets.least(0) - (0.9 + 0.0042)).abs() < 1e-9, "{}", sets.least(0));
    assert!((sets.least(1) - (0.5 + 0.0052)).abs() < 1e-9, "{}", sets.least(1));
    assert_eq!(sets.plausible(Array1::from(vec![0.6, 0.4]).view()), Vec::<usize>::new());
    assert_eq!(sets.plausible(Array1::from(vec![0.45, 0.55]).view()), [1]);
}

#[test]
fn only_sure_items_are_sorted_when_asked_for() {
    let mut rng = ChaCha8Rng::seed_from_u64(2);
    let (mut sorter, _) = pile(4, 0, 5, 15, 0.8, &mut rng);
    sorter.set_terms(Terms::new(0.9, 0.05, true).unwrap());
    let verdicts: Vec<_> = sorter.verdicts().iter().flatten().copied().collect();
    let mut seen = [0; 2];
    for (number, verdict) in verdicts.iter().enumerate().skip(20) {
        let plausible = sorter.plausible(number).unwrap();
        if verdict.set_aside.is_none() {
            assert_eq!(plausible, [verdict.tray.unwrap()]);
            seen[0] += 1;
        } else if verdict.set_aside == Some(Reason::Between) {
            assert!(plausible.len() > 1);
            seen[1] += 1;
        }
    }
    assert!(seen.iter().all(|&count| count > 0), "{seen:?}");
}

#[test]
fn wrong_answers_are_doubted_first() {
    let mut rng = ChaCha8Rng::seed_from_u64(9);
    let (mut sorter, categories) = pile(5, 0, 8, 10, 0.25, &mut rng);
    let wrong = [3, 12, 25, 38];
    for item in wrong {
        sorter.answer(item, (categories[item] + 1) % 5).unwrap();
    }
    let doubts = sorter.doubts();
    let mut first: Vec<usize> = doubts.iter().take(4).map(|doubt| doubt.item).collect();
    first.sort_unstable();
    assert_eq!(first, wrong);
    for doubt in &doubts[..4] {
        assert_eq!(doubt.rather, categories[doubt.item]);
    }
    let assessment = sorter.assessment().unwrap();
    assert_eq!(assessment.answers, 40);
    let confused: Vec<usize> = assessment.confusions.iter().flat_map(|pair| pair.items.clone()).collect();
    assert!(wrong.iter().all(|item| confused.contains(item)));
    assert_eq!(assessment.share.judged - assessment.share.right, confused.len());
}

#[test]
fn duplicates_in_different_trays_and_changed_answers_are_doubted() {
    let mut rng = ChaCha8Rng::seed_from_u64(4);
    let (mut sorter, _) = pile(3, 0, 4, 6, 0.2, &mut rng);
    let twin = item(0, 0.2, &mut rng);
    let (a, b) = (sorter.add_item(&twin).unwrap(), sorter.add_item(&twin).unwrap());
    sorter.answer(a, 0).unwrap();
    sorter.answer(b, 2).unwrap();
    let doubt = sorter.doubts()[0];
    assert_eq!((doubt.item, doubt.tray, doubt.rather), (b, 2, 0));
    let json = serde_json::to_value(doubt).unwrap();
    assert_eq!((&json["why"], &json["other"]), (&"duplicate".into(), &a.into()));
    sorter.answer(b, 0).unwrap();
    let changed: Vec<_> = sorter.doubts().into_iter().filter(|doubt| doubt.item == b).collect();
    assert_eq!(serde_json::to_value(&changed).unwrap()[0]["why"], "changed");
}

#[test]
fn too_little_is_said_to_be_too_little() {
    let mut rng = ChaCha8Rng::seed_from_u64(6);
    let (mut sorter, _) = pile(3, 2, 1, 8, 0.2, &mut rng);
    assert!(sorter.verdicts().iter().flatten().all(|verdict| verdict.set_aside.is_none()));
    let assessment = sorter.assessment().unwrap();
    assert_eq!((assessment.share.judged, assessment.unknown.as_slice()), (0, &[0, 1, 2][..]));
    assert!(assessment.calibration.is_none() && assessment.curve.is_none());
    assert!(sorter.doubts().is_empty());
    // A category with a single answer among others with many: what is unlike the others and lies nearest to it can't be told.
    let (mut sorter, _) = pile(4, 0, 8, 4, 0.2, &mut rng);
    let single = sorter.add_tray("single").unwrap();
    let number = sorter.add_item(&item(10, 0.2, &mut rng)).unwrap();
    sorter.answer(number, single).unwrap();
    let mut strange = item(10, 0.2, &mut rng);
    strange[14] += 2.5;
    let strange = sorter.add_item(&strange).unwrap();
    assert_eq!(sorter.verdict(strange).unwrap().set_aside, Some(Reason::TooLittle));
}

#[test]
fn terms_that_cannot_be_kept_are_refused_and_the_others_are_kept_in_the_state() {
    for (confidence, share) in [(0.4, 0.05), (1.0, 0.05), (f64::NAN, 0.05), (0.9, -0.1), (0.9, 0.6), (0.9, f64::NAN)] {
        assert_eq!(Terms::new(confidence, share, false).unwrap_err().code(), "terms");
    }
    let mut sorter = Sorter::new(settings(1));
    let terms = Terms::new(0.8, 0.1, true).unwrap();
    sorter.set_terms(terms);
    assert_eq!(*Sorter::restore(&sorter.state(), &[], None).unwrap().terms(), terms);
}

#[test]
fn the_learning_curve_grows_and_asks_for_more_where_more_is_wanted() {
    let mut rng = ChaCha8Rng::seed_from_u64(8);
    let (mut sorter, _) = pile(6, 0, 9, 4, 0.4, &mut rng);
    let curve = sorter.assessment().unwrap().curve.unwrap();
    assert!(curve.points.first().unwrap().accuracy < curve.points.last().unwrap().accuracy);
    let targets = [0.5, 0.8, 0.9, 0.99].map(|target| curve.more_answers(target));
    for pair in targets.windows(2) {
        assert!(pair[0].low <= pair[1].low);
    }
    for one in targets {
        let (likely, high) = (one.likely.unwrap_or(f64::INFINITY), one.high.unwrap_or(f64::INFINITY));
        assert!(one.low <= likely && likely <= high, "{one:?}");
    }
    assert_eq!(targets[0].likely, Some(0.0));

    // What is foreseen starts at the level, never falls, and agrees with the number of answers that a target is told to take.
    let ahead = &curve.ahead;
    assert_eq!((ahead.len(), ahead[0].more), (13, 0.0));
    assert!((ahead[0].likely - curve.level[1]).abs() < 1e-12);
    for pair in ahead.windows(2) {
        assert!(pair[0].more < pair[1].more);
        assert!(pair[0].low <= pair[1].low && pair[0].likely <= pair[1].likely && pair[0].high <= pair[1].high);
    }
    for one in ahead {
        assert!(0.0 < one.low && one.low <= one.likely && one.likely <= one.high && one.high < 1.0);
        let told = curve.more_answers(one.likely).likely.unwrap();
        assert!((told - one.more).abs() <= 1.0, "{told} answers for {one:?}");
    }
}

#[test]
fn a_doubt_that_was_settled_is_not_raised_again() {
    let mut rng = ChaCha8Rng::seed_from_u64(9);
    let (mut sorter, categories) = pile(5, 0, 8, 10, 0.25, &mut rng);
    for item in [3, 12] {
        sorter.answer(item, (categories[item] + 1) % 5).unwrap();
    }
    let raised = |sorter: &mut Sorter, item| sorter.doubts().iter().any(|doubt| doubt.item == item);
    assert!(raised(&mut sorter, 3) && raised(&mut sorter, 12));
    // One is left as it is, the other is changed: that it was answered differently before is known by now.
    sorter.settle_doubt(3, (categories[3] + 1) % 5).unwrap();
    sorter.settle_doubt(12, categories[12]).unwrap();
    assert!(!raised(&mut sorter, 3) && !raised(&mut sorter, 12));
    assert_eq!(sorter.verdict(12).unwrap().tray, Some(categories[12]));
    let embeddings: Vec<f32> = (0..sorter.items()).flat_map(|k| item(categories[k], 0.25, &mut rng)).collect();
    let kept = Sorter::restore(&sorter.state(), &embeddings, None).unwrap();
    assert!(kept.ledger().is_kept(3) && kept.ledger().is_kept(12));
    assert_eq!(sorter.undo().unwrap().name(), "answer");
    assert_eq!(sorter.undo().unwrap().name(), "keep");
    assert!(raised(&mut sorter, 3) && raised(&mut sorter, 12));
    sorter.redo();
    // Answered anew, it can be doubted anew.
    sorter.answer(3, (categories[3] + 2) % 5).unwrap();
    assert!(raised(&mut sorter, 3));
}

#[test]
fn a_spot_check_holds_the_sorting_still_until_the_next_answer() {
    let mut rng = ChaCha8Rng::seed_from_u64(21);
    let (mut sorter, _) = pile(4, 1, 3, 30, 0.5, &mut rng);
    let before: Vec<_> = sorter.verdicts().to_vec();
    let plan = Plan::new(0.05, 0.95, 0, false).unwrap();
    let mut check = sorter.spot_check(plan, 5).unwrap();
    assert!(!sorter.is_about_now(&check), "nothing was said yet");
    let sample: Vec<_> = check.sample().map(|(sorted, _)| sorted).collect();
    for (place, sorted) in sample.iter().enumerate() {
        let judgement = match place % 7 {
            0 => Judgement::Belongs((sorted.tray + 1) % 4),
            1 => Judgement::Wrong,
            2 => Judgement::Untold,
            _ => Judgement::Right,
        };
        check.judge(sorted.item, Some(judgement)).unwrap();
    }
    sorter.answer_checked(&check).unwrap();
    assert!(sorter.is_about_now(&check));
    let corrected = check.corrected();
    for (item, tray) in &corrected {
        assert_eq!(sorter.verdict(*item).unwrap().tray, *tray);
    }
    // The items that nobody looked at are where they were, with the same figures.
    let looked_at = |item: usize| sample.iter().any(|sorted| sorted.item == item);
    let now = sorter.verdicts().to_vec();
    assert!((0..now.len()).filter(|&item| !looked_at(item)).all(|item| now[item] == before[item]));
    // So they are after a reload.
    assert!(sorter.state().contains("spot-check"));

    // With the next answer they teach, and the statement is about the earlier sorting.
    let open = (0..now.len()).find(|&item| !looked_at(item) && now[item].unwrap().answer == Answer::Open).unwrap();
    sorter.skip(open).unwrap();
    assert!(!sorter.is_about_now(&check));
    assert_ne!(sorter.verdicts(), &now[..]);
    assert!(sorter.assessment().unwrap().answers > 12);
    assert_eq!(sorter.undo().unwrap().name(), "skip");
    assert!(sorter.is_about_now(&check));
    assert_eq!(sorter.verdicts(), &now[..]);
    assert_eq!(sorter.undo().unwrap().name(), "spot-check");
    assert_eq!(sorter.verdicts(), &before[..]);
    assert!(!sorter.is_about_now(&check));
    sorter.redo();
    assert!(sorter.is_about_now(&check));
    // An item that arrives is sorted too, and no part of the statement.
    sorter.add_item(&item(0, 0.2, &mut rng)).unwrap();
    assert!(!sorter.is_about_now(&check));
}

#[test]
fn what_a_spot_check_says_of_items_and_trays_that_are_gone_is_left_out() {
    let mut rng = ChaCha8Rng::seed_from_u64(22);
    let (mut sorter, _) = pile(4, 0, 3, 20, 0.3, &mut rng);
    let mut check = sorter.spot_check(Plan::new(0.1, 0.9, 0, true).unwrap(), 5).unwrap();
    let sample: Vec<_> = check.sample().map(|(sorted, _)| sorted).collect();
    sample.iter().for_each(|sorted| check.judge(sorted.item, Some(Judgement::Right)).unwrap());
    let gone = sample.iter().find(|sorted| sorted.tray == 0).unwrap().item;
    sorter.remove_item(gone).unwrap();
    sorter.remove_tray(3).unwrap();
    sorter.answer_checked(&check).unwrap();
    for sorted in &sample {
        let answer = sorter.ledger().answer(sorted.item);
        let left_out = sorted.item == gone || sorted.tray == 3;
        assert_eq!(answer, if left_out { Answer::Open } else { Answer::Tray(sorted.tray) });
    }
    assert!(!sorter.is_about_now(&check));
}
