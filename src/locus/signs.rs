//! Signs that a locus is not what it seems: too many or too few heterozygotes, genotypes missing
//! together.

use super::Counts;
use super::hardy_weinberg::test_two_alleles;

/// Expected homozygotes and heterozygotes from which on the total of a locus of many alleles is taken
/// as normal; below, the commonest allele is held against all others, and that test is exact.
const ENOUGH_EXPECTED: f64 = 5.0;

/// How far the heterozygotes of one sample lie above (positive) or below their expectation under
/// random mating, given the allele counts, in standard deviations of a normal variable. `None` when
/// nothing varies.
///
/// Two alleles: by the exact one-sided mid-p (Graffelman & Moreno 2013). More: mean and variance of
/// the number of homozygotes among n random pairs of the 2n gene copies, both exact, with the
/// continuity correction of one half.
pub fn heterozygote_score(counts: &Counts) -> Option<f64> {
    match counts.alleles_seen() {
        0 | 1 => None,
        2 => {
            let copies = counts.copies.iter().copied().find(|&c| c > 0)?;
            two_alleles(counts.typed, copies, counts.heterozygotes)
        }
        _ => many_alleles(counts),
    }
}

fn two_alleles(typed: u32, copies: u32, heterozygotes: u32) -> Option<f64> {
    let test = test_two_alleles(typed, copies, heterozygotes)?;
    let here = (test.excess + test.deficit - 1.0).max(0.0);
    Some(if test.excess <= test.deficit {
        -standard_normal(test.excess - here / 2.0)
    } else {
        standard_normal(test.deficit - here / 2.0)
    })
}

fn many_alleles(counts: &Counts) -> Option<f64> {
    let (mean, variance) = homozygotes_by_chance(&counts.copies)?;
    let typed = f64::from(counts.typed);
    if mean >= ENOUGH_EXPECTED && typed - mean >= ENOUGH_EXPECTED && variance > 0.0 {
        let off = mean - (typed - f64::from(counts.heterozygotes));
        let off = off.signum() * (off.abs() - 0.5).max(0.0);
        return Some(off / variance.sqrt());
    }
    let (allele, &copies) = counts.copies.iter().enumerate().max_by_key(|(_, c)| **c)?;
    two_alleles(counts.typed, copies, counts.heterozygous[allele])
}

/// Mean and variance of the homozygotes among n individuals made of 2n gene copies paired at random:
/// with N = 2n and x_i copies, P1 = sum x_i (x_i - 1) / (N (N - 1)) is the chance that one pair is
/// alike and P2 that two given pairs both are; mean n P1, variance n P1 (1 - P1) + n (n - 1)(P2 - P1^2).
/// `None` below two individuals.
pub fn homozygotes_by_chance(copies: &[u32]) -> Option<(f64, f64)> {
    let falling = |c: u32, k: u32| (0..k).map(|j| f64::from(c) - f64::from(j)).product::<f64>();
    let total: u32 = copies.iter().sum();
    if total < 4 {
        return None;
    }
    let n = f64::from(total) / 2.0;
    let alike: f64 = copies.iter().map(|&c| falling(c, 2)).sum();
    let squares: f64 = copies.iter().map(|&c| falling(c, 2).powi(2)).sum();
    let fours: f64 = copies.iter().map(|&c| falling(c, 4)).sum();
    let one = alike / falling(total, 2);
    let two = (alike * alike - squares + fours) / falling(total, 4);
    Some((
        n * one,
        n * one * (1.0 - one) + n * (n - 1.0) * (two - one * one),
    ))
}

/// Scores of several samples as one, each weighted by the root of its size (Stouffer et al. 1949;
/// Liptak 1958). `None` without a score.
pub fn combined_score(scores: impl Iterator<Item = (f64, f64)>) -> Option<f64> {
    let (mut sum, mut squares) = (0.0, 0.0);
    for (score, size) in scores {
        sum += score * size.sqrt();
        squares += size;
    }
    (squares > 0.0).then(|| sum / squares.sqrt())
}

/// Chance of a standard normal variable above `score`.
pub fn upper_tail(score: f64) -> f64 {
    statrs::function::erf::erfc(score / std::f64::consts::SQRT_2) / 2.0
}

/// The standard normal value below which a share `p` lies, `p` held away from 0 and 1.
fn standard_normal(p: f64) -> f64 {
    const SMALLEST: f64 = 1e-300;
    -std::f64::consts::SQRT_2 * statrs::function::erf::erfc_inv(2.0 * p.clamp(SMALLEST, 0.5)) + 0.0
}

/// Frequency of an allele that is never seen which would make so many heterozygotes too few:
/// (He - Ho)/(1 + He) (Brookfield 1996, Mol Ecol 5:453-455), 0 where there are enough. From sums over
/// samples of expected and observed heterozygotes, and individuals. `None` without individuals.
pub fn unseen_allele_frequency(observed: f64, expected: f64, individuals: f64) -> Option<f64> {
    (individuals > 0.0).then(|| {
        let (observed, expected) = (observed / individuals, expected / individuals);
        ((expected - observed) / (1.0 + expected)).max(0.0)
    })
}

