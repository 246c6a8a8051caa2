//! What the laboratory makes of the true genotypes: miscalls, dropout, missing data, reads.

use super::dice::{Dice, Purpose};
use super::genome::Unit;
use super::meiosis::Transmission;
use super::scenario::{Genotyping, Scenario};

/// A missing genotype in a row of calls.
pub const MISSING: [u8; 2] = [u8::MAX; 2];

/// Genotypes of the samples at one written locus.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct CallRow {
    /// Index of the locus among the sites of its unit.
    pub site: usize,
    /// Called alleles of each sample, the lower code first, or [`MISSING`].
    pub calls: Vec<[u8; 2]>,
    /// Reads of each sample and allele, sample by sample; empty without depth.
    pub reads: Vec<u16>,
}

/// Factors of each sample on rate of missing data and on depth.
#[derive(Debug, Clone, PartialEq)]
pub struct SampleQuality {
    missing: Vec<f64>,
    depth: Vec<f64>,
}

impl SampleQuality {
    /// Draws the factors of `samples` samples.
    pub fn draw(genotyping: &Genotyping, samples: usize, seed: u64) -> Self {
        let mut dice = Dice::new(seed, Purpose::SampleQuality, 0, 0);
        let mut quality = SampleQuality {
            missing: Vec::new(),
            depth: Vec::new(),
        };
        for _ in 0..samples {
            quality
                .missing
                .push(dice.factor(genotyping.missing_spread_samples));
            quality
                .depth
                .push(dice.factor(genotyping.depth_spread_samples));
        }
        quality
    }
}

/// Genotypes the written loci of a unit.
pub fn genotype(
    scenario: &Scenario,
    unit: &Unit,
    transmission: &Transmission,
    quality: &SampleQuality,
    seed: u64,
) -> Vec<CallRow> {
    let mut dice = Dice::new(seed, Purpose::Genotyping, unit.number, 0);
    let genotyping = &scenario.genotyping;
    let samples = quality.missing.len();
    let mut rows = Vec::new();
    for (site, place) in unit.sites.iter().enumerate() {
        if place.shadow {
            continue;
        }
        let twin = unit
            .sites
            .get(site + 1)
            .filter(|next| next.shadow)
            .map(|_| site + 1);
        let alleles = transmission.layout.alleles[site];
        let missing_here = genotyping.missing_rate * dice.factor(genotyping.missing_spread_loci);
        let depth_here = genotyping
            .depth
            .map(|d| d * dice.factor(genotyping.depth_spread_loci));
        let mut row = CallRow {
            site,
            calls: Vec::with_capacity(samples),
            reads: Vec::new(),
        };
        for sample in 0..samples {
            let mut genotype = true_genotype(transmission, sample, site, twin);
            disturb(&mut genotype, alleles, genotyping, &mut dice);
            if dice.chance((missing_here * quality.missing[sample]).min(0.99)) {
                row.calls.push(MISSING);
                row.reads
                    .extend(depth_here.iter().flat_map(|_| vec![0; alleles as usize]));
            } else if let Some(depth) = depth_here {
                let reads = dice.poisson(depth * quality.depth[sample]);
                let counts = draw_reads(genotype, alleles, reads, genotyping, &mut dice);
                row.calls
                    .push(likeliest(&counts, genotyping.read_error_rate));
                row.reads.extend(counts);
            } else {
                genotype.sort_unstable();
                row.calls.push(genotype);
            }
        }
        rows.push(row);
    }
    rows
}

/// The two alleles that an individual shows; with a twin, two different ones of its four gene
/// copies where there are such.
fn true_genotype(t: &Transmission, sample: usize, site: usize, twin: Option<usize>) -> [u8; 2] {
    let code = |side: usize, locus: usize| t.layout.code(t.samples.get(sample, side), locus) as u8;
    let own = [code(0, site), code(1, site)];
    match twin {
        Some(twin) if own[0] == own[1] => {
            let others = [code(0, twin), code(1, twin)];
            let other = others.into_iter().find(|&a| a != own[0]);
            [own[0], other.unwrap_or(own[0])]
        }
        _ => own,
    }
}

