//! `genewane measure`: the main job.

use std::ffi::OsStr;
use std::path::{Path, PathBuf};

use clap::error::ErrorKind;
use clap::{Args, CommandFactory, ValueEnum};

use super::common::{self, Running};
use super::masks::MaskFlags;
use crate::model::{MeasurePlan, PopulationSettings, SamplingPlan};

/// Measures diversity, its change and effective size from genotype calls
///
/// Reads the calls once and writes one report: for each population at each visit its diversity; for
/// each visit the change since the baseline with the alleles not seen again; between populations
/// their differentiation; and the effective size by several methods. Every estimate has an interval
/// that counts loci and individuals, the number of loci behind it, or the reason why it is absent.
#[derive(Debug, Clone, Args)]
#[command(after_long_help = EXAMPLES, arg_required_else_help = true)]
pub(super) struct Flags {
    /// Genotype calls: VCF, BCF or a tidy table; '-' is standard input
    ///
    /// Several files are shards of one set of calls: the same samples, different contigs. The
    /// format is found by content, never by name. Diploid genotypes count; partly missing ones are
    /// missing; haploid and polyploid ones are left out and counted.
    ///
    /// Or a tidy table (CSV, TSV) with the columns sample, locus, allele_1, allele_2: bases or
    /// fragment lengths, blank or NA where missing.
    #[arg(value_name = "CALLS", required = true)]
    calls: Vec<PathBuf>,

    /// Sample sheet: who was sampled where and when
    ///
    /// A table in UTF-8 with a header row, delimited by tabs, commas or semicolons. Columns:
    /// sample, population and year (or date, as 2019-05-03); optional visit (a label that pools
    /// years), sex (F, M), generation, replicate_of, batch, use (rows with 'no' are left out and
    /// counted). Further columns are ignored.
    #[arg(long, value_name = "SHEET")]
    samples: PathBuf,

    /// Where the loci of a tidy genotype table are: columns locus, contig, position
    ///
    /// Without it each locus counts as unlinked to all others.
    #[arg(long, value_name = "FILE")]
    locus_map: Option<PathBuf>,

    /// Let samples of the sheet lack calls: they are left out with a note
    #[arg(long)]
    allow_absent: bool,

    #[command(flatten)]
    programme: ProgrammeFlags,

    /// Least share of individuals typed for a locus to count [default: 0, every typed locus]
    ///
    /// A share from 0 to 1 of all individuals in use. Estimators weigh each locus by its own sample,
    /// so no filter is needed for their sake.
    #[arg(long, value_name = "X", value_parser = common::share, help_heading = "Loci")]
    min_call_rate: Option<f64>,

    /// Gene copies to which allelic richness is rarefied [default: by the smallest stratum]
    ///
    /// An even number. Give the same one every year to compare reports. The default is the largest
    /// even number not above 80 % of the gene copies of the smallest stratum of at least 5
    /// individuals.
    #[arg(long, value_name = "N", value_parser = common::gene_copies, help_heading = "Loci")]
    gene_copies: Option<u32>,

    /// Write the report here [default: standard output]
    #[arg(short, long, value_name = "FILE", help_heading = "Output")]
    output: Option<PathBuf>,

    /// Write a table with one row a locus here; the name ends in .tsv or .tsv.gz
    #[arg(long, value_name = "FILE", help_heading = "Output")]
    loci: Option<PathBuf>,

    /// Most lost alleles listed by name in the report [default: 1000]
    ///
    /// All are counted, listed or not.
    #[arg(long, value_name = "N", help_heading = "Output")]
    list_losses: Option<u32>,

    /// Put the time of the run into the report, which then differs from run to run
    #[arg(long, help_heading = "Output")]
    stamp: bool,

    #[command(flatten)]
    masks: MaskFlags,

    #[command(flatten)]
    running: Running,
}

/// What is known beside the genotypes.
#[derive(Debug, Clone, Args)]
#[command(next_help_heading = "Programme")]
struct ProgrammeFlags {
    /// Programme file: the settings below by population; flags hold for all and win over it
    ///
    /// TOML. Keys: baseline, generation_years, census, sampling_plan, chromosomes, map_length_cm,
    /// breeding_males, breeding_females, family_sizes, and the table life_history with age_at_maturity,
    /// adult_life_span and fecundity_cv. Tables [population."Name"] hold for one population and win
    /// over the keys at the top.
    #[arg(long, value_name = "FILE")]
    programme: Option<PathBuf>,

    /// Visit that later ones are held against: a label or a year [default: the earliest]
    #[arg(long, value_name = "YEAR|VISIT", value_parser = common::label)]
    baseline: Option<String>,

    /// Generation length in years: the mean age of parents
    ///
    /// Turns years into generations. Not needed where the sheet has generations; without either,
    /// nothing that counts generations is estimated.
    #[arg(long, value_name = "X", value_parser = common::above_zero)]
    generation_years: Option<f64>,

