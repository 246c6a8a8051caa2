//! The per-locus table: one row a record that was kept, columns named by stratum.
//!
//! Text, tab-separated, `NA` where there is no value. Columns: `contig`, `position`, `id`, `alleles`;
//! then for each stratum `typed`, `copies` (by allele, comma-separated), `observed_heterozygosity`,
//! `expected_heterozygosity`, `hardy_weinberg_mid_p`; then for each comparison `fst_hudson`, and for
//! comparisons in time `alleles_not_seen_again`. A column's name is `what:stratum` or
//! `what:from>to`.

use std::fmt::Write as _;
use std::io::{self, Write};
use std::path::Path;

use flate2::Compression;
use flate2::write::GzEncoder;

use super::parquet::{Kind, ParquetTable};
use crate::error::{Error, Result};
use crate::files::WholeFile;
use crate::locus::diversity::{expected_heterozygosity, observed_heterozygosity};
use crate::locus::fstatistics::hudson;
use crate::locus::hardy_weinberg::HardyWeinbergCache;
use crate::merge::LocusView;
use crate::model::{Comparison, ComparisonKind, Locus, Strata};

/// What the rows hold.
#[derive(Debug)]
pub struct LocusTable<'a> {
    strata: &'a Strata,
    comparisons: &'a [Comparison],
}

impl<'a> LocusTable<'a> {
    /// A table of these strata and comparisons.
    pub fn new(strata: &'a Strata, comparisons: &'a [Comparison]) -> Self {
        LocusTable {
            strata,
            comparisons,
        }
    }

    /// The columns: their names and what their cells hold.
    pub fn columns(&self) -> Vec<(String, Kind)> {
        let mut columns = vec![
            ("contig".to_owned(), Kind::Text),
            ("position".to_owned(), Kind::Whole),
            ("id".to_owned(), Kind::Text),
            ("alleles".to_owned(), Kind::Text),
        ];
        for stratum in &self.strata.strata {
            for (what, kind) in [
                ("typed", Kind::Whole),
                ("copies", Kind::Counts),
                ("observed_heterozygosity", Kind::Number),
                ("expected_heterozygosity", Kind::Number),
                ("hardy_weinberg_mid_p", Kind::Number),
            ] {
                columns.push((format!("{what}:{}", plain(stratum.name.as_bytes())), kind));
            }
        }
        for comparison in self.comparisons {
            let name = |s: usize| plain(self.strata.strata[s].name.as_bytes());
            let pair = format!("{}>{}", name(comparison.from), name(comparison.to));
            columns.push((format!("fst_hudson:{pair}"), Kind::Number));
            if in_time(comparison) {
                columns.push((format!("alleles_not_seen_again:{pair}"), Kind::Text));
            }
        }
        columns
    }

    /// Appends the row of one locus.
    pub fn row(&self, locus: &Locus, view: &LocusView, out: &mut Vec<u8>) {
        let mut row = String::new();
        let _ = write!(
            row,
            "{}\t{}\t",
            plain(locus.contig.as_bytes()),
            locus.position
        );
        row.push_str(&if locus.id.is_empty() {
            "NA".into()
        } else {
            plain(locus.id.as_bytes())
        });
        row.push('\t');
        for allele in 0..locus.allele_count() {
            if allele > 0 {
                row.push(',');
            }
            row.push_str(&plain(locus.allele(allele).unwrap_or_default()));
        }
        for counts in view.counts {
            let _ = write!(row, "\t{}\t", counts.typed);
            for (allele, copies) in counts.copies.iter().take(locus.allele_count()).enumerate() {
                let _ = write!(row, "{}{copies}", if allele > 0 { "," } else { "" });
            }
            number(&mut row, observed_heterozygosity(counts));
            number(&mut row, expected_heterozygosity(counts));
            let tested = counts.alleles_seen() == 2;
            let mid_p = tested
                .then(|| HardyWeinbergCache::default().mid_p(counts))
                .flatten();
            number(&mut row, mid_p.map(|t| t.mid_p));
        }
        for comparison in self.comparisons {
            let (from, to) = (&view.counts[comparison.from], &view.counts[comparison.to]);
            let usable = view.usable[comparison.from] && view.usable[comparison.to];
            number(
                &mut row,
                hudson(from, to)
                    .filter(|_| usable)
                    .and_then(|terms| terms.ratio()),
            );
            if in_time(comparison) {
                not_seen_again(&mut row, &from.copies, &to.copies, usable);
            }
        }
        row.push('\n');
        out.extend_from_slice(row.as_bytes());
    }
}

