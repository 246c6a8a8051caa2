//! What is fuzzed: each reader of something that comes from outside.

use std::io::{Cursor, Read, Write};
use std::path::{Path, PathBuf};
use std::sync::LazyLock;
use std::sync::atomic::{AtomicU64, Ordering};

use genewane::ingest::{self, Decoder, RecordBatch, Selection};
use genewane::model::{Locus, Verdict};
use genewane::outlook::forecast::parse_watched;
use genewane::outlook::verdict::parse_policy;
use genewane::report::page::{Companions, Page, parse_report};
use genewane::report::tally::read_tally;
use genewane::report::tally_counts::TalliedCounts;
use noodles_bgzf as bgzf;
use noodles_vcf::variant::io::Write as _;
use noodles_vcf::variant::record_buf::samples::sample::Value;

use crate::common::{fixture, run};
use crate::sums::{report, states};

/// What came of one input: read, or the words of the refusal.
pub type Outcome = Result<(), String>;

/// One reader.
pub struct Target {
    pub name: &'static str,
    pub corpus: fn() -> Vec<Vec<u8>>,
    pub read: fn(&[u8]) -> Outcome,
    /// Runs that take about as long as a thousand of the quickest target.
    pub share: u64,
}

pub const TARGETS: [Target; 11] = [
    Target {
        name: "text",
        corpus: texts,
        read: calls,
        share: 1000,
    },
    Target {
        name: "binary",
        corpus: binaries,
        read: calls,
        share: 1000,
    },
    Target {
        name: "blocks",
        corpus: blocks,
        read: calls,
        share: 1000,
    },
    Target {
        name: "tidy",
        corpus: tidies,
        read: tidy,
        share: 400,
    },
    Target {
        name: "sheet",
        corpus: sheets,
        read: sheet,
        share: 1000,
    },
    Target {
        name: "programme",
        corpus: programmes,
        read: programme,
        share: 1000,
    },
    Target {
        name: "lists",
        corpus: lists,
        read: list,
        share: 1000,
    },
    Target {
        name: "tally",
        corpus: tallies,
        read: tally,
        share: 100,
    },
    Target {
        name: "map",
        corpus: maps,
        read: map,
        share: 200,
    },
    Target {
        name: "sums",
        corpus: states,
        read: report,
        share: 5,
    },
    Target {
        name: "documents",
        corpus: documents,
        read: document,
        share: 30,
    },
];

fn vcf() -> String {
    let mut text = "##fileformat=VCFv4.3\n##contig=<ID=a,length=9000>\n##contig=<ID=b>\n\
        ##FORMAT=<ID=GT,Number=1,Type=String,Description=\"g\">\n\
        ##FORMAT=<ID=DP,Number=1,Type=Integer,Description=\"d\">\n\
        ##FORMAT=<ID=AD,Number=R,Type=Integer,Description=\"d\">\n\
        #CHROM\tPOS\tID\tREF\tALT\tQUAL\tFILTER\tINFO\tFORMAT\ts1\ts2\ts3\ts4\n"
        .to_owned();
    for (i, row) in [
        "A\tC\t.\tPASS\t.\tGT\t0/1\t1/1\t./.\t0|0",
        "A\tC,GT\t9.5\tq10\tX=1\tGT:DP:AD\t0/2:3:1,0,2\t1|2:.:.\t.\t0/0:7:7,0,0",
        "AC\tA,<DEL>,*\t.\t.\t.\tDP:GT\t3:0/3\t4:1/1\t.:./1\t9:2",
        "G\t.\t.\t.\t.\tGT\t0/0\t0/0\t0/0\t.",
    ]
    .iter()
    .enumerate()
    {
        let contig = if i < 2 { "a" } else { "b" };
        text += &format!("{contig}\t{}\tr{i}\t{row}\n", 100 + 7 * i);
    }
    text
}

fn texts() -> Vec<Vec<u8>> {
    let text = vcf();
    vec![
        text.clone().into_bytes(),
        text.replace('\n', "\r\n").into_bytes(),
        text.replace("4.3", "4.5").into_bytes(),
    ]
}

