//! One locus and the genotypes of the individuals in use.

use serde::{Deserialize, Serialize};

/// The allele code of a missing genotype in [`Genotypes::pair`]'s storage.
pub const MISSING_ALLELE: u16 = u16::MAX;
/// The dosage code of a missing genotype of a biallelic locus.
pub const MISSING_DOSAGE: u8 = 3;

/// Most alleles of a locus, the reference included; a record that lists more is set aside.
pub const MAX_ALLELES: usize = 4096;

/// One record of the calls, owned by the caller and refilled: nothing is allocated per locus.
#[derive(Debug, Clone, Default)]
pub struct Locus {
    /// Contig name as written.
    pub contig: String,
    /// [`crate::model::stable_hash`] of the contig name.
    pub contig_hash: u64,
    /// 1-based position; 0 is the telomere before the first base.
    pub position: u64,
    /// Identifier as written, empty when absent.
    pub id: String,
    /// 1-based number of the record among all records of its file.
    pub record: u64,
    /// Unordered diploid genotypes of the individuals in use, by slot.
    pub genotypes: Genotypes,
    allele_text: Vec<u8>,
    allele_ends: Vec<u32>,
}

impl Locus {
    /// Forgets the alleles of the record before.
    pub fn clear_alleles(&mut self) {
        self.allele_text.clear();
        self.allele_ends.clear();
    }

    /// Adds the next allele: the reference first, then each alternate.
    pub fn push_allele(&mut self, text: &[u8]) {
        self.allele_text.extend_from_slice(text);
        self.allele_ends.push(self.allele_text.len() as u32);
    }

    /// Number of alleles the record lists, the reference included.
    pub fn allele_count(&self) -> usize {
        self.allele_ends.len()
    }

    /// The text of allele `i` (0 is the reference), or `None` beyond the list.
    pub fn allele(&self, i: usize) -> Option<&[u8]> {
        let end = *self.allele_ends.get(i)? as usize;
        let start = if i == 0 {
            0
        } else {
            self.allele_ends[i - 1] as usize
        };
        Some(&self.allele_text[start..end])
    }
}

/// Diploid genotypes by slot (see [`crate::model::Strata`]): one stratum is one contiguous range.
///
/// Up to two listed alleles, genotypes are dosages of allele 1 in one byte each; beyond, pairs of
/// allele codes. Only one of the two stores is filled at a time.
#[derive(Debug, Clone, Default, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
pub struct Genotypes {
    allele_count: usize,
    dosages: Vec<u8>,
    pairs: Vec<[u16; 2]>,
}

impl Genotypes {
    /// Makes `slots` missing genotypes at a locus of `allele_count` listed alleles (at least 1).
    pub fn reset(&mut self, slots: usize, allele_count: usize) {
        self.allele_count = allele_count;
        self.dosages.clear();
        self.pairs.clear();
        if self.is_biallelic() {
            self.dosages.resize(slots, MISSING_DOSAGE);
        } else {
            self.pairs.resize(slots, [MISSING_ALLELE; 2]);
        }
    }

    /// Whether at most two alleles are listed, so that [`Genotypes::dosages`] holds the genotypes.
    pub fn is_biallelic(&self) -> bool {
        self.allele_count <= 2
    }

    /// Number of listed alleles, the reference included.
    pub fn allele_count(&self) -> usize {
        self.allele_count
    }

    /// Whether it has so many slots and no genotype names an allele that is not listed.
    pub fn is_sound(&self, slots: usize) -> bool {
        let stores = match self.is_biallelic() {
            true => [self.dosages.len(), 0],
            false => [0, self.pairs.len()],
        };
        let pair = |&[a, b]: &[u16; 2]| {
            (a, b) == (MISSING_ALLELE, MISSING_ALLELE)
                || (a <= b && usize::from(b) < self.allele_count)
        };
        self.allele_count <= MAX_ALLELES
            && [self.dosages.len(), self.pairs.len()] == stores
            && self.len() == slots
            && self.dosages.iter().all(|&d| d <= MISSING_DOSAGE)
            && self.pairs.iter().all(pair)
    }

    /// Number of slots.
    pub fn len(&self) -> usize {
        self.dosages.len().max(self.pairs.len())
    }

    /// Whether there is no slot.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// Sets the genotype of a slot to alleles `a` and `b`, in any order.
    pub fn set(&mut self, slot: usize, a: u16, b: u16) {
        if self.is_biallelic() {
            self.dosages[slot] = (a + b) as u8;
        } else {
            self.pairs[slot] = [a.min(b), a.max(b)];
        }
    }