fn in_time(comparison: &Comparison) -> bool {
    comparison.kind != ComparisonKind::BetweenPopulations
}

fn not_seen_again(row: &mut String, from: &[u32], to: &[u32], usable: bool) {
    row.push('\t');
    let gone = from
        .iter()
        .zip(to)
        .enumerate()
        .filter(|(_, (before, after))| **before > 0 && **after == 0);
    let mut first = true;
    for (allele, _) in gone.filter(|_| usable) {
        let _ = write!(row, "{}{allele}", if first { "" } else { "," });
        first = false;
    }
    if first {
        row.push_str(if usable { "-" } else { "NA" });
    }
}

fn number(row: &mut String, value: Option<f64>) {
    match value {
        Some(value) => {
            let _ = write!(row, "\t{value}");
        }
        None => row.push_str("\tNA"),
    }
}

/// Text from an input file as a cell: control characters out, and no first character that a
/// spreadsheet program takes for the start of a formula.
pub(super) fn plain(text: &[u8]) -> String {
    let text: String = String::from_utf8_lossy(text)
        .chars()
        .map(|c| if c.is_control() { ' ' } else { c })
        .collect();
    if text.starts_with(['=', '+', '-', '@']) {
        format!("'{text}")
    } else {
        text
    }
}

/// Where a table goes: text, text compressed by gzip (a name that ends in `.gz`), or Parquet (`.parquet`).
pub enum TableFile {
    /// As text.
    Plain(io::BufWriter<WholeFile>),
    /// Compressed by gzip.
    Gzip(Box<GzEncoder<io::BufWriter<WholeFile>>>),
    /// As Parquet: `NA` is null, `copies` are lists.
    Parquet(Box<ParquetTable>),
}

impl TableFile {
    /// Creates the file (under a temporary name) before any work is done, with its header.
    pub fn create(path: &Path, columns: &[(String, Kind)]) -> Result<Self> {
        let ends = |ending: &str| {
            path.extension()
                .is_some_and(|e| e.eq_ignore_ascii_case(ending))
        };
        if ends("parquet") {
            let table = ParquetTable::create(path, columns)?;
            return Ok(TableFile::Parquet(Box::new(table)));
        }
        let file = io::BufWriter::new(WholeFile::create(path)?);
        let mut file = match ends("gz") {
            true => TableFile::Gzip(Box::new(GzEncoder::new(file, Compression::default()))),
            false => TableFile::Plain(file),
        };
        let names: Vec<&str> = columns.iter().map(|(name, _)| name.as_str()).collect();
        let header = names.join("\t") + "\n";
        file.write_all(header.as_bytes())
            .map_err(|e| Error::io(path, "write", e))?;
        Ok(file)
    }

    /// Puts the complete table under its name.
    pub fn finish(self, path: &Path) -> Result<()> {
        let failed = |e: io::Error| Error::io(path, "write", e);
        let buffered = match self {
            TableFile::Plain(file) => file,
            TableFile::Gzip(encoder) => encoder.finish().map_err(failed)?,
            TableFile::Parquet(table) => return table.finish(path, Vec::new()),
        };
        buffered
            .into_inner()
            .map_err(|e| failed(e.into_error()))?
            .finish()
    }
}

impl Write for TableFile {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        match self {
            TableFile::Plain(file) => file.write(bytes),
            TableFile::Gzip(encoder) => encoder.write(bytes),
            TableFile::Parquet(table) => table.write(bytes),
        }
    }

    fn flush(&mut self) -> io::Result<()> {
        match self {
            TableFile::Plain(file) => file.flush(),
            TableFile::Gzip(encoder) => encoder.flush(),
            TableFile::Parquet(table) => table.flush(),
        }
    }
}
