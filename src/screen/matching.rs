//! Which pairs of samples are one individual, and how close the others are.

use statrs::distribution::{Binomial, DiscreteCDF};

use super::genotypes::ScreenGenotypes;
use crate::locus::individuals::{Closeness, PairCounts};

/// Pairs of full sibs that may be taken for one individual, expected over the whole sample if every
/// sample had one full sib in it.
const EXPECTED_FALSE: f64 = 0.05;
/// Shared loci beyond which the limit is the cap alone: chance no longer matters there.
const MANY_LOCI: usize = 2000;
/// The cap on mismatches as a share of those expected of full sibs. With many loci chance hides sibs no
/// more, but sibs of species with few chromosomes differ in how much they share; replicates of a poor
/// laboratory (2 % error, 5 % dropout a gene copy) show half of what sibs do.
const CAP: f64 = 0.6;
/// Strata with fewer individuals have no frequencies to rely on; the least telling others stand in.
const ENOUGH_INDIVIDUALS: usize = 5;

/// When two samples are one individual.
#[derive(Debug, Clone, PartialEq)]
pub struct MatchRule {
    /// Loci that both must be typed at, where the user says so.
    pub fewest_shared: u32,
    /// Share of the shared loci that may differ, where the user says so.
    pub most_mismatching: Option<f64>,
    /// Most mismatches by stratum and shared loci; none where even a perfect match tells nothing.
    limits: Vec<Vec<Option<u32>>>,
    /// Expected share of loci at which full sibs differ, by stratum.
    sibs_differ: Vec<f64>,
}

impl MatchRule {
    /// The rule for a set of genotypes. Without a share given, the most mismatches among L shared
    /// loci are the most for which `samples` pairs of full sibs would give 0.05 false matches, sibs
    /// differing at each locus with the mean chance of their stratum, and never more than 0.6 of
    /// what sibs are expected to show.
    pub fn of(
        genotypes: &ScreenGenotypes,
        samples: usize,
        fewest_shared: u32,
        most_mismatching: Option<f64>,
    ) -> Self {
        let enough = |i: &usize| genotypes.strata[*i].individuals >= ENOUGH_INDIVIDUALS;
        let all: Vec<usize> = (0..genotypes.strata.len()).collect();
        let relied: Vec<usize> = all.iter().copied().filter(enough).collect();
        let relied = if relied.is_empty() {
            all.clone()
        } else {
            relied
        };
        let least = relied
            .iter()
            .map(|&i| genotypes.strata[i].sibs_differ)
            .fold(1.0, f64::min);
        let sibs_differ: Vec<f64> = all
            .iter()
            .map(|i| match relied.contains(i) {
                true => genotypes.strata[*i].sibs_differ,
                false => least,
            })
            .collect();
        let limits = sibs_differ
            .iter()
            .map(|&differ| limits(genotypes.loci(), differ, samples))
            .collect();
        MatchRule {
            fewest_shared,
            most_mismatching,
            limits,
            sibs_differ,
        }
    }

    /// Most mismatches among `shared` loci between samples of two strata; none when a match would
    /// tell nothing.
    pub fn limit(&self, first: usize, second: usize, shared: u32) -> Option<u32> {
        if shared < self.fewest_shared.max(1) {
            return None;
        }
        if let Some(share) = self.most_mismatching {
            return Some((share * f64::from(shared)).floor() as u32);
        }
        let of = |s: usize| {
            let limits = &self.limits[s];
            match limits.get(shared as usize) {
                Some(limit) => *limit,
                None => Some((CAP * self.sibs_differ[s] * f64::from(shared)).floor() as u32),
            }
        };
        Some(of(first)?.min(of(second)?))
    }

    /// Whether a pair passes.
    pub fn passes(&self, first: usize, second: usize, counts: &PairCounts) -> bool {
        self.limit(first, second, counts.shared)
            .is_some_and(|limit| counts.mismatching <= limit)
    }

    /// Fewest shared loci at which a match tells anything within each stratum; none when no number
    /// of the kept loci does.
    pub fn fewest_telling(&self, stratum: usize) -> Option<u32> {
        if self.most_mismatching.is_some() {
            return Some(self.fewest_shared.max(1));
        }
        let first = self.limits[stratum].iter().position(Option::is_some)?;
        Some((first as u32).max(self.fewest_shared))
    }

    /// Expected share of loci at which full sibs of a stratum differ.
    pub fn sibs_differ(&self, stratum: usize) -> f64 {
        self.sibs_differ[stratum]
    }
}

