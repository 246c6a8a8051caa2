//! Rates of genotyping error and allelic dropout from individuals genotyped twice.

use std::collections::BTreeMap;

use statrs::distribution::{Beta, ContinuousCDF};

/// Classes of allele frequency by which outcomes are counted.
const CLASSES: u32 = 200;
/// Largest rate considered; a laboratory beyond it has other worries.
const LARGEST: f64 = 0.5;
/// Half the 95 % quantile of chi-square with one degree of freedom: how far the log-likelihood falls
/// at the ends of the interval.
const DROP: f64 = 1.920_729_410_347_062;

/// Exact binomial interval (Clopper & Pearson 1934) for `hits` of `trials`. `None` without trials.
pub fn exact_binomial(hits: u64, trials: u64, level: f64) -> Option<[f64; 2]> {
    if trials == 0 || hits > trials {
        return None;
    }
    let (k, n, tail) = (hits as f64, trials as f64, (1.0 - level) / 2.0);
    let low = match hits {
        0 => 0.0,
        _ => Beta::new(k, n - k + 1.0).ok()?.inverse_cdf(tail),
    };
    let high = match hits == trials {
        true => 1.0,
        false => Beta::new(k + 1.0, n - k).ok()?.inverse_cdf(1.0 - tail),
    };
    Some([low, high])
}

/// Genotypes of one individual typed twice, counted by what they are and by the allele frequency of
/// their locus.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct OutcomeTable {
    /// By class of allele frequency: dosages of both genotypings (the lower first) as 0, 01, 02, 1,
    /// 12, 2.
    classes: BTreeMap<u32, [u64; 6]>,
}

/// A rate with its interval from the likelihood.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RateEstimate {
    /// The likeliest value.
    pub value: f64,
    /// 95 % interval: where the profile of the log-likelihood is within 1.92 of its peak.
    pub interval: [f64; 2],
}

/// Rates per gene copy.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct GenotypingRates {
    /// Chance that a gene copy is called as the other allele.
    pub error: RateEstimate,
    /// Chance that a gene copy of a heterozygote is not copied, so that the other is called twice.
    pub dropout: RateEstimate,
}

impl OutcomeTable {
    /// Counts a locus of two alleles typed twice in one individual; `frequency` is that of allele 1.
    pub fn add(&mut self, frequency: f64, first: u8, second: u8) {
        let (a, b) = (first.min(second), first.max(second));
        let cell = match (a, b) {
            (0, 0) => 0,
            (0, 1) => 1,
            (0, 2) => 2,
            (1, 1) => 3,
            (1, 2) => 4,
            (2, 2) => 5,
            _ => return,
        };
        let class = (frequency * f64::from(CLASSES)).round() as u32;
        self.classes.entry(class).or_default()[cell] += 1;
    }

    /// Genotype pairs counted.
    pub fn shared(&self) -> u64 {
        self.classes.values().flatten().sum()
    }

    /// Heterozygote against homozygote, and both heterozygous.
    pub fn one_and_both_heterozygous(&self) -> (u64, u64) {
        self.classes
            .values()
            .fold((0, 0), |(one, both), c| (one + c[1] + c[4], both + c[3]))
    }

    /// Opposite homozygotes.
    pub fn opposite(&self) -> u64 {
        self.classes.values().map(|c| c[2]).sum()
    }

    /// Both rates by maximum likelihood. The true genotype has Hardy-Weinberg proportions at the
    /// frequency of its locus (the called one, freed of the error); each copy of a heterozygote drops out with chance d (a genotyping that
    /// loses both is repeated), then each called allele is taken for the other with chance e; two
    /// genotypings are independent given the truth. Errors show at every locus, dropout at
    /// heterozygotes alone: loci of different frequency tell them apart. `None` without outcomes.
    pub fn rates(&self) -> Option<GenotypingRates> {
        if self.shared() == 0 {
            return None;
        }
        let profile_error = |e: f64| highest(|d| self.log_likelihood(e, d)).1;
        let profile_dropout = |d: f64| highest(|e| self.log_likelihood(e, d)).1;
        Some(GenotypingRates {
            error: estimate(profile_error),
            dropout: estimate(profile_dropout),
        })
    }

    fn log_likelihood(&self, error: f64, dropout: f64) -> f64 {
        let called = called_given_truth(error, dropout);
        let mut sum = 0.0;
        for (&class, counts) in &self.classes {
            // Called frequencies are p (1 - e) + (1 - p) e; those of 0 and 1 are of a sample alone.
            let called_p = f64::from(class) / f64::from(CLASSES);
            let p = ((called_p - error) / (1.0 - 2.0 * error).max(0.1)).clamp(0.005, 0.995);
            let truth = [(1.0 - p).powi(2), 2.0 * p * (1.0 - p), p * p];
            let chance = |a: usize, b: usize| {
                let both = (0..3)
                    .map(|t| truth[t] * called[t][a] * called[t][b])
                    .sum::<f64>();
                if a == b { both } else { 2.0 * both }
            };
            let cells = [(0, 0), (0, 1), (0, 2), (1, 1), (1, 2), (2, 2)];
            for (&count, (a, b)) in counts.iter().zip(cells) {
                if count > 0 {
                    sum += count as f64 * chance(a, b).max(1e-300).ln();
                }
            }
        }
        sum
    }
}

