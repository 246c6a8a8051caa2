//! From the bytes of a file to batches of whole records.

use std::io::Read;
use std::path::Path;
use std::sync::Arc;

use memchr::memchr;

use super::batch::RecordBatch;
use super::fault::{COPY_AGAIN, Fault, WRITE_AGAIN};
use super::header::{CallsHeader, HeaderParser};
use super::inflate::Inflater;
use super::limits::{BATCH_BYTES, MAX_HEADER_BYTES, MAX_RECORD_BYTES};
use super::order::OrderWatch;
use super::remarks::Remarks;
use super::source::{InputDigest, Source};
use crate::error::{Place, Result};

/// A file of genotype calls, opened and past its header.
pub struct CallsReader {
    inflater: Inflater,
    header: Arc<CallsHeader>,
    warnings: Vec<String>,
    /// Bytes behind the last record handed out.
    carry: Vec<u8>,
    records: u64,
    order: OrderWatch,
    empty_line: bool,
    ended: bool,
}

/// Opens a file of calls, or standard input for `-`, and reads its header.
///
/// # Errors
/// [`crate::Error::Io`] when the system refuses, [`crate::Error::Calls`] when the file is not VCF or BCF or its
/// header cannot be used.
pub fn open(path: &Path) -> Result<CallsReader> {
    CallsReader::new(Source::open(path)?)
}

/// Like [`open`], from any stream; `name` stands for it in messages.
///
/// # Errors
/// As [`open`].
pub fn open_stream(name: &Path, stream: Box<dyn Read + Send>) -> Result<CallsReader> {
    CallsReader::new(Source::new(name, stream))
}

impl CallsReader {
    fn new(source: Source) -> Result<Self> {
        let mut inflater = Inflater::new(source)?;
        let mut carry = Vec::new();
        while carry.len() < BCF_HEAD && inflater.fill(&mut carry)? > 0 {}
        let binary = match find_format(&carry) {
            Ok(binary) => binary,
            Err(fault) => return Err(fault.at(inflater.path(), Place::Header)),
        };
        let mut parser = HeaderParser::new(binary, inflater.packing());
        let used = if binary {
            read_binary_header(&mut inflater, &mut carry, &mut parser)?
        } else {
            read_text_header(&mut inflater, &mut carry, &mut parser)?
        };
        carry.drain(..used);
        let (header, warnings) = parser.finish();
        let header = Arc::new(header);
        Ok(CallsReader {
            inflater,
            header,
            warnings,
            carry,
            records: 0,
            order: OrderWatch::default(),
            empty_line: false,
            ended: false,
        })
    }

    /// What the file says before its first record.
    pub fn header(&self) -> &CallsHeader {
        &self.header
    }

    /// The header, to be shared with decoders.
    pub(super) fn shared_header(&self) -> Arc<CallsHeader> {
        Arc::clone(&self.header)
    }

    /// The file as the user named it.
    pub fn path(&self) -> &Path {
        self.inflater.path()
    }

    /// What is worth telling about the header.
    pub fn warnings(&self) -> &[String] {
        &self.warnings
    }

    /// What was remarked on the order of the records handed out so far.
    pub fn remarks(&self) -> &Remarks {
        self.order.remarks()
    }

    /// Bytes of the file taken so far, as they are on disk: for progress.
    pub fn bytes_read(&self) -> u64 {
        self.inflater.offset()
    }

    /// Records handed out so far.
    pub fn records(&self) -> u64 {
        self.records
    }

    /// Size and SHA-256 of the file as it is on disk; of the whole file once
    /// [`CallsReader::next_batch`] has returned `false`.
    pub fn digest(&self) -> InputDigest {
        self.inflater.digest()
    }

    /// Fills `batch` with the next whole records, about 256 KiB of them and at least one; `false`,
    /// and an empty batch, when the end of the file is reached and was found in order.
    ///
    /// # Errors
    /// The file is cut, damaged, or a record is longer than [`MAX_RECORD_BYTES`].
    pub fn next_batch(&mut self, batch: &mut RecordBatch) -> Result<bool> {
        batch.clear();
        batch.first_record = self.records + 1;
        std::mem::swap(&mut batch.bytes, &mut self.carry);
        let mut split = Split {
            empty_line: self.empty_line,
            ..Split::default()
        };
        loop {
            let found = if self.header.binary {
                split.binary_records(batch)
            } else {
                split.lines(batch)
            };
            if let Err(fault) = found.and_then(|()| split.check_length(batch)) {
                return Err(self.fault_in_next(batch, fault));
            }
            let full = batch.bytes.len() >= BATCH_BYTES && !batch.is_empty();
            if full || self.ended {
                break;
            }
            if self.inflater.fill(&mut batch.bytes)? == 0 {
                self.ended = true;
                if split.empty_line {
                    self.warnings
                        .push("the file ends with an empty line".into());
                }
                if split.start < batch.bytes.len() {
                    self.end_inside_record(batch, &mut split)?;
                }
                break;
            }
        }
        self.empty_line = split.empty_line;
        self.carry.clear();
        self.carry.extend_from_slice(&batch.bytes[split.start..]);
        batch.bytes.truncate(split.start);
        self.watch_order(batch);
        self.records += batch.len() as u64;
        Ok(!batch.is_empty())
    }

