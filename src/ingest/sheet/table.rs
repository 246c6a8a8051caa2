//! Bytes of a small delimited table to records with their true line numbers.
#![expect(
    clippy::indexing_slicing,
    reason = "the place was found in the same text"
)]

use crate::model::Problem;

/// Delimiters a sheet may use; of equals in the header row the first wins.
const DELIMITERS: [(u8, &str); 3] = [(b'\t', "tab"), (b',', "comma"), (b';', "semicolon")];

/// One record: its fields as bytes, trimmed of nothing.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(in crate::ingest) struct Record {
    /// 1-based line on which the record starts.
    pub row: u64,
    /// The fields.
    pub fields: Vec<Vec<u8>>,
}

impl Record {
    /// Whether every field is empty or white space.
    pub fn is_blank(&self) -> bool {
        self.fields
            .iter()
            .all(|field| field.trim_ascii().is_empty())
    }
}

/// A table: its header row and the records below, blank ones left out and counted.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(in crate::ingest) struct Table {
    /// The first record that is not blank.
    pub header: Record,
    /// All others that are not blank.
    pub records: Vec<Record>,
    /// Records of nothing but delimiters and white space.
    pub blank_records: u64,
}

/// Splits a table. The delimiter is the one that the header row has most of; a byte order mark, CRLF
/// and lone CR line ends and quoted fields are accepted.
///
/// # Errors
/// What is no table at all (compressed, UTF-16, genotype calls, empty), or a quotation mark that is
/// never closed.
pub(in crate::ingest) fn split(bytes: &[u8]) -> Result<Table, Vec<Problem>> {
    let text = bytes.strip_prefix(b"\xEF\xBB\xBF").unwrap_or(bytes);
    refuse_other_formats(text)?;
    let mut lines = Lines::new(text);
    let mut reader = csv::ReaderBuilder::new()
        .delimiter(delimiter_of(text))
        .has_headers(false)
        .flexible(true)
        .from_reader(text);
    let mut record = csv::ByteRecord::new();
    let (mut records, mut blank_records) = (Vec::new(), 0);
    let mut last_start = 0;
    loop {
        let start = reader.position().byte() as usize;
        match reader.read_byte_record(&mut record) {
            Ok(false) => break,
            Ok(true) => {}
            Err(e) => {
                return Err(vec![Problem::of_all(
                    e.to_string(),
                    "write it as plain CSV",
                )]);
            }
        }
        last_start = lines.first_of_record(start);
        let record = Record {
            row: lines.line,
            fields: record.iter().map(<[u8]>::to_vec).collect(),
        };
        if record.is_blank() {
            blank_records += 1;
        } else {
            records.push(record);
        }
    }
    if records.is_empty() {
        return Err(vec![Problem::of_all(
            "the file is empty",
            "write a header row with sample, population and year, and one row for each sample",
        )]);
    }
    refuse_open_quote(&text[last_start..], &records)?;
    let header = records.remove(0);
    Ok(Table {
        header,
        records,
        blank_records,
    })
}

/// The delimiter most frequent in the first line that is not blank, outside quotes.
fn delimiter_of(text: &[u8]) -> u8 {
    let line = text
        .split(|&b| b == b'\n' || b == b'\r')
        .find(|line| !line.trim_ascii().is_empty())
        .unwrap_or_default();
    let mut best = (0, DELIMITERS[0].0);
    for (delimiter, _) in DELIMITERS {
        let mut quoted = false;
        let count = line
            .iter()
            .filter(|&&b| {
                quoted ^= b == b'"';
                b == delimiter && !quoted
            })
            .count();
        if count > best.0 {
            best = (count, delimiter);
        }
    }
    best.1
}

fn refuse_other_formats(text: &[u8]) -> Result<(), Vec<Problem>> {
    let refusal = if text.starts_with(b"\x1F\x8B") {
        Some((
            "the file is compressed with gzip",
            "decompress it: sheets are small plain text",
        ))
    } else if text.starts_with(b"##fileformat=") || text.starts_with(b"BCF\x02") {
        Some((
            "this is a file of genotype calls, not a sample sheet",
            "give calls as arguments without a flag, and the sheet with --samples",
        ))
    } else if text.starts_with(b"\xFF\xFE") || text.starts_with(b"\xFE\xFF") {
        Some(("the text is encoded as UTF-16", "save it as 'CSV UTF-8'"))
    } else if text.starts_with(b"PK\x03\x04") {
        Some((
            "this is a spreadsheet workbook",
            "save its sheet as 'CSV UTF-8' and give that",
        ))
    } else {
        None
    };
    match refusal {
        Some((what, cure)) => Err(vec![Problem::of_all(what, cure)]),
        None => Ok(()),
    }
}

