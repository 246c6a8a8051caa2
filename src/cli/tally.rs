//! `genewane tally`: one shard of the calls counted into a file.

use std::path::PathBuf;

use clap::Args;

use super::reading::Reading;
use crate::model::MeasurePlan;

/// Counts one shard of the calls into a file that 'measure' adds up with others
///
/// The shards of a genome, by contig as a rule, can be counted on different machines. 'genewane
/// measure' adds their tallies up to the report that the whole calls give: the sums are integers, so
/// the split does not change a digit. A tally is a Parquet file with a row a locus, which other
/// programs read as well; the sums themselves are in its footer. Sheet, programme and options must
/// be those of the report.
#[derive(Debug, Clone, Args)]
#[command(after_long_help = EXAMPLES, arg_required_else_help = true)]
pub(super) struct Flags {
    #[command(flatten)]
    reading: Reading,

    /// Write the tally here: a Parquet file
    #[arg(
        short,
        long,
        value_name = "FILE",
        required = true,
        help_heading = "Output"
    )]
    output: PathBuf,
}

const EXAMPLES: &str = "\
Examples:
  One contig each, then the report:
    genewane tally reed_1.vcf.gz --samples samples.tsv -o reed_1.parquet
    genewane tally reed_2.vcf.gz --samples samples.tsv -o reed_2.parquet
    genewane measure reed_1.parquet reed_2.parquet --samples samples.tsv -o report.json

  One contig of a file that holds all:
    genewane tally calls.vcf.gz --samples samples.tsv --contigs reed_1 -o reed_1.parquet";

impl Flags {
    /// What was typed, as what is meant.
    pub fn plan(self) -> Result<MeasurePlan, clap::Error> {
        self.reading.check("tally", std::iter::once(&self.output))?;
        let mut plan = self.reading.plan();
        plan.output = Some(self.output);
        Ok(plan)
    }
}
