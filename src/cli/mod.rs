//! Flags to validated plans, one file a command. The only place that knows the flag parser.
//!
//! A command is its flags (a struct with one doc comment a flag, from which help and man page come)
//! and a function that turns what was typed into what is meant. To add one: a file with both, a
//! variant of the flags' enum and of [`Work`], and an arm in the match of [`parse_from`].

mod common;
mod measure;
mod page;
mod rehearse;
mod schema;
mod screen;

use std::ffi::OsString;
use std::path::PathBuf;

use clap::{CommandFactory, Parser, Subcommand};

use crate::model::{MeasurePlan, ScreenPlan};

/// What the program was asked to do.
#[derive(Debug, Clone, PartialEq)]
pub enum Work {
    /// Genotype calls in, report out.
    Measure(Box<MeasurePlan>),
    /// Set a report as a page.
    Page(PagePlan),
    /// Simulate a monitored population.
    Rehearse(RehearsePlan),
    /// Look at the samples themselves.
    Screen(Box<ScreenPlan>),
    /// Print the JSON Schema of what the program writes.
    Schema {
        /// Which document; all of them are listed when absent.
        name: Option<String>,
    },
}

/// A page to make.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct PagePlan {
    /// The report; `-` is standard input.
    pub report: PathBuf,
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
    arg_required_else_help = true,
    subcommand_value_name = "COMMAND",
    max_term_width = 100,
    after_long_help = EXIT_STATUS,
    after_help = "'genewane help COMMAND' explains a command with an example."
)]
struct Flags {
    #[command(subcommand)]
    command: Command,
}

const EXIT_STATUS: &str = "\
Exit status:
  0  done
  1  the work failed: a file that cannot be read, written or trusted
  2  wrong usage, or an input sheet or settings file with problems";

#[derive(Subcommand)]
enum Command {
    Measure(measure::Flags),
    Page(page::Flags),
    Rehearse(rehearse::Flags),
    Screen(screen::Flags),
    Schema(schema::Flags),
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
        Command::Page(flags) => Ok(Work::Page(flags.plan())),
        Command::Rehearse(flags) => Ok(Work::Rehearse(flags.plan())),
        Command::Screen(flags) => Ok(Work::Screen(Box::new(flags.plan()?))),
        Command::Schema(flags) => Ok(Work::Schema { name: flags.name }),
    }
}

/// The whole command line as a value, from which man pages and completions are made.
pub fn command() -> clap::Command {
    Flags::command()
}

#[cfg(test)]
mod tests;
