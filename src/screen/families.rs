//! Families in a sample, and what they do to the effective size by linkage.

use super::genotypes::ScreenGenotypes;
use super::matching::{PairFound, PairKind};
use crate::locus::Counts;
use crate::locus::individuals::Closeness;
use crate::merge::gram::{FrequencyCutoff, GramStratum};
use crate::model::{Genotypes, MISSING_DOSAGE};
use crate::ne::linkage::{LinkageEstimate, LinkagePairs, LinkagePanel, Mating, SizeInterval};

/// Loci behind the effective sizes with and without families: they are compared with each other, and
/// individuals limit their precision.
pub const FAMILY_LOCI: usize = 3_000;
/// Expected opposite homozygotes of full sibs below which sibs cannot be told from parents.
const FEWEST_OPPOSITE: f64 = 5.0;
/// Standard normal value of 95 % intervals.
const QUANTILE: f64 = 1.959_963_984_540_054;

/// Whether a pair of the first degree of one stratum has the opposite homozygotes of full sibs (more
/// than half of those expected) rather than those of parent and offspring, who have none but for
/// errors. `None` when too few are expected to tell.
pub fn sib_like(genotypes: &ScreenGenotypes, stratum: usize, pair: &PairFound) -> Option<bool> {
    let shared = f64::from(pair.biallelic.shared);
    let expected = genotypes.strata[stratum].sibs_opposite * shared;
    let found = f64::from(pair.biallelic.nothing_in_common);
    (expected >= FEWEST_OPPOSITE).then_some(found > expected / 2.0)
}

/// Families of full sibs within strata: slots joined by pairs of the first degree that are like full
/// sibs, or cannot be told from them. Slots of `left_out` take no part.
pub fn full_sib_families(
    genotypes: &ScreenGenotypes,
    pairs: &[PairFound],
    stratum_of: &[usize],
    left_out: &[bool],
) -> Vec<Vec<usize>> {
    let mut family: Vec<usize> = (0..stratum_of.len()).collect();
    for pair in pairs {
        let (a, b) = (pair.first, pair.second);
        let first_degree = pair.kind == PairKind::Related(Closeness::First);
        let together = stratum_of[a] == stratum_of[b] && !left_out[a] && !left_out[b];
        if first_degree && together && sib_like(genotypes, stratum_of[a], pair) != Some(false) {
            let (keep, drop) = (family[a].min(family[b]), family[a].max(family[b]));
            family
                .iter_mut()
                .filter(|f| **f == drop)
                .for_each(|f| *f = keep);
        }
    }
    let mut members = vec![Vec::new(); family.len()];
    for (slot, &f) in family.iter().enumerate() {
        members[f].push(slot);
    }
    members.retain(|m| m.len() > 1);
    members
}

/// An effective size by linkage from some of the individuals of a stratum.
#[derive(Debug, Clone, PartialEq)]
pub struct SizeBySample {
    /// Individuals.
    pub individuals: usize,
    /// Loci at the frequency cutoff of 0.05.
    pub loci: u64,
    /// The estimate; none is unbounded.
    pub size: Option<f64>,
    /// Its 95 % interval, which counts individuals.
    pub interval: Option<SizeInterval>,
    /// Why there is no estimate.
    pub absent: Option<String>,
}

/// Effective size with whole families and with one individual of each.
#[derive(Debug, Clone, PartialEq)]
pub struct FamilyEffect {
    /// From all distinct individuals.
    pub whole: SizeBySample,
    /// From all but the later members of each family.
    pub one_each: SizeBySample,
}

/// Both effective sizes of one stratum from some loci of two alleles (hash of the contig, dosages of
/// all slots; [`FAMILY_LOCI`] are enough): `slots` are its distinct individuals, `families` those of the
/// stratum.
pub fn family_effect(
    rows: &[(u64, Vec<u8>)],
    slots: &[usize],
    families: &[Vec<usize>],
) -> FamilyEffect {
    let later: Vec<usize> = families.iter().flat_map(|f| f[1..].to_vec()).collect();
    let one_each: Vec<usize> = slots
        .iter()
        .copied()
        .filter(|s| !later.contains(s))
        .collect();
    FamilyEffect {
        whole: size_of(rows, slots),
        one_each: size_of(rows, &one_each),
    }
}

fn size_of(rows: &[(u64, Vec<u8>)], slots: &[usize]) -> SizeBySample {
    let absent = |why: String| SizeBySample {
        individuals: slots.len(),
        loci: 0,
        size: None,
        interval: None,
        absent: Some(why),
    };
    let mut gram = match GramStratum::new(slots.len()) {
        Ok(gram) => gram,
        Err(why) => return absent(why.to_string()),
    };
    let cutoff = FrequencyCutoff::FivePercent;
    let mut panel = LinkagePanel::new(slots.len(), cutoff);
    let (mut locus, mut counts) = (Genotypes::default(), Counts::default());
    for (contig, row) in rows {
        locus.reset(slots.len(), 2);
        for (out, &slot) in locus.dosages_mut().iter_mut().zip(slots) {
            *out = row.get(slot).copied().unwrap_or(MISSING_DOSAGE);
        }
        counts.recount(&locus, 0..slots.len());
        gram.add(*contig, &locus, 0..slots.len(), &counts);
        panel.push(*contig, &locus, 0..slots.len(), &counts);
    }
    let sums = gram.pairs(cutoff);
    let pairs = match sums.contigs() < 2 {
        true => LinkagePairs::All,
        false => LinkagePairs::BetweenContigs,
    };
    match LinkageEstimate::of(&sums, pairs, cutoff, Mating::Random) {
        Err(why) => absent(why.to_string()),
        Ok(mut estimate) => {
            estimate.individual_variance = panel.individual_variance(pairs);
            SizeBySample {
                individuals: slots.len(),
                loci: estimate.loci,
                size: estimate.effective_size(),
                interval: estimate.size_interval(QUANTILE),
                absent: None,
            }
        }
    }
}
