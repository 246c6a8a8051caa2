//! All sums of one run: what a worker fills locus by locus, what shards add up.

use std::sync::Arc;

use serde::{Deserialize, Serialize};

use super::carriers::Carriers;
use super::entry::{Buffers, Entry};
use super::fates::Fates;
use super::gram::{GramAbsent, GramStratum};
use super::histogram::PValueHistogram;
use super::panel::Panel;
use super::scheme::{Pair, Scheme};
use super::spectrum::Spectrum;
use super::two_way::TwoWay;
use crate::locus::hardy_weinberg::{HardyWeinbergCache, test_many_alleles};
use crate::locus::richness::Rarefaction;
use crate::locus::{
    Counts, GenotypeClasses, PairTerms, PrivateTerms, StratumLanes, StratumTerms, pair_terms,
    private_terms, stratum_terms,
};
use crate::model::{Genotypes, Locus, MISSING_ALLELE, MISSING_DOSAGE};

/// Tables of a multi-allelic locus that are visited one by one before its Hardy-Weinberg test turns to
/// shuffling: about a millisecond's work, since whole genomes hold many such loci.
const TABLE_BUDGET: u64 = 20_000;
/// Shuffles of that test: a standard error below 0.0022 at p = 0.05.
const SHUFFLES: u32 = 10_000;

/// Sums of one stratum.
#[derive(Debug, Clone, Serialize, Deserialize)]
pub struct StratumSums {
    /// Diversity.
    pub diversity: TwoWay<StratumTerms>,
    /// Typed genotypes over all kept records, whether the locus counts in the stratum or not.
    pub typed_genotypes: u64,
    /// Exact Hardy-Weinberg tests of the loci that vary in the stratum.
    pub hardy_weinberg: PValueHistogram,
    /// What linkage between all pairs of loci follows from, or why it is not kept.
    pub linkage: Result<GramStratum, GramAbsent>,
}