    /// Census size at the baseline, in individuals; needed by sampling plan 1
    #[arg(long, value_name = "N", value_parser = common::census)]
    census: Option<f64>,

    /// How individuals were taken [default: 2]
    ///
    /// The plan matters more than the estimator: the wrong one can double an effective size.
    #[arg(long, value_name = "1|2", value_enum)]
    sampling_plan: Option<Plan>,

    /// Haploid number of chromosomes, to correct linkage estimates for linked loci
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u32).range(1..=1000))]
    chromosomes: Option<u32>,

    /// Length of the genetic map in centimorgans, for the same where chromosomes are not counted
    #[arg(long, value_name = "CM", value_parser = common::above_zero)]
    map_length_cm: Option<f64>,
}

#[derive(Debug, Clone, Copy, ValueEnum)]
enum Plan {
    /// Plan I: sampled individuals may be parents of later ones (sampled after breeding, or put back)
    #[value(name = "1", alias = "I")]
    One,
    /// Plan II: they cannot (removed before breeding, or young that were never put back)
    #[value(name = "2", alias = "II")]
    Two,
}

const EXAMPLES: &str = "\
Examples:
  A report of the demonstration data, generations four years long:
    genewane measure fixtures/demo/calls.vcf.gz --samples fixtures/demo/samples.tsv \\
        --generation-years 4 -o report.json

  Shards by contig from a pipeline, settings for each population in a file:
    genewane measure shards/*.vcf.gz --samples samples.tsv --programme programme.toml \\
        --loci loci.tsv.gz --threads 4 -o report.json

  From standard input, held against the visit of 1995:
    zcat calls.vcf.gz | genewane measure - --samples samples.tsv --baseline 1995 > report.json";

/// Endings of the table by locus that can be written.
const LOCI_ENDINGS: [&str; 2] = [".tsv", ".tsv.gz"];

impl Flags {
    /// What was typed, as what is meant.
    pub fn plan(self) -> Result<MeasurePlan, clap::Error> {
        self.check_files()?;
        let mut plan = MeasurePlan::new(self.calls, self.samples);
        plan.locus_map = self.locus_map;
        plan.masks = self.masks.masks();
        plan.programme = self.programme.programme;
        plan.output = self.output.filter(|path| path.as_os_str() != "-");
        plan.loci_output = self.loci;
        plan.flags = PopulationSettings {
            baseline: self.programme.baseline,
            generation_years: self.programme.generation_years,
            census: self.programme.census,
            plan: self.programme.sampling_plan.map(|plan| match plan {
                Plan::One => SamplingPlan::One,
                Plan::Two => SamplingPlan::Two,
            }),
            chromosomes: self.programme.chromosomes,
            map_length_cm: self.programme.map_length_cm,
            ..PopulationSettings::default()
        };
        plan.allow_absent = self.allow_absent;
        plan.min_call_rate = self.min_call_rate.unwrap_or(plan.min_call_rate);
        plan.gene_copies = self.gene_copies;
        plan.list_losses = self.list_losses.map_or(plan.list_losses, |n| n as usize);
        plan.threads = self.running.threads();
        plan.quiet = self.running.quiet;
        plan.stamp = self.stamp;
        Ok(plan)
    }

    /// Files that stand in each other's way.
    fn check_files(&self) -> Result<(), clap::Error> {
        for (i, path) in self.calls.iter().enumerate() {
            if self.calls[..i].contains(path) {
                return Err(refusal(format!(
                    "the calls {} are given twice",
                    path.display()
                )));
            }
        }
        if let Some(loci) = &self.loci {
            let name = loci.file_name().and_then(OsStr::to_str).unwrap_or_default();
            if !LOCI_ENDINGS.iter().any(|ending| name.ends_with(ending)) {
                return Err(refusal(format!(
                    "--loci {}: the name must end in {}",
                    loci.display(),
                    LOCI_ENDINGS.join(" or ")
                )));
            }
            if self.output.as_ref() == Some(loci) {
                return Err(refusal(format!(
                    "-o and --loci both name {}: give two names",
                    loci.display()
                )));
            }
        }
        let inputs: Vec<&PathBuf> = self
            .calls
            .iter()
            .chain([&self.samples])
            .chain(&self.programme.programme)
            .collect();
        for output in self.output.iter().chain(&self.loci) {
            if output != Path::new("-") && inputs.contains(&output) {
                return Err(refusal(format!(
                    "{} is both read and written: give the output another name",
                    output.display()
                )));
            }
        }
        Ok(())
    }
}

fn refusal(text: String) -> clap::Error {
    let mut command = super::Flags::command();
    command.build();
    match command.find_subcommand_mut("measure") {
        Some(measure) => measure.error(ErrorKind::ArgumentConflict, text),
        None => command.error(ErrorKind::ArgumentConflict, text),
    }
}
