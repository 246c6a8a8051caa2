//! Text and binary records against an independent reader: random records, read by the general-purpose
//! library noodles (its typed records, allele by allele) and by us, must hold the same genotypes.

use std::io::Cursor;
use std::path::Path;

use genewane::ingest::{self, Decoder, RecordBatch, Selection};
use genewane::model::{CallTally, Locus, Verdict};
use noodles_bcf as bcf;
use noodles_vcf as vcf;
use noodles_vcf::variant::RecordBuf;
use noodles_vcf::variant::io::Write as _;
use noodles_vcf::variant::record_buf::samples::sample::Value;
use proptest::prelude::*;

/// One record, decoded.
#[derive(Debug, PartialEq)]
struct Read {
    contig: String,
    position: u64,
    id: String,
    alleles: Vec<String>,
    verdict: Verdict,
    pairs: Vec<Option<[u16; 2]>>,
    tally: CallTally,
}

fn ours(bytes: Vec<u8>, slots: &[u32]) -> Vec<Read> {
    let mut reader = ingest::open_stream(Path::new("calls"), Box::new(Cursor::new(bytes))).unwrap();
    let used = slots.iter().filter(|&&slot| slot != u32::MAX).count();
    let selection = Selection {
        slot_of_column: slots.to_vec(),
        slots: used,
    };
    let mut decoder = Decoder::new(&reader, selection);
    let (mut batch, mut locus, mut out) = (RecordBatch::default(), Locus::default(), Vec::new());
    while reader.next_batch(&mut batch).unwrap() {
        for index in 0..batch.len() {
            let verdict = decoder.decode(&batch, index, &mut locus).unwrap();
            let alleles = (0..locus.allele_count()).filter_map(|i| locus.allele(i));
            out.push(Read {
                contig: locus.contig.clone(),
                position: locus.position,
                id: locus.id.clone(),
                alleles: alleles
                    .map(|a| String::from_utf8(a.to_vec()).unwrap())
                    .collect(),
                verdict,
                pairs: (0..used).map(|slot| locus.genotypes.pair(slot)).collect(),
                tally: decoder.take_tally(),
            });
        }
    }
    out
}

fn typed(text: &[u8]) -> (vcf::Header, Vec<RecordBuf>) {
    let mut reader = vcf::io::Reader::new(text);
    let header = reader.read_header().unwrap();
    let records = reader.record_bufs(&header).map(Result::unwrap).collect();
    (header, records)
}

/// The allele of each place of a genotype; one missing place when it is absent as a whole.
fn places(record: &RecordBuf, column: usize) -> Vec<Option<usize>> {
    match record
        .samples()
        .get_index(column)
        .unwrap()
        .get("GT")
        .flatten()
    {
        Some(Value::Genotype(genotype)) => genotype
            .as_ref()
            .iter()
            .map(|allele| allele.position())
            .collect(),
        None => vec![None],
        other => panic!("{other:?}"),
    }
}

/// The plain way: one typed genotype after the other, straight from the definitions.
fn oracle(record: &RecordBuf, slots: &[u32]) -> Read {
    let alternates = record.alternate_bases().as_ref().to_vec();
    let alleles: Vec<String> = std::iter::once(record.reference_bases().to_string())
        .chain(alternates)
        .collect();
    let used = slots.iter().filter(|&&slot| slot != u32::MAX).count();
    let mut pairs = vec![None; used];
    let mut tally = CallTally::default();
    for (column, &slot) in slots.iter().enumerate() {
        if slot == u32::MAX {
            continue;
        }
        let places = places(record, column);
        let called: Vec<usize> = places.iter().flatten().copied().collect();
        let names: Vec<&str> = called.iter().map(|&i| alleles[i].as_str()).collect();
        match (called.len(), places.len()) {
            (0, _) => tally.missing += 1,
            (1, 1) => tally.haploid += 1,
            (1, 2) => tally.partly_missing += 1,
            (2, 2) if names.contains(&"*") => tally.spanning_deletion += 1,
            (2, 2) if names.contains(&"<*>") || names.contains(&"<NON_REF>") => {
                tally.unspecified_allele += 1;
            }
            (2, 2) => {
                tally.diploid += 1;
                let (a, b) = (called[0] as u16, called[1] as u16);
                pairs[slot as usize] = Some([a.min(b), a.max(b)]);
            }
            _ => tally.other_ploidy += 1,
        }
    }
    let verdict = if tally.diploid > 0 {
        Verdict::Kept
    } else if tally.other_ploidy > 0 {
        Verdict::OnlyOtherPloidy
    } else if tally.haploid > 0 {
        Verdict::OnlyHaploid
    } else {
        Verdict::NothingCalled
    };
    Read {
        contig: record.reference_sequence_name().into(),
        position: record.variant_start().map_or(0, |p| usize::from(p) as u64),
        id: record
            .ids()
            .as_ref()
            .iter()
            .cloned()
            .collect::<Vec<_>>()
            .join(";"),
        alleles,
        verdict,
        pairs,
        tally,
    }
}