    fn watch_order(&mut self, batch: &RecordBatch) {
        for (record, index) in (batch.first_record..).zip(0..batch.len()) {
            if self.header.binary {
                self.order.binary(record, batch.record(index));
            } else {
                self.order.line(record, batch.record(index));
            }
        }
    }

    /// A last line needs no end; a last binary record does.
    fn end_inside_record(&self, batch: &mut RecordBatch, split: &mut Split) -> Result<()> {
        if self.header.binary {
            let fault = Fault::new("the file ends inside this record", COPY_AGAIN);
            return Err(self.fault_in_next(batch, fault));
        }
        let end = batch.bytes.len();
        let found = split.line(batch, end, end);
        found.map_err(|fault| self.fault_in_next(batch, fault))
    }

    fn fault_in_next(&self, batch: &RecordBatch, fault: Fault) -> crate::Error {
        let record = self.records + batch.len() as u64 + 1;
        fault.at(self.inflater.path(), Place::Record(record))
    }
}

/// How far a batch has been split into records.
#[derive(Default)]
struct Split {
    /// Where the next record begins.
    start: usize,
    /// Up to where there is no line end (text).
    searched: usize,
    /// Whether there was an empty line (text).
    empty_line: bool,
}

impl Split {
    fn lines(&mut self, batch: &mut RecordBatch) -> std::result::Result<(), Fault> {
        while let Some(at) = memchr(b'\n', &batch.bytes[self.searched..]) {
            let end = self.searched + at;
            self.line(batch, end, end + 1)?;
        }
        self.searched = batch.bytes.len();
        Ok(())
    }

    /// Adds the line up to `end`, without a carriage return; the next one begins at `next`.
    /// Empty lines are passed over, but then nothing may follow.
    fn line(
        &mut self,
        batch: &mut RecordBatch,
        end: usize,
        next: usize,
    ) -> std::result::Result<(), Fault> {
        let bare = match batch.bytes[self.start..end].last() {
            Some(b'\r') => end - 1,
            _ => end,
        };
        if bare == self.start {
            self.empty_line = true;
        } else if self.empty_line {
            return Err(Fault::new(
                "an empty line stands before this record",
                "take the line out",
            ));
        } else {
            batch.push(self.start, bare);
        }
        self.start = next;
        self.searched = next;
        Ok(())
    }

    fn binary_records(&mut self, batch: &mut RecordBatch) -> std::result::Result<(), Fault> {
        while let Some(sizes) = batch.bytes[self.start..].first_chunk::<8>() {
            let [a, b, c, d, e, f, g, h] = *sizes;
            let shared = u32::from_le_bytes([a, b, c, d]) as usize;
            let genotypes = u32::from_le_bytes([e, f, g, h]) as usize;
            let size = 8 + shared + genotypes;
            if size > MAX_RECORD_BYTES {
                return Err(too_long("the record claims to be", size));
            }
            let end = self.start + size;
            if end > batch.bytes.len() {
                break;
            }
            batch.push(self.start, end);
            self.start = end;
        }
        Ok(())
    }

    fn check_length(&self, batch: &RecordBatch) -> std::result::Result<(), Fault> {
        let size = batch.bytes.len() - self.start;
        if size > MAX_RECORD_BYTES {
            Err(too_long("the record is", size))
        } else {
            Ok(())
        }
    }
}

fn too_long(what: &str, size: usize) -> Fault {
    Fault::new(
        format!("{what} {size} bytes long, and at most {MAX_RECORD_BYTES} are read"),
        "check that the file is VCF or BCF and whole; split it by samples if it really is that wide",
    )
}

/// Bytes before the header text of BCF: magic, version and length.
const BCF_HEAD: usize = 9;

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
