//! Whether the panel can tell individuals: the chance that two of them have the same genotypes.

use super::genotypes::ScreenGenotypes;
use crate::locus::individuals::{
    expected_chance_matches, probability_of_identity_sibs, probability_of_identity_unbiased,
};

/// The guideline of Waits, Luikart & Taberlet (2001): a chance over all loci of at most 0.01, better
/// 0.0001.
const LARGEST: f64 = 0.01;
const SAFE: f64 = 0.0001;

/// What a panel tells of individuals.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Telling {
    /// Even full sibs: their chance is at most 0.0001.
    Sibs,
    /// Full sibs mostly: their chance is at most 0.01.
    MostSibs,
    /// Unrelated individuals alone: their chance is at most 0.01.
    Unrelated,
    /// Not even these.
    Nobody,
}

/// Chances over all kept loci of one stratum, loci taken as independent.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Identity {
    /// log10 of the chance for two unrelated individuals, without bias (Paetkau et al. 1998).
    pub unrelated: f64,
    /// log10 of the chance for two full sibs (Evett & Weir 1998).
    pub sibs: f64,
    /// Pairs of unrelated individuals expected to match by chance in this sample.
    pub chance_matches: f64,
    /// Loci.
    pub loci: usize,
    /// What that means.
    pub telling: Telling,
}

/// Chances of identity in a stratum; none without a locus of four typed gene copies.
pub fn identity(genotypes: &ScreenGenotypes, stratum: usize, individuals: u64) -> Option<Identity> {
    let of = &genotypes.strata[stratum];
    let copies = 2.0 * of.individuals as f64;
    let (mut unrelated, mut sibs, mut loci) = (0.0, 0.0, 0);
    let mut add = |counts: &[u32], frequencies: &[f64]| {
        let Some(chance) = probability_of_identity_unbiased(counts) else {
            return;
        };
        // A sample so small that no two pairs among it differ gives 0: it says nothing.
        if chance > 0.0 {
            unrelated += chance.min(1.0).log10();
            sibs += probability_of_identity_sibs(frequencies).log10();
            loci += 1;
        }
    };
    for p in of.biallelic.iter().flatten() {
        let alternate = (p * copies).round();
        add(
            &[(copies - alternate) as u32, alternate as u32],
            &[1.0 - p, *p],
        );
    }
    for counts in of.repeats.iter().filter(|c| c.typed > 0) {
        let all = f64::from(counts.gene_copies());
        let frequencies: Vec<f64> = counts.copies.iter().map(|&c| f64::from(c) / all).collect();
        add(&counts.copies, &frequencies);
    }
    (loci > 0).then(|| Identity {
        unrelated,
        sibs,
        chance_matches: expected_chance_matches(individuals, 10f64.powf(unrelated)),
        loci,
        telling: if sibs <= SAFE.log10() {
            Telling::Sibs
        } else if sibs <= LARGEST.log10() {
            Telling::MostSibs
        } else if unrelated <= LARGEST.log10() {
            Telling::Unrelated
        } else {
            Telling::Nobody
        },
    })
}
