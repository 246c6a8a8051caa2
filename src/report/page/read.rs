//! A report, and what was made from it, read back from their files.
#![cfg_attr(not(test), deny(clippy::indexing_slicing))]

use std::fs::File;
use std::io::{self, Read};
use std::path::Path;

use serde::Deserialize;

use crate::error::{Error, Result};
use crate::report::forecast::{FORECAST_FORMAT, FORECAST_VERSION, Forecast};
use crate::report::verdict::{VERDICT_FORMAT, VERDICT_VERSION, Verdict};
use crate::report::wire::{FORMAT, FORMAT_VERSION, Report};

/// Bytes that every Parquet file begins with.
const PARQUET: &[u8] = b"PAR1";

/// What tells one document from another, before the rest is looked at.
#[derive(Deserialize)]
struct Stamp {
    format: Option<String>,
    format_version: Option<u32>,
}

/// Documents of this program that stand beside a report on its page.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Companions {
    /// Forecasts from the report.
    pub forecasts: Vec<Forecast>,
    /// Verdicts on the report.
    pub verdicts: Vec<Verdict>,
}

/// The bytes of a document; `-` is standard input.
///
/// # Errors
/// [`Error::Io`] where it cannot be read.
pub fn read_document(path: &Path) -> Result<Vec<u8>> {
    let mut text = Vec::new();
    match path == Path::new("-") {
        true => io::stdin().lock().read_to_end(&mut text),
        false => File::open(path).and_then(|mut file| file.read_to_end(&mut text)),
    }
    .map_err(|e| Error::io(path, "read", e))?;
    Ok(text)
}

/// A report from the bytes of its file; `path` is for messages.
///
/// # Errors
/// [`Error::Document`] where it is not JSON, not a report, or of another version, with line and column.
pub fn parse_report(path: &Path, text: &[u8]) -> Result<Report> {
    let cure = "give the JSON file that 'genewane measure' wrote";
    if text.starts_with(PARQUET) {
        let cure = "make a report of the tallies with 'genewane measure' first";
        return Err(refused(path, "this is a tally, no report".to_owned(), cure));
    }
    let stamp = stamp(path, text, "this is no report", cure)?;
    match stamp.format.as_deref() {
        Some(FORMAT) => {}
        other => {
            let problem = format!("format: {}, but '{FORMAT}' is needed", named(other));
            return Err(refused(path, problem, cure));
        }
    }
    of_version(path, &stamp, FORMAT_VERSION)?;
    let again = "make the report anew with 'genewane measure'";
    serde_json::from_slice(text).map_err(|e| refused(path, format!("a broken report: {e}"), again))
}

impl Companions {
    /// Takes in a forecast or a verdict from the bytes of its file. `report_sha256` is the digest of
    /// the report's file: a document from another report is refused, so that no page mixes two.
    ///
    /// # Errors
    /// [`Error::Document`] where it is neither, of another version, broken, or from another report.
    pub fn take(&mut self, path: &Path, text: &[u8], report_sha256: &str) -> Result<()> {
        let cure = "give what 'genewane forecast' or 'genewane verdict' wrote with this report";
        let stamp = stamp(path, text, "this is no forecast and no verdict", cure)?;
        let broken = |e| refused(path, format!("a broken document: {e}"), cure);
        let inputs = match stamp.format.as_deref() {
            Some(FORECAST_FORMAT) => {
                of_version(path, &stamp, FORECAST_VERSION)?;
                let forecast: Forecast = serde_json::from_slice(text).map_err(broken)?;
                self.forecasts.push(forecast);
                self.forecasts.last().map(|f| &f.provenance.inputs)
            }
            Some(VERDICT_FORMAT) => {
                of_version(path, &stamp, VERDICT_VERSION)?;
                let verdict: Verdict = serde_json::from_slice(text).map_err(broken)?;
                self.verdicts.push(verdict);
                self.verdicts.last().map(|v| &v.provenance.inputs)
            }
            other => {
                let problem = format!(
                    "format: {}, but '{FORECAST_FORMAT}' or '{VERDICT_FORMAT}' is needed",
                    named(other)
                );
                return Err(refused(path, problem, cure));
            }
        };
        let mut inputs = inputs.into_iter().flatten();
        match inputs.find(|input| input.role == "report") {
            Some(from) if from.sha256 == report_sha256 => Ok(()),
            from => {
                let from = from.map_or("none", |from| from.name.as_str());
                let problem = format!(
                    "it was made from another report ('{from}'): its digest differs from that of the \
                     report of this page"
                );
                let cure = "make it anew from the report of this page, or give the report it was made from";
                Err(refused(path, problem, cure))
            }
        }
    }
}

fn refused(path: &Path, problem: String, cure: &str) -> Error {
    Error::Document {
        path: path.to_owned(),
        problem,
        cure: cure.to_owned(),
    }
}

fn named(format: Option<&str>) -> String {
    format.map_or_else(|| "none".to_owned(), |name| format!("'{name}'"))
}

fn stamp(path: &Path, text: &[u8], otherwise: &str, cure: &str) -> Result<Stamp> {
    serde_json::from_slice(text).map_err(|e| {
        let cure = format!("{cure}, whole and unchanged");
        refused(path, format!("{otherwise}: {e}"), &cure)
    })
}

fn of_version(path: &Path, stamp: &Stamp, version: u32) -> Result<()> {
    if stamp.format_version == Some(version) {
        return Ok(());
    }
    let told = stamp
        .format_version
        .map_or_else(|| "none".to_owned(), |v| v.to_string());
    Err(refused(
        path,
        format!("format_version: {told}, but this program reads version {version}"),
        "use the program version that wrote it, or make it anew",
    ))
}

#[cfg(test)]
mod tests {
    use super::super::sample::two_populations;
    use super::*;

    fn problem(text: &str) -> String {
        match parse_report(Path::new("r.json"), text.as_bytes()) {
            Err(error @ Error::Document { .. }) => error.to_string(),
            other => panic!("{other:?}"),
        }
    }

    #[test]
    fn a_report_reads_back_as_it_was() {
        let report = two_populations();
        let text = serde_json::to_vec(&report).unwrap();
        assert_eq!(parse_report(Path::new("r.json"), &text).unwrap(), report);
    }

    #[test]
    fn what_is_no_report_is_told_with_its_place_and_cure() {
        let text = serde_json::to_string(&two_populations()).unwrap();
        let of_version = text.replace("\"format_version\":1", "\"format_version\":9");
        assert!(problem(&of_version).contains("format_version: 9"));
        let of_format = text.replace("genewane-report", "genewane-forecast");
        assert!(problem(&of_format).contains("'genewane-forecast'"));
        let with_more = text.replacen("{", "{\"more\":1,", 1);
        assert!(problem(&with_more).contains("unknown field `more`"));
        assert!(problem(&with_more).contains("line 1"));
        assert!(problem(&text[..text.len() / 2]).contains("column"));
        assert!(problem("[]").contains("cure"));
        assert!(problem("").contains("cure"));
        assert!(problem("{}").contains("format: none"));
        assert!(problem("\u{1f9ab}").contains("this is no report"));
    }
}
