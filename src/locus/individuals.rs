//! One individual, and two: heterozygosity, inbreeding, kinship, and the chance of identity.
//!
//! Everything here is of a set of loci chosen by the caller; how many took part is part of every
//! result, and what cannot be said is `None`.

mod packed;

use crate::locus::Counts;

pub use packed::{PackedGenotypes, row_blocks};

/// Heterozygous and typed loci of one individual.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub struct MultilocusHeterozygosity {
    /// Heterozygous loci.
    pub heterozygous: u64,
    /// Typed loci.
    pub typed: u64,
}

impl MultilocusHeterozygosity {
    /// Counts a locus; a missing genotype counts nowhere.
    pub fn add(&mut self, genotype: Option<[u16; 2]>) {
        if let Some([a, b]) = genotype {
            self.typed += 1;
            self.heterozygous += u64::from(a != b);
        }
    }

    /// Heterozygous over typed loci; `None` when nothing is typed.
    pub fn share(&self) -> Option<f64> {
        (self.typed > 0).then(|| self.heterozygous as f64 / self.typed as f64)
    }
}

/// Inbreeding of one individual against expected homozygosity, by the method of moments with the
/// unbiased expectation of Nei (1978).
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct MomentInbreeding {
    /// Homozygous loci.
    pub homozygous: u64,
    /// Sum of expected homozygosity over the same loci.
    pub expected: f64,
    /// Typed loci at which homozygosity has an expectation.
    pub loci: u64,
}

impl MomentInbreeding {
    /// Adds a locus typed in the individual; `expected` is [`expected_homozygosity`] there.
    pub fn add(&mut self, [a, b]: [u16; 2], expected: f64) {
        self.homozygous += u64::from(a == b);
        self.expected += expected;
        self.loci += 1;
    }

    /// F = (O - E)/(L - E); `None` when no locus varies.
    pub fn value(&self) -> Option<f64> {
        let room = self.loci as f64 - self.expected;
        (room > 0.0).then(|| (self.homozygous as f64 - self.expected) / room)
    }
}

/// Unbiased expected homozygosity, 1 - (1 - sum p^2) 2n/(2n-1) for n typed individuals (Nei 1978).
/// `None` when nobody is typed.
pub fn expected_homozygosity(counts: &Counts) -> Option<f64> {
    let total = f64::from(counts.gene_copies());
    // Pairs of distinct gene copies that are alike, over all such pairs.
    let alike: f64 = counts
        .copies
        .iter()
        .map(|&c| f64::from(c) * (f64::from(c) - 1.0))
        .sum();
    (total > 1.0).then(|| alike / (total * (total - 1.0)))
}

/// The same for a biallelic locus of frequency `p` in `individuals` typed.
pub fn expected_homozygosity_at(p: f64, individuals: f64) -> Option<f64> {
    let total = 2.0 * individuals;
    (total > 1.0).then(|| 1.0 - 2.0 * p * (1.0 - p) * total / (total - 1.0))
}

/// Inbreeding of one individual as the correlation of uniting gametes (Yang et al. 2011), over
/// biallelic loci that vary.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct UnitingInbreeding {
    /// Sum of x^2 - (1 + 2p) x + 2 p^2.
    pub numerator: f64,
    /// Sum of 2 p (1 - p).
    pub denominator: f64,
    /// Sum of the ratios.
    pub ratios: f64,
    /// Loci.
    pub loci: u64,
}

impl UnitingInbreeding {
    /// Adds a locus: `dosage` copies of the allele of frequency `p`. Nothing when p is 0 or 1.
    pub fn add(&mut self, dosage: u8, p: f64) {
        let (x, denominator) = (f64::from(dosage), 2.0 * p * (1.0 - p));
        if denominator > 0.0 {
            let numerator = x * x - (1.0 + 2.0 * p) * x + 2.0 * p * p;
            self.numerator += numerator;
            self.denominator += denominator;
            self.ratios += numerator / denominator;
            self.loci += 1;
        }
    }

