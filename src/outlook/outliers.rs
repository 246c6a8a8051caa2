//! Loci that changed more than drift explains.
//!
//! The null is what this population's own drift would do to a locus of the same baseline count: the
//! later count has an exact predictive distribution. The effective size must come from other loci,
//! or from all where these are many.

use std::collections::HashMap;

use statrs::distribution::{ChiSquared, ContinuousCDF};

use super::passage::{Passage, Pool, dot};
use crate::ne::likelihood::{BetaPrior, RateWeight};
use crate::ne::matrix::Matrix;
use crate::ne::wright_fisher::binomial_probabilities;

/// Differences of frequencies closer than this are ties.
const TIE: f64 = 1e-9;

/// Predictive distributions of later counts between one baseline and one later visit. Loci of equal
/// counts share one table.
#[derive(Debug, Clone)]
pub struct OutlierTest {
    passage: Passage,
    most_later: u32,
    /// Chance of each later count by baseline node, for each later sample size.
    by_size: HashMap<u32, Matrix>,
    known: HashMap<(u32, u32, u32), Vec<f64>>,
}

impl OutlierTest {
    /// Prepares a test: the prior of the baseline frequency, weighted drift rates (which add up to
    /// 1), generations since the baseline, and the most gene copies typed later at any locus.
    /// Exact for 2Ne up to 2000 (rounded to a whole number), by the diffusion beyond.
    pub fn new(prior: BetaPrior, rates: &[RateWeight], generations: f64, most_later: u32) -> Self {
        OutlierTest {
            passage: Passage::new(prior, &[], Pool::Endless, rates, generations, most_later),
            most_later,
            by_size: HashMap::new(),
            known: HashMap::new(),
        }
    }

    /// Chances of 0..=`later_typed` copies later, after `baseline` = (copies, copies typed).
    pub fn predictive(&mut self, baseline: (u32, u32), later_typed: u32) -> &[f64] {
        let later_typed = later_typed.min(self.most_later);
        let key = (baseline.0, baseline.1, later_typed);
        let passage = &self.passage;
        let by_size = &mut self.by_size;
        self.known.entry(key).or_insert_with(|| {
            let table = by_size
                .entry(later_typed)
                .or_insert_with(|| later_counts(passage, later_typed));
            let posterior = passage.posterior(baseline.0, baseline.1);
            // A row a later count, so that each chance is one sum.
            (0..table.rows)
                .map(|y| dot(table.row(y), &posterior).max(0.0))
                .collect()
        })
    }

    /// Two-sided p: the chance of a frequency at least as far from the baseline's as the one found.
    /// `None` where a sample has no typed copies.
    pub fn p(&mut self, baseline: (u32, u32), later: (u32, u32)) -> Option<f64> {
        if baseline.1 == 0 || later.1 == 0 {
            return None;
        }
        let (n, start) = (
            f64::from(later.1),
            f64::from(baseline.0) / f64::from(baseline.1),
        );
        let found = (f64::from(later.0) / n - start).abs();
        let chances = self.predictive(baseline, later.1);
        let sum: f64 = chances
            .iter()
            .enumerate()
            .filter(|(y, _)| (*y as f64 / n - start).abs() >= found - TIE)
            .map(|(_, p)| p)
            .sum();
        Some(sum.min(1.0))
    }
}

/// Rows: later counts; columns: baseline nodes.
fn later_counts(passage: &Passage, typed: u32) -> Matrix {
    let by_node: Vec<Vec<f64>> = passage
        .nodes
        .iter()
        .map(|&x| binomial_probabilities(typed, x))
        .collect();
    let rows: Vec<Vec<f64>> = (0..=typed as usize)
        .map(|y| {
            let function: Vec<f64> = by_node.iter().map(|b| b[y]).collect();
            passage.back(&function)
        })
        .collect();
    Matrix {
        rows: rows.len(),
        columns: rows.first().map_or(0, Vec::len),
        data: rows.concat(),
    }
}

/// A quick test of one allele: chi-square with one degree of freedom.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct DriftChiSquare {
    /// Pooled frequency.
    pub pooled: f64,
    /// Variance of the difference of the two sample frequencies.
    pub variance: f64,
    /// Squared difference over its variance.
    pub statistic: f64,
    /// Chance of a statistic at least as large.
    pub p: f64,
}

/// Two samples to compare by [`drift_chi_square`].
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FrequencyPair {
    /// Frequency of the allele in the baseline sample.
    pub baseline: f64,
    /// Frequency in the later sample.
    pub later: f64,
    /// Individuals typed at the baseline.
    pub baseline_individuals: f64,
    /// Individuals typed later.
    pub later_individuals: f64,
}