/// The same as BCF without compression: by another library, and the records it does not write cut away.
fn binaries() -> Vec<Vec<u8>> {
    let text: String = vcf()
        .lines()
        .filter(|l| !l.contains("DEL"))
        .map(|l| format!("{l}\n"))
        .collect();
    let mut reader = noodles_vcf::io::Reader::new(text.as_bytes());
    let header = reader.read_header().expect("a header");
    let mut writer = noodles_bcf::io::Writer::from(Vec::new());
    writer.write_header(&header).expect("memory takes it");
    for record in reader.record_bufs(&header) {
        let record = record.expect("a record");
        let _ = writer.write_variant_record(&header, &record);
    }
    vec![writer.into_inner()]
}

fn packed(bytes: &[u8], block: usize) -> Vec<u8> {
    let mut writer = bgzf::io::Writer::new(Vec::new());
    for piece in bytes.chunks(block) {
        writer.write_all(piece).expect("memory takes it");
        writer.flush().expect("memory takes it");
    }
    writer.finish().expect("memory takes it")
}

fn blocks() -> Vec<Vec<u8>> {
    let mut plain = flate2::write::GzEncoder::new(Vec::new(), flate2::Compression::default());
    plain.write_all(vcf().as_bytes()).expect("memory takes it");
    vec![
        packed(vcf().as_bytes(), 100),
        packed(vcf().as_bytes(), 5000),
        packed(&binaries()[0], 300),
        plain.finish().expect("memory takes it"),
    ]
}

/// Reads calls to their end; where another reader takes a text as well, the genotypes are the same.
fn calls(bytes: &[u8]) -> Outcome {
    let stream = Box::new(Cursor::new(bytes.to_vec()));
    let mut reader = ingest::open_stream(Path::new("calls"), stream).map_err(words)?;
    let selection = Selection::all(reader.header());
    let mut decoder = Decoder::new(&reader, selection);
    let (mut batch, mut locus) = (RecordBatch::default(), Locus::default());
    let mut read = Vec::new();
    while reader.next_batch(&mut batch).map_err(words)? {
        for index in 0..batch.len() {
            let verdict = decoder.decode(&batch, index, &mut locus).map_err(words)?;
            let kept = verdict == Verdict::Kept;
            let slots = if kept { locus.genotypes.len() } else { 0 };
            read.push(
                (0..slots)
                    .map(|s| locus.genotypes.pair(s))
                    .collect::<Vec<_>>(),
            );
        }
    }
    // The other reader takes longer than ours: every eighth input, unless all are asked for.
    let compared = bytes.len().is_multiple_of(8) || *COMPARE_ALL;
    if bytes.starts_with(b"##fileformat=VCF") && compared {
        compare(bytes, &read);
    }
    Ok(())
}

static COMPARE_ALL: LazyLock<bool> =
    LazyLock::new(|| std::env::var_os("GENEWANE_FUZZ_COMPARE_ALL").is_some());

/// Holds the genotypes against those of another library, where it reads the record at all: called ones and
/// missing ones, those of records that were set aside left out.
fn compare(bytes: &[u8], ours: &[Vec<Option<[u16; 2]>>]) {
    let mut reader = noodles_vcf::io::Reader::new(bytes);
    let Ok(header) = reader.read_header() else {
        return;
    };
    for (record, ours) in reader.record_bufs(&header).zip(ours) {
        // From the first record that it refuses it is out of step.
        let Ok(record) = record else { return };
        let alternates = record.alternate_bases().as_ref();
        for (sample, ours) in record.samples().values().zip(ours) {
            let Some(Some(Value::Genotype(theirs))) = sample.get("GT") else {
                continue;
            };
            let codes: Vec<_> = theirs.as_ref().iter().map(|a| a.position()).collect();
            assert_eq!(diploid(&codes, alternates), *ours, "genotypes differ");
            COMPARED.fetch_add(1, Ordering::Relaxed);
        }
    }
}

/// Genotypes that were held against those of another library.
pub static COMPARED: AtomicU64 = AtomicU64::new(0);

/// What the definitions make of a genotype: two alleles called, none of them a stand-in for others. Which
/// copy comes first means nothing.
fn diploid(codes: &[Option<usize>], alternates: &[String]) -> Option<[u16; 2]> {
    let &[Some(a), Some(b)] = codes else {
        return None;
    };
    let stands_in = |code: usize| {
        let name = code.checked_sub(1).and_then(|i| alternates.get(i));
        // Where ALT is a dot, allele 1 is an alternate that is not named (examples of the standard have it).
        let unnamed = code == 1 && alternates.is_empty();
        unnamed || name.is_some_and(|name| ["*", "<*>", "<NON_REF>"].contains(&name.as_str()))
    };
    let sorted = [a.min(b) as u16, a.max(b) as u16];
    (!stands_in(a) && !stands_in(b)).then_some(sorted)
}

