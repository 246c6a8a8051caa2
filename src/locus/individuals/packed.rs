//! Genotypes packed two bits each, so that pairs of individuals are compared 64 loci at a time.

use std::ops::Range;

use super::PairCounts;
use crate::model::MISSING_DOSAGE;

/// Rows compared with one other individual while that one is in the nearest cache: 16 rows of 50 000
/// loci are 200 kB, which the next cache holds.
const TILE: usize = 16;

/// Biallelic genotypes of many individuals: two bit planes each, the low and the high bit of the
/// dosage, so 3 (both bits) is missing. Memory: a quarter byte an individual and locus.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct PackedGenotypes {
    loci: usize,
    individuals: Vec<Planes>,
}

/// The planes of one individual; unused bits of the last word are missing.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
struct Planes {
    low: Vec<u64>,
    high: Vec<u64>,
}

impl PackedGenotypes {
    /// No locus yet.
    pub fn new(individuals: usize) -> Self {
        PackedGenotypes {
            loci: 0,
            individuals: vec![Planes::default(); individuals],
        }
    }

    /// Adds a locus: the dosage of each individual, [`MISSING_DOSAGE`] where missing.
    ///
    /// # Panics
    /// When there is not one dosage an individual.
    pub fn push(&mut self, dosages: &[u8]) {
        assert_eq!(
            dosages.len(),
            self.individuals.len(),
            "one dosage an individual"
        );
        let bit = self.loci % 64;
        for (planes, &dosage) in self.individuals.iter_mut().zip(dosages) {
            if bit == 0 {
                planes.low.push(u64::MAX);
                planes.high.push(u64::MAX);
            }
            let dosage = dosage.min(MISSING_DOSAGE);
            let word = planes.low.len() - 1;
            planes.low[word] &= !(u64::from(dosage & 1 == 0) << bit);
            planes.high[word] &= !(u64::from(dosage & 2 == 0) << bit);
        }
        self.loci += 1;
    }

    /// Number of loci.
    pub fn loci(&self) -> usize {
        self.loci
    }

    /// Number of individuals.
    pub fn individuals(&self) -> usize {
        self.individuals.len()
    }

    /// Compares two individuals over all loci typed in both.
    pub fn compare(&self, first: usize, second: usize) -> PairCounts {
        self.individuals[first].compare(&self.individuals[second])
    }

    /// Compares each individual of `rows` with every later one, and hands over both indices (the
    /// lower first) with the counts. Calls for disjoint rows are independent: give each thread its
    /// own (see [`row_blocks`]). Pairs come tile by tile, in an order that depends on `rows` only.
    pub fn compare_rows(
        &self,
        rows: Range<usize>,
        mut visit: impl FnMut(usize, usize, PairCounts),
    ) {
        let mut start = rows.start;
        while start < rows.end {
            let tile = start..(start + TILE).min(rows.end);
            for second in start + 1..self.individuals.len() {
                for first in tile.start..tile.end.min(second) {
                    visit(first, second, self.compare(first, second));
                }
            }
            start = tile.end;
        }
    }
}

impl Planes {
    fn compare(&self, other: &Planes) -> PairCounts {
        let mut counters = [Counter::default(); 5];
        let blocks = |plane: &[u64]| plane.len() / BLOCK * BLOCK;
        let whole = blocks(&self.low);
        let (low, low_rest) = self.low.split_at(whole);
        let (high, high_rest) = self.high.split_at(whole);
        let (other_low, other_low_rest) = other.low.split_at(whole);
        let (other_high, other_high_rest) = other.high.split_at(whole);
        let ours = low.chunks_exact(BLOCK).zip(high.chunks_exact(BLOCK));
        let theirs = other_low
            .chunks_exact(BLOCK)
            .zip(other_high.chunks_exact(BLOCK));
        for ((l, h), (m, i)) in ours.zip(theirs) {
            let mut masks = [[0; BLOCK]; 5];
            for word in 0..BLOCK {
                let here = compared(l[word], h[word], m[word], i[word]);
                for (mask, bits) in masks.iter_mut().zip(here) {
                    mask[word] = bits;
                }
            }
            counters
                .iter_mut()
                .zip(&masks)
                .for_each(|(counter, mask)| counter.add(mask));
        }
        let mut counts = counters.map(|counter| counter.total());
        let ours = low_rest.iter().zip(high_rest);
        let theirs = other_low_rest.iter().zip(other_high_rest);
        for ((&l, &h), (&m, &i)) in ours.zip(theirs) {
            for (count, bits) in counts.iter_mut().zip(compared(l, h, m, i)) {
                *count += bits.count_ones();
            }
        }
        let [shared, first, second, both, opposite] = counts;
        // Neither both homozygous alike nor both heterozygous.
        let one_heterozygous = first + second - 2 * both;
        PairCounts {
            shared,
            heterozygous_first: first,
            heterozygous_second: second,
            both_heterozygous: both,
            nothing_in_common: opposite,
            mismatching: one_heterozygous + opposite,
        }
    }
}

