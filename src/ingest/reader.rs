//! From the bytes of a file to batches of whole records.
#![expect(
    clippy::indexing_slicing,
    reason = "the splitter stays within its batch"
)]

use std::collections::VecDeque;
use std::io::Read;
use std::ops::Range;
use std::path::Path;
use std::sync::Arc;

use super::batch::RecordBatch;
use super::fault::{COPY_AGAIN, Fault};
use super::header::CallsHeader;
use super::inflate::Inflater;
use super::inflate::Packing;
use super::limits::BATCH_BYTES;
use super::order::OrderWatch;
use super::preamble::{NO_LINE_END, read_preamble};
use super::regions::{self, Access};
use super::remarks::Remarks;
use super::source::{InputDigest, Source};
use super::split::Split;
use super::tidy;
use crate::error::{Error, Place, Result};
use crate::model::Regions;

/// Bytes of which the first line tells whether they are a tidy table.
const TIDY_BYTES: usize = 4096;

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
    /// An error that waits for the records before it.
    failure: Option<Error>,
    /// The table from which the records were made, if any.
    tidy: Option<InputDigest>,
    /// What the run is about, where it is not everything.
    regions: Option<Arc<Regions>>,
    /// Stretches of the file that are still to be read, where an index says which.
    chunks: Option<VecDeque<Range<u64>>>,
}

/// Opens a file of calls, or standard input for `-`, and reads its header.
///
/// # Errors
/// [`crate::Error::Io`] when the system refuses, [`crate::Error::Calls`] when the file is not VCF or BCF or its
/// header cannot be used.
pub fn open(path: &Path) -> Result<CallsReader> {
    open_with_map(path, None)
}

