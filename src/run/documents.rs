//! Documents that are read back and build on one another.

use std::collections::BTreeMap;
use std::fs::File;
use std::io::Read;
use std::path::Path;

use sha2::{Digest, Sha256};

use crate::error::{Error, Result};
use crate::model::hexadecimal;
use crate::report::page::{parse_report, read_document};
use crate::report::wire::{InputFile, Provenance, Report};

/// Reads a report and notes it as an input.
pub(super) fn report_of(path: &Path, inputs: &mut Vec<InputFile>) -> Result<Report> {
    let bytes = read_document(path)?;
    let report = parse_report(path, &bytes)?;
    inputs.insert(0, input_file("report", path, "json", &bytes));
    Ok(report)
}

/// What made a document that builds on a report.
pub(super) fn provenance(
    arguments: Vec<String>,
    inputs: Vec<InputFile>,
    settings: BTreeMap<&str, String>,
    methods: &[(&str, &str)],
) -> Provenance {
    let owned = |(name, text): &(&str, &str)| ((*name).to_owned(), (*text).to_owned());
    Provenance {
        program: env!("CARGO_PKG_NAME").to_owned(),
        version: env!("CARGO_PKG_VERSION").to_owned(),
        arguments,
        inputs,
        settings: settings
            .into_iter()
            .map(|(name, value)| (name.to_owned(), value))
            .collect(),
        methods: methods.iter().map(owned).collect(),
        stamp: None,
    }
}

/// An input file with its digest.
pub(super) fn input_file(role: &str, path: &Path, format: &str, bytes: &[u8]) -> InputFile {
    let digest = hexadecimal(&Sha256::digest(bytes));
    super::input_file(role, path, format, bytes.len() as u64, digest)
}

/// An input file with its digest, read piece by piece.
pub(super) fn large_input_file(role: &str, path: &Path, format: &str) -> Result<InputFile> {
    let failed = |e| Error::io(path, "read", e);
    let mut file = File::open(path).map_err(failed)?;
    let (mut digest, mut bytes, mut piece) = (Sha256::new(), 0, vec![0; 1 << 16]);
    loop {
        let n = file.read(&mut piece).map_err(failed)?;
        if n == 0 {
            break;
        }
        digest.update(&piece[..n]);
        bytes += n as u64;
    }
    Ok(super::input_file(
        role,
        path,
        format,
        bytes,
        hexadecimal(&digest.finalize()),
    ))
}