/// Chances of called dosages (columns) of each true dosage (rows).
fn called_given_truth(error: f64, dropout: f64) -> [[f64; 3]; 3] {
    let (e, right) = (error, 1.0 - error);
    let homozygote = [right * right, 2.0 * e * right, e * e];
    let other = [homozygote[2], homozygote[1], homozygote[0]];
    let kept = [e * right, right * right + e * e, e * right];
    let lost = dropout * (1.0 - dropout);
    let mut heterozygote = [0.0; 3];
    for (i, out) in heterozygote.iter_mut().enumerate() {
        *out = (1.0 - 2.0 * lost) * kept[i] + lost * (homozygote[i] + other[i]);
    }
    [homozygote, heterozygote, other]
}

/// The peak of a profile and its interval.
fn estimate(profile: impl Fn(f64) -> f64) -> RateEstimate {
    let (value, peak) = highest(&profile);
    let inside = |x: f64| profile(x) >= peak - DROP;
    let edge = |mut inner: f64, mut outer: f64| {
        if inside(outer) {
            return outer;
        }
        for _ in 0..30 {
            let middle = (inner + outer) / 2.0;
            if inside(middle) {
                inner = middle;
            } else {
                outer = middle;
            }
        }
        (inner + outer) / 2.0
    };
    RateEstimate {
        value,
        interval: [edge(value, 0.0), edge(value, LARGEST)],
    }
}

/// Place and height of the only peak between 0 and the largest rate, by the golden section; 0 itself
/// is held against it.
fn highest(function: impl Fn(f64) -> f64) -> (f64, f64) {
    let ratio = (5f64.sqrt() - 1.0) / 2.0;
    let (mut low, mut high) = (0.0, LARGEST);
    let (mut left, mut right) = (high - ratio * (high - low), low + ratio * (high - low));
    let (mut at_left, mut at_right) = (function(left), function(right));
    for _ in 0..40 {
        if at_left > at_right {
            (high, right, at_right) = (right, left, at_left);
            left = high - ratio * (high - low);
            at_left = function(left);
        } else {
            (low, left, at_left) = (left, right, at_right);
            right = low + ratio * (high - low);
            at_right = function(right);
        }
    }
    let inside = ((low + high) / 2.0, at_left.max(at_right));
    let none = function(0.0);
    if none >= inside.1 {
        (0.0, none)
    } else {
        inside
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Clopper & Pearson (1934) by the closed forms at the ends: 0 of n is 1 - (tail)^(1/n), n of n
    /// its mirror; and 4 of 10, whose 95 % limits are tabulated as 0.122 and 0.738.
    #[test]
    fn exact_limits() {
        let [low, high] = exact_binomial(0, 10, 0.95).unwrap();
        assert!(low == 0.0 && (high - (1.0 - 0.025f64.powf(0.1))).abs() < 1e-9);
        let [low, high] = exact_binomial(10, 10, 0.95).unwrap();
        assert!(high == 1.0 && (low - 0.025f64.powf(0.1)).abs() < 1e-9);
        let [low, high] = exact_binomial(4, 10, 0.95).unwrap();
        assert!((low - 0.122).abs() < 5e-4 && (high - 0.738).abs() < 5e-4);
        assert_eq!(exact_binomial(0, 0, 0.95), None);
    }

    #[test]
    fn chances_of_calls_add_up() {
        for row in called_given_truth(0.02, 0.05) {
            assert!((row.iter().sum::<f64>() - 1.0).abs() < 1e-12);
        }
        assert_eq!(called_given_truth(0.0, 0.0)[1], [0.0, 1.0, 0.0]);
    }

    /// Expected counts under 2 % error and 5 % dropout give these rates back.
    #[test]
    fn expected_outcomes_give_the_rates_back() {
        let called = called_given_truth(0.02, 0.05);
        let mut table = OutcomeTable::default();
        for class in 5..=25u32 {
            let p = f64::from(class) / 50.0;
            let called_p = p * 0.98 + (1.0 - p) * 0.02;
            let truth = [(1.0 - p).powi(2), 2.0 * p * (1.0 - p), p * p];
            for a in 0..3u8 {
                for b in 0..3u8 {
                    let of = |t: usize| truth[t] * called[t][a as usize] * called[t][b as usize];
                    let n = (1e4 * (0..3).map(of).sum::<f64>()).round() as u64;
                    (0..n).for_each(|_| table.add(called_p, a, b));
                }
            }
        }
        let rates = table.rates().unwrap();
        assert!((rates.error.value - 0.02).abs() < 1e-3, "{rates:?}");
        assert!((rates.dropout.value - 0.05).abs() < 2e-3, "{rates:?}");
        assert!(rates.error.interval[0] < 0.02 && rates.error.interval[1] > 0.02);
    }
}