    /// Ratio of sums, steady with rare alleles: the one to report. `None` without loci.
    pub fn ratio_of_sums(&self) -> Option<f64> {
        (self.loci > 0).then(|| self.numerator / self.denominator)
    }

    /// Mean of ratios.
    pub fn mean_of_ratios(&self) -> Option<f64> {
        (self.loci > 0).then(|| self.ratios / self.loci as f64)
    }
}

/// Two individuals compared over the loci typed in both.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub struct PairCounts {
    /// Loci typed in both.
    pub shared: u32,
    /// Of these, heterozygous in the first.
    pub heterozygous_first: u32,
    /// Heterozygous in the second.
    pub heterozygous_second: u32,
    /// Heterozygous in both, whether alike or not.
    pub both_heterozygous: u32,
    /// Loci without an allele in common: opposite homozygotes where there are two alleles.
    pub nothing_in_common: u32,
    /// Loci with different genotypes.
    pub mismatching: u32,
}

impl PairCounts {
    /// Counts one locus: the plain form, for any number of alleles. [`PackedGenotypes`] does the same
    /// for many biallelic loci at once.
    pub fn add(&mut self, first: Option<[u16; 2]>, second: Option<[u16; 2]>) {
        let (Some([a, b]), Some([c, d])) = (first, second) else {
            return;
        };
        let alike = (a.min(b), a.max(b)) == (c.min(d), c.max(d));
        self.shared += 1;
        self.heterozygous_first += u32::from(a != b);
        self.heterozygous_second += u32::from(c != d);
        self.both_heterozygous += u32::from(a != b && c != d);
        self.nothing_in_common += u32::from(a != c && a != d && b != c && b != d);
        self.mismatching += u32::from(!alike);
    }

    /// Adds the counts of other loci.
    pub fn merge(&mut self, other: &PairCounts) {
        self.shared += other.shared;
        self.heterozygous_first += other.heterozygous_first;
        self.heterozygous_second += other.heterozygous_second;
        self.both_heterozygous += other.both_heterozygous;
        self.nothing_in_common += other.nothing_in_common;
        self.mismatching += other.mismatching;
    }

    /// Mismatches that the loss of one allele in one of the samples would explain: they have an
    /// allele in common. The others cannot come from one true genotype by such a loss.
    pub fn explained_by_dropout(&self) -> u32 {
        self.mismatching - self.nothing_in_common
    }

    /// Kinship between individuals of whatever populations, without allele frequencies (Manichaikul
    /// et al. 2010), biallelic loci only. `None` when one has no heterozygous locus. Negative values
    /// mean different populations.
    pub fn kinship_between(&self) -> Option<f64> {
        let fewest = f64::from(self.heterozygous_first.min(self.heterozygous_second));
        let sum = f64::from(self.heterozygous_first) + f64::from(self.heterozygous_second);
        (fewest > 0.0).then(|| self.likeness() / (2.0 * fewest) + 0.5 - sum / (4.0 * fewest))
    }

    /// Kinship within one random-mating population (Manichaikul et al. 2010), biallelic loci only.
    /// `None` when neither has a heterozygous locus.
    pub fn kinship_within(&self) -> Option<f64> {
        let sum = f64::from(self.heterozygous_first) + f64::from(self.heterozygous_second);
        (sum > 0.0).then(|| self.likeness() / sum)
    }

    fn likeness(&self) -> f64 {
        f64::from(self.both_heterozygous) - 2.0 * f64::from(self.nothing_in_common)
    }

    /// Mean allele sharing M, the mean of (1 + (x - 1)(y - 1))/2 over dosages x and y (Weir & Goudet
    /// 2017), biallelic loci only. `None` without a shared locus.
    pub fn allele_sharing(&self) -> Option<f64> {
        let heterozygous =
            self.heterozygous_first + self.heterozygous_second - self.both_heterozygous;
        let same = f64::from(self.shared - heterozygous - self.nothing_in_common);
        let shared = f64::from(self.shared);
        (self.shared > 0).then(|| 0.5 + (same - f64::from(self.nothing_in_common)) / (2.0 * shared))
    }
}

