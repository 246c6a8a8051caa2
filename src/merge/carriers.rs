//! Alleles that a latest sample still holds in few carriers, and what each individual stands for.

use std::collections::{BTreeMap, BTreeSet};
use std::ops::Range;

use serde::{Deserialize, Serialize};

use super::bounds::{self, MOST_ALLELES};
use super::fixed::{from_fixed, to_fixed};
use crate::locus::Counts;
use crate::model::Locus;

/// Alleles with more carriers than this are not at risk through any one of them: with two offspring
/// each, five heterozygous carriers all fail to pass the allele with chance (1/4)^5, below 0.1 %.
pub const FEW_CARRIERS: usize = 4;
/// Offspring assumed of each other carrier: the mean of a population of constant size.
const OFFSPRING: i32 = 2;

/// An allele in few carriers.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
pub struct ScarceAllele {
    /// Copies in the sample, the fewest first.
    pub copies: u32,
    /// Contig name.
    pub contig: String,
    /// 1-based position.
    pub position: u64,
    /// The allele as written.
    pub allele: Vec<u8>,
    /// Gene copies typed.
    pub typed: u32,
    /// Carriers, counted within the stratum.
    pub carriers: Vec<u32>,
}

/// Scarce alleles of one stratum and the individuals they hang on.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Carriers {
    slots: Range<usize>,
    most_listed: usize,
    list: BTreeSet<ScarceAllele>,
    /// Alleles in at most [`FEW_CARRIERS`] carriers.
    pub scarce: u64,
    /// By individual: alleles that it alone carries.
    pub only_carrier: Vec<u64>,
    /// By individual: scarce alleles that it carries.
    pub scarce_carried: Vec<u64>,
    vanish: Vec<i128>,
    /// Scarce alleles that both of two individuals carry, the lower number first.
    shared: BTreeMap<(u32, u32), u64>,
}

impl Carriers {
    /// No allele yet, for the individuals of these slots.
    pub fn new(slots: Range<usize>, most_listed: usize) -> Self {
        let n = slots.len();
        Carriers {
            slots,
            most_listed,
            list: BTreeSet::new(),
            scarce: 0,
            only_carrier: vec![0; n],
            scarce_carried: vec![0; n],
            vanish: vec![0; n],
            shared: BTreeMap::new(),
        }
    }

    /// Adds the alleles of one locus.
    pub fn add(&mut self, locus: &Locus, counts: &Counts) {
        if counts.alleles_seen() < 2 {
            return;
        }
        for (allele, &copies) in counts.copies.iter().enumerate() {
            if copies > 0 && copies as usize <= 2 * FEW_CARRIERS {
                self.add_allele(locus, allele as u16, copies, counts.gene_copies());
            }
        }
    }

    fn add_allele(&mut self, locus: &Locus, allele: u16, copies: u32, typed: u32) {
        let carried = |slot: usize| {
            let pair = locus.genotypes.pair(slot)?;
            Some(u32::from(pair[0] == allele) + u32::from(pair[1] == allele))
        };
        let carriers: Vec<(u32, u32)> = (0u32..)
            .zip(self.slots.clone())
            .filter_map(|(i, slot)| carried(slot).filter(|&n| n > 0).map(|n| (i, n)))
            .collect();
        if carriers.len() > FEW_CARRIERS {
            return;
        }
        self.scarce += 1;
        for &(i, _) in &carriers {
            let others = carriers.iter().filter(|&&(j, _)| j != i);
            let all_fail: f64 = others.map(|&(_, n)| fails_to_pass(n)).product();
            self.vanish[i as usize] += i128::from(to_fixed(all_fail));
            self.only_carrier[i as usize] += u64::from(carriers.len() == 1);
            self.scarce_carried[i as usize] += 1;
        }
        for (n, &(i, _)) in carriers.iter().enumerate() {
            for &(j, _) in &carriers[n + 1..] {
                *self.shared.entry((i, j)).or_default() += 1;
            }
        }
        self.list.insert(ScarceAllele {
            copies,
            contig: locus.contig.clone(),
            position: locus.position,
            allele: locus.allele(allele.into()).unwrap_or_default().to_vec(),
            typed,
            carriers: carriers.into_iter().map(|(i, _)| i).collect(),
        });
        self.trim();
    }

