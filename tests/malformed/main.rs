//! Broken files: every cut and every flipped bit is noticed where the format has a check for it, every
//! message names the place and the cure, and nothing panics.

mod binary;
mod text;

use std::io::{Cursor, Write};
use std::path::Path;

use flate2::Compression;
use flate2::write::GzEncoder;
use genewane::error::Place;
use genewane::ingest::{self, Decoder, RecordBatch, Remarks, Selection};
use genewane::model::{Locus, Verdict};
use genewane::{Error, Result};
use noodles_bcf as bcf;
use noodles_bgzf as bgzf;
use noodles_vcf as vcf;
use noodles_vcf::variant::io::Write as _;
use proptest::prelude::*;

/// A whole file: contig, position, alleles, verdict and genotypes of each record.
type Content = Vec<(String, u64, usize, Verdict, Vec<Option<[u16; 2]>>)>;

/// What was read, with what was told about it.
struct Outcome {
    content: Content,
    warnings: Vec<String>,
    remarks: Remarks,
}

fn read(bytes: &[u8]) -> Result<Outcome> {
    let stream = Box::new(Cursor::new(bytes.to_vec()));
    let mut reader = ingest::open_stream(Path::new("calls"), stream)?;
    let mut decoder = Decoder::new(&reader, Selection::all(reader.header()));
    let (mut batch, mut locus, mut content) =
        (RecordBatch::default(), Locus::default(), Vec::new());
    while reader.next_batch(&mut batch)? {
        for index in 0..batch.len() {
            let verdict = decoder.decode(&batch, index, &mut locus)?;
            let kept = verdict == Verdict::Kept;
            let slots = if kept { locus.genotypes.len() } else { 0 };
            let pairs = (0..slots).map(|slot| locus.genotypes.pair(slot)).collect();
            let alleles = if kept { locus.allele_count() } else { 0 };
            content.push((
                locus.contig.clone(),
                locus.position,
                alleles,
                verdict,
                pairs,
            ));
        }
    }
    assert_eq!(reader.digest().bytes, bytes.len() as u64);
    let mut remarks = decoder.take_remarks();
    remarks.merge(reader.remarks());
    Ok(Outcome {
        content,
        warnings: reader.warnings().to_vec(),
        remarks,
    })
}

const HEAD: &str = "##fileformat=VCFv4.2
##contig=<ID=lake,length=90000>
##FORMAT=<ID=GT,Number=1,Type=String,Description=\"g\">
##FORMAT=<ID=DP,Number=1,Type=Integer,Description=\"d\">
#CHROM\tPOS\tID\tREF\tALT\tQUAL\tFILTER\tINFO\tFORMAT\tvole\tshrew\tnewt
";
const BODY: &str = "lake\t5\t.\tA\tC\t.\tPASS\t.\tGT\t0/1\t1/1\t./.
lake\t17\tx\tG\tGT,T\t9\tPASS\t.\tGT:DP\t0|2:3\t1|1:4\t0/0:5
lake\t900\t.\tT\tC\t.\tPASS\t.\tGT\t0/0\t0/1\t0/0
";

fn text() -> Vec<u8> {
    format!("{HEAD}{BODY}").into_bytes()
}

fn binary() -> Vec<u8> {
    let text = text();
    let mut reader = vcf::io::Reader::new(&text[..]);
    let header = reader.read_header().unwrap();
    let mut writer = bcf::io::Writer::from(Vec::new());
    writer.write_header(&header).unwrap();
    for record in reader.record_bufs(&header) {
        writer
            .write_variant_record(&header, &record.unwrap())
            .unwrap();
    }
    writer.into_inner()
}

/// BGZF of several blocks.
fn blocked(bytes: &[u8]) -> Vec<u8> {
    let mut writer = bgzf::io::Writer::new(Vec::new());
    for piece in bytes.chunks(bytes.len() / 3 + 1) {
        writer.write_all(piece).unwrap();
        writer.flush().unwrap();
    }
    writer.finish().unwrap()
}

fn gzip(bytes: &[u8]) -> Vec<u8> {
    let mut encoder = GzEncoder::new(Vec::new(), Compression::default());
    encoder.write_all(bytes).unwrap();
    encoder.finish().unwrap()
}

fn error(bytes: &[u8]) -> (Place, String) {
    match read(bytes).err() {
        Some(Error::Calls {
            path,
            place,
            problem,
            cure,
        }) => {
            assert_eq!(path, Path::new("calls"));
            assert!(!cure.is_empty());
            (place, problem)
        }
        Some(other) => panic!("{other}"),
        None => panic!("was read: {}", String::from_utf8_lossy(bytes)),
    }
}

