//! `genewane design`: what sampling would detect what loss.

use std::path::PathBuf;

use clap::Args;

use super::DesignPlan;
use super::common::{self, Running};

/// Tells what a sampling design can see, before the field season
///
/// For every combination of individuals, loci, generations and true effective size: the expected
/// precision and interval of the temporal and the linkage estimate; how many individuals show an
/// allele, how many individuals or loci reach a precision; and, by simulation with the same
/// estimators as 'measure', the chance to declare a decline and the rate of false alarms.
#[derive(Debug, Clone, Args)]
#[command(after_long_help = EXAMPLES)]
pub(super) struct Flags {
    /// Individuals at each visit, separated by commas
    #[arg(long, value_name = "LIST", value_delimiter = ',', value_parser = clap::value_parser!(u32).range(2..=100_000), default_value = "20,30,50,100")]
    individuals: Vec<u32>,

    /// Loci, separated by commas
    #[arg(long, value_name = "LIST", value_delimiter = ',', value_parser = clap::value_parser!(u32).range(1..=10_000_000), default_value = "20,200,2000")]
    loci: Vec<u32>,

    /// Generations between two visits, separated by commas
    #[arg(long, value_name = "LIST", value_delimiter = ',', value_parser = clap::value_parser!(u32).range(1..=1000), default_value = "1,4")]
    generations: Vec<u32>,

    /// True effective sizes, separated by commas
    #[arg(long, value_name = "LIST", value_delimiter = ',', value_parser = size, default_value = "50,500")]
    effective_size: Vec<f64>,

    /// Alleles a locus: 2 for most SNPs, 8 or more for many microsatellites
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u32).range(2..=64), default_value = "2")]
    alleles: u32,

    /// Chromosomes: loci on one chromosome do not count as pairs for linkage, and are simulated linked
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u32).range(2..=1000), default_value = "20")]
    chromosomes: u32,

    /// Coefficient of variation of 1/Ne that is to be reached
    #[arg(long, value_name = "X", value_parser = common::above_zero, default_value = "0.25", help_heading = "Goals")]
    cv: f64,

    /// Frequencies of alleles that are to be seen, separated by commas
    #[arg(long, value_name = "LIST", value_delimiter = ',', value_parser = common::inner_share, default_value = "0.1,0.05,0.01", help_heading = "Goals")]
    allele_frequency: Vec<f64>,

    /// Probability with which they are to be seen
    #[arg(long, value_name = "X", value_parser = common::inner_share, default_value = "0.95", help_heading = "Goals")]
    seen: f64,

    /// Power that is to be reached
    #[arg(long, value_name = "X", value_parser = common::inner_share, default_value = "0.8", help_heading = "Goals")]
    power: f64,

    /// Simulations a design, for the power; 0 leaves it out
    ///
    /// The Monte Carlo error of a power is at most 0.5 over the root of this number.
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u32).range(0..=10_000), default_value = "0", help_heading = "Simulation")]
    simulate: u32,

    /// Effective size below which a decline is to be declared
    ///
    /// It is declared when the whole 95 % interval lies below. False alarms are counted in a
    /// population of just this size.
    #[arg(long, value_name = "X", value_parser = size, default_value = "100", help_heading = "Simulation")]
    size_limit: f64,

    /// Share of allelic richness that must be gone before its loss is declared
    #[arg(long, value_name = "X", value_parser = common::share, default_value = "0", help_heading = "Simulation")]
    richness_drop: f64,

    /// Effective size of the stable population in which declared losses are false alarms
    #[arg(long, value_name = "X", value_parser = size, default_value = "1000", help_heading = "Simulation")]
    stable_size: f64,

    /// Seed of all chance; the same seed gives the same bytes
    #[arg(
        long,
        value_name = "N",
        default_value = "1",
        help_heading = "Simulation"
    )]
    seed: u64,

    /// Cost of one sampled and genotyped individual
    #[arg(long, value_name = "X", value_parser = common::above_zero, help_heading = "Costs")]
    cost_per_sample: Option<f64>,

    /// Cost of one locus, paid once
    #[arg(long, value_name = "X", value_parser = common::above_zero, help_heading = "Costs")]
    cost_per_locus: Option<f64>,

    /// Write the document here [default: standard output]
    #[arg(short, long, value_name = "FILE", help_heading = "Output")]
    output: Option<PathBuf>,

    #[command(flatten)]
    running: Running,
}

const EXAMPLES: &str = "\
Examples:
  What 30 or 60 fish and 200 or 2000 loci say of Ne after four generations:
    genewane design --individuals 30,60 --loci 200,2000 --generations 4 --effective-size 50,200

  The power to see an Ne of 40 below 100, the cheapest design first:
    genewane design --individuals 25,50 --loci 100,1000 --generations 5 --effective-size 40 \\
        --size-limit 100 --simulate 100 --cost-per-sample 40 --cost-per-locus 2 -o design.json";

/// An effective size that can be simulated and computed.
fn size(text: &str) -> Result<f64, String> {
    match common::above_zero(text)? {
        size if (2.0..=1e6).contains(&size) => Ok(size),
        _ => Err("not an effective size from 2 to a million".to_string()),
    }
}

impl Flags {
    /// What was typed, as what is meant.
    pub fn plan(self) -> DesignPlan {
        DesignPlan {
            individuals: self.individuals,
            loci: self.loci,
            generations: self.generations,
            effective_sizes: self.effective_size,
            alleles: self.alleles,
            chromosomes: self.chromosomes,
            cv: self.cv,
            frequencies: self.allele_frequency,
            seen: self.seen,
            power: self.power,
            simulations: self.simulate,
            size_limit: self.size_limit,
            richness_drop: self.richness_drop,
            stable_size: self.stable_size,
            cost_per_sample: self.cost_per_sample,
            cost_per_locus: self.cost_per_locus,
            seed: self.seed,
            output: self.output.filter(|path| path.as_os_str() != "-"),
            threads: self.running.threads(),
            quiet: self.running.quiet,
        }
    }
}
