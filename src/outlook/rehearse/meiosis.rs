//! Haplotypes of one unit through the pedigree: 64 loci a word, recombined under masks.

use super::dice::{Dice, Purpose};
use super::genome::{Unit, common_frequencies, diverged};
use super::population::{History, Origin};
use super::sampling::Source;
use super::scenario::Scenario;
use super::watch::{Gone, Watch, count_strata};

/// Where the loci of a unit are in a haplotype. Word `w` holds loci 64w to 64w + 63, once for each
/// bit that its allele codes need (its planes): locus `l` has code `sum of bit(l, plane) << plane`.
#[derive(Debug, Clone)]
pub struct Layout {
    /// Index of the first plane of each word, and the total at the end.
    offsets: Vec<usize>,
    /// Alleles of each locus.
    pub alleles: Vec<u16>,
    /// Distance of each locus along the map in morgans; empty when unlinked.
    map: Vec<f64>,
    /// Length of the map in morgans.
    map_length: f64,
}

/// Haplotypes of many individuals: two rows of words each.
#[derive(Debug, Clone, Default)]
pub struct Haplotypes {
    stride: usize,
    words: Vec<u64>,
}

/// What became of one unit.
#[derive(Debug, Clone)]
pub struct Transmission {
    /// Layout of the haplotypes.
    pub layout: Layout,
    /// Haplotypes of the samples, in their order.
    pub samples: Haplotypes,
    /// By stratum: gene copies by locus and allele among all adults of the population.
    pub copies: Vec<Vec<Vec<u32>>>,
    /// By population: alleles there at its first visit and gone for good: locus, allele and first
    /// generation without it.
    pub gone: Vec<Vec<Gone>>,
}

impl Layout {
    /// The layout of a unit, with its map in proportion to base pairs.
    pub fn new(scenario: &Scenario, unit: &Unit, length_bp: u64, map_morgans: Option<f64>) -> Self {
        let alleles: Vec<u16> = unit
            .sites
            .iter()
            .map(|s| scenario.loci[s.set as usize].alleles as u16)
            .collect();
        let mut offsets = vec![0];
        for word in alleles.chunks(64) {
            let most = word.iter().copied().max().unwrap_or(2).max(2);
            offsets.push(offsets[offsets.len() - 1] + (16 - (most - 1).leading_zeros()) as usize);
        }
        let map = map_morgans.map_or(Vec::new(), |length| {
            unit.sites
                .iter()
                .map(|s| f64::from(s.position) / length_bp as f64 * length)
                .collect()
        });
        Layout {
            offsets,
            alleles,
            map,
            map_length: map_morgans.unwrap_or(0.0),
        }
    }

    /// Words of a haplotype.
    fn stride(&self) -> usize {
        self.offsets[self.offsets.len() - 1]
    }

    /// Number of 64-locus words.
    pub fn blocks(&self) -> usize {
        self.offsets.len() - 1
    }

    /// Which loci of a block have this allele code in a haplotype, a bit a locus.
    pub fn matches(&self, haplotype: &[u64], block: usize, code: u16) -> u64 {
        let planes = &haplotype[self.offsets[block]..self.offsets[block + 1]];
        let bit = |p: usize, w: u64| if code >> p & 1 == 1 { w } else { !w };
        planes
            .iter()
            .enumerate()
            .fold(self.used(block), |found, (p, &w)| found & bit(p, w))
    }

    /// Allele code of a locus in a haplotype.
    pub fn code(&self, haplotype: &[u64], locus: usize) -> u16 {
        let (word, bit) = (locus / 64, locus % 64);
        let planes = &haplotype[self.offsets[word]..self.offsets[word + 1]];
        planes
            .iter()
            .enumerate()
            .map(|(p, w)| ((w >> bit & 1) as u16) << p)
            .sum()
    }

