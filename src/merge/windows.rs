//! A bounded number of genome windows, whatever the genome: the raw material of jackknife blocks.
//!
//! Windows start at 65 536 bases. When more than the allowed number are occupied, neighbours are
//! joined pairwise, and when every contig is one window, contigs are folded together by a hash of
//! their name. Each step is nested in the one before, so the outcome depends only on which loci
//! came, never on their order or on how they were sharded.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use super::bounds;

/// Levels at which windows double: from 2^16 bases up to a whole contig.
const CONTIG_LEVEL: u32 = 32;
/// Bases of the finest window, as a power of two.
const FINEST_SHIFT: u32 = 16;
/// Levels after [`CONTIG_LEVEL`]: contigs folded into 2^15, 2^14, ... groups.
const FOLD_BITS: u32 = 16;
/// Fewest blocks that an interval should rest on, where the genome allows it: with fewer, Student's
/// t makes intervals wide; with many more, neighbouring blocks are cut inside long linkage.
pub const ENOUGH_BLOCKS: usize = 20;

/// Sums by window.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Windows {
    terms: usize,
    most: usize,
    level: u32,
    sums: BTreeMap<(u64, u64), Vec<i128>>,
}

impl Windows {
    /// No window yet, each to hold `terms` sums; at most `most` windows (at least 32) are kept.
    pub fn new(terms: usize, most: usize) -> Self {
        Windows {
            terms,
            most: most.max(32),
            level: 0,
            sums: BTreeMap::new(),
        }
    }

    /// The window of a position at the present level.
    pub fn key(&self, contig_hash: u64, position: u64) -> (u64, u64) {
        key_at(self.level, contig_hash, position)
    }

    /// Adds fixed-point sums of loci that all lie in window `key` of level `level`.
    pub fn add(&mut self, contig_hash: u64, position: u64, sums: &[i64]) {
        let key = self.key(contig_hash, position);
        let terms = self.terms;
        let window = self.sums.entry(key).or_insert_with(|| vec![0; terms]);
        for (total, &sum) in window.iter_mut().zip(sums) {
            *total += i128::from(sum);
        }
        self.shrink();
    }

    /// Adds all windows of another collection of the same terms and bound.
    pub fn merge(&mut self, mut other: Windows) {
        let level = self.level.max(other.level);
        self.rise_to(level);
        other.rise_to(level);
        for (key, sums) in other.sums {
            add_into(&mut self.sums, key, sums);
        }
        self.shrink();
    }

    /// Whether both hold windows of the same terms and bound.
    pub(super) fn same_shape(&self, other: &Windows) -> bool {
        self.terms == other.terms
            && self.most == other.most
            && other.level <= CONTIG_LEVEL + FOLD_BITS
            && other.sums.values().all(|sums| sums.len() == self.terms)
    }

    /// Whether there are no more windows than are kept, and their sums can be added up further.
    pub(super) fn is_bounded(&self) -> bool {
        self.sums.len() <= self.most && bounds::terms(self.sums.values().flatten())
    }

    /// Number of windows with loci.
    pub fn len(&self) -> usize {
        self.sums.len()
    }

    /// Whether no locus came yet.
    pub fn is_empty(&self) -> bool {
        self.sums.is_empty()
    }

    /// Sums by jackknife block: whole contigs where at least [`ENOUGH_BLOCKS`] carry loci, else the
    /// longest windows of which there are that many, else the finest windows kept.
    pub fn blocks(&self) -> Vec<Vec<i128>> {
        let mut coarse = self.clone();
        coarse.rise_to(self.block_level());
        coarse.sums.into_values().collect()
    }

    /// The cut of the genome into jackknife blocks that [`Windows::blocks`] uses.
    pub fn blocking(&self) -> Blocking {
        let mut coarse = self.clone();
        coarse.rise_to(self.block_level());
        let blocks = coarse.sums.into_keys().zip(0..).collect();
        Blocking {
            level: self.block_level(),
            blocks,
        }
    }

    fn block_level(&self) -> u32 {
        let mut level = CONTIG_LEVEL.max(self.level);
        while level > self.level && self.count_at(level) < ENOUGH_BLOCKS {
            level -= 1;
        }
        level
    }

