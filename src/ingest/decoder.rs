//! From an undecoded record to a locus and its verdict.
#![expect(
    clippy::indexing_slicing,
    reason = "the scanner counts columns and places of the same row"
)]

mod masks;

use std::path::PathBuf;
use std::sync::Arc;

use super::alleles::{self, is_contig_name};
use super::batch::RecordBatch;
use super::binary::{GenotypeBlock, Site};
use super::call::{AlleleKind, Flaw, Row, Run};
use super::fault::{Fault, WRITE_AGAIN, quote};
use super::header::CallsHeader;
use super::limits::MAX_ALLELES;
use super::reader::CallsReader;
use super::remarks::{Remark, Remarks};
use super::scan::{GenotypeRule, RowFlaw, count_columns, packed_row, scan_row};
use super::text::{self, Format, Line};
use crate::error::{Place, Result};
use crate::model::{CallTally, Locus, Regions, Verdict, stable_hash};

/// Which sample columns are in use, and where their genotypes go.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Selection {
    /// The slot of each sample column; `u32::MAX` when the sample is not in use. As long as
    /// [`CallsHeader::samples`], no slot twice.
    pub slot_of_column: Vec<u32>,
    /// Number of slots.
    pub slots: usize,
}

impl Selection {
    /// Every sample of the file, in column order.
    pub fn all(header: &CallsHeader) -> Self {
        let slots = header.samples.len();
        Selection {
            slot_of_column: (0..slots as u32).collect(),
            slots,
        }
    }
}

/// Minor version of VCF since which a phasing sign may stand before the first allele (4.4, section 1.6.2).
const PREFIX_SINCE: u32 = 4;

/// Decodes records; each worker has its own.
pub struct Decoder {
    path: PathBuf,
    header: Arc<CallsHeader>,
    genotype_key: Option<u32>,
    selection: Selection,
    runs: Vec<Run>,
    tally: CallTally,
    remarks: Remarks,
    tidy: bool,
    regions: Option<Arc<Regions>>,
    contig: Contig,
    format: (Vec<u8>, Format),
    kinds: Vec<AlleleKind>,
    dosages: Vec<u8>,
}

/// The contig of the record before: most often that of the next one.
#[derive(Default)]
struct Contig {
    name: String,
    hash: u64,
    odd: bool,
}

impl Decoder {
    /// A decoder for the records of `reader`.
    ///
    /// # Panics
    /// When `selection` does not fit the header of the file: columns or slots are wrong in number.
    pub fn new(reader: &CallsReader, selection: Selection) -> Self {
        let header = reader.shared_header();
        assert_eq!(
            selection.slot_of_column.len(),
            header.samples.len(),
            "one entry a column"
        );
        let runs = Run::all(&selection.slot_of_column);
        let fits = |run: &Run| run.slot + run.length <= selection.slots;
        assert!(runs.iter().all(fits), "slots in range");
        Decoder {
            path: reader.path().into(),
            genotype_key: header.keys.number("GT"),
            header,
            selection,
            runs,
            tally: CallTally::default(),
            remarks: Remarks::default(),
            tidy: reader.is_tidy(),
            regions: reader.regions(),
            contig: Contig::default(),
            format: (Vec::new(), Format::default()),
            kinds: Vec::new(),
            dosages: Vec::new(),
        }
    }

    /// Decodes record `index` of a batch into `locus`.
    ///
    /// The genotypes of `locus` mean something only when the verdict is [`Verdict::Kept`].
    ///
    /// # Errors
    /// [`crate::Error::Calls`] with the record when it breaks the standard where genotypes are concerned.
    pub fn decode(
        &mut self,
        batch: &RecordBatch,
        index: usize,
        locus: &mut Locus,
    ) -> Result<Verdict> {
        let record = batch.first_record + index as u64;
        locus.record = record;
        let bytes = batch.record(index);
        let mut placed = false;
        let found = if self.header.binary {
            self.binary(bytes, locus, &mut placed)
        } else {
            self.text(bytes, locus, &mut placed)
        };
        found.map_err(|fault| {
            let place = if placed {
                Place::Locus {
                    record,
                    contig: locus.contig.clone(),
                    position: locus.position,
                }
            } else {
                Place::Record(record)
            };
            fault.at(&self.path, place)
        })
    }

    /// What became of single genotypes since the last call.
    pub fn take_tally(&mut self) -> CallTally {
        std::mem::take(&mut self.tally)
    }

