//! Gene diversity within samples and over all of them, and what is made of the two.

use std::borrow::Borrow;

use super::ratio;
use crate::locus::Counts;

/// Heterozygosities of Nei & Chesser (1983, Ann Hum Genet 47:253-259): of one locus, or means over
/// loci, from which the ratios below are taken.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct NeiDiversity {
    /// Number of samples (s).
    pub samples: u32,
    /// Observed heterozygosity, mean over samples (Ho).
    pub observed: f64,
    /// Gene diversity within samples (Hs).
    pub within: f64,
    /// Gene diversity of the whole (Ht).
    pub total: f64,
}

impl NeiDiversity {
    /// From the number of samples, their harmonic mean size (above 1), their mean observed
    /// heterozygosity, the mean over samples of sum p^2, and the sum of squared mean frequencies.
    fn of(samples: u32, size: f64, observed: f64, squares: f64, squared_means: f64) -> Self {
        let s = f64::from(samples);
        let sampled = 0.5 * observed / size;
        let within = size / (size - 1.0) * (1.0 - squares - sampled);
        let total = 1.0 - squared_means + within / (size * s) - sampled / s;
        NeiDiversity {
            samples,
            observed,
            within,
            total,
        }
    }

    /// GST = (Ht - Hs)/Ht (Nei 1973); `None` without diversity.
    pub fn gst(&self) -> Option<f64> {
        ratio(self.total - self.within, self.total)
    }

    /// GST' = Dst'/Ht' with Dst' = s(Ht - Hs)/(s-1) and Ht' = Hs + Dst' (Nei 1987); `None` without
    /// diversity.
    pub fn gst_prime(&self) -> Option<f64> {
        let between = self.between();
        ratio(between, self.within + between)
    }

    /// Jost's D = s/(s-1) (Ht - Hs)/(1 - Hs) (Jost 2008, Mol Ecol 17:4015-4026); `None` when every
    /// copy within samples differs.
    pub fn jost_d(&self) -> Option<f64> {
        ratio(self.between(), 1.0 - self.within)
    }

    /// Hedrick's standardised GST = GST (s - 1 + Hs)/((s-1)(1 - Hs)) (Hedrick 2005, Evolution
    /// 59:1633-1638); `None` without diversity or when every copy within samples differs.
    pub fn gst_hedrick(&self) -> Option<f64> {
        let others = f64::from(self.samples) - 1.0;
        let greatest = ratio(others * (1.0 - self.within), others + self.within)?;
        ratio(self.gst()?, greatest)
    }

    /// G''ST = s(Ht - Hs)/((s Ht - Hs)(1 - Hs)) (Meirmans & Hedrick 2011, Mol Ecol Resour 11:5-18);
    /// `None` without diversity or when every copy within samples differs.
    pub fn gst_double_prime(&self) -> Option<f64> {
        let samples = f64::from(self.samples);
        let below = (samples * self.total - self.within) * (1.0 - self.within);
        ratio(samples * (self.total - self.within), below)
    }

    /// FIS = 1 - Ho/Hs; `None` without diversity within samples.
    pub fn inbreeding(&self) -> Option<f64> {
        Some(1.0 - ratio(self.observed, self.within)?)
    }

    /// Dst', the diversity between samples.
    fn between(&self) -> f64 {
        let samples = f64::from(self.samples);
        samples * (self.total - self.within) / (samples - 1.0)
    }
}

/// Heterozygosities within and over samples, unweighted. Samples without a typed individual drop
/// out. `None` for fewer than two samples left, or when each has one individual only.
///
/// All samples list the same alleles. Take means of all three over loci with the same number of
/// samples, then the ratios.
pub fn nei<C: Borrow<Counts>>(samples: &[C]) -> Option<NeiDiversity> {
    if let [first, second] = samples {
        return nei_pair(first.borrow(), second.borrow());
    }
    let typed = || samples.iter().map(|s| s.borrow()).filter(|s| s.typed > 0);
    let (mut number, mut reciprocals, mut observed, mut squares) = (0u32, 0.0, 0.0, 0.0);
    for sample in typed() {
        let all = u64::from(sample.gene_copies());
        number += 1;
        reciprocals += 1.0 / f64::from(sample.typed);
        observed += f64::from(sample.heterozygotes) / f64::from(sample.typed);
        squares += 1.0 - sample.differing_pairs() as f64 / (all * all) as f64;
    }
    let s = f64::from(number);
    // The harmonic mean size s/reciprocals must be above 1.
    if number < 2 || reciprocals >= s {
        return None;
    }
    let size = s / reciprocals;
    let observed = observed / s;
    let mut squared_means = 0.0;
    for allele in 0..samples[0].borrow().copies.len() {
        let sum: f64 = typed()
            .map(|s| f64::from(s.copies[allele]) / f64::from(s.gene_copies()))
            .sum();
        squared_means += sum * sum;
    }
    Some(NeiDiversity::of(
        number,
        size,
        observed,
        squares / s,
        squared_means / (s * s),
    ))
}

/// [`nei`] of two samples, which is what comparisons ask for by the million.
pub fn nei_pair(first: &Counts, second: &Counts) -> Option<NeiDiversity> {
    let (n1, n2) = (f64::from(first.typed), f64::from(second.typed));
    if first.typed == 0 || second.typed == 0 || first.typed + second.typed == 2 {
        return None;
    }
    let size = 2.0 * n1 * n2 / (n1 + n2);
    let (all1, all2) = (2.0 * n1, 2.0 * n2);
    let observed = f64::from(first.heterozygotes) / all1 + f64::from(second.heterozygotes) / all2;
    let (mut squares, mut squared_sums) = (0.0, 0.0);
    for (&copies1, &copies2) in first.copies.iter().zip(&second.copies) {
        // Divided, not multiplied by a reciprocal: a fixed allele has exactly 1.
        let (p1, p2) = (f64::from(copies1) / all1, f64::from(copies2) / all2);
        squares += p1 * p1 + p2 * p2;
        squared_sums += (p1 + p2) * (p1 + p2);
    }
    Some(NeiDiversity::of(
        2,
        size,
        observed,
        0.5 * squares,
        0.25 * squared_sums,
    ))
}