    fn set(&self, haplotype: &mut [u64], locus: usize, code: u16) {
        let (word, bit) = (locus / 64, locus % 64);
        let planes = &mut haplotype[self.offsets[word]..self.offsets[word + 1]];
        for (p, w) in planes.iter_mut().enumerate() {
            *w |= u64::from(code >> p & 1) << bit;
        }
    }

    /// Highest number of alleles in a word.
    pub fn most_alleles(&self, block: usize) -> u16 {
        let loci = &self.alleles[64 * block..self.alleles.len().min(64 * block + 64)];
        loci.iter().copied().max().unwrap_or(2)
    }

    /// Bits of a word that hold loci.
    pub fn used(&self, block: usize) -> u64 {
        let loci = self.alleles.len().min(64 * block + 64) - 64 * block;
        if loci == 64 {
            u64::MAX
        } else {
            (1 << loci) - 1
        }
    }
}

impl Haplotypes {
    fn new(individuals: usize, stride: usize) -> Self {
        Haplotypes {
            stride,
            words: vec![0; 2 * individuals * stride],
        }
    }

    /// One of the two haplotypes (0 from the mother, 1 from the father) of an individual.
    pub fn get(&self, individual: usize, side: usize) -> &[u64] {
        let start = (2 * individual + side) * self.stride;
        &self.words[start..start + self.stride]
    }

    fn get_mut(&mut self, individual: usize, side: usize) -> &mut [u64] {
        let start = (2 * individual + side) * self.stride;
        &mut self.words[start..start + self.stride]
    }
}

/// Carries a unit through the pedigree.
pub fn transmit(
    scenario: &Scenario,
    history: &History,
    unit: &Unit,
    layout: Layout,
    seed: u64,
) -> Transmission {
    let frequencies = first_frequencies(scenario, unit, &layout, seed);
    let mut founding = Dice::new(seed, Purpose::Founders, unit.number, 0);
    let mut samples = Haplotypes::new(history.samples.len(), layout.stride());
    let mut copies = vec![Vec::new(); history.strata.len()];
    let mut watch = Watch::new(scenario, history, &layout);
    let (mut before, mut adults) = (Haplotypes::default(), Haplotypes::default());
    for (index, generation) in history.generations.iter().enumerate() {
        std::mem::swap(&mut before, &mut adults);
        let mut born = |origins: &[Origin], purpose: Purpose, into: &mut Haplotypes| {
            let mut dice = Dice::new(seed, purpose, unit.number, index as u64);
            into.stride = layout.stride();
            into.words.clear();
            into.words.resize(2 * origins.len() * layout.stride(), 0);
            for (child, origin) in origins.iter().enumerate() {
                for side in 0..2 {
                    let haplotype = into.get_mut(child, side);
                    match *origin {
                        Origin::Founder(population) => {
                            let first = &frequencies[population as usize];
                            draw_founder(first, &layout, haplotype, &mut founding);
                        }
                        Origin::Child(parents) => {
                            let parent = parents[side] as usize;
                            let pair = [before.get(parent, 0), before.get(parent, 1)];
                            gamete(&layout, pair, haplotype, &mut dice);
                        }
                    }
                }
            }
        };
        born(&generation.origins, Purpose::Meiosis, &mut adults);
        let mut juveniles = Haplotypes::default();
        if !generation.juveniles.is_empty() {
            born(&generation.juveniles, Purpose::Juveniles, &mut juveniles);
        }
        keep_samples(history, index, &adults, &juveniles, &mut samples);
        count_strata(history, index, generation, &layout, &adults, &mut copies);
        watch.look(&layout, index, generation, &adults);
    }
    Transmission {
        layout,
        samples,
        copies,
        gone: watch.finish(),
    }
}

/// Running sums of the first frequencies of one population, as limits of a random 32-bit number:
/// the allele code is the number of limits of the locus at or below it.
struct FirstFrequencies {
    limits: Vec<u64>,
    /// Where the limits of each locus end.
    ends: Vec<usize>,
}

