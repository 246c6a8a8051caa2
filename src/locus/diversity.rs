//! Diversity of one locus in one stratum: heterozygosity, effective alleles, heterozygote excess.

use super::Counts;

/// Observed heterozygosity Ho: the share of typed individuals that are heterozygous.
/// `None` when nobody is typed.
pub fn observed_heterozygosity(counts: &Counts) -> Option<f64> {
    (counts.typed > 0).then(|| f64::from(counts.heterozygotes) / f64::from(counts.typed))
}

/// Unbiased expected heterozygosity He = 2n/(2n-1) (1 - sum p^2) (Nei 1978, Genetics 89:583-590),
/// which is the share of pairs of distinct gene copies that differ. `None` when nobody is typed.
pub fn expected_heterozygosity(counts: &Counts) -> Option<f64> {
    let copies = u64::from(counts.gene_copies());
    (copies > 0).then(|| counts.differing_pairs() as f64 / (copies * (copies - 1)) as f64)
}

/// Inbreeding coefficient FIS = 1 - Ho/He, from the values of one locus or from sums of both over
/// the same loci (ratio of sums). `None` when there is no expected heterozygosity.
pub fn inbreeding(observed: f64, expected: f64) -> Option<f64> {
    (expected > 0.0).then(|| 1.0 - observed / expected)
}

/// Effective number of alleles 1/(1 - He) from an unbiased expected heterozygosity, of one locus or
/// a mean. `None` when every gene copy differs, where it has no bound.
pub fn effective_alleles(expected_heterozygosity: f64) -> Option<f64> {
    (expected_heterozygosity < 1.0).then(|| 1.0 / (1.0 - expected_heterozygosity))
}

/// Effective number of alleles 1/sum p^2 of the sample itself, without correction for its size.
/// `None` when nobody is typed.
pub fn effective_alleles_of_sample(counts: &Counts) -> Option<f64> {
    let copies = u64::from(counts.gene_copies());
    let all = copies * copies;
    (copies > 0).then(|| all as f64 / (all - counts.differing_pairs()) as f64)
}

/// What one locus adds to a mean heterozygote excess.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct HeterozygoteExcess {
    /// Sum over alleles of (Hobs - Hexp)/Hexp.
    pub sum: f64,
    /// Number of alleles in that sum.
    pub alleles: u32,
}

/// Heterozygote excess over the alleles that are seen and not fixed (Pudovkin, Zaykin & Hedgecock
/// 1996, Genetics 144:383-387). For one allele of c copies among N = 2n, Hobs is the share of
/// individuals heterozygous for it and Hexp = 2p(1-p) N/(N-1). A locus of one allele adds nothing.
pub fn heterozygote_excess(counts: &Counts) -> HeterozygoteExcess {
    let all = u64::from(counts.gene_copies());
    let mut excess = HeterozygoteExcess::default();
    for (&copies, &heterozygous) in counts.copies.iter().zip(&counts.heterozygous) {
        let copies = u64::from(copies);
        if copies == 0 || copies == all {
            continue;
        }
        let observed = u64::from(heterozygous) * (all - 1);
        excess.sum += observed as f64 / (copies * (all - copies)) as f64 - 1.0;
        excess.alleles += 1;
    }
    excess
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nobody_typed_is_absent() {
        let none = Counts::empty(2);
        assert_eq!(observed_heterozygosity(&none), None);
        assert_eq!(expected_heterozygosity(&none), None);
        assert_eq!(effective_alleles_of_sample(&none), None);
        assert_eq!(heterozygote_excess(&none), HeterozygoteExcess::default());
    }

    #[test]
    fn one_individual_has_all_or_nothing() {
        let heterozygote = Counts::of(2, [Some([0, 1])]);
        assert_eq!(expected_heterozygosity(&heterozygote), Some(1.0));
        assert_eq!(effective_alleles(1.0), None);
        let homozygote = Counts::of(2, [Some([1, 1])]);
        assert_eq!(expected_heterozygosity(&homozygote), Some(0.0));
        assert_eq!(inbreeding(0.0, 0.0), None);
    }
}
