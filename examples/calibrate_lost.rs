//! Simulates populations, lets the report say how probable it is that each allele not seen again is lost,
//! and counts how many are. Prints one row a cell and tenth of the scale (tab-separated).
//!
//! ```sh
//! cargo run --release --example calibrate_lost -- 40 > tests/calibration/lost.tsv
//! ```
//! The number is that of populations a cell; more numbers pick cells, counted from 1. The effective size is
//! not told to the program: chances are averaged over what it estimates, as in `genewane measure`.
//!
//! A cell with a range of adults draws a number for each population, evenly in 1/(2Ne): this is what the
//! program takes for likely before it sees the data, and the only case in which chances can be right at
//! every tenth. Where all populations have one size, the topmost tenth picks those in which the size was
//! estimated too small.

use std::collections::{BTreeMap, BTreeSet};
use std::error::Error;
use std::sync::Arc;

use genewane::merge::{Scheme, Sums};
use genewane::model::{Locus, Programme, SamplingPlan, comparisons};
use genewane::outlook::rehearse::{Scenario, simulate};
use genewane::report::assemble::{Findings, losses};
use rayon::prelude::*;

/// Fewest and most adults, loci, generations between the two visits, individuals a visit, frequencies at
/// the founding.
type Cell = ([u32; 2], u32, u32, u32, &'static str);

const GRID: [Cell; 12] = [
    ([50, 50], 1000, 5, 25, "{ beta = [1.0, 1.0] }"),
    ([50, 50], 1000, 5, 25, "{ beta = [0.2, 0.8] }"),
    ([100, 100], 1000, 10, 30, "{ beta = [0.1, 1.0] }"),
    ([25, 25], 1000, 4, 20, "{ beta = [0.3, 0.3] }"),
    ([100, 100], 1000, 2, 50, "{ beta = [0.2, 0.8] }"),
    ([200, 200], 1000, 10, 25, "{ beta = [0.5, 1.0] }"),
    ([50, 50], 300, 10, 40, "{ dirichlet = 0.8 }"),
    ([30, 30], 200, 3, 15, "{ beta = [0.5, 1.0] }"),
    ([16, 1000], 1000, 5, 30, "{ beta = [0.2, 0.8] }"),
    ([16, 1000], 500, 10, 40, "{ beta = [0.5, 1.0] }"),
    ([16, 1000], 200, 4, 20, "{ beta = [0.5, 0.5] }"),
    ([16, 1000], 100, 8, 30, "{ dirichlet = 0.8 }"),
];

/// Adults of one population of a cell: even in 1/(2Ne). Steps of the golden ratio fill the range evenly
/// whatever the number of populations.
fn adults_of([fewest, most]: [u32; 2], seed: u64) -> u32 {
    let share = (seed as f64 * 0.618_033_988_749_894_9).fract();
    let [high, low] = [fewest, most].map(|n| 0.5 / f64::from(n));
    (0.5 / (low + share * (high - low))).round() as u32
}

/// Tenths of the scale.
const TENTHS: usize = 10;

fn main() -> Result<(), Box<dyn Error + Send + Sync>> {
    let mut numbers = std::env::args().skip(1).map(|n| n.parse::<usize>());
    let runs = numbers.next().unwrap_or(Ok(20))?;
    let picked: Vec<usize> = numbers.collect::<Result<_, _>>()?;
    println!(
        "cell\tadults\tloci\tgenerations\tsample\tfrequencies\ttenth\talleles\tsaid_lost\treally_lost\t\
         standard_error"
    );
    for (number, &cell) in (1usize..).zip(&GRID) {
        if !picked.is_empty() && !picked.contains(&number) {
            continue;
        }
        // By population and tenth: alleles, chances said, really lost.
        let all: Vec<[[f64; 3]; TENTHS]> = (1..=runs as u64)
            .into_par_iter()
            .map(|seed| said_and_true(cell, seed))
            .collect::<Result<_, _>>()?;
        for tenth in 0..TENTHS {
            print_row(number, cell, tenth, &all);
        }
    }
    Ok(())
}

/// Sums over populations. Alleles of one population share its pedigree, so the error of the difference is
/// that between populations, of a ratio (Cochran 1977, eq. 2.39).
fn print_row(
    number: usize,
    ([fewest, most], loci, generations, sample, frequencies): Cell,
    tenth: usize,
    all: &[[[f64; 3]; TENTHS]],
) {
    let sum = |which: usize| all.iter().map(|run| run[tenth][which]).sum::<f64>();
    let (alleles, said, truly) = (sum(0), sum(1), sum(2));
    if alleles < 1.0 {
        return;
    }
    let excess = (truly - said) / alleles;
    let squares: f64 = all
        .iter()
        .map(|run| {
            let [n, said, truly] = run[tenth];
            (truly - said - excess * n).powi(2)
        })
        .sum();
    let runs = all.len() as f64;
    let error = (squares * runs / (runs - 1.0)).sqrt() / alleles;
    let adults = match fewest == most {
        true => fewest.to_string(),
        false => format!("{fewest}-{most}"),
    };
    println!(
        "{number}\t{adults}\t{loci}\t{generations}\t{sample}\t{frequencies}\t{:.1}\t{alleles}\t{:.3}\t{:.3}\t\
         {error:.3}",
        tenth as f64 / TENTHS as f64,
        said / alleles,
        truly / alleles,
    );
}

fn said_and_true(
    (range, loci, generations, sample, frequencies): Cell,
    seed: u64,
) -> Result<[[f64; 3]; TENTHS], Box<dyn Error + Send + Sync>> {
    let adults = adults_of(range, seed);
    let alleles = if frequencies.contains("dirichlet") {
        "alleles = 6, "
    } else {
        ""
    };
    let scenario: Scenario = toml::from_str(&format!(
        "settling_generations = 3\n\
         chromosome = [{{ name = \"c\", length_bp = 100_000_000, map_length_cm = 100, copies = 20 }}]\n\
         loci = [{{ count = {loci}, {alleles}frequencies = {frequencies} }}]\n\
         population = [{{ name = \"p\", size = {adults} }}]\n\
         visit = [{{ generation = 0, individuals = {sample} }}, \
         {{ generation = {generations}, individuals = {sample} }}]\n"
    ))?;
    let simulation = simulate(&scenario, seed).map_err(|why| why.to_string())?;
    let strata = simulation.model_strata();
    let mut programme = Programme::default();
    programme.all.plan = Some(SamplingPlan::Two);
    let compared = comparisons(&strata, &programme).map_err(|p| format!("{p:?}"))?;
    let scheme = Scheme::new(&strata, &compared.comparisons, 0.0, 20, usize::MAX);
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
    // The sampled juveniles are born to the adults of the generation before the visit: what those have
    // lost is lost.
    let mut gone = BTreeSet::new();
    let truth = &simulation.truth;
    for lost in truth.gone.iter().filter(|g| g.generation < generations) {
        gone.insert((lost.contig.as_str(), lost.position, lost.allele));
    }
    let mut codes = BTreeMap::new();
    for locus in &truth.loci {
        for (code, allele) in (0u16..).zip(&locus.alleles) {
            codes.insert(
                (locus.contig.as_str(), locus.position, allele.as_str()),
                code,
            );
            if locus.copies[0][usize::from(code)] == 0 {
                gone.insert((locus.contig.as_str(), locus.position, code));
            }
        }
    }
    let mut tenths = [[0.0; 3]; TENTHS];
    for loss in losses(&findings) {
        let Some(p) = loss.probability_lost else {
            continue;
        };
        let code = codes[&(loss.contig.as_str(), loss.position, loss.allele.as_str())];
        let key = (loss.contig.as_str(), loss.position, code);
        let tenth = &mut tenths[((p * TENTHS as f64) as usize).min(TENTHS - 1)];
        tenth[0] += 1.0;
        tenth[1] += p;
        tenth[2] += f64::from(u8::from(gone.contains(&key)));
    }
    Ok(tenths)
}