/// Like [`open`], with the file that says where the loci of a tidy table are.
///
/// # Errors
/// As [`open`]; [`crate::Error::Sheet`] for problems of a tidy table or its map, and
/// [`crate::Error::Usage`] for a map beside calls that say themselves where their loci are.
pub fn open_with_map(path: &Path, locus_map: Option<&Path>) -> Result<CallsReader> {
    let mut source = Source::open(path)?;
    if !tidy::looks_tidy(source.peek(TIDY_BYTES)?) {
        return match locus_map {
            None => CallsReader::new(source),
            Some(map) => Err(Error::Usage(format!(
                "{} is no tidy genotype table, so the map of loci {} has no use: leave it out",
                path.display(),
                map.display()
            ))),
        };
    }
    let mut bytes = Vec::new();
    loop {
        let more = source.peek(1)?;
        if more.is_empty() {
            break;
        }
        bytes.extend_from_slice(more);
        let taken = more.len();
        source.consume(taken);
    }
    let map = locus_map.map(tidy::read_locus_map).transpose()?;
    let text = tidy::as_calls(path, &bytes, map.as_ref())?;
    let mut reader = open_stream(path, Box::new(std::io::Cursor::new(text)))?;
    reader.tidy = Some(source.digest());
    Ok(reader)
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
        let preamble = read_preamble(&mut inflater)?;
        Ok(CallsReader {
            inflater,
            header: Arc::new(preamble.header),
            warnings: preamble.warnings,
            carry: preamble.rest,
            records: 0,
            order: OrderWatch::default(),
            empty_line: false,
            ended: false,
            failure: None,
            tidy: None,
            regions: None,
            chunks: None,
        })
    }

    /// From now on only records in these regions count; where a BGZF file has an index, only their
    /// blocks are read. To be called before the first batch is read.
    ///
    /// # Errors
    /// An index that cannot be read, a file that has lost its end, a contig that the header does not know.
    pub fn restrict(&mut self, regions: Arc<Regions>) -> Result<()> {
        let from_a_file = self.path() != Path::new("-") && self.path().is_file();
        if self.inflater.packing() == Packing::Bgzf && from_a_file {
            match regions::access(self.path(), &self.header, &regions)? {
                Access::Whole(why) => self.warnings.push(why),
                Access::Chunks(chunks) => {
                    self.carry.clear();
                    self.chunks = Some(chunks.into());
                }
            }
        }
        self.regions = Some(regions);
        Ok(())
    }

    /// What the run is about, where it is not everything.
    pub(super) fn regions(&self) -> Option<Arc<Regions>> {
        self.regions.clone()
    }

    /// What the file says before its first record.
    pub fn header(&self) -> &CallsHeader {
        &self.header
    }

    /// The header, to be shared with decoders.
    pub(super) fn shared_header(&self) -> Arc<CallsHeader> {
        Arc::clone(&self.header)
    }

    /// The format for messages and reports, as in `VCF 4.2, BGZF`.
    pub fn format(&self) -> String {
        match self.tidy {
            Some(_) => "tidy genotype table".to_owned(),
            None => self.header.format(),
        }
    }

    /// Whether the records were made from a tidy table, whose names need not be those of VCF.
    pub(super) fn is_tidy(&self) -> bool {
        self.tidy.is_some()
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
        self.tidy.clone().unwrap_or_else(|| self.inflater.digest())
    }

    /// Fills `batch` with the next whole records, about 256 KiB of them and at least one; `false`,
    /// and an empty batch, when the end of the file is reached and was found in order.
    ///
    /// Whole records before a damaged place come first, and the error with the call after them, so
    /// that the earliest of several faults is the one a run ends with. After an error there is nothing
    /// more to read.
    ///
    /// # Errors
    /// The file is cut, damaged, or a record is longer than [`super::limits::MAX_RECORD_BYTES`].
    pub fn next_batch(&mut self, batch: &mut RecordBatch) -> Result<bool> {
        batch.clear();
        batch.first_record = self.records + 1;
        if let Some(failure) = self.failure.take() {
            return Err(failure);
        }
        std::mem::swap(&mut batch.bytes, &mut self.carry);
        let mut split = Split::new(self.empty_line);
        let filled = self.fill(batch, &mut split);
        self.empty_line = split.empty_line;
        self.carry.clear();
        if let Err(failure) = filled {
            self.ended = true;
            if batch.is_empty() {
                return Err(failure);
            }
            self.failure = Some(failure);
        } else {
            self.carry.extend_from_slice(&batch.bytes[split.start..]);
        }
        batch.bytes.truncate(split.start);
        self.watch_order(batch);
        self.records += batch.len() as u64;
        Ok(!batch.is_empty())
    }

    /// Decompresses and splits until the batch is full or the file ends.
    fn fill(&mut self, batch: &mut RecordBatch, split: &mut Split) -> Result<()> {
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
                return Ok(());
            }
            if self.chunks.is_some() && self.inflater.limit_is_unset() {
                // Nothing of the header's blocks belongs to a region that was asked for.
            } else if self.inflater.fill(&mut batch.bytes)? > 0 {
                continue;
            }
            if !self.next_chunk(batch, split)? {
                self.ended = true;
                return self.end(batch, split);
            }
        }
    }

    /// Goes to the next stretch that the index names; false when there is none.
    fn next_chunk(&mut self, batch: &mut RecordBatch, split: &Split) -> Result<bool> {
        let Some(chunk) = self.chunks.as_mut().and_then(VecDeque::pop_front) else {
            return Ok(false);
        };
        if split.start < batch.bytes.len() {
            let fault = Fault::new(
                "the index ends a stretch inside of this record, so it is not of these calls",
                "make the index again, or remove it",
            );
            return Err(self.fault_in_next(batch, fault));
        }
        self.inflater.go_to(&chunk, &mut batch.bytes)?;
        Ok(true)
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

    /// Looks at what is left at the end of the file: a last line needs no end, a binary record does.
    fn end(&mut self, batch: &mut RecordBatch, split: &mut Split) -> Result<()> {
        let end = batch.bytes.len();
        if split.start < end && self.header.binary {
            let fault = Fault::new("the file ends inside this record", COPY_AGAIN);
            return Err(self.fault_in_next(batch, fault));
        }
        if split.start < end {
            self.warnings.push(NO_LINE_END.into());
            let found = split.line(batch, end, end);
            found.map_err(|fault| self.fault_in_next(batch, fault))?;
        }
        if split.empty_line {
            self.warnings
                .push("the file ends with an empty line".into());
        }
        Ok(())
    }

    fn fault_in_next(&self, batch: &RecordBatch, fault: Fault) -> Error {
        let record = self.records + batch.len() as u64 + 1;
        fault.at(self.inflater.path(), Place::Record(record))
    }
}