/// Kinship relative to the average pair, from the allele sharing of a pair and its mean over all
/// pairs of different individuals (Weir & Goudet 2017). `None` when all pairs share everything.
pub fn sharing_kinship(sharing: f64, mean: f64) -> Option<f64> {
    (mean < 1.0).then(|| (sharing - mean) / (1.0 - mean))
}

/// Inbreeding relative to the average pair, from the homozygous share of an individual's typed loci:
/// 2 beta - 1 of its sharing with itself, (1 + homozygous share)/2.
pub fn sharing_inbreeding(homozygous_share: f64, mean: f64) -> Option<f64> {
    sharing_kinship((1.0 + homozygous_share) / 2.0, mean).map(|beta| 2.0 * beta - 1.0)
}

/// How close a robust kinship says that two individuals are (limits of Manichaikul et al. 2010).
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Closeness {
    /// The same individual, or identical twins.
    Same,
    /// Parent and offspring, or full sibs.
    First,
    /// Half sibs, grandparents, aunts and uncles.
    Second,
    /// First cousins.
    Third,
    /// None of these.
    Unrelated,
}

impl Closeness {
    /// The class of a kinship coefficient: limits at 2^-1.5, 2^-2.5, 2^-3.5 and 2^-4.5.
    pub fn of(kinship: f64) -> Self {
        let classes = [
            Closeness::Same,
            Closeness::First,
            Closeness::Second,
            Closeness::Third,
        ];
        (0u8..)
            .zip(classes)
            .find(|(i, _)| kinship > (-1.5 - f64::from(*i)).exp2())
            .map_or(Closeness::Unrelated, |(_, class)| class)
    }
}

/// Chance that two unrelated individuals have the same genotype at a locus, from population
/// frequencies: 2 a2^2 - a4, a_k the sum of k-th powers (Paetkau & Strobeck 1994).
pub fn probability_of_identity(frequencies: &[f64]) -> f64 {
    let [a2, _, a4] = powers(frequencies.iter().copied());
    2.0 * a2 * a2 - a4
}

/// The same without bias from the counts of a sample of n gene copies (Paetkau et al. 1998): the
/// chance that two pairs among four distinct copies make the same genotype. `None` below four copies.
pub fn probability_of_identity_unbiased(copies: &[u32]) -> Option<f64> {
    let n: f64 = copies.iter().map(|&c| f64::from(c)).sum();
    let [a2, a3, a4] = powers(copies.iter().map(|&c| f64::from(c) / n));
    (n >= 4.0).then(|| {
        let leading = n.powi(3) * (2.0 * a2 * a2 - a4) - 2.0 * n * n * (a3 + 2.0 * a2);
        let rest = n * (9.0 * a2 + 2.0) - 6.0;
        (leading + rest) / ((n - 1.0) * (n - 2.0) * (n - 3.0))
    })
}

/// Chance that two full sibs have the same genotype at a locus (Evett & Weir 1998).
pub fn probability_of_identity_sibs(frequencies: &[f64]) -> f64 {
    let [a2, _, a4] = powers(frequencies.iter().copied());
    0.25 + 0.5 * a2 + 0.5 * a2 * a2 - 0.25 * a4
}

/// Pairs among `individuals` expected to match by chance, given the chance for one pair over all loci
/// (the product over independent loci).
pub fn expected_chance_matches(individuals: u64, identity: f64) -> f64 {
    let n = individuals as f64;
    n * (n - 1.0).max(0.0) / 2.0 * identity
}

/// Share of the autosomes within markers' reach that lies in runs of homozygosity (McQuillan et al.
/// 2008), in base pairs. `None` when nothing is covered.
pub fn inbreeding_from_runs(run_lengths: &[u64], covered: u64) -> Option<f64> {
    (covered > 0).then(|| run_lengths.iter().map(|&l| l as f64).sum::<f64>() / covered as f64)
}

/// Sums of second, third and fourth powers.
fn powers(frequencies: impl Iterator<Item = f64>) -> [f64; 3] {
    frequencies.fold([0.0; 3], |[a2, a3, a4], p| {
        [a2 + p * p, a3 + p.powi(3), a4 + p.powi(4)]
    })
}
