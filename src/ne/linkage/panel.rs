//! The genotypes of a panel of loci, for the estimate again without each individual in turn.

use std::ops::Range;

use super::without_each::Ordered;
use super::{Excess, LinkagePairs};
use crate::locus::Counts;
use crate::merge::gram::{FrequencyCutoff, PairSums, enough_typed, push_row_alleles};
use crate::model::Genotypes;

/// The fewest individuals of whom one can be left out: three must remain.
const FEWEST: usize = 4;

/// The genotypes of a panel of loci in one stratum, as vectors. Memory: about 16 bytes an individual
/// and locus, and as much again while the jackknife runs.
#[derive(Debug, Clone)]
pub struct LinkagePanel {
    pub(super) individuals: usize,
    cutoff: FrequencyCutoff,
    pub(super) loci: Vec<PanelLocus>,
    /// rows x individuals: unit vectors, 0 where missing.
    pub(super) vectors: Vec<f64>,
    /// loci x individuals: 1 typed, 0 missing.
    pub(super) typed: Vec<f64>,
}

#[derive(Debug, Clone)]
pub(super) struct PanelLocus {
    pub(super) contig: u64,
    /// Individuals typed.
    pub(super) typed: u32,
    /// Kept alleles less one.
    pub(super) weight: f64,
    /// Weight of each row: (K-1)/K, or 1 for the one row of a two-allele locus.
    pub(super) row_weight: f64,
    pub(super) rows: Range<usize>,
}

impl LinkagePanel {
    /// No locus yet.
    pub fn new(individuals: usize, cutoff: FrequencyCutoff) -> Self {
        LinkagePanel {
            individuals,
            cutoff,
            loci: Vec::new(),
            vectors: Vec::new(),
            typed: Vec::new(),
        }
    }

    /// Adds a locus by the rules of [`crate::merge::gram::GramStratum::add`].
    ///
    /// # Panics
    /// When `slots` is not as long as the stratum.
    pub fn push(
        &mut self,
        contig_hash: u64,
        genotypes: &Genotypes,
        slots: Range<usize>,
        counts: &Counts,
    ) {
        assert_eq!(slots.len(), self.individuals, "slots of another stratum");
        let alleles = self.alleles(counts);
        if alleles.is_empty() {
            return;
        }
        let start = self.vectors.len() / self.individuals;
        for &allele in &alleles {
            let n = f64::from(counts.typed);
            let copies = f64::from(counts.copies[usize::from(allele)]);
            let squares = 2.0 * copies - f64::from(counts.heterozygous[usize::from(allele)]);
            let length = (squares - copies * copies / n).sqrt();
            self.vectors
                .extend(slots.clone().map(|slot| match genotypes.pair(slot) {
                    Some(pair) => {
                        let dosage = pair.iter().filter(|&&code| code == allele).count() as f64;
                        (dosage - copies / n) / length
                    }
                    None => 0.0,
                }));
        }
        let is_typed = |slot| {
            if genotypes.pair(slot).is_some() {
                1.0
            } else {
                0.0
            }
        };
        self.typed.extend(slots.map(is_typed));
        let kept = alleles.len() as f64;
        self.loci.push(PanelLocus {
            contig: contig_hash,
            typed: counts.typed,
            weight: (kept - 1.0).max(1.0),
            row_weight: if kept > 1.0 { (kept - 1.0) / kept } else { 1.0 },
            rows: start..start + alleles.len(),
        });
    }

    /// Loci that pass the cutoff.
    pub fn loci(&self) -> usize {
        self.loci.len()
    }

    /// r2' without each individual in turn; `None` for fewer than four individuals, or when a panel
    /// without one has no pair left.
    pub fn without_each(&self, pairs: LinkagePairs) -> Option<Vec<f64>> {
        if self.individuals < FEWEST || self.loci.len() < 2 {
            return None;
        }
        let ordered = Ordered::of(self, pairs);
        let squares = ordered.squared_correlations();
        let expected = ordered.expectations();
        squares
            .into_iter()
            .zip(expected)
            .map(|(squared_correlation, sums)| {
                Excess::of(&PairSums {
                    squared_correlation,
                    ..sums
                })
                .map(|found| found.excess)
            })
            .collect()
    }

    /// Delete-one variance of r2' over individuals: (S-1)/S times the squares about the mean. It is
    /// too large by a known factor: see [`super::INDIVIDUAL_VARIANCE_FACTOR`].
    pub fn individual_variance(&self, pairs: LinkagePairs) -> Option<f64> {
        let values = self.without_each(pairs)?;
        let n = values.len() as f64;
        let mean = values.iter().sum::<f64>() / n;
        Some((n - 1.0) / n * values.iter().map(|v| (v - mean).powi(2)).sum::<f64>())
    }

    /// Codes of the alleles that make a row.
    fn alleles(&self, counts: &Counts) -> Vec<u16> {
        if !enough_typed(counts.typed, self.individuals) {
            return Vec::new();
        }
        let mut alleles = Vec::new();
        push_row_alleles(counts, self.cutoff, &mut alleles);
        alleles
    }
}

impl PanelLocus {
    /// n/(n-1).
    pub(super) fn inflation(&self) -> f64 {
        f64::from(self.typed) / (f64::from(self.typed) - 1.0)
    }
}