fn tidies() -> Vec<Vec<u8>> {
    vec![
        b"sample,locus,allele_1,allele_2\ns1,L1,184,188\ns2,L1,188,188\ns1,L2,A,G\ns2,L2,NA,\n"
            .to_vec(),
        b"sample\tlocus\tallele_1\tallele_2\ns1\tL1\t184\t188\ns2\tL1\t190\t190\n".to_vec(),
    ]
}

fn tidy(bytes: &[u8]) -> Outcome {
    let path = scratch("tidy.csv", bytes);
    let mut reader = ingest::open(&path).map_err(words)?;
    let mut batch = RecordBatch::default();
    while reader.next_batch(&mut batch).map_err(words)? {}
    Ok(())
}

fn maps() -> Vec<Vec<u8>> {
    vec![
        b"locus,contig,position\nL1,a,12\nL2,b,900\n".to_vec(),
        b"locus\tcontig\tposition\nL2\ta\t7\nL1\ta\t3\n".to_vec(),
    ]
}

/// A map of loci, with the first table of genotypes.
fn map(bytes: &[u8]) -> Outcome {
    let (table, map) = (
        scratch("table.csv", &tidies()[0]),
        scratch("map.csv", bytes),
    );
    let mut reader = ingest::open_with_map(&table, Some(&map)).map_err(words)?;
    let mut batch = RecordBatch::default();
    while reader.next_batch(&mut batch).map_err(words)? {}
    Ok(())
}

fn sheets() -> Vec<Vec<u8>> {
    let demo = std::fs::read_to_string(fixture("demo/samples.tsv")).expect("the demo sheet");
    let rows: Vec<&str> = demo.lines().take(16).collect();
    vec![
        rows.join("\n").into_bytes(),
        b"sample;population;year;visit;sex;replicate_of;batch;use\na;P;2001;v;F;;b1;yes\nb;P;2001;v;M;a;b1;no\n"
            .to_vec(),
        b"sample,population,date\na,\"P, Q\",2001-02-28\nb,P,2004-02-29\n".to_vec(),
    ]
}

fn sheet(bytes: &[u8]) -> Outcome {
    ingest::sheet::parse_sheet(bytes)
        .map(drop)
        .map_err(|problems| told(&problems))
}

fn programmes() -> Vec<Vec<u8>> {
    let keys = "baseline = 1995\ngeneration_years = 4.5\ncensus = 800\nsampling_plan = 2\nchromosomes = 29\n\
        map_length_cm = 2900\nbreeding_males = 40\nbreeding_females = 60\nfamily_sizes = [0, 2, 3, 1]\n\
        [life_history]\nage_at_maturity = 3\nadult_life_span = 6\nfecundity_cv = 0.4\n\
        [population.\"Alder Brook\"]\ncensus = 120\n";
    vec![keys.as_bytes().to_vec()]
}

fn programme(bytes: &[u8]) -> Outcome {
    let read = ingest::programme::parse_programme(bytes);
    read.map(drop).map_err(|problems| told(&problems))
}

fn lists() -> Vec<Vec<u8>> {
    let policy = run(["verdict", "--write-policy"]).stdout;
    vec![
        policy,
        b"contig,position,allele,population,selection_coefficient,copies,gene_copies\na,5,C,P,0.01,3,40\n".to_vec(),
    ]
}

/// Settings that are no programme: a policy and a list of alleles, whichever it may be.
fn list(bytes: &[u8]) -> Outcome {
    let policy = parse_policy(bytes)
        .map(drop)
        .map_err(|problems| told(&problems));
    let watched = parse_watched(bytes)
        .map(drop)
        .map_err(|problems| told(&problems));
    policy.or(watched)
}

/// A small survey: the demo, two contigs of it.
pub static SMALL: LazyLock<PathBuf> = LazyLock::new(|| {
    let folder = std::env::temp_dir().join(format!("genewane-fuzz-{}", std::process::id()));
    std::fs::create_dir_all(&folder).expect("a scratch folder");
    let sheet = std::fs::read_to_string(fixture("demo/samples.tsv")).expect("the demo sheet");
    let rows = sheet.lines().enumerate().filter(|(i, _)| i % 6 == 0);
    let rows: Vec<&str> = rows.map(|(_, row)| row).collect();
    std::fs::write(folder.join("sheet.tsv"), rows.join("\n") + "\n").expect("a sheet");
    folder
});

