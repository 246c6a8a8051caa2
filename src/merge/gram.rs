//! Sums over loci of individual x individual matrices, from which linkage between ALL pairs of loci
//! follows without any pair being formed.
//!
//! Per stratum, contig and [`FrequencyCutoff`], over loci with unit vectors z of centred dosages
//! (0 where missing), typed masks m, n typed, a = 1/(n-1), b = a/n, h = a (1 - 2/n):
//!
//! ```text
//! G = sum z z'   B = sum b m m'   H = sum h m m'   p = sum a m   q = sum b m   k = loci
//! ```
//!
//! A locus with k kept alleles, k > 2, gives one vector an allele with weight (k-1)/k and enters the
//! other sums k-1 times, so that a pair of loci weighs (k1-1)(k2-1) as usual; two alleles give one
//! vector, because both say the same.
//!
//! # Exactness
//!
//! The state is made of integers only, so it is the same for any order of loci, any number of
//! threads and any sharding. z is rounded to multiples of 2^-22, b and h to multiples of 2^-43. A
//! batch of 256 rows is multiplied in f64: every product of two cells of z is an integer of at most
//! 2^44, so every partial sum is an integer of at most 2^52, which f64 holds exactly whatever the
//! order and whether or not the processor fuses multiply and add. h (k-1) < 1 and b (k-1) <= 1/10,
//! because n >= 10 typed individuals show at most n alleles that are no singletons; they are added as
//! integers below 2^43. Batches are added up in i64, and in i128 beyond 2^18 rows. Rounding moves
//! the excess of linkage over sampling by less than 1e-7 of itself (measured in the tests).
//!
//! # Memory
//!
//! At most `contig_groups(S) x bins x S (S + 1)/2 x 8` bytes for complete data, 3 times that with
//! missing genotypes, twice that beyond 262 144 loci in one contig; bins are the sets of cutoffs that
//! loci pass, at most 7 and in practice 3. Independent of the number of loci.

mod batch;
mod missing;
mod pairs;
mod sums;
#[cfg(test)]
mod tests;

use std::collections::BTreeMap;
use std::fmt;
use std::ops::Range;

use serde::{Deserialize, Serialize};

use crate::locus::Counts;
use crate::model::Genotypes;

use batch::{LocusWeights, Product, TERM_BITS, VECTOR_BITS, WEIGHT_BITS, Workbench, power_of_two};
use missing::MissingSums;
pub use pairs::{ContigPairs, PairSums};
use sums::{BinSums, ContigSums, TypedTally};

/// The most individuals of one stratum for which matrices are kept: beyond, time and memory grow
/// with the square while the precision gained is small beside that of the loci.
pub const MAXIMUM_INDIVIDUALS: usize = 1000;
/// The fewest individuals between which a correlation is formed.
pub const MINIMUM_INDIVIDUALS: usize = 3;
/// A locus takes part when at least so many individuals are typed (or all, in smaller strata).
pub const MINIMUM_TYPED: usize = 10;
/// The most groups in which contigs are kept apart.
pub const MAXIMUM_CONTIG_GROUPS: usize = 64;

/// Which alleles take part. Rare alleles bias linkage estimates of Ne (Waples & Do 2010), so every
/// estimate names its cutoff.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum FrequencyCutoff {
    /// Alleles of frequency 0.05 or more among the typed of the stratum.
    FivePercent,
    /// Alleles of frequency 0.02 or more.
    TwoPercent,
    /// Alleles seen more than once.
    NoSingletons,
}

impl FrequencyCutoff {
    /// Every cutoff, the strictest first.
    pub const ALL: [FrequencyCutoff; 3] = [
        FrequencyCutoff::FivePercent,
        FrequencyCutoff::TwoPercent,
        FrequencyCutoff::NoSingletons,
    ];

