//! The genotype classes of one stratum at one locus: leaving out any one individual depends only on
//! its class, so a delete-one recount costs a few classes instead of all individuals.

use std::ops::Range;

use crate::model::Genotypes;

/// Distinct genotypes of a stratum, how many individuals have each, and each individual's class.
#[derive(Debug, Clone, Default)]
pub struct GenotypeClasses {
    /// Distinct genotypes with the number of individuals. Biallelic: always 0/0, 0/1, 1/1.
    pub classes: Vec<([u16; 2], u32)>,
    /// Class of each individual of the stratum, in slot order; the number of classes when missing.
    /// Filled for multi-allelic loci only: a biallelic dosage is its own class, 3 when missing.
    pub of_individual: Vec<u16>,
    order: Vec<([u16; 2], u32)>,
}

impl GenotypeClasses {
    /// Refills from the slots of one stratum.
    pub fn refill(&mut self, genotypes: &Genotypes, slots: Range<usize>) {
        self.classes.clear();
        self.of_individual.clear();
        if genotypes.is_biallelic() {
            let mut n = [0u32; 4];
            for &dosage in &genotypes.dosages()[slots] {
                n[usize::from(dosage & 3)] += 1;
            }
            self.classes
                .extend([([0, 0], n[0]), ([0, 1], n[1]), ([1, 1], n[2])]);
            return;
        }
        self.order.clear();
        let present = slots
            .clone()
            .filter_map(|slot| genotypes.pair(slot).map(|g| (g, slot as u32)));
        self.order.extend(present);
        self.order.sort_unstable();
        for &(genotype, _) in &self.order {
            match self.classes.last_mut() {
                Some((last, n)) if *last == genotype => *n += 1,
                _ => self.classes.push((genotype, 1)),
            }
        }
        self.of_individual
            .resize(slots.len(), self.classes.len() as u16);
        let mut class = 0u16;
        for (i, &(genotype, slot)) in self.order.iter().enumerate() {
            if i > 0 && genotype != self.order[i - 1].0 {
                class += 1;
            }
            self.of_individual[slot as usize - slots.start] = class;
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_individual_finds_its_class() {
        let calls = [Some([2, 1]), None, Some([0, 0]), Some([1, 2]), Some([0, 2])];
        let mut genotypes = Genotypes::default();
        genotypes.reset(6, 3);
        for (slot, call) in calls.iter().enumerate() {
            if let Some([a, b]) = call {
                genotypes.set(slot + 1, *a, *b);
            }
        }
        let mut classes = GenotypeClasses::default();
        classes.refill(&genotypes, 1..6);
        assert_eq!(classes.classes, [([0, 0], 1), ([0, 2], 1), ([1, 2], 2)]);
        assert_eq!(classes.of_individual, [2, 3, 0, 2, 1]);
    }
}
