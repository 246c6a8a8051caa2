//! Records of the calls: text, and blocks of it that are compressed apart and indexed together.

use std::io::{self, Write};

use noodles_bgzf as bgzf;
use noodles_core::Position;
use noodles_csi::binning_index::index::reference_sequence::bin::Chunk;
use noodles_tabix::index::Indexer;

use super::calls::{CallRow, MISSING, phred_likelihoods};
use super::scenario::{Field, Genotyping};
use super::simulation::{Outcome, SimulatedLocus};

/// The empty block that ends a file (the BGZF part of the SAM standard).
pub const END_OF_FILE: [u8; 28] = [
    0x1f, 0x8b, 0x08, 0x04, 0, 0, 0, 0, 0, 0xff, 0x06, 0, 0x42, 0x43, 0x02, 0, 0x1b, 0, 0x03, 0, 0,
    0, 0, 0, 0, 0, 0, 0,
];

/// The records of one unit in blocks of their own, so that units are compressed side by side and
/// their bytes do not depend on how many at a time.
pub struct Part {
    /// Compressed blocks.
    pub blocks: Vec<u8>,
    /// Place of every record.
    pub records: Vec<Record>,
}

/// The place of one record on its contig and in the blocks of its unit.
pub struct Record {
    first_base: usize,
    last_base: usize,
    start: bgzf::VirtualPosition,
    end: bgzf::VirtualPosition,
}

impl Part {
    /// Formats and compresses the records of a unit.
    pub fn new(contig: &str, outcome: &Outcome, genotyping: &Genotyping) -> io::Result<Self> {
        let mut writer = bgzf::io::Writer::new(Vec::new());
        let mut records = Vec::with_capacity(outcome.loci.len());
        let mut text = Vec::new();
        for (locus, row) in outcome.loci.iter().zip(&outcome.rows) {
            text.clear();
            push_record(&mut text, contig, locus, row, genotyping);
            let start = writer.virtual_position();
            writer.write_all(&text)?;
            let first_base = locus.position as usize;
            records.push(Record {
                first_base,
                last_base: first_base + locus.alleles[0].len() - 1,
                start,
                end: writer.virtual_position(),
            });
        }
        Ok(Part {
            blocks: without_end(writer)?,
            records,
        })
    }
}

impl Record {
    /// Adds the record to an index; the blocks of its unit begin at byte `offset` of the file.
    pub fn index(&self, contig: &str, offset: u64, indexer: &mut Indexer) -> io::Result<()> {
        let moved = |place: bgzf::VirtualPosition| {
            let block = (place.compressed() + offset, place.uncompressed());
            bgzf::VirtualPosition::try_from(block).map_err(io::Error::other)
        };
        let base = |n: usize| Position::try_from(n).map_err(io::Error::other);
        let chunk = Chunk::new(moved(self.start)?, moved(self.end)?);
        indexer.add_record(contig, base(self.first_base)?, base(self.last_base)?, chunk)
    }
}

/// Compresses a text to blocks, the end of the file left out.
pub fn compress(text: &[u8]) -> io::Result<Vec<u8>> {
    let mut writer = bgzf::io::Writer::new(Vec::new());
    writer.write_all(text)?;
    without_end(writer)
}

fn without_end(writer: bgzf::io::Writer<Vec<u8>>) -> io::Result<Vec<u8>> {
    let mut blocks = writer.finish()?;
    if blocks.ends_with(&END_OF_FILE) {
        blocks.truncate(blocks.len() - END_OF_FILE.len());
    }
    Ok(blocks)
}

fn push_record(
    text: &mut Vec<u8>,
    contig: &str,
    locus: &SimulatedLocus,
    row: &CallRow,
    genotyping: &Genotyping,
) {
    let (reference, alternates) = (&locus.alleles[0], locus.alleles[1..].join(","));
    text.extend_from_slice(
        format!(
            "{contig}\t{}\t.\t{reference}\t{alternates}\t.\tPASS\t.\tGT",
            locus.position
        )
        .as_bytes(),
    );
    for field in &genotyping.fields {
        text.extend_from_slice(format!(":{field:?}").as_bytes());
    }
    let alleles = locus.alleles.len();
    for (sample, call) in row.calls.iter().enumerate() {
        text.push(b'\t');
        match *call {
            MISSING => text.extend_from_slice(b"./."),
            [a, b] => {
                push_number(text, u32::from(a));
                text.push(b'/');
                push_number(text, u32::from(b));
            }
        }
        if !genotyping.fields.is_empty() {
            let reads = &row.reads[sample * alleles..(sample + 1) * alleles];
            push_fields(text, *call, reads, genotyping);
        }
    }
    text.push(b'\n');
}

fn push_fields(text: &mut Vec<u8>, call: [u8; 2], reads: &[u16], genotyping: &Genotyping) {
    let scores = phred_likelihoods(reads, genotyping.read_error_rate);
    for field in &genotyping.fields {
        text.push(b':');
        match field {
            Field::AD => push_list(text, reads.iter().map(|&n| u32::from(n))),
            Field::DP => push_number(text, reads.iter().map(|&n| u32::from(n)).sum()),
            Field::GQ | Field::PL if call == MISSING => text.push(b'.'),
            Field::GQ => {
                let mut sorted = scores.clone();
                sorted.sort_unstable();
                push_number(text, sorted[1].min(99));
            }
            Field::PL => push_list(text, scores.iter().copied()),
        }
    }
}

fn push_list(text: &mut Vec<u8>, numbers: impl Iterator<Item = u32>) {
    for (i, number) in numbers.enumerate() {
        if i > 0 {
            text.push(b',');
        }
        push_number(text, number);
    }
}

fn push_number(text: &mut Vec<u8>, number: u32) {
    if number < 10 {
        text.push(b'0' + number as u8);
    } else {
        text.extend_from_slice(number.to_string().as_bytes());
    }
}
