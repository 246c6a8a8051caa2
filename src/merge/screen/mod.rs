//! Sums for looking at samples and loci themselves. Integers, and lists bounded by rank, so that
//! order and threads change nothing.

mod panel;
mod suspects;

use std::ops::Range;

use super::histogram::PValueHistogram;
use super::to_fixed;
use crate::locus::Counts;
use crate::locus::hardy_weinberg::Direction;
use crate::locus::individuals::expected_homozygosity;
use crate::locus::signs::{Factorials, combined_score, heterozygote_score, upper_tail};
use crate::model::Locus;

pub use panel::{KeptLocus, KeptRepeat, ScreenPanel};
pub use suspects::{MissingTogether, OddHeterozygotes, Ranked};

/// What is looked at: slots, and how they hang together.
#[derive(Debug, Clone)]
pub struct ScreenScheme {
    /// Slots of each stratum, known replicates last.
    pub strata: Vec<Range<usize>>,
    /// Of these, the slots that count in allele frequencies: those of no known replicate.
    pub counted: Vec<Range<usize>>,
    /// Groups of samples that might have been genotyped differently: by visit, by batch.
    pub groupings: Vec<Grouping>,
    /// Loci of two alleles whose genotypes are kept.
    pub most_loci: usize,
    /// Loci of more alleles whose genotypes are kept.
    pub most_repeats: usize,
    /// Loci listed for each kind of oddity.
    pub most_listed: usize,
}

/// One way of grouping all slots.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Grouping {
    /// What the groups are: `visit` or `batch`.
    pub by: &'static str,
    /// Names of the groups.
    pub names: Vec<String>,
    /// Group of each slot; none for samples that are in no group.
    pub of_slot: Vec<Option<usize>>,
}

/// Sums of one sample.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub struct SampleSums {
    /// Kept records at which it is typed.
    pub typed: u64,
    /// Loci that vary among all samples at which it is typed.
    pub typed_varying: u64,
    /// Of these, heterozygous.
    pub heterozygous: u64,
    /// Loci with an expected homozygosity: those that vary in its stratum.
    pub moment_loci: u64,
    /// Of these, homozygous.
    pub homozygous: u64,
    /// Sum of expected homozygosity there, in steps of 2^-40.
    pub expected: i128,
    /// Loci of two alleles among them.
    pub uniting_loci: u64,
    /// Numerator of inbreeding by uniting gametes, in steps of 2^-40.
    pub uniting: i128,
    /// Its denominator.
    pub uniting_scale: i128,
}

impl SampleSums {
    fn merge(&mut self, other: &SampleSums) {
        self.typed += other.typed;
        self.typed_varying += other.typed_varying;
        self.heterozygous += other.heterozygous;
        self.moment_loci += other.moment_loci;
        self.homozygous += other.homozygous;
        self.expected += other.expected;
        self.uniting_loci += other.uniting_loci;
        self.uniting += other.uniting;
        self.uniting_scale += other.uniting_scale;
    }
}

/// Everything that `screen` sums over loci.
#[derive(Debug, Clone)]
pub struct ScreenSums {
    scheme: std::sync::Arc<ScreenScheme>,
    factorials: std::sync::Arc<Factorials>,
    /// By slot.
    pub samples: Vec<SampleSums>,
    /// Genotypes at a bounded set of loci.
    pub panel: ScreenPanel,
    /// p of every locus for too many or too few heterozygotes.
    pub heterozygotes: PValueHistogram,
    /// The loci of lowest such p.
    pub odd_heterozygotes: Ranked<OddHeterozygotes>,
    /// p of every locus for genotypes missing together, by grouping.
    pub missing: Vec<PValueHistogram>,
    /// The loci of lowest such p, by grouping.
    pub missing_together: Vec<Ranked<MissingTogether>>,
    /// Records added.
    pub kept: u64,
    /// Records that vary among the samples.
    pub varying: u64,
    counts: Vec<Counts>,
}

impl ScreenSums {
    /// The identity of [`ScreenSums::merge`] for this scheme.
    pub fn new(scheme: std::sync::Arc<ScreenScheme>) -> Self {
        let slots = scheme.strata.last().map_or(0, |s| s.end);
        let groupings = scheme.groupings.len();
        ScreenSums {
            factorials: std::sync::Arc::new(Factorials::new(slots)),
            samples: vec![SampleSums::default(); slots],
            panel: ScreenPanel::new(scheme.most_loci, scheme.most_repeats),
            heterozygotes: PValueHistogram::default(),
            odd_heterozygotes: Ranked::new(scheme.most_listed),
            missing: vec![PValueHistogram::default(); groupings],
            missing_together: vec![Ranked::new(scheme.most_listed); groupings],
            kept: 0,
            varying: 0,
            counts: vec![Counts::default(); scheme.strata.len()],
            scheme,
        }
    }

    /// Adds one locus.
    pub fn add(&mut self, locus: &Locus) {
        let scheme = std::sync::Arc::clone(&self.scheme);
        self.kept += 1;
        for (counts, slots) in self.counts.iter_mut().zip(&scheme.strata) {
            counts.recount(&locus.genotypes, slots.clone());
        }
        let varies = {
            let alleles = locus.genotypes.allele_count().max(2);
            let seen = |a: &usize| self.counts.iter().any(|c| c.copies[*a] > 0);
            (0..alleles).filter(seen).take(2).count() == 2
        };
        self.add_samples(locus, varies);
        self.add_missing(locus, &scheme);
        if !varies {
            return;
        }
        self.varying += 1;
        self.panel.offer(locus);
        for (counts, slots) in self.counts.iter_mut().zip(&scheme.counted) {
            counts.recount(&locus.genotypes, slots.clone());
        }
        self.add_inbreeding(locus, &scheme);
        self.add_heterozygotes(locus);
    }