/// A quotation mark that is never closed swallows every row after it into one field.
fn refuse_open_quote(last_record: &[u8], records: &[Record]) -> Result<(), Vec<Problem>> {
    let spans_lines = last_record
        .trim_ascii()
        .iter()
        .any(|&b| b == b'\n' || b == b'\r');
    let quotes = last_record.iter().filter(|&&b| b == b'"').count();
    match records.last() {
        Some(record) if spans_lines && quotes % 2 == 1 => Err(vec![Problem::at(
            record.row,
            "a quotation mark opens in this row and is never closed",
            "close it, or remove it",
        )]),
        _ => Ok(()),
    }
}

/// Line numbers by byte. The reader's own count is off after blank lines, so it is not used.
struct Lines<'a> {
    text: &'a [u8],
    byte: usize,
    line: u64,
}

impl<'a> Lines<'a> {
    fn new(text: &'a [u8]) -> Self {
        Lines {
            text,
            byte: 0,
            line: 1,
        }
    }

    /// Moves to the first byte at or after `start` that ends no line; returns it.
    fn first_of_record(&mut self, start: usize) -> usize {
        while let Some(&b) = self.text.get(self.byte) {
            let ends_line = match b {
                b'\n' => true,
                b'\r' => self.text.get(self.byte + 1) != Some(&b'\n'),
                _ => false,
            };
            if self.byte >= start && b != b'\n' && b != b'\r' {
                break;
            }
            self.line += u64::from(ends_line);
            self.byte += 1;
        }
        self.byte
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn rows(text: &str) -> Vec<(u64, Vec<String>)> {
        let table = split(text.as_bytes()).unwrap();
        std::iter::once(&table.header)
            .chain(&table.records)
            .map(|r| {
                (
                    r.row,
                    r.fields
                        .iter()
                        .map(|f| String::from_utf8_lossy(f).into())
                        .collect(),
                )
            })
            .collect()
    }

    #[test]
    fn the_delimiter_is_the_one_the_header_has_most_of() {
        assert_eq!(delimiter_of(b"a\tb,c\td\n1,2,3,4,5"), b'\t');
        assert_eq!(delimiter_of(b"\n\na;b;c,d\n"), b';');
        assert_eq!(delimiter_of(b"\"x;y;z\",b\n"), b',');
        assert_eq!(delimiter_of(b"single\n"), b'\t');
    }

    #[test]
    fn line_numbers_survive_blank_lines_crlf_and_quoted_line_ends() {
        let text = "a,b\r\n\r\n1,\"x\r\ny\"\r\n , \r\n2,z\r\n";
        let rows = rows(text);
        let numbers: Vec<u64> = rows.iter().map(|(row, _)| *row).collect();
        assert_eq!(numbers, [1, 3, 6]);
        assert_eq!(rows[1].1, ["1", "x\r\ny"]);
        assert_eq!(split(text.as_bytes()).unwrap().blank_records, 1);
    }

    #[test]
    fn lone_carriage_returns_end_lines_too() {
        let numbers: Vec<u64> = rows("a,b\r1,2\r\r3,4")
            .iter()
            .map(|(row, _)| *row)
            .collect();
        assert_eq!(numbers, [1, 2, 4]);
    }

    #[test]
    fn an_open_quotation_mark_is_told_with_its_row() {
        let problems = split(b"a,b\n1,\"x\n2,y\n3,z\n").unwrap_err();
        assert_eq!(problems[0].row, Some(2));
        // A mark inside a field (inches) is no quotation.
        assert_eq!(rows("a,b\n1,5\" trap\n2,y\n").len(), 3);
    }

    #[test]
    fn other_formats_are_named() {
        let cases: [(&[u8], &str); 5] = [
            (b"\x1F\x8B\x08", "gzip"),
            (b"##fileformat=VCFv4.3\n", "calls"),
            (b"\xFF\xFEs\0", "UTF-16"),
            (b"PK\x03\x04", "workbook"),
            (b" \r\n\n", "empty"),
        ];
        for (bytes, word) in cases {
            let problems = split(bytes).unwrap_err();
            assert!(problems[0].what.contains(word), "{problems:?}");
        }
    }
}