    /// Whether an allele of `copies` copies among `gene_copies` takes part; in integers, so that a
    /// frequency of exactly the limit does.
    pub fn keeps(self, copies: u32, gene_copies: u32) -> bool {
        let (copies, gene_copies) = (u64::from(copies), u64::from(gene_copies));
        match self {
            FrequencyCutoff::FivePercent => copies > 0 && 20 * copies >= gene_copies,
            FrequencyCutoff::TwoPercent => copies > 0 && 50 * copies >= gene_copies,
            FrequencyCutoff::NoSingletons => copies > 1,
        }
    }

    /// The lowest frequency that takes part; `None` where the limit is one copy.
    pub fn frequency(self) -> Option<f64> {
        match self {
            FrequencyCutoff::FivePercent => Some(0.05),
            FrequencyCutoff::TwoPercent => Some(0.02),
            FrequencyCutoff::NoSingletons => None,
        }
    }

    fn bit(self) -> u8 {
        1 << self as u8
    }
}

/// Why a stratum has no matrices.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub enum GramAbsent {
    /// Fewer individuals than [`MINIMUM_INDIVIDUALS`].
    TooFewIndividuals(usize),
    /// More individuals than [`MAXIMUM_INDIVIDUALS`].
    TooManyIndividuals(usize),
}

impl fmt::Display for GramAbsent {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            GramAbsent::TooFewIndividuals(n) => write!(
                f,
                "{n} individuals sampled; linkage needs at least {MINIMUM_INDIVIDUALS}"
            ),
            GramAbsent::TooManyIndividuals(n) => write!(
                f,
                "{n} individuals sampled; linkage is computed for at most {MAXIMUM_INDIVIDUALS} \
                 a sample: list a random subset"
            ),
        }
    }
}

/// How many groups of contigs are kept apart for a stratum: 64 up to 256 individuals, then fewer
/// (at least 8), so that memory stays within that of 256 individuals or 8 matrices.
pub fn contig_groups(individuals: usize) -> usize {
    let within_memory = MAXIMUM_CONTIG_GROUPS * 256 * 256 / individuals.max(1).pow(2);
    within_memory.clamp(8, MAXIMUM_CONTIG_GROUPS)
}

/// The rule by which a locus takes part: enough typed individuals.
pub(crate) fn enough_typed(typed: u32, individuals: usize) -> bool {
    typed as usize >= MINIMUM_TYPED.min(individuals)
}

/// The matrices of one stratum. [`GramStratum::merge`] is commutative and associative, with a new
/// one as identity, bit for bit.
#[derive(Debug, Clone, Serialize, Deserialize)]
pub struct GramStratum {
    individuals: usize,
    /// Keyed by contig hash, or by its remainder once there were more than [`contig_groups`].
    contigs: BTreeMap<u64, ContigSums>,
    folded: bool,
    #[serde(skip)]
    workbench: Workbench,
    #[serde(skip)]
    sets: AlleleSets,
}

impl GramStratum {
    /// No locus yet, for a stratum of `individuals`.
    pub fn new(individuals: usize) -> Result<Self, GramAbsent> {
        match individuals {
            n if n < MINIMUM_INDIVIDUALS => Err(GramAbsent::TooFewIndividuals(n)),
            n if n > MAXIMUM_INDIVIDUALS => Err(GramAbsent::TooManyIndividuals(n)),
            n => Ok(GramStratum {
                individuals: n,
                contigs: BTreeMap::new(),
                folded: false,
                workbench: Workbench::new(n),
                sets: AlleleSets::default(),
            }),
        }
    }

    /// Whether both are of as many individuals, each matrix of their size.
    pub(super) fn same_shape(&self, other: &GramStratum) -> bool {
        let n = self.individuals;
        other.individuals == n && other.contigs.values().all(|sums| sums.has_size(n))
    }

    /// Whether there are no more groups of contigs than are kept, and their sums can be added up further.
    pub(super) fn is_bounded(&self) -> bool {
        let most = contig_groups(self.individuals);
        self.contigs.len() <= most
            && (!self.folded || self.contigs.keys().all(|&key| key < most as u64))
            && self.contigs.values().all(ContigSums::is_bounded)
    }

