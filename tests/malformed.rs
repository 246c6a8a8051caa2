//! Broken files: every cut and every flipped bit is noticed where the format has a check for it, every
//! message names the place and the cure, and nothing panics.

use std::io::{Cursor, Write};
use std::path::Path;

use flate2::Compression;
use flate2::write::GzEncoder;
use genewane::error::Place;
use genewane::ingest::{self, Decoder, RecordBatch, Remark, Remarks, Selection};
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

/// A good file with one piece replaced, the part of the problem that must be told, and the record
/// it must be told of (0: the header).
const BROKEN: [(&str, &str, &str, u64); 44] = [
    (
        "##fileformat=VCFv4.2\n",
        "",
        "the first line must be ##fileformat",
        0,
    ),
    ("VCFv4.2", "VCFv4", "is not one of VCFv4.1", 0),
    ("VCFv4.2", "VCFv5.0", "is not one of VCFv4.1", 0),
    ("VCFv4.2", "", "is not one of VCFv4.1", 0),
    ("##contig", "contig", "stands among the ## lines", 0),
    ("##contig", "#contig", "stands among the ## lines", 0),
    ("\tPOS", "\tPLACE", "has \"PLACE\" where \"POS\" belongs", 0),
    ("\tPOS\tID", " POS ID", "where \"#CHROM\" belongs", 0),
    ("\tFORMAT", "\tGT", "ninth column", 0),
    ("\tFORMAT\tvole\tshrew\tnewt", "", "no sample columns", 0),
    ("\tvole\tshrew\tnewt", "", "no sample columns", 0),
    ("shrew", "vole", "two sample columns are named \"vole\"", 0),
    ("shrew", "", "sample column 2 has no name", 0),
    ("newt\n", "newt\t\n", "sample column 4 has no name", 0),
    (
        "\t0/1\t1/1\t./.",
        "\t0/1\t1/1",
        "has 11 column(s) where the header has 12",
        1,
    ),
    (
        "\t0/1\t1/1\t./.",
        "\t0/1\t1/1\t./.\t0/0",
        "has 13 column(s) where the header has 12",
        1,
    ),
    (
        "\t0/1\t1/1\t./.",
        "\t0/1\t1/1\t./.\t",
        "has 13 column(s) where the header has 12",
        1,
    ),
    (
        "\tGT\t0/1\t1/1\t./.",
        "",
        "has 8 column(s) where the header has 12",
        1,
    ),
    (
        "0|2:3\t1|1:4",
        "0|2:3",
        "has 11 column(s) where the header has 12",
        2,
    ),
    (
        "lake\t5\t",
        "lake 5 ",
        "has 10 column(s) where the header has 12",
        1,
    ),
    ("lake\t5\t", "\t5\t", "the column CHROM is empty", 1),
    ("\tA\tC", "\t\tC", "the column REF is empty", 1),
    ("\tA\tC", "\tA\t", "the column ALT is empty", 1),
    ("\tGT:DP", "\t", "the column FORMAT is empty", 2),
    ("lake\t17", "lake\t-17", "POS is \"-17\"", 2),
    ("lake\t17", "lake\t1.7", "POS is \"1.7\"", 2),
    (
        "lake\t17",
        "lake\t99999999999999999999",
        "POS is \"99999999999999999999\"",
        2,
    ),
    ("lake\t17", "lake\t.", "POS is \".\"", 2),
    ("GT,T", "GT,,T", "an allele is empty", 2),
    ("GT,T", "GT,", "an allele is empty", 2),
    ("\tGT:DP", "\tGT:GT", "FORMAT lists GT twice", 2),
    (
        "0/1\t1/1",
        "0/2\t1/1",
        "genotype \"0/2\" of sample \"vole\" names allele 2",
        1,
    ),
    (
        "0|2:3",
        "0|3:3",
        "names allele 3, but the record lists only alleles 0 to 2",
        2,
    ),
    (
        "0|2:3",
        "0|99999999999:3",
        "genotype \"0|99999999999\" of sample \"vole\" names allele",
        2,
    ),
    (
        "1|1:4",
        "1|:4",
        "genotype \"1|\" of sample \"shrew\" is not written as VCF says",
        2,
    ),
    ("1|1:4", "|1:4", "is not written as VCF says", 2),
    ("1|1:4", "1||1:4", "is not written as VCF says", 2),
    ("1|1:4", "1\\1:4", "is not written as VCF says", 2),
    ("1|1:4", "-1|1:4", "is not written as VCF says", 2),
    ("1|1:4", "A|C:4", "is not written as VCF says", 2),
    ("1|1:4", "1|1 :4", "is not written as VCF says", 2),
    (
        "1|1:4",
        ":4",
        "genotype \"\" of sample \"shrew\" is not written",
        2,
    ),
    (
        "1|1:4\t",
        "\t",
        "genotype \"\" of sample \"shrew\" is not written",
        2,
    ),
    (
        "lake\t17",
        "\nlake\t17",
        "an empty line stands before this record",
        2,
    ),
];

