//! One line of VCF.
#![expect(
    clippy::indexing_slicing,
    reason = "places were found in the same line"
)]

use memchr::memchr;

use super::fault::{Fault, WRITE_AGAIN, quote};
use super::scan::count_columns;

/// Names of the nine columns before the samples.
pub(super) const COLUMNS: [&str; 9] = [
    "CHROM", "POS", "ID", "REF", "ALT", "QUAL", "FILTER", "INFO", "FORMAT",
];

/// The parts of a line that matter.
#[derive(Debug, Clone, Copy)]
pub(super) struct Line<'a> {
    pub contig: &'a [u8],
    pub position: u64,
    pub id: &'a [u8],
    pub reference: &'a [u8],
    /// As written: parted by commas, or `.`.
    pub alternates: &'a [u8],
    /// Names of filters, parted by semicolons.
    pub filter: &'a [u8],
    pub format: &'a [u8],
    /// All sample columns.
    pub samples: &'a [u8],
}

impl<'a> Line<'a> {
    /// Takes a line apart. `samples` is their number in the header, for the message.
    pub fn split(line: &'a [u8], samples: usize) -> Result<Self, Fault> {
        let mut fields: [&[u8]; 9] = [&[]; 9];
        let mut at = 0;
        for (i, field) in fields.iter_mut().enumerate() {
            let Some(length) = memchr(b'\t', &line[at..]) else {
                return Err(wrong_columns(i + 1, samples + COLUMNS.len()));
            };
            if length == 0 {
                return Err(Fault::new(
                    format!("the column {} is empty", COLUMNS[i]),
                    "write a dot where a value is missing",
                ));
            }
            *field = &line[at..at + length];
            at += length + 1;
        }
        let [
            contig,
            position,
            id,
            reference,
            alternates,
            _,
            filter,
            _,
            format,
        ] = fields;
        let position = read_position(position).map_err(|fault| {
            // Columns that are not parted by tabs are the better explanation.
            let (found, expected) = (count_columns(line), samples + COLUMNS.len());
            if found == expected {
                fault
            } else {
                wrong_columns(found, expected)
            }
        })?;
        Ok(Line {
            contig,
            position,
            id,
            reference,
            alternates,
            filter,
            format,
            samples: &line[at..],
        })
    }
}

/// The fault of a line with `found` columns where the header has `expected`.
pub(super) fn wrong_columns(found: usize, expected: usize) -> Fault {
    Fault::new(
        format!("the line has {found} column(s) where the header has {expected}"),
        "if this is the last line the file was cut: copy it again; else mend the line (columns are parted by tabs)",
    )
}

/// A position: digits only, 0 being the telomere.
fn read_position(field: &[u8]) -> Result<u64, Fault> {
    let digits = field.iter().all(u8::is_ascii_digit);
    let number = std::str::from_utf8(field).ok().filter(|_| digits);
    number.and_then(|text| text.parse().ok()).ok_or_else(|| {
        Fault::new(
            format!(
                "POS is {}, which is not a whole number from 0 up",
                quote(field)
            ),
            WRITE_AGAIN,
        )
    })
}

/// What a FORMAT column says about genotypes.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub(super) struct Format {
    /// Which key is GT, from 0.
    pub genotype: Option<usize>,
    /// Number of keys.
    pub keys: usize,
    /// Whether a key is empty or holds a space.
    pub odd: bool,
}

impl Format {
    /// Reads a FORMAT column.
    pub fn parse(format: &[u8]) -> Result<Self, Fault> {
        let mut out = Format::default();
        for key in format.split(|&byte| byte == b':') {
            if key == b"GT" && out.genotype.replace(out.keys).is_some() {
                return Err(Fault::new("FORMAT lists GT twice", WRITE_AGAIN));
            }
            out.odd |= key.is_empty() || key.contains(&b' ');
            out.keys += 1;
        }
        Ok(out)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn positions_are_digits_only() {
        assert_eq!(read_position(b"0"), Ok(0));
        assert_eq!(read_position(b"4000000000"), Ok(4_000_000_000));
        for bad in [
            "",
            ".",
            "-1",
            "+1",
            "1e3",
            "12a",
            "99999999999999999999",
            "\u{0661}",
        ] {
            assert!(read_position(bad.as_bytes()).is_err(), "{bad}");
        }
    }

    #[test]
    fn finds_the_genotype_key() {
        let parse = |text: &str| Format::parse(text.as_bytes());
        assert_eq!(
            parse("GT"),
            Ok(Format {
                genotype: Some(0),
                keys: 1,
                odd: false
            })
        );
        assert_eq!(
            parse("DP:GT:AD"),
            Ok(Format {
                genotype: Some(1),
                keys: 3,
                odd: false
            })
        );
        assert_eq!(
            parse("."),
            Ok(Format {
                genotype: None,
                keys: 1,
                odd: false
            })
        );
        assert_eq!(
            parse("GTX:XGT"),
            Ok(Format {
                genotype: None,
                keys: 2,
                odd: false
            })
        );
        assert!(parse("GT::GL").unwrap().odd);
        assert!(parse("GT:GT").is_err());
    }

    #[test]
    fn says_how_many_columns_there_are() {
        let problem = |line: &str| Line::split(line.as_bytes(), 2).unwrap_err().problem;
        assert_eq!(
            problem("lake\t5\t."),
            "the line has 3 column(s) where the header has 11"
        );
        assert_eq!(
            problem("lake\t5\t.\t\tC\t.\t.\t.\tGT\t0/0"),
            "the column REF is empty"
        );
    }
}
