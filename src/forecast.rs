//! When to stop: how much is sorted right by now, and what more answers would bring.
//!
//! The expected share is the mean of the sorter's own probabilities, moved and given a spread on the scale of log odds by
//! what replays of whole jobs on stamps, digits, package summaries and quotations have shown: early on the sorter claims
//! too much, since it does not know the trays it has not met, and later too little. With the move fitted on three of
//! these sets the interval held in 94 to 100 % of cases on the fourth, and is wide for it. Errors are taken to fall as a
//! power of the number of answers. Nothing replaces the spot check, which looks at items drawn at random; this says when
//! it is worth doing one.

/// An interval that holds the truth in about 95 of 100 piles, with what is most likely in it; shares, 0 to 1.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Range {
    /// The lower end.
    pub low: f64,
    /// The most likely.
    pub expected: f64,
    /// The upper end.
    pub high: f64,
}

/// How a pile stands and where it is going.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Outlook {
    /// Of the items without an answer, the share sorted right now.
    pub now: Range,
    /// The same after [`MORE`] more answers to the sorter's own questions.
    pub after_more: Range,
    /// The mean of the probabilities that this was made from.
    pub claimed: f64,
}

/// How many more answers [`Outlook::after_more`] looks ahead.
pub const MORE: usize = 10;

const Z: f64 = 1.959_963_984_540_054;

impl Outlook {
    /// From the probabilities of the items without an answer, the number of answers, that of the trays with one, and that of
    /// the trays with just one; `None` for no item or fewer than two trays. Cost O(n).
    ///
    /// The share of answers that are the only one in their tray estimates how much of the pile belongs in trays that nobody
    /// has met yet (Good 1953), and too highly, since questions go to what is unlike the rest: it counts for the lower end
    /// alone.
    pub fn new(sure: &[f64], answers: usize, trays: usize, single: usize) -> Option<Self> {
        if sure.is_empty() || trays < 2 || answers == 0 {
            return None;
        }
        let n = sure.len() as f64;
        let claimed = sure.iter().sum::<f64>() / n;
        let shot = answers as f64 / trays as f64;
        let centre = log_odds(claimed) + MOVED - MOVED_EARLY / shot;
        let share = from_log_odds(centre);
        // Even with probabilities that hold, as many items as these scatter.
        let scatter = 1.0 / (n * (share * (1.0 - share)).max(1e-3));
        let spread = Z * (SPREAD * SPREAD * (1.0 + 1.0 / shot) + scatter).sqrt();
        let met = 1.0 - single as f64 / answers as f64;
        let (low, high) = (met * from_log_odds(centre - spread), from_log_odds(centre + spread));
        let growth = libm::log((answers + MORE) as f64 / answers as f64);
        let fall = |share: f64, power: f64| 1.0 - (1.0 - share) * libm::exp(-power * growth);
        let now = Range::whole(low, share, high, n);
        let least = fall(low, POWER - Z * POWER_SPREAD);
        let most = fall(high, POWER + Z * POWER_SPREAD);
        let after_more = Range::whole(least, fall(share, POWER), most, (n - MORE as f64).max(1.0));
        Some(Self { now, after_more, claimed })
    }
}

/// What replays have shown, fitted with every set counting the same.
const MOVED: f64 = 1.4;
const MOVED_EARLY: f64 = 2.3;
const SPREAD: f64 = 0.8;
const POWER: f64 = 0.35;
const POWER_SPREAD: f64 = 0.2;

impl Range {
    /// With ends that n items can have, rounded outward.
    fn whole(low: f64, expected: f64, high: f64, n: f64) -> Self {
        Self { low: ((low * n).floor() / n).max(0.0), expected, high: ((high * n).ceil() / n).min(1.0) }
    }
}

fn log_odds(share: f64) -> f64 {
    let share = share.clamp(1e-4, 1.0 - 1e-4);
    libm::log(share / (1.0 - share))
}

fn from_log_odds(odds: f64) -> f64 {
    1.0 / (1.0 + libm::exp(-odds))
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    proptest! {
        #[test]
        fn ranges_are_in_order(
            sure in prop::collection::vec(0.0_f64..=1.0, 1..60),
            answers in 2_usize..400,
            trays in 2_usize..30,
            single in 0_usize..30,
        ) {
            let outlook = Outlook::new(&sure, answers, trays, single.min(answers)).unwrap();
            for Range { low, expected, high } in [outlook.now, outlook.after_more] {
                prop_assert!(0.0 <= low && low <= expected && expected <= high && high <= 1.0);
            }
            prop_assert!(outlook.after_more.expected >= outlook.now.expected);
        }
    }

    #[test]
    fn more_answers_make_it_surer() {
        let width = |answers| {
            let Range { low, high, .. } = Outlook::new(&[0.7; 400], answers, 8, 0).unwrap().now;
            high - low
        };
        assert!(width(64) < width(32) && width(32) < width(16));
    }

    #[test]
    fn trays_with_one_answer_tell_of_others() {
        let low = |single| Outlook::new(&[0.9; 50], 3, 2, single).unwrap().now.low;
        assert!(low(1) < 0.7 * low(0) && low(0) > 0.0);
    }

    #[test]
    fn there_is_nothing_to_expect_of_nothing() {
        assert_eq!(Outlook::new(&[], 10, 3, 0), None);
        assert_eq!(Outlook::new(&[0.5], 10, 1, 0), None);
        assert_eq!(Outlook::new(&[0.5], 0, 2, 0), None);
    }
}
