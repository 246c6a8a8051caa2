//! Flags to validated plans, one file a command. The only place that knows the flag parser.
//!
//! A command is its flags (a struct with one doc comment a flag, from which help and man page come)
//! and a function that turns what was typed into what is meant. To add one: a file with both, a
//! variant of the flags' enum and of [`Work`], and an arm in the match of [`parse_from`].

mod common;
mod design;
mod forecast;
pub mod help;
mod masks;
mod measure;
mod page;
mod reading;
mod rehearse;
mod schema;
mod screen;
mod tally;
mod verdict;

use std::ffi::OsString;
use std::path::PathBuf;

use clap::{CommandFactory, Parser, Subcommand};

use crate::model::{MeasurePlan, ScreenPlan};

/// What the program was asked to do.
#[derive(Debug, Clone, PartialEq)]
pub enum Work {
    /// Genotype calls in, report out.
    Measure(Box<MeasurePlan>),
    /// Count one shard of the calls into a file.
    Tally(Box<MeasurePlan>),
    /// Set a report as a page.
    Page(PagePlan),
    /// Simulate a monitored population.
    Rehearse(RehearsePlan),
    /// Judge a report against a policy.
    Verdict(VerdictPlan),
    /// Project the diversity of a report's populations.
    Forecast(ForecastPlan),
    /// Tell what a sampling design can see.
    Design(Box<DesignPlan>),
    /// Look at the samples themselves.
    Screen(Box<ScreenPlan>),
    /// Print the JSON Schema of what the program writes.
    Schema {
        /// Which document; all of them are listed when absent.
        name: Option<String>,
    },
    /// Print words: the help of a command, or a topic.
    Words(String),
}

/// A page to make.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct PagePlan {
    /// The report; `-` is standard input.
    pub report: PathBuf,
    /// Forecasts and verdicts made from the report.
    pub documents: Vec<PathBuf>,
    /// Where the page goes; standard output when absent.
    pub output: Option<PathBuf>,
    /// The folder that gets each figure as a file, if any.
    pub figures: Option<PathBuf>,
    /// Whether sample names stay off the page.
    pub without_samples: bool,
}

/// A simulation to run.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct RehearsePlan {
    /// The scenario file.
    pub scenario: PathBuf,
    /// The folder to write into.
    pub output: PathBuf,
    /// Seed that wins over the scenario's.
    pub seed: Option<u64>,
    /// Threads; all cores when absent.
    pub threads: Option<usize>,
    /// Whether progress stays off standard error.
    pub quiet: bool,
}

/// A report to judge.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct VerdictPlan {
    /// The report; `-` is standard input. Absent when the built-in policy is to be printed.
    pub report: Option<PathBuf>,
    /// The policy file; the built-in policy when absent.
    pub policy: Option<PathBuf>,
    /// Whether the share of populations above 500 is added.
    pub indicator: bool,
    /// What "cannot tell" counts as for the exit code.
    pub on_uncertain: OnUncertain,
    /// Where the verdict goes; standard output when absent.
    pub output: Option<PathBuf>,
    /// Whether the table stays off standard error.
    pub quiet: bool,
}

/// A report to project.
#[derive(Debug, Clone, PartialEq)]
pub struct ForecastPlan {
    /// The report; `-` is standard input.
    pub report: PathBuf,
    /// Scenarios beside the status quo.
    pub scenarios: Option<PathBuf>,
    /// Alleles to watch.
    pub watch: Option<PathBuf>,
    /// Tallies that hold the copies of watched alleles.
    pub tallies: Vec<PathBuf>,
    /// Years ahead.
    pub years: Option<f64>,
    /// Generations ahead.
    pub generations: Option<usize>,
    /// Years in a generation; the report's when absent.
    pub generation_years: Option<f64>,
    /// Share of the baseline's heterozygosity to be kept, above 0 and below 1.
    pub keep: f64,
    /// Draws behind each band.
    pub draws: usize,
    /// Seed of all chance.
    pub seed: u64,
    /// Where the forecast goes; standard output when absent.
    pub output: Option<PathBuf>,
    /// Threads; all cores when absent.
    pub threads: Option<usize>,
    /// Whether the table stays off standard error.
    pub quiet: bool,
}

