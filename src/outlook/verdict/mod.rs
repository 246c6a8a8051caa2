//! Findings held against the limits of a programme: met, breached, or cannot tell.

mod decimal;
mod indicator;
mod policy;

use std::cmp::Ordering;

pub use decimal::compare_product;
pub use indicator::{Indicator, Member, SpeciesShare, indicator};
pub use policy::{
    By, DEFAULT_POLICY, DEFAULT_RATIO, INDICATOR_SIZE, Known, Limit, Measure, Policy, Rule, Side,
    parse_policy, read_policy,
};

/// The answer to one rule.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Answer {
    /// The limit is kept.
    Met,
    /// The data do not say.
    CannotTell,
    /// The limit is not kept.
    Breached,
}

/// What is known of a measure.
#[derive(Debug, Clone, PartialEq)]
pub enum Fact {
    /// A number that is counted or given, without uncertainty of its own.
    Exact(f64),
    /// A census size times a ratio, given: compared without rounding.
    Product {
        /// Census size.
        census: f64,
        /// Effective size over census size.
        ratio: f64,
    },
    /// Yes or no.
    Flag(bool),
    /// An estimate.
    Estimate {
        /// The value; `None` when it is unbounded above.
        value: Option<f64>,
        /// Lower and upper limit, `None` where unbounded; the whole is absent when nobody knows it.
        interval: Option<[Option<f64>; 2]>,
    },
    /// Nothing, for this reason.
    Absent(String),
}

impl Fact {
    /// The value, as a plain number.
    pub fn value(&self) -> Option<f64> {
        match self {
            Fact::Exact(value) => Some(*value),
            Fact::Product { census, ratio } => Some(census * ratio),
            Fact::Estimate { value, .. } => *value,
            Fact::Flag(_) | Fact::Absent(_) => None,
        }
    }

    /// How the value compares with a number; `None` without a value. Unbounded is greater.
    pub fn compare(&self, limit: f64) -> Option<Ordering> {
        match self {
            Fact::Exact(value) => Some(value.total_cmp(&limit)),
            Fact::Product { census, ratio } => Some(compare_product(*census, *ratio, limit)),
            Fact::Estimate { value, .. } => {
                Some(value.map_or(Ordering::Greater, |value| value.total_cmp(&limit)))
            }
            Fact::Flag(_) | Fact::Absent(_) => None,
        }
    }
}

/// Holds a fact against a limit; the reason is a clause for a person.
///
/// By interval, the limit is met when every value of the interval meets it, and breached when none
/// does.
pub fn judge(limit: Limit, by: By, fact: &Fact) -> (Answer, String) {
    match (fact, limit) {
        (Fact::Absent(why), _) => (Answer::CannotTell, why.clone()),
        (Fact::Flag(flag), Limit::Is(wanted)) => {
            let answer = if *flag == wanted {
                Answer::Met
            } else {
                Answer::Breached
            };
            (
                answer,
                format!("the report says {}", if *flag { "yes" } else { "no" }),
            )
        }
        (Fact::Flag(_), Limit::Number(..)) => (
            Answer::CannotTell,
            "the field is true or false, the limit a number".to_string(),
        ),
        (_, Limit::Is(_)) => (
            Answer::CannotTell,
            "the field is a number, the limit true or false".to_string(),
        ),
        (Fact::Estimate { interval, .. }, Limit::Number(side, limit)) if by == By::Interval => {
            let Some([low, high]) = interval else {
                return (
                    Answer::CannotTell,
                    "the value has no interval, so nobody knows how far to trust it".to_string(),
                );
            };
            by_interval(side, limit, *low, *high)
        }
        (_, Limit::Number(side, number)) => match fact.compare(number) {
            Some(order) if side.holds(order) => (Answer::Met, "the value meets the limit".into()),
            Some(_) => (Answer::Breached, "the value does not meet the limit".into()),
            None => (Answer::CannotTell, "there is no value".into()),
        },
    }
}

fn by_interval(side: Side, limit: f64, low: Option<f64>, high: Option<f64>) -> (Answer, String) {
    let at_low = low.map_or(Ordering::Less, |low| low.total_cmp(&limit));
    let at_high = high.map_or(Ordering::Greater, |high| high.total_cmp(&limit));
    match [side.holds(at_low), side.holds(at_high)] {
        [true, true] => (Answer::Met, "the whole interval meets the limit".into()),
        [false, false] => (
            Answer::Breached,
            "no part of the interval meets the limit".into(),
        ),
        _ => (Answer::CannotTell, "the interval crosses the limit".into()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn estimate(value: Option<f64>, low: f64, high: Option<f64>) -> Fact {
        Fact::Estimate {
            value,
            interval: Some([Some(low), high]),
        }
    }

    // By hand: the limit itself is not above the limit (the CBD indicator asks for Ne > 500).
    #[test]
    fn answers_by_interval_and_by_value() {
        let above = Limit::Number(Side::Above, 500.0);
        let at_least = Limit::Number(Side::AtLeast, 500.0);
        let at_most = Limit::Number(Side::AtMost, 0.01);
        let cases = [
            (
                above,
                estimate(Some(700.0), 501.0, Some(900.0)),
                Answer::Met,
            ),
            (
                above,
                estimate(Some(700.0), 500.0, Some(900.0)),
                Answer::CannotTell,
            ),
            (
                at_least,
                estimate(Some(700.0), 500.0, Some(900.0)),
                Answer::Met,
            ),
            (
                above,
                estimate(Some(400.0), 300.0, Some(500.0)),
                Answer::Breached,
            ),
            (
                at_least,
                estimate(Some(400.0), 300.0, Some(500.0)),
                Answer::CannotTell,
            ),
            (above, estimate(None, 600.0, None), Answer::Met),
            (above, estimate(None, 200.0, None), Answer::CannotTell),
            (
                at_most,
                estimate(Some(0.002), 0.001, Some(0.01)),
                Answer::Met,
            ),
            (
                at_most,
                estimate(Some(0.02), 0.015, Some(0.03)),
                Answer::Breached,
            ),
            (above, Fact::Exact(500.0), Answer::Breached),
            (above, Fact::Exact(500.1), Answer::Met),
            (
                above,
                Fact::Product {
                    census: 5000.0,
                    ratio: 0.1,
                },
                Answer::Breached,
            ),
            (
                above,
                Fact::Product {
                    census: 5001.0,
                    ratio: 0.1,
                },
                Answer::Met,
            ),
            (above, Fact::Absent("no sample".into()), Answer::CannotTell),
            (Limit::Is(false), Fact::Flag(true), Answer::Breached),
            (Limit::Is(false), Fact::Flag(false), Answer::Met),
        ];
        for (limit, fact, wanted) in cases {
            assert_eq!(
                judge(limit, By::Interval, &fact).0,
                wanted,
                "{limit:?} {fact:?}"
            );
        }
        let wide = estimate(Some(700.0), 300.0, Some(900.0));
        assert_eq!(judge(above, By::Value, &wide).0, Answer::Met);
        let bare = Fact::Estimate {
            value: Some(700.0),
            interval: None,
        };
        assert_eq!(judge(above, By::Interval, &bare).0, Answer::CannotTell);
        assert_eq!(
            judge(above, By::Value, &estimate(None, 9.0, None)).0,
            Answer::Met
        );
    }
}
