//! Simulates populations whose effective size and diversity are known and asks how often the intervals
//! of the report hold them. Prints one row an estimator and cell (tab-separated).
//!
//! ```sh
//! cargo run --release --example calibrate -- 300 > tests/calibration/coverage.tsv
//! ```
//! The first number is that of runs a cell; more numbers pick cells, counted from 1. With `RUNS_TO=FILE`
//! in the environment, every single run goes to that file too. Genotypes go through the same sums and
//! the same assembly as those of `genewane measure`. Run r of a cell has seed r, so the rows do not
//! depend on threads or on which cells are picked.

use std::error::Error;
use std::fmt::Write as _;
use std::sync::Arc;

use genewane::merge::{Scheme, Sums};
use genewane::model::{Locus, Programme, SamplingPlan, comparisons};
use genewane::outlook::rehearse::{Scenario, simulate};
use genewane::report::assemble::{Findings, effective_size};
use genewane::report::wire::EffectiveSize;
use rayon::prelude::*;

/// One design of the grid.
#[derive(Clone, Copy)]
struct Cell {
    /// Half of each sex: the true effective size is half an individual above.
    adults: u32,
    loci: u32,
    visits: &'static [u32],
    sample: u32,
    /// Chromosomes of 100 centimorgans; 0: every locus on its own.
    chromosomes: u32,
    missing: f64,
    alleles: u32,
    plan: SamplingPlan,
}

impl Cell {
    const fn new(adults: u32, loci: u32, visits: &'static [u32], sample: u32) -> Self {
        Cell {
            adults,
            loci,
            visits,
            sample,
            chromosomes: 0,
            missing: 0.0,
            alleles: 2,
            plan: SamplingPlan::Two,
        }
    }

    const fn linked(self, chromosomes: u32) -> Self {
        Cell {
            chromosomes,
            ..self
        }
    }

    const fn missing(self, missing: f64) -> Self {
        Cell { missing, ..self }
    }

    const fn alleles(self, alleles: u32) -> Self {
        Cell { alleles, ..self }
    }

    const fn plan_one(self) -> Self {
        Cell {
            plan: SamplingPlan::One,
            ..self
        }
    }
}

const GRID: [Cell; 18] = [
    Cell::new(50, 500, &[0, 4], 50),
    Cell::new(50, 2000, &[0, 2], 25),
    Cell::new(25, 300, &[0, 2], 25),
    Cell::new(100, 500, &[0, 10], 50),
    Cell::new(100, 500, &[0, 5, 10], 50).missing(0.1),
    Cell::new(500, 2000, &[0, 5], 50),
    Cell::new(100, 1000, &[0, 5], 50).linked(20),
    Cell::new(100, 1000, &[0, 5], 50).linked(20).missing(0.3),
    Cell::new(200, 200, &[0, 5], 30),
    Cell::new(1000, 5000, &[0, 5], 100),
    Cell::new(25, 100, &[0, 1], 20),
    Cell::new(50, 300, &[0, 20], 50),
    Cell::new(200, 20_000, &[0, 4], 40).linked(20),
    Cell::new(100, 60, &[0, 5], 50).alleles(8),
    Cell::new(100, 500, &[0, 5], 50).plan_one(),
    Cell::new(200, 1000, &[0, 2, 10], 50).linked(10),
    Cell::new(100, 1000, &[0, 20], 100).linked(20).missing(0.1),
    Cell::new(1000, 2000, &[0, 1], 50),
];

/// Estimators of effective size, as named in the report.
const METHODS: [&str; 4] = [
    "temporal_fs",
    "temporal_fc",
    "temporal_likelihood",
    "linkage",
];

/// One estimate of one run: the drift rate 1/(2Ne) and its interval.
#[derive(Debug, Clone, Copy)]
struct Outcome {
    method: &'static str,
    rate: f64,
    interval: [f64; 2],
    unbounded: bool,
}

fn main() -> Result<(), Box<dyn Error + Send + Sync>> {
    let mut numbers = std::env::args().skip(1).map(|n| n.parse::<usize>());
    let runs = numbers.next().unwrap_or(Ok(100))?;
    let picked: Vec<usize> = numbers.collect::<Result<_, _>>()?;
    let mut every_run = String::new();
    println!(
        "cell\tadults\tloci\tgenerations\tsample\tchromosomes\tmissing\talleles\tplan\testimator\truns\t\
         bias_percent\tcv\tcoverage\tcoverage_error\tunbounded_share"
    );
    for (number, cell) in (1..).zip(&GRID) {
        if !picked.is_empty() && !picked.contains(&number) {
            continue;
        }
        let truth = 0.5 / (f64::from(cell.adults) + 0.5);
        let outcomes: Vec<Vec<Outcome>> = (1..=runs as u64)
            .into_par_iter()
            .map(|seed| outcomes(cell, seed))
            .collect::<Result<_, _>>()?;
        for method in METHODS {
            let of_method: Vec<Outcome> = outcomes
                .iter()
                .flatten()
                .copied()
                .filter(|o| o.method == method)
                .collect();
            if !of_method.is_empty() {
                print_row(number, cell, method, &of_method, truth);
            }
            for o in &of_method {
                let [low, high] = o.interval;
                writeln!(
                    every_run,
                    "{number}\t{method}\t{truth}\t{}\t{low}\t{high}",
                    o.rate
                )?;
            }
        }
    }
    if let Some(path) = std::env::var_os("RUNS_TO") {
        std::fs::write(path, every_run)?;
    }
    Ok(())
}