/// Words that are compared at once: four adders of four words each.
const BLOCK: usize = 16;
const LANES: usize = 4;
type Lanes = [u64; LANES];

/// Masks of the loci typed in both; of these, heterozygous here, there, in both; and opposite
/// homozygotes. From the low and high bits of the dosages of two individuals.
fn compared(low: u64, high: u64, other_low: u64, other_high: u64) -> [u64; 5] {
    let (typed, other_typed) = (!(low & high), !(other_low & other_high));
    let (heterozygous, other_heterozygous) = (low & !high, other_low & !other_high);
    [
        typed & other_typed,
        heterozygous & other_typed,
        typed & other_heterozygous,
        heterozygous & other_heterozygous,
        // Homozygous here and there, with high bits that differ.
        !(low | other_low) & (high ^ other_high),
    ]
}

/// Counts set bits of many words. Bits are added up in place, lane by lane, so that only one word in
/// four is counted (the adder of Harley and Seal, in Knuth, TAOCP 4A, 7.1.3). The baseline processor
/// has no instruction that counts bits: all pairs of 2000 individuals at 50 000 loci took 12 to 15 s on
/// two busy cores, and 33 s when every word was counted.
#[derive(Debug, Clone, Copy, Default)]
struct Counter {
    ones: Lanes,
    twos: Lanes,
    fours: u32,
}

impl Counter {
    fn add(&mut self, block: &[u64; BLOCK]) {
        let mut counted = 0;
        for lane in 0..LANES {
            let word = |i: usize| block[LANES * i + lane];
            let (sum, first) = add_bits(self.ones[lane], word(0), word(1));
            let (ones, second) = add_bits(sum, word(2), word(3));
            let (twos, fours) = add_bits(self.twos[lane], first, second);
            (self.ones[lane], self.twos[lane]) = (ones, twos);
            counted += fours.count_ones();
        }
        self.fours += counted;
    }

    fn total(self) -> u32 {
        let count = |lanes: Lanes| lanes.iter().map(|l| l.count_ones()).sum::<u32>();
        4 * self.fours + 2 * count(self.twos) + count(self.ones)
    }
}

/// Sum and carry of three bits, at every place of a word.
fn add_bits(a: u64, b: u64, c: u64) -> (u64, u64) {
    let half = a ^ b;
    (half ^ c, (a & b) | (half & c))
}

/// Cuts the individuals into at most `blocks` ranges of about equally many pairs (each individual
/// counts its pairs with later ones), for [`PackedGenotypes::compare_rows`].
pub fn row_blocks(individuals: usize, blocks: usize) -> Vec<Range<usize>> {
    let pairs = individuals * individuals.saturating_sub(1) / 2;
    let share = pairs.div_ceil(blocks.max(1)).max(1);
    let (mut ranges, mut start, mut held) = (Vec::new(), 0, 0);
    for i in 0..individuals {
        held += individuals - 1 - i;
        if held >= share {
            ranges.push(start..i + 1);
            (start, held) = (i + 1, 0);
        }
    }
    // What is left has too few pairs for a block of its own, or none: the last individual.
    match ranges.last_mut() {
        Some(last) if held == 0 => last.end = individuals,
        _ if start < individuals => ranges.push(start..individuals),
        _ => {}
    }
    ranges
}
