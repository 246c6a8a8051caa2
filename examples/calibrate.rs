//! Simulates populations whose effective size is known and asks how often the intervals of the report
//! hold it. Prints one row an estimator and cell (tab-separated).
//!
//! ```sh
//! cargo run --release --example calibrate -- 100 > tests/calibration/coverage.tsv
//! ```
//! The number is that of runs a cell. Genotypes go through the same sums and the same assembly as
//! those of `genewane measure`.

use std::error::Error;
use std::sync::Arc;

use genewane::merge::{Scheme, Sums};
use genewane::model::{Locus, Programme, SamplingPlan, comparisons};
use genewane::outlook::rehearse::{Scenario, simulate};
use genewane::report::assemble::{Findings, effective_size};
use genewane::report::wire::EffectiveSize;

/// One design of the grid.
struct Cell {
    adults: u32,
    loci: u32,
    visits: &'static [u32],
    sample: u32,
    /// Chromosomes of 100 centimorgans; 0: every locus on its own.
    chromosomes: u32,
    missing: f64,
}

const GRID: [Cell; 8] = [
    Cell {
        adults: 50,
        loci: 500,
        visits: &[0, 4],
        sample: 50,
        chromosomes: 0,
        missing: 0.0,
    },
    Cell {
        adults: 50,
        loci: 2000,
        visits: &[0, 2],
        sample: 25,
        chromosomes: 0,
        missing: 0.0,
    },
    Cell {
        adults: 25,
        loci: 300,
        visits: &[0, 2],
        sample: 25,
        chromosomes: 0,
        missing: 0.0,
    },
    Cell {
        adults: 100,
        loci: 500,
        visits: &[0, 10],
        sample: 50,
        chromosomes: 0,
        missing: 0.0,
    },
    Cell {
        adults: 100,
        loci: 500,
        visits: &[0, 5, 10],
        sample: 50,
        chromosomes: 0,
        missing: 0.1,
    },
    Cell {
        adults: 500,
        loci: 2000,
        visits: &[0, 5],
        sample: 50,
        chromosomes: 0,
        missing: 0.0,
    },
    Cell {
        adults: 100,
        loci: 1000,
        visits: &[0, 5],
        sample: 50,
        chromosomes: 20,
        missing: 0.0,
    },
    Cell {
        adults: 100,
        loci: 1000,
        visits: &[0, 5],
        sample: 50,
        chromosomes: 20,
        missing: 0.2,
    },
];

/// What came of one estimator in one cell.
#[derive(Default)]
struct Score {
    rates: Vec<f64>,
    held: u32,
    unbounded: u32,
}

fn main() -> Result<(), Box<dyn Error>> {
    let runs: u64 = std::env::args().nth(1).map_or(Ok(100), |n| n.parse())?;
    println!(
        "adults\tloci\tgenerations\tsample\tchromosomes\tmissing\testimator\truns\tbias_percent\tcv\t\
         coverage\tcoverage_error\tunbounded_share"
    );
    for cell in &GRID {
        let methods = [
            "temporal_fs",
            "temporal_fc",
            "temporal_likelihood",
            "linkage",
        ];
        let mut scores = methods.map(|_| Score::default());
        // Separate sexes in equal numbers: the effective size is half an individual above the count.
        let truth = 0.5 / (f64::from(cell.adults) + 0.5);
        for run in 0..runs {
            let sizes = estimates(cell, run)?;
            for (score, method) in scores.iter_mut().zip(methods) {
                if let Some(size) = whole_time(&sizes, method) {
                    score.add(size, truth);
                }
            }
        }
        for (score, method) in scores.iter().zip(methods) {
            score.print(cell, method, truth);
        }
    }
    Ok(())
}

impl Score {
    fn add(&mut self, size: &EffectiveSize, truth: f64) {
        let (Some(rate), Some([low, high])) = (size.drift_rate.estimate, size.drift_rate.interval)
        else {
            return;
        };
        self.rates.push(rate);
        self.held += u32::from(low <= truth && truth <= high);
        self.unbounded += u32::from(size.unbounded);
    }

    fn print(&self, cell: &Cell, method: &str, truth: f64) {
        let n = self.rates.len() as f64;
        let mean = self.rates.iter().sum::<f64>() / n;
        let variance = self.rates.iter().map(|r| (r - mean).powi(2)).sum::<f64>() / (n - 1.0);
        let coverage = f64::from(self.held) / n;
        println!(
            "{}\t{}\t{}\t{}\t{}\t{}\t{method}\t{}\t{:.1}\t{:.3}\t{coverage:.3}\t{:.3}\t{:.3}",
            cell.adults,
            cell.loci,
            cell.visits
                .iter()
                .map(u32::to_string)
                .collect::<Vec<_>>()
                .join(","),
            cell.sample,
            cell.chromosomes,
            cell.missing,
            self.rates.len(),
            100.0 * (truth / mean - 1.0),
            variance.sqrt() / mean,
            (coverage * (1.0 - coverage) / n).sqrt(),
            f64::from(self.unbounded) / n,
        );
    }
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
fn estimates(cell: &Cell, run: u64) -> Result<Vec<EffectiveSize>, Box<dyn Error>> {
    let simulation = simulate(&scenario(cell)?, 1 + run)?;
    let strata = simulation.model_strata();
    let mut programme = Programme::default();
    programme.all.plan = Some(SamplingPlan::Two);
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
    let visits: Vec<String> = cell
        .visits
        .iter()
        .map(|g| format!("{{ generation = {g}, individuals = {} }}", cell.sample))
        .collect();
    toml::from_str(&format!(
        "settling_generations = {}\nchromosome = [{chromosome}]\n\
         loci = [{{ count = {}, frequencies = {{ beta = [1.0, 1.0] }} }}]\n\
         population = [{{ name = \"p\", size = {} }}]\nvisit = [{}]\n\
         genotyping = {{ missing_rate = {}, missing_spread_samples = 0.5 }}\n",
        if cell.chromosomes == 0 { 5 } else { 30 },
        cell.loci,
        cell.adults,
        visits.join(", "),
        cell.missing
    ))
}
