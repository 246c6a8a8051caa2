//! One record of BCF (VCF 4.3, section 6.3).
#![expect(
    clippy::indexing_slicing,
    reason = "a block is as long as columns times places, which was checked when it was split"
)]

use super::call::{Call, Flaw, Places, Row, UNUSED};
use super::cursor::{Cursor, Kind};
use super::fault::{Fault, WRITE_AGAIN};
use super::scan::RowFlaw;

/// The first block of a record up to the alleles, taken apart.
#[derive(Debug, Clone, Copy)]
pub(super) struct Site<'a> {
    /// Number of the contig.
    pub contig: u32,
    /// 1-based position.
    pub position: u64,
    pub id: &'a [u8],
    pub allele_count: usize,
    info_count: usize,
    key_count: usize,
    sample_count: usize,
    /// From the first allele to the end of the block.
    rest: Cursor<'a>,
    genotypes: &'a [u8],
}

/// The GT values of all samples.
#[derive(Debug, Clone, Copy)]
pub(super) struct GenotypeBlock<'a> {
    /// Bytes of one value.
    pub width: usize,
    /// Values of one sample.
    pub places: usize,
    pub values: &'a [u8],
}

impl<'a> Site<'a> {
    /// Takes a record apart, its two length fields included.
    pub fn split(record: &'a [u8]) -> Result<Self, Fault> {
        let mut all = Cursor::new(record);
        let shared = all.int32()? as u32 as usize;
        all.int32()?;
        let mut site = Cursor::new(all.take(shared)?);
        let genotypes = all.take(all.left())?;
        let contig = u32::try_from(site.int32()?)
            .map_err(|_| Fault::new("the number of the contig is negative", WRITE_AGAIN))?;
        // 0-based in the file; -1 is the telomere before the first base.
        let position = u64::try_from(i64::from(site.int32()?) + 1)
            .map_err(|_| Fault::new("the position is negative", WRITE_AGAIN))?;
        site.take(8)?; // length on the reference, quality
        let counts = site.int32()? as u32;
        let (allele_count, info_count) = ((counts >> 16) as usize, (counts & 0xffff) as usize);
        let counts = site.int32()? as u32;
        let (key_count, sample_count) = ((counts >> 24) as usize, (counts & 0xff_ffff) as usize);
        let id = site.text()?;
        if allele_count == 0 {
            return Err(Fault::new(
                "the record lists no allele, not even REF",
                WRITE_AGAIN,
            ));
        }
        let rest = site;
        Ok(Site {
            contig,
            position,
            id,
            allele_count,
            info_count,
            key_count,
            sample_count,
            rest,
            genotypes,
        })
    }

    /// Hands each allele to `take`, and checks that filters and INFO fill the rest of the block.
    pub fn alleles(&self, mut take: impl FnMut(&'a [u8])) -> Result<(), Fault> {
        let mut rest = self.rest;
        for _ in 0..self.allele_count {
            take(rest.text()?);
        }
        rest.skip(1)?;
        for _ in 0..self.info_count {
            rest.key()?;
            rest.skip(1)?;
        }
        fully_read(&rest)
    }

    /// Numbers of the filters; empty where none was applied.
    pub fn filters(&self) -> Result<Vec<i32>, Fault> {
        let mut rest = self.rest;
        for _ in 0..self.allele_count {
            rest.text()?;
        }
        let (kind, places) = rest.typed()?;
        let width = kind.width();
        let bytes = rest.values(kind, places, 1)?;
        let number = |bytes: &[u8]| integer(width, bytes);
        Ok(bytes
            .chunks_exact(width.max(1))
            .filter_map(number)
            .collect())
    }

    /// The values of the key with number `wanted`, among `samples` samples.
    pub fn genotypes(
        &self,
        wanted: Option<u32>,
        samples: usize,
    ) -> Result<Option<GenotypeBlock<'a>>, Fault> {
        if self.key_count > 0 && self.sample_count != samples {
            return Err(Fault::new(
                format!(
                    "the record has {} samples where the header has {samples}",
                    self.sample_count
                ),
                WRITE_AGAIN,
            ));
        }
        let mut found = None;
        let mut block = Cursor::new(self.genotypes);
        for _ in 0..self.key_count {
            let key = Some(block.key()?);
            let (kind, places) = block.typed()?;
            let values = block.values(kind, places, samples)?;
            if key != wanted {
                continue;
            }
            let width = match kind {
                Kind::Int(width) => width,
                Kind::Missing => 0,
                _ => return Err(Fault::new("the GT values are not integers", WRITE_AGAIN)),
            };
            if found
                .replace(GenotypeBlock {
                    width,
                    places,
                    values,
                })
                .is_some()
            {
                return Err(Fault::new("the record lists GT twice", WRITE_AGAIN));
            }
        }
        fully_read(&block)?;
        Ok(found)
    }
}

