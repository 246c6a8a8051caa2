//! A tally: what was counted in one shard of the calls, as a Parquet file.
//!
//! A row a kept locus, which any reader of Parquet opens: `contig`, `position`, `id`, `alleles`, and for each
//! stratum `typed:S`, `heterozygotes:S` and `copies:S` (a list by allele). The footer holds under
//! [`HEADER_KEY`] what it was made of (JSON, [`TallyHeader`]) and under `genewane-state` the exact sums that
//! `measure` adds up, for this program alone.
#![cfg_attr(not(test), deny(clippy::indexing_slicing))]
#![expect(
    clippy::indexing_slicing,
    reason = "places were found in the same line; slots are those of the strata"
)]

use std::collections::BTreeMap;
use std::fmt::Write as _;
use std::fs::File;
use std::io::{self, Read, Write};
use std::path::Path;

use base64::Engine;
use base64::engine::general_purpose::STANDARD;
use flate2::Compression;
use flate2::read::ZlibDecoder;
use flate2::write::ZlibEncoder;
use parquet::file::reader::{FileReader, SerializedFileReader};
use schemars::JsonSchema;
use serde::{Deserialize, Serialize};
use sha2::{Digest, Sha256};

use super::parquet::{Kind, ParquetTable};
use super::table::plain;
use super::wire::InputFile;
use crate::error::{Error, Place, Result, guarded};
use crate::merge::LocusView;
use crate::model::{Locus, Strata, hexadecimal};

/// Name of the format.
pub const TALLY_FORMAT: &str = "genewane-tally";
/// Version of the format: of the header and of the state.
pub const TALLY_VERSION: u32 = 1;
/// Key of the header in the footer.
pub const HEADER_KEY: &str = "genewane-tally";
/// Key of the sums in the footer.
const STATE_KEY: &str = "genewane-state";
/// Bytes that every Parquet file begins with.
const MAGIC: &[u8] = b"PAR1";
/// Most bytes that the sums of a tally may take when unpacked.
const MOST_STATE: u64 = 8 << 30;

/// What a tally was made of.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct TallyHeader {
    /// Always `genewane-tally`.
    pub format: String,
    /// Version of this format.
    pub format_version: u32,
    /// Version of the program: tallies of different versions are not added up.
    pub version: String,
    /// Files of calls read.
    pub inputs: Vec<InputFile>,
    /// Samples of the calls, in their order.
    pub samples_in_calls: Vec<String>,
    /// Strata with their samples in use, in the order of the sums.
    pub strata: Vec<TallyStratum>,
    /// Pairs of strata that are compared, as `from > to`.
    pub comparisons: Vec<String>,
    /// Settings that change what is counted.
    pub settings: BTreeMap<String, String>,
    /// Kept loci by contig: the first and the last position.
    pub contigs: BTreeMap<String, [u64; 2]>,
    /// What the reader remarked on the calls.
    pub remarks: Vec<String>,
    /// SHA-256 of the sums, unpacked, in hexadecimal.
    pub state_sha256: String,
}

/// One stratum of a tally.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct TallyStratum {
    /// `population@visit`.
    pub stratum: String,
    /// Samples in use.
    pub samples: Vec<String>,
}

/// The strata of a sheet as a tally names them.
pub fn strata_of(strata: &Strata) -> Vec<TallyStratum> {
    let samples = |slots: std::ops::Range<usize>| {
        let individuals = &strata.individuals[slots];
        individuals.iter().map(|i| i.sample.clone()).collect()
    };
    strata
        .strata
        .iter()
        .map(|s| TallyStratum {
            stratum: s.name.clone(),
            samples: samples(s.slots.clone()),
        })
        .collect()
}

/// The rows of a tally under way.
pub struct TallyRows {
    table: ParquetTable,
    contigs: BTreeMap<String, [u64; 2]>,
    pending: Vec<u8>,
}

impl TallyRows {
    /// Creates the file (under a temporary name) before any work is done.
    pub fn create(path: &Path, strata: &Strata) -> Result<Self> {
        let mut columns = vec![
            ("contig".to_owned(), Kind::Text),
            ("position".to_owned(), Kind::Whole),
            ("id".to_owned(), Kind::Text),
            ("alleles".to_owned(), Kind::Text),
        ];
        for stratum in &strata.strata {
            columns.push((format!("typed:{}", stratum.name), Kind::Whole));
            columns.push((format!("heterozygotes:{}", stratum.name), Kind::Whole));
            columns.push((format!("copies:{}", stratum.name), Kind::Counts));
        }
        Ok(TallyRows {
            table: ParquetTable::create(path, &columns)?,
            contigs: BTreeMap::new(),
            pending: Vec::new(),
        })
    }

    /// Appends the row of one locus, as text.
    pub fn row(locus: &Locus, view: &LocusView, out: &mut Vec<u8>) {
        let mut row = format!("{}\t{}\t", plain(locus.contig.as_bytes()), locus.position);
        row.push_str(&match locus.id.is_empty() {
            true => "NA".into(),
            false => plain(locus.id.as_bytes()),
        });
        row.push('\t');
        for allele in 0..locus.allele_count() {
            let text = plain(locus.allele(allele).unwrap_or_default());
            let _ = write!(row, "{}{text}", if allele > 0 { "," } else { "" });
        }
        for counts in view.counts {
            let _ = write!(row, "\t{}\t{}\t", counts.typed, counts.heterozygotes);
            for (allele, copies) in counts.copies.iter().take(locus.allele_count()).enumerate() {
                let _ = write!(row, "{}{copies}", if allele > 0 { "," } else { "" });
            }
        }
        row.push('\n');
        out.extend_from_slice(row.as_bytes());
    }

