//! How many alleles are seen in how many copies: the frequency spectrum of one stratum.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use super::bounds::{self, MOST_ALLELES, MOST_LOCI};
use super::fates::{most_typed, rounded};
use crate::locus::Counts;

/// Alleles by copies seen and gene copies typed, over loci that vary among all individuals in use.
#[derive(Debug, Clone, Default, PartialEq, Eq, Serialize, Deserialize)]
pub struct Spectrum {
    classes: BTreeMap<(u32, u32), u64>,
    /// Loci.
    pub loci: u64,
}

impl Spectrum {
    /// Adds the alleles of one locus; alleles that are not seen are not counted.
    pub fn add(&mut self, counts: &Counts) {
        self.loci += 1;
        let typed = rounded(counts.gene_copies());
        for &copies in counts.copies.iter().filter(|&&c| c > 0) {
            *self.classes.entry((rounded(copies), typed)).or_default() += 1;
        }
    }

    /// Adds the alleles of other loci.
    pub fn merge(&mut self, other: Spectrum) {
        self.loci += other.loci;
        for (class, alleles) in other.classes {
            *self.classes.entry(class).or_default() += alleles;
        }
    }

    /// Whether the alleles can be those of so many individuals.
    pub(super) fn is_bounded(&self, individuals: usize) -> bool {
        let most = most_typed(individuals);
        let possible =
            |&(copies, typed): &(u32, u32)| 0 < copies && copies <= typed && typed <= most;
        self.loci <= MOST_LOCI
            && self.classes.keys().all(possible)
            && bounds::add_up(self.classes.values(), MOST_ALLELES)
    }

    /// Copies, gene copies and number of alleles, in order. Numbers above 64 are rounded by at most
    /// 3 %, so that the spectrum stays small for any number of loci.
    pub fn classes(&self) -> impl Iterator<Item = (u32, u32, u64)> + '_ {
        self.classes
            .iter()
            .map(|(&(copies, typed), &alleles)| (copies, typed, alleles))
    }
}
