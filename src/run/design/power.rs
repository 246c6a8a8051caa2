//! The simulated chance to declare a decline, with the estimators of `measure`.

use std::collections::{BTreeMap, BTreeSet};
use std::sync::Arc;

use rayon::prelude::*;

use super::each;
use crate::cli::DesignPlan;
use crate::error::{Error, Result};
use crate::merge::{Scheme, Sums};
use crate::model::{
    DEFAULT_FALSE_DISCOVERY_RATE, DEFAULT_LEVEL, Locus, Programme, comparisons, default_gene_copies,
};
use crate::outlook::design::{Setting, scenario};
use crate::outlook::rehearse::{Simulation, simulate};
use crate::report::assemble::{self, Findings};
use crate::report::design::{Power, Sampling};
use crate::report::wire::LossCall;

/// What may be declared of a simulated population, in the order of [`declared`].
pub const DECLARED: [&str; 7] = [
    "size_below_limit_by_temporal_fs",
    "size_below_limit_by_temporal_likelihood",
    "size_below_limit_by_linkage",
    "heterozygosity_lower",
    "richness_lower",
    "allele_not_seen_again",
    "allele_called_lost",
];
/// Of these, how many are about the effective size.
const ABOUT_SIZE: usize = 3;
/// Alleles not seen again that are followed by name, so that calls can be held against the truth.
const MOST_FOLLOWED: usize = 100_000;

/// What a report declares of a simulated population; shares of populations once added up.
type Shares = [f64; DECLARED.len()];

/// The shares of populations of one design and size.
#[derive(Debug, Clone, Copy)]
struct Outcome {
    declared: Shares,
    /// The same, but an allele counts as called lost where one is that the population still has.
    wrongly: Shares,
}

/// Simulated power of every design; nothing when no simulations are asked for.
pub fn powers(plan: &DesignPlan) -> Result<Vec<Power>> {
    if plan.simulations == 0 {
        return Ok(Vec::new());
    }
    let threads = plan.threads.unwrap_or_else(crate::run::available_threads);
    let pool = rayon::ThreadPoolBuilder::new()
        .num_threads(threads)
        .build()
        .map_err(|e| Error::Usage(format!("{threads} threads cannot be started: {e}")))?;
    let mut all = Vec::new();
    // Designs that differ in the true size alone share their false alarms.
    let mut known: BTreeMap<(u64, u64, Option<u64>, u64), Outcome> = BTreeMap::new();
    for design in each(plan) {
        let mut at = |size: f64| {
            let key = (
                design.individuals,
                design.loci,
                design.generations,
                size.to_bits(),
            );
            if let Some(outcome) = known.get(&key) {
                return Ok(*outcome);
            }
            let outcome = pool.install(|| shares(plan, &design, size))?;
            known.insert(key, outcome);
            Ok::<Outcome, Error>(outcome)
        };
        let (power, at_limit, stable) = (
            at(design.effective_size)?.declared,
            at(plan.size_limit)?.declared,
            at(plan.stable_size)?.wrongly,
        );
        for (i, declared) in DECLARED.into_iter().enumerate() {
            let (alarms, false_alarms_at) = match i < ABOUT_SIZE {
                true => (at_limit[i], plan.size_limit),
                false => (stable[i], plan.stable_size),
            };
            let simulations = f64::from(plan.simulations);
            all.push(Power {
                declared: declared.to_owned(),
                design: design.clone(),
                simulations: plan.simulations.into(),
                power: power[i],
                error: (power[i] * (1.0 - power[i]) / simulations).sqrt(),
                false_alarms: alarms,
                false_alarms_at,
            });
        }
    }
    Ok(all)
}

/// Shares of simulated populations of which each thing is declared.
fn shares(plan: &DesignPlan, design: &Sampling, size: f64) -> Result<Outcome> {
    // With two sexes in equal numbers, Ne is N + 1/2.
    let adults = ((size - 0.5).round() as u32).max(2);
    let setting = Setting {
        adults,
        individuals: design.individuals as u32,
        loci: design.loci as u32,
        alleles: plan.alleles,
        generations: design.generations.unwrap_or(1) as u32,
        chromosomes: plan.chromosomes,
    };
    let runs: Vec<[[bool; DECLARED.len()]; 2]> = (0..u64::from(plan.simulations))
        .into_par_iter()
        .map(|run| declared(plan, &setting, plan.seed.wrapping_add(run)))
        .collect::<Result<_>>()?;
    let share = |which: usize, i: usize| {
        runs.iter().filter(|r| r[which][i]).count() as f64 / runs.len() as f64
    };
    Ok(Outcome {
        declared: std::array::from_fn(|i| share(0, i)),
        wrongly: std::array::from_fn(|i| share(1, i)),
    })
}

