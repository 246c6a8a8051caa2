//! Where the loci of a tidy table are.

use std::collections::HashMap;
use std::path::Path;

use super::{cell, columns, not_text, sheet};
use crate::error::{Error, Result};
use crate::ingest::sheet::table;
use crate::model::Problem;

/// Where a locus is: contig and position.
pub(in crate::ingest) type LocusMap = HashMap<String, (String, u64)>;

/// Reads a map of loci: a table with `locus`, `contig` and `position`.
///
/// # Errors
/// [`Error::Io`] and [`Error::Sheet`] with every problem.
pub(in crate::ingest) fn read_locus_map(path: &Path) -> Result<LocusMap> {
    let bytes = std::fs::read(path).map_err(|e| Error::io(path, "read", e))?;
    locus_map(&bytes).map_err(|problems| sheet(path, problems))
}

pub(super) fn locus_map(bytes: &[u8]) -> std::result::Result<LocusMap, Vec<Problem>> {
    let table = table::split(bytes)?;
    let [locus, contig, position] = columns(&table.header, ["locus", "contig", "position"])?;
    let (mut map, mut problems) = (LocusMap::new(), Vec::new());
    for record in &table.records {
        let at = |column| cell(record, column);
        let place = (at(locus), at(contig), at(position));
        let (Ok(name), Ok(contig), Ok(text)) = place else {
            problems.push(not_text(record.row));
            continue;
        };
        match text.parse::<u64>() {
            Ok(position) if position > 0 && !name.is_empty() && !contig.is_empty() => {
                if map
                    .insert(name.to_string(), (contig.to_string(), position))
                    .is_some()
                {
                    problems.push(Problem::at(
                        record.row,
                        format!("locus '{name}' is listed twice"),
                        "keep one row",
                    ));
                }
            }
            _ => problems.push(Problem::at(
                record.row,
                format!("locus '{name}', contig '{contig}', position '{text}' is no place"),
                "write all three; positions are whole numbers from 1 up",
            )),
        }
    }
    match problems.is_empty() {
        true => Ok(map),
        false => Err(problems),
    }
}
