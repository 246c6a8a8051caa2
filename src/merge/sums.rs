//! All sums of one run: what a worker fills locus by locus, what shards add up.

use std::sync::Arc;

use super::fixed::Terms;
use super::histogram::PValueHistogram;
use super::panel::Panel;
use super::scheme::Scheme;
use super::two_way::TwoWay;
use crate::locus::hardy_weinberg::{HardyWeinbergCache, HardyWeinbergOutcome};
use crate::locus::richness::Rarefaction;
use crate::locus::{
    Counts, GenotypeClasses, PairTerms, PrivateTerms, StratumTerms, pair_terms, private_terms,
    stratum_terms,
};
use crate::model::{Genotypes, Locus};

/// Sums of one stratum.
#[derive(Debug, Clone, PartialEq)]
pub struct StratumSums {
    /// Diversity.
    pub diversity: TwoWay<StratumTerms>,
    /// Typed genotypes over all kept records, whether the locus counts in the stratum or not.
    pub typed_genotypes: u64,
    /// Exact Hardy-Weinberg tests of the loci that vary in the stratum.
    pub hardy_weinberg: PValueHistogram,
}

/// Sums of one pair of strata.
#[derive(Debug, Clone, PartialEq)]
pub struct PairSums {
    /// Differentiation and change.
    pub change: TwoWay<PairTerms>,
    /// Alleles seen in the first.
    pub alleles_from: u64,
    /// Of these, alleles not seen in the second.
    pub not_seen_again: u64,
    /// Loci that vary in the first and show one allele in the second.
    pub loci_fixed: u64,
}

/// Everything that is summed over loci.
#[derive(Debug, Clone)]
pub struct Sums {
    scheme: Arc<Scheme>,
    /// By stratum.
    pub strata: Vec<StratumSums>,
    /// By pair of the scheme.
    pub pairs: Vec<PairSums>,
    /// By visit of the scheme, then stratum of that visit.
    pub private: Vec<Vec<TwoWay<PrivateTerms>>>,
    /// Genotypes at a sample of loci.
    pub panel: Panel,
    /// Records added.
    pub kept: u64,
    /// Records that vary among all individuals in use.
    pub polymorphic: u64,
    scratch: Scratch,
}

/// Reused buffers; hold nothing between loci that a result depends on.
#[derive(Debug, Clone)]
struct Scratch {
    counts: Vec<Counts>,
    classes: Vec<GenotypeClasses>,
    usable: Vec<bool>,
    rarefaction: Rarefaction,
    hardy_weinberg: HardyWeinbergCache,
    fixed: Vec<i64>,
    rows: Vec<i64>,
}

/// What was found at the locus just added, for the per-locus table.
#[derive(Debug)]
pub struct LocusView<'a> {
    /// Counts by stratum.
    pub counts: &'a [Counts],
    /// Whether the locus counts in the stratum.
    pub usable: &'a [bool],
    /// Whether it varies among all individuals in use.
    pub polymorphic: bool,
}

impl Sums {
    /// Empty sums: the identity of [`Sums::merge`] for this scheme.
    pub fn new(scheme: Arc<Scheme>) -> Self {
        let most = scheme.most_windows();
        let range = |s: usize| scheme.strata[s].clone();
        let strata = (0..scheme.strata.len())
            .map(|s| StratumSums {
                diversity: TwoWay::new(vec![0..range(s).len()], most),
                typed_genotypes: 0,
                hardy_weinberg: PValueHistogram::default(),
            })
            .collect::<Vec<_>>();
        let side_by_side = |members: &[usize]| {
            let mut start = 0;
            let group = |&s: &usize| {
                let group = start..start + range(s).len();
                start = group.end;
                group
            };
            members.iter().map(group).collect::<Vec<_>>()
        };
        let pairs = scheme
            .pairs
            .iter()
            .map(|&(from, to)| PairSums {
                change: TwoWay::new(side_by_side(&[from, to]), most),
                alleles_from: 0,
                not_seen_again: 0,
                loci_fixed: 0,
            })
            .collect();
        let private = scheme
            .visits
            .iter()
            .map(|v| {
                v.iter()
                    .map(|_| TwoWay::new(side_by_side(v), most))
                    .collect()
            })
            .collect();
        let scratch = Scratch {
            counts: vec![Counts::default(); strata.len()],
            classes: vec![GenotypeClasses::default(); strata.len()],
            usable: vec![false; strata.len()],
            rarefaction: Rarefaction::new(scheme.gene_copies),
            hardy_weinberg: HardyWeinbergCache::default(),
            fixed: vec![0; 64],
            rows: Vec::new(),
        };
        Sums {
            strata,
            pairs,
            private,
            panel: Panel::default(),
            kept: 0,
            polymorphic: 0,
            scratch,
            scheme,
        }
    }

