//! Learners against scikit-learn and numpy: `pkg-scripts/reference/learner_values.py` wrote the values and names the
//! versions in them.

use std::sync::Arc;

use kenspeckle::{
    Prior, Support,
    learner::{Descent, Gradient, Groups, Learner, Prototype, Ridge, Step},
    prior::{ByShot, usual_prototype_factor},
};
use ndarray::Array2;
use serde::Deserialize;

#[derive(Deserialize)]
struct Values {
    steps: usize,
    step_size: f64,
    bias_step_size: f64,
    temperature: f64,
    tasks: Vec<Task>,
}

#[derive(Deserialize)]
struct Task {
    name: String,
    labels: Vec<usize>,
    examples: Vec<Vec<f32>>,
    queries: Vec<Vec<f32>>,
    nearest_centroid: Option<Vec<usize>>,
    prototype: Vec<Vec<f64>>,
    discriminant: Vec<DiscriminantValues>,
    ridge: Vec<RidgeValues>,
    gradient: Vec<Vec<f64>>,
    gradient_loss: f64,
    descent: DescentValues,
}

#[derive(Deserialize)]
struct DescentValues {
    directions: Vec<Vec<f32>>,
    ends: Vec<usize>,
    start: Vec<f64>,
    /// By group, the rest, and the bias.
    steps: Vec<Vec<f64>>,
    logits: Vec<Vec<f64>>,
    loss: f64,
}

#[derive(Deserialize)]
struct DiscriminantValues {
    penalty: f64,
    logits: Vec<Vec<f64>>,
}

#[derive(Deserialize)]
struct RidgeValues {
    penalty: f64,
    logits: Vec<Vec<f64>>,
    left_out: Vec<Option<Vec<f64>>>,
}

fn values() -> Values {
    serde_json::from_str(include_str!("data/learners.json")).unwrap()
}

fn rows(rows: &[Vec<f32>]) -> Array2<f32> {
    Array2::from_shape_fn((rows.len(), rows[0].len()), |(i, j)| rows[i][j])
}

impl Task {
    fn support(&self) -> Support {
        let categories = self.labels.iter().max().unwrap() + 1;
        Support::new(rows(&self.examples), self.labels.clone(), categories).unwrap()
    }
}

fn assert_close(name: &str, ours: &Array2<f64>, theirs: &[Vec<f64>], tolerance: f64) {
    assert_eq!(ours.nrows(), theirs.len());
    for (row, reference) in ours.outer_iter().zip(theirs) {
        for (a, b) in row.iter().zip(reference) {
            assert!((a - b).abs() < tolerance, "{name}: {row} is not {reference:?}");
        }
    }
}

#[test]
fn prototypes_choose_as_scikit_learns_nearest_centroid() {
    let mut compared = 0;
    for task in values().tasks {
        let head = Prototype { shrinkage: 0.0, regularisation: f64::INFINITY }.learn(&task.support()).head;
        let logits = head.logits(rows(&task.queries).view());
        assert_close(&task.name, &logits, &task.prototype, 2e-5);
        let Some(nearest) = task.nearest_centroid else { continue };
        let chosen: Vec<usize> =
            logits.outer_iter().map(|row| kenspeckle::arithmetic::arg_max(row.iter()).unwrap()).collect();
        assert_eq!(chosen, nearest, "{}", task.name);
        compared += 1;
    }
    assert_eq!(compared, 2);
}

/// Up to what is the same for all categories: scikit-learn's scores have the log of shares in them.
#[test]
fn prototypes_with_a_metric_are_scikit_learns_regularised_discriminants() {
    let mut compared = 0;
    for task in values().tasks {
        for reference in &task.discriminant {
            let prototype = Prototype { shrinkage: 0.0, regularisation: 1.0 };
            let head = prototype.learn_at(&task.support(), reference.penalty).head;
            let level = |logits: &Array2<f64>| {
                logits - &logits.mean_axis(ndarray::Axis(1)).unwrap().insert_axis(ndarray::Axis(1))
            };
            let expected = Array2::from_shape_fn((reference.logits.len(), reference.logits[0].len()), |(i, c)| {
                reference.logits[i][c]
            });
            let expected: Vec<Vec<f64>> = level(&expected).outer_iter().map(|row| row.to_vec()).collect();
            assert_close(&task.name, &level(&head.logits(rows(&task.queries).view())), &expected, 5e-5);
            compared += 1;
        }
    }
    assert_eq!(compared, 6);
}

#[test]
fn ridge_fits_as_scikit_learns_ridge() {
    for task in values().tasks {
        let support = task.support();
        for reference in &task.ridge {
            let learned = Ridge::learn_at(&support, reference.penalty * support.shot());
            assert_close(&task.name, &learned.head.logits(rows(&task.queries).view()), &reference.logits, 2e-5);
            for (example, expected) in reference.left_out.iter().enumerate() {
                let ours = learned.left_out.get(example);
                assert_eq!(ours.is_some(), expected.is_some());
                if let (Some(ours), Some(expected)) = (ours, expected) {
                    let ours = ours.to_owned().insert_axis(ndarray::Axis(0));
                    assert_close(&task.name, &ours, std::slice::from_ref(expected), 5e-5);
                }
            }
        }
    }
}

/// Logits of the queries, and the loss that the steps go down: scikit-learn's log_loss with the same weights.
fn check_gradient(task: &Task, temperature: f64, descent: Descent, logits: &[Vec<f64>], expected_loss: f64) {
    let support = task.support();
    let prior = Prior {
        descent,
        prototype_temperature: ByShot::even(temperature / usual_prototype_factor(support.shot())),
        ..Prior::default()
    };
    let head = Gradient { prior: &prior }.learn(&support).head;
    assert_close(&task.name, &head.logits(rows(&task.queries).view()), logits, 1e-4);
    let probabilities = head.probabilities(support.embeddings());
    let loss: f64 = (0..support.len())
        .map(|i| {
            let label = support.labels()[i];
            -probabilities[[i, label]].ln() / (support.counts()[label] * support.categories()) as f64
        })
        .sum();
    assert!((loss - expected_loss).abs() < 1e-5, "{}: {loss} {expected_loss}", task.name);
}

#[test]
fn gradient_steps_as_numpy_takes_them() {
    let values = values();
    for task in &values.tasks {
        let even = Descent::even(values.steps, values.step_size, values.bias_step_size);
        check_gradient(task, values.temperature, even, &task.gradient, task.gradient_loss);
    }
}

#[test]
fn steps_by_group_of_directions_as_numpy_takes_them() {
    let values = values();
    for task in &values.tasks {
        let DescentValues { directions, ends, start, steps, logits, loss } = &task.descent;
        let groups = Arc::new(Groups::new(rows(directions), ends.clone()));
        let step = |sizes: &Vec<f64>| {
            let (bias, weights) = sizes.split_last().unwrap();
            Step { weights: weights.to_vec(), bias: *bias }
        };
        let descent = Descent::new(groups, start.clone(), steps.iter().map(step).collect());
        check_gradient(task, values.temperature, descent, logits, *loss);
    }
}