    /// What was remarked on records since the last call.
    pub fn take_remarks(&mut self) -> Remarks {
        let remarks = std::mem::take(&mut self.remarks);
        // A tidy table names contigs and alleles in its own way: nothing of that breaks a standard.
        if self.tidy {
            Remarks::default()
        } else {
            remarks
        }
    }

    fn text(
        &mut self,
        line: &[u8],
        locus: &mut Locus,
        placed: &mut bool,
    ) -> std::result::Result<Verdict, Fault> {
        let line = Line::split(line, self.header.samples.len())?;
        if !self.place(line.contig, line.position, locus)? {
            return Ok(Verdict::Elsewhere);
        }
        *placed = true;
        set_id(locus, line.id);
        locus.clear_alleles();
        let format = self.format_of(line.format, locus.record)?;
        let alternates = match line.alternates {
            b"." => 0,
            list => memchr::memchr_iter(b',', list).count() + 1,
        };
        let verdict = match format.genotype {
            None => Verdict::NoGenotypeField,
            Some(_) if alternates >= MAX_ALLELES => Verdict::TooManyAlleles,
            Some(key) => {
                locus.push_allele(line.reference);
                if alternates > 0 {
                    line.alternates
                        .split(|&b| b == b',')
                        .for_each(|a| locus.push_allele(a));
                }
                let values = Values::Text {
                    samples: line.samples,
                    key,
                    keys: format.keys,
                };
                return self.genotypes(locus, values);
            }
        };
        let found = count_columns(line.samples);
        if found != self.header.samples.len() {
            Err(self.wrong_columns(found))
        } else {
            Ok(verdict)
        }
    }

    fn binary(
        &mut self,
        record: &[u8],
        locus: &mut Locus,
        placed: &mut bool,
    ) -> std::result::Result<Verdict, Fault> {
        let site = Site::split(record)?;
        let header = Arc::clone(&self.header);
        let contig = header.contig_numbers.name(site.contig).ok_or_else(|| {
            Fault::new(
                format!("the header has no contig number {}", site.contig),
                WRITE_AGAIN,
            )
        })?;
        if !self.place(contig.as_bytes(), site.position, locus)? {
            return Ok(Verdict::Elsewhere);
        }
        *placed = true;
        set_id(locus, site.id);
        locus.clear_alleles();
        site.alleles(|allele| locus.push_allele(allele))?;
        match site.genotypes(self.genotype_key, header.samples.len())? {
            None => Ok(Verdict::NoGenotypeField),
            Some(_) if site.allele_count > MAX_ALLELES => Ok(Verdict::TooManyAlleles),
            Some(block) => self.genotypes(locus, Values::Binary(block)),
        }
    }

    /// Reads the genotypes of a record whose alleles are in place.
    fn genotypes(
        &mut self,
        locus: &mut Locus,
        values: Values,
    ) -> std::result::Result<Verdict, Fault> {
        alleles::check(locus, &mut self.kinds, &mut self.remarks)?;
        let listed = locus.allele_count();
        let alleles = self.kinds.len().max(listed) as u32;
        locus.genotypes.reset(self.selection.slots, listed);
        let packed = self.packed(values, listed);
        let slots = &self.selection.slot_of_column;
        let mut row = Row::new(&mut locus.genotypes, &self.kinds);
        let scanned = match values {
            _ if packed => {
                row.put_dosages(&self.dosages, &self.runs);
                Ok(())
            }
            Values::Text { samples, key, keys } => {
                // Whether one column has too many is only sure when the others have all of theirs.
                if memchr::memchr_iter(b':', samples).count() > slots.len() * (keys - 1) {
                    self.remarks.add(Remark::ExtraValues, locus.record);
                }
                let prefix = self.header.minor_version >= PREFIX_SINCE;
                scan_row(
                    samples,
                    slots,
                    GenotypeRule {
                        key,
                        alleles,
                        prefix,
                    },
                    &mut row,
                )
            }
            Values::Binary(block) => block.scan(slots, alleles, &mut row),
        };
        let (verdict, tally) = (row.verdict(), row.tally);
        scanned.map_err(|flaw| self.row_fault(flaw, listed, values))?;
        if listed == 1 && tally.unspecified_allele > 0 {
            self.remarks.add(Remark::UnnamedAlternate, locus.record);
        }
        self.tally.merge(&tally);
        Ok(verdict)
    }

