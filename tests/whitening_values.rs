//! The whitened space against scikit-learn's shrunk linear discriminant analysis (`LinearDiscriminantAnalysis(solver="lsqr",
//! shrinkage=0.5)`): `pkg-scripts/reference/whitening_values.py` wrote the values and names the version in them.

use kenspeckle::{Space, meta::statistics::Statistics, whitening::Whitening};
use serde::Deserialize;

#[derive(Deserialize)]
struct Values {
    tables: Vec<Table>,
}

#[derive(Deserialize)]
struct Table {
    name: String,
    labels: Vec<usize>,
    examples: Vec<Vec<f32>>,
    queries: Vec<Vec<f32>>,
    scores: Vec<Vec<f64>>,
}

/// With all directions but the last, whitening is (S + t I)^(−1/2) times a factor: distances to category means are then the
/// discriminants, times another.
#[test]
fn distances_in_the_whitened_space_are_the_discriminants_of_shrunk_lda() {
    let values: Values = serde_json::from_str(include_str!("data/whitening.json")).unwrap();
    for table in values.tables {
        let categories = table.labels.iter().max().unwrap() + 1;
        let space = Space::new(table.examples[0].len(), false).unwrap();
        let of = |category: usize| {
            table.examples.iter().zip(&table.labels).filter(move |(_, label)| **label == category).map(|(row, _)| row)
        };
        let mut statistics = Statistics::new("table", space);
        statistics.add_pile((0..categories).map(|c| of(c).map(Vec::as_slice))).unwrap();
        let whitening = Whitening::learn(&statistics.whole(), space.dimension());
        let whitened = |row: &[f32]| {
            let mut place = space.place(row).unwrap();
            whitening.apply(&mut place);
            place
        };
        let means: Vec<Vec<f64>> = (0..categories)
            .map(|category| {
                let rows: Vec<Vec<f32>> = of(category).map(|row| whitened(row)).collect();
                (0..space.dimension())
                    .map(|j| rows.iter().map(|row| f64::from(row[j])).sum::<f64>() / rows.len() as f64)
                    .collect()
            })
            .collect();
        let ours: Vec<Vec<f64>> = table
            .queries
            .iter()
            .map(|query| {
                let query = whitened(query);
                let distance = |mean: &Vec<f64>| -> f64 {
                    mean.iter().zip(&query).map(|(m, &x)| (m - f64::from(x)).powi(2)).sum()
                };
                let scores: Vec<f64> = means.iter().map(|mean| -distance(mean)).collect();
                let middle = scores.iter().sum::<f64>() / categories as f64;
                scores.iter().map(|score| score - middle).collect()
            })
            .collect();
        // One factor for the whole table, by least squares; what is left must be rounding.
        let pairs = || ours.iter().flatten().zip(table.scores.iter().flatten());
        let factor = pairs().map(|(a, b)| a * b).sum::<f64>() / pairs().map(|(a, _)| a * a).sum::<f64>();
        let size = pairs().map(|(_, b)| b.abs()).fold(0.0, f64::max);
        for (a, b) in pairs() {
            assert!((a * factor - b).abs() < 1e-4 * size, "{}: {} is not {b}", table.name, a * factor);
        }
        for (a, b) in ours.iter().zip(&table.scores) {
            let best = |row: &[f64]| kenspeckle::arithmetic::arg_max(row);
            assert_eq!(best(a), best(b), "{}", table.name);
        }
    }
}