/// The drift-aware chi-square test of Waples (1989, Evolution 43:1236-1251); poor for rare alleles
/// and for many generations over 2Ne. `census` is the population's size N under plan I (sampled
/// with replacement before reproduction), `None` under plan II. `None` where nothing varies.
pub fn drift_chi_square(
    pair: FrequencyPair,
    generations: f64,
    effective_size: f64,
    census: Option<f64>,
) -> Option<DriftChiSquare> {
    let (c0, c1) = (
        2.0 * pair.baseline_individuals,
        2.0 * pair.later_individuals,
    );
    let pooled = (c0 * pair.baseline + c1 * pair.later) / (c0 + c1);
    let kept = (generations * (-0.5 / effective_size).ln_1p()).exp();
    let factor = 1.0 / c0 + 1.0 - (1.0 - 1.0 / c1) * kept - census.map_or(0.0, |n| 1.0 / n);
    let variance = pooled * (1.0 - pooled) * factor;
    if variance.is_nan() || variance <= 0.0 {
        return None;
    }
    let statistic = (pair.baseline - pair.later).powi(2) / variance;
    let p = ChiSquared::new(1.0).ok()?.sf(statistic);
    Some(DriftChiSquare {
        pooled,
        variance,
        statistic,
        p,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn close(got: f64, want: f64, absolute: f64) {
        assert!((got - want).abs() < absolute, "{got} is not {want}");
    }

    /// Computed by hand from the formula; the variance is the exact Wright-Fisher variance.
    #[test]
    fn chi_square_of_one_allele() {
        let pair = FrequencyPair {
            baseline: 0.3,
            later: 0.55,
            baseline_individuals: 40.0,
            later_individuals: 50.0,
        };
        let two = drift_chi_square(pair, 5.0, 50.0, None).unwrap();
        close(two.pooled, 0.4388888888888889, 1e-12);
        close(two.variance, 0.017489734195352526, 1e-12);
        close(two.statistic, 3.573524863322845, 1e-9);
        close(two.p, 0.05870756921512533, 1e-9);
        let one = drift_chi_square(pair, 5.0, 50.0, Some(200.0)).unwrap();
        close(one.variance, 0.0162584070348587, 1e-12);
        close(one.statistic, 3.844165044336597, 1e-9);
        close(one.p, 0.04991937063623443, 1e-9);
        let still = FrequencyPair {
            baseline: 1.0,
            later: 1.0,
            ..pair
        };
        assert_eq!(drift_chi_square(still, 5.0, 50.0, None), None);
    }

    /// Beta-binomial founders, Wright-Fisher matrix, binomial sample: exact enumeration.
    #[test]
    fn predictive_distribution_is_exact() {
        let rates = RateWeight::certain(Some(10.0));
        let mut test = OutlierTest::new(BetaPrior::FLAT, &rates, 1.0, 20);
        let chances = test.predictive((10, 20), 20).to_vec();
        let want = [
            0.00155362, 0.00494207, 0.01117636, 0.02057953, 0.03301151, 0.04770172, 0.06331891,
            0.07815661, 0.09041045, 0.09849199, 0.10131449,
        ];
        for (y, want) in want.into_iter().enumerate() {
            close(chances[y], want, 1e-8);
            close(chances[20 - y], want, 1e-8);
        }
        for (y, want) in [
            (14, 0.36456742108513307),
            (16, 0.1425261649221596),
            (18, 0.0353441025946172),
            (20, 0.0031072403831185627),
        ] {
            close(test.p((10, 20), (y, 20)).unwrap(), want, 1e-9);
        }
        let rates = RateWeight::certain(Some(50.0));
        let mut test = OutlierTest::new(BetaPrior::FLAT, &rates, 5.0, 100);
        for (y, want) in [
            (55, 0.039839767970920335),
            (50, 0.10650465755694402),
            (45, 0.23768797980842407),
        ] {
            close(test.p((24, 80), (y, 100)).unwrap(), want, 1e-9);
        }
        assert_eq!(test.p((0, 0), (3, 10)), None);
    }

    #[test]
    fn exact_and_diffusion_meet() {
        let at = |ne: f64| {
            let rates = RateWeight::certain(Some(ne));
            let mut test = OutlierTest::new(BetaPrior::FLAT, &rates, 20.0, 100);
            test.p((24, 80), (50, 100)).unwrap()
        };
        close(at(1000.0), at(1000.4), 2e-4);
    }
}
