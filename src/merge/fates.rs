//! What became of the alleles of the first of two visits.
//!
//! Chances of loss need the effective size, which is known only after the last locus; so alleles are
//! counted by what their chances depend on: copies and gene copies at the first visit, gene copies at
//! the second.

use std::collections::{BTreeMap, BTreeSet};

use serde::{Deserialize, Serialize};

use super::bounds::{self, MOST_ALLELES, MOST_LOCI};
use crate::locus::Counts;
use crate::model::Locus;

/// Numbers up to this are kept as they are; above, they are rounded to steps of at most 3 %, so that
/// the table stays small for any number of loci.
const EXACT_UP_TO: u32 = 64;

/// Copies of an allele at the first visit, gene copies typed there, gene copies typed at the second.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
pub struct FateKey {
    /// Copies of the allele at the first visit, at least 1.
    pub baseline_copies: u32,
    /// Gene copies typed at the first visit.
    pub baseline_typed: u32,
    /// Gene copies typed at the second visit.
    pub later_typed: u32,
}

/// Alleles with one key.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
pub struct Fate {
    /// Seen at both visits.
    pub seen: u64,
    /// Not seen at the second.
    pub not_seen: u64,
}

/// An allele of the first visit that the second did not show.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
pub struct MissingAllele {
    /// Sorts the commonest at the baseline first: 2^32 less its frequency in steps of 2^-32.
    rank: u64,
    /// Contig name.
    pub contig: String,
    /// 1-based position.
    pub position: u64,
    /// Identifier as written, empty when absent.
    pub id: String,
    /// The allele as written.
    pub allele: Vec<u8>,
    /// Copies at the first visit.
    pub baseline_copies: u32,
    /// Gene copies typed at the first visit.
    pub baseline_typed: u32,
    /// Gene copies typed at the second visit.
    pub later_typed: u32,
}

/// The fates of all alleles of the first of two visits.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Fates {
    by_key: BTreeMap<FateKey, Fate>,
    missing: BTreeSet<MissingAllele>,
    most_listed: usize,
    /// Loci that varied at the first visit and show one allele at the second.
    pub loci_fixed: u64,
}

impl Fates {
    /// No allele yet; at most `most_listed` of those not seen again are kept by name.
    pub fn new(most_listed: usize) -> Self {
        Fates {
            by_key: BTreeMap::new(),
            missing: BTreeSet::new(),
            most_listed,
            loci_fixed: 0,
        }
    }

    /// Adds the alleles of one locus that is typed at both visits.
    pub fn add(&mut self, locus: &Locus, first: &Counts, second: &Counts) {
        for (allele, (&before, &after)) in first.copies.iter().zip(&second.copies).enumerate() {
            if before == 0 {
                continue;
            }
            let key = FateKey {
                baseline_copies: rounded(before),
                baseline_typed: rounded(first.gene_copies()),
                later_typed: rounded(second.gene_copies()),
            };
            let fate = self.by_key.entry(key).or_default();
            if after > 0 {
                fate.seen += 1;
            } else {
                fate.not_seen += 1;
                self.list(locus, allele, before, first, second);
            }
        }
        if first.alleles_seen() > 1 && second.alleles_seen() == 1 {
            self.loci_fixed += 1;
        }
    }

    /// Adds the fates of other loci.
    pub fn merge(&mut self, other: Fates) {
        for (key, fate) in other.by_key {
            let sum = self.by_key.entry(key).or_default();
            sum.seen += fate.seen;
            sum.not_seen += fate.not_seen;
        }
        self.missing.extend(other.missing);
        self.trim();
        self.loci_fixed += other.loci_fixed;
    }

    /// Whether the fates can be those of so many individuals at the first visit and at the second.
    pub(super) fn is_bounded(&self, first: usize, second: usize) -> bool {
        let possible = |copies: u32, [before, after]: [u32; 2], most: [u32; 2]| {
            0 < copies && copies <= before && before <= most[0] && 0 < after && after <= most[1]
        };
        let rounded = [most_typed(first), most_typed(second)];
        // The list has the numbers as they are, which may be above the rounded ones.
        let exact = [gene_copies(first), gene_copies(second)];
        let mut keys = self.by_key.keys();
        let mut missing = self.missing.iter();
        let numbers = self.by_key.values().flat_map(|f| [&f.seen, &f.not_seen]);
        keys.all(|k| {
            possible(
                k.baseline_copies,
                [k.baseline_typed, k.later_typed],
                rounded,
            )
        }) && missing.all(|m| possible(m.baseline_copies, [m.baseline_typed, m.later_typed], exact))
            && bounds::add_up(numbers, MOST_ALLELES)
            && self.loci_fixed <= MOST_LOCI
    }