/// Natural logarithms of factorials up to a bound that is known beforehand.
#[derive(Debug, Clone)]
pub struct Factorials(Vec<f64>);

impl Factorials {
    /// Up to the factorial of `largest`.
    pub fn new(largest: usize) -> Self {
        let mut logs = Vec::with_capacity(largest + 1);
        logs.push(0.0);
        for i in 1..=largest {
            logs.push(logs[i - 1] + (i as f64).ln());
        }
        Factorials(logs)
    }

    fn choose(&self, n: usize, k: usize) -> f64 {
        self.0[n] - self.0[k] - self.0[n - k]
    }

    /// Chance that at least `missing` of a group of `group` are among the `missing_all` that are
    /// missing of `all`, when it is chance alone who is (Fisher 1935, one-sided).
    ///
    /// # Panics
    /// When `all` is above the bound, or a part above the whole.
    pub fn missing_together(
        &self,
        missing: usize,
        group: usize,
        missing_all: usize,
        all: usize,
    ) -> f64 {
        let most = group.min(missing_all);
        let whole = self.choose(all, missing_all);
        let chance = |m: usize| {
            if missing_all - m > all - group {
                return 0.0;
            }
            let log = self.choose(group, m) + self.choose(all - group, missing_all - m) - whole;
            log.exp()
        };
        (missing..=most).map(chance).sum::<f64>().min(1.0)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Exact enumeration: all ways to pair six gene copies AAAABC and AABBCC.
    #[test]
    fn homozygotes_by_chance_are_those_of_all_pairings() {
        fn pairings(left: &[u8], homozygotes: u32, out: &mut Vec<u32>) {
            let Some((&first, rest)) = left.split_first() else {
                out.push(homozygotes);
                return;
            };
            for i in 0..rest.len() {
                let mut others = rest.to_vec();
                let partner = others.remove(i);
                pairings(&others, homozygotes + u32::from(partner == first), out);
            }
        }
        for (copies, counts) in [(b"AAAABC", [4, 1, 1]), (b"AABBCC", [2, 2, 2])] {
            let mut all = Vec::new();
            pairings(copies, 0, &mut all);
            let n = all.len() as f64;
            let mean = all.iter().map(|&h| f64::from(h)).sum::<f64>() / n;
            let square = all.iter().map(|&h| f64::from(h).powi(2)).sum::<f64>() / n;
            let (m, v) = homozygotes_by_chance(&counts).unwrap();
            assert!((m - mean).abs() < 1e-12 && (v - (square - mean * mean)).abs() < 1e-12);
        }
    }

    /// 100 individuals, 21 copies of the rarer allele: one-sided chances from the published example of
    /// Wigginton, Cutler & Abecasis (2005), Table 1: P(H = 21) 0.282, 19 0.406, 17 0.214, 15 0.0759...
    /// so 21 heterozygotes have an upper mid-p of half of the last class.
    #[test]
    fn two_alleles_score_by_their_exact_tail() {
        let mut counts = Counts::empty(2);
        (0..21).for_each(|_| counts.add([0, 1]));
        (0..79).for_each(|_| counts.add([0, 0]));
        let score = heterozygote_score(&counts).unwrap();
        let chance = test_two_alleles(100, 21, 21).unwrap().excess;
        assert!((upper_tail(score) - chance / 2.0).abs() < 1e-9);
        // One copy: nothing can be said, and nothing is.
        let mut single = Counts::empty(2);
        single.add([0, 1]);
        (0..30).for_each(|_| single.add([0, 0]));
        assert!(heterozygote_score(&single).unwrap().abs() < 1e-9);
        assert_eq!(heterozygote_score(&Counts::of(2, [Some([0, 0]); 4])), None);
    }

    /// The tea tasting (Fisher 1935): 4 of 8 cups, at least 3 right: 17/70; all right: 1/70.
    #[test]
    fn missing_together_is_the_hypergeometric_tail() {
        let table = Factorials::new(8);
        assert!((table.missing_together(3, 4, 4, 8) - 17.0 / 70.0).abs() < 1e-12);
        assert!((table.missing_together(4, 4, 4, 8) - 1.0 / 70.0).abs() < 1e-12);
        assert!((table.missing_together(0, 4, 4, 8) - 1.0).abs() < 1e-12);
    }

    #[test]
    fn unseen_allele() {
        // By hand: He 0.5, Ho 0.35: 0.15/1.5.
        let frequency = unseen_allele_frequency(35.0, 50.0, 100.0).unwrap();
        assert!((frequency - 0.1).abs() < 1e-12);
        assert_eq!(unseen_allele_frequency(1.0, 0.0, 10.0), Some(0.0));
        assert_eq!(unseen_allele_frequency(0.0, 0.0, 0.0), None);
    }
}