fn fully_read(block: &Cursor) -> Result<(), Fault> {
    if block.left() == 0 {
        return Ok(());
    }
    Err(Fault::new(
        format!("{} bytes of the record belong to nothing", block.left()),
        WRITE_AGAIN,
    ))
}

impl GenotypeBlock<'_> {
    /// One value of a sample; none when missing or not there.
    pub fn integer(&self, column: usize, place: usize) -> Option<i32> {
        if place >= self.places || self.width == 0 {
            return None;
        }
        let at = (column * self.places + place) * self.width;
        integer(self.width, self.values.get(at..at + self.width)?)
    }

    /// Reads all columns; those in use go to `row`.
    pub fn scan(&self, slots: &[u32], alleles: u32, row: &mut Row) -> Result<(), RowFlaw> {
        let size = self.width * self.places;
        for (column, &slot) in slots.iter().enumerate() {
            let values = &self.values[column * size..(column + 1) * size];
            let call = match self.width {
                1 => read_genotype::<1>(values, alleles),
                2 => read_genotype::<2>(values, alleles),
                4 => read_genotype::<4>(values, alleles),
                _ => Ok(Call::Missing),
            };
            let call = call.map_err(|flaw| RowFlaw::Genotype {
                column,
                at: column * size,
                flaw,
            })?;
            if slot != UNUSED {
                row.put(slot as usize, call);
            }
        }
        Ok(())
    }

    /// The fast case of [`crate::ingest::scan::packed_row`]: two one-byte values a sample, two alleles.
    pub fn packed_row(&self, dosages: &mut Vec<u8>) -> bool {
        if (self.width, self.places) != (1, 2) {
            return false;
        }
        dosages.clear();
        dosages.resize(self.values.len() / 2, 0);
        let mut good = true;
        for (out, cell) in dosages.iter_mut().zip(self.values.as_chunks::<2>().0) {
            // Twice the allele plus two, plus one when phased; 0 and 1 are missing.
            let (a, b) = (cell[0] >> 1, cell[1] >> 1);
            let absent = (a | b) == 0;
            let called = (a.wrapping_sub(1) < 2) & (b.wrapping_sub(1) < 2);
            *out = if called {
                a.wrapping_add(b).wrapping_sub(2)
            } else {
                3
            };
            good &= absent | called;
        }
        good
    }
}

/// An integer that is not one of the two reserved values.
fn integer(width: usize, bytes: &[u8]) -> Option<i32> {
    let value = match width {
        1 => value::<1>(bytes),
        2 => value::<2>(bytes),
        4 => value::<4>(bytes),
        _ => return None,
    };
    (value > i32::MIN + 1).then_some(value)
}

/// One value, with the two reserved ones for "end" and "missing" made alike in all widths.
#[inline]
fn value<const WIDTH: usize>(bytes: &[u8]) -> i32 {
    match *bytes {
        [a] => match a as i8 {
            i8::MIN => i32::MIN,
            -127 => i32::MIN + 1,
            other => i32::from(other),
        },
        [a, b] => match i16::from_le_bytes([a, b]) {
            i16::MIN => i32::MIN,
            -32767 => i32::MIN + 1,
            other => i32::from(other),
        },
        [a, b, c, d] => i32::from_le_bytes([a, b, c, d]),
        _ => i32::MIN,
    }
}

/// Reads the values of one sample.
fn read_genotype<const WIDTH: usize>(values: &[u8], alleles: u32) -> Result<Call, Flaw> {
    const MISSING: i32 = i32::MIN;
    const END: i32 = i32::MIN + 1;
    let mut places = Places::default();
    let mut ended = false;
    for bytes in values.chunks_exact(WIDTH) {
        match value::<WIDTH>(bytes) {
            END => ended = true,
            _ if ended => return Err(Flaw::Malformed),
            MISSING | 0 | 1 => places.absent(),
            negative if negative < 0 => return Err(Flaw::Malformed),
            coded => {
                let allele = (coded >> 1) as u32 - 1;
                if allele >= alleles {
                    return Err(Flaw::Beyond(allele));
                }
                places.allele(allele as u16);
            }
        }
    }
    Ok(places.call())
}