fn first_frequencies(
    scenario: &Scenario,
    unit: &Unit,
    layout: &Layout,
    seed: u64,
) -> Vec<FirstFrequencies> {
    let mut dice = Dice::new(seed, Purpose::Frequencies, unit.number, 0);
    let empty = |_| FirstFrequencies {
        limits: Vec::new(),
        ends: Vec::new(),
    };
    let mut all: Vec<FirstFrequencies> = scenario.population.iter().map(empty).collect();
    for (site, &alleles) in unit.sites.iter().zip(&layout.alleles) {
        let set = &scenario.loci[site.set as usize];
        let common = common_frequencies(&set.frequencies, alleles as usize, &mut dice);
        for (population, first) in scenario.population.iter().zip(&mut all) {
            let own = diverged(&common, population.divergence, &mut dice);
            let mut sum = 0.0;
            for frequency in &own[..own.len() - 1] {
                sum += frequency;
                first.limits.push((sum * 4_294_967_296.0).round() as u64);
            }
            first.ends.push(first.limits.len());
        }
    }
    all
}

/// Draws the codes of a haplotype, two numbers a word of chance.
fn draw_founder(first: &FirstFrequencies, layout: &Layout, haplotype: &mut [u64], dice: &mut Dice) {
    let (mut word, mut start) = (0, 0);
    for (locus, &end) in first.ends.iter().enumerate() {
        word = if locus % 2 == 0 {
            dice.word()
        } else {
            word >> 32
        };
        let number = word & 0xffff_ffff;
        let limits = &first.limits[start..end];
        start = end;
        let code = limits.iter().map(|&limit| u16::from(number >= limit)).sum();
        layout.set(haplotype, locus, code);
    }
}

/// Makes a gamete of a parent's two haplotypes.
pub fn gamete(layout: &Layout, parent: [&[u64]; 2], child: &mut [u64], dice: &mut Dice) {
    if layout.map.is_empty() {
        for block in 0..layout.blocks() {
            let mask = dice.word();
            for plane in layout.offsets[block]..layout.offsets[block + 1] {
                child[plane] = (parent[0][plane] & mask) | (parent[1][plane] & !mask);
            }
        }
        return;
    }
    let strand = (dice.word() & 1) as usize;
    child.copy_from_slice(parent[strand]);
    // Crossovers without interference are a Poisson process along the map (Haldane 1919); every
    // second stretch between them comes from the other strand.
    let place = |point: f64| layout.map.partition_point(|&m| m <= point);
    let mut start = dice.waiting_time();
    while start < layout.map_length {
        let end = start + dice.waiting_time();
        let (from, to) = (place(start), place(end));
        if to > from {
            overlay(layout, parent[1 - strand], child, from, to);
        }
        start = end + dice.waiting_time();
    }
}

/// Copies loci `from..to` of a haplotype.
fn overlay(layout: &Layout, source: &[u64], child: &mut [u64], from: usize, to: usize) {
    let (first, last) = (from / 64, (to - 1) / 64);
    for block in first..=last {
        let mut mask = u64::MAX;
        if block == first {
            mask &= u64::MAX << (from % 64);
        }
        if block == last {
            mask &= u64::MAX >> (63 - (to - 1) % 64);
        }
        for plane in layout.offsets[block]..layout.offsets[block + 1] {
            child[plane] = (source[plane] & mask) | (child[plane] & !mask);
        }
    }
}

fn keep_samples(
    history: &History,
    index: usize,
    adults: &Haplotypes,
    juveniles: &Haplotypes,
    samples: &mut Haplotypes,
) {
    for (sample, taken) in history.samples.iter().enumerate() {
        let (from, individual) = match taken.source {
            Source::Adult { generation, adult } if generation == index => (adults, adult),
            Source::Juvenile {
                generation,
                juvenile,
            } if generation == index => (juveniles, juvenile),
            _ => continue,
        };
        for side in 0..2 {
            samples
                .get_mut(sample, side)
                .copy_from_slice(from.get(individual, side));
        }
    }
}