/// BCF as the library writes it; `None` where it cannot: a genotype absent as a whole is refused, and
/// vectors of unequal length above one are padded wrongly.
fn written_by_library(header: &vcf::Header, records: &[RecordBuf]) -> Option<Vec<u8>> {
    let columns = header.sample_names().len();
    let mut writer = bcf::io::Writer::from(Vec::new());
    writer.write_header(header).unwrap();
    for record in records {
        if (0..columns).any(|column| places(record, column).len() > 2) {
            return None;
        }
        writer.write_variant_record(header, record).ok()?;
    }
    Some(writer.into_inner())
}

/// BCF written here, value by value, with genotypes of `width` bytes (VCF 4.3, section 6.3).
fn written_here(text: &str, records: &[RecordBuf], width: usize) -> Vec<u8> {
    let head: String = text
        .lines()
        .take_while(|l| l.starts_with('#'))
        .flat_map(|l| [l, "\n"])
        .collect();
    let columns = text.lines().last().unwrap().split('\t').count() - 9;
    let mut out = b"BCF\x02\x02".to_vec();
    out.extend((head.len() as u32 + 1).to_le_bytes());
    out.extend(head.as_bytes());
    out.push(0);
    for record in records {
        let site = site_block(record, columns);
        let genotypes = genotype_block(record, columns, width);
        out.extend((site.len() as u32).to_le_bytes());
        out.extend((genotypes.len() as u32).to_le_bytes());
        out.extend(site);
        out.extend(genotypes);
    }
    out
}

fn site_block(record: &RecordBuf, columns: usize) -> Vec<u8> {
    let read = oracle(record, &vec![u32::MAX; columns]);
    let mut site = Vec::new();
    site.extend(u32::from(read.contig == "river").to_le_bytes());
    site.extend((read.position as i32 - 1).to_le_bytes());
    site.extend(1i32.to_le_bytes());
    site.extend(0x7f80_0001u32.to_le_bytes()); // quality: missing
    site.extend(((read.alleles.len() as u32) << 16).to_le_bytes());
    site.extend(((2 << 24) | columns as u32).to_le_bytes());
    for string in std::iter::once(&read.id).chain(&read.alleles) {
        site.push(((string.len() as u8) << 4) | 7);
        site.extend(string.as_bytes());
    }
    site.extend([0x11, 0]); // PASS
    site
}

fn genotype_block(record: &RecordBuf, columns: usize, width: usize) -> Vec<u8> {
    const END: i32 = i32::MIN + 1;
    let genotypes: Vec<Vec<Option<usize>>> = (0..columns).map(|c| places(record, c)).collect();
    let length = genotypes.iter().map(Vec::len).max().unwrap();
    let kind = [0, 1, 2, 0, 3][width];
    let mut block = vec![0x11, 1, 0x11]; // DP, one byte a sample
    block.extend(vec![9; columns]);
    block.extend([0x11, 2, ((length as u8) << 4) | kind]); // GT
    for genotype in genotypes {
        let coded = |place: &Option<usize>| place.map_or(0, |a| 2 * (a as i32 + 1));
        let mut values: Vec<i32> = genotype.iter().map(coded).collect();
        values.resize(length, END);
        for value in values {
            match (width, value == END) {
                (1, end) => block.push(if end { 0x81 } else { value as u8 }),
                (2, end) => {
                    block.extend((if end { i16::MIN + 1 } else { value as i16 }).to_le_bytes())
                }
                _ => block.extend(value.to_le_bytes()),
            }
        }
    }
    block
}

const HEAD: &str = "##fileformat=VCFv4.3
##contig=<ID=lake,length=90000>
##contig=<ID=river>
##FORMAT=<ID=DP,Number=1,Type=Integer,Description=\"d\">
##FORMAT=<ID=GT,Number=1,Type=String,Description=\"g\">
##FORMAT=<ID=GQ,Number=1,Type=Integer,Description=\"q\">
#CHROM\tPOS\tID\tREF\tALT\tQUAL\tFILTER\tINFO\tFORMAT";

