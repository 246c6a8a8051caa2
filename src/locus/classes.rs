//! The genotype classes of one stratum at one locus: leaving out any one individual depends only on
//! its class, so a delete-one recount costs a few classes instead of all individuals.

use std::ops::Range;

use super::Counts;
use crate::model::Genotypes;

/// Distinct genotypes of a stratum, how many individuals have each, and who has another than the
/// commonest.
#[derive(Debug, Clone, Default)]
pub struct GenotypeClasses {
    /// Distinct genotypes with the number of individuals. Biallelic: always 0/0, 0/1, 1/1.
    pub classes: Vec<([u16; 2], u32)>,
    /// The class of most individuals, the first of equals; the number of classes when most are missing.
    pub commonest: usize,
    /// Individuals of any other class, counted within the stratum, with their class; the number of
    /// classes when missing.
    pub others: Vec<(u32, u16)>,
    order: Vec<([u16; 2], u32)>,
}

impl GenotypeClasses {
    /// Refills from the slots of one stratum and their counts.
    pub fn refill(&mut self, genotypes: &Genotypes, slots: Range<usize>, counts: &Counts) {
        self.classes.clear();
        self.others.clear();
        let individuals = slots.len();
        if genotypes.is_biallelic() {
            let [n0, n1, n2] = counts.dosage_classes();
            self.classes
                .extend([([0, 0], n0), ([0, 1], n1), ([1, 1], n2)]);
            self.find_commonest(individuals);
            self.list_dosages(&genotypes.dosages()[slots]);
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
        self.find_commonest(individuals);
        self.list_pairs(genotypes, slots);
    }

    fn find_commonest(&mut self, individuals: usize) {
        let typed: u32 = self.classes.iter().map(|(_, n)| n).sum();
        let sizes = self.classes.iter().map(|&(_, n)| n);
        let (mut most, mut size) = (self.classes.len(), individuals as u32 - typed);
        for (class, n) in sizes.enumerate().rev() {
            if n >= size {
                (most, size) = (class, n);
            }
        }
        self.commonest = most;
    }

    /// Writes every individual and steps on behind those that stay: no branch to guess.
    fn list_dosages(&mut self, dosages: &[u8]) {
        self.others.resize(dosages.len(), (0, 0));
        let mut kept = 0;
        for (i, &dosage) in (0u32..).zip(dosages) {
            let class = dosage & 3;
            self.others[kept] = (i, u16::from(class));
            kept += usize::from(usize::from(class) != self.commonest);
        }
        self.others.truncate(kept);
    }

    fn list_pairs(&mut self, genotypes: &Genotypes, slots: Range<usize>) {
        let mut class = 0usize;
        for (i, &(genotype, slot)) in self.order.iter().enumerate() {
            if i > 0 && genotype != self.order[i - 1].0 {
                class += 1;
            }
            if class != self.commonest {
                self.others.push((slot - slots.start as u32, class as u16));
            }
        }
        let missing = self.classes.len();
        if missing != self.commonest {
            let start = slots.start;
            let absent = slots.filter(|&slot| genotypes.pair(slot).is_none());
            self.others
                .extend(absent.map(|slot| ((slot - start) as u32, missing as u16)));
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
        classes.refill(&genotypes, 1..6, &Counts::of(3, calls));
        assert_eq!(classes.classes, [([0, 0], 1), ([0, 2], 1), ([1, 2], 2)]);
        assert_eq!(classes.commonest, 2);
        assert_eq!(classes.others, [(2, 0), (4, 1), (1, 3)]);
    }

    #[test]
    fn only_those_of_another_class_are_listed() {
        let calls = [None, Some([0, 1]), None, Some([1, 1]), Some([0, 1]), None];
        let mut genotypes = Genotypes::default();
        genotypes.reset(calls.len(), 2);
        for (slot, call) in calls.iter().enumerate() {
            if let Some([a, b]) = call {
                genotypes.set(slot, *a, *b);
            }
        }
        let mut classes = GenotypeClasses::default();
        classes.refill(&genotypes, 0..6, &Counts::of(2, calls));
        assert_eq!(classes.commonest, 3);
        assert_eq!(classes.others, [(1, 1), (3, 2), (4, 1)]);
        classes.refill(&genotypes, 1..5, &Counts::of(2, calls));
        assert_eq!(classes.commonest, 1);
        assert_eq!(classes.others, [(1, 3), (2, 2)]);
    }
}
