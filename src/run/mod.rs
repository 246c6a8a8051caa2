//! The story: open, read once, add up, estimate, report. Threads start only here.

mod design;
mod documents;
mod forecast;
mod measure;
mod page;
mod pipeline;
mod progress;
mod screen;
mod signals;
mod tally;
mod verdict;

pub use measure::measure;
pub use screen::screen;

use std::borrow::Cow;
use std::collections::BTreeMap;
use std::path::Path;

use schemars::schema_for;

use crate::cli::{RehearsePlan, Work};
use crate::error::{Error, Result};
use crate::outlook;
use crate::report::summary::{screen_summary, summary};
use crate::report::wire::InputFile;
use crate::report::{self, Output};

/// Does what was asked for. `arguments` are those of the command line, for provenance.
pub fn run(work: Work, arguments: &[std::ffi::OsString]) -> Result<()> {
    signals::watch();
    match work {
        Work::Measure(plan) => {
            let report = measure(&plan, told_arguments(arguments))?;
            if !plan.quiet {
                eprint!("{}", summary(&report));
            }
            Ok(())
        }
        Work::Tally(plan) => {
            let (read, kept) = tally::tally(&plan)?;
            if !plan.quiet {
                eprintln!("{kept} of {read} records tallied");
            }
            Ok(())
        }
        Work::Page(plan) => page::page(&plan),
        Work::Rehearse(plan) => rehearse(&plan),
        Work::Verdict(plan) => verdict::verdict(&plan, told_arguments(arguments)),
        Work::Forecast(plan) => forecast::forecast(&plan, told_arguments(arguments)),
        Work::Design(plan) => design::design(&plan, told_arguments(arguments)),
        Work::Screen(plan) => {
            let report = screen(&plan, told_arguments(arguments))?;
            if !plan.quiet {
                eprint!("{}", screen_summary(&report));
            }
            Ok(())
        }
        Work::Schema { name } => schema(name.as_deref()),
        Work::Words(text) => Output::create(None)?.bytes(text.as_bytes()),
    }
}

/// Simulates a monitored population and tells what was written.
fn rehearse(plan: &RehearsePlan) -> Result<()> {
    let threads = plan.threads.unwrap_or_else(available_threads);
    let done = outlook::rehearse::rehearse(&plan.scenario, &plan.output, plan.seed, threads)?;
    if !plan.quiet {
        eprintln!(
            "{} loci of {} samples in {} strata, seed {}; {} alleles went from a population",
            done.loci, done.samples, done.strata, done.seed, done.alleles_gone
        );
        for file in &done.files {
            eprintln!("  {}", file.display());
        }
    }
    Ok(())
}

/// An input file, for provenance.
fn input_file(role: &str, path: &Path, format: &str, bytes: u64, sha256: String) -> InputFile {
    InputFile {
        role: role.to_owned(),
        name: path.display().to_string(),
        format: format.to_owned(),
        bytes,
        sha256,
    }
}

/// What was masked, by reason.
fn told(masked: &BTreeMap<Cow<'static, str>, u64>) -> impl Iterator<Item = (String, u64)> {
    masked
        .iter()
        .map(|(name, n)| (name.clone().into_owned(), *n))
}

/// The threads used when none are asked for: as many as the machine grants.
fn available_threads() -> usize {
    std::thread::available_parallelism().map_or(1, |n| n.get())
}

/// Makes the schema of one document.
type MakeSchema = fn() -> schemars::Schema;

/// Documents that have a schema, by name.
const SCHEMAS: [(&str, MakeSchema); 8] = [
    ("report", || schema_for!(report::wire::Report)),
    ("verdict", || schema_for!(report::verdict::Verdict)),
    ("forecast", || schema_for!(report::forecast::Forecast)),
    ("design", || schema_for!(report::design::Design)),
    ("screen", || schema_for!(report::screen_wire::ScreenReport)),
    ("tally", || schema_for!(report::tally::TallyHeader)),
    ("scenario", || schema_for!(outlook::rehearse::Scenario)),
    ("truth", || schema_for!(outlook::rehearse::Truth)),
];

/// Prints the JSON Schema of one document, or the names of all.
fn schema(name: Option<&str>) -> Result<()> {
    let out = Output::create(None)?;
    let names = || SCHEMAS.map(|(name, _)| name);
    let Some(name) = name else {
        return out.bytes(format!("{}\n", names().join("\n")).as_bytes());
    };
    match SCHEMAS.iter().find(|(document, _)| *document == name) {
        Some((_, schema)) => out.json(&schema()),
        None => Err(Error::Usage(format!(
            "no document is called '{name}'; there are: {}",
            names().join(", ")
        ))),
    }
}

/// Arguments that shape the result: those that only say where it goes or how it is made are left
/// out, so that the same input gives the same bytes.
fn told_arguments(arguments: &[std::ffi::OsString]) -> Vec<String> {
    const WITH_VALUE: [&str; 5] = ["--threads", "--output", "-o", "--loci", "--write-sheet"];
    let mut told = Vec::new();
    let mut skip = false;
    for argument in arguments.iter().skip(1).map(|a| a.to_string_lossy()) {
        let name = argument.split('=').next().unwrap_or_default();
        if std::mem::take(&mut skip) || name == "--quiet" {
            continue;
        }
        if WITH_VALUE.contains(&name) {
            skip = !argument.contains('=');
        } else {
            told.push(argument.into_owned());
        }
    }
    told
}
