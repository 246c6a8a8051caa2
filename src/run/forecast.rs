//! `genewane forecast`: read the report, scenarios and watched alleles; project; write.

use std::collections::HashSet;

use rayon::prelude::*;

use super::documents::{input_file, large_input_file, provenance, report_of};
use crate::cli::ForecastPlan;
use crate::error::{Error, Result};
use crate::outlook::forecast::{Horizon, Scenario, Start, Watched, read_scenarios, read_watched};
use crate::report::Output;
use crate::report::forecast::{Job, counted, forecast as document, starts, text_table};
use crate::report::tally_counts::TalliedCounts;

/// Generations ahead where neither years nor generations are asked for and no generation length is
/// known: as far as most programmes plan.
const DEFAULT_GENERATIONS: usize = 20;
/// Years ahead where a generation length is known: the horizon of zoo and recovery programmes.
const DEFAULT_YEARS: f64 = 100.0;
/// Most generations ahead.
const MOST_GENERATIONS: f64 = 2000.0;

/// How a forecast is made.
const METHODS: [(&str, &str); 6] = [
    (
        "expected_heterozygosity",
        "frequencies of up to 1000 alleles drawn from the spectrum of the latest sample drift by \
         binomial sampling of 2Ne copies (Wright 1931); told as the share left of today's value",
    ),
    (
        "effective_size",
        "draws of 1/(2Ne) from Student's t around the estimate to quote, as wide as its interval, cut \
         off at 0 and 1/2",
    ),
    (
        "frequencies",
        "beta posterior of each allele's copies; its prior fitted to the spectrum of the latest sample",
    ),
    (
        "individuals_come_in",
        "identity of two copies within the population, between it and the source, and within the \
         source, one generation after the other",
    ),
    (
        "sizes_needed",
        "1/(2(1 - R^(1/t))) (Soule, Gilpin, Conway & Foose 1986)",
    ),
    (
        "watched",
        "exact Wright-Fisher chain up to 2000 gene copies, beyond it the diffusion (Kimura 1955), or \
         paths where there is selection or newcomers; fixed in the end by Kimura (1962)",
    ),
];

/// Projects every population under every scenario.
pub fn forecast(plan: &ForecastPlan, arguments: Vec<String>) -> Result<()> {
    let out = Output::create(plan.output.as_deref())?;
    let mut inputs = Vec::new();
    let report = report_of(&plan.report, &mut inputs)?;
    let starts = starts(&report, plan.generation_years);
    let mut scenarios = vec![Scenario::status_quo()];
    if let Some(path) = &plan.scenarios {
        let (read, bytes) = read_scenarios(path, &starts)?;
        inputs.push(input_file("scenarios", path, "toml", &bytes));
        scenarios = read;
    }
    let mut listed = Vec::new();
    if let Some(path) = &plan.watch {
        let (read, bytes) = read_watched(path)?;
        inputs.push(input_file("watch", path, "table", &bytes));
        listed = read;
    }
    for path in &plan.tallies {
        inputs.push(large_input_file("tally", path, "parquet")?);
    }
    let tallied = tallied(plan, &starts, &listed)?;
    let watched =
        counted(&report, &starts, &listed, &tallied).map_err(|problems| Error::Sheet {
            path: plan.watch.clone().unwrap_or_default(),
            problems,
        })?;
    let horizons: Vec<Horizon> = starts
        .iter()
        .map(|start| horizon(plan, start))
        .collect::<Result<_>>()?;
    let jobs: Vec<Job> = starts
        .iter()
        .zip(&horizons)
        .enumerate()
        .flat_map(|(index, (start, &horizon))| {
            let watched = &watched;
            let fitting = scenarios.iter().filter(|s| s.is_for(&start.population));
            fitting.map(move |scenario| Job {
                start,
                scenario,
                index,
                watched,
                horizon,
            })
        })
        .collect();
    let threads = plan.threads.unwrap_or_else(super::available_threads);
    let pool = rayon::ThreadPoolBuilder::new()
        .num_threads(threads)
        .build()
        .map_err(|e| Error::Usage(format!("{threads} threads cannot be started: {e}")))?;
    let done: Vec<_> = pool.install(|| jobs.par_iter().map(|job| (job.index, job.run())).collect());
    let mut by_population = vec![Vec::new(); starts.len()];
    for (i, scenario) in done {
        by_population[i].push(scenario);
    }
    let settings = [
        ("keep", plan.keep.to_string()),
        ("draws", plan.draws.to_string()),
        ("seed", plan.seed.to_string()),
    ];
    let provenance = provenance(arguments, inputs, settings.into(), &METHODS);
    let forecast = document(&report, &starts, &horizons, by_population, provenance);
    if !plan.quiet {
        eprint!("{}", text_table(&forecast));
    }
    out.json(&forecast)
}

/// Counts of the watched alleles at the latest visits, from the rows of the tallies.
fn tallied(plan: &ForecastPlan, starts: &[Start], watched: &[Watched]) -> Result<TalliedCounts> {
    let strata: Vec<&str> = starts.iter().map(|s| s.stratum.as_str()).collect();
    let wanted: HashSet<(&str, u64)> = watched
        .iter()
        .map(|allele| (allele.contig.as_str(), allele.position))
        .collect();
    let mut counts = TalliedCounts::default();
    for path in &plan.tallies {
        counts.take(path, &strata, &wanted)?;
    }
    Ok(counts)
}

/// How far to look for one population.
fn horizon(plan: &ForecastPlan, start: &Start) -> Result<Horizon> {
    let generations = match (plan.generations, plan.years, start.generation_years) {
        (Some(generations), ..) => generations as f64,
        (None, Some(_), None) => {
            return Err(Error::Usage(format!(
                "--years needs a generation length, and the report has none for {}: give \
                 --generation-years, or --generations instead of --years",
                start.population
            )));
        }
        (None, None, None) => DEFAULT_GENERATIONS as f64,
        (None, years, Some(length)) => (years.unwrap_or(DEFAULT_YEARS) / length).round().max(1.0),
    };
    if generations > MOST_GENERATIONS {
        return Err(Error::Usage(format!(
            "{generations} generations of {} are too many: at most {MOST_GENERATIONS}; give fewer \
             years",
            start.population
        )));
    }
    Ok(Horizon {
        generations: generations as usize,
        draws: plan.draws,
        seed: plan.seed,
        keep: plan.keep,
    })
}
