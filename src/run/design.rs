//! `genewane design`: precision by formula, power by simulation with the estimators of `measure`.

use std::cmp::Ordering;

mod power;

use self::power::{DECLARED, powers};
use super::documents::provenance;
use crate::cli::DesignPlan;
use crate::error::{Error, Result};
use crate::model::DEFAULT_LEVEL;
use crate::outlook::design::{
    Temporal, individuals_for_cv, individuals_to_see, linkage, loci_for_cv, missed, temporal,
};
use crate::report::design::{
    ASSUMPTIONS, AlleleDetection, Choice, DESIGN_FORMAT, DESIGN_VERSION, Design, Missed,
    NeededForCv, Power, Precision, Sampling, text_table,
};
use crate::report::{CAUTIONS, Output};

/// Largest simulated population: larger ones take minutes a design and are never called declining.
const MOST_ADULTS: f64 = 20_000.0;

/// How designs are weighed up.
const METHODS: [(&str, &str); 4] = [
    (
        "temporal",
        "E F = 1/(2S0) + 1/(2St) + t/(2Ne); CV of 1/Ne = sqrt(2/n') (1 + 2Ne/(tS)); limits by \
         chi-square (Nei & Tajima 1981; Waples 1989)",
    ),
    (
        "linkage",
        "CV of 1/Ne = sqrt(2/n) (1 + 3Ne/S) (Hill 1981); r2 and limits by Waples (2006); n pairs of \
         alleles on different chromosomes",
    ),
    (
        "allele_detection",
        "n = ln(1 - seen)/(2 ln(1 - p)) (Brown & Marshall 1995)",
    ),
    (
        "power",
        "simulated populations through the estimators and intervals of 'measure'",
    ),
];

/// Weighs up every design asked for.
pub fn design(plan: &DesignPlan, arguments: Vec<String>) -> Result<()> {
    let out = Output::create(plan.output.as_deref())?;
    let largest = plan
        .effective_sizes
        .iter()
        .fold(plan.stable_size, |a, &b| a.max(b));
    if plan.simulations > 0 && largest.max(plan.size_limit) > MOST_ADULTS {
        return Err(Error::Usage(format!(
            "an effective size above {MOST_ADULTS} is too large to simulate: leave --simulate out, \
             or lower --effective-size, --size-limit and --stable-size"
        )));
    }
    let mut power = powers(plan)?;
    power.sort_by(|a, b| {
        a.declared
            .cmp(&b.declared)
            .then_with(|| cheapest(&a.design, &b.design))
    });
    let settings = [
        ("alleles", plan.alleles.to_string()),
        ("chromosomes", plan.chromosomes.to_string()),
        ("level", DEFAULT_LEVEL.to_string()),
        ("seed", plan.seed.to_string()),
        ("size_limit", plan.size_limit.to_string()),
        ("richness_drop", plan.richness_drop.to_string()),
    ];
    let design = Design {
        format: DESIGN_FORMAT.to_owned(),
        format_version: DESIGN_VERSION,
        provenance: provenance(arguments, Vec::new(), settings.into(), &METHODS),
        precision: precision(plan),
        allele_detection: plan
            .frequencies
            .iter()
            .map(|&p| detection(plan, p))
            .collect(),
        needed_for_cv: each(plan).map(|d| needed(plan, &d)).collect(),
        smallest_with_power: choices(plan, &power),
        power,
        assumptions: ASSUMPTIONS.map(str::to_owned).into(),
        cautions: CAUTIONS.map(str::to_owned).into(),
    };
    if !plan.quiet {
        eprint!("{}", text_table(&design));
    }
    out.json(&design)
}

/// Every combination of the lists.
fn each(plan: &DesignPlan) -> impl Iterator<Item = Sampling> + '_ {
    plan.effective_sizes.iter().flat_map(move |&size| {
        plan.generations.iter().flat_map(move |&generations| {
            plan.individuals.iter().flat_map(move |&individuals| {
                plan.loci
                    .iter()
                    .map(move |&loci| sampling(plan, individuals, loci, Some(generations), size))
            })
        })
    })
}