    /// Tries the fast way, which leaves dosages by column when it succeeds.
    fn packed(&mut self, values: Values, listed: usize) -> bool {
        if listed > 2 || (listed == 2 && !self.kinds.is_empty()) {
            return false;
        }
        let columns = self.header.samples.len();
        let read = match values {
            Values::Text {
                samples, key: 0, ..
            } => packed_row(samples, columns, &mut self.dosages),
            Values::Text { .. } => false,
            Values::Binary(block) => block.packed_row(&mut self.dosages),
        };
        read && (listed == 2 || self.dosages.iter().all(|&dosage| matches!(dosage, 0 | 3)))
    }

    fn wrong_columns(&self, found: usize) -> Fault {
        let fixed = text::COLUMNS.len();
        text::wrong_columns(found + fixed, self.header.samples.len() + fixed)
    }

    fn row_fault(&self, flaw: RowFlaw, alleles: usize, values: Values) -> Fault {
        let (column, at, flaw) = match flaw {
            RowFlaw::Columns(found) => return self.wrong_columns(found),
            RowFlaw::Genotype { column, at, flaw } => (column, at, flaw),
        };
        let sample = quote(self.header.samples[column].as_bytes());
        let written = match values {
            Values::Text { samples, .. } => {
                let value = samples[at..].split(|b| matches!(b, b':' | b'\t')).next();
                format!(" {}", quote(value.unwrap_or_default()))
            }
            Values::Binary(_) => String::new(),
        };
        match flaw {
            Flaw::Malformed => Fault::new(
                format!("the genotype{written} of sample {sample} is not written as VCF says"),
                "write genotypes as allele numbers or dots parted by / or |, as in 0/1",
            ),
            Flaw::Beyond(allele) => Fault::new(
                format!(
                    "the genotype{written} of sample {sample} names allele {allele}, but the record lists only alleles 0 to {}",
                    alleles - 1
                ),
                "the alleles or the genotypes of this record are wrong: make the file again",
            ),
        }
    }

    /// Sets contig and position, hashing the name only when it is a new one; false where the run is about
    /// other regions.
    fn place(
        &mut self,
        contig: &[u8],
        position: u64,
        locus: &mut Locus,
    ) -> std::result::Result<bool, Fault> {
        if contig != self.contig.name.as_bytes() {
            let name = std::str::from_utf8(contig).map_err(|_| {
                Fault::new(
                    format!("the contig name {} is not UTF-8", quote(contig)),
                    "convert the file to UTF-8",
                )
            })?;
            self.contig = Contig {
                name: name.into(),
                hash: stable_hash(contig),
                odd: !is_contig_name(contig, self.header.minor_version),
            };
        }
        if locus.contig != self.contig.name {
            locus.contig.clone_from(&self.contig.name);
        }
        locus.contig_hash = self.contig.hash;
        locus.position = position;
        if self.contig.odd {
            self.remarks.add(Remark::ContigName, locus.record);
        }
        if position > i32::MAX as u64 {
            self.remarks.add(Remark::FarPosition, locus.record);
        }
        let regions = self.regions.as_ref();
        Ok(regions.is_none_or(|regions| regions.hold(&locus.contig, position)))
    }

    /// What the FORMAT column says; remembered from the record before.
    fn format_of(&mut self, format: &[u8], record: u64) -> std::result::Result<Format, Fault> {
        if format != self.format.0 {
            let parsed = Format::parse(format)?;
            self.format.0.clear();
            self.format.0.extend_from_slice(format);
            self.format.1 = parsed;
        }
        let parsed = self.format.1;
        if parsed.odd {
            self.remarks.add(Remark::FormatKey, record);
        }
        if parsed.genotype.is_some_and(|key| key > 0) {
            self.remarks.add(Remark::LateGenotype, record);
        }
        Ok(parsed)
    }
}

/// The genotypes of a record, as they are written.
#[derive(Clone, Copy)]
enum Values<'a> {
    /// All sample columns, which of their values is GT, and how many FORMAT lists.
    Text {
        samples: &'a [u8],
        key: usize,
        keys: usize,
    },
    /// The values of the GT key.
    Binary(GenotypeBlock<'a>),
}

fn set_id(locus: &mut Locus, id: &[u8]) {
    locus.id.clear();
    if id != b"." {
        locus.id.push_str(&String::from_utf8_lossy(id));
    }
}
