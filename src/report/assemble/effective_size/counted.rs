//! Effective size from the excess of heterozygotes in one sample, and from counted breeders and
//! families.

use super::{FEWEST_INDIVIDUALS, Subject};
use crate::ne::demographic;
use crate::ne::estimate::{Absence, Estimate, two_way_estimate};
use crate::ne::interval::individual_variance;
use crate::report::assemble::{Findings, ratio};
use crate::report::wire;

/// Heterozygote excess of each stratum; sex ratio and family sizes of each population that has them.
pub fn entries(findings: &Findings) -> Vec<wire::EffectiveSize> {
    let mut entries = excess(findings);
    let mut populations: Vec<&str> = findings
        .strata
        .strata
        .iter()
        .map(|s| s.population.as_str())
        .collect();
    populations.dedup();
    for population in populations {
        entries.extend(breeders(findings, population));
        entries.extend(families(findings, population));
    }
    entries
}

/// Pudovkin, Zaykin & Hedgecock (1996): Neb = 1/(2D) + 1/(2(D + 1)).
fn excess(findings: &Findings) -> Vec<wire::EffectiveSize> {
    let all = findings.strata.strata.iter().zip(&findings.sums.strata);
    all.map(|(stratum, sums)| {
        let estimate = match stratum.individuals() < FEWEST_INDIVIDUALS {
            true => Estimate::absent(Absence::TooFewIndividuals),
            // 1/(2 Neb) = D (D + 1)/(2 D + 1), which keeps the sign of D.
            false => two_way_estimate(
                &sums.diversity,
                |t| {
                    let d = ratio(t.excess, t.excess_alleles)?;
                    ratio(1.0, 2.0 * d + 1.0).map(|inverse| d * (d + 1.0) * inverse)
                },
                |t| t.polymorphic,
                Absence::NoLoci,
            ),
        };
        let subject = Subject {
            population: stratum.population.clone(),
            method: "heterozygote_excess",
            to: stratum.name.clone(),
            refers_to: format!("parents of the individuals sampled at {}", stratum.visit),
            individuals: Some(stratum.individuals() as f64),
            notes: vec![
                "imprecise unless there are fewer than about 10 breeders, many loci and more than 60 \
                 individuals (Luikart & Cornuet 1999); inbreeding and null alleles hide the signal"
                    .to_owned(),
            ],
            ..Subject::default()
        };
        findings.size(subject, &estimate)
    })
    .collect()
}

fn breeders(findings: &Findings, population: &str) -> Option<wire::EffectiveSize> {
    let (males, females) = findings.programme.get(population, |p| p.breeders)?;
    let size = demographic::sex_ratio(males, females)?;
    let estimate = Estimate {
        value: Ok(0.5 / size),
        ..Estimate::absent(Absence::Undefined)
    };
    let subject = counted(
        findings,
        population,
        "males and females",
        males + females,
        "counted, not sampled: no interval; family sizes are taken to vary at random within each sex",
    );
    Some(findings.size(subject, &estimate))
}

fn families(findings: &Findings, population: &str) -> Option<wire::EffectiveSize> {
    let sizes = findings.programme.settings(population).family_sizes;
    let rate = |sizes: &[u32]| Some(0.5 / demographic::FamilySizes::of(sizes)?.effective_size()?);
    let value = rate(&sizes)?;
    let without: Option<Vec<f64>> = (0..sizes.len())
        .map(|i| rate(&[&sizes[..i], &sizes[i + 1..]].concat()))
        .collect();
    let estimate = Estimate {
        value: Ok(value),
        variance_individuals: without.and_then(|w| individual_variance(value, &w)),
        degrees: Some(sizes.len() as f64 - 1.0),
        ..Estimate::absent(Absence::Undefined)
    };
    let subject = counted(
        findings,
        population,
        "family sizes",
        sizes.len() as f64,
        "the interval leaves out one parent at a time; parents without offspring must be among them",
    );
    Some(findings.size(subject, &estimate))
}

fn counted(
    findings: &Findings,
    population: &str,
    variant: &str,
    individuals: f64,
    note: &str,
) -> Subject {
    let latest = findings
        .strata
        .strata
        .iter()
        .rev()
        .find(|s| s.population == population);
    Subject {
        population: population.to_owned(),
        method: "demographic",
        variant: Some(variant.to_owned()),
        to: latest.map(|s| s.name.clone()).unwrap_or_default(),
        refers_to: "the generation counted".to_owned(),
        individuals: Some(individuals),
        census: findings.programme.get(population, |p| p.census),
        notes: vec![note.to_owned()],
        ..Subject::default()
    }
}
