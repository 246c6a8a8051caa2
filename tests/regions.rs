//! `--region` and `--regions-bed`: with an index and without, the report is that of calls which hold nothing
//! else.

mod common;

use std::fs;
use std::io::{Read, Write};
use std::path::{Path, PathBuf};
use std::time::{Duration, SystemTime};

use common::{Case, Run, fixture, run};
use noodles_bgzf as bgzf;
use noodles_core::Position;
use noodles_csi::{self as csi, binning_index::index::reference_sequence::bin::Chunk};
use noodles_vcf::variant::io::Write as _;
use serde_json::Value;

/// The calls of the demo as text.
fn text() -> String {
    let packed = fs::read(fixture("demo/calls.vcf.gz")).expect("the demo calls");
    let mut text = String::new();
    let mut decoder = flate2::read::MultiGzDecoder::new(packed.as_slice());
    decoder.read_to_string(&mut text).expect("text");
    text
}

/// Contig and position of a line.
fn place(line: &str) -> (&str, u64) {
    let mut cells = line.split('\t');
    let contig = cells.next().expect("a contig");
    (
        contig,
        cells.next().expect("a position").parse().expect("a number"),
    )
}

impl Case {
    /// Writes BGZF text of many small blocks with an index by another library; `csi` or `tbi`.
    fn indexed_text(&self, name: &str, ending: &str) -> PathBuf {
        let path = self.path(name);
        let mut writer = bgzf::io::Writer::new(Vec::new());
        let names: Vec<String> = contigs();
        let header = csi::binning_index::index::header::Builder::vcf().build();
        let mut tabix = noodles_tabix::index::Indexer::default();
        tabix.set_header(header);
        let mut by_number = Indexer::default();
        for (i, line) in text().lines().enumerate() {
            let start = writer.virtual_position();
            writeln!(writer, "{line}").unwrap();
            if i % 7 == 0 {
                writer.flush().unwrap();
            }
            if line.starts_with('#') {
                continue;
            }
            let chunk = Chunk::new(start, writer.virtual_position());
            let (contig, at) = place(line);
            let at = Position::try_from(at as usize).unwrap();
            tabix.add_record(contig, at, at, chunk).unwrap();
            let number = names.iter().position(|n| n == contig).unwrap();
            by_number
                .add_record(Some((number, at, at, true)), chunk)
                .unwrap();
        }
        fs::write(&path, writer.finish().unwrap()).unwrap();
        let index = with_ending(&path, ending);
        match ending {
            "tbi" => noodles_tabix::fs::write(index, &tabix.build()).unwrap(),
            // Without names, as for binary calls: numbers are those of the header.
            _ => csi::fs::write(index, &by_number.build(names.len())).unwrap(),
        }
        path
    }

    /// The same as BCF, by another library.
    fn indexed_binary(&self, name: &str) -> PathBuf {
        let path = self.path(name);
        let text = text();
        let mut reader = noodles_vcf::io::Reader::new(text.as_bytes());
        let header = reader.read_header().unwrap();
        let mut writer = noodles_bcf::io::Writer::from(bgzf::io::Writer::new(Vec::new()));
        writer.write_header(&header).unwrap();
        let names = contigs();
        let mut indexer = Indexer::default();
        for (i, record) in reader.record_bufs(&header).enumerate() {
            let record = record.unwrap();
            let start = writer.get_ref().virtual_position();
            writer.write_variant_record(&header, &record).unwrap();
            if i % 5 == 0 {
                writer.get_mut().flush().unwrap();
            }
            let chunk = Chunk::new(start, writer.get_ref().virtual_position());
            let contig = record.reference_sequence_name();
            let number = names.iter().position(|n| n == contig).unwrap();
            let at = record.variant_start().unwrap();
            indexer
                .add_record(Some((number, at, at, true)), chunk)
                .unwrap();
        }
        fs::write(&path, writer.into_inner().finish().unwrap()).unwrap();
        csi::fs::write(with_ending(&path, "csi"), &indexer.build(names.len())).unwrap();
        path
    }

    /// Plain text with the records that `keep` says.
    fn cut(&self, keep: impl Fn(&str, u64) -> bool) -> PathBuf {
        let path = self.path("cut.vcf");
        let kept = |line: &&str| {
            line.starts_with('#') || {
                let (contig, at) = place(line);
                keep(contig, at)
            }
        };
        let text = text();
        let lines: Vec<&str> = text.lines().filter(kept).collect();
        fs::write(&path, lines.join("\n") + "\n").unwrap();
        path
    }
}

