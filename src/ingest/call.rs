//! One genotype as it was called, and the row of a locus that takes them.

use crate::model::{CallTally, Genotypes, Verdict};

/// In [`crate::ingest::Selection::slot_of_column`]: this sample is not in use.
pub(super) const UNUSED: u32 = u32::MAX;

/// What one sample column says.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Call {
    /// No allele is called.
    Missing,
    /// One of two alleles is called.
    Partly,
    /// One allele, and no place for a second.
    Haploid,
    /// Two alleles.
    Diploid(u16, u16),
    /// Three and more places, at least one allele called.
    Other,
}

/// Counts the places of a genotype as they are read.
#[derive(Debug, Default, Clone, Copy)]
pub(super) struct Places {
    called: u32,
    absent: u32,
    pair: [u16; 2],
}

impl Places {
    pub fn allele(&mut self, allele: u16) {
        self.pair[usize::from(self.called > 0)] = allele;
        self.called += 1;
    }

    pub fn absent(&mut self) {
        self.absent += 1;
    }

    pub fn call(self) -> Call {
        match (self.called, self.absent) {
            (0, _) => Call::Missing,
            (1, 0) => Call::Haploid,
            (1, 1) => Call::Partly,
            (2, 0) => Call::Diploid(self.pair[0], self.pair[1]),
            _ => Call::Other,
        }
    }
}

/// Why a genotype cannot be used.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Flaw {
    /// It is not written as the standard says.
    Malformed,
    /// It names an allele that the record does not list.
    Beyond(u32),
}

/// How an allele is to be understood.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum AlleleKind {
    /// Bases, symbolic, or a breakend.
    Ordinary,
    /// `*`: the base lies in a deletion of an earlier record.
    Spanning,
    /// `<*>` or `<NON_REF>`: anything that is not listed.
    Unspecified,
}

impl AlleleKind {
    /// The kind of an ALT allele.
    pub fn of(allele: &[u8]) -> Self {
        match allele {
            b"*" => AlleleKind::Spanning,
            b"<*>" | b"<NON_REF>" => AlleleKind::Unspecified,
            _ => AlleleKind::Ordinary,
        }
    }
}

/// Takes the genotypes of one record.
pub(super) struct Row<'a> {
    /// Where they are kept, by slot.
    genotypes: &'a mut Genotypes,
    /// The kinds of all alleles; empty when all are ordinary.
    kinds: &'a [AlleleKind],
    /// What became of them.
    pub tally: CallTally,
}

impl<'a> Row<'a> {
    /// A row of missing genotypes, of a record with alleles of these kinds.
    pub fn new(genotypes: &'a mut Genotypes, kinds: &'a [AlleleKind]) -> Self {
        Row {
            genotypes,
            kinds,
            tally: CallTally::default(),
        }
    }

    /// Keeps or counts the genotype of a slot.
    #[inline]
    pub fn put(&mut self, slot: usize, call: Call) {
        match call {
            Call::Diploid(a, b) if self.kinds.is_empty() => {
                self.genotypes.set(slot, a, b);
                self.tally.diploid += 1;
            }
            Call::Diploid(a, b) => self.put_special(slot, a, b),
            Call::Missing => self.tally.missing += 1,
            Call::Partly => self.tally.partly_missing += 1,
            Call::Haploid => self.tally.haploid += 1,
            Call::Other => self.tally.other_ploidy += 1,
        }
    }

    fn put_special(&mut self, slot: usize, a: u16, b: u16) {
        let has = |kind| [a, b].iter().any(|&x| self.kinds[usize::from(x)] == kind);
        if has(AlleleKind::Spanning) {
            self.tally.spanning_deletion += 1;
        } else if has(AlleleKind::Unspecified) {
            self.tally.unspecified_allele += 1;
        } else {
            self.genotypes.set(slot, a, b);
            self.tally.diploid += 1;
        }
    }

    /// Keeps a whole row of dosages, by column, of a record with two ordinary alleles.
    pub fn put_dosages(&mut self, by_column: &[u8], used: &[(u32, u32)]) {
        let dosages = self.genotypes.dosages_mut();
        for &(column, slot) in used {
            dosages[slot as usize] = by_column[column as usize];
        }
        let called = dosages.iter().filter(|&&d| d < 3).count() as u64;
        self.tally.diploid += called;
        self.tally.missing += used.len() as u64 - called;
    }

    /// The fate of the record. Where some calls are haploid and others of higher ploidy, the latter
    /// give the name.
    pub fn verdict(&self) -> Verdict {
        if self.tally.diploid > 0 {
            Verdict::Kept
        } else if self.tally.other_ploidy > 0 {
            Verdict::OnlyOtherPloidy
        } else if self.tally.haploid > 0 {
            Verdict::OnlyHaploid
        } else {
            Verdict::NothingCalled
        }
    }
}
