//! `genewane rehearse`: a monitored population with known truth.

use std::path::PathBuf;

use clap::Args;

use super::RehearsePlan;
use super::common::Running;

/// Simulates a monitored population with known truth
///
/// Writes calls, a sample sheet and the truth into a folder: for demonstrations, tests, and to learn
/// before the field season what a sampling design can tell. The same scenario and seed give the
/// same files, byte for byte.
#[derive(Debug, Clone, Args)]
#[command(after_long_help = EXAMPLES, arg_required_else_help = true)]
pub(super) struct Flags {
    /// Scenario file (TOML): populations, their sizes through time, visits and genotyping
    #[arg(value_name = "SCENARIO")]
    scenario: PathBuf,
    /// Folder to write into; made if absent
    #[arg(short, long, value_name = "DIR")]
    output: PathBuf,
    /// Seed of all chance [default: the scenario's]
    #[arg(long, value_name = "N")]
    seed: Option<u64>,
    #[command(flatten)]
    running: Running,
}

const EXAMPLES: &str = "\
Examples:
  The scenario of the demonstration data, then its report:
    genewane rehearse fixtures/demo/scenario.toml -o rehearsal
    genewane measure rehearsal/calls.vcf.gz --samples rehearsal/samples.tsv -o report.json";

impl Flags {
    /// What was typed, as what is meant.
    pub fn plan(self) -> RehearsePlan {
        RehearsePlan {
            scenario: self.scenario,
            output: self.output,
            seed: self.seed,
            threads: self.running.threads(),
            quiet: self.running.quiet,
        }
    }
}
