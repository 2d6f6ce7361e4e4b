//! Properties every learner must have, checked against brute force.

use kenspeckle::{
    LearnerKind, Prior, Support,
    learner::{Gradient, Learner, Prototype, Ridge},
    prior::{ByShot, usual_prototype_factor},
};
use ndarray::{Array2, Axis};
use proptest::prelude::*;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

/// A support set of unit vectors with 1 to 6 examples in each of 2 to 5 categories, 2 to 12 dimensions.
fn supports() -> impl Strategy<Value = Support> {
    (prop::collection::vec(1_usize..=6, 2..=5), 2_usize..=12).prop_flat_map(|(counts, dimension)| {
        let labels: Vec<usize> = counts.iter().enumerate().flat_map(|(c, &n)| vec![c; n]).collect();
        let categories = counts.len();
        (prop::collection::vec(-1.0_f32..1.0, labels.len() * dimension), Just(labels).prop_shuffle()).prop_map(
            move |(numbers, labels)| {
                let mut rows = Array2::from_shape_vec((labels.len(), dimension), numbers).unwrap();
                for mut row in rows.axis_iter_mut(Axis(0)) {
                    row[0] += 1e-3;
                    let length = row.dot(&row).sqrt();
                    row /= length;
                }
                Support::new(rows, labels, categories).unwrap()
            },
        )
    })
}

/// Leave-one-out logits must be those of a head learned without the example.
fn check_leave_one_out(support: &Support, learn: impl Fn(&Support) -> kenspeckle::learner::Learned) {
    let learned = learn(support);
    for example in 0..support.len() {
        let query = support.embeddings().select(Axis(0), &[example]);
        match (support.without(example), learned.left_out.get(example)) {
            (Some(others), Some(claimed)) => {
                let refitted = learn(&others).head.logits(query.view());
                let scale = refitted.iter().fold(1.0_f64, |top, x| top.max(x.abs()));
                for (a, b) in claimed.iter().zip(refitted.row(0)) {
                    assert!((a - b).abs() < 2e-4 * scale, "example {example}: {claimed} is not {refitted}");
                }
            }
            (None, None) => {}
            (refit, claimed) => panic!("example {example}: {} but {claimed:?}", refit.is_some()),
        }
    }
}

/// A prior whose factor on squared distances is the same whatever the shot: a refit without one example keeps it.
fn tempered(support: &Support, factor: f64) -> Prior {
    Prior { prototype_temperature: ByShot::even(factor / usual_prototype_factor(support.shot())), ..Prior::default() }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 96, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn prototype_leave_one_out_is_the_refit(support in supports(), shrinkage in 0.0_f64..3.0, regularisation in 0.05_f64..3.0) {
        // ν belongs to the whole support set; a refit without one example keeps it.
        let prototype = Prototype { shrinkage, regularisation };
        for penalty in [f64::INFINITY, prototype.penalty(&support)] {
            check_leave_one_out(&support, |s| prototype.learn_at(s, penalty));
        }
    }

    #[test]
    fn ridge_leave_one_out_is_the_refit(support in supports(), strength in 0.03_f64..3.0) {
        // The penalty belongs to the whole support set; a refit without one example keeps it.
        let penalty = strength / support.shot();
        check_leave_one_out(&support, |s| Ridge::learn_at(s, penalty * s.shot()));
    }

    #[test]
    fn gradient_leave_one_out_is_the_refit(support in supports()) {
        check_leave_one_out(&support, |s| Gradient { prior: &tempered(s, 7.0) }.learn(s));
    }

    #[test]
    fn probabilities_add_up_and_are_finite(support in supports(), kind in prop::sample::select(LearnerKind::ALL.to_vec())) {
        let learned = kind.learn(&support, &Prior::default());
        for row in learned.head.probabilities(support.embeddings()).axis_iter(Axis(0)) {
            prop_assert!((row.sum() - 1.0).abs() < 1e-9);
            prop_assert!(row.iter().all(|p| p.is_finite() && *p >= 0.0));
        }
    }

    #[test]
    fn the_order_of_categories_does_not_matter(support in supports(), kind in prop::sample::select(LearnerKind::ALL.to_vec())) {
        let last = support.categories() - 1;
        let turned = Support::new(
            support.embeddings().to_owned(),
            support.labels().iter().map(|&label| last - label).collect(),
            support.categories(),
        ).unwrap();
        let prior = Prior::default();
        let straight = kind.learn(&support, &prior).head.probabilities(support.embeddings());
        let mirrored = kind.learn(&turned, &prior).head.probabilities(support.embeddings());
        for (a, b) in straight.axis_iter(Axis(0)).zip(mirrored.axis_iter(Axis(0))) {
            for c in 0..=last {
                prop_assert!((a[c] - b[last - c]).abs() < 1e-3, "{} {}", a, b);
            }
        }
    }

    #[test]
    fn the_same_examples_give_the_same_bits(support in supports(), kind in prop::sample::select(LearnerKind::ALL.to_vec())) {
        let again = Support::new(support.embeddings().to_owned(), support.labels().to_vec(), support.categories()).unwrap();
        let prior = Prior::default();
        prop_assert_eq!(kind.learn(&support, &prior).head, kind.learn(&again, &prior).head);
    }
}