type Indexer =
    csi::binning_index::Indexer<csi::binning_index::index::reference_sequence::index::BinnedIndex>;

fn with_ending(path: &Path, ending: &str) -> PathBuf {
    PathBuf::from(format!("{}.{ending}", path.display()))
}

/// Contigs in the order of the header.
fn contigs() -> Vec<String> {
    text()
        .lines()
        .filter_map(|line| line.strip_prefix("##contig=<ID="))
        .map(|rest| rest.split([',', '>']).next().unwrap().to_owned())
        .collect()
}

fn measure(calls: &Path, options: &[&str]) -> Run {
    let mut arguments = vec!["measure".into(), calls.as_os_str().to_owned()];
    arguments.extend([
        "--samples".into(),
        fixture("demo/samples.tsv").into_os_string(),
    ]);
    arguments.extend(["--generation-years", "2", "--quiet"].map(Into::into));
    arguments.extend(options.iter().map(Into::into));
    run(arguments)
}

/// What does not depend on how the calls came in.
fn content(report: Value) -> Value {
    let mut report = common::without_provenance(report);
    let warnings = report["warnings"].as_array_mut().expect("a list");
    warnings.retain(|w| w["place"] != "calls" && w["code"] != "calls");
    report
}

#[test]
fn regions_give_the_report_of_calls_that_hold_nothing_else() {
    let case = Case::empty();
    let tbi = case.indexed_text("tbi.vcf.gz", "tbi");
    let csi = case.indexed_text("csi.vcf.gz", "csi");
    let bcf = case.indexed_binary("calls.bcf");
    let whole = case.path("bare.vcf.gz");
    fs::copy(&tbi, &whole).unwrap();
    let all = contigs();
    let (first, third) = (all[0].as_str(), all[2].as_str());
    let text = text();
    let of_third: Vec<u64> = text
        .lines()
        .filter(|l| !l.starts_with('#') && place(l).0 == third)
        .map(|l| place(l).1)
        .collect();
    let (from, to) = (of_third[3], of_third[of_third.len() - 4]);
    let range = format!("{third}:{from}-{to}");
    let tail = format!("{third}:{}-", from + 1);
    let bed = case.path("regions.bed");
    fs::write(
        &bed,
        format!("{third}\t{}\t{to}\n{first}\t0\t900000000\n", from - 1),
    )
    .unwrap();
    let bed = bed.to_str().unwrap();

    let of_range = |c: &str, at: u64| c == third && (from..=to).contains(&at);
    let of_tail = |c: &str, at: u64| c == third && at > from;
    let of_bed = |c: &str, at: u64| c == first || of_range(c, at);
    type Keep<'a> = &'a dyn Fn(&str, u64) -> bool;
    let cases: [(&[&str], Keep); 4] = [
        (&["--region", first], &|c, _| c == first),
        (&["--region", &range], &of_range),
        (&["--region", &tail], &of_tail),
        (&["--regions-bed", bed], &of_bed),
    ];
    for (options, keep) in cases {
        let wanted = content(measure(&case.cut(keep), &[]).json());
        for calls in [&tbi, &csi, &bcf, &whole] {
            let got = measure(calls, options).json();
            let bytes = got["provenance"]["inputs"]
                .as_array()
                .and_then(|inputs| inputs.iter().find(|i| i["role"] == "calls"))
                .and_then(|input| input["bytes"].as_u64())
                .unwrap();
            let size = fs::metadata(calls).unwrap().len();
            // Only what the index says is read.
            assert_eq!(bytes < size, calls != &whole, "{bytes} of {size}");
            let told = got["warnings"].to_string().contains("no index");
            assert_eq!(told, calls == &whole);
            assert_eq!(content(got), wanted, "{options:?} of {}", calls.display());
        }
    }
}

