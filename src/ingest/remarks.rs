//! What breaks the standard without touching a genotype: counted, told, and let through.
#![expect(clippy::indexing_slicing, reason = "one place a remark")]

use serde::{Deserialize, Serialize};

/// A kind of harmless fault of a record.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Remark {
    /// A contig name holds a character the standard does not allow.
    ContigName,
    /// POS is beyond the 32-bit integers of the standard.
    FarPosition,
    /// REF is not made of the bases A, C, G, T, N.
    ReferenceBases,
    /// An ALT allele is neither bases, nor symbolic, nor a breakend, nor `*`.
    AlternateBases,
    /// The same allele is listed twice, so that its copies are split.
    RepeatedAllele,
    /// ALT is a dot, yet genotypes name allele 1; they are missing here.
    UnnamedAlternate,
    /// A FORMAT key is empty or holds a space.
    FormatKey,
    /// GT is not the first FORMAT key.
    LateGenotype,
    /// Sample columns hold more values than FORMAT has keys.
    ExtraValues,
    /// A record lies before the one ahead of it.
    OutOfOrder,
    /// The records of a contig do not stand together.
    ScatteredContig,
    /// The same change of sequence was in an earlier record.
    RepeatedVariant,
}

impl Remark {
    /// Every kind, in report order.
    pub const ALL: [Remark; 12] = [
        Remark::ContigName,
        Remark::FarPosition,
        Remark::ReferenceBases,
        Remark::AlternateBases,
        Remark::RepeatedAllele,
        Remark::UnnamedAlternate,
        Remark::FormatKey,
        Remark::LateGenotype,
        Remark::ExtraValues,
        Remark::OutOfOrder,
        Remark::ScatteredContig,
        Remark::RepeatedVariant,
    ];

    /// The remark in words, after "N records: ".
    pub fn text(self) -> &'static str {
        match self {
            Remark::ContigName => "the contig name holds a character that VCF does not allow",
            Remark::FarPosition => "POS is beyond 2^31 - 1, the largest number of VCF",
            Remark::ReferenceBases => "REF is not made of A, C, G, T and N",
            Remark::AlternateBases => {
                "an ALT allele is neither bases nor any other kind of allele that VCF knows"
            }
            Remark::RepeatedAllele => "an allele is listed twice, so its copies are counted apart",
            Remark::UnnamedAlternate => {
                "ALT is a dot, yet genotypes name allele 1; these are taken as missing"
            }
            Remark::FormatKey => "a FORMAT key is empty or holds a space",
            Remark::LateGenotype => "GT is not the first FORMAT key",
            Remark::ExtraValues => "sample columns hold more values than FORMAT has keys",
            Remark::OutOfOrder => "the position is before that of the record ahead",
            Remark::ScatteredContig => "a contig begins again after another one",
            Remark::RepeatedVariant => {
                "the same variant was in an earlier record, so it counts twice"
            }
        }
    }
}

/// How often each remark was due, and the first record it was due for.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Remarks {
    counts: [u64; Remark::ALL.len()],
    first: [u64; Remark::ALL.len()],
}

impl Default for Remarks {
    fn default() -> Self {
        Remarks {
            counts: [0; Remark::ALL.len()],
            first: [u64::MAX; Remark::ALL.len()],
        }
    }
}

impl Remarks {
    /// Counts a remark on the record with this 1-based number.
    pub fn add(&mut self, remark: Remark, record: u64) {
        let i = remark as usize;
        self.counts[i] += 1;
        self.first[i] = self.first[i].min(record);
    }

    /// Adds others; commutative and associative, with the default as identity.
    pub fn merge(&mut self, other: &Remarks) {
        for i in 0..self.counts.len() {
            self.counts[i] += other.counts[i];
            self.first[i] = self.first[i].min(other.first[i]);
        }
    }

    /// How often a remark was due.
    pub fn count(&self, remark: Remark) -> u64 {
        self.counts[remark as usize]
    }

    /// Whether nothing was remarked.
    pub fn is_empty(&self) -> bool {
        self.counts.iter().all(|&n| n == 0)
    }

    /// One sentence a remark that was due, for people.
    pub fn messages(&self) -> Vec<String> {
        let due = Remark::ALL.into_iter().filter(|&r| self.count(r) > 0);
        due.map(|r| {
            let first = self.first[r as usize];
            format!(
                "{} record(s), the first of them record {first}: {}",
                self.count(r),
                r.text()
            )
        })
        .collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn from(list: &[(usize, u64)]) -> Remarks {
        let mut out = Remarks::default();
        for &(kind, record) in list {
            out.add(Remark::ALL[kind], record);
        }
        out
    }

    proptest! {
        #[test]
        fn merging_is_adding(list in proptest::collection::vec((0..Remark::ALL.len(), 1u64..99), 0..20), cut in 0usize..20) {
            let cut = cut.min(list.len());
            let (mut left, right) = (from(&list[..cut]), from(&list[cut..]));
            let mut other = right.clone();
            other.merge(&left);
            left.merge(&right);
            prop_assert_eq!(&left, &from(&list));
            prop_assert_eq!(&left, &other);
            left.merge(&Remarks::default());
            prop_assert_eq!(&left, &other);
        }
    }

    #[test]
    fn numbers_follow_the_list() {
        for (i, remark) in Remark::ALL.into_iter().enumerate() {
            assert_eq!(remark as usize, i);
        }
    }
}