    /// Adds the sums of another worker of the same scheme.
    pub fn merge(&mut self, other: ScreenSums) {
        for (own, their) in self.samples.iter_mut().zip(&other.samples) {
            own.merge(their);
        }
        self.panel.merge(other.panel);
        self.heterozygotes.merge(&other.heterozygotes);
        self.odd_heterozygotes.merge(other.odd_heterozygotes);
        for (own, their) in self.missing.iter_mut().zip(&other.missing) {
            own.merge(their);
        }
        let theirs = other.missing_together;
        for (own, their) in self.missing_together.iter_mut().zip(theirs) {
            own.merge(their);
        }
        self.kept += other.kept;
        self.varying += other.varying;
    }

    fn add_samples(&mut self, locus: &Locus, varies: bool) {
        for (slot, sums) in self.samples.iter_mut().enumerate() {
            if let Some([a, b]) = locus.genotypes.pair(slot) {
                sums.typed += 1;
                if varies {
                    sums.typed_varying += 1;
                    sums.heterozygous += u64::from(a != b);
                }
            }
        }
    }

    fn add_inbreeding(&mut self, locus: &Locus, scheme: &ScreenScheme) {
        for (counts, slots) in self.counts.iter().zip(&scheme.strata) {
            if counts.alleles_seen() < 2 {
                continue;
            }
            let Some(expected) = expected_homozygosity(counts).map(to_fixed) else {
                continue;
            };
            let uniting = locus
                .genotypes
                .is_biallelic()
                .then(|| counts.frequency(1))
                .flatten()
                .map(uniting_terms);
            for slot in slots.clone() {
                let Some([a, b]) = locus.genotypes.pair(slot) else {
                    continue;
                };
                let sums = &mut self.samples[slot];
                sums.moment_loci += 1;
                sums.homozygous += u64::from(a == b);
                sums.expected += i128::from(expected);
                if let Some((numerators, scale)) = &uniting {
                    sums.uniting_loci += 1;
                    sums.uniting += i128::from(numerators[usize::from((a + b).min(2))]);
                    sums.uniting_scale += i128::from(*scale);
                }
            }
        }
    }

    fn add_heterozygotes(&mut self, locus: &Locus) {
        let varying = || self.counts.iter().filter(|c| c.alleles_seen() > 1);
        let scores = varying()
            .filter_map(|counts| Some((heterozygote_score(counts)?, f64::from(counts.typed))));
        let Some(score) = combined_score(scores) else {
            return;
        };
        let direction = if score < 0.0 {
            Direction::Deficit
        } else {
            Direction::Excess
        };
        let p = (2.0 * upper_tail(score.abs())).min(1.0);
        self.heterozygotes.add(p, direction);
        if !self.odd_heterozygotes.takes(p) {
            return;
        }
        let mut odd = OddHeterozygotes {
            score,
            ..OddHeterozygotes::default()
        };
        for counts in varying() {
            odd.individuals += u64::from(counts.typed);
            odd.heterozygotes += u64::from(counts.heterozygotes);
            let diversity = 1.0 - expected_homozygosity(counts).unwrap_or(1.0);
            odd.expected += diversity * f64::from(counts.typed);
        }
        self.odd_heterozygotes.offer(p, locus, odd);
    }

    fn add_missing(&mut self, locus: &Locus, scheme: &ScreenScheme) {
        for (which, grouping) in scheme.groupings.iter().enumerate() {
            let groups = grouping.names.len();
            let (mut missing, mut size) = (vec![0usize; groups], vec![0usize; groups]);
            for (slot, group) in grouping.of_slot.iter().enumerate() {
                if let Some(group) = *group {
                    size[group] += 1;
                    missing[group] += usize::from(locus.genotypes.pair(slot).is_none());
                }
            }
            let (all, none): (usize, usize) = (size.iter().sum(), missing.iter().sum());
            let chance = |g: usize| {
                (missing[g] > 0).then(|| {
                    let tail = self
                        .factorials
                        .missing_together(missing[g], size[g], none, all);
                    (tail, g)
                })
            };
            let lowest = (0..groups)
                .filter_map(chance)
                .min_by(|a, b| a.0.total_cmp(&b.0));
            // The lowest of several groups, held against so many chances (Bonferroni).
            let p = lowest.map_or(1.0, |(p, _)| (p * groups as f64).min(1.0));
            self.missing[which].add(p, Direction::Deficit);
            if let Some((_, group)) = lowest.filter(|_| self.missing_together[which].takes(p)) {
                let found = MissingTogether {
                    group,
                    missing: missing[group] as u64,
                    group_size: size[group] as u64,
                    missing_elsewhere: (none - missing[group]) as u64,
                    elsewhere: (all - size[group]) as u64,
                };
                self.missing_together[which].offer(p, locus, found);
            }
        }
    }
}

/// x^2 - (1 + 2p) x + 2 p^2 for dosages 0, 1, 2, and 2 p (1 - p) (Yang et al. 2011), in fixed point.
fn uniting_terms(p: f64) -> ([i64; 3], i64) {
    let term = |x: f64| to_fixed(x * x - (1.0 + 2.0 * p) * x + 2.0 * p * p);
    (
        [term(0.0), term(1.0), term(2.0)],
        to_fixed(2.0 * p * (1.0 - p)),
    )
}