    /// First and last position by contig so far.
    pub fn contigs(&self) -> &BTreeMap<String, [u64; 2]> {
        &self.contigs
    }

    /// Puts the complete file under its name; `state` are the sums.
    pub fn finish(self, path: &Path, mut header: TallyHeader, state: &[u8]) -> Result<()> {
        let failed = |e: io::Error| Error::io(path, "write", e);
        header.state_sha256 = digest(state);
        let mut packed = ZlibEncoder::new(Vec::new(), Compression::default());
        packed.write_all(state).map_err(failed)?;
        let packed = packed.finish().map_err(failed)?;
        let json = serde_json::to_string(&header).map_err(|e| failed(io::Error::other(e)))?;
        let texts = vec![
            (HEADER_KEY.to_owned(), json),
            (STATE_KEY.to_owned(), STANDARD.encode(packed)),
        ];
        self.table.finish(path, texts)
    }

    fn see(&mut self, line: &[u8]) {
        let text = String::from_utf8_lossy(line);
        let mut cells = text.split('\t');
        let contig = cells.next().unwrap_or_default();
        let position = cells.next().and_then(|p| p.parse().ok()).unwrap_or(0);
        match self.contigs.get_mut(contig) {
            Some([first, last]) => {
                *first = position.min(*first);
                *last = position.max(*last);
            }
            None => {
                self.contigs.insert(contig.to_owned(), [position; 2]);
            }
        }
    }
}

impl Write for TallyRows {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        self.pending.extend_from_slice(bytes);
        while let Some(end) = self.pending.iter().position(|&b| b == b'\n') {
            let rest = self.pending.split_off(end + 1);
            let line = std::mem::replace(&mut self.pending, rest);
            self.see(&line[..end]);
            self.table.write_all(&line)?;
        }
        Ok(bytes.len())
    }

    fn flush(&mut self) -> io::Result<()> {
        Ok(())
    }
}

/// Whether a file begins like a tally; a file that cannot be opened does not.
pub fn is_tally(path: &Path) -> bool {
    let mut begin = [0; MAGIC.len()];
    // A pipe must not lose its first bytes.
    let regular = std::fs::metadata(path).is_ok_and(|m| m.is_file());
    regular
        && File::open(path).is_ok_and(|mut file| file.read_exact(&mut begin).is_ok())
        && begin == MAGIC
}

/// The header and the sums of a tally, whose checksum holds.
///
/// # Errors
/// When the file cannot be read, is no tally of this version, or is damaged.
pub fn read_tally(path: &Path) -> Result<(TallyHeader, Vec<u8>)> {
    let texts = footer(path)?;
    let text = |key: &str| {
        texts.get(key).ok_or_else(|| {
            faulty(
                path,
                "this Parquet file is no tally of genewane",
                "give what 'genewane tally' wrote, or the calls themselves",
            )
        })
    };
    let header: TallyHeader = serde_json::from_str(text(HEADER_KEY)?)
        .map_err(|e| faulty(path, &format!("its header cannot be read: {e}"), AGAIN))?;
    if header.format_version != TALLY_VERSION || header.version != env!("CARGO_PKG_VERSION") {
        return Err(faulty(
            path,
            &format!(
                "it was made by version {} (format {}), this is {} (format {TALLY_VERSION})",
                header.version,
                header.format_version,
                env!("CARGO_PKG_VERSION")
            ),
            AGAIN,
        ));
    }
    let packed = STANDARD
        .decode(text(STATE_KEY)?)
        .map_err(|e| faulty(path, &format!("its sums are damaged: {e}"), AGAIN))?;
    let mut state = Vec::new();
    ZlibDecoder::new(packed.as_slice())
        .take(MOST_STATE)
        .read_to_end(&mut state)
        .map_err(|e| faulty(path, &format!("its sums are damaged: {e}"), AGAIN))?;
    match digest(&state) == header.state_sha256 {
        true => Ok((header, state)),
        false => Err(faulty(path, "its sums do not have their checksum", AGAIN)),
    }
}

const AGAIN: &str = "make the tally again with this version of 'genewane tally'";

/// What is wrong with a tally.
pub fn faulty(path: &Path, problem: &str, cure: &str) -> Error {
    Error::Calls {
        path: path.to_owned(),
        place: Place::Header,
        problem: problem.to_owned(),
        cure: cure.to_owned(),
    }
}

/// Texts by key in the footer of a Parquet file.
fn footer(path: &Path) -> Result<BTreeMap<String, String>> {
    let file = File::open(path).map_err(|e| Error::io(path, "open", e))?;
    guarded("its footer cannot be read", || {
        let reader = SerializedFileReader::new(file);
        let reader = reader.map_err(|e| format!("its footer cannot be read: {e}"))?;
        let texts = reader.metadata().file_metadata().key_value_metadata();
        let texts = texts.into_iter().flatten();
        Ok(texts
            .filter_map(|kv| Some((kv.key.clone(), kv.value.clone()?)))
            .collect())
    })
    .map_err(|problem| faulty(path, &problem, AGAIN))
}

fn digest(bytes: &[u8]) -> String {
    hexadecimal(&Sha256::digest(bytes))
}
