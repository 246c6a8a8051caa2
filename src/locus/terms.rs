//! What one locus adds to the sums: one set of terms for a stratum, one for a pair of strata, one
//! for the strata of a visit together. Every multilocus statistic is a function of these sums.

use super::Counts;
use super::change::temporal_terms;
use super::diversity::{expected_heterozygosity, heterozygote_excess, observed_heterozygosity};
use super::fstatistics::{hudson, nei, weir_cockerham_pair};
use super::richness::{Rarefaction, private_richness, richness};
use super::term_list::terms;

terms! {
    /// One stratum at one locus. Loci that vary among all individuals in use enter everything;
    /// the others add to `sites` alone.
    StratumTerms, StratumTermLanes {
        /// 1: a record with at least one typed individual.
        sites,
        /// 1: such a record that varies among all individuals in use.
        loci,
        /// 1: such a record that varies in this stratum.
        polymorphic,
        /// Share of typed individuals that are heterozygous.
        observed_heterozygosity,
        /// Unbiased gene diversity (Nei 1978).
        expected_heterozygosity,
        /// Alleles expected in the fixed number of gene copies (Hurlbert 1971).
        richness,
        /// 1: at least that many gene copies are typed.
        richness_loci,
        /// Sum over alleles of (observed - expected) / expected heterozygotes (Pudovkin et al. 1996).
        excess,
        /// Alleles in that sum.
        excess_alleles,
    }
}

terms! {
    /// Two strata at one locus that varies among all individuals in use and is typed in both.
    PairTerms, PairTermLanes {
        /// 1.
        loci,
        /// Observed heterozygosity of the first.
        observed_from,
        /// Observed heterozygosity of the second.
        observed_to,
        /// Expected heterozygosity of the first.
        expected_from,
        /// Expected heterozygosity of the second.
        expected_to,
        /// Rarefied richness of the first, where both allow it.
        richness_from,
        /// Rarefied richness of the second, where both allow it.
        richness_to,
        /// 1: both allow it.
        richness_loci,
        /// Variance component between samples, summed over alleles (Weir & Cockerham 1984: a).
        wc_between,
        /// All three variance components (a + b + c).
        wc_total,
        /// 1: the components exist.
        wc_loci,
        /// Numerator of Hudson's FST (Bhatia et al. 2013).
        hudson_numerator,
        /// Denominator of Hudson's FST: the diversity between.
        hudson_denominator,
        /// Mean observed heterozygosity (Nei & Chesser 1983).
        nei_observed,
        /// Diversity within, Hs.
        nei_within,
        /// Diversity in all, Ht.
        nei_total,
        /// 1: Hs and Ht exist.
        nei_loci,
        /// (K - 1) Fc of the locus (Nei & Tajima 1981).
        fc,
        /// (K - 1) Fk of the locus (Pollak 1983).
        fk,
        /// Numerator of Fs (Jorde & Ryman 2007).
        fs_numerator,
        /// Denominator of Fs.
        fs_denominator,
        /// Independent alleles, K - 1.
        independent_alleles,
        /// (K - 1) / individuals typed in the first.
        inverse_size_from,
        /// (K - 1) / individuals typed in the second.
        inverse_size_to,
        /// 1: at least two alleles between the two.
        temporal_loci,
    }
}

terms! {
    /// One stratum at one locus, beside the other populations of the same visit.
    PrivateTerms {
        /// Alleles expected in the fixed number of copies of this stratum and in none of the others'
        /// (Kalinowski 2004).
        private_richness,
        /// 1: every stratum of the visit has that many copies typed.
        loci,
    }
}

/// The terms of a stratum at a locus that varies among all individuals in use.
pub fn stratum_terms(counts: &Counts, rarefaction: &mut Rarefaction) -> StratumTerms {
    let (Some(observed), Some(expected)) = (
        observed_heterozygosity(counts),
        expected_heterozygosity(counts),
    ) else {
        return StratumTerms::default();
    };
    let richness = richness(counts, rarefaction);
    let excess = heterozygote_excess(counts);
    StratumTerms {
        sites: 1.0,
        loci: 1.0,
        polymorphic: f64::from(u8::from(counts.alleles_seen() > 1)),
        observed_heterozygosity: observed,
        expected_heterozygosity: expected,
        richness: richness.unwrap_or_default(),
        richness_loci: present(&richness),
        excess: excess.sum,
        excess_alleles: f64::from(excess.alleles),
    }
}

/// The terms of a pair of strata; all zero when one of them has nobody typed.
pub fn pair_terms(from: &Counts, to: &Counts, rarefaction: &mut Rarefaction) -> PairTerms {
    let both = |f: fn(&Counts) -> Option<f64>| f(from).zip(f(to));
    let (Some(observed), Some(expected)) =
        (both(observed_heterozygosity), both(expected_heterozygosity))
    else {
        return PairTerms::default();
    };
    let richness = richness(from, rarefaction).zip(richness(to, rarefaction));
    let variance = weir_cockerham_pair(from, to);
    let hudson = hudson(from, to).unwrap_or_default();
    let nei = nei(&[from, to]);
    let change = temporal_terms(from, to);
    let (richness_from, richness_to) = richness.unwrap_or_default();
    let (wc_between, wc_total) = variance.map_or((0.0, 0.0), |v| (v.a, v.a + v.b + v.c));
    let mut terms = PairTerms {
        loci: 1.0,
        observed_from: observed.0,
        observed_to: observed.1,
        expected_from: expected.0,
        expected_to: expected.1,
        richness_from,
        richness_to,
        richness_loci: present(&richness),
        wc_between,
        wc_total,
        wc_loci: present(&variance),
        hudson_numerator: hudson.numerator,
        hudson_denominator: hudson.denominator,
        nei_loci: present(&nei),
        ..PairTerms::default()
    };
    if let Some(n) = nei {
        terms.nei_observed = n.observed;
        terms.nei_within = n.within;
        terms.nei_total = n.total;
    }
    if let Some(c) = change {
        let weight = f64::from(c.weight());
        terms.fc = weight * c.fc;
        terms.fk = weight * c.fk;
        terms.fs_numerator = c.fs_numerator;
        terms.fs_denominator = c.fs_denominator;
        terms.independent_alleles = weight;
        terms.inverse_size_from = weight / f64::from(from.typed);
        terms.inverse_size_to = weight / f64::from(to.typed);
        terms.temporal_loci = 1.0;
    }
    terms
}

/// The private richness of the stratum at `visit[which]` among the strata of one visit.
pub fn private_terms(
    which: usize,
    visit: &[usize],
    counts: &[Counts],
    rarefaction: &mut Rarefaction,
) -> PrivateTerms {
    let members: Vec<&Counts> = visit.iter().map(|&s| &counts[s]).collect();
    let value = private_richness(which, &members, rarefaction);
    PrivateTerms {
        private_richness: value.unwrap_or_default(),
        loci: present(&value),
    }
}

fn present<T>(value: &Option<T>) -> f64 {
    f64::from(u8::from(value.is_some()))
}
