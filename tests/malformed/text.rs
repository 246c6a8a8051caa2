//! Text that contradicts itself or the standard.

use std::io::{Cursor, Read as _};
use std::path::Path;

use genewane::error::Place;
use genewane::ingest::{self, RecordBatch, Remark};
use genewane::model::Verdict;

use super::{BODY, HEAD, error, read, text};

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

/// Takes the 256 MiB of memory that a record may have, and no more.
#[test]
fn an_endless_line_ends() {
    let stream = Cursor::new(HEAD.as_bytes()).chain(std::io::repeat(b'A'));
    let mut reader = ingest::open_stream(Path::new("calls"), Box::new(stream)).unwrap();
    let error = reader.next_batch(&mut RecordBatch::default()).unwrap_err();
    assert!(error.to_string().contains("at most"), "{error}");
}