fn sampling(
    plan: &DesignPlan,
    individuals: u32,
    loci: u32,
    generations: Option<u32>,
    effective_size: f64,
) -> Sampling {
    let visits = if generations.is_some() { 2.0 } else { 1.0 };
    let costs = [plan.cost_per_sample, plan.cost_per_locus];
    let cost = visits * f64::from(individuals) * costs[0].unwrap_or(0.0)
        + f64::from(loci) * costs[1].unwrap_or(0.0);
    Sampling {
        individuals: individuals.into(),
        loci: loci.into(),
        generations: generations.map(u64::from),
        effective_size,
        cost: costs.iter().any(Option::is_some).then_some(cost),
    }
}

fn precision(plan: &DesignPlan) -> Vec<Precision> {
    let mut rows: Vec<Precision> = each(plan)
        .map(|design| {
            let expected = temporal(&as_temporal(plan, &design), DEFAULT_LEVEL);
            Precision {
                method: "temporal".to_owned(),
                least_cv: expected.cv,
                expected_signal: expected.signal,
                narrowest_interval: expected.interval,
                design,
            }
        })
        .collect();
    for &size in &plan.effective_sizes {
        for &individuals in &plan.individuals {
            for &loci in plan.loci.iter().filter(|&&loci| loci > 1) {
                let expected = linkage(pairs(plan, loci), individuals.into(), size, DEFAULT_LEVEL);
                rows.push(Precision {
                    method: "linkage".to_owned(),
                    design: sampling(plan, individuals, loci, None, size),
                    least_cv: expected.cv,
                    expected_signal: expected.signal,
                    narrowest_interval: expected.interval,
                });
            }
        }
    }
    rows
}

/// Independent comparisons of loci on different chromosomes.
fn pairs(plan: &DesignPlan, loci: u32) -> f64 {
    let (loci, alleles) = (f64::from(loci), f64::from(plan.alleles - 1));
    let apart = 1.0 - 1.0 / f64::from(plan.chromosomes);
    (loci * (loci - 1.0) / 2.0 * apart * alleles * alleles).max(1.0)
}

fn as_temporal(plan: &DesignPlan, design: &Sampling) -> Temporal {
    Temporal {
        independent_alleles: design.loci as f64 * f64::from(plan.alleles - 1),
        first: design.individuals as f64,
        later: design.individuals as f64,
        generations: design.generations.unwrap_or(1) as f64,
        effective_size: design.effective_size,
    }
}

fn needed(plan: &DesignPlan, design: &Sampling) -> NeededForCv {
    let temporal = as_temporal(plan, design);
    let alleles = loci_for_cv(&temporal, plan.cv);
    NeededForCv {
        cv: plan.cv,
        loci_needed: (alleles / f64::from(plan.alleles - 1)).ceil() as u64,
        individuals_needed: individuals_for_cv(&temporal, plan.cv).map(|n| n as u64),
        design: design.clone(),
    }
}

fn detection(plan: &DesignPlan, frequency: f64) -> AlleleDetection {
    let sizes = plan.individuals.iter();
    AlleleDetection {
        frequency,
        seen: plan.seen,
        individuals: individuals_to_see(frequency, plan.seen, 0.0) as u64,
        individuals_if_inbred: individuals_to_see(frequency, plan.seen, 1.0) as u64,
        missed: sizes
            .map(|&individuals| Missed {
                individuals: individuals.into(),
                probability: missed(frequency, individuals.into(), 0.0),
            })
            .collect(),
    }
}

/// The cheaper first; without costs the one with fewer individuals, then fewer loci.
fn cheapest(a: &Sampling, b: &Sampling) -> Ordering {
    let size = |d: &Sampling| (d.individuals, d.loci, d.generations);
    a.effective_size
        .total_cmp(&b.effective_size)
        .then_with(|| match (a.cost, b.cost) {
            (Some(a), Some(b)) => a.total_cmp(&b),
            _ => Ordering::Equal,
        })
        .then_with(|| size(a).cmp(&size(b)))
}

fn choices(plan: &DesignPlan, power: &[Power]) -> Vec<Choice> {
    let mut choices = Vec::new();
    if power.is_empty() {
        return choices;
    }
    for declared in DECLARED {
        for &effective_size in &plan.effective_sizes {
            let first = power.iter().find(|p| {
                p.declared == declared
                    && p.design.effective_size == effective_size
                    && p.power >= plan.power
            });
            choices.push(Choice {
                declared: declared.to_owned(),
                effective_size,
                wanted: plan.power,
                design: first.map(|p| p.design.clone()),
                power: first.map(|p| p.power),
                false_alarms: first.map(|p| p.false_alarms),
            });
        }
    }
    choices
}
