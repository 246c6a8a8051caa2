//! `genewane measure`: the main job.

use std::ffi::OsStr;
use std::path::PathBuf;

use clap::Args;

use super::reading::{Reading, refusal};
use crate::model::MeasurePlan;

/// Measures diversity, its change and effective size from genotype calls
///
/// Reads the calls once and writes one report: for each population at each visit its diversity; for
/// each visit the change since the baseline with the alleles not seen again; between populations
/// their differentiation; and the effective size by several methods. Every estimate has an interval
/// that counts loci and individuals, the number of loci behind it, or the reason why it is absent.
#[derive(Debug, Clone, Args)]
#[command(after_long_help = EXAMPLES, arg_required_else_help = true)]
pub(super) struct Flags {
    #[command(flatten)]
    pub reading: Reading,

    /// Write the report here [default: standard output]
    #[arg(short, long, value_name = "FILE", help_heading = "Output")]
    output: Option<PathBuf>,

    /// Write a table with one row a locus here; the name ends in .tsv, .tsv.gz or .parquet
    #[arg(long, value_name = "FILE", help_heading = "Output")]
    loci: Option<PathBuf>,

    /// Put the time of the run into the report, which then differs from run to run
    #[arg(long, help_heading = "Output")]
    stamp: bool,
}

const EXAMPLES: &str = "\
Examples:
  A report of the demonstration data, generations four years long:
    genewane measure fixtures/demo/calls.vcf.gz --samples fixtures/demo/samples.tsv \\
        --generation-years 4 -o report.json

  Shards by contig from a pipeline, settings for each population in a file:
    genewane measure shards/*.vcf.gz --samples samples.tsv --programme programme.toml \\
        --loci loci.tsv.gz --threads 4 -o report.json

  Tallies that a cluster made of one contig each:
    genewane measure tallies/*.parquet --samples samples.tsv --programme programme.toml -o report.json

  From standard input, held against the visit of 1995:
    zcat calls.vcf.gz | genewane measure - --samples samples.tsv --baseline 1995 > report.json";

/// Endings of the table by locus that can be written.
const LOCI_ENDINGS: [&str; 3] = [".tsv", ".tsv.gz", ".parquet"];

impl Flags {
    /// What was typed, as what is meant.
    pub fn plan(self) -> Result<MeasurePlan, clap::Error> {
        self.check_files()?;
        let mut plan = self.reading.plan();
        plan.output = self.output.filter(|path| path.as_os_str() != "-");
        plan.loci_output = self.loci;
        plan.stamp = self.stamp;
        Ok(plan)
    }

    /// Files that stand in each other's way.
    fn check_files(&self) -> Result<(), clap::Error> {
        self.reading
            .check("measure", self.output.iter().chain(&self.loci))?;
        if let Some(loci) = &self.loci {
            let name = loci.file_name().and_then(OsStr::to_str).unwrap_or_default();
            if !LOCI_ENDINGS.iter().any(|ending| name.ends_with(ending)) {
                return Err(refusal(
                    "measure",
                    format!(
                        "--loci {}: the name must end in .tsv, .tsv.gz or .parquet",
                        loci.display()
                    ),
                ));
            }
            if self.output.as_ref() == Some(loci) {
                return Err(refusal(
                    "measure",
                    format!("-o and --loci both name {}: give two names", loci.display()),
                ));
            }
        }
        Ok(())
    }
}
