//! Effective number of breeders from the excess of heterozygotes in their offspring (Pudovkin, Zaykin
//! & Hedgecock 1996).
//!
//! Few males and females differ in allele frequency by chance, so their offspring are more often
//! heterozygous than their own frequencies let expect. The signal is weak unless there were fewer
//! than about ten breeders, many loci and more than 60 offspring (Luikart & Cornuet 1999), and
//! inbreeding or a null allele hides it.

use crate::locus::Counts;

/// Relative excess of heterozygotes at one allele, (Hobs - Hexp)/Hexp with Hexp = 2 p (1-p) 2n/(2n-1),
/// n typed. `None` where the allele does not vary or nobody is typed.
pub fn allele_excess(counts: &Counts, allele: usize) -> Option<f64> {
    let copies = f64::from(counts.copies[allele]);
    let total = f64::from(counts.gene_copies());
    let expected = 2.0 * copies * (total - copies) / (total * (total - 1.0));
    let observed = f64::from(counts.heterozygous[allele]) / f64::from(counts.typed);
    (total > 1.0 && expected > 0.0).then(|| (observed - expected) / expected)
}

/// Sum of the excess over the alleles seen at a locus, and their number: add these over loci and
/// divide once for D. A locus of two alleles counts one, because both say the same.
pub fn locus_excess(counts: &Counts) -> (f64, u32) {
    let seen = counts.alleles_seen();
    let counted = if seen == 2 { 1 } else { seen };
    (0..counts.copies.len())
        .filter_map(|allele| allele_excess(counts, allele))
        .take(counted)
        .fold((0.0, 0), |(sum, number), excess| (sum + excess, number + 1))
}

/// Effective number of breeders from the mean excess D: 1/(2D) + 1/(2(D+1)). `None` is unbounded: no
/// excess.
pub fn effective_breeders(excess: f64) -> Option<f64> {
    (excess > 0.0).then(|| 1.0 / (2.0 * excess) + 1.0 / (2.0 * (excess + 1.0)))
}

/// D that `males` and `females` breeders lead to: 1/(2 Ne - 1), Ne = 4 Nm Nf/(Nm + Nf), exactly.
pub fn expected_excess(males: f64, females: f64) -> f64 {
    1.0 / (8.0 * males * females / (males + females) - 1.0)
}