#[test]
fn broken_text_is_refused_with_its_place() {
    let good = format!("{HEAD}{BODY}");
    for (from, to, told, record) in BROKEN {
        assert!(good.contains(from), "{from}");
        for end in ["\n", "\r\n"] {
            let bad = good.replacen(from, to, 1).replace('\n', end);
            let (place, problem) = error(bad.as_bytes());
            assert!(problem.contains(told), "{from} -> {to}: {problem}");
            let found = match place {
                Place::Header => 0,
                Place::Record(record) | Place::Locus { record, .. } => record,
                other => panic!("{other}"),
            };
            assert_eq!(found, record, "{from} -> {to}");
        }
    }
}

#[test]
fn other_files_are_named() {
    for (bytes, told) in [
        (&b""[..], "the file is empty"),
        (b"BCF\x04\x00\x00\x00\x00\x00", "BCF of version 1"),
        (b"BAM\x01\x00\x00\x00\x00\x00", "BAM"),
        (b"CRAM\x03\x00", "CRAM"),
        (b"PK\x03\x04zzzz", "ZIP"),
        (b"\x28\xb5\x2f\xfdzzzz", "Zstandard"),
        (b"BZh91AY", "bzip2"),
        (b"\xff\xfe#\x00#\x00", "UTF-16"),
        (b"sample,locus\n", "neither VCF"),
        (b"\n##fileformat=VCFv4.2\n", "neither VCF"),
        (b"#CHROM\tPOS\n", "the first line must be ##fileformat"),
        (b"##fileformat=VCFv4.2\n", "ends before the #CHROM line"),
        (b"\x1f\x8b", "header of a compressed block"),
        (
            b"\x1f\x8b\x09\x00aaaaaaaa",
            "header of a compressed block is damaged",
        ),
    ] {
        let (_, problem) = error(bytes);
        assert!(problem.contains(told), "{problem}");
    }
}

#[test]
fn harmless_faults_are_told() {
    let good = format!("{HEAD}{BODY}");
    let warned = |text: String, told: &str| {
        let outcome = read(text.as_bytes()).unwrap();
        assert_eq!(outcome.content.len(), 3);
        assert!(
            outcome.warnings.iter().any(|w| w.contains(told)),
            "{:?}",
            outcome.warnings
        );
    };
    warned(format!("\u{feff}{good}"), "byte order mark");
    warned(good.trim_end().to_string(), "no end");
    warned(format!("{good}\n\n"), "empty line");
    warned(good.replace("v4.2", "v4.9"), "VCFv4.9");
    warned(
        good.replace("##contig=<ID=lake,length=90000>", "##contig=<lake>"),
        "taken apart",
    );
    for (from, to, remark) in [
        ("lake\t17", "la ke\t17", Remark::ContigName),
        ("lake\t900", "lake\t3000000000", Remark::FarPosition),
        ("\tA\tC", "\tR\tC", Remark::ReferenceBases),
        ("\tA\tC", "\tA\tC ", Remark::AlternateBases),
        ("GT,T", "T,T", Remark::RepeatedAllele),
        ("\tT\tC\t", "\tT\t.\t", Remark::UnnamedAlternate),
        ("GT:DP", "GT: ", Remark::FormatKey),
        ("0/1\t1/1", "0/1:7\t1/1", Remark::ExtraValues),
        ("lake\t900", "lake\t9", Remark::OutOfOrder),
    ] {
        let outcome = read(good.replacen(from, to, 1).as_bytes()).unwrap();
        assert_eq!(outcome.remarks.count(remark), 1, "{from} -> {to}");
        assert!(!outcome.remarks.messages().is_empty());
    }
}

