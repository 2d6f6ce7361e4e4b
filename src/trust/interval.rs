//! Intervals for a share that was counted: so many of so many.
//!
//! Wilson 1927 (10.1080/01621459.1927.10502953) holds its confidence on average and is short: it is the one to look at.
//! Clopper and Pearson 1934 (10.1093/biomet/26.4.404) holds it at every true share, by inverting the binomial test: it is
//! the one to promise by. Both take `of` independent trials.
//!
//! The incomplete beta function is the continued fraction of DLMF 8.17.22, quantiles are found by halving: at most 60 ·
//! 200 steps. Checked against scipy and statsmodels in `tests/trust_values.rs`.

use serde::Serialize;

/// A closed interval of shares, each 0 to 1.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Interval {
    /// The lower end.
    pub low: f64,
    /// The upper end.
    pub high: f64,
}

/// Wilson's two-sided interval for `count` of `of` at a confidence of 0 to 1; everything from 0 to 1 for none of none.
///
/// ```
/// use kenspeckle::trust::interval::wilson;
///
/// let interval = wilson(8, 10, 0.95);
/// // statsmodels 0.15.0, proportion_confint(8, 10, method="wilson")
/// assert!((interval.low - 0.490162).abs() < 1e-6 && (interval.high - 0.943318).abs() < 1e-6);
/// ```
pub fn wilson(count: usize, of: usize, confidence: f64) -> Interval {
    if of == 0 {
        return Interval { low: 0.0, high: 1.0 };
    }
    let (n, share) = (of as f64, count as f64 / of as f64);
    let z = normal_quantile(0.5 + confidence / 2.0);
    let square = z * z / n;
    let middle = share + square / 2.0;
    let half = z * (share * (1.0 - share) / n + square / (4.0 * n)).sqrt();
    let low = if count == 0 { 0.0 } else { ((middle - half) / (1.0 + square)).max(0.0) };
    let high = if count == of { 1.0 } else { ((middle + half) / (1.0 + square)).min(1.0) };
    Interval { low, high }
}

/// Clopper and Pearson's two-sided interval for `count` of `of` at a confidence of 0 to 1; everything from 0 to 1 for none
/// of none.
pub fn clopper_pearson(count: usize, of: usize, confidence: f64) -> Interval {
    let side = 0.5 + confidence / 2.0;
    Interval { low: at_least(count, of, side), high: at_most(count, of, side) }
}

/// The share that is not exceeded at this one-sided confidence, after Clopper and Pearson: the largest p with
/// P(X ≤ count | p) ≥ 1 − confidence.
pub fn at_most(count: usize, of: usize, confidence: f64) -> f64 {
    if count >= of { 1.0 } else { solve(|share| 1.0 - binomial_at_most(count, of, share), confidence) }
}

/// The share that is reached at this one-sided confidence, after Clopper and Pearson.
pub fn at_least(count: usize, of: usize, confidence: f64) -> f64 {
    if count == 0 { 0.0 } else { solve(|share| 1.0 - binomial_at_most(count - 1, of, share), 1.0 - confidence) }
}

/// P(X ≤ count) for X the successes in `of` independent trials of this share.
pub fn binomial_at_most(count: usize, of: usize, share: f64) -> f64 {
    if count >= of { 1.0 } else { incomplete_beta((of - count) as f64, count as f64 + 1.0, 1.0 - share) }
}

/// The p of 0 to 1 at which an increasing function reaches `level`.
fn solve(increasing: impl Fn(f64) -> f64, level: f64) -> f64 {
    let (mut low, mut high) = (0.0, 1.0);
    for _ in 0..60 {
        let middle = (low + high) / 2.0;
        if increasing(middle) < level {
            low = middle;
        } else {
            high = middle;
        }
    }
    (low + high) / 2.0
}

/// The quantile of the standard normal distribution, 0 < level < 1.
pub(crate) fn normal_quantile(level: f64) -> f64 {
    let (mut low, mut high) = (-40.0, 40.0);
    for _ in 0..80 {
        let middle = (low + high) / 2.0;
        if 0.5 * libm::erfc(-middle / std::f64::consts::SQRT_2) < level {
            low = middle;
        } else {
            high = middle;
        }
    }
    (low + high) / 2.0
}

/// The regularised incomplete beta function I_x(a, b) for a, b > 0.
fn incomplete_beta(a: f64, b: f64, x: f64) -> f64 {
    if x <= 0.0 || x >= 1.0 {
        return if x <= 0.0 { 0.0 } else { 1.0 };
    }
    // The fraction converges fast below the mean; above it, the other tail is taken.
    if x > (a + 1.0) / (a + b + 2.0) {
        return 1.0 - incomplete_beta(b, a, 1.0 - x);
    }
    let log_front =
        a * libm::log(x) + b * libm::log1p(-x) + libm::lgamma(a + b) - libm::lgamma(a) - libm::lgamma(b) - libm::log(a);
    const TINY: f64 = 1e-300;
    let away_from_zero = |value: f64| if value.abs() < TINY { TINY } else { value };
    // Lentz's recurrence.
    let mut c = 1.0;
    let mut d = 1.0 / away_from_zero(1.0 - (a + b) * x / (a + 1.0));
    let mut fraction = d;
    // About √max(a, b) terms are needed; millions of items need some thousand.
    for m in 1..20_000 {
        let m = f64::from(m);
        for numerator in [
            m * (b - m) * x / ((a + 2.0 * m - 1.0) * (a + 2.0 * m)),
            -(a + m) * (a + b + m) * x / ((a + 2.0 * m) * (a + 2.0 * m + 1.0)),
        ] {
            d = 1.0 / away_from_zero(1.0 + numerator * d);
            c = away_from_zero(1.0 + numerator / c);
            fraction *= c * d;
        }
        if (c * d - 1.0).abs() < 1e-15 {
            break;
        }
    }
    libm::exp(log_front) * fraction
}
