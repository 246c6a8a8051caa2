//! Masks on a record that was decoded: its filters, and the quality, depth and allele reads of its
//! genotypes. Read again from the record only when a mask asks for them.
#![expect(clippy::indexing_slicing, reason = "three fields, three places")]

use super::Decoder;
use crate::error::{Place, Result};
use crate::ingest::batch::RecordBatch;
use crate::ingest::binary::{GenotypeBlock, Site};
use crate::ingest::call::UNUSED;
use crate::ingest::fault::Fault;
use crate::ingest::text::Line;
use crate::model::{Locus, MaskTally, Masks};

/// Fields of a genotype that masks look at.
const KEYS: [&str; 3] = ["GQ", "DP", "AD"];

/// Values of one genotype, none where missing.
#[derive(Debug, Clone, Copy, Default)]
struct Fields {
    quality: Option<f64>,
    depth: Option<f64>,
    /// Reads of the two called alleles.
    reads: Option<[f64; 2]>,
}

impl Decoder {
    /// Masks a record that was just decoded as kept; false when nothing of it is left. What was masked
    /// is added to `tally`.
    ///
    /// # Errors
    /// [`crate::Error::Calls`] with the record when its fields cannot be read.
    pub fn mask(
        &self,
        masks: &Masks,
        batch: &RecordBatch,
        index: usize,
        locus: &mut Locus,
        tally: &mut MaskTally,
    ) -> Result<bool> {
        let masked = self.mask_record(masks, batch.record(index), locus, tally);
        let reason = masked.map_err(|fault| {
            fault.at(
                &self.path,
                Place::Locus {
                    record: locus.record,
                    contig: locus.contig.clone(),
                    position: locus.position,
                },
            )
        })?;
        if let Some(reason) = reason {
            *tally.records.entry(reason.into()).or_default() += 1;
        }
        Ok(reason.is_none())
    }

    fn mask_record(
        &self,
        masks: &Masks,
        record: &[u8],
        locus: &mut Locus,
        tally: &mut MaskTally,
    ) -> std::result::Result<Option<&'static str>, Fault> {
        let site = of_site(masks, locus);
        if site.is_some() || (masks.filters.is_none() && !masks.of_genotypes()) {
            return Ok(site);
        }
        let before: u64 = tally.genotypes.values().sum();
        if self.header.binary {
            let site = Site::split(record)?;
            let names = site.filters()?;
            let name = |&number: &i32| {
                let number = u32::try_from(number).ok();
                number.and_then(|n| self.header.keys.name(n)).unwrap_or("?")
            };
            let mut names = names.iter().map(name).peekable();
            let none = names.peek().is_none();
            if filtered(masks, names.chain(none.then_some("."))) {
                return Ok(Some("masked_filter"));
            }
            if masks.of_genotypes() {
                let samples = self.header.samples.len();
                let block = |key| {
                    let number = self.header.keys.number(key);
                    // A key of another type than integer says nothing here.
                    number.and_then(|n| site.genotypes(Some(n), samples).ok().flatten())
                };
                let blocks = KEYS.map(block);
                for (column, &slot) in self.selection.slot_of_column.iter().enumerate() {
                    if slot != UNUSED {
                        let read = |pair| binary_fields(&blocks, column, pair);
                        mask_genotype(masks, locus, slot as usize, read, tally);
                    }
                }
            }
        } else {
            let line = Line::split(record, self.header.samples.len())?;
            let filter = String::from_utf8_lossy(line.filter);
            if filtered(masks, filter.split(';')) {
                return Ok(Some("masked_filter"));
            }
            if masks.of_genotypes() {
                let place = |key: &str| {
                    let mut keys = line.format.split(|&b| b == b':');
                    keys.position(|k| k == key.as_bytes())
                };
                let places = KEYS.map(place);
                let columns = line.samples.split(|&b| b == b'\t');
                for (values, &slot) in columns.zip(&self.selection.slot_of_column) {
                    if slot != UNUSED {
                        let read = |pair| text_fields(values, &places, pair);
                        mask_genotype(masks, locus, slot as usize, read, tally);
                    }
                }
            }
        }
        let masked = tally.genotypes.values().sum::<u64>() > before;
        let left = || (0..locus.genotypes.len()).any(|slot| locus.genotypes.pair(slot).is_some());
        Ok((masked && !left()).then_some("nothing_left_unmasked"))
    }
}

