//! The section on each population at each visit.

use super::{Findings, POSITIVE, SHARE, ratio};
use crate::locus::diversity::{effective_alleles, inbreeding};
use crate::locus::{PrivateTerms, StratumTerms};
use crate::merge::{StratumSums, TwoWay};
use crate::model::Stratum;
use crate::ne::estimate::{Absence, Estimate, two_way_estimate};
use crate::report::wire;

/// One entry a stratum, in the order of the strata.
pub fn strata(findings: &Findings) -> Vec<wire::Stratum> {
    let all = findings
        .strata
        .strata
        .iter()
        .zip(&findings.sums.strata)
        .enumerate();
    all.map(|(s, (stratum, sums))| one(findings, s, stratum, sums))
        .collect()
}

fn one(findings: &Findings, s: usize, stratum: &Stratum, sums: &StratumSums) -> wire::Stratum {
    let total = sums.diversity.total();
    let over_loci = |f: fn(&StratumTerms) -> Option<f64>| {
        two_way_estimate(&sums.diversity, f, |t| t.loci, Absence::NoLoci)
    };
    let individuals = stratum.individuals();
    let richness = two_way_estimate(
        &sums.diversity,
        |t| ratio(t.richness, t.richness_loci),
        |t| t.richness_loci,
        Absence::TooFewGeneCopies,
    );
    let (private, against) = private_richness(findings, s);
    wire::Stratum {
        stratum: stratum.name.clone(),
        population: stratum.population.clone(),
        visit: stratum.visit.clone(),
        year: stratum.year,
        individuals: individuals as u64,
        typed_loci: total.loci as u64,
        polymorphic_loci: total.polymorphic as u64,
        polymorphic_share: findings.wire(&over_loci(|t| ratio(t.polymorphic, t.loci)), SHARE),
        call_rate: call_rate(findings, sums, individuals),
        observed_heterozygosity: findings.wire(
            &over_loci(|t| ratio(t.observed_heterozygosity, t.loci)),
            SHARE,
        ),
        expected_heterozygosity: findings.wire(
            &over_loci(|t| ratio(t.expected_heterozygosity, t.loci)),
            SHARE,
        ),
        inbreeding_coefficient: findings.wire(
            &over_loci(|t| inbreeding(t.observed_heterozygosity, t.expected_heterozygosity)),
            [-1.0, 1.0],
        ),
        allelic_richness: with_copies(findings, &richness),
        private_allelic_richness: with_copies(findings, &private),
        private_against: against,
        effective_alleles: findings.wire(
            &over_loci(|t| effective_alleles(ratio(t.expected_heterozygosity, t.loci)?)),
            [1.0, f64::INFINITY],
        ),
        per_site: per_site(findings, &sums.diversity),
        hardy_weinberg: hardy_weinberg(findings, sums),
    }
}

fn call_rate(findings: &Findings, sums: &StratumSums, individuals: usize) -> f64 {
    let possible = findings.sums.kept * individuals as u64;
    ratio(sums.typed_genotypes as f64, possible as f64).unwrap_or(0.0)
}

fn per_site(findings: &Findings, diversity: &TwoWay<StratumTerms>) -> wire::PerSite {
    let over_sites = |f: fn(&StratumTerms) -> Option<f64>| {
        findings.wire(
            &two_way_estimate(diversity, f, |t| t.sites, Absence::NoLoci),
            SHARE,
        )
    };
    wire::PerSite {
        sites: diversity.total().sites as u64,
        observed_heterozygosity: over_sites(|t| ratio(t.observed_heterozygosity, t.sites)),
        expected_heterozygosity: over_sites(|t| ratio(t.expected_heterozygosity, t.sites)),
    }
}

fn hardy_weinberg(findings: &Findings, sums: &StratumSums) -> wire::HardyWeinberg {
    let rate = findings.false_discovery_rate;
    let rejected = sums.hardy_weinberg.rejections(rate);
    wire::HardyWeinberg {
        tested: sums.hardy_weinberg.tested(),
        false_discovery_rate: rate,
        rejected: rejected.rejected(),
        excess: rejected.excess,
        deficit: rejected.deficit,
    }
}

/// The estimate and the strata it is private against.
fn private_richness(findings: &Findings, s: usize) -> (Estimate, Vec<String>) {
    let scheme = findings.sums.scheme();
    for (visit, members) in scheme.visits.iter().zip(&findings.sums.private) {
        if let Some(which) = visit.iter().position(|&member| member == s) {
            let estimate = two_way_estimate(
                &members[which],
                |t: &PrivateTerms| ratio(t.private_richness, t.loci),
                |t| t.loci,
                Absence::TooFewGeneCopies,
            );
            let others = visit.iter().filter(|&&other| other != s);
            let names = others
                .map(|&other| findings.strata.strata[other].name.clone())
                .collect();
            return (estimate, names);
        }
    }
    (Estimate::absent(Absence::OnlyPopulationAtVisit), Vec::new())
}

fn with_copies(findings: &Findings, estimate: &Estimate) -> wire::Estimate {
    let gene_copies = Some(findings.sums.scheme().gene_copies);
    wire::Estimate {
        gene_copies,
        ..findings.wire(estimate, POSITIVE)
    }
}