/// Constant, duplicated, collinear and opposite examples, more categories than dimensions: finite answers from everyone.
#[test]
fn degenerate_examples_give_finite_answers() {
    let cases: Vec<(Vec<[f32; 2]>, Vec<usize>, usize)> = vec![
        (vec![[1.0, 0.0]; 6], vec![0, 0, 0, 1, 1, 1], 2),
        (vec![[1.0, 0.0], [1.0, 0.0], [0.0, 1.0], [0.0, 1.0]], vec![0, 0, 1, 1], 2),
        (vec![[1.0, 0.0], [-1.0, 0.0], [1.0, 0.0], [-1.0, 0.0]], vec![0, 0, 1, 1], 2),
        (vec![[0.0, 0.0]; 4], vec![0, 1, 0, 1], 2),
        ((0..10).map(|i| [(i as f32 * 0.6).cos(), (i as f32 * 0.6).sin()]).collect(), (0..10).collect(), 10),
        (vec![[0.6, 0.8]; 5], vec![0, 1, 2, 3, 3], 4),
    ];
    for (rows, labels, categories) in cases {
        let rows = Array2::from_shape_fn((rows.len(), 2), |(i, j)| rows[i][j]);
        let support = Support::new(rows.clone(), labels, categories).unwrap();
        for kind in LearnerKind::ALL {
            let probabilities = kind.learn(&support, &Prior::default()).head.probabilities(rows.view());
            assert!(probabilities.iter().all(|p| p.is_finite()), "{kind:?} {rows}");
        }
    }
}

fn many(n: usize, dimension: usize) -> Support {
    let rows = Array2::from_shape_fn((n, dimension), |(i, j)| {
        (((i * 31 + j * 17) % 101) as f32 / 50.0 - 1.0) + (i % 3 == j) as u8 as f32
    });
    Support::new(rows, (0..n).map(|i| i % 3).collect(), 3).unwrap()
}

/// In n × n or in d × d, with leave-one-out or without: the same minimum.
#[test]
fn ridge_in_every_form_is_the_same_fit() {
    for (n, dimension) in [(30, 6), (30, 29), (30, 30), (30, 45)] {
        let support = many(n, dimension);
        for strength in [0.03, 0.3, 3.0] {
            let judged = Ridge::learn_at(&support, strength).head.logits(support.embeddings());
            let alone = Ridge::fit(&support, strength).logits(support.embeddings());
            assert!((&judged - &alone).iter().all(|x| x.abs() < 1e-4), "{n} × {dimension} at {strength}");
        }
    }
}

/// In n × n or in d × d, with leave-one-out or without: the same prototypes, in the same metric.
#[test]
fn prototypes_in_every_form_are_the_same_fit() {
    for (n, dimension) in [(30, 6), (30, 29), (30, 30), (30, 45)] {
        let support = many(n, dimension);
        for regularisation in [0.03, 1.0, f64::INFINITY] {
            let prototype = Prototype { shrinkage: 0.5, regularisation };
            let judged = prototype.learn(&support).head.logits(support.embeddings());
            let alone = prototype.fit(&support).logits(support.embeddings());
            assert!((&judged - &alone).iter().all(|x| x.abs() < 1e-3), "{n} × {dimension} at {regularisation}");
        }
    }
}

/// Where a part of the examples decides for all, the result must be as good as where all decide.
#[test]
fn many_examples_are_learned_from_as_few_are() {
    let prior = Prior::default();
    let (limit, queries) = (kenspeckle::learner::JUDGED_LIMIT, many(90, 12));
    for kind in LearnerKind::ALL {
        let right = |n: usize| {
            let probabilities = kind.learn(&many(n, 12), &prior).head.probabilities(queries.embeddings());
            let best = |row: ndarray::ArrayView1<f64>| kenspeckle::arithmetic::arg_max(row.iter()).unwrap();
            (0..90).filter(|&i| best(probabilities.row(i)) == queries.labels()[i]).count()
        };
        let (below, above) = (right(limit - limit % 3), right(3 * limit));
        assert!(above + 3 >= below, "{kind:?}: {above} right with many examples, {below} with fewer");
    }
    let learned = LearnerKind::Auto.learn(&many(3 * limit, 12), &prior);
    let known = (0..3 * limit).filter(|&i| learned.left_out.get(i).is_some()).count();
    assert!((limit - 3..=limit).contains(&known), "{known} examples judged");
}

/// From 2 categories to 200 and from 1 example to 1 000: everyone learns, and sorts what lies apart without a mistake.
#[test]
fn few_and_many_categories_and_examples() {
    for (categories, each) in [(2, 1), (2, 1000), (200, 1), (200, 2), (20, 60)] {
        let dimension = 24;
        let mut rng = ChaCha8Rng::seed_from_u64(1);
        let centres = Array2::from_shape_simple_fn((categories, dimension), || rng.random_range(-1.0_f32..1.0));
        let row = |i: usize, j: usize| centres[[i % categories, j]] + (((i * 37 + j * 11) % 19) as f32 - 9.0) / 90.0;
        let labels: Vec<usize> = (0..categories * each).map(|i| i % categories).collect();
        let rows = Array2::from_shape_fn((labels.len(), dimension), |(i, j)| row(i, j));
        let queries = Array2::from_shape_fn((categories, dimension), |(c, j)| row(c + 5 * categories * each, j));
        let support = Support::new(rows, labels, categories).unwrap();
        for kind in LearnerKind::ALL {
            let probabilities = kind.learn(&support, &Prior::default()).head.probabilities(queries.view());
            let right = (0..categories)
                .filter(|&c| kenspeckle::arithmetic::arg_max(probabilities.row(c).iter()) == Some(c))
                .count();
            assert!(probabilities.iter().all(|p| p.is_finite()));
            assert!(100 * right >= 97 * categories, "{kind:?}, {categories} × {each}: {right} right");
        }
    }
}