/// A genotype of up to `alleles` alleles; most of them diploid and called, as in real files.
fn genotype(alleles: usize) -> impl Strategy<Value = String> {
    let allele =
        move || prop_oneof![9 => (0..alleles).prop_map(|a| a.to_string()), 1 => Just(".".into())];
    let ploidy = prop_oneof![12 => Just(2usize), 1 => Just(1), 1 => Just(3)];
    (ploidy, any::<bool>()).prop_flat_map(move |(ploidy, phased)| {
        proptest::collection::vec(allele(), ploidy)
            .prop_map(move |places| places.join(if phased { "|" } else { "/" }))
    })
}

fn record(samples: usize) -> impl Strategy<Value = String> {
    const ALTERNATES: [&str; 14] = [
        "C",
        "G",
        "<DEL>",
        "*",
        "<*>",
        "CC",
        "<NON_REF>",
        "T",
        "GT",
        "AG",
        "AC",
        "AT",
        "AGG",
        "ACC",
    ];
    let formats = prop_oneof![
        3 => Just(("GT", "", "")),
        2 => Just(("GT:DP:GQ", "", ":7:99")),
        1 => Just(("DP:GT", "12:", "")),
    ];
    let shape = (0usize..ALTERNATES.len(), 0..=2usize, any::<bool>());
    (shape, formats, 0u32..90_000, any::<bool>()).prop_flat_map(
        move |((from, extra, many), (format, before, after), position, named)| {
            let count = if many { ALTERNATES.len() } else { extra };
            let list: Vec<&str> = (0..count)
                .map(|i| ALTERNATES[(from + i) % ALTERNATES.len()])
                .collect();
            let alternates = if list.is_empty() {
                ".".into()
            } else {
                list.join(",")
            };
            proptest::collection::vec(genotype(count + 1), samples).prop_map(move |genotypes| {
                let contig = if position % 2 == 0 { "lake" } else { "river" };
                let id = if named { "site7" } else { "." };
                let columns: String = genotypes
                    .iter()
                    .map(|gt| format!("\t{before}{gt}{after}"))
                    .collect();
                format!(
                    "{contig}\t{position}\t{id}\tA\t{alternates}\t.\tPASS\t.\t{format}{columns}"
                )
            })
        },
    )
}

fn file() -> impl Strategy<Value = (String, Vec<u32>)> {
    (1usize..12)
        .prop_flat_map(|samples| {
            let order = Just((0..samples).collect::<Vec<_>>()).prop_shuffle();
            let records = proptest::collection::vec(record(samples), 1..6);
            (records, order, 1..=samples)
        })
        .prop_map(|(records, order, used)| {
            let names: String = (0..order.len()).map(|i| format!("\tvole{i}")).collect();
            let slots = order
                .iter()
                .map(|&slot| if slot < used { slot as u32 } else { u32::MAX })
                .collect();
            (format!("{HEAD}{names}\n{}\n", records.join("\n")), slots)
        })
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]
    #[test]
    fn text_and_binary_hold_what_the_library_reads((text, slots) in file()) {
        let (header, records) = typed(text.as_bytes());
        let expected: Vec<Read> = records.iter().map(|record| oracle(record, &slots)).collect();
        prop_assert_eq!(&ours(text.clone().into_bytes(), &slots), &expected);
        for width in [1, 2, 4] {
            prop_assert_eq!(&ours(written_here(&text, &records, width), &slots), &expected);
        }
        if let Some(binary) = written_by_library(&header, &records) {
            prop_assert_eq!(&ours(binary, &slots), &expected);
        }
        let windows = text.replace('\n', "\r\n").trim_end().to_string();
        prop_assert_eq!(&ours(windows.into_bytes(), &slots), &expected);
    }
}

/// Real microsatellite calls with up to fifty alleles, as text and as BCF made of it by others.
#[test]
fn snail_text_and_binary_are_one() {
    let folder = Path::new("../shared/data/snail");
    let (Ok(text), Ok(binary)) = (
        std::fs::read(folder.join("snail.vcf.gz")),
        std::fs::read(folder.join("snail.bcf")),
    ) else {
        eprintln!("SKIPPED: {} is absent", folder.display());
        return;
    };
    let slots: Vec<u32> = (0..1270).collect();
    let text = ours(text, &slots);
    assert_eq!(text, ours(binary, &slots));
    // SOURCE.md beside the data: 10 loci, 304 missing genotypes of 12,700.
    assert_eq!(text.len(), 10);
    assert_eq!(text.iter().map(|read| read.tally.missing).sum::<u64>(), 304);
    assert_eq!(
        text.iter().map(|read| read.tally.diploid).sum::<u64>(),
        12_396
    );
}