    /// Adds the alleles of other loci.
    pub fn merge(&mut self, other: Carriers) {
        self.scarce += other.scarce;
        for (a, b) in self.only_carrier.iter_mut().zip(other.only_carrier) {
            *a += b;
        }
        for (a, b) in self.scarce_carried.iter_mut().zip(other.scarce_carried) {
            *a += b;
        }
        for (a, b) in self.vanish.iter_mut().zip(other.vanish) {
            *a += b;
        }
        for (pair, n) in other.shared {
            *self.shared.entry(pair).or_default() += n;
        }
        self.list.extend(other.list);
        self.trim();
    }

    /// Whether both are of the same individuals.
    pub(super) fn same_shape(&self, other: &Carriers) -> bool {
        let n = self.slots.len();
        let within = |&i: &u32| (i as usize) < n;
        self.slots == other.slots
            && other.only_carrier.len() == n
            && other.scarce_carried.len() == n
            && other.vanish.len() == n
            && other.list.iter().flat_map(|a| &a.carriers).all(within)
    }

    /// Whether the alleles can be those of the individuals.
    pub(super) fn is_bounded(&self) -> bool {
        let n = self.slots.len();
        let typed = u32::try_from(2 * n).unwrap_or(u32::MAX);
        let listed = |a: &ScarceAllele| {
            (1..=FEW_CARRIERS).contains(&a.carriers.len())
                && 0 < a.copies
                && a.copies as usize <= 2 * FEW_CARRIERS
                && a.copies <= a.typed
                && a.typed <= typed
        };
        let counts = self.only_carrier.iter().chain(&self.scarce_carried);
        self.scarce <= MOST_ALLELES
            && counts
                .chain(self.shared.values())
                .all(|&c| c <= self.scarce)
            && self.shared.keys().all(|&(i, j)| i < j && (j as usize) < n)
            && self.list.iter().all(listed)
            && bounds::terms(&self.vanish)
    }

    /// Slots of the individuals.
    pub fn slots(&self) -> Range<usize> {
        self.slots.clone()
    }

    /// Scarce alleles, the scarcest first, as many as are listed.
    pub fn list(&self) -> impl Iterator<Item = &ScarceAllele> {
        self.list.iter()
    }

    /// Alleles expected to vanish from the sampled animals if this individual does not breed and
    /// every other has two offspring.
    pub fn would_vanish(&self, individual: usize) -> f64 {
        from_fixed(self.vanish[individual])
    }

    /// Scarce alleles that both of two different individuals carry.
    pub fn shared(&self, one: usize, other: usize) -> u64 {
        let pair = (one.min(other) as u32, one.max(other) as u32);
        self.shared.get(&pair).copied().unwrap_or_default()
    }

    fn trim(&mut self) {
        while self.list.len() > self.most_listed {
            self.list.pop_last();
        }
    }
}

/// Chance that none of the offspring of a carrier of `n` copies receives the allele (Mendel).
fn fails_to_pass(n: u32) -> f64 {
    if n >= 2 { 0.0 } else { 0.5f64.powi(OFFSPRING) }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_only_carrier_counts_one_and_a_shared_allele_a_quarter() {
        let mut locus = Locus::default();
        locus.genotypes.reset(6, 2);
        let mut carriers = Carriers::new(0..6, 10);
        for dosages in [[1, 0, 0, 0, 0, 0], [1, 1, 0, 0, 0, 0], [1, 2, 0, 0, 0, 0]] {
            locus.genotypes.dosages_mut().copy_from_slice(&dosages);
            let mut counts = Counts::default();
            counts.recount(&locus.genotypes, 0..6);
            carriers.add(&locus, &counts);
        }
        // Mendel's law: a heterozygote with two offspring fails with (1/2)^2, a homozygote never.
        assert_eq!(carriers.would_vanish(0), 1.0 + 0.25 + 0.0);
        assert_eq!(carriers.would_vanish(1), 0.25 + 0.25);
        assert_eq!(carriers.only_carrier, [1, 0, 0, 0, 0, 0]);
        assert_eq!(carriers.scarce_carried, [3, 2, 0, 0, 0, 0]);
        assert_eq!((carriers.shared(1, 0), carriers.shared(0, 2)), (2, 0));
    }
}
