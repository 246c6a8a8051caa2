//! One genotype as it was called, and the row of a locus that takes them.
#![expect(
    clippy::indexing_slicing,
    reason = "a call has two places, and slots and columns are those that the selection was checked for"
)]

use crate::model::{CallTally, Genotypes, MISSING_DOSAGE, Verdict};

/// In [`crate::ingest::Selection::slot_of_column`]: this sample is not in use.
pub(super) const UNUSED: u32 = u32::MAX;

/// Columns in use that stand side by side, and whose slots do so too.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Run {
    /// First column.
    pub column: usize,
    /// Its slot.
    pub slot: usize,
    /// Number of columns.
    pub length: usize,
}

impl Run {
    /// The runs of a selection, in column order.
    pub fn all(slot_of_column: &[u32]) -> Vec<Run> {
        let mut runs: Vec<Run> = Vec::new();
        for (column, &slot) in slot_of_column.iter().enumerate() {
            let slot = match slot {
                UNUSED => continue,
                slot => slot as usize,
            };
            match runs.last_mut() {
                Some(run) if (run.column + run.length, run.slot + run.length) == (column, slot) => {
                    run.length += 1;
                }
                _ => runs.push(Run {
                    column,
                    slot,
                    length: 1,
                }),
            }
        }
        runs
    }
}

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
    pub fn put_dosages(&mut self, by_column: &[u8], runs: &[Run]) {
        let dosages = self.genotypes.dosages_mut();
        let mut columns = 0;
        for run in runs {
            columns += run.length;
            match run.length {
                1 => dosages[run.slot] = by_column[run.column],
                length => dosages[run.slot..run.slot + length]
                    .copy_from_slice(&by_column[run.column..run.column + length]),
            }
        }
        let called: u64 = dosages
            .chunks(BYTE_SUMS)
            .map(|part| u64::from(called(part)))
            .sum();
        self.tally.diploid += called;
        self.tally.missing += columns as u64 - called;
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

/// Bytes that can be counted in one byte.
const BYTE_SUMS: usize = 255;

/// Called genotypes among at most [`BYTE_SUMS`]; adding in single bytes lets sixteen and more be
/// added at a time.
fn called(dosages: &[u8]) -> u8 {
    dosages
        .iter()
        .fold(0, |sum, &d| sum.wrapping_add(u8::from(d < MISSING_DOSAGE)))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn counts_called_bytes() {
        for length in [0, 1, 254, 255, 256, 1000] {
            let dosages: Vec<u8> = (0..length).map(|i| (i % 7 % 4) as u8).collect();
            let mut genotypes = Genotypes::default();
            genotypes.reset(length, 2);
            let mut row = Row::new(&mut genotypes, &[]);
            row.put_dosages(
                &dosages,
                &[Run {
                    column: 0,
                    slot: 0,
                    length,
                }],
            );
            let plain = dosages.iter().filter(|&&d| d != 3).count() as u64;
            assert_eq!(
                (row.tally.diploid, row.tally.missing),
                (plain, length as u64 - plain)
            );
        }
    }

    #[test]
    fn runs_of_columns() {
        let run = |column, slot, length| Run {
            column,
            slot,
            length,
        };
        let of = |slots: &[u32]| Run::all(slots);
        assert_eq!(of(&[0, 1, 2]), [run(0, 0, 3)]);
        assert_eq!(of(&[2, UNUSED, 0, 1]), [run(0, 2, 1), run(2, 0, 2)]);
        assert_eq!(
            of(&[0, UNUSED, 1, 3]),
            [run(0, 0, 1), run(2, 1, 1), run(3, 3, 1)]
        );
        assert_eq!(of(&[UNUSED]), []);
    }
}
