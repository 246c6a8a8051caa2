//! The kept genotypes, laid out for comparing individuals.

use std::ops::Range;

use crate::locus::Counts;
use crate::locus::individuals::{PackedGenotypes, PairCounts, probability_of_identity_sibs};
use crate::locus::runs::Place;
use crate::merge::screen::{ScreenPanel, ScreenScheme};
use crate::model::Genotypes;

/// Blocks of neighbouring loci behind the interval of a kinship: enough for a variance, few enough
/// that a block of a small panel holds several loci.
const BLOCKS: usize = 50;
/// Fewest loci of a block.
const BLOCK_LOCI: usize = 4;

/// Kept genotypes of all slots.
#[derive(Debug, Clone)]
pub struct ScreenGenotypes {
    /// Loci of two alleles, by contig and position.
    pub packed: PackedGenotypes,
    /// The same loci cut into blocks of neighbours.
    pub blocks: Vec<PackedGenotypes>,
    /// Where they are; contigs numbered in the order of their names.
    pub places: Vec<Place>,
    /// Hash of the contig of each.
    pub contigs: Vec<u64>,
    /// Loci of more alleles.
    pub repeats: Vec<Genotypes>,
    /// Hash of the contig of each.
    pub repeat_contigs: Vec<u64>,
    /// Frequencies by stratum, from its counted slots.
    pub strata: Vec<StratumFrequencies>,
}

/// Allele frequencies of the kept loci in one stratum.
#[derive(Debug, Clone, PartialEq)]
pub struct StratumFrequencies {
    /// Frequency of allele 1 at loci of two alleles; none where nobody is typed.
    pub biallelic: Vec<Option<f64>>,
    /// Counts at loci of more alleles.
    pub repeats: Vec<Counts>,
    /// Individuals that count.
    pub individuals: usize,
    /// Mean over loci of the chance that two full sibs have different genotypes (Evett & Weir 1998).
    pub sibs_differ: f64,
    /// Mean over loci of two alleles of the chance that two full sibs are opposite homozygotes,
    /// p^2 q^2 / 2: both alleles differ by descent in a quarter of loci.
    pub sibs_opposite: f64,
}

impl ScreenGenotypes {
    /// Lays out a panel.
    pub fn of(panel: &ScreenPanel, scheme: &ScreenScheme) -> Self {
        let slots = scheme.strata.last().map_or(0, |s| s.end);
        let loci = panel.loci();
        let per_block = loci.len().div_ceil(BLOCKS).max(BLOCK_LOCI);
        let mut packed = PackedGenotypes::new(slots);
        let mut blocks = Vec::new();
        let (mut places, mut contigs) = (Vec::new(), Vec::new());
        let mut frequencies = vec![Vec::with_capacity(loci.len()); scheme.strata.len()];
        let mut dosages = vec![0; slots];
        for (l, locus) in loci.iter().enumerate() {
            locus.unpack(&mut dosages);
            packed.push(&dosages);
            if l % per_block == 0 {
                blocks.push(PackedGenotypes::new(slots));
            }
            if let Some(block) = blocks.last_mut() {
                block.push(&dosages);
            }
            let new = l > 0 && loci[l - 1].contig != locus.contig;
            let number = places.last().map_or(0, |&(c, _): &Place| c) + u32::from(new);
            places.push((number, locus.position));
            contigs.push(locus.contig_hash);
            for (out, slots) in frequencies.iter_mut().zip(&scheme.counted) {
                out.push(frequency(&dosages[slots.clone()]));
            }
        }
        let repeats: Vec<Genotypes> = panel.repeats().map(|r| r.genotypes.clone()).collect();
        let strata = frequencies
            .into_iter()
            .zip(&scheme.counted)
            .map(|(biallelic, slots)| StratumFrequencies::of(biallelic, &repeats, slots.clone()))
            .collect();
        ScreenGenotypes {
            packed,
            blocks,
            places,
            contigs,
            repeats,
            repeat_contigs: panel.repeats().map(|r| r.contig_hash).collect(),
            strata,
        }
    }

    /// Compares two slots over loci of more alleles, one by one.
    pub fn compare_repeats(&self, first: usize, second: usize) -> PairCounts {
        let mut counts = PairCounts::default();
        for locus in &self.repeats {
            counts.add(locus.pair(first), locus.pair(second));
        }
        counts
    }

    /// Loci kept, of any number of alleles.
    pub fn loci(&self) -> usize {
        self.places.len() + self.repeats.len()
    }
}

impl StratumFrequencies {
    fn of(biallelic: Vec<Option<f64>>, repeats: &[Genotypes], slots: Range<usize>) -> Self {
        let individuals = slots.len();
        let counted = |locus: &Genotypes| {
            let mut counts = Counts::default();
            counts.recount(locus, slots.clone());
            counts
        };
        let repeats: Vec<Counts> = repeats.iter().map(counted).collect();
        let (mut differ, mut opposite, mut loci) = (0.0, 0.0, 0.0);
        for p in biallelic.iter().flatten() {
            differ += 1.0 - probability_of_identity_sibs(&[*p, 1.0 - p]);
            opposite += (p * (1.0 - p)).powi(2) / 2.0;
            loci += 1.0;
        }
        let sibs_opposite = if loci > 0.0 { opposite / loci } else { 0.0 };
        for counts in repeats.iter().filter(|c| c.typed > 0) {
            let copies = f64::from(counts.gene_copies());
            let p: Vec<f64> = counts
                .copies
                .iter()
                .map(|&c| f64::from(c) / copies)
                .collect();
            differ += 1.0 - probability_of_identity_sibs(&p);
            loci += 1.0;
        }
        StratumFrequencies {
            biallelic,
            repeats,
            individuals,
            sibs_differ: if loci > 0.0 { differ / loci } else { 0.0 },
            sibs_opposite,
        }
    }
}

fn frequency(dosages: &[u8]) -> Option<f64> {
    let typed = dosages.iter().filter(|&&d| d < 3);
    let (n, copies) = typed.fold((0u32, 0u32), |(n, copies), &d| {
        (n + 1, copies + u32::from(d))
    });
    (n > 0).then(|| f64::from(copies) / f64::from(2 * n))
}