/// Every contig by itself: tallies of regions add up to the report of the whole.
#[test]
fn tallies_of_regions_add_up() {
    let case = Case::empty();
    let calls = case.indexed_text("calls.vcf.gz", "csi");
    let mut shards = Vec::new();
    for contig in contigs() {
        let out = case.path(&format!("{contig}.parquet"));
        let mut arguments = vec!["tally".into(), calls.as_os_str().to_owned()];
        arguments.extend([
            "--samples".into(),
            fixture("demo/samples.tsv").into_os_string(),
        ]);
        arguments
            .extend(["--generation-years", "2", "--quiet", "--region", &contig].map(Into::into));
        arguments.extend(["-o".into(), out.as_os_str().to_owned()]);
        let got = run(arguments);
        assert_eq!(got.code, Some(0), "{}", got.stderr);
        shards.push(out);
    }
    let mut arguments = vec!["measure".into()];
    arguments.extend(shards.iter().map(|s| s.as_os_str().to_owned()));
    arguments.extend([
        "--samples".into(),
        fixture("demo/samples.tsv").into_os_string(),
    ]);
    arguments.extend(["--generation-years", "2", "--quiet"].map(Into::into));
    let added = run(arguments).json();
    // Records elsewhere are as if they were not in the file, so even the accounting is that of the whole.
    assert_eq!(content(added), content(measure(&calls, &[]).json()));
}

#[test]
fn indexes_that_cannot_be_trusted_are_told() {
    let case = Case::empty();
    let calls = case.indexed_text("calls.vcf.gz", "tbi");
    let index = with_ending(&calls, "tbi");
    let contig = contigs()[1].clone();
    let region = ["--region", contig.as_str()];
    let wanted = content(measure(&calls, &region).json());

    // Older than the calls: not used, and told; the numbers are the same.
    let old = SystemTime::now() - Duration::from_secs(3600);
    fs::File::options()
        .write(true)
        .open(&index)
        .unwrap()
        .set_modified(old)
        .unwrap();
    let got = measure(&calls, &region).json();
    assert!(got["warnings"].to_string().contains("older than the calls"));
    assert_eq!(content(got), wanted);

    // Of other calls: whether its places are inside of records or of blocks, the run stops.
    let whole = fs::read(&index).unwrap();
    let other = case.indexed_text("other.vcf.gz", "tbi");
    let text = text();
    let mut writer = bgzf::io::Writer::new(Vec::new());
    writer
        .write_all(
            text.replace("##contig", "##note=moved\n##contig")
                .as_bytes(),
        )
        .unwrap();
    fs::write(&other, writer.finish().unwrap()).unwrap();
    fs::write(with_ending(&other, "tbi"), &whole).unwrap();
    let got = measure(&other, &region);
    assert_eq!(got.code, Some(1), "{}", got.stderr);
    assert!(got.stdout.is_empty());

    // Damaged.
    fs::write(&index, &whole[..whole.len() / 2]).unwrap();
    let got = measure(&calls, &region);
    assert_eq!(got.code, Some(1));
    assert!(got.stderr.contains("calls.vcf.gz.tbi"), "{}", got.stderr);
    assert!(
        got.stderr.contains("make the index again"),
        "{}",
        got.stderr
    );
    fs::write(&index, &whole).unwrap();

    // Calls that lost their end, far behind the region.
    let bytes = fs::read(&calls).unwrap();
    fs::write(&calls, &bytes[..bytes.len() - 28]).unwrap();
    fs::write(&index, &whole).unwrap();
    let got = measure(&calls, &region);
    assert_eq!(got.code, Some(1));
    assert!(got.stderr.contains("end-of-file marker"), "{}", got.stderr);
}

#[test]
fn wrong_regions_are_told() {
    let case = Case::empty();
    let calls = case.indexed_text("calls.vcf.gz", "tbi");
    let refused = |options: &[&str], parts: &[&str]| {
        let got = measure(&calls, options);
        assert_eq!(got.code, Some(2), "{}", got.stderr);
        for part in parts {
            assert!(got.stderr.contains(part), "no {part:?} in {}", got.stderr);
        }
    };
    let contig = contigs()[0].clone();
    refused(
        &["--region", &format!("{contig}x")],
        &["did you mean", &contig],
    );
    refused(&["--region", &format!("{contig}:9-5")], &["is empty"]);
    let bed = case.path("wrong.bed");
    fs::write(&bed, format!("{contig}\t5\t9\n{contig}\t9\t5\n{contig}\n")).unwrap();
    refused(
        &["--regions-bed", bed.to_str().unwrap()],
        &["row 2", "row 3", "2 problem(s)"],
    );
    // A region without a record leaves nothing to report.
    let got = measure(&calls, &["--region", &format!("{contig}:1-1")]);
    assert_eq!(got.code, Some(1), "{}", got.stderr);
}