/// VCF 4.4, section 1.6.2: a phasing sign may stand first; before 4.4 it may not.
#[test]
fn leading_phasing_since_4_4() {
    let phased = format!("{HEAD}{BODY}").replace("0|2:3\t1|1:4", "|0|2:3\t/1|1:4");
    assert!(
        error(phased.as_bytes())
            .1
            .contains("is not written as VCF says")
    );
    let expected = read(&text()).unwrap().content;
    assert_eq!(
        read(phased.replace("v4.2", "v4.4").as_bytes())
            .unwrap()
            .content,
        expected
    );
}

#[test]
fn too_many_alleles_are_set_aside() {
    let alternates = |n: usize| vec!["T"; n].join(",");
    let with = |n| text_with("GT,T", &alternates(n));
    let verdict = |n| read(with(n).as_bytes()).unwrap().content[1].3;
    assert_eq!(verdict(ingest::limits::MAX_ALLELES - 1), Verdict::Kept);
    assert_eq!(
        verdict(ingest::limits::MAX_ALLELES),
        Verdict::TooManyAlleles
    );
}

fn text_with(from: &str, to: &str) -> String {
    format!("{HEAD}{BODY}").replacen(from, to, 1)
}

/// Byte patterns in the first binary record, and what is said of hostile values put there.
#[test]
fn hostile_binary_lengths_are_refused() {
    let bytes = binary();
    let header = 9 + u32::from_le_bytes([bytes[5], bytes[6], bytes[7], bytes[8]]) as usize;
    let patched = |at: usize, new: &[u8]| {
        let mut out = bytes.clone();
        out[at..at + new.len()].copy_from_slice(new);
        error(&out).1
    };
    let all = u32::MAX.to_le_bytes();
    let told = |problem: String, part: &str| assert!(problem.contains(part), "{problem}");
    told(patched(5, &all), "the header is longer than");
    told(patched(header, &all), "the record claims to be");
    told(patched(header + 4, &all), "the record claims to be");
    told(patched(header, &[3, 0, 0, 0]), "reaches beyond its end");
    told(
        patched(header + 8, &7u32.to_le_bytes()),
        "no contig number 7",
    );
    told(
        patched(header + 8, &all),
        "the number of the contig is negative",
    );
    told(
        patched(header + 12, &(-5i32).to_le_bytes()),
        "the position is negative",
    );
    told(patched(header + 24, &[0xff, 0xff, 2, 0]), "beyond its end");
    told(patched(header + 24, &[0, 0, 0xff, 0xff]), "");
    told(patched(header + 24, &[0, 0, 0, 0]), "lists no allele");
    told(
        patched(header + 28, &[0xff, 0xff, 0xff, 1]),
        "has 16777215 samples",
    );
    told(patched(header + 28, &[3, 0, 0, 0xff]), "beyond its end");
    // The GT key: name 1 of the header, two one-byte values a sample.
    let genotypes = header
        + bytes[header..]
            .windows(3)
            .position(|w| w == [0x11, 1, 0x21])
            .unwrap();
    told(patched(genotypes, &[0x17]), "no number of a name");
    told(patched(genotypes + 2, &[0x2f]), "unknown type");
    told(
        patched(genotypes + 2, &[0x27]),
        "GT values are not integers",
    );
    told(
        patched(genotypes + 2, &[0xf1, 0x13, 0xff, 0xff, 0xff, 0x7f]),
        "beyond its end",
    );
    told(patched(genotypes + 2, &[0xf1, 0x11, 0xff]), "negative");
    told(patched(genotypes + 3, &[6, 4]), "names allele 2");
    told(
        patched(genotypes + 3, &[0x85, 4]),
        "is not written as VCF says",
    );
    told(
        patched(genotypes + 3, &[0x81, 4]),
        "is not written as VCF says",
    );
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

/// Reads 256 MiB of a line that never ends; by hand, for its memory.
#[test]
#[ignore = "takes half a gigabyte of memory"]
fn an_endless_line_ends() {
    use std::io::Read as _;
    let stream = Cursor::new(HEAD.as_bytes()).chain(std::io::repeat(b'A'));
    let mut reader = ingest::open_stream(Path::new("calls"), Box::new(stream)).unwrap();
    let error = reader.next_batch(&mut RecordBatch::default()).unwrap_err();
    assert!(error.to_string().contains("at most"), "{error}");
}