/// Dropout, then miscalls.
fn disturb(genotype: &mut [u8; 2], alleles: u16, genotyping: &Genotyping, dice: &mut Dice) {
    if genotype[0] != genotype[1] {
        // Each copy may fail; where both fail, the laboratory repeats the work.
        let rate = genotyping.dropout_rate;
        let (first, second) = (dice.chance(rate), dice.chance(rate));
        if first != second {
            *genotype = if first {
                [genotype[1]; 2]
            } else {
                [genotype[0]; 2]
            };
        }
    }
    for allele in genotype {
        if dice.chance(genotyping.miscall_rate) {
            *allele = another(*allele, alleles, dice);
        }
    }
}

fn another(allele: u8, alleles: u16, dice: &mut Dice) -> u8 {
    let step = 1 + dice.below(u32::from(alleles) - 1);
    ((u32::from(allele) + step) % u32::from(alleles)) as u8
}

fn draw_reads(
    genotype: [u8; 2],
    alleles: u16,
    reads: u32,
    genotyping: &Genotyping,
    dice: &mut Dice,
) -> Vec<u16> {
    let mut counts = vec![0u16; alleles as usize];
    for _ in 0..reads {
        let mut allele = genotype[(dice.word() & 1) as usize];
        if dice.chance(genotyping.read_error_rate) {
            allele = another(allele, alleles, dice);
        }
        let count = &mut counts[allele as usize];
        *count = count.saturating_add(1);
    }
    counts
}

/// The likeliest genotype of these reads, the earliest in the order of the standard among equals;
/// missing without a read.
fn likeliest(reads: &[u16], error: f64) -> [u8; 2] {
    if reads.iter().all(|&n| n == 0) {
        return MISSING;
    }
    let scores = phred_likelihoods(reads, error);
    let best = scores.iter().position(|&s| s == 0).unwrap_or(0);
    let mut index = 0;
    for high in 0..reads.len() as u8 {
        for low in 0..=high {
            if index == best {
                return [low, high];
            }
            index += 1;
        }
    }
    MISSING
}

/// Phred-scaled likelihoods of all genotypes from the reads by allele, the likeliest 0, in the
/// order of the VCF standard (0/0, 0/1, 1/1, 0/2, ...). A read shows each allele of the genotype
/// with probability 1/2, and another allele than the one it was made from with probability `error`.
pub fn phred_likelihoods(reads: &[u16], error: f64) -> Vec<u32> {
    let alleles = reads.len();
    let error = error.clamp(1e-6, 0.5);
    let (right, wrong) = (1.0 - error, error / (alleles as f64 - 1.0));
    let (both, one, none) = (
        right.log10(),
        ((right + wrong) / 2.0).log10(),
        wrong.log10(),
    );
    let total: f64 = reads.iter().map(|&n| f64::from(n)).sum();
    let mut logs = Vec::with_capacity(alleles * (alleles + 1) / 2);
    for high in 0..alleles {
        for low in 0..=high {
            let (a, b) = (f64::from(reads[low]), f64::from(reads[high]));
            logs.push(if low == high {
                a * both + (total - a) * none
            } else {
                (a + b) * one + (total - a - b) * none
            });
        }
    }
    let best = logs.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    logs.iter()
        .map(|&l| (-10.0 * (l - best)).round() as u32)
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Two reads of each of two alleles, error 0.01: log10 of 0.99^2 0.01^2 against 0.5^4, by hand.
    #[test]
    fn likelihoods_of_a_clear_heterozygote() {
        let homozygote =
            -10.0 * (2.0 * 0.99f64.log10() + 2.0 * 0.01f64.log10() - 4.0 * 0.5f64.log10());
        assert_eq!(
            phred_likelihoods(&[2, 2], 0.01),
            [homozygote.round() as u32, 0, 28]
        );
        assert_eq!(likeliest(&[2, 2], 0.01), [0, 1]);
        assert_eq!(likeliest(&[0, 0, 7], 0.01), [2, 2]);
        assert_eq!(likeliest(&[0, 4, 7], 0.01), [1, 2]);
        assert_eq!(likeliest(&[0, 0], 0.01), MISSING);
    }
}