    fn count_at(&self, level: u32) -> usize {
        let keys: std::collections::BTreeSet<_> = self
            .sums
            .keys()
            .map(|&key| lift(key, self.level, level))
            .collect();
        keys.len()
    }

    fn shrink(&mut self) {
        while self.sums.len() > self.most {
            self.rise_to(self.level + 1);
        }
    }

    fn rise_to(&mut self, level: u32) {
        if level == self.level {
            return;
        }
        let from = self.level;
        self.level = level;
        for (key, sums) in std::mem::take(&mut self.sums) {
            add_into(&mut self.sums, lift(key, from, level), sums);
        }
    }
}

/// Jackknife blocks by place in the genome.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Blocking {
    level: u32,
    blocks: BTreeMap<(u64, u64), u32>,
}

impl Blocking {
    /// The block of a place; `None` where no locus came.
    pub fn block(&self, contig_hash: u64, position: u64) -> Option<u32> {
        self.blocks
            .get(&key_at(self.level, contig_hash, position))
            .copied()
    }
}

fn add_into(map: &mut BTreeMap<(u64, u64), Vec<i128>>, key: (u64, u64), sums: Vec<i128>) {
    match map.entry(key) {
        std::collections::btree_map::Entry::Vacant(place) => {
            place.insert(sums);
        }
        std::collections::btree_map::Entry::Occupied(mut place) => {
            for (total, sum) in place.get_mut().iter_mut().zip(sums) {
                *total += sum;
            }
        }
    }
}

fn key_at(level: u32, contig_hash: u64, position: u64) -> (u64, u64) {
    lift((contig_hash, position >> FINEST_SHIFT), 0, level)
}

/// The window of level `to` that holds a window of level `from`.
fn lift((contig, window): (u64, u64), from: u32, to: u32) -> (u64, u64) {
    if to < CONTIG_LEVEL {
        return (contig, window >> (to - from));
    }
    let folds = (to - CONTIG_LEVEL).min(FOLD_BITS);
    let contig = if folds == 0 {
        contig
    } else {
        contig & ((1 << (FOLD_BITS - folds)) - 1)
    };
    (contig, 0)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn filled(loci: &[(u64, u64)], most: usize) -> Windows {
        let mut windows = Windows::new(1, most);
        for &(contig, position) in loci {
            windows.add(
                crate::model::stable_hash(&contig.to_le_bytes()),
                position,
                &[1],
            );
        }
        windows
    }

    proptest! {
        #[test]
        fn order_and_splitting_do_not_matter(
            loci in prop::collection::vec((0u64..90, 0u64..5_000_000), 1..400),
            cut in 0usize..400,
            swap in any::<bool>(),
        ) {
            let whole = filled(&loci, 40);
            prop_assert!(whole.len() <= 40);
            let cut = cut.min(loci.len());
            let (mut a, mut b) = (filled(&loci[..cut], 40), filled(&loci[cut..], 40));
            if swap { std::mem::swap(&mut a, &mut b); }
            a.merge(b);
            prop_assert_eq!(&a, &whole);
            let total: i128 = whole.blocks().iter().map(|b| b[0]).sum();
            prop_assert_eq!(total, loci.len() as i128);
        }
    }

    #[test]
    fn many_contigs_become_blocks_themselves() {
        let loci: Vec<_> = (0..30)
            .flat_map(|c| (0..50).map(move |p| (c, p * 1_000_000)))
            .collect();
        assert_eq!(filled(&loci, 4096).blocks().len(), 30);
    }

    #[test]
    fn few_contigs_are_cut_into_equal_windows() {
        let loci: Vec<_> = (0..2)
            .flat_map(|c| (0..100).map(move |p| (c, p * 1_000_000)))
            .collect();
        let blocks = filled(&loci, 4096).blocks();
        assert!(
            (ENOUGH_BLOCKS..2 * ENOUGH_BLOCKS + 2).contains(&blocks.len()),
            "{}",
            blocks.len()
        );
    }
}
