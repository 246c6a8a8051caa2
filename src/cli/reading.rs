//! Flags of what is read and counted, shared by `measure` and `tally`.

use std::path::{Path, PathBuf};

use clap::error::ErrorKind;
use clap::{Args, CommandFactory, ValueEnum};

use super::common::{self, Running};
use super::masks::MaskFlags;
use crate::model::{MeasurePlan, PopulationSettings, SamplingPlan};

/// Calls, sheet, programme and masks.
#[derive(Debug, Clone, Args)]
pub(super) struct Reading {
    /// Genotype calls: VCF, BCF, a tidy table, or tallies of such; '-' is standard input
    ///
    /// Several files are shards of one set of calls: the same samples, different contigs. The
    /// format is found by content, never by name. Diploid genotypes count; partly missing ones are
    /// missing; haploid and polyploid ones are left out and counted.
    ///
    /// Or a tidy table (CSV, TSV) with the columns sample, locus, allele_1, allele_2: bases or
    /// fragment lengths, blank or NA where missing.
    ///
    /// Or tallies, which 'genewane tally' made of shards with the same sheet and options.
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

    /// Most lost alleles listed by name in the report [default: 1000]
    ///
    /// All are counted, listed or not.
    #[arg(long, value_name = "N", help_heading = "Output")]
    list_losses: Option<u32>,

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

impl Reading {
    /// What was typed, as what is meant; outputs are the command's own.
    pub fn plan(self) -> MeasurePlan {
        let mut plan = MeasurePlan::new(self.calls, self.samples);
        plan.locus_map = self.locus_map;
        plan.masks = self.masks.masks();
        plan.programme = self.programme.programme;
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
        plan
    }

    /// Files that stand in each other's way.
    pub fn check<'a>(
        &self,
        command: &str,
        outputs: impl Iterator<Item = &'a PathBuf>,
    ) -> Result<(), clap::Error> {
        for (i, path) in self.calls.iter().enumerate() {
            if self.calls[..i].contains(path) {
                let text = format!("the calls {} are given twice", path.display());
                return Err(refusal(command, text));
            }
        }
        let inputs: Vec<&PathBuf> = self
            .calls
            .iter()
            .chain([&self.samples])
            .chain(&self.programme.programme)
            .collect();
        for output in outputs {
            if output != Path::new("-") && inputs.contains(&output) {
                let text = format!(
                    "{} is both read and written: give the output another name",
                    output.display()
                );
                return Err(refusal(command, text));
            }
        }
        Ok(())
    }
}

/// A refusal with the usage of the command.
pub(super) fn refusal(command: &str, text: String) -> clap::Error {
    let mut all = super::Flags::command();
    all.build();
    match all.find_subcommand_mut(command) {
        Some(one) => one.error(ErrorKind::ArgumentConflict, text),
        None => all.error(ErrorKind::ArgumentConflict, text),
    }
}
