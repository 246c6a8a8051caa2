//! How large the sums of a file may be.
//!
//! A checksum says that a file is as it was written, not that what was written can be added up. Sums
//! within these bounds can be: two of them, and all that is worked out from one, stay inside their
//! integers. Far more than any genome holds is within.

use super::{FRACTION_BITS, Sums};
use crate::model::MAX_ALLELES;

/// Most loci.
pub(super) const MOST_LOCI: u64 = 1 << 42;
/// Most alleles of these.
pub(super) const MOST_ALLELES: u64 = MOST_LOCI * MAX_ALLELES as u64;
/// Largest sum of terms of so many loci: each below 2^14, in steps of 2^-[`FRACTION_BITS`].
const MOST_TERMS: u128 = 1 << (42 + 14 + FRACTION_BITS);
/// Largest sum in finer steps (of matrices and of squares): eight of them stay inside i128.
const MOST_FINE: u128 = 1 << 120;

/// Whether numbers add up to at most `most`.
pub(super) fn add_up<'a>(numbers: impl IntoIterator<Item = &'a u64>, most: u64) -> bool {
    let sum = numbers
        .into_iter()
        .try_fold(0u64, |sum, &n| sum.checked_add(n));
    sum.is_some_and(|sum| sum <= most)
}

/// Whether sums of terms are as small as terms make them.
pub(super) fn terms<'a>(sums: impl IntoIterator<Item = &'a i128>) -> bool {
    sums.into_iter().all(|sum| sum.unsigned_abs() <= MOST_TERMS)
}

/// Whether sums in finer steps can be added up.
pub(super) fn fine<'a>(sums: impl IntoIterator<Item = &'a i128>) -> bool {
    sums.into_iter().all(|sum| sum.unsigned_abs() <= MOST_FINE)
}

impl Sums {
    /// Whether the sums can have come from loci of these samples, and can be added up further. Only sums
    /// that were read from a file need to be asked.
    pub fn is_bounded(&self) -> bool {
        let scheme = self.scheme();
        let within = |s: usize| scheme.strata.get(s).map_or(0, ExactSizeIterator::len);
        let counts = self.kept <= MOST_LOCI && self.polymorphic <= self.kept;
        counts
            && self.individuals_are_bounded()
            && self.panel.is_bounded(self.polymorphic)
            && self.strata.iter().enumerate().all(|(s, stratum)| {
                let genotypes = self.kept.checked_mul(within(s) as u64);
                genotypes.is_some_and(|most| stratum.typed_genotypes <= most)
                    && stratum.diversity.is_bounded()
                    && stratum.hardy_weinberg.is_bounded()
                    && stratum.linkage.iter().all(|gram| gram.is_bounded())
            })
            && scheme.pairs.iter().zip(&self.pairs).all(|(pair, sums)| {
                sums.change.is_bounded()
                    && sums.fates.is_bounded(within(pair.from), within(pair.to))
            })
            && self.private.iter().flatten().all(|p| p.is_bounded())
            && self.carriers.iter().all(|c| c.is_bounded())
            && (scheme.latest.iter().zip(&self.spectra)).all(|(&s, of)| of.is_bounded(within(s)))
    }

    /// Each individual is heterozygous at most where it is typed, and typed at most where there is a record.
    fn individuals_are_bounded(&self) -> bool {
        let varying = self.heterozygous.iter().zip(&self.typed_polymorphic);
        let typed = self.typed_polymorphic.iter().zip(&self.typed_records);
        varying.chain(typed).all(|(few, many)| few <= many)
            && self
                .typed_polymorphic
                .iter()
                .all(|&n| n <= self.polymorphic)
            && self.typed_records.iter().all(|&n| n <= self.kept)
    }
}
