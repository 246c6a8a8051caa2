//! The section on pairs of strata.

use super::losses::{Explained, unexplained};
use super::{ANY, Findings, POSITIVE, ratio};
use crate::locus::PairTerms;
use crate::locus::fstatistics::NeiDiversity;
use crate::merge::{PairSums, TwoWay};
use crate::model::{Comparison, ComparisonKind};
use crate::ne::estimate::{Absence, two_way_estimate};
use crate::report::wire;

/// One entry a comparison, in the order of the comparisons.
pub fn comparisons(findings: &Findings) -> Vec<wire::Comparison> {
    let all = findings.comparisons.iter().zip(&findings.sums.pairs);
    all.enumerate()
        .map(|(i, (comparison, sums))| one(findings, i, comparison, sums))
        .collect()
}

fn one(
    findings: &Findings,
    index: usize,
    comparison: &Comparison,
    sums: &PairSums,
) -> wire::Comparison {
    let name = |s: usize| findings.strata.strata[s].name.clone();
    let in_time = comparison.kind != ComparisonKind::BetweenPopulations;
    let explained = Explained::of(findings, index);
    let pair = Pair {
        findings,
        sums: &sums.change,
    };
    wire::Comparison {
        from: name(comparison.from),
        to: name(comparison.to),
        kind: match comparison.kind {
            ComparisonKind::SinceBaseline => wire::Kind::SinceBaseline,
            ComparisonKind::BetweenVisits => wire::Kind::BetweenVisits,
            ComparisonKind::BetweenPopulations => wire::Kind::BetweenPopulations,
        },
        generations: comparison.generations,
        fst_weir_cockerham: pair.estimate(ANY, |t| ratio(t.wc_between, t.wc_total), |t| t.wc_loci),
        fst_hudson: pair.estimate(
            ANY,
            |t| ratio(t.hudson_numerator, t.hudson_denominator),
            |t| t.loci,
        ),
        gst_nei: pair.estimate(ANY, |t| nei(t)?.gst(), |t| t.nei_loci),
        gst_hedrick: pair.estimate(ANY, |t| nei(t)?.gst_hedrick(), |t| t.nei_loci),
        jost_d: pair.estimate(ANY, |t| nei(t)?.jost_d(), |t| t.nei_loci),
        fc: in_time.then(|| pair.change(|t| ratio(t.fc, t.independent_alleles))),
        fk: in_time.then(|| pair.change(|t| ratio(t.fk, t.independent_alleles))),
        fs: in_time.then(|| pair.change(|t| ratio(t.fs_numerator, t.fs_denominator))),
        change: differences(&pair),
        alleles: in_time.then(|| match &explained {
            Some(explained) => explained.alleles(findings.level),
            None => unexplained(&sums.fates, comparison.generations),
        }),
        loci_fixed_since: in_time.then_some(sums.fates.loci_fixed),
        outlier_loci: explained
            .filter(|_| comparison.kind == ComparisonKind::SinceBaseline)
            .map(|explained| explained.outliers(findings)),
    }
}

fn differences(pair: &Pair) -> wire::Change {
    let over_loci = |range, f: fn(&PairTerms) -> Option<f64>| pair.estimate(range, f, |t| t.loci);
    wire::Change {
        observed_heterozygosity: over_loci([-1.0, 1.0], |t| {
            ratio(t.observed_to - t.observed_from, t.loci)
        }),
        expected_heterozygosity: over_loci([-1.0, 1.0], |t| {
            ratio(t.expected_to - t.expected_from, t.loci)
        }),
        expected_heterozygosity_kept: over_loci(POSITIVE, |t| {
            ratio(t.expected_to, t.expected_from)
        }),
        allelic_richness: wire::Estimate {
            gene_copies: Some(pair.findings.sums.scheme().gene_copies),
            ..pair.estimate(
                ANY,
                |t| ratio(t.richness_to - t.richness_from, t.richness_loci),
                |t| t.richness_loci,
            )
        },
    }
}

struct Pair<'a> {
    findings: &'a Findings<'a>,
    sums: &'a TwoWay<PairTerms>,
}

impl Pair<'_> {
    fn estimate(
        &self,
        range: [f64; 2],
        statistic: impl Fn(&PairTerms) -> Option<f64>,
        loci: impl Fn(&PairTerms) -> f64,
    ) -> wire::Estimate {
        self.findings.wire(
            &two_way_estimate(self.sums, statistic, loci, Absence::NoLoci),
            range,
        )
    }

    /// A standardised change of frequency: over loci with at least two alleles between the two.
    fn change(&self, statistic: impl Fn(&PairTerms) -> Option<f64>) -> wire::Estimate {
        self.estimate(POSITIVE, statistic, |t| t.temporal_loci)
    }
}

fn nei(t: &PairTerms) -> Option<NeiDiversity> {
    Some(NeiDiversity {
        samples: 2,
        observed: ratio(t.nei_observed, t.nei_loci)?,
        within: ratio(t.nei_within, t.nei_loci)?,
        total: ratio(t.nei_total, t.nei_loci)?,
    })
}