/// Sampling designs to weigh up: every combination of the lists.
#[derive(Debug, Clone, PartialEq)]
pub struct DesignPlan {
    /// Individuals at each visit.
    pub individuals: Vec<u32>,
    /// Loci.
    pub loci: Vec<u32>,
    /// Generations between two visits.
    pub generations: Vec<u32>,
    /// True effective sizes.
    pub effective_sizes: Vec<f64>,
    /// Alleles a locus.
    pub alleles: u32,
    /// Chromosomes.
    pub chromosomes: u32,
    /// Coefficient of variation of 1/Ne to be reached.
    pub cv: f64,
    /// Frequencies of alleles to be seen.
    pub frequencies: Vec<f64>,
    /// Probability with which they are to be seen.
    pub seen: f64,
    /// Power to be reached.
    pub power: f64,
    /// Simulations a design; 0 for none.
    pub simulations: u32,
    /// Effective size below which a decline is to be declared.
    pub size_limit: f64,
    /// Share of richness that must be gone before a loss of richness is declared.
    pub richness_drop: f64,
    /// Effective size of the population whose declared declines are false alarms.
    pub stable_size: f64,
    /// Cost of one sampled individual.
    pub cost_per_sample: Option<f64>,
    /// Cost of one locus.
    pub cost_per_locus: Option<f64>,
    /// Seed of all chance.
    pub seed: u64,
    /// Where the document goes; standard output when absent.
    pub output: Option<PathBuf>,
    /// Threads; all cores when absent.
    pub threads: Option<usize>,
    /// Whether the table stays off standard error.
    pub quiet: bool,
}

/// What "cannot tell" counts as for the exit code of a verdict.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum OnUncertain {
    /// As met.
    Met,
    /// As breached.
    Breached,
    /// As neither.
    Tell,
}

/// Genetic monitoring of wild and captive populations.
///
/// Genotype calls of several visits and a sample sheet come in; diversity with its change since the
/// baseline, effective size, and alleles lost or missed come out, each with an interval. The report
/// is one JSON document: the same bytes for any number of threads.
///
/// Reports go to standard output or to the file after -o; messages go to standard error. Files are
/// written under a temporary name and renamed when whole.
#[derive(Parser)]
#[command(
    name = "genewane",
    version,
    subcommand_required = true,
    disable_help_subcommand = true,
    arg_required_else_help = true,
    subcommand_value_name = "COMMAND",
    max_term_width = 100,
    after_long_help = EXIT_STATUS,
    after_help = "'genewane help' lists commands and topics, 'genewane help COMMAND' explains a command with an example."
)]
struct Flags {
    #[command(subcommand)]
    command: Command,
}

const EXIT_STATUS: &str = "\
Exit status:
  0  done
  1  the work failed: a file that cannot be read, written or trusted
  2  wrong usage, or an input sheet or settings file with problems
  3  a verdict found a breach";

#[derive(Subcommand)]
enum Command {
    Measure(Box<measure::Flags>),
    Tally(Box<tally::Flags>),
    Page(page::Flags),
    Rehearse(rehearse::Flags),
    Verdict(verdict::Flags),
    Forecast(Box<forecast::Flags>),
    Design(Box<design::Flags>),
    Screen(Box<screen::Flags>),
    Schema(schema::Flags),
    Help(help::Flags),
}

/// Reads the arguments, the first of which is the name of the program.
///
/// # Errors
/// Wrong usage, and requests for help or version, as the flag parser's own error: it prints itself
/// to the right stream and knows its exit code (2, or 0 for help and version).
pub fn parse_from<I, T>(args: I) -> Result<Work, clap::Error>
where
    I: IntoIterator<Item = T>,
    T: Into<OsString> + Clone,
{
    let flags = Flags::try_parse_from(args)?;
    match flags.command {
        Command::Measure(flags) => Ok(Work::Measure(Box::new(flags.plan()?))),
        Command::Tally(flags) => Ok(Work::Tally(Box::new(flags.plan()?))),
        Command::Page(flags) => Ok(Work::Page(flags.plan())),
        Command::Rehearse(flags) => Ok(Work::Rehearse(flags.plan())),
        Command::Verdict(flags) => Ok(Work::Verdict(flags.plan()?)),
        Command::Forecast(flags) => Ok(Work::Forecast(flags.plan()?)),
        Command::Design(flags) => Ok(Work::Design(Box::new(flags.plan()))),
        Command::Screen(flags) => Ok(Work::Screen(Box::new(flags.plan()?))),
        Command::Schema(flags) => Ok(Work::Schema { name: flags.name }),
        Command::Help(flags) => flags.plan(),
    }
}

/// The whole command line as a value, from which man pages and completions are made.
pub fn command() -> clap::Command {
    Flags::command()
}

#[cfg(test)]
mod tests;
