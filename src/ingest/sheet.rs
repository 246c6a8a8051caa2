//! The sample sheet: who was sampled where and when.
//!
//! A table with a header row, delimited by tabs, commas or semicolons, in UTF-8:
//!
//! | column | |
//! |---|---|
//! | `sample` | name as in the calls; required |
//! | `population` | required; holds no `@`, which joins population and visit |
//! | `year` | calendar year, may be fractional; required unless there is a `date` |
//! | `date` | day as 2019-05-03; fills a blank `year` with its calendar year, and without a `year` column becomes a fractional year |
//! | `visit` | label that pools years; the year where blank |
//! | `sex` | F, M, female, male; blank, U or unknown when not known |
//! | `generation` | number, 0 for founders |
//! | `replicate_of` | name of the sample of which this is a second genotyping |
//! | `batch` | genotyping batch |
//! | `use` | yes or no; rows with no are left out and counted, blank is yes |
//!
//! Further columns are ignored. `NA` counts as blank in optional columns.
#![expect(
    clippy::indexing_slicing,
    reason = "columns are those of the header, and rows have as many"
)]

pub mod annotate;
mod columns;
mod fields;
pub(super) mod table;

use std::collections::HashMap;
use std::path::{Path, PathBuf};

use sha2::{Digest, Sha256};

use crate::error::{Error, Result};
use crate::model::{Note, Problem, SheetRow, hexadecimal, nearest};
use columns::Columns;
use table::Record;

/// More years between the first and the last sample than this are noted: one may be mistyped.
const UNUSUAL_SPAN_YEARS: f64 = 500.0;

/// A sample sheet without problems.
#[derive(Debug, Clone, PartialEq)]
pub struct Sheet {
    /// The file as the user named it.
    pub path: PathBuf,
    /// Its rows in the order of the file.
    pub rows: Vec<SheetRow>,
    /// What a person should know of it.
    pub notes: Vec<Note>,
    /// SHA-256 of the bytes of the file, in lower-case hexadecimal.
    pub digest: String,
    /// Size of the file in bytes.
    pub bytes: u64,
}

/// Reads and checks a sample sheet.
///
/// # Errors
/// [`Error::Io`] when the file cannot be read, [`Error::Sheet`] with every problem found, in the
/// order of the file.
pub fn read_sheet(path: &Path) -> Result<Sheet> {
    let bytes = std::fs::read(path).map_err(|e| Error::io(path, "read", e))?;
    let (rows, notes) = parse_sheet(&bytes).map_err(|problems| Error::Sheet {
        path: path.to_path_buf(),
        problems,
    })?;
    let digest = hexadecimal(&Sha256::digest(&bytes));
    Ok(Sheet {
        path: path.to_path_buf(),
        rows,
        notes,
        digest,
        bytes: bytes.len() as u64,
    })
}

/// Row and name of every sample that a sheet lists and that is no replicate, whatever else is wrong
/// with the sheet; none when it cannot be read as a table at all.
pub fn listed_samples(path: &Path) -> Vec<(u64, String)> {
    let Some(table) = std::fs::read(path).ok().and_then(|b| table::split(&b).ok()) else {
        return Vec::new();
    };
    let (mut unused, mut notes) = (Vec::new(), Vec::new());
    let columns = Columns::of(&table.header, &mut unused, &mut notes);
    read_rows(&table, &columns, &mut unused)
        .into_iter()
        .filter(|draft| draft.used && draft.replicate_of.is_none())
        .map(|draft| (draft.row, draft.sample))
        .collect()
}

/// The rows and notes of a sheet given as bytes, or every problem in the order of the file.
pub fn parse_sheet(bytes: &[u8]) -> std::result::Result<(Vec<SheetRow>, Vec<Note>), Vec<Problem>> {
    let table = table::split(bytes)?;
    let (mut problems, mut notes) = (Vec::new(), Vec::new());
    let columns = Columns::of(&table.header, &mut problems, &mut notes);
    if table.records.is_empty() {
        problems.push(Problem::of_all(
            "there is a header row but no sample below it",
            "write one row for each sample",
        ));
    }
    let rows = read_rows(&table, &columns, &mut problems);
    check_together(&rows, &mut problems);
    if !problems.is_empty() {
        problems.sort_by_key(|problem| problem.row);
        return Err(problems);
    }
    let rows: Vec<SheetRow> = rows.into_iter().filter_map(Draft::finish).collect();
    note_oddities(&rows, table.blank_records, &mut notes);
    Ok((rows, notes))
}