    /// Individuals of the stratum.
    pub fn individuals(&self) -> usize {
        self.individuals
    }

    /// Adds a locus: its genotypes, the slots of this stratum in them, and their counts. Loci of
    /// which fewer than two alleles pass any cutoff, or with too few typed, add nothing.
    ///
    /// # Panics
    /// When `slots` is not as long as the stratum.
    pub fn add(
        &mut self,
        contig_hash: u64,
        genotypes: &Genotypes,
        slots: Range<usize>,
        counts: &Counts,
    ) {
        assert_eq!(slots.len(), self.individuals, "slots of another stratum");
        if !enough_typed(counts.typed, self.individuals) {
            return;
        }
        if self.workbench.contig() != Some(contig_hash) {
            self.flush();
            self.workbench.set_contig(contig_hash);
        }
        let key = self.key(contig_hash);
        self.sets.refill(counts);
        for (mask, alleles) in self.sets.sets() {
            let rows = LocusRows {
                genotypes,
                slots: slots.clone(),
                counts,
                alleles,
            };
            let sums = self
                .contigs
                .entry(key)
                .or_default()
                .bin_mut(mask, self.individuals);
            self.workbench.add(mask, &rows, sums);
        }
        self.fold_when_many();
    }

    /// Adds another part of the same stratum.
    ///
    /// # Panics
    /// When the other has another number of individuals.
    pub fn merge(&mut self, mut other: GramStratum) {
        assert_eq!(
            self.individuals, other.individuals,
            "matrices of another stratum"
        );
        self.flush();
        other.flush();
        if other.folded {
            self.fold();
        }
        for (hash, sums) in other.contigs {
            let key = self.key(hash);
            self.contigs.entry(key).or_default().merge(sums);
        }
        self.fold_when_many();
    }

    /// Linkage sums over every pair of contigs, and within each, of the loci that pass a cutoff.
    pub fn pairs(&mut self, cutoff: FrequencyCutoff) -> ContigPairs {
        self.flush();
        ContigPairs::of(self.individuals, self.folded, &self.contigs, cutoff.bit())
    }

    fn key(&self, contig_hash: u64) -> u64 {
        if self.folded {
            contig_hash % contig_groups(self.individuals) as u64
        } else {
            contig_hash
        }
    }

    /// Empties the workbench into the sums of its contig.
    pub(super) fn flush(&mut self) {
        if let Some(contig) = self.workbench.contig() {
            let key = self.key(contig);
            if let Some(sums) = self.contigs.get_mut(&key) {
                self.workbench.flush(sums);
            }
        }
    }

    /// Folds once the contigs outnumber the groups. Whether that happens depends on the set of
    /// contigs only, never on their order, and a folded sum is the same whenever it was folded.
    fn fold_when_many(&mut self) {
        if !self.folded && self.contigs.len() > contig_groups(self.individuals) {
            self.fold();
        }
    }

    /// Groups contigs by remainder. Two contigs in one group lose the pairs between them, which
    /// leaves estimates unbiased.
    fn fold(&mut self) {
        if self.folded {
            return;
        }
        self.flush();
        self.folded = true;
        for (hash, sums) in std::mem::take(&mut self.contigs) {
            let key = self.key(hash);
            self.contigs.entry(key).or_default().merge(sums);
        }
    }
}

/// Equal when the sums are; what waits on the workbench is counted in.
impl PartialEq for GramStratum {
    fn eq(&self, other: &Self) -> bool {
        let (mut a, mut b) = (self.clone(), other.clone());
        a.flush();
        b.flush();
        a.individuals == b.individuals && a.folded == b.folded && a.contigs == b.contigs
    }
}

