//! The header of VCF and BCF: version, contigs, key numbers, sample names.
//!
//! Our own and not that of a library, because the two differ in strictness from what genotypes need:
//! descriptive lines that break the standard (a bad `Number=` of some INFO key, say) do not touch a
//! genotype and are let through with a warning, while a second `#CHROM` column named otherwise, a
//! duplicate sample or a missing `##fileformat` stops the run, and every message has its cure.
#![expect(
    clippy::indexing_slicing,
    reason = "the place was found in the same line"
)]

use std::collections::HashSet;

use super::dictionary::{MetaLine, Numbering};
use super::fault::{Fault, WRITE_AGAIN, quote};
use super::inflate::Packing;
use super::limits::{MAX_HEADER_WARNINGS, MAX_SAMPLES};

/// What a file of calls says before its first record.
#[derive(Debug, Clone)]
pub struct CallsHeader {
    /// Sample names, in column order; distinct, not empty.
    pub samples: Vec<String>,
    /// Contigs of `##contig` lines with their lengths in bases, in file order; may be empty.
    pub contigs: Vec<(String, Option<u64>)>,
    /// Version of the standard, as in `VCFv4.2`: the number after the point.
    pub minor_version: u32,
    /// Whether records are binary (BCF) or text (VCF).
    pub binary: bool,
    /// How the file is compressed.
    pub packing: Packing,
    pub(super) keys: Numbering,
    pub(super) contig_numbers: Numbering,
}

impl CallsHeader {
    /// The number of a contig in binary records.
    pub(super) fn contig_number(&self, name: &str) -> Option<usize> {
        self.contig_numbers
            .number(name)
            .and_then(|n| usize::try_from(n).ok())
    }

    /// The format for messages and reports, as in `VCF 4.2, BGZF`.
    pub fn format(&self) -> String {
        let kind = if self.binary { "BCF of VCF" } else { "VCF" };
        format!("{kind} 4.{}, {}", self.minor_version, self.packing.name())
    }
}

/// The eight columns every file has; FORMAT is the ninth.
const FIXED_COLUMNS: [&[u8]; 8] = [
    b"#CHROM", b"POS", b"ID", b"REF", b"ALT", b"QUAL", b"FILTER", b"INFO",
];
/// Oldest and newest version this was written for.
const KNOWN_VERSIONS: std::ops::RangeInclusive<u32> = 1..=5;
/// Byte order mark of UTF-8, which the standard forbids.
const UTF8_MARK: &[u8] = b"\xef\xbb\xbf";

/// Takes header lines one by one, in order.
pub(super) struct HeaderParser {
    header: CallsHeader,
    lines: u64,
    warnings: Vec<String>,
    unnamed_warnings: u64,
}

impl HeaderParser {
    /// A parser for a text or a binary file.
    pub fn new(binary: bool, packing: Packing) -> Self {
        HeaderParser {
            header: CallsHeader {
                samples: Vec::new(),
                contigs: Vec::new(),
                minor_version: 0,
                binary,
                packing,
                keys: Numbering::of_keys(),
                contig_numbers: Numbering::default(),
            },
            lines: 0,
            warnings: Vec::new(),
            unnamed_warnings: 0,
        }
    }

    /// Takes the next line, without its end; true when it was the last of the header.
    ///
    /// # Errors
    /// The line makes the file unusable; the problem names the line by number.
    pub fn push(&mut self, line: &[u8]) -> Result<bool, Fault> {
        self.lines += 1;
        let found = if self.lines == 1 {
            self.first_line(line).map(|()| false)
        } else if let Some(meta) = line.strip_prefix(b"##") {
            self.meta_line(meta).map(|()| false)
        } else if line.starts_with(b"#CHROM") {
            self.column_line(line).map(|()| true)
        } else {
            Err(Fault::new(
                format!(
                    "{} stands among the ## lines before the #CHROM line",
                    quote(line)
                ),
                "begin every descriptive line with ##, and let the #CHROM line follow them",
            ))
        };
        found.map_err(|fault| Fault {
            problem: format!("line {}: {}", self.lines, fault.problem),
            cure: fault.cure,
        })
    }

    /// The finished header and its warnings.
    pub fn finish(mut self) -> (CallsHeader, Vec<String>) {
        if self.unnamed_warnings > 0 {
            self.warnings.push(format!(
                "{} more header lines like these",
                self.unnamed_warnings
            ));
        }
        (self.header, self.warnings)
    }

    /// Notes something to tell about the line taken last.
    pub fn warn(&mut self, warning: String) {
        if self.warnings.len() < MAX_HEADER_WARNINGS {
            self.warnings
                .push(format!("header line {}: {warning}", self.lines));
        } else {
            self.unnamed_warnings += 1;
        }
    }