fn read_rows(table: &table::Table, columns: &Columns, problems: &mut Vec<Problem>) -> Vec<Draft> {
    let read = |record| {
        RowReader {
            record,
            columns,
            problems,
        }
        .read()
    };
    table.records.iter().filter_map(read).collect()
}

/// A row as far as it could be read. Its checks against other rows need no more than names.
#[derive(Debug, Clone)]
struct Draft {
    row: u64,
    sample: String,
    population: Option<String>,
    time: Option<(f64, String)>,
    visit: Option<String>,
    sex: Option<crate::model::Sex>,
    generation: Option<f64>,
    replicate_of: Option<String>,
    batch: Option<String>,
    used: bool,
}

impl Draft {
    fn finish(self) -> Option<SheetRow> {
        let (year, label) = self.time?;
        Some(SheetRow {
            row: self.row,
            sample: self.sample,
            population: self.population?,
            year,
            visit: self.visit.unwrap_or(label),
            sex: self.sex,
            generation: self.generation,
            replicate_of: self.replicate_of,
            batch: self.batch,
            used: self.used,
        })
    }
}

/// Reads one record; every problem of it is kept.
struct RowReader<'a> {
    record: &'a Record,
    columns: &'a Columns,
    problems: &'a mut Vec<Problem>,
}

impl RowReader<'_> {
    /// The row, or `None` when it has no sample name or not the columns of the header.
    fn read(&mut self) -> Option<Draft> {
        let (found, width) = (self.record.fields.len(), self.columns.width);
        let surplus_is_blank = self
            .record
            .fields
            .iter()
            .skip(width)
            .all(|field| field.trim_ascii().is_empty());
        if found < width || !surplus_is_blank {
            self.complain(
                format!("the row has {found} columns, the header row has {width}"),
                "quote fields that hold the delimiter, and fill up blank fields at the end",
            );
            return None;
        }
        let columns = *self.columns;
        let sample = self.required(columns.sample, "sample");
        let population = self.required(columns.population, "population");
        if population.as_ref().is_some_and(|name| name.contains('@')) {
            self.complain(
                format!(
                    "population '{}' holds '@'",
                    population.as_deref().unwrap_or_default()
                ),
                "use another mark: '@' joins population and visit in the report",
            );
        }
        let time = self.time();
        let visit = self.optional(columns.visit, "visit");
        let sex = self.optional(columns.sex, "sex");
        let sex = sex
            .and_then(|text| self.accept(fields::sex(&text)))
            .flatten();
        let generation = self.optional(columns.generation, "generation");
        let generation = generation.and_then(|text| self.accept(fields::generation(&text)));
        let replicate_of = self.optional(columns.replicate_of, "replicate_of");
        let batch = self.optional(columns.batch, "batch");
        let used = self.optional(columns.used, "use");
        let used = used.and_then(|text| self.accept(fields::used(&text)));
        Some(Draft {
            row: self.record.row,
            sample: sample?,
            population,
            time,
            visit,
            sex,
            generation,
            replicate_of,
            batch,
            used: used.unwrap_or(true),
        })
    }

    /// The year and the visit label it makes.
    fn time(&mut self) -> Option<(f64, String)> {
        let columns = self.columns;
        if columns.year.is_none() && columns.date.is_none() {
            return None;
        }
        let year_text = self.optional(columns.year, "year");
        let date_text = self.optional(columns.date, "date");
        let day = date_text.and_then(|text| self.accept(fields::date(&text)));
        match year_text {
            Some(text) => {
                let year = self.accept(fields::year(&text))?;
                if let Some(day) = day.filter(|day| f64::from(day.calendar_year) != year.floor()) {
                    self.complain(
                        format!("year {year} and date in {} disagree", day.calendar_year),
                        "correct one of them",
                    );
                }
                Some((year, year.to_string()))
            }
            // Beside whole years a date serves as a whole year too, or differences would be skewed.
            None if columns.year.is_some() && day.is_some() => {
                day.map(|day| (f64::from(day.calendar_year), day.calendar_year.to_string()))
            }
            None => {
                let blank = columns
                    .date
                    .is_none_or(|i| self.record.fields[i].trim_ascii().is_empty());
                if day.is_none() && blank {
                    let name = if columns.year.is_some() {
                        "year"
                    } else {
                        "date"
                    };
                    self.complain(
                        format!("{name} is blank"),
                        "fill it in, or take the row out: a sample without a time cannot be used",
                    );
                }
                day.map(|day| (day.year, day.calendar_year.to_string()))
            }
        }
    }

    /// The trimmed text of a field; `None` when the column is absent, the field blank or unusable.
    fn text(&mut self, column: Option<usize>, name: &str) -> Option<String> {
        let Ok(text) = std::str::from_utf8(self.record.fields.get(column?)?) else {
            self.complain(
                format!("{name} is not UTF-8 text"),
                "save the sheet as 'CSV UTF-8' and write special letters anew",
            );
            return None;
        };
        let text = text.trim();
        if text.chars().any(char::is_control) {
            self.complain(
                format!("{name} {text:?} holds a line end or another control character"),
                "write it on one line; check that every quotation mark is closed",
            );
            return None;
        }
        (!text.is_empty()).then(|| text.to_string())
    }

    /// A field that must not be blank, if its column exists at all.
    fn required(&mut self, column: Option<usize>, name: &str) -> Option<String> {
        let before = self.problems.len();
        let text = self.text(column, name);
        if text.is_none() && column.is_some() && self.problems.len() == before {
            self.complain(
                format!("{name} is blank"),
                "fill it in, or take the row out",
            );
        }
        text
    }

    fn optional(&mut self, column: Option<usize>, name: &str) -> Option<String> {
        self.text(column, name)
            .filter(|text| !text.eq_ignore_ascii_case("na"))
    }

    fn accept<T>(&mut self, value: std::result::Result<T, fields::Complaint>) -> Option<T> {
        match value {
            Ok(value) => Some(value),
            Err((what, cure)) => {
                self.complain(what, cure);
                None
            }
        }
    }

    fn complain(&mut self, what: String, cure: &str) {
        self.problems.push(Problem::at(self.record.row, what, cure));
    }
}

