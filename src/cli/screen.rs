//! `genewane screen`: the samples themselves.

use std::path::{Path, PathBuf};

use clap::error::ErrorKind;
use clap::{Args, CommandFactory};

use super::common::{self, Running};
use super::masks::MaskFlags;
use crate::model::{RunRule, ScreenPlan};

/// Looks at the samples and loci themselves, before anything is measured
///
/// Finds samples that are one individual (recaptures, replicates, mix-ups), relatives and families,
/// samples and loci whose genotypes cannot be trusted, and estimates genotyping error and dropout
/// from replicates. Nothing is dropped: what should not be used is said in a copy of the sheet, with
/// the reason, and 'measure' heeds its column 'use'.
#[derive(Debug, Clone, Args)]
#[command(after_long_help = EXAMPLES, arg_required_else_help = true)]
pub(super) struct Flags {
    /// Genotype calls: VCF, BCF or a tidy table; '-' is standard input
    ///
    /// Several files are shards of one set of calls: the same samples, different contigs.
    ///
    /// Or a tidy table (CSV, TSV) with the columns sample, locus, allele_1, allele_2: bases or
    /// fragment lengths, blank or NA where missing.
    #[arg(value_name = "CALLS", required = true)]
    calls: Vec<PathBuf>,

    /// Sample sheet: who was sampled where and when
    ///
    /// As for 'measure'. Replicates are read too, and so are rows with 'no' under 'use'.
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

    /// Least share of records typed for a sample to be used [default: 0.5]
    #[arg(long, value_name = "X", value_parser = common::share, help_heading = "Samples")]
    min_sample_call_rate: Option<f64>,

    /// Loci that both samples of a match must be typed at [default: as many as tell sibs apart]
    #[arg(long, value_name = "N", help_heading = "Samples")]
    fewest_shared: Option<u32>,

    /// Share of the shared loci that may differ within one individual [default: from the panel]
    ///
    /// By default the most for which one full sib of every sample would give 0.05 false matches in
    /// all, and never more than 0.6 of what full sibs are expected to show.
    #[arg(long, value_name = "X", value_parser = common::share, help_heading = "Samples")]
    most_mismatching: Option<f64>,

    /// Most loci of two alleles on which pairs are compared [default: 50000]
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u32).range(1..), help_heading = "Samples")]
    most_loci: Option<u32>,

    #[command(flatten)]
    runs: RunFlags,

    /// Share of false findings accepted among odd loci [default: 0.05]
    #[arg(long, value_name = "X", value_parser = common::share, help_heading = "Loci")]
    false_discovery_rate: Option<f64>,

    /// Write the report here [default: standard output]
    #[arg(short, long, value_name = "FILE", help_heading = "Output")]
    output: Option<PathBuf>,

    /// Write the sheet here, every row and column kept, with columns 'use' and 'why'
    #[arg(long, value_name = "FILE", help_heading = "Output")]
    write_sheet: Option<PathBuf>,

    /// Most related pairs listed by name [default: 1000]; all are counted
    #[arg(long, value_name = "N", help_heading = "Output")]
    list_pairs: Option<u32>,

    /// Most odd loci listed of each kind [default: 200]; all are counted
    #[arg(long, value_name = "N", help_heading = "Output")]
    list_loci: Option<u32>,

    #[command(flatten)]
    masks: MaskFlags,

    #[command(flatten)]
    running: Running,
}

/// What counts as a run of homozygosity.
#[derive(Debug, Clone, Args)]
#[command(next_help_heading = "Runs of homozygosity")]
struct RunFlags {
    /// Fewest typed loci of a run [default: 30]
    #[arg(long, value_name = "N")]
    run_loci: Option<u32>,
    /// Least length of a run in base pairs [default: 1000000]
    #[arg(long, value_name = "BP")]
    run_length: Option<u64>,
    /// Most heterozygous loci inside a run [default: 1]
    #[arg(long, value_name = "N")]
    run_heterozygous: Option<u32>,
    /// Most missing loci inside a run [default: 5]
    #[arg(long, value_name = "N")]
    run_missing: Option<u32>,
    /// Widest gap between neighbouring loci of a run in base pairs [default: 500000]
    #[arg(long, value_name = "BP")]
    run_gap: Option<u64>,
}

const EXAMPLES: &str = "\
Examples:
  Screen, look at the report, then measure what can be trusted:
    genewane screen calls.vcf.gz --samples samples.tsv -o screen.json --write-sheet clean.tsv
    genewane measure calls.vcf.gz --samples clean.tsv -o report.json

  Scat samples at few loci: at most one mismatch in ten, eight loci at least:
    genewane screen calls.vcf --samples samples.csv --most-mismatching 0.1 --fewest-shared 8";

impl Flags {
    /// What was typed, as what is meant.
    pub fn plan(self) -> Result<ScreenPlan, clap::Error> {
        self.check_files()?;
        let mut plan = ScreenPlan::new(self.calls, self.samples);
        plan.output = self.output.filter(|path| path.as_os_str() != "-");
        plan.locus_map = self.locus_map;
        plan.masks = self.masks.masks();
        plan.clean_sheet = self.write_sheet;
        plan.allow_absent = self.allow_absent;
        let number = |n: Option<u32>, default| n.map_or(default, |n| n as usize);
        plan.most_loci = number(self.most_loci, plan.most_loci);
        plan.list_pairs = number(self.list_pairs, plan.list_pairs);
        plan.list_loci = number(self.list_loci, plan.list_loci);
        plan.fewest_shared = self.fewest_shared.unwrap_or(plan.fewest_shared);
        plan.most_mismatching = self.most_mismatching;
        plan.min_sample_call_rate = self
            .min_sample_call_rate
            .unwrap_or(plan.min_sample_call_rate);
        plan.false_discovery_rate = self
            .false_discovery_rate
            .unwrap_or(plan.false_discovery_rate);
        let (runs, default) = (self.runs, plan.runs);
        plan.runs = RunRule {
            fewest_loci: runs.run_loci.unwrap_or(default.fewest_loci),
            shortest: runs.run_length.unwrap_or(default.shortest),
            most_heterozygous: runs.run_heterozygous.unwrap_or(default.most_heterozygous),
            most_missing: runs.run_missing.unwrap_or(default.most_missing),
            widest_gap: runs.run_gap.unwrap_or(default.widest_gap),
        };
        plan.threads = self.running.threads();
        plan.quiet = self.running.quiet;
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
        let inputs: Vec<&PathBuf> = self.calls.iter().chain([&self.samples]).collect();
        for output in self.output.iter().chain(&self.write_sheet) {
            if output != Path::new("-") && inputs.contains(&output) {
                return Err(refusal(format!(
                    "{} is both read and written: give the output another name",
                    output.display()
                )));
            }
        }
        if self.output.is_some() && self.output == self.write_sheet {
            return Err(refusal(
                "-o and --write-sheet name one file: give two names".to_owned(),
            ));
        }
        Ok(())
    }
}

fn refusal(text: String) -> clap::Error {
    let mut command = super::Flags::command();
    command.build();
    match command.find_subcommand_mut("screen") {
        Some(screen) => screen.error(ErrorKind::ArgumentConflict, text),
        None => command.error(ErrorKind::ArgumentConflict, text),
    }
}