pub fn made(command: &str, name: &str, options: &[&str]) -> Vec<u8> {
    let out = SMALL.join(name);
    let mut arguments = vec![
        command.into(),
        fixture("demo/calls.vcf.gz").into_os_string(),
    ];
    arguments.extend(["--samples".into(), SMALL.join("sheet.tsv").into_os_string()]);
    arguments.extend(["-o".into(), out.as_os_str().to_owned()]);
    arguments.extend(options.iter().map(Into::into));
    let got = run(arguments);
    assert_eq!(got.code, Some(0), "{}", got.stderr);
    std::fs::read(out).expect("an output")
}

pub const OF_A_SURVEY: [&str; 4] = ["--quiet", "--generation-years", "2", "--contigs"];

fn tallies() -> Vec<Vec<u8>> {
    let options = [&OF_A_SURVEY[..], &["fd8"]].concat();
    vec![made("tally", "tally.parquet", &options)]
}

fn tally(bytes: &[u8]) -> Outcome {
    let path = scratch("tally.parquet", bytes);
    let wanted = [("fd8", 1000), ("fd8", 2)].into_iter().collect();
    let counts = TalliedCounts::default().take(&path, &["Quillmere@2020"], &wanted);
    read_tally(&path).map_err(words)?;
    counts.map_err(words)
}

fn documents() -> Vec<Vec<u8>> {
    let options = [&OF_A_SURVEY[..], &["fd8", "--list-losses", "3"]].concat();
    let report = made("measure", "report.json", &options);
    let of_report = |command: &str, more: &[&str]| {
        let mut arguments = vec![command.into(), SMALL.join("report.json").into_os_string()];
        arguments.extend(["--quiet"].iter().chain(more).map(Into::into));
        run(arguments).stdout
    };
    let forecast = of_report("forecast", &["--draws", "20", "--generations", "4"]);
    vec![report, forecast, of_report("verdict", &[])]
}

/// Reads a document, and sets the page of what can be read.
fn document(bytes: &[u8]) -> Outcome {
    let mut companions = Companions::default();
    // The digest that a document names, wherever it stands, so that the check of it is passed.
    let named = serde_json::from_slice::<serde_json::Value>(bytes).ok();
    let digest = named
        .as_ref()
        .and_then(|v| v["provenance"]["inputs"][0]["sha256"].as_str());
    let taken = companions.take(Path::new("d.json"), bytes, digest.unwrap_or("none"));
    let report = parse_report(Path::new("r.json"), bytes).map_err(words);
    match (report, taken) {
        (Ok(report), _) => Page::of(report, &companions, false)
            .html()
            .map(drop)
            .map_err(words),
        (Err(_), Ok(())) => {
            let report = std::fs::read(SMALL.join("report.json")).expect("the report");
            let report = parse_report(Path::new("r.json"), &report).map_err(words)?;
            Page::of(report, &companions, true)
                .html()
                .map(drop)
                .map_err(words)
        }
        (Err(why), Err(_)) => Err(why),
    }
}

pub fn words(error: genewane::Error) -> String {
    error.to_string()
}

fn told(problems: &[genewane::error::Problem]) -> String {
    let all: Vec<String> = problems.iter().map(|p| format!("{p:?}")).collect();
    all.join("\n")
}

/// A file with these bytes, for readers that take paths.
fn scratch(name: &str, bytes: &[u8]) -> PathBuf {
    let path = SMALL.join(name.replace('.', "-mutated."));
    std::fs::write(&path, bytes).expect("a scratch file");
    path
}

/// Damages the payload behind a good checksum as often as the blocks themselves.
pub fn repacked(bytes: Vec<u8>, number: u64) -> Vec<u8> {
    if number.is_multiple_of(2) {
        return bytes;
    }
    let mut text = Vec::new();
    let _ = flate2::read::MultiGzDecoder::new(&bytes[..])
        .take(1 << 16)
        .read_to_end(&mut text);
    let block = 1 + (number as usize * 7) % 900;
    packed(&text, block)
}