    /// The scheme these sums follow.
    pub fn scheme(&self) -> &Scheme {
        &self.scheme
    }

    /// Adds one locus.
    pub fn add(&mut self, locus: &Locus) -> LocusView<'_> {
        let scheme = Arc::clone(&self.scheme);
        self.kept += 1;
        for (s, slots) in scheme.strata.iter().enumerate() {
            self.scratch.counts[s].recount(&locus.genotypes, slots.clone());
            let typed = self.scratch.counts[s].typed;
            self.strata[s].typed_genotypes += u64::from(typed);
            self.scratch.usable[s] = scheme.counts_in(s, typed);
        }
        let polymorphic = varies(&self.scratch.counts);
        if polymorphic {
            self.polymorphic += 1;
            self.panel.offer(locus);
            self.add_polymorphic(locus, &scheme);
        } else {
            self.add_site(locus);
        }
        LocusView {
            counts: &self.scratch.counts,
            usable: &self.scratch.usable,
            polymorphic,
        }
    }

    /// Adds the sums of another worker or shard of the same scheme.
    pub fn merge(&mut self, other: Sums) {
        for (a, b) in self.strata.iter_mut().zip(other.strata) {
            a.diversity.merge(b.diversity);
            a.typed_genotypes += b.typed_genotypes;
            a.hardy_weinberg.merge(&b.hardy_weinberg);
        }
        for (a, b) in self.pairs.iter_mut().zip(other.pairs) {
            a.change.merge(b.change);
            a.alleles_from += b.alleles_from;
            a.not_seen_again += b.not_seen_again;
            a.loci_fixed += b.loci_fixed;
        }
        for (a, b) in self
            .private
            .iter_mut()
            .flatten()
            .zip(other.private.into_iter().flatten())
        {
            a.merge(b);
        }
        self.panel.merge(other.panel);
        self.kept += other.kept;
        self.polymorphic += other.polymorphic;
    }

    /// Moves everything into the totals; must be called before reading.
    pub fn flush(&mut self) {
        self.strata.iter_mut().for_each(|s| s.diversity.flush());
        self.pairs.iter_mut().for_each(|p| p.change.flush());
        self.private.iter_mut().flatten().for_each(TwoWay::flush);
    }

    /// A record without variation counts as a site and nothing else.
    fn add_site(&mut self, locus: &Locus) {
        let site = StratumTerms {
            sites: 1.0,
            ..StratumTerms::default()
        };
        for (s, sums) in self.strata.iter_mut().enumerate() {
            if self.scratch.usable[s] {
                let fixed = &mut self.scratch.fixed[..StratumTerms::LEN];
                sums.diversity
                    .add(locus.contig_hash, locus.position, &site, fixed);
            }
        }
    }

    fn add_polymorphic(&mut self, locus: &Locus, scheme: &Scheme) {
        let Scratch {
            counts,
            classes,
            usable,
            rarefaction,
            hardy_weinberg,
            fixed,
            rows,
        } = &mut self.scratch;
        for (s, slots) in scheme.strata.iter().enumerate() {
            classes[s].refill(&locus.genotypes, slots.clone());
        }
        let seed = locus.contig_hash ^ locus.position;
        let mut at = Place {
            locus,
            scheme,
            classes,
            fixed,
            rows,
        };
        for (s, sums) in self
            .strata
            .iter_mut()
            .enumerate()
            .filter(|(s, _)| usable[*s])
        {
            at.add(&mut sums.diversity, counts, &[s], |c| {
                stratum_terms(&c[s], rarefaction)
            });
            if counts[s].alleles_seen() > 1 {
                let HardyWeinbergOutcome { mid_p, excess } =
                    hardy_weinberg.test(&counts[s], &at.classes[s].classes, seed);
                sums.hardy_weinberg.add(mid_p, excess);
            }
        }
        for (sums, &(from, to)) in self.pairs.iter_mut().zip(&scheme.pairs) {
            if usable[from] && usable[to] {
                at.add(&mut sums.change, counts, &[from, to], |c| {
                    pair_terms(&c[from], &c[to], rarefaction)
                });
                let seen = fates(&counts[from], &counts[to]);
                sums.alleles_from += seen.0;
                sums.not_seen_again += seen.1;
                sums.loci_fixed += u64::from(seen.2);
            }
        }
        for (members, visit) in self.private.iter_mut().zip(&scheme.visits) {
            if visit.iter().all(|&s| usable[s]) {
                for (which, sums) in members.iter_mut().enumerate() {
                    at.add(sums, counts, visit, |c| {
                        private_terms(which, visit, c, rarefaction)
                    });
                }
            }
        }
    }
}

