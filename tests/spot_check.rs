//! Spot checks keep their promise on simulated piles, however many are wrong and wherever they lie.

use std::collections::BTreeSet;

use kenspeckle::trust::spot_check::{Judgement, Plan, Sorted, SpotCheck, hypergeometric_at_most};
use proptest::prelude::*;
use rand::{RngExt, SeedableRng, seq::SliceRandom};
use rand_chacha::ChaCha8Rng;

/// A sorting with trays of these sizes, items numbered from 100.
fn sorting(trays: &[usize]) -> Vec<Sorted> {
    let trays = trays.iter().enumerate().flat_map(|(tray, &size)| std::iter::repeat_n(tray, size));
    trays.enumerate().map(|(position, tray)| Sorted { item: 100 + position, tray }).collect()
}

/// Runs a whole check on a pile in which these items are wrong; whether the statement is true.
fn statement_is_true(plan: Plan, sorting: &[Sorted], wrong: &BTreeSet<usize>, seed: u64, rng: &mut ChaCha8Rng) -> bool {
    let mut check = SpotCheck::draw(plan, sorting.to_vec(), seed).unwrap();
    let drawn: Vec<Sorted> = check.sample().map(|(sorted, _)| sorted).collect();
    let mut corrected = 0;
    for sorted in drawn {
        let judgement = match wrong.contains(&sorted.item) {
            true if rng.random_bool(0.1) => Judgement::Untold,
            true => {
                corrected += 1;
                if rng.random_bool(0.5) { Judgement::Wrong } else { Judgement::Belongs(sorted.tray + 1) }
            }
            false => Judgement::Right,
        };
        check.judge(sorted.item, Some(judgement)).unwrap();
    }
    let statement = check.statement("2026-12-01").unwrap();
    // With no more wrong ones than the plan allows, and all corrected, what was to be shown is shown.
    assert!(
        statement.holds() || statement.untold > 0 || statement.wrong > plan.allowed(),
        "{statement} under {plan:?}"
    );
    wrong.len() - corrected <= statement.at_most
}

/// 2 000 piles an error rate; the share of true statements may fall short of 95 % by chance only: by 2.4 standard deviations.
fn simulate(by_tray: bool, clustered: bool) {
    let trays = [150, 90, 60, 7, 3, 2];
    let sorting = sorting(&trays);
    let mut rng = ChaCha8Rng::seed_from_u64(7);
    for percent in [0, 1, 2, 3, 5, 8, 10, 15, 20] {
        let count = sorting.len() * percent / 100;
        let plan = Plan::new(0.05, 0.95, percent % 3, by_tray).unwrap();
        let mut kept = 0;
        for seed in 0..2000 {
            let mut items: Vec<usize> = sorting.iter().map(|sorted| sorted.item).collect();
            if clustered {
                // The first trays, or the last, are the wrong ones.
                if seed % 2 == 0 {
                    items.reverse();
                }
            } else {
                items.shuffle(&mut rng);
            }
            let wrong = items.into_iter().take(count).collect();
            kept += usize::from(statement_is_true(plan, &sorting, &wrong, seed, &mut rng));
        }
        let least = 2000.0 * 0.95 - 2.4 * (2000.0_f64 * 0.95 * 0.05).sqrt();
        assert!(f64::from(kept as u32) >= least, "{percent} % wrong: {kept} of 2000");
    }
}

#[test]
fn statements_are_true_as_often_as_they_say() {
    simulate(false, false);
}

#[test]
fn statements_by_tray_are_true_as_often_as_they_say() {
    simulate(true, false);
}

#[test]
fn statements_by_tray_are_true_when_whole_trays_are_wrong() {
    simulate(true, true);
}

/// A statement by tray rests on a bound for sums of hypergeometric variables: against the exact sum over all ways.
#[test]
fn the_bound_by_tray_never_rules_out_what_is_likelier() {
    let trays = [12, 7, 4];
    let plan = Plan::new(0.2, 0.9, 0, true).unwrap();
    let sizes = plan.sample_sizes(&trays);
    let exactly = |count: usize, tray: usize, total: usize| {
        let below = if count == 0 { 0.0 } else { hypergeometric_at_most(count - 1, trays[tray], total, sizes[tray]) };
        hypergeometric_at_most(count, trays[tray], total, sizes[tray]) - below
    };
    for wrong in 0..4 {
        let mut check = SpotCheck::draw(plan, sorting(&trays), 5).unwrap();
        let drawn: Vec<usize> = check.sample().map(|(sorted, _)| sorted.item).collect();
        for (position, item) in drawn.into_iter().enumerate() {
            let judgement = if position < wrong { Judgement::Wrong } else { Judgement::Right };
            check.judge(item, Some(judgement)).unwrap();
        }
        let most = check.statement("").unwrap().at_most + wrong;
        // Whatever is ruled out shows so few with a probability of at most 10 %, wherever the wrong ones lie.
        for a in 0..=12 {
            for b in 0..=7 {
                for c in 0..=4 {
                    if a + b + c <= most {
                        continue;
                    }
                    let mut probability = 0.0;
                    for x in 0..=wrong {
                        for y in 0..=wrong - x {
                            for z in 0..=wrong - x - y {
                                probability += exactly(x, 0, a) * exactly(y, 1, b) * exactly(z, 2, c);
                            }
                        }
                    }
                    assert!(
                        probability <= 0.1 + 1e-9,
                        "{wrong} wrong: {a} + {b} + {c} has {probability}, bound {most}"
                    );
                }
            }
        }
    }
}