#[test]
fn the_same_content_in_every_wrapping() {
    let expected = read(&text()).unwrap().content;
    assert_eq!(expected.len(), 3);
    assert_eq!(expected[1].4, [Some([0, 2]), Some([1, 1]), Some([0, 0])]);
    for inner in [text(), binary()] {
        let two_members = [gzip(&inner[..200]), gzip(&inner[200..])].concat();
        let mixed = [blocked(&inner[..200]), gzip(&inner[200..])].concat();
        for bytes in [
            &inner,
            &gzip(&inner),
            &blocked(&inner),
            &two_members,
            &mixed,
        ] {
            assert_eq!(read(bytes).unwrap().content, expected);
        }
    }
}

#[test]
fn every_cut_of_a_compressed_file_is_noticed() {
    for inner in [text(), binary()] {
        for bytes in [blocked(&inner), gzip(&inner)] {
            for end in 0..bytes.len() {
                assert!(
                    read(&bytes[..end]).is_err(),
                    "cut at {end} of {}",
                    bytes.len()
                );
            }
        }
    }
}

#[test]
fn a_cut_binary_file_is_noticed_inside_of_records() {
    let bytes = binary();
    let whole = read(&bytes).unwrap().content;
    let survivors: Vec<Content> = (0..bytes.len())
        .filter_map(|end| read(&bytes[..end]).ok())
        .map(|o| o.content)
        .collect();
    // Only a cut right behind the header, or behind one of the first two records, cannot be seen.
    assert_eq!(survivors.len(), 3);
    for (records, content) in survivors.iter().enumerate() {
        assert_eq!(content[..], whole[..records]);
    }
}

#[test]
fn a_cut_line_is_noticed_or_told() {
    let bytes = text();
    for end in 0..bytes.len() {
        let Ok(outcome) = read(&bytes[..end]) else {
            continue;
        };
        let clean = bytes[end - 1] == b'\n';
        assert!(clean || !outcome.warnings.is_empty(), "cut at {end}");
    }
}

#[test]
fn every_flipped_bit_of_a_compressed_file_is_noticed_or_harmless() {
    for inner in [text(), binary()] {
        let expected = read(&inner).unwrap().content;
        for bytes in [blocked(&inner), gzip(&inner)] {
            for bit in 0..8 * bytes.len() {
                let mut flipped = bytes.clone();
                flipped[bit / 8] ^= 1 << (bit % 8);
                if let Ok(outcome) = read(&flipped) {
                    assert_eq!(outcome.content, expected, "bit {bit}");
                }
            }
        }
    }
}

#[test]
fn flipped_bits_without_checksums_do_not_panic() {
    for bytes in [text(), binary()] {
        for bit in 0..8 * bytes.len() {
            let mut flipped = bytes.clone();
            flipped[bit / 8] ^= 1 << (bit % 8);
            _ = read(&flipped);
        }
    }
}

#[test]
fn compression_is_checked_to_its_end() {
    let bytes = blocked(&text());
    // The end-of-file marker of BGZF is 28 bytes long (SAM specification, section 4.1.2).
    let (place, problem) = error(&bytes[..bytes.len() - 28]);
    assert_eq!(place, Place::End);
    assert!(problem.contains("end-of-file marker"), "{problem}");
    let (place, problem) = error(&bytes[..bytes.len() - 20]);
    assert_eq!(place, Place::Byte(bytes.len() as u64 - 28));
    assert!(
        problem.contains("header of a compressed block"),
        "{problem}"
    );
    for bytes in [bytes, gzip(&text())] {
        let (place, problem) = error(&[&bytes[..], b"junk"].concat());
        assert_eq!(place, Place::Byte(bytes.len() as u64));
        assert!(problem.contains("not compressed data"), "{problem}");
    }
    assert!(error(&gzip(&gzip(&text()))).1.contains("compressed twice"));
    assert!(error(&gzip(b"")).1.contains("holds nothing"));
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]
    /// Any bytes in place of any others: an answer, never a panic.
    #[test]
    fn any_bytes_get_an_answer(
        which in 0usize..4,
        at in any::<prop::sample::Index>(),
        gone in 0usize..20,
        new in proptest::collection::vec(any::<u8>(), 0..20),
    ) {
        let inner = if which < 2 { text() } else { binary() };
        let mut bytes = if which % 2 == 0 { inner } else { blocked(&inner) };
        let at = at.index(bytes.len());
        let end = (at + gone).min(bytes.len());
        bytes.splice(at..end, new);
        _ = read(&bytes);
    }
}