/// One locus on its way into the sums.
struct Place<'a> {
    locus: &'a Locus,
    scheme: &'a Scheme,
    classes: &'a [GenotypeClasses],
    fixed: &'a mut [i64],
    rows: &'a mut Vec<i64>,
}

impl Place<'_> {
    /// Adds the terms, and for every genotype class of every member stratum what leaving out one
    /// individual of that class changes.
    fn add<T: Terms>(
        &mut self,
        sums: &mut TwoWay<T>,
        counts: &mut [Counts],
        members: &[usize],
        mut terms: impl FnMut(&[Counts]) -> T,
    ) {
        let fixed = &mut self.fixed[..T::LEN];
        sums.add(
            self.locus.contig_hash,
            self.locus.position,
            &terms(counts),
            fixed,
        );
        let mut first = 0;
        for &s in members {
            let classes = &self.classes[s].classes;
            self.rows.clear();
            self.rows.resize((classes.len() + 1) * T::LEN, 0);
            for (row, &(genotype, individuals)) in self.rows.chunks_exact_mut(T::LEN).zip(classes) {
                if individuals > 0 {
                    counts[s].remove(genotype);
                    TwoWay::absence_row(&terms(counts), fixed, row);
                    counts[s].add(genotype);
                }
            }
            let slots = self.scheme.strata[s].clone();
            let individuals = slots.len();
            let genotypes: &Genotypes = &self.locus.genotypes;
            if genotypes.is_biallelic() {
                sums.add_absences(first, &genotypes.dosages()[slots], self.rows);
            } else {
                sums.add_absences(first, &self.classes[s].of_individual, self.rows);
            }
            first += individuals;
        }
    }
}

/// Whether at least two alleles are seen among all strata.
fn varies(counts: &[Counts]) -> bool {
    let alleles = counts.first().map_or(0, |c| c.copies.len());
    let seen = |a: &usize| counts.iter().any(|c| c.copies[*a] > 0);
    (0..alleles).filter(seen).nth(1).is_some()
}

/// Alleles of the first, those of them not seen in the second, and whether a locus that varied in
/// the first shows a single allele in the second.
fn fates(from: &Counts, to: &Counts) -> (u64, u64, bool) {
    let (mut seen, mut gone) = (0, 0);
    for (&before, &after) in from.copies.iter().zip(&to.copies) {
        seen += u64::from(before > 0);
        gone += u64::from(before > 0 && after == 0);
    }
    (seen, gone, seen > 1 && to.alleles_seen() == 1)
}
