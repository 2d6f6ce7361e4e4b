//! Intervals, spot checks and calibration against scipy, statsmodels and scikit-learn: `pkg-scripts/reference/trust_values.py` wrote the values and names
//! the versions in them.

use kenspeckle::trust::{
    calibration::calibration,
    interval::{at_most, clopper_pearson, wilson},
    spot_check::{Plan, most_wrong},
};
use ndarray::ArrayView1;
use serde::Deserialize;

#[derive(Deserialize)]
struct Values {
    intervals: Vec<IntervalValues>,
    checks: Vec<Check>,
    plans: Vec<PlanValues>,
    calibration: CalibrationValues,
}

#[derive(Deserialize)]
struct CalibrationValues {
    labels: Vec<usize>,
    probabilities: Vec<Vec<f64>>,
    error: f64,
    brier: f64,
    log_loss: f64,
    bins: Vec<(usize, f64, f64)>,
}

#[derive(Deserialize, Debug)]
struct IntervalValues {
    count: usize,
    of: usize,
    confidence: f64,
    wilson: [f64; 2],
    exact: [f64; 2],
    at_most: f64,
}

#[derive(Deserialize, Debug)]
struct Check {
    items: usize,
    looked_at: usize,
    wrong: usize,
    confidence: f64,
    most_wrong: usize,
}

#[derive(Deserialize, Debug)]
struct PlanValues {
    items: usize,
    tolerance: f64,
    allowed: usize,
    confidence: f64,
    sample: usize,
}

fn values() -> Values {
    serde_json::from_str(include_str!("data/trust.json")).unwrap()
}

#[test]
fn intervals_are_those_of_scipy_and_statsmodels() {
    for one in values().intervals {
        let pairs = [
            (wilson(one.count, one.of, one.confidence), one.wilson),
            (clopper_pearson(one.count, one.of, one.confidence), one.exact),
        ];
        for (ours, [low, high]) in pairs {
            assert!((ours.low - low).abs() < 1e-9 && (ours.high - high).abs() < 1e-9, "{ours:?} {one:?}");
        }
        assert!((at_most(one.count, one.of, one.confidence) - one.at_most).abs() < 1e-9, "{one:?}");
    }
}

#[test]
fn bounds_are_those_of_scipys_hypergeometric_distribution() {
    for one in values().checks {
        assert_eq!(most_wrong(one.items, one.looked_at, one.wrong, one.confidence), one.most_wrong, "{one:?}");
    }
}

#[test]
fn samples_are_as_large_as_scipys_hypergeometric_distribution_needs() {
    for one in values().plans {
        let plan = Plan::new(one.tolerance, one.confidence, one.allowed, false).unwrap();
        assert_eq!(plan.sample_sizes(&[one.items]), [one.sample], "{one:?}");
    }
}

/// Common practice, no source; the values for one to four errors from memory of tables for attribute sampling.
#[test]
fn a_large_pile_needs_the_samples_that_auditors_know() {
    let sample = |tolerance, allowed| Plan::new(tolerance, 0.95, allowed, false).unwrap().sample_sizes(&[10_000_000]);
    assert_eq!([0, 1, 2, 3, 4].map(|allowed| sample(0.05, allowed)), [[59], [93], [124], [153], [181]]);
    assert_eq!(sample(0.01, 0), [299]);
    // The rule of three: 3/n.
    for n in [100, 300, 1000] {
        let bound = most_wrong(10_000_000, n, 0, 0.95) as f64 / 1e7;
        assert!((bound * n as f64 - 3.0).abs() < 0.05, "{bound}");
    }
}

#[test]
fn calibration_is_that_of_scikit_learn() {
    let values = values().calibration;
    let rows =
        values.labels.iter().copied().zip(values.probabilities.iter().map(|row| ArrayView1::from(row.as_slice())));
    let ours = calibration(rows).unwrap();
    assert!((ours.error - values.error).abs() < 1e-9, "{ours:?}");
    assert!((ours.brier - values.brier).abs() < 1e-9, "{ours:?}");
    assert!((ours.log_loss - values.log_loss).abs() < 1e-9, "{ours:?}");
    assert_eq!(ours.bins.len(), values.bins.len());
    for (ours, (items, said, right)) in ours.bins.iter().zip(values.bins) {
        assert_eq!(ours.items, items);
        assert!((ours.said - said).abs() < 1e-9 && (ours.right - right).abs() < 1e-9, "{ours:?}");
        assert!((ours.from..=ours.to).contains(&said) && ours.wilson.low <= right && right <= ours.wilson.high);
    }
    assert_eq!(calibration([]), None);
}