fn print_row(number: usize, cell: &Cell, method: &str, outcomes: &[Outcome], truth: f64) {
    let n = outcomes.len() as f64;
    let share =
        |holds: &dyn Fn(&Outcome) -> bool| outcomes.iter().filter(|o| holds(o)).count() as f64 / n;
    let mean = outcomes.iter().map(|o| o.rate).sum::<f64>() / n;
    let squares: f64 = outcomes.iter().map(|o| (o.rate - mean).powi(2)).sum();
    let coverage = share(&|o| o.interval[0] <= truth && truth <= o.interval[1]);
    let visits: Vec<String> = cell.visits.iter().map(u32::to_string).collect();
    println!(
        "{number}\t{}\t{}\t{}\t{}\t{}\t{}\t{}\t{}\t{method}\t{}\t{:.1}\t{:.3}\t{coverage:.3}\t{:.3}\t{:.3}",
        cell.adults,
        cell.loci,
        visits.join(","),
        cell.sample,
        cell.chromosomes,
        cell.missing,
        cell.alleles,
        plan_name(cell.plan),
        outcomes.len(),
        100.0 * (truth / mean - 1.0),
        (squares / (n - 1.0)).sqrt() / mean,
        (coverage * (1.0 - coverage) / n).sqrt(),
        share(&|o| o.unbounded),
    );
}

fn plan_name(plan: SamplingPlan) -> &'static str {
    match plan {
        SamplingPlan::One => "I",
        SamplingPlan::Two => "II",
    }
}

/// What the report says of one simulated population.
fn outcomes(cell: &Cell, seed: u64) -> Result<Vec<Outcome>, Box<dyn Error + Send + Sync>> {
    let sizes = estimates(cell, seed)?;
    let outcome = |method| {
        let size = whole_time(&sizes, method)?;
        Some(Outcome {
            method,
            rate: size.drift_rate.estimate?,
            interval: size.drift_rate.interval?,
            unbounded: size.unbounded,
        })
    };
    // The likelihood presumes plan II.
    let applies = |m: &str| cell.plan == SamplingPlan::Two || m != "temporal_likelihood";
    Ok(METHODS
        .into_iter()
        .filter(|m| applies(m))
        .filter_map(outcome)
        .collect())
}

/// The entry of a method for the whole time, or for the latest sample.
fn whole_time<'a>(sizes: &'a [EffectiveSize], method: &str) -> Option<&'a EffectiveSize> {
    let of_method = sizes.iter().filter(|size| size.method == method);
    let longest = |a: &&EffectiveSize, b: &&EffectiveSize| {
        let key = |size: &EffectiveSize| (size.generations.unwrap_or(0.0), size.headline);
        key(a)
            .partial_cmp(&key(b))
            .unwrap_or(std::cmp::Ordering::Equal)
    };
    of_method.max_by(longest)
}

/// The section on effective size of one simulated population.
fn estimates(cell: &Cell, seed: u64) -> Result<Vec<EffectiveSize>, Box<dyn Error + Send + Sync>> {
    let simulation = simulate(&scenario(cell)?, seed).map_err(|why| why.to_string())?;
    let strata = simulation.model_strata();
    let mut programme = Programme::default();
    programme.all.plan = Some(cell.plan);
    programme.all.census = (cell.plan == SamplingPlan::One).then_some(f64::from(cell.adults));
    programme.all.generation_years = Some(1.0);
    let compared = comparisons(&strata, &programme).map_err(|p| format!("{p:?}"))?;
    let scheme = Scheme::new(&strata, &compared.comparisons, 0.0, 20, 0);
    let mut sums = Sums::new(Arc::new(scheme));
    let mut locus = Locus::default();
    for i in 0..simulation.loci.len() {
        simulation.fill_locus(i, &mut locus);
        sums.add(&locus);
    }
    sums.flush();
    let findings = Findings {
        strata: &strata,
        comparisons: &compared.comparisons,
        sums: &sums,
        programme: &programme,
        level: 0.95,
        false_discovery_rate: 0.05,
        fits: Vec::new(),
    }
    .fitted();
    Ok(effective_size(&findings))
}

fn scenario(cell: &Cell) -> Result<Scenario, toml::de::Error> {
    let chromosome = match cell.chromosomes {
        // Contigs only carry the names of the loci here; each locus is inherited on its own.
        0 => "{ name = \"u\", length_bp = 50_000_000, unlinked = true, copies = 40 }".to_owned(),
        n => format!(
            "{{ name = \"c\", length_bp = 100_000_000, map_length_cm = 100, copies = {n} }}"
        ),
    };
    let visit = |g: &u32| {
        format!(
            "{{ generation = {g}, individuals = {}, plan = \"{}\" }}",
            cell.sample,
            plan_name(cell.plan)
        )
    };
    let visits: Vec<String> = cell.visits.iter().map(visit).collect();
    let frequencies = match cell.alleles {
        2 => "frequencies = { beta = [1.0, 1.0] }".to_owned(),
        n => format!("alleles = {n}, frequencies = {{ dirichlet = 1.0 }}"),
    };
    toml::from_str(&format!(
        "settling_generations = {}\nchromosome = [{chromosome}]\n\
         loci = [{{ count = {}, {frequencies} }}]\n\
         population = [{{ name = \"p\", size = {} }}]\nvisit = [{}]\n\
         genotyping = {{ missing_rate = {}, missing_spread_samples = 0.5 }}\n",
        if cell.chromosomes == 0 { 5 } else { 30 },
        cell.loci,
        cell.adults,
        visits.join(", "),
        cell.missing
    ))
}
