//! Regions from the command line and BED, and where an index says that they stand in the file.

use std::fs::File;
use std::io::{self, Read, Seek, SeekFrom};
use std::ops::Range;
use std::path::{Path, PathBuf};

use noodles_core::{Position, region::Interval};
use noodles_csi::{self as csi, BinningIndex};

use super::header::CallsHeader;
use crate::error::{Error, Place, Result, guarded};
use crate::model::{Masks, Problem, Region, Regions, nearest};

/// The empty block that ends every BGZF file (SAM specification, section 4.1.2).
const END_OF_FILE: [u8; 28] = [
    0x1f, 0x8b, 8, 4, 0, 0, 0, 0, 0, 0xff, 6, 0, 0x42, 0x43, 2, 0, 0x1b, 0, 3, 0, 0, 0, 0, 0, 0, 0,
    0, 0,
];

/// The regions that masks name, those of a BED file included; `None` where the run is about everything.
///
/// # Errors
/// [`Error::Io`] where the BED file cannot be read, [`Error::Sheet`] with every row that is wrong.
pub fn regions_of(masks: &Masks) -> Result<Option<Regions>> {
    let mut all = masks.regions.clone();
    if let Some(path) = &masks.regions_bed {
        let bytes = std::fs::read(path).map_err(|e| Error::io(path, "read", e))?;
        all.extend(parse_bed(&bytes).map_err(|problems| Error::Sheet {
            path: path.clone(),
            problems,
        })?);
    }
    Ok((!all.is_empty()).then(|| Regions::new(all)))
}

/// BED (GA4GH, BED 1.0): contig, first base counted from 0, end not included; more columns are left alone.
fn parse_bed(bytes: &[u8]) -> std::result::Result<Vec<Region>, Vec<Problem>> {
    const SHAPE: &str = "write contig, start (from 0) and end, parted by tabs";
    let (mut regions, mut problems) = (Vec::new(), Vec::new());
    for (row, line) in (1..).zip(String::from_utf8_lossy(bytes).lines()) {
        let line = line.trim_end();
        let is_told = ["#", "track", "browser"]
            .iter()
            .any(|m| line.starts_with(m));
        if line.is_empty() || is_told {
            continue;
        }
        let mut cells = line.split(['\t', ' ']).filter(|cell| !cell.is_empty());
        let contig = cells.next().unwrap_or_default();
        let mut number = || cells.next().and_then(|cell| cell.parse::<u64>().ok());
        match (number(), number()) {
            (Some(start), Some(end)) if start < end => regions.push(Region {
                contig: contig.to_owned(),
                from: start + 1,
                to: end,
            }),
            (Some(start), Some(end)) => {
                let what = format!("the region from {start} to {end} is empty");
                problems.push(Problem::at(row, what, SHAPE));
            }
            _ => problems.push(Problem::at(row, "no start and end", SHAPE)),
        }
    }
    if regions.is_empty() && problems.is_empty() {
        problems.push(Problem::at(1, "the file names no region", SHAPE));
    }
    match problems.is_empty() {
        true => Ok(regions),
        false => Err(problems),
    }
}

/// How the regions of a file are found.
pub(super) enum Access {
    /// Stretches between virtual offsets, in order, none touching another's block.
    Chunks(Vec<Range<u64>>),
    /// Everything is read, and why.
    Whole(String),
}

/// What an index says of the regions in a BGZF file.
///
/// # Errors
/// [`Error::Calls`] where the index cannot be read, or the calls have lost their end;
/// [`Error::Usage`] where the header knows no such contig.
pub(super) fn access(path: &Path, header: &CallsHeader, regions: &Regions) -> Result<Access> {
    contigs_are_known(header, regions)?;
    let Some(index) = index_of(path) else {
        return Ok(Access::Whole(
            "no index (.csi or .tbi) stands beside the calls, so all of them were read for the regions"
                .to_owned(),
        ));
    };
    if is_older(&index, path) {
        return Ok(Access::Whole(format!(
            "the index {} is older than the calls and was not used, so all of them were read for the \
             regions: make it again",
            index.display()
        )));
    }
    ends_as_it_must(path)?;
    let found = guarded("the index cannot be read", || {
        chunks(&index, header, regions).map_err(|e| format!("the index cannot be read: {e}"))
    });
    found.map(Access::Chunks).map_err(|problem| Error::Calls {
        path: index.clone(),
        place: Place::Header,
        problem,
        cure: "make the index again, or remove it".to_owned(),
    })
}

fn contigs_are_known(header: &CallsHeader, regions: &Regions) -> Result<()> {
    let names = || header.contigs.iter().map(|(name, _)| name.as_str());
    if names().next().is_none() {
        return Ok(());
    }
    let unknown = regions
        .list()
        .iter()
        .find(|region| !names().any(|name| name == region.contig));
    match unknown {
        None => Ok(()),
        Some(Region { contig, .. }) => Err(Error::Usage(match nearest(contig, names()) {
            Some(near) => format!("the calls have no contig '{contig}': did you mean '{near}'?"),
            None => format!("the calls have no contig '{contig}'"),
        })),
    }
}