    fn first_line(&mut self, line: &[u8]) -> Result<(), Fault> {
        let bare = line.strip_prefix(UTF8_MARK).unwrap_or(line);
        if bare.len() < line.len() {
            self.warn("the file begins with a byte order mark, which VCF forbids".into());
        }
        let Some(version) = bare.strip_prefix(b"##fileformat=") else {
            return Err(Fault::new(
                format!(
                    "the first line must be ##fileformat=VCFv4.x, not {}",
                    quote(bare)
                ),
                "name a VCF or BCF file, or put that line on top if it was lost",
            ));
        };
        let minor = version
            .strip_prefix(b"VCFv4.")
            .filter(|digits| !digits.is_empty() && digits.iter().all(u8::is_ascii_digit))
            .and_then(|digits| std::str::from_utf8(digits).ok()?.parse().ok());
        let Some(minor) = minor else {
            return Err(Fault::new(
                format!(
                    "the version {} is not one of VCFv4.1 to VCFv4.5",
                    quote(version)
                ),
                "convert the file to VCF 4.2 or later",
            ));
        };
        if !KNOWN_VERSIONS.contains(&minor) {
            self.warn(format!(
                "VCFv4.{minor} is read like the nearest of VCFv4.1 to VCFv4.5"
            ));
        }
        self.header.minor_version = minor;
        Ok(())
    }

    fn meta_line(&mut self, line: &[u8]) -> Result<(), Fault> {
        let end = memchr::memchr(b'=', line).unwrap_or(line.len());
        if !matches!(&line[..end], b"contig" | b"INFO" | b"FORMAT" | b"FILTER") {
            return Ok(());
        }
        let meta = MetaLine::parse(line);
        let (Some(meta), true) = (&meta, meta.as_ref().is_some_and(|m| m.id.is_some())) else {
            if self.header.binary {
                return Err(Fault::new(
                    format!(
                        "{} cannot be taken apart, but numbers of records count on it",
                        quote(line)
                    ),
                    WRITE_AGAIN,
                ));
            }
            self.warn(format!("{} cannot be taken apart; ignored", quote(line)));
            return Ok(());
        };
        let id = meta.id.as_deref().unwrap_or_default();
        let index = meta.index.as_deref().filter(|_| self.header.binary);
        if meta.key != "contig" {
            return self.header.keys.add(id, index).map(|_| ());
        }
        if self.header.contig_numbers.add(id, index)? {
            self.header.contigs.push((id.into(), meta.length));
        } else {
            self.warn(format!("contig {} is listed again", quote(id.as_bytes())));
        }
        Ok(())
    }

    fn column_line(&mut self, line: &[u8]) -> Result<(), Fault> {
        let mut columns = line.split(|&byte| byte == b'\t');
        for expected in FIXED_COLUMNS {
            let found = columns.next().unwrap_or_default();
            if found != expected {
                return Err(Fault::new(
                    format!(
                        "the #CHROM line has {} where {} belongs",
                        quote(found),
                        quote(expected)
                    ),
                    "name the columns as the standard does, and part them with tabs",
                ));
            }
        }
        match columns.next() {
            None => return Err(no_samples()),
            Some(b"FORMAT") => {}
            Some(other) => {
                return Err(Fault::new(
                    format!("the ninth column is named {}, not FORMAT", quote(other)),
                    "name the columns as the standard does, and part them with tabs",
                ));
            }
        }
        self.header.samples = sample_names(columns)?;
        Ok(())
    }
}

fn no_samples() -> Fault {
    Fault::new(
        "the file has no sample columns, so it holds no genotypes",
        "name the file with the genotypes of the samples, not a list of sites",
    )
}

fn sample_names<'a>(columns: impl Iterator<Item = &'a [u8]>) -> Result<Vec<String>, Fault> {
    let mut samples = Vec::new();
    let mut known = HashSet::new();
    for (i, column) in columns.enumerate() {
        if i == MAX_SAMPLES {
            return Err(Fault::new(
                format!("the file has more than {MAX_SAMPLES} sample columns"),
                "split the file by samples",
            ));
        }
        if column.is_empty() {
            return Err(Fault::new(
                format!("sample column {} has no name", i + 1),
                "give every sample a name of its own, and end the line after the last one",
            ));
        }
        let name = std::str::from_utf8(column).map_err(|_| {
            Fault::new(
                format!("the sample name {} is not UTF-8", quote(column)),
                "convert the file to UTF-8",
            )
        })?;
        if !known.insert(name) {
            return Err(Fault::new(
                format!("two sample columns are named {}", quote(column)),
                "give every sample a name of its own",
            ));
        }
        samples.push(name.to_string());
    }
    if samples.is_empty() {
        Err(no_samples())
    } else {
        Ok(samples)
    }
}