/// What of the locus itself leaves it out.
fn of_site(masks: &Masks, locus: &Locus) -> Option<&'static str> {
    let listed = |contigs: &[String]| contigs.contains(&locus.contig);
    let single = |i: usize| {
        let allele = locus.allele(i).unwrap_or_default();
        let base = |b: &u8| matches!(b.to_ascii_uppercase(), b'A' | b'C' | b'G' | b'T' | b'N');
        allele.len() == 1 && allele.iter().all(base)
    };
    let other_contig = masks
        .contigs
        .as_ref()
        .is_some_and(|contigs| !listed(contigs));
    if other_contig || listed(&masks.without_contigs) {
        Some("masked_contig")
    } else if masks.biallelic_only && locus.allele_count() > 2 {
        Some("masked_more_than_two_alleles")
    } else if masks.snv_only && !(0..locus.allele_count()).all(single) {
        Some("masked_not_single_base")
    } else {
        None
    }
}

/// Whether one of the filters of a record is not listed.
fn filtered<'a>(masks: &Masks, mut filters: impl Iterator<Item = &'a str>) -> bool {
    let listed = masks.filters.as_ref();
    listed.is_some_and(|listed| filters.any(|filter| !listed.iter().any(|l| l == filter)))
}

/// Masks one genotype for the first reason that holds.
fn mask_genotype(
    masks: &Masks,
    locus: &mut Locus,
    slot: usize,
    read: impl Fn([u16; 2]) -> Fields,
    tally: &mut MaskTally,
) {
    let Some(pair) = locus.genotypes.pair(slot) else {
        return;
    };
    let fields = read(pair);
    let below = |value: Option<f64>, limit: Option<u32>| {
        value
            .zip(limit)
            .is_some_and(|(value, limit)| value < f64::from(limit))
    };
    let above = |value: Option<f64>, limit: Option<u32>| {
        value
            .zip(limit)
            .is_some_and(|(value, limit)| value > f64::from(limit))
    };
    let unbalanced = || {
        let (Some([a, b]), Some(least)) = (fields.reads, masks.least_balance) else {
            return false;
        };
        pair[0] != pair[1] && a + b > 0.0 && a.min(b) < least * (a + b)
    };
    let reason = if below(fields.quality, masks.below_gq) {
        "masked_below_gq"
    } else if below(fields.depth, masks.below_dp) {
        "masked_below_dp"
    } else if above(fields.depth, masks.above_dp) {
        "masked_above_dp"
    } else if unbalanced() {
        "masked_below_balance"
    } else {
        return;
    };
    locus.genotypes.clear(slot);
    *tally.genotypes.entry(reason.into()).or_default() += 1;
}

fn text_fields(values: &[u8], places: &[Option<usize>; 3], pair: [u16; 2]) -> Fields {
    let field = |which: usize| {
        let place = places[which]?;
        values.split(|&b| b == b':').nth(place)
    };
    let number = |text: &[u8]| {
        let text = std::str::from_utf8(text).ok()?;
        text.parse::<f64>().ok().filter(|x| x.is_finite())
    };
    let reads = |allele: u16| {
        let mut list = field(2)?.split(|&b| b == b',');
        list.nth(usize::from(allele)).and_then(number)
    };
    Fields {
        quality: field(0).and_then(number),
        depth: field(1).and_then(number),
        reads: reads(pair[0]).zip(reads(pair[1])).map(|(a, b)| [a, b]),
    }
}

fn binary_fields(blocks: &[Option<GenotypeBlock>; 3], column: usize, pair: [u16; 2]) -> Fields {
    let value = |which: usize, place: usize| {
        let block = blocks[which].as_ref()?;
        block.integer(column, place).map(f64::from)
    };
    let reads = |allele: u16| value(2, usize::from(allele));
    Fields {
        quality: value(0, 0),
        depth: value(1, 0),
        reads: reads(pair[0]).zip(reads(pair[1])).map(|(a, b)| [a, b]),
    }
}