/// One locus as the workbench takes it: the alleles that pass one set of cutoffs.
struct LocusRows<'a> {
    genotypes: &'a Genotypes,
    slots: Range<usize>,
    counts: &'a Counts,
    /// Codes of the alleles that make a row. One allele stands for both of a two-allele locus.
    alleles: &'a [u16],
}

impl LocusRows<'_> {
    /// Kept alleles less one: how often the locus counts beside its rows.
    fn weight(&self) -> u64 {
        (self.alleles.len() as u64 - 1).max(1)
    }

    /// The individuals that are not typed, counted within the stratum.
    fn absent(&self) -> impl Iterator<Item = usize> + '_ {
        let slots = self.slots.clone();
        let start = slots.start;
        slots
            .filter(|&slot| self.genotypes.pair(slot).is_none())
            .map(move |slot| slot - start)
    }

    /// The weight of a row: (k-1)/k, or 1 where one row stands for both alleles.
    fn row_weight(&self) -> f64 {
        match self.alleles.len() {
            1 => 1.0,
            k => (k - 1) as f64 / k as f64,
        }
    }
}

/// The sets of alleles of a locus that pass the cutoffs. Cutoffs with the same set share one entry,
/// so common loci are added once; a mask of cutoff bits says which.
#[derive(Debug, Clone, Default)]
struct AlleleSets {
    masks: [u8; 3],
    ends: [usize; 3],
    alleles: Vec<u16>,
}

impl AlleleSets {
    /// Takes the sets of a locus.
    fn refill(&mut self, counts: &Counts) {
        self.alleles.clear();
        for (i, cutoff) in FrequencyCutoff::ALL.into_iter().enumerate() {
            push_row_alleles(counts, cutoff, &mut self.alleles);
            self.ends[i] = self.alleles.len();
            self.masks[i] = cutoff.bit();
            self.share_with_earlier(i);
        }
    }

    /// Gives the cutoff of set `i` to an earlier, equal set.
    fn share_with_earlier(&mut self, i: usize) {
        for j in 0..i {
            if self.masks[j] != 0 && self.range(j).len() == self.range(i).len() {
                let same = self.alleles[self.range(j)] == self.alleles[self.range(i)];
                if same {
                    self.masks[j] |= self.masks[i];
                    self.masks[i] = 0;
                    return;
                }
            }
        }
    }

    fn range(&self, i: usize) -> Range<usize> {
        let start = if i == 0 { 0 } else { self.ends[i - 1] };
        start..self.ends[i]
    }

    /// Mask of cutoffs and allele codes of every set that is not empty.
    fn sets(&self) -> impl Iterator<Item = (u8, &[u16])> {
        (0..3)
            .map(|i| (self.masks[i], &self.alleles[self.range(i)]))
            .filter(|(mask, alleles)| *mask != 0 && !alleles.is_empty())
    }
}

/// Appends the codes of the alleles that make a row: those that pass the cutoff and vary (an allele
/// that all typed individuals carry once correlates with nothing), where there are two and more; at
/// a locus of two alleles one stands for both.
pub(crate) fn push_row_alleles(counts: &Counts, cutoff: FrequencyCutoff, rows: &mut Vec<u16>) {
    let start = rows.len();
    rows.extend((0..counts.copies.len() as u16).filter(|&a| {
        cutoff.keeps(counts.copies[a as usize], counts.gene_copies())
            && squared_length(counts, a) > 0
    }));
    match (counts.alleles_seen(), rows.len() - start) {
        (_, 0 | 1) => rows.truncate(start),
        (2, 2) => rows.truncate(start + 1),
        _ => {}
    }
}

/// n sum x^2 - (sum x)^2 over the typed, x copies of the allele: n times the squared length of the
/// centred dosages, an integer.
fn squared_length(counts: &Counts, allele: u16) -> u64 {
    let n = u64::from(counts.typed);
    let copies = u64::from(counts.copies[allele as usize]);
    let squares = 2 * copies - u64::from(counts.heterozygous[allele as usize]);
    n * squares - copies * copies
}