/// What the report on one simulated population would declare: everything, and the same with the last
/// only where it is wrong.
fn declared(
    plan: &DesignPlan,
    setting: &Setting,
    seed: u64,
) -> Result<[[bool; DECLARED.len()]; 2]> {
    let simulation = simulate(&scenario(setting), seed)?;
    let strata = simulation.model_strata();
    let programme = Programme::default();
    let compared = comparisons(&strata, &programme).map_err(|problems| Error::Sheet {
        path: "design".into(),
        problems,
    })?;
    let gene_copies = default_gene_copies(&strata).unwrap_or(2);
    let pairs = &compared.comparisons;
    let scheme = Scheme::new(&strata, pairs, 0.0, gene_copies, MOST_FOLLOWED);
    let mut sums = Sums::new(Arc::new(scheme));
    let mut locus = Locus::default();
    for index in 0..simulation.loci.len() {
        simulation.fill_locus(index, &mut locus);
        sums.add(&locus);
    }
    sums.flush();
    let findings = Findings {
        strata: &strata,
        comparisons: pairs,
        sums: &sums,
        programme: &programme,
        level: DEFAULT_LEVEL,
        false_discovery_rate: DEFAULT_FALSE_DISCOVERY_RATE,
        fits: Vec::new(),
    }
    .fitted();
    let called = called_lost(&findings, &simulation);
    let mut said = declared_of(plan, &findings);
    said[DECLARED.len() - 1] = called.right > 0;
    let mut wrongly = said;
    wrongly[DECLARED.len() - 1] = called.wrong > 0;
    Ok([said, wrongly])
}

/// Alleles called lost, held against the truth.
struct CalledLost {
    /// Those that no adult has any more.
    right: usize,
    /// Those that some adult still has.
    wrong: usize,
}

fn called_lost(findings: &Findings, simulation: &Simulation) -> CalledLost {
    let mut gone = BTreeSet::new();
    for locus in &simulation.truth.loci {
        let latest = locus.copies.last().into_iter().flatten();
        for (allele, _) in locus
            .alleles
            .iter()
            .zip(latest)
            .filter(|(_, copies)| **copies == 0)
        {
            gone.insert((locus.contig.as_str(), locus.position, allele.as_str()));
        }
    }
    let losses = assemble::losses(findings);
    let called = losses.iter().filter(|l| l.call == Some(LossCall::Lost));
    let (right, wrong): (Vec<_>, Vec<_>) =
        called.partition(|l| gone.contains(&(l.contig.as_str(), l.position, l.allele.as_str())));
    CalledLost {
        right: right.len(),
        wrong: wrong.len(),
    }
}

/// Everything but calls of lost alleles, which need the truth.
fn declared_of(plan: &DesignPlan, findings: &Findings) -> [bool; DECLARED.len()] {
    let sizes = assemble::effective_size(findings);
    let latest = findings.strata.strata.last();
    let latest = latest.map_or("", |s| s.name.as_str());
    let below = |method: &str| {
        sizes
            .iter()
            .filter(|e| e.method == method && e.headline && e.to == latest)
            .filter_map(|e| e.interval?.1)
            .any(|high| high < plan.size_limit)
    };
    let compared = assemble::comparisons(findings);
    let change = compared.first();
    let richness = assemble::strata(findings);
    let before = richness.first().and_then(|s| s.allelic_richness.estimate);
    let lower =
        |limit: f64, interval: Option<[f64; 2]>| interval.is_some_and(|[_, high]| high < limit);
    [
        below("temporal_fs"),
        below("temporal_likelihood"),
        below("linkage"),
        change.is_some_and(|c| lower(0.0, c.change.expected_heterozygosity.interval)),
        change.is_some_and(|c| {
            lower(
                -plan.richness_drop * before.unwrap_or(0.0),
                c.change.allelic_richness.interval,
            )
        }),
        change
            .and_then(|c| c.alleles.as_ref())
            .is_some_and(|a| a.not_seen_again > 0),
        false,
    ]
}
