//! Whole records on their way from the reader to a decoder.
#![expect(
    clippy::indexing_slicing,
    reason = "spans are made by the splitter of the same batch"
)]

/// Some records of one file, undecoded, in file order. Refilled by
/// [`crate::ingest::CallsReader::next_batch`]; its buffers are kept.
#[derive(Debug, Default)]
pub struct RecordBatch {
    /// The records and what stands between them.
    pub(super) bytes: Vec<u8>,
    /// Where each record begins and ends in `bytes`. 32 bits reach, see
    /// [`crate::ingest::limits::MAX_RECORD_BYTES`].
    pub(super) spans: Vec<(u32, u32)>,
    /// 1-based number of the first record among all records of the file.
    pub(super) first_record: u64,
}

impl RecordBatch {
    /// Number of records.
    pub fn len(&self) -> usize {
        self.spans.len()
    }

    /// Whether there is no record.
    pub fn is_empty(&self) -> bool {
        self.spans.is_empty()
    }

    /// 1-based number of the first record among all records of the file.
    pub fn first_record(&self) -> u64 {
        self.first_record
    }

    /// Bytes held, decompressed.
    pub fn byte_len(&self) -> usize {
        self.bytes.len()
    }

    pub(super) fn clear(&mut self) {
        self.bytes.clear();
        self.spans.clear();
    }

    pub(super) fn push(&mut self, start: usize, end: usize) {
        self.spans.push((start as u32, end as u32));
    }

    /// The bytes of record `index`: a line without its end, or both blocks of a binary record.
    pub(super) fn record(&self, index: usize) -> &[u8] {
        let (start, end) = self.spans[index];
        &self.bytes[start as usize..end as usize]
    }
}