fn limits(loci: usize, differ: f64, samples: usize) -> Vec<Option<u32>> {
    let chance = EXPECTED_FALSE / samples.max(1) as f64;
    let mut limits: Vec<Option<u32>> = Vec::new();
    // Limits never fall with more loci, so each search goes on where the last one ended.
    let mut next = 0u64;
    for shared in 0..=loci.min(MANY_LOCI) {
        let cap = (CAP * differ * shared as f64).floor() as u64;
        if let Ok(mismatches) = Binomial::new(differ.clamp(0.0, 1.0), shared as u64) {
            while next <= cap && mismatches.cdf(next) <= chance {
                next += 1;
            }
        }
        limits.push(next.checked_sub(1).map(|k| k as u32));
    }
    limits
}

/// What a pair is worth mentioning for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum PairKind {
    /// One individual by the rule.
    Match,
    /// Related by kinship.
    Related(Closeness),
}

/// A pair worth mentioning.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PairFound {
    /// Lower slot.
    pub first: usize,
    /// Higher slot.
    pub second: usize,
    /// Over loci of two alleles.
    pub biallelic: PairCounts,
    /// Over all kept loci.
    pub all: PairCounts,
    /// Why it is here.
    pub kind: PairKind,
}

/// Goes through pairs of slots.
#[derive(Debug)]
pub struct Matching<'a> {
    /// The genotypes.
    pub genotypes: &'a ScreenGenotypes,
    /// The rule of matching.
    pub rule: &'a MatchRule,
    /// Stratum of each slot.
    pub stratum_of: &'a [usize],
    /// Whether kinship is asked for: there are loci enough.
    pub kinship: bool,
}

/// What a range of pairs gave.
#[derive(Debug, Clone, Default)]
pub struct Found {
    /// Pairs worth mentioning, by first and second slot.
    pub pairs: Vec<PairFound>,
    /// All pairs by closeness, the matching ones left out: first, second, third degree, the rest, and
    /// those without a kinship.
    pub by_closeness: [u64; 6],
    /// Pairs that share too few loci for a match to tell anything.
    pub untold: u64,
}

impl Matching<'_> {
    /// All pairs of each slot of `rows` with later ones.
    pub fn rows(&self, rows: std::ops::Range<usize>) -> Found {
        let mut found = Found::default();
        self.genotypes
            .packed
            .compare_rows(rows, |first, second, biallelic| {
                self.pair(first, second, biallelic, &mut found);
            });
        found.pairs.sort_by_key(|pair| (pair.first, pair.second));
        found
    }

    /// One pair over all kept loci: of two alleles, and of any number.
    pub fn compare(&self, first: usize, second: usize) -> (PairCounts, PairCounts) {
        let biallelic = self.genotypes.packed.compare(first, second);
        let mut all = self.genotypes.compare_repeats(first, second);
        all.merge(&biallelic);
        (biallelic, all)
    }

    fn pair(&self, first: usize, second: usize, biallelic: PairCounts, found: &mut Found) {
        let mut all = self.genotypes.compare_repeats(first, second);
        all.merge(&biallelic);
        let (s, t) = (self.stratum_of[first], self.stratum_of[second]);
        let mut add = |kind| {
            found.pairs.push(PairFound {
                first,
                second,
                biallelic,
                all,
                kind,
            });
        };
        match self.rule.limit(s, t, all.shared) {
            None => found.untold += 1,
            Some(limit) if all.mismatching <= limit => return add(PairKind::Match),
            Some(_) => {}
        }
        if !self.kinship {
            return;
        }
        let class = biallelic.kinship_between().map(Closeness::of);
        found.by_closeness[class.map_or(5, |c| c as usize)] += 1;
        if let Some(class @ (Closeness::Same | Closeness::First | Closeness::Second)) = class {
            add(PairKind::Related(class));
        }
    }
}

impl Found {
    /// Adds what another range of rows gave.
    pub fn merge(&mut self, other: Found) {
        self.pairs.extend(other.pairs);
        for (own, their) in self.by_closeness.iter_mut().zip(other.by_closeness) {
            *own += their;
        }
        self.untold += other.untold;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// By hand: sibs that differ at 0.6 of loci agree at twelve with chance 0.4^12 = 1.7e-5, at one
    /// mismatch or none with 3.2e-4, at two with 2.8e-3; 100 samples allow 5e-4. At eight loci
    /// 0.4^8 = 6.6e-4 is too much already.
    #[test]
    fn limits_are_those_of_the_binomial() {
        let limits = limits(12, 0.6, 100);
        assert_eq!(limits[8], None);
        assert_eq!(limits[9], Some(0));
        assert_eq!(limits[12], Some(1));
        assert!(limits.is_sorted());
    }

    #[test]
    fn with_many_loci_the_cap_is_the_most() {
        // 0.6 x 0.3 x 2000.
        assert_eq!(limits(2000, 0.3, 500)[2000], Some(360));
    }
}
