//! A bounded set of loci whose genotypes are kept, two bits each, for comparing individuals.

use std::collections::BTreeSet;

use crate::model::{Genotypes, Locus, MISSING_DOSAGE, stable_hash};

/// One locus of two alleles that is kept.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord)]
pub struct KeptLocus {
    priority: u64,
    /// Contig name.
    pub contig: String,
    /// 1-based position.
    pub position: u64,
    /// Identifier as written, empty when absent.
    pub id: String,
    /// [`stable_hash`] of the contig name.
    pub contig_hash: u64,
    /// Dosages of all slots, four a byte.
    packed: Vec<u8>,
}

impl KeptLocus {
    /// The dosage of one slot.
    pub fn dosage(&self, slot: usize) -> u8 {
        self.packed.get(slot / 4).map_or(MISSING_DOSAGE, |byte| {
            (byte >> (2 * (slot % 4))) & MISSING_DOSAGE
        })
    }

    /// Dosages by slot, into a buffer of as many slots as wanted.
    pub fn unpack(&self, dosages: &mut [u8]) {
        for (slot, dosage) in dosages.iter_mut().enumerate() {
            *dosage = self.dosage(slot);
        }
    }
}

/// One locus of more alleles that is kept.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord)]
pub struct KeptRepeat {
    priority: u64,
    /// Contig name.
    pub contig: String,
    /// 1-based position.
    pub position: u64,
    /// Identifier as written, empty when absent.
    pub id: String,
    /// [`stable_hash`] of the contig name.
    pub contig_hash: u64,
    /// Genotypes by slot.
    pub genotypes: Genotypes,
}

/// The loci of lowest priority among those offered, which depends on what a locus is and on nothing
/// else: the same in any order, for any number of threads and any sharding. Memory: a quarter byte a
/// slot for each locus of two alleles, four bytes for each with more.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct ScreenPanel {
    most: usize,
    most_repeats: usize,
    loci: BTreeSet<KeptLocus>,
    repeats: BTreeSet<KeptRepeat>,
    /// Loci of two alleles that were offered.
    pub offered: u64,
    /// Loci of more alleles that were offered.
    pub offered_repeats: u64,
}

impl ScreenPanel {
    /// No locus yet; at most `most` of two alleles and `most_repeats` of more will be kept.
    pub fn new(most: usize, most_repeats: usize) -> Self {
        ScreenPanel {
            most,
            most_repeats,
            loci: BTreeSet::new(),
            repeats: BTreeSet::new(),
            offered: 0,
            offered_repeats: 0,
        }
    }

    /// Offers a locus that varies.
    pub fn offer(&mut self, locus: &Locus) {
        let priority = priority(locus);
        if locus.genotypes.is_biallelic() {
            self.offered += 1;
            let last = self.loci.last().map(|last| last.priority);
            if self.loci.len() >= self.most && last.is_none_or(|last| priority > last) {
                return;
            }
            self.loci.insert(KeptLocus {
                priority,
                contig: locus.contig.clone(),
                position: locus.position,
                id: locus.id.clone(),
                contig_hash: locus.contig_hash,
                packed: pack(locus.genotypes.dosages()),
            });
        } else {
            self.offered_repeats += 1;
            let last = self.repeats.last().map(|last| last.priority);
            if self.repeats.len() >= self.most_repeats && last.is_none_or(|last| priority > last) {
                return;
            }
            self.repeats.insert(KeptRepeat {
                priority,
                contig: locus.contig.clone(),
                position: locus.position,
                id: locus.id.clone(),
                contig_hash: locus.contig_hash,
                genotypes: locus.genotypes.clone(),
            });
        }
        self.trim();
    }

    /// Adds the loci of another panel over the same slots.
    pub fn merge(&mut self, other: ScreenPanel) {
        self.offered += other.offered;
        self.offered_repeats += other.offered_repeats;
        self.loci.extend(other.loci);
        self.repeats.extend(other.repeats);
        self.trim();
    }

    /// Loci of two alleles by contig name and position.
    pub fn loci(&self) -> Vec<&KeptLocus> {
        let mut loci: Vec<&KeptLocus> = self.loci.iter().collect();
        loci.sort_by(|a, b| (&a.contig, a.position, *a).cmp(&(&b.contig, b.position, *b)));
        loci
    }

    /// Loci of more alleles, in an order of their own that is the same in every run.
    pub fn repeats(&self) -> impl ExactSizeIterator<Item = &KeptRepeat> {
        self.repeats.iter()
    }

    fn trim(&mut self) {
        while self.loci.len() > self.most {
            self.loci.pop_last();
        }
        while self.repeats.len() > self.most_repeats {
            self.repeats.pop_last();
        }
    }
}

/// The rule of [`crate::merge::panel`].
fn priority(locus: &Locus) -> u64 {
    let place = locus.contig_hash ^ locus.position.wrapping_mul(0x9e37_79b9_7f4a_7c15);
    stable_hash(&place.to_le_bytes())
}

fn pack(dosages: &[u8]) -> Vec<u8> {
    dosages
        .chunks(4)
        .map(|four| {
            (0..4).fold(0, |byte, i| {
                let dosage = four.get(i).copied().unwrap_or(MISSING_DOSAGE);
                byte | (dosage.min(MISSING_DOSAGE) << (2 * i))
            })
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn locus(position: u64, dosages: &[u8]) -> Locus {
        let mut locus = Locus::default();
        locus.contig = "lake".into();
        locus.contig_hash = stable_hash(b"lake");
        locus.position = position;
        locus.genotypes.reset(dosages.len(), 2);
        locus.genotypes.dosages_mut().copy_from_slice(dosages);
        locus
    }

    #[test]
    fn dosages_come_back_as_they_went_in() {
        let dosages = [0, 1, 2, 3, 2, 1, 0, 3, 2];
        let mut panel = ScreenPanel::new(10, 10);
        panel.offer(&locus(5, &dosages));
        let mut back = [9; 9];
        panel.loci()[0].unpack(&mut back);
        assert_eq!(back, dosages);
    }

    #[test]
    fn the_same_loci_stay_in_any_order_and_however_split() {
        let all: Vec<Locus> = (0..60u64)
            .map(|i| locus(i * 7, &[(i % 3) as u8, 1]))
            .collect();
        let mut whole = ScreenPanel::new(20, 5);
        all.iter().for_each(|l| whole.offer(l));
        let (mut left, mut right) = (ScreenPanel::new(20, 5), ScreenPanel::new(20, 5));
        for (i, locus) in all.iter().enumerate().rev() {
            if i % 3 == 0 { &mut left } else { &mut right }.offer(locus);
        }
        right.merge(left);
        assert_eq!(whole, right);
        assert_eq!((whole.loci().len(), whole.offered), (20, 60));
        let places: Vec<u64> = whole.loci().iter().map(|l| l.position).collect();
        assert!(places.is_sorted());
    }
}