/// Sums of one pair of strata.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct PairSums {
    /// Differentiation and change.
    pub change: TwoWay<PairTerms>,
    /// What became of the alleles of the first; nothing is added for two populations.
    pub fates: Fates,
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
    /// Frequency spectra, by latest stratum of the scheme.
    pub spectra: Vec<Spectrum>,
    /// Alleles in few carriers, by latest stratum of the scheme.
    pub carriers: Vec<Carriers>,
    /// Genotypes at a sample of loci.
    pub panel: Panel,
    /// Kept records at which each individual is typed, by slot.
    pub typed_records: Vec<u64>,
    /// Of the records that vary among all individuals in use, those at which each is typed.
    pub typed_polymorphic: Vec<u64>,
    /// And those at which it is heterozygous.
    pub heterozygous: Vec<u64>,
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
    /// Filled at loci with two alleles.
    lanes: Vec<StratumLanes>,
    usable: Vec<bool>,
    rarefaction: Rarefaction,
    hardy_weinberg: HardyWeinbergCache,
    buffers: Buffers,
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
        let side_by_side = |members: &[usize]| {
            let mut start = 0;
            let group = |&s: &usize| {
                let group = start..start + range(s).len();
                start = group.end;
                group
            };
            members.iter().map(group).collect::<Vec<_>>()
        };
        let strata = (0..scheme.strata.len())
            .map(|s| StratumSums {
                diversity: TwoWay::new(side_by_side(&[s]), most),
                typed_genotypes: 0,
                hardy_weinberg: PValueHistogram::default(),
                linkage: GramStratum::new(range(s).len()),
            })
            .collect::<Vec<_>>();
        let pairs = scheme
            .pairs
            .iter()
            .map(|pair| PairSums {
                change: TwoWay::new(side_by_side(&[pair.from, pair.to]), most),
                fates: Fates::new(scheme.most_listed),
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
        let carriers: Vec<Carriers> = scheme
            .latest
            .iter()
            .map(|&s| Carriers::new(range(s), scheme.most_listed))
            .collect();
        let scratch = Scratch {
            counts: vec![Counts::default(); strata.len()],
            classes: vec![GenotypeClasses::default(); strata.len()],
            lanes: vec![StratumLanes::default(); strata.len()],
            usable: vec![false; strata.len()],
            rarefaction: Rarefaction::new(scheme.gene_copies),
            hardy_weinberg: HardyWeinbergCache::default(),
            buffers: Buffers::default(),
        };
        Sums {
            strata,
            pairs,
            private,
            spectra: vec![Spectrum::default(); carriers.len()],
            carriers,
            panel: Panel::default(),
            typed_records: vec![0; scheme.slots()],
            typed_polymorphic: vec![0; scheme.slots()],
            heterozygous: vec![0; scheme.slots()],
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
        count_typed(&locus.genotypes, &mut self.typed_records);
        for (s, slots) in scheme.strata.iter().enumerate() {
            self.scratch.counts[s].recount(&locus.genotypes, slots.clone());
            let typed = self.scratch.counts[s].typed;
            self.strata[s].typed_genotypes += u64::from(typed);
            self.scratch.usable[s] = scheme.counts_in(s, typed);
        }
        let polymorphic = varies(&self.scratch.counts);
        if polymorphic {
            self.polymorphic += 1;
            count_typed(&locus.genotypes, &mut self.typed_polymorphic);
            count_heterozygous(&locus.genotypes, &mut self.heterozygous);
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
            // Both sides have the same individuals, so both have matrices or neither has.
            if let (Ok(a), Ok(b)) = (&mut a.linkage, b.linkage) {
                a.merge(b);
            }
        }
        for (a, b) in self.pairs.iter_mut().zip(other.pairs) {
            a.change.merge(b.change);
            a.fates.merge(b.fates);
        }
        for (a, b) in self
            .private
            .iter_mut()
            .flatten()
            .zip(other.private.into_iter().flatten())
        {
            a.merge(b);
        }
        for (a, b) in self.spectra.iter_mut().zip(other.spectra) {
            a.merge(b);
        }
        for (a, b) in self.carriers.iter_mut().zip(other.carriers) {
            a.merge(b);
        }
        self.panel.merge(other.panel);
        for (mine, theirs) in [
            (&mut self.typed_records, other.typed_records),
            (&mut self.typed_polymorphic, other.typed_polymorphic),
            (&mut self.heterozygous, other.heterozygous),
        ] {
            mine.iter_mut().zip(theirs).for_each(|(a, b)| *a += b);
        }
        self.kept += other.kept;
        self.polymorphic += other.polymorphic;
    }

    /// As [`Sums::flush`], with nothing waiting anywhere, as far as storing needs it.
    pub(super) fn settle(&mut self) {
        self.flush();
        for stratum in &mut self.strata {
            if let Ok(linkage) = &mut stratum.linkage {
                linkage.flush();
            }
        }
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
        let mut entry = Entry {
            locus,
            classes: &[],
            buffers: &mut self.scratch.buffers,
        };
        for (s, sums) in self.strata.iter_mut().enumerate() {
            if self.scratch.usable[s] {
                entry.add_terms(&mut sums.diversity, &site);
            }
        }
    }

    fn add_polymorphic(&mut self, locus: &Locus, scheme: &Scheme) {
        let Scratch {
            counts,
            classes,
            lanes,
            usable,
            rarefaction,
            hardy_weinberg,
            buffers,
        } = &mut self.scratch;
        let biallelic = locus.genotypes.is_biallelic();
        for (s, slots) in scheme.strata.iter().enumerate() {
            classes[s].refill(&locus.genotypes, slots.clone(), &counts[s]);
            if biallelic {
                lanes[s].refill(counts[s].dosage_classes(), rarefaction);
            }
        }
        let seed = locus.contig_hash ^ locus.position;
        let mut entry = Entry {
            locus,
            classes,
            buffers,
        };
        for (s, sums) in self
            .strata
            .iter_mut()
            .enumerate()
            .filter(|(s, _)| usable[*s])
        {
            if biallelic {
                entry.add_lanes(&mut sums.diversity, &[s], &lanes[s].terms().columns());
            } else {
                entry.add(&mut sums.diversity, &[s], |left_out| {
                    recounted(counts, classes, &[s], left_out, |c| {
                        stratum_terms(&c[s], rarefaction)
                    })
                });
            }
            if let Ok(linkage) = &mut sums.linkage {
                let slots = scheme.strata[s].clone();
                linkage.add(locus.contig_hash, &locus.genotypes, slots, &counts[s]);
            }
            let test = match counts[s].alleles_seen() {
                0 | 1 => None,
                2 => hardy_weinberg
                    .mid_p(&counts[s])
                    .map(|t| (t.mid_p, t.direction)),
                _ => test_many_alleles(&classes[s].classes, TABLE_BUDGET, SHUFFLES, seed)
                    .map(|t| (t.mid_p, t.direction)),
            };
            if let Some((mid_p, direction)) = test {
                sums.hardy_weinberg.add(mid_p, direction);
            }
        }
        for (sums, &Pair { from, to, in_time }) in self.pairs.iter_mut().zip(&scheme.pairs) {
            if !(usable[from] && usable[to]) {
                continue;
            }
            if biallelic {
                let terms = lanes[from].pair_terms(&lanes[to]);
                entry.add_lanes(&mut sums.change, &[from, to], &terms.columns());
            } else {
                entry.add(&mut sums.change, &[from, to], |left_out| {
                    recounted(counts, classes, &[from, to], left_out, |c| {
                        pair_terms(&c[from], &c[to], rarefaction)
                    })
                });
            }
            if in_time {
                sums.fates.add(locus, &counts[from], &counts[to]);
            }
        }
        let latest = self
            .carriers
            .iter_mut()
            .zip(&mut self.spectra)
            .zip(&scheme.latest);
        for ((carriers, spectrum), &s) in latest {
            carriers.add(locus, &counts[s]);
            if usable[s] {
                spectrum.add(&counts[s]);
            }
        }
        for (members, visit) in self.private.iter_mut().zip(&scheme.visits) {
            if !visit.iter().all(|&s| usable[s]) {
                continue;
            }
            let beside: Vec<&StratumLanes> = visit.iter().map(|&s| &lanes[s]).collect();
            for (which, sums) in members.iter_mut().enumerate() {
                entry.add(sums, visit, |left_out| {
                    if biallelic {
                        return StratumLanes::private_terms(which, &beside, left_out);
                    }
                    recounted(counts, classes, visit, left_out, |c| {
                        private_terms(which, visit, c, rarefaction)
                    })
                });
            }
        }
    }
}

/// The terms of counts from which one individual may be left out: (member, class), as in
/// [`Entry::add`].
fn recounted<T>(
    counts: &mut [Counts],
    classes: &[GenotypeClasses],
    members: &[usize],
    left_out: Option<(usize, usize)>,
    terms: impl FnOnce(&[Counts]) -> T,
) -> T {
    let Some((member, class)) = left_out else {
        return terms(counts);
    };
    let stratum = members[member];
    let (genotype, _) = classes[stratum].classes[class];
    counts[stratum].remove(genotype);
    let value = terms(counts);
    counts[stratum].add(genotype);
    value
}

/// Adds one for each individual that is typed.
fn count_typed(genotypes: &Genotypes, typed: &mut [u64]) {
    if genotypes.is_biallelic() {
        for (n, &dosage) in typed.iter_mut().zip(genotypes.dosages()) {
            *n += u64::from(dosage != MISSING_DOSAGE);
        }
    } else {
        for (n, pair) in typed.iter_mut().zip(genotypes.pairs()) {
            *n += u64::from(pair[0] != MISSING_ALLELE);
        }
    }
}

/// Adds one for each individual that is heterozygous.
fn count_heterozygous(genotypes: &Genotypes, heterozygous: &mut [u64]) {
    if genotypes.is_biallelic() {
        for (n, &dosage) in heterozygous.iter_mut().zip(genotypes.dosages()) {
            *n += u64::from(dosage == 1);
        }
    } else {
        for (n, pair) in heterozygous.iter_mut().zip(genotypes.pairs()) {
            *n += u64::from(pair[0] != pair[1]);
        }
    }
}

/// Whether at least two alleles are seen among all strata.
fn varies(counts: &[Counts]) -> bool {
    let alleles = counts.first().map_or(0, |c| c.copies.len());
    let seen = |a: &usize| counts.iter().any(|c| c.copies[*a] > 0);
    (0..alleles).filter(seen).nth(1).is_some()
}