#[test]
fn the_sentence_says_what_was_done() {
    let mut check = SpotCheck::draw(Plan::new(0.05, 0.95, 0, false).unwrap(), sorting(&[300, 112]), 4711).unwrap();
    assert_eq!(check.statement("2026-12-01").unwrap_err().code(), "spot-check-unfinished");
    let drawn: Vec<Sorted> = check.sample().map(|(sorted, _)| sorted).collect();
    assert_eq!(drawn.len(), 54);
    for sorted in &drawn {
        check.judge(sorted.item, Some(Judgement::Belongs(sorted.tray))).unwrap();
    }
    assert_eq!(
        check.statement("2026-12-01").unwrap().to_string(),
        "At most 4.9 % of the 412 sorted items are in the wrong tray (95 % confidence, 54 looked at, 0 wrong, seed 4711, \
         2026-12-01)"
    );
    // One is corrected and one is taken out: they are wrong no longer, but more of the others may be.
    check.judge(drawn[0].item, Some(Judgement::Belongs(1 - drawn[0].tray))).unwrap();
    check.judge(drawn[1].item, Some(Judgement::Wrong)).unwrap();
    let statement = check.statement("2026-12-01").unwrap();
    assert!(!statement.holds());
    assert!(statement.to_string().contains("54 looked at, 2 wrong and corrected, seed 4711"), "{statement}");
    let corrected = check.corrected();
    assert_eq!(corrected.iter().filter(|(_, tray)| tray.is_none()).count(), 1);
    assert!(corrected.contains(&(drawn[0].item, Some(1 - drawn[0].tray))));
    let saved = serde_json::to_string(&check).unwrap();
    assert_eq!(SpotCheck::restore(&saved).unwrap(), check);
    assert_eq!(SpotCheck::restore(&saved.replace("4711", "4712")).unwrap_err().code(), "state-unreadable");
}

#[test]
fn what_makes_no_sense_is_refused() {
    for (tolerance, confidence) in [(1.0, 0.9), (-0.1, 0.9), (f64::NAN, 0.9), (0.1, 1.0), (0.1, 0.0), (0.1, f64::NAN)] {
        assert_eq!(Plan::new(tolerance, confidence, 0, false).unwrap_err().code(), "spot-check-plan");
    }
    let plan = Plan::new(0.1, 0.9, 0, false).unwrap();
    assert_eq!(SpotCheck::draw(plan, Vec::new(), 1).unwrap_err().code(), "nothing-to-check");
    let mut check = SpotCheck::draw(plan, sorting(&[5]), 1).unwrap();
    assert_eq!(check.judge(7, None).unwrap_err().code(), "not-in-sample");
}

proptest! {
    #[test]
    fn any_plan_on_any_pile_gives_a_sample_of_it(
        trays in prop::collection::vec(0_usize..60, 1..6),
        tolerance in 0.0_f64..0.99,
        confidence in 0.01_f64..0.999,
        allowed in 0_usize..5,
        by_tray: bool,
        seed: u64,
    ) {
        let sorting = sorting(&trays);
        prop_assume!(!sorting.is_empty());
        let plan = Plan::new(tolerance, confidence, allowed, by_tray).unwrap();
        let mut check = SpotCheck::draw(plan, sorting.clone(), seed).unwrap();
        let drawn: Vec<Sorted> = check.sample().map(|(sorted, _)| sorted).collect();
        let items: BTreeSet<usize> = drawn.iter().map(|sorted| sorted.item).collect();
        prop_assert_eq!(items.len(), drawn.len(), "an item came twice");
        for sorted in &drawn {
            prop_assert_eq!(sorting[sorted.item - 100], *sorted);
            check.judge(sorted.item, Some(Judgement::Right)).unwrap();
        }
        let statement = check.statement("2026-12-01").unwrap();
        prop_assert!(statement.holds(), "{} with a tolerance of {}", statement, tolerance);
        prop_assert_eq!(SpotCheck::draw(plan, sorting, seed).unwrap().sample().map(|(s, _)| s).collect::<Vec<_>>(), drawn);
    }
}
