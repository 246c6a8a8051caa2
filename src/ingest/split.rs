//! Where one record ends and the next begins.
#![expect(
    clippy::indexing_slicing,
    reason = "places were found in the same batch"
)]

use memchr::memchr;

use super::batch::RecordBatch;
use super::fault::Fault;
use super::limits::MAX_RECORD_BYTES;

/// How far a batch has been split into records.
#[derive(Default)]
pub(super) struct Split {
    /// Where the next record begins.
    pub start: usize,
    /// Up to where there is no line end (text).
    searched: usize,
    /// Whether there was an empty line (text).
    pub empty_line: bool,
}

impl Split {
    /// At the beginning of a batch; `empty_line` is from the batch before.
    pub fn new(empty_line: bool) -> Self {
        Split {
            empty_line,
            ..Split::default()
        }
    }

    /// Adds all lines that have an end.
    pub fn lines(&mut self, batch: &mut RecordBatch) -> std::result::Result<(), Fault> {
        while let Some(at) = memchr(b'\n', &batch.bytes[self.searched..]) {
            let end = self.searched + at;
            self.line(batch, end, end + 1)?;
        }
        self.searched = batch.bytes.len();
        Ok(())
    }

    /// Adds the line up to `end`, without a carriage return; the next one begins at `next`.
    /// Empty lines are passed over, but then nothing may follow.
    pub fn line(
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

    /// Adds all binary records that are there as a whole.
    pub fn binary_records(&mut self, batch: &mut RecordBatch) -> std::result::Result<(), Fault> {
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

    /// Whether the record that is still coming is not too long already.
    pub fn check_length(&self, batch: &RecordBatch) -> std::result::Result<(), Fault> {
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
