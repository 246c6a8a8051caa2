//! From the first byte of the decompressed file to its first record.
#![expect(
    clippy::indexing_slicing,
    reason = "places were found in the same text"
)]

use memchr::memchr;

use super::fault::{COPY_AGAIN, Fault, WRITE_AGAIN};
use super::header::{CallsHeader, HeaderParser};
use super::inflate::Inflater;
use super::limits::MAX_HEADER_BYTES;
use crate::error::{Place, Result};

/// What is told when a text ends inside of a line.
pub(super) const NO_LINE_END: &str =
    "the last line has no end: if the file was cut there, its last value is wrong";
/// Bytes before the header text of BCF: magic, version and length.
const BCF_HEAD: usize = 9;

/// What stands before the records.
pub(super) struct Preamble {
    pub header: CallsHeader,
    pub warnings: Vec<String>,
    /// Bytes behind the header that were decompressed with it.
    pub rest: Vec<u8>,
}

/// Reads a file up to its first record.
pub(super) fn read_preamble(inflater: &mut Inflater) -> Result<Preamble> {
    let mut rest = Vec::new();
    while rest.len() < BCF_HEAD && inflater.fill(&mut rest)? > 0 {}
    let binary = find_format(&rest).map_err(|f| f.at(inflater.path(), Place::Header))?;
    let mut parser = HeaderParser::new(binary, inflater.packing());
    let used = if binary {
        read_binary_header(inflater, &mut rest, &mut parser)?
    } else {
        read_text_header(inflater, &mut rest, &mut parser)?
    };
    rest.drain(..used);
    let (header, warnings) = parser.finish();
    Ok(Preamble {
        header,
        warnings,
        rest,
    })
}

/// Whether the file is binary, by its first bytes.
fn find_format(start: &[u8]) -> std::result::Result<bool, Fault> {
    const NOT_OURS: &str = "name a VCF or BCF file";
    match start {
        [] => Err(Fault::new(
            "the file holds nothing",
            "name a file with genotype calls",
        )),
        [b'B', b'C', b'F', 2, ..] => Ok(true),
        [b'B', b'C', b'F', 4, ..] => Err(Fault::new(
            "the file is BCF of version 1",
            "convert it to BCF 2 or VCF",
        )),
        [b'#', ..] | [0xef, 0xbb, 0xbf, ..] => Ok(false),
        [0x1f, 0x8b, ..] => Err(Fault::new(
            "the file is compressed twice",
            "decompress it once and try again",
        )),
        [0xff, 0xfe, ..] | [0xfe, 0xff, ..] => {
            Err(Fault::new("the file is UTF-16 text", "convert it to UTF-8"))
        }
        [b'B', b'A', b'M', 1, ..] => Err(Fault::new("the file is BAM: reads, not calls", NOT_OURS)),
        [b'C', b'R', b'A', b'M', ..] => {
            Err(Fault::new("the file is CRAM: reads, not calls", NOT_OURS))
        }
        _ => Err(Fault::new(
            "the file is neither VCF (it does not begin with ##fileformat) nor BCF",
            NOT_OURS,
        )),
    }
}

fn header_too_long() -> Fault {
    Fault::new(
        format!("the header is longer than the {MAX_HEADER_BYTES} bytes that are read"),
        "check that the file is VCF or BCF; drop ## lines that are not needed",
    )
}

fn header_cut() -> Fault {
    Fault::new("the file ends before the #CHROM line", COPY_AGAIN)
}

/// Reads lines up to #CHROM; returns the bytes they take.
fn read_text_header(
    inflater: &mut Inflater,
    carry: &mut Vec<u8>,
    parser: &mut HeaderParser,
) -> Result<usize> {
    let (mut start, mut searched, mut ended) = (0, 0, false);
    loop {
        let found = match memchr(b'\n', &carry[searched..]) {
            Some(at) => Some((searched + at, searched + at + 1)),
            None if ended && start < carry.len() => Some((carry.len(), carry.len())),
            None if ended => return Err(header_cut().at(inflater.path(), Place::Header)),
            None => None,
        };
        if let Some((end, next)) = found {
            let line = carry[start..end]
                .strip_suffix(b"\r")
                .unwrap_or(&carry[start..end]);
            let last = parser
                .push(line)
                .map_err(|f| f.at(inflater.path(), Place::Header))?;
            (start, searched) = (next, next);
            if last && next == end {
                parser.warn(NO_LINE_END.into());
            }
            if last {
                return Ok(next);
            }
            continue;
        }
        searched = carry.len();
        if searched > MAX_HEADER_BYTES {
            return Err(header_too_long().at(inflater.path(), Place::Header));
        }
        ended = inflater.fill(carry)? == 0;
    }
}

/// Reads the header text of BCF; returns the bytes it takes.
fn read_binary_header(
    inflater: &mut Inflater,
    carry: &mut Vec<u8>,
    parser: &mut HeaderParser,
) -> Result<usize> {
    let size = match carry.first_chunk::<BCF_HEAD>() {
        Some(&[.., a, b, c, d]) => u32::from_le_bytes([a, b, c, d]) as usize,
        None => return Err(header_cut().at(inflater.path(), Place::Header)),
    };
    if size > MAX_HEADER_BYTES {
        return Err(header_too_long().at(inflater.path(), Place::Header));
    }
    let end = BCF_HEAD + size;
    while carry.len() < end {
        if inflater.fill(carry)? == 0 {
            return Err(header_cut().at(inflater.path(), Place::Header));
        }
    }
    let text = &carry[BCF_HEAD..end];
    let text = &text[..memchr(0, text).unwrap_or(text.len())];
    let mut last = false;
    for line in text
        .strip_suffix(b"\n")
        .unwrap_or(text)
        .split(|&byte| byte == b'\n')
    {
        let line = line.strip_suffix(b"\r").unwrap_or(line);
        if last {
            let fault = Fault::new("the header goes on after the #CHROM line", WRITE_AGAIN);
            return Err(fault.at(inflater.path(), Place::Header));
        }
        last = parser
            .push(line)
            .map_err(|f| f.at(inflater.path(), Place::Header))?;
    }
    if last {
        Ok(end)
    } else {
        Err(header_cut().at(inflater.path(), Place::Header))
    }
}
