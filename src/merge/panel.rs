//! A bounded sample of loci whose genotypes are kept, for methods that need individuals at loci.
//!
//! Every locus that varies has a priority, a hash of what it is; the panel is the loci of lowest
//! priority. Which loci these are depends on the set of loci alone, so the panel is the same for
//! any order, number of threads and sharding.

use std::collections::BTreeSet;

use serde::{Deserialize, Serialize};

use crate::model::{Genotypes, Locus, stable_hash};

/// Loci kept. The likelihood gains little beyond (loci share one pedigree), and its cost and the
/// memory (one byte a locus and individual) stay small.
pub const PANEL_LOCI: usize = 10_000;

/// One locus of the panel.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
pub struct PanelLocus {
    priority: u64,
    /// Contig name.
    pub contig: String,
    /// Stable hash of the contig name.
    pub contig_hash: u64,
    /// 1-based position.
    pub position: u64,
    /// Genotypes by slot.
    pub genotypes: Genotypes,
}

/// The loci of lowest priority among those offered.
#[derive(Debug, Clone, Default, PartialEq, Eq, Serialize, Deserialize)]
pub struct Panel {
    loci: BTreeSet<PanelLocus>,
    offered: u64,
}

impl Panel {
    /// Offers a locus.
    pub fn offer(&mut self, locus: &Locus) {
        self.offered += 1;
        let priority = priority(locus);
        let full = self.loci.len() >= PANEL_LOCI;
        if full
            && self
                .loci
                .last()
                .is_some_and(|last| priority > last.priority)
        {
            return;
        }
        self.loci.insert(PanelLocus {
            priority,
            contig: locus.contig.clone(),
            contig_hash: locus.contig_hash,
            position: locus.position,
            genotypes: locus.genotypes.clone(),
        });
        self.trim();
    }

    /// Adds the loci of another panel over the same slots.
    pub fn merge(&mut self, other: Panel) {
        self.offered += other.offered;
        self.loci.extend(other.loci);
        self.trim();
    }

    /// Whether no more loci were offered than vary, and no more are kept than were offered.
    pub(super) fn is_bounded(&self, polymorphic: u64) -> bool {
        self.offered <= polymorphic && self.loci.len() as u64 <= self.offered
    }

    /// Loci kept, in an order of their own that is the same in every run.
    pub fn loci(&self) -> impl ExactSizeIterator<Item = &PanelLocus> {
        self.loci.iter()
    }

    /// Loci offered.
    pub fn offered(&self) -> u64 {
        self.offered
    }

    fn trim(&mut self) {
        while self.loci.len() > PANEL_LOCI {
            self.loci.pop_last();
        }
    }
}

fn priority(locus: &Locus) -> u64 {
    let place = locus.contig_hash ^ locus.position.wrapping_mul(0x9e37_79b9_7f4a_7c15);
    stable_hash(&place.to_le_bytes())
}