/// What only shows when rows are seen together: samples listed twice, replicates of nothing.
fn check_together(rows: &[Draft], problems: &mut Vec<Problem>) {
    let mut first: HashMap<&str, &Draft> = HashMap::with_capacity(rows.len());
    for row in rows {
        let Some(&earlier) = first.get(row.sample.as_str()) else {
            first.insert(&row.sample, row);
            continue;
        };
        let what = format!(
            "sample '{}' is listed in row {} already",
            row.sample, earlier.row
        );
        let (what, cure) = match (&earlier.population, &row.population) {
            (Some(a), Some(b)) if a != b => (
                format!("{what}, there under population '{a}', here under '{b}'"),
                "keep the right one",
            ),
            _ => (
                what,
                "keep one row; a second genotyping needs its own name and 'replicate_of'",
            ),
        };
        problems.push(Problem::at(row.row, what, cure));
    }
    for row in rows {
        let Some(original) = &row.replicate_of else {
            continue;
        };
        let complaint = match first.get(original.as_str()) {
            _ if *original == row.sample => Some((
                format!("sample '{original}' is a replicate of itself"),
                "name the other sample of the same individual, or leave it blank".to_string(),
            )),
            None => Some((
                format!("replicate_of names '{original}', which the sheet does not list"),
                match nearest(original, rows.iter().map(|r| r.sample.as_str())) {
                    Some(near) => format!("did you mean '{near}'? else list it, or leave it blank"),
                    None => "list that sample, or leave it blank".to_string(),
                },
            )),
            Some(named) if named.replicate_of.is_some() => Some((
                format!("replicate_of names '{original}', which is a replicate itself"),
                "let all replicates name the one sample that is used".to_string(),
            )),
            Some(_) => None,
        };
        problems.extend(complaint.map(|(what, cure)| Problem::at(row.row, what, cure)));
    }
}

fn note_oddities(rows: &[SheetRow], blank_records: u64, notes: &mut Vec<Note>) {
    if blank_records > 0 {
        notes.push(Note::new(
            "blank_rows",
            "sheet",
            format!("{blank_records} blank row(s) skipped."),
        ));
    }
    let years = || rows.iter().map(|row| row.year);
    let (low, high) = (
        years().fold(f64::MAX, f64::min),
        years().fold(f64::MIN, f64::max),
    );
    if high - low > UNUSUAL_SPAN_YEARS {
        notes.push(Note::new(
            "unusual_years",
            "sheet",
            format!("Years run from {low} to {high}: check for a slip of the pen."),
        ));
    }
    let by_name: HashMap<&str, &SheetRow> = rows.iter().map(|r| (r.sample.as_str(), r)).collect();
    for row in rows {
        let original = row
            .replicate_of
            .as_deref()
            .and_then(|name| by_name.get(name));
        if let Some(original) = original.filter(|original| original.population != row.population) {
            notes.push(Note::new(
                "replicate_elsewhere",
                "sheet",
                format!(
                    "Row {}: '{}' is a replicate of '{}', which is listed under another population.",
                    row.row, row.sample, original.sample
                ),
            ));
        }
    }
}

#[cfg(test)]
mod tests;