    /// Makes the genotype of a slot missing.
    pub fn clear(&mut self, slot: usize) {
        if self.is_biallelic() {
            self.dosages[slot] = MISSING_DOSAGE;
        } else {
            self.pairs[slot] = [MISSING_ALLELE; 2];
        }
    }

    /// The genotype of a slot as two allele codes, the lower first; `None` when missing.
    pub fn pair(&self, slot: usize) -> Option<[u16; 2]> {
        if self.is_biallelic() {
            match self.dosages[slot] {
                0 => Some([0, 0]),
                1 => Some([0, 1]),
                2 => Some([1, 1]),
                _ => None,
            }
        } else {
            let pair = self.pairs[slot];
            (pair[0] != MISSING_ALLELE).then_some(pair)
        }
    }

    /// Copies of allele 1 by slot (0, 1, 2 or [`MISSING_DOSAGE`]); empty unless biallelic.
    pub fn dosages(&self) -> &[u8] {
        &self.dosages
    }

    /// Mutable dosages, for readers that fill whole rows; empty unless biallelic.
    pub fn dosages_mut(&mut self) -> &mut [u8] {
        &mut self.dosages
    }

    /// Allele pairs by slot, lower code first; empty if biallelic.
    pub fn pairs(&self) -> &[[u16; 2]] {
        &self.pairs
    }
}

/// The fate of a record. Every record gets exactly one, and every one is counted, but for those outside
/// the regions that were asked for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
pub enum Verdict {
    /// At least one individual in use has a diploid genotype.
    Kept,
    /// The record lists no GT field.
    NoGenotypeField,
    /// No individual in use has a called genotype.
    NothingCalled,
    /// All called genotypes of individuals in use are haploid.
    OnlyHaploid,
    /// All called genotypes of individuals in use have more than two alleles.
    OnlyOtherPloidy,
    /// More alleles are listed than the reader handles.
    TooManyAlleles,
    /// The record lies outside the regions that the run is about: as if it were not in the file.
    Elsewhere,
}

impl Verdict {
    /// Every verdict that is counted, in report order.
    pub const ALL: [Verdict; 6] = [
        Verdict::Kept,
        Verdict::NoGenotypeField,
        Verdict::NothingCalled,
        Verdict::OnlyHaploid,
        Verdict::OnlyOtherPloidy,
        Verdict::TooManyAlleles,
    ];

    /// The name under which the report counts this verdict.
    pub fn name(self) -> &'static str {
        match self {
            Verdict::Kept => "kept",
            Verdict::NoGenotypeField => "no_genotype_field",
            Verdict::NothingCalled => "nothing_called",
            Verdict::OnlyHaploid => "only_haploid",
            Verdict::OnlyOtherPloidy => "only_other_ploidy",
            Verdict::TooManyAlleles => "too_many_alleles",
            Verdict::Elsewhere => "elsewhere",
        }
    }
}

/// What became of the single genotypes of individuals in use, over all records that were read.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
pub struct CallTally {
    /// Diploid genotypes with both alleles called.
    pub diploid: u64,
    /// Genotypes with no allele called.
    pub missing: u64,
    /// Genotypes with one allele called and one missing: wholly missing here.
    pub partly_missing: u64,
    /// Haploid calls: left out of diploid formulas.
    pub haploid: u64,
    /// Genotypes of three and more alleles: left out.
    pub other_ploidy: u64,
    /// Diploid genotypes with the `*` allele (the base lies in a deletion of an earlier record): missing here.
    pub spanning_deletion: u64,
    /// Diploid genotypes with `<*>` or `<NON_REF>`: missing here.
    pub unspecified_allele: u64,
}

impl CallTally {
    /// Every number of it.
    pub fn numbers(&self) -> [u64; 7] {
        [
            self.diploid,
            self.missing,
            self.partly_missing,
            self.haploid,
            self.other_ploidy,
            self.spanning_deletion,
            self.unspecified_allele,
        ]
    }

    /// Adds another tally; commutative and associative, with the default as identity.
    pub fn merge(&mut self, other: &CallTally) {
        self.diploid += other.diploid;
        self.missing += other.missing;
        self.partly_missing += other.partly_missing;
        self.haploid += other.haploid;
        self.other_ploidy += other.other_ploidy;
        self.spanning_deletion += other.spanning_deletion;
        self.unspecified_allele += other.unspecified_allele;
    }
}
