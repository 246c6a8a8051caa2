//! The files of calls behind a report: opened, matched with the sheet, and what is told of them.

use std::collections::HashSet;
use std::sync::Arc;

use crate::error::{Error, Result};
use crate::ingest::sheet::{Sheet, listed_samples};
use crate::ingest::{self, Remarks, Selection};
use crate::model::{Matched, MeasurePlan, Note, match_samples, told_absent};
use crate::report::warnings::warning;
use crate::report::wire::{InputFile, Warning};
use crate::run::input_file;
use crate::run::pipeline::Source;

/// A file of calls, for provenance; it must have been read.
pub fn calls_file(source: &Source) -> InputFile {
    let digest = source.reader.digest();
    let format = source.reader.format();
    input_file(
        "calls",
        source.reader.path(),
        &format,
        digest.bytes,
        digest.sha256,
    )
}

/// What the reader has to say of a file that was read.
pub fn remarks_of(source: &Source, of_records: &Remarks) -> Vec<String> {
    let mut remarks = of_records.clone();
    remarks.merge(source.reader.remarks());
    let told = source.reader.warnings().iter().cloned();
    told.chain(remarks.messages()).collect()
}

/// The same as warnings of the report.
pub fn told_of_calls(source: &Source, remarks: &Remarks, file: &str) -> Vec<Warning> {
    let told = remarks_of(source, remarks).into_iter();
    told.map(|text| warning(&Note::new("calls", file.to_owned(), text)))
        .collect()
}

/// A faulty sheet's problems together with the samples that the calls lack, so that a person mends
/// all of them in one go. The first file of calls speaks for all; where it cannot be read, the
/// sheet's own problems are told alone.
pub fn told_with_calls(error: Error, plan: &MeasurePlan) -> Error {
    let Error::Sheet { path, mut problems } = error else {
        return error;
    };
    let reader = plan
        .calls
        .first()
        .and_then(|calls| ingest::open_with_map(calls, plan.locus_map.as_deref()).ok());
    if let Some(reader) = reader.filter(|_| !plan.allow_absent) {
        let header = &reader.header().samples;
        let in_calls: HashSet<&str> = header.iter().map(String::as_str).collect();
        let listed = listed_samples(&path);
        let names = || listed.iter().map(|(row, sample)| (*row, sample.as_str()));
        let absent = names().filter(|(_, name)| !in_calls.contains(name));
        problems.extend(told_absent(absent, header, names().map(|(_, name)| name)));
        problems.sort_by_key(|problem| problem.row);
    }
    Error::Sheet { path, problems }
}

/// Opens every file of calls and matches it with the sheet; all must hold the same samples in use.
pub fn open_calls(plan: &MeasurePlan, sheet: &Sheet) -> Result<(Vec<Source>, Matched)> {
    let mut sources = Vec::new();
    let mut first: Option<Matched> = None;
    let regions = ingest::regions_of(&plan.masks)?.map(Arc::new);
    for path in &plan.calls {
        let mut reader = ingest::open_with_map(path, plan.locus_map.as_deref())?;
        if let Some(regions) = &regions {
            reader.restrict(Arc::clone(regions))?;
        }
        let matched = match_samples(&reader.header().samples, &sheet.rows, plan.allow_absent)
            .map_err(|problems| Error::Sheet {
                path: plan.sheet.clone(),
                problems,
            })?;
        let selection = Selection {
            slot_of_column: matched.slot_of_column.clone(),
            slots: matched.strata.individuals.len(),
        };
        if let Some(first) = &first {
            if first.strata != matched.strata {
                return Err(Error::Calls {
                    path: path.clone(),
                    place: crate::error::Place::Header,
                    problem: format!(
                        "its samples are not those of {}: absent there {}, here {}",
                        plan.calls[0].display(),
                        first.absent.len(),
                        matched.absent.len()
                    ),
                    cure: "give files that hold the same individuals, one a part of the genome"
                        .to_owned(),
                });
            }
        } else {
            first = Some(matched);
        }
        sources.push(Source { reader, selection });
    }
    match first {
        Some(matched) => Ok((sources, matched)),
        None => Err(Error::Usage(
            "no file of genotype calls was given".to_owned(),
        )),
    }
}