    /// Alleles by key, in order.
    pub fn by_key(&self) -> impl Iterator<Item = (FateKey, Fate)> + '_ {
        self.by_key.iter().map(|(&key, &fate)| (key, fate))
    }

    /// Alleles seen at the first visit.
    pub fn alleles(&self) -> u64 {
        self.by_key.values().map(|f| f.seen + f.not_seen).sum()
    }

    /// Of these, alleles not seen at the second.
    pub fn not_seen(&self) -> u64 {
        self.by_key.values().map(|f| f.not_seen).sum()
    }

    /// Alleles not seen again, the commonest at the baseline first, as many as are listed.
    pub fn missing(&self) -> impl Iterator<Item = &MissingAllele> {
        self.missing.iter()
    }

    fn list(&mut self, locus: &Locus, allele: usize, copies: u32, first: &Counts, second: &Counts) {
        if self.most_listed == 0 {
            return;
        }
        let typed = first.gene_copies();
        let rank = (1 << 32) - (u64::from(copies) << 32) / u64::from(typed);
        let full = self.missing.len() >= self.most_listed;
        if full && self.missing.last().is_some_and(|last| rank > last.rank) {
            return;
        }
        self.missing.insert(MissingAllele {
            rank,
            contig: locus.contig.clone(),
            position: locus.position,
            id: locus.id.clone(),
            allele: locus.allele(allele).unwrap_or_default().to_vec(),
            baseline_copies: copies,
            baseline_typed: typed,
            later_typed: second.gene_copies(),
        });
        self.trim();
    }

    fn trim(&mut self) {
        while self.missing.len() > self.most_listed {
            self.missing.pop_last();
        }
    }
}

/// The number itself if small, else the middle of its step of at most 1/32 of its size.
pub(super) fn rounded(n: u32) -> u32 {
    if n <= EXACT_UP_TO {
        return n;
    }
    let step = 1u32 << (n.ilog2() - 5);
    (n / step) * step + step / 2
}

/// Gene copies of so many individuals, all typed.
fn gene_copies(individuals: usize) -> u32 {
    u32::try_from(2 * individuals).unwrap_or(u32::MAX)
}

/// The most gene copies of so many individuals, [`rounded`].
pub(super) fn most_typed(individuals: usize) -> u32 {
    rounded(gene_copies(individuals))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rounding_stays_within_three_percent() {
        for n in 1..100_000u32 {
            let error = (f64::from(rounded(n)) - f64::from(n)).abs() / f64::from(n);
            assert!(error <= 0.03, "{n} became {}", rounded(n));
        }
    }

    /// Numbers above 64 are rounded as keys and not in the list: both are within bounds for every size.
    #[test]
    fn fates_of_fully_typed_samples_are_within_bounds() {
        assert!((1..200).any(|n| most_typed(n) < gene_copies(n)));
        for n in (1..200).chain([500, 1031, 20_000]) {
            let mut first = Counts::of(2, vec![Some([0, 0]); n - 1]);
            first.add([0, 1]);
            let second = Counts::of(2, vec![Some([0, 0]); n]);
            let mut fates = Fates::new(5);
            fates.add(&Locus::default(), &first, &second);
            assert_eq!(fates.missing.len(), 1);
            assert!(fates.is_bounded(n, n), "{n}");
            assert!(!fates.is_bounded(n / 2, n), "{n}");
        }
    }

    #[test]
    fn the_commonest_missing_allele_is_listed_first() {
        let mut fates = Fates::new(1);
        let second = Counts::of(2, [Some([0, 0]); 3]);
        let rare = Counts::of(2, [Some([0, 0]), Some([0, 0]), Some([0, 1])]);
        let common = Counts::of(2, [Some([0, 0]), Some([0, 1]), Some([0, 1])]);
        for (position, first) in [(1, &rare), (2, &common), (3, &rare)] {
            let mut locus = Locus::default();
            locus.position = position;
            fates.add(&locus, first, &second);
        }
        assert_eq!(
            (fates.alleles(), fates.not_seen(), fates.loci_fixed),
            (6, 3, 3)
        );
        assert_eq!(fates.missing().map(|m| m.position).collect::<Vec<_>>(), [2]);
    }
}
