//! A report read back from its file.

use std::fs::File;
use std::io::{self, Read};
use std::path::Path;

use serde::Deserialize;

use crate::error::{Error, Result};
use crate::report::wire::{FORMAT, FORMAT_VERSION, Report};

/// What tells a report from other documents, before the rest is looked at.
#[derive(Deserialize)]
struct Stamp {
    format: Option<String>,
    format_version: Option<u32>,
}

/// Reads the report at a path; `-` is standard input.
///
/// # Errors
/// [`Error::Io`] where it cannot be read; [`Error::Document`] where it is not JSON, not a report, or
/// of another version, with line and column.
pub fn read_report(path: &Path) -> Result<Report> {
    let failed = |e| Error::io(path, "read", e);
    let mut text = Vec::new();
    match path == Path::new("-") {
        true => io::stdin().lock().read_to_end(&mut text),
        false => File::open(path).and_then(|mut file| file.read_to_end(&mut text)),
    }
    .map_err(failed)?;
    parse_report(path, &text)
}

/// A report from the bytes of its file; `path` is for messages.
pub fn parse_report(path: &Path, text: &[u8]) -> Result<Report> {
    let refused = |problem: String, cure: &str| Error::Document {
        path: path.to_owned(),
        problem,
        cure: cure.to_owned(),
    };
    let again = "make the report anew with 'genewane measure'";
    let stamp: Stamp = serde_json::from_slice(text).map_err(|e| {
        refused(
            format!("this is no report: {e}"),
            "give the JSON file that 'genewane measure' wrote, whole and unchanged",
        )
    })?;
    match (stamp.format.as_deref(), stamp.format_version) {
        (Some(FORMAT), Some(FORMAT_VERSION)) => {}
        (Some(FORMAT), version) => {
            let version = version.map_or_else(|| "none".to_owned(), |v| v.to_string());
            let problem = format!(
                "format_version: {version}, but this program reads version {FORMAT_VERSION}"
            );
            return Err(refused(
                problem,
                "use the program version that wrote it, or make the report anew",
            ));
        }
        (other, _) => {
            let other = other.map_or_else(|| "none".to_owned(), |name| format!("'{name}'"));
            let problem = format!("format: {other}, but '{FORMAT}' is needed");
            return Err(refused(
                problem,
                "give the JSON file that 'genewane measure' wrote",
            ));
        }
    }
    serde_json::from_slice(text).map_err(|e| refused(format!("a broken report: {e}"), again))
}