/// The index beside the file, under the name that the user gave it.
fn index_of(path: &Path) -> Option<PathBuf> {
    ["csi", "tbi"].iter().find_map(|ending| {
        let mut name = path.as_os_str().to_owned();
        name.push(".");
        name.push(ending);
        let index = PathBuf::from(name);
        index.is_file().then_some(index)
    })
}

fn is_older(index: &Path, calls: &Path) -> bool {
    let time = |path: &Path| std::fs::metadata(path).and_then(|m| m.modified()).ok();
    time(index).zip(time(calls)).is_some_and(|(i, c)| i < c)
}

/// A file read in places must still end with the empty block: otherwise it was cut.
fn ends_as_it_must(path: &Path) -> Result<()> {
    let failed = |e| Error::io(path, "read", e);
    let mut file = File::open(path).map_err(failed)?;
    let mut end = [0; END_OF_FILE.len()];
    let length = file.seek(SeekFrom::End(0)).map_err(failed)?;
    if length >= end.len() as u64 {
        let back = SeekFrom::End(-(end.len() as i64));
        file.seek(back).map_err(failed)?;
        file.read_exact(&mut end).map_err(failed)?;
    }
    match end == END_OF_FILE {
        true => Ok(()),
        false => Err(Error::Calls {
            path: path.to_owned(),
            place: Place::End,
            problem: "the end-of-file marker of BGZF is missing, so the file may have lost its end"
                .to_owned(),
            cure: "copy or make the file again".to_owned(),
        }),
    }
}

fn chunks(index: &Path, header: &CallsHeader, regions: &Regions) -> io::Result<Vec<Range<u64>>> {
    let index: Box<dyn BinningIndex> = match index.extension().is_some_and(|e| e == "tbi") {
        true => Box::new(noodles_tabix::fs::read(index)?),
        false => Box::new(csi::fs::read(index)?),
    };
    let number = |contig: &str| match index.header() {
        Some(names) => names
            .reference_sequence_names()
            .get_index_of(contig.as_bytes()),
        None => header.contig_number(contig),
    };
    let mut all = Vec::new();
    for region in regions.list() {
        // An index lists the contigs that have records.
        let Some(number) = number(&region.contig) else {
            continue;
        };
        if number >= index.reference_sequences().count() {
            continue;
        }
        let bits = u32::from(index.min_shift()) + 3 * u32::from(index.depth());
        let last = 1u64.checked_shl(bits).map_or(u64::MAX, |n| n - 1);
        // An index has nothing beyond its last place.
        if region.from > last {
            continue;
        }
        let found = index.query(number, interval(region, last)?)?;
        all.extend(
            found
                .iter()
                .map(|c| u64::from(c.start())..u64::from(c.end())),
        );
    }
    Ok(joined(all))
}

fn interval(region: &Region, last: u64) -> io::Result<Interval> {
    let position = |at: u64| {
        let at = usize::try_from(at.max(1))
            .ok()
            .and_then(|at| Position::try_from(at).ok());
        at.ok_or_else(|| io::Error::other("a position is out of bounds"))
    };
    let from = position(region.from)?;
    Ok(match region.to {
        to if to >= last && region.from <= 1 => Interval::from(..),
        to if to >= last => Interval::from(from..),
        to => Interval::from(from..=position(to)?),
    })
}

/// Chunks in order; those that share a block are one.
fn joined(mut chunks: Vec<Range<u64>>) -> Vec<Range<u64>> {
    chunks.sort_by_key(|chunk| (chunk.start, chunk.end));
    let mut joined: Vec<Range<u64>> = Vec::new();
    for chunk in chunks {
        match joined.last_mut() {
            Some(last) if chunk.start >> 16 <= last.end >> 16 => last.end = last.end.max(chunk.end),
            _ => joined.push(chunk),
        }
    }
    joined
}

#[cfg(test)]
mod tests {
    use super::*;

    // Zero-based and half-open, as GA4GH's BED 1.0 says.
    #[test]
    fn bed_is_half_open_and_told_by_row() {
        let regions = parse_bed(b"# x\ntrack a\nc1\t0\t10\tname\nc2 5 6\n\n").unwrap();
        let of = |r: &Region| (r.contig.clone(), r.from, r.to);
        let got: Vec<_> = regions.iter().map(of).collect();
        assert_eq!(got, [("c1".into(), 1, 10), ("c2".into(), 6, 6)]);
        let problems = parse_bed(b"c1\t5\t5\nc1\tx\t9\n").unwrap_err();
        let rows: Vec<_> = problems.iter().map(|p| p.row).collect();
        assert_eq!(rows, [Some(1), Some(2)]);
        assert!(parse_bed(b"#\n").is_err());
    }

    #[test]
    fn chunks_that_share_a_block_are_read_once() {
        let at = |block: u64, inside: u64| block << 16 | inside;
        let chunks = vec![
            at(900, 3)..at(1200, 0),
            at(0, 5)..at(100, 7),
            at(100, 9)..at(300, 1),
        ];
        assert_eq!(
            joined(chunks),
            [at(0, 5)..at(300, 1), at(900, 3)..at(1200, 0)]
        );
    }
}
