//! `genewane forecast`: what will be left under one management or another.

use std::path::PathBuf;

use clap::Args;

use super::ForecastPlan;
use super::common::{self, Running};

/// Projects diversity and watched alleles under management scenarios
///
/// From the latest visit of each population: expected and observed heterozygosity, allelic richness,
/// alleles left and inbreeding accrued by generation and year, as medians with bands over drift and
/// over the uncertainty of the effective size and of today's frequencies; the time until too little
/// is kept, and the effective size that would keep enough.
#[derive(Debug, Clone, Args)]
#[command(after_long_help = EXAMPLES, arg_required_else_help = true)]
pub(super) struct Flags {
    /// Report that 'genewane measure' wrote; '-' is standard input
    #[arg(value_name = "REPORT")]
    report: PathBuf,

    /// Scenario file: other ways to manage, beside the status quo
    ///
    /// TOML, a table [[scenario]] each, with name, optionally populations, and one way to say the
    /// size: effective_size; census with ratio; sizes (effective sizes by generation, the last one
    /// stays); times (a factor on the estimated size); breeders with family_size_variance or
    /// equal_families = true; males and females. growth is a factor a generation, most its limit.
    /// migrants (individuals a generation) or release (individuals, once, at generation) come from
    /// a stratum named by from.
    #[arg(long, value_name = "FILE")]
    scenarios: Option<PathBuf>,

    /// Alleles to watch: the chance that each is lost, still there or fixed
    ///
    /// A table with the columns contig, position and allele; optional population,
    /// selection_coefficient, copies with gene_copies (of the latest visit; otherwise from --tally, or
    /// from the report where it lists the allele as scarce, written as in the calls), and
    /// source_frequency (where newcomers come from).
    #[arg(long, value_name = "FILE")]
    watch: Option<PathBuf>,

    /// Tally of the report's calls: has the copies of any watched allele; may be given several times
    #[arg(long, value_name = "FILE", requires = "watch")]
    tally: Vec<PathBuf>,

    /// Years to look ahead [default: 100 where a generation length is known]
    #[arg(long, value_name = "N", value_parser = common::above_zero, allow_negative_numbers = true, conflicts_with = "generations")]
    years: Option<f64>,

    /// Generations to look ahead [default: 20 where no generation length is known]
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u32).range(1..=2000))]
    generations: Option<u32>,

    /// Generation length in years [default: the report's]
    #[arg(long, value_name = "X", value_parser = common::above_zero, allow_negative_numbers = true)]
    generation_years: Option<f64>,

    /// Share of the baseline's expected heterozygosity that is to be kept
    #[arg(long, value_name = "X", value_parser = common::inner_share, default_value = "0.9")]
    keep: f64,

    /// Draws behind each band
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u32).range(20..=100_000), default_value = "500")]
    draws: u32,

    /// Seed of all chance; the same seed gives the same bytes
    #[arg(long, value_name = "N", default_value = "1")]
    seed: u64,

    /// Write the forecast here [default: standard output]
    #[arg(short, long, value_name = "FILE", help_heading = "Output")]
    output: Option<PathBuf>,

    #[command(flatten)]
    running: Running,
}

const EXAMPLES: &str = "\
Examples:
  A hundred years of the status quo, where 95 % of the diversity shall stay:
    genewane forecast report.json --keep 0.95 -o forecast.json

  Under other management, with three alleles watched:
    genewane forecast report.json --scenarios scenarios.toml --watch alleles.csv \\
        --years 50 -o forecast.json

  A scenario file:
    [[scenario]]
    name = \"twice the breeders\"
    times = 2
    [[scenario]]
    name = \"ten founders from Quillmere\"
    populations = \"Tarn Osk\"
    release = 10
    from = \"Quillmere@2020\"";

impl Flags {
    /// What was typed, as what is meant.
    pub fn plan(self) -> Result<ForecastPlan, clap::Error> {
        let inputs = [
            Some(&self.report),
            self.scenarios.as_ref(),
            self.watch.as_ref(),
        ];
        common::keep_apart(inputs, self.output.as_ref())?;
        Ok(ForecastPlan {
            report: self.report,
            scenarios: self.scenarios,
            watch: self.watch,
            tallies: self.tally,
            years: self.years,
            generations: self.generations.map(|n| n as usize),
            generation_years: self.generation_years,
            keep: self.keep,
            draws: self.draws as usize,
            seed: self.seed,
            output: self.output.filter(|path| path.as_os_str() != "-"),
            threads: self.running.threads(),
            quiet: self.running.quiet,
        })
    }
}
