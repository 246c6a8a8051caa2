//! The counts of one locus in one stratum, from which all its statistics come.

use std::ops::Range;

use crate::model::Genotypes;

/// Typed individuals, allele copies and heterozygotes of one locus in one stratum.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Counts {
    /// Individuals with a diploid genotype.
    pub typed: u32,
    /// Heterozygous individuals.
    pub heterozygotes: u32,
    /// Gene copies by allele code; the length is the number of alleles of the locus.
    pub copies: Vec<u32>,
    /// Heterozygous individuals that carry the allele, by allele code.
    pub heterozygous: Vec<u32>,
}

impl Counts {
    /// Counts of no individual at a locus of `alleles` alleles.
    pub fn empty(alleles: usize) -> Self {
        Counts {
            typed: 0,
            heterozygotes: 0,
            copies: vec![0; alleles],
            heterozygous: vec![0; alleles],
        }
    }

    /// Counts of a list of genotypes; `None` is missing. Allele codes must be below `alleles`.
    pub fn of(alleles: usize, genotypes: impl IntoIterator<Item = Option<[u16; 2]>>) -> Self {
        let mut counts = Counts::empty(alleles);
        for genotype in genotypes.into_iter().flatten() {
            counts.add(genotype);
        }
        counts
    }

    /// Recounts from the genotypes of the slots of one stratum. A locus of one listed allele is
    /// counted as one of two, the second never seen.
    pub fn recount(&mut self, genotypes: &Genotypes, slots: Range<usize>) {
        let alleles = genotypes.allele_count().max(2);
        self.typed = 0;
        self.heterozygotes = 0;
        self.copies.clear();
        self.copies.resize(alleles, 0);
        self.heterozygous.clear();
        self.heterozygous.resize(alleles, 0);
        if genotypes.is_biallelic() {
            let [n0, n1, n2] = dosage_classes(&genotypes.dosages()[slots]);
            self.typed = n0 + n1 + n2;
            self.heterozygotes = n1;
            self.copies[0] = 2 * n0 + n1;
            self.copies[1] = 2 * n2 + n1;
            self.heterozygous[0] = n1;
            self.heterozygous[1] = n1;
        } else {
            for slot in slots {
                if let Some(genotype) = genotypes.pair(slot) {
                    self.add(genotype);
                }
            }
        }
    }

    /// Adds one individual.
    pub fn add(&mut self, [a, b]: [u16; 2]) {
        self.typed += 1;
        self.copies[a as usize] += 1;
        self.copies[b as usize] += 1;
        if a != b {
            self.heterozygotes += 1;
            self.heterozygous[a as usize] += 1;
            self.heterozygous[b as usize] += 1;
        }
    }

    /// Takes one individual out that is among those counted.
    pub fn remove(&mut self, [a, b]: [u16; 2]) {
        self.typed -= 1;
        self.copies[a as usize] -= 1;
        self.copies[b as usize] -= 1;
        if a != b {
            self.heterozygotes -= 1;
            self.heterozygous[a as usize] -= 1;
            self.heterozygous[b as usize] -= 1;
        }
    }

    /// At a locus with two alleles: homozygotes of the first, heterozygotes, homozygotes of the second.
    pub fn dosage_classes(&self) -> [u32; 3] {
        let homozygotes = |allele: usize| (self.copies[allele] - self.heterozygotes) / 2;
        [homozygotes(0), self.heterozygotes, homozygotes(1)]
    }

    /// Gene copies typed: twice the individuals.
    pub fn gene_copies(&self) -> u32 {
        2 * self.typed
    }

    /// Ordered pairs of distinct gene copies that differ in state, of the 2n (2n - 1) there are:
    /// (2n)^2 less the sum of squared copies. The integer behind every gene diversity.
    pub fn differing_pairs(&self) -> u64 {
        let all = u64::from(self.gene_copies());
        let alike: u64 = self
            .copies
            .iter()
            .map(|&c| u64::from(c) * u64::from(c))
            .sum();
        all * all - alike
    }

    /// Number of alleles seen here.
    pub fn alleles_seen(&self) -> usize {
        self.copies.iter().filter(|&&c| c > 0).count()
    }

    /// Frequency of an allele; `None` when nobody is typed.
    pub fn frequency(&self, allele: usize) -> Option<f64> {
        (self.typed > 0).then(|| f64::from(self.copies[allele]) / f64::from(self.gene_copies()))
    }
}

/// How many dosages are 0, 1 and 2. Written as sums of comparisons, which compilers turn into wide
/// instructions; blocks of 255 keep the byte sums from wrapping.
fn dosage_classes(dosages: &[u8]) -> [u32; 3] {
    let mut n = [0u32; 3];
    for block in dosages.chunks(255) {
        let (mut n0, mut n1, mut n2) = (0u8, 0u8, 0u8);
        for &d in block {
            n0 += u8::from(d == 0);
            n1 += u8::from(d == 1);
            n2 += u8::from(d == 2);
        }
        n[0] += u32::from(n0);
        n[1] += u32::from(n1);
        n[2] += u32::from(n2);
    }
    n
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn dosages_and_pairs_count_alike() {
        let calls = [None, Some([0, 1]), Some([1, 1]), Some([0, 0]), Some([0, 1])];
        let mut genotypes = Genotypes::default();
        genotypes.reset(calls.len(), 2);
        for (slot, call) in calls.iter().enumerate() {
            if let Some([a, b]) = call {
                genotypes.set(slot, *a, *b);
            }
        }
        let mut counts = Counts::default();
        counts.recount(&genotypes, 0..calls.len());
        assert_eq!(counts, Counts::of(2, calls));
        assert_eq!((counts.typed, counts.heterozygotes), (4, 2));
        assert_eq!(counts.copies, [4, 4]);
    }

    #[test]
    fn remove_undoes_add() {
        let mut counts = Counts::of(3, [Some([0, 2]), Some([1, 1])]);
        let before = counts.clone();
        counts.add([0, 1]);
        counts.remove([0, 1]);
        assert_eq!(counts, before);
    }
}
