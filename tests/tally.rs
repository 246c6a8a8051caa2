//! Shards counted one by one add up to what the whole gives; what does not fit together is told.

mod common;

use std::path::{Path, PathBuf};

use common::{Run, fixture, genewane, run, without_provenance};
use genewane::ingest::sheet::parse_sheet;
use genewane::model::match_samples;
use genewane::report::tally::{TallyRows, read_tally};
use serde_json::Value;

/// The demo calls as text, cut into one file a contig; the cuts' names.
fn shards(folder: &Path) -> Vec<PathBuf> {
    let packed = std::fs::read(fixture("demo/calls.vcf.gz")).expect("the demo calls");
    let mut text = String::new();
    let mut decoder = flate2::read::MultiGzDecoder::new(packed.as_slice());
    std::io::Read::read_to_string(&mut decoder, &mut text).expect("text");
    let header: String = text
        .lines()
        .filter(|l| l.starts_with('#'))
        .map(|l| format!("{l}\n"))
        .collect();
    let mut contigs: Vec<(String, String)> = Vec::new();
    for line in text.lines().filter(|l| !l.starts_with('#')) {
        let contig = line.split('\t').next().expect("a contig");
        if contigs.last().is_none_or(|(name, _)| name != contig) {
            contigs.push((contig.to_owned(), header.clone()));
        }
        let (_, shard) = contigs.last_mut().expect("a shard");
        *shard += &format!("{line}\n");
    }
    contigs
        .into_iter()
        .map(|(name, text)| {
            let path = folder.join(format!("{name}.vcf"));
            std::fs::write(&path, text).expect("a scratch file");
            path
        })
        .collect()
}

fn sheet() -> PathBuf {
    fixture("demo/samples.tsv")
}

fn tally(calls: &Path, sheet: &Path, options: &[&str]) -> (PathBuf, Run) {
    let path = calls.with_extension("parquet");
    let mut command = genewane();
    command.arg("tally").arg(calls).arg("--samples").arg(sheet);
    command
        .args(["--generation-years", "2", "-o"])
        .arg(&path)
        .args(options);
    (
        path,
        common::finish(command.output().expect("the built program starts")),
    )
}

fn measure(inputs: &[PathBuf], options: &[&str]) -> Run {
    let mut command = genewane();
    command
        .arg("measure")
        .args(inputs)
        .arg("--samples")
        .arg(sheet());
    command
        .args(["--generation-years", "2", "--quiet"])
        .args(options);
    common::finish(command.output().expect("the built program starts"))
}

fn tallies(folder: &Path) -> Vec<PathBuf> {
    shards(folder)
        .iter()
        .map(|shard| {
            let (path, done) = tally(shard, &sheet(), &[]);
            assert_eq!(done.code, Some(0), "{}", done.stderr);
            path
        })
        .collect()
}

/// Everything but the names of the inputs and the arguments.
fn body(run: &Run) -> Value {
    without_provenance(run.json())
}

#[test]
fn tallies_of_contigs_add_up_to_the_report_of_the_whole() {
    let folder = tempfile::tempdir().expect("a scratch folder");
    let mut parts = tallies(folder.path());
    let whole = body(&measure(&[fixture("demo/calls.vcf.gz")], &[]));
    assert_eq!(body(&measure(&parts, &[])), whole);
    parts.reverse();
    parts.swap(1, 4);
    assert_eq!(body(&measure(&parts, &["--threads", "1"])), whole);
}

#[test]
fn a_report_of_tallies_names_the_calls_behind_them() {
    let folder = tempfile::tempdir().expect("a scratch folder");
    let calls = shards(folder.path());
    let parts = tallies(folder.path());
    let of_tallies = measure(&parts, &[]).json();
    let of_calls = measure(&calls, &[]).json();
    assert_eq!(
        of_tallies["provenance"]["inputs"],
        of_calls["provenance"]["inputs"]
    );
    assert_eq!(
        of_tallies["provenance"]["settings"],
        of_calls["provenance"]["settings"]
    );
}

/// Cut anywhere, not only between contigs: integers do not mind.
#[test]
fn shards_cut_inside_a_contig_add_up_too() {
    let folder = tempfile::tempdir().expect("a scratch folder");
    let calls = shards(folder.path());
    let text = std::fs::read_to_string(&calls[0]).expect("a shard");
    let header: String = text
        .lines()
        .filter(|l| l.starts_with('#'))
        .map(|l| format!("{l}\n"))
        .collect();
    let records: Vec<&str> = text.lines().filter(|l| !l.starts_with('#')).collect();
    let mut parts = Vec::new();
    for (i, lines) in records.chunks(17).enumerate() {
        let path = folder.path().join(format!("cut{i}.vcf"));
        std::fs::write(&path, header.clone() + &lines.join("\n") + "\n").expect("a scratch file");
        parts.push(tally(&path, &sheet(), &[]).0);
    }
    assert_eq!(
        body(&measure(&parts, &[])),
        body(&measure(&calls[..1], &[]))
    );
}

#[test]
fn the_same_input_makes_the_same_tally_on_any_number_of_threads() {
    let folder = tempfile::tempdir().expect("a scratch folder");
    let calls = shards(folder.path());
    let (path, _) = tally(&calls[0], &sheet(), &["--threads", "1"]);
    let one = std::fs::read(&path).expect("a tally");
    let (path, _) = tally(&calls[0], &sheet(), &["--threads", "4"]);
    assert_eq!(one, std::fs::read(path).expect("a tally"));
}

#[test]
fn what_does_not_fit_together_is_told() {
    let folder = tempfile::tempdir().expect("a scratch folder");
    let calls = shards(folder.path());
    let parts: Vec<PathBuf> = calls[..2]
        .iter()
        .map(|c| tally(c, &sheet(), &[]).0)
        .collect();
    let refused = |inputs: &[PathBuf], options: &[&str], words: &[&str]| {
        let run = measure(inputs, options);
        assert_ne!(run.code, Some(0));
        for word in words {
            assert!(run.stderr.contains(word), "{word}: {}", run.stderr);
        }
    };
    refused(
        &parts,
        &["--gene-copies", "10"],
        &["gene_copies", "10 here", "cure"],
    );
    refused(&parts, &["--baseline", "2012"], &["baseline"]);
    refused(&parts, &["--snv-only"], &["genewane tally"]);
    refused(&[parts[0].clone(), calls[1].clone()], &[], &["is no tally"]);
    let again = folder.path().join("again.parquet");
    std::fs::copy(&parts[0], &again).expect("a copy");
    refused(
        &[parts[0].clone(), again],
        &[],
        &["lie among those of", "once"],
    );
    // Another sheet: one animal less.
    let text = std::fs::read_to_string(sheet()).expect("the sheet");
    let fewer: Vec<&str> = text.lines().take(text.lines().count() - 1).collect();
    let list = folder.path().join("fewer.tsv");
    std::fs::write(&list, fewer.join("\n") + "\n").expect("a scratch file");
    let (odd, _) = tally(&calls[1], &list, &[]);
    refused(&[parts[0].clone(), odd], &[], &["30 listed", "29 tallied"]);
}

/// A tally cut short or with any byte changed in its footer's texts is refused, never measured.
#[test]
fn damage_is_noticed() {
    let folder = tempfile::tempdir().expect("a scratch folder");
    let calls = shards(folder.path());
    let (path, _) = tally(&calls[7], &sheet(), &[]);
    let whole = std::fs::read(&path).expect("a tally");
    let bad = folder.path().join("bad.parquet");
    for cut in [4, 5, 100, whole.len() / 2, whole.len() - 9, whole.len() - 1] {
        std::fs::write(&bad, &whole[..cut]).expect("a scratch file");
        let run = measure(std::slice::from_ref(&bad), &[]);
        assert_eq!(run.code, Some(1), "cut at {cut}: {}", run.stderr);
    }
    // The sums fill the last part of the file: flip one bit at every 997th byte of it.
    for at in (whole.len() / 2..whole.len() - 8).step_by(997) {
        let mut spoilt = whole.clone();
        spoilt[at] ^= 4;
        std::fs::write(&bad, &spoilt).expect("a scratch file");
        let run = measure(std::slice::from_ref(&bad), &[]);
        assert_ne!(run.code, Some(0), "bit of byte {at} went unnoticed");
        assert_ne!(run.code, Some(101), "byte {at}: {}", run.stderr);
    }
}

/// A checksum holds for whatever was written: sums that no calls make are refused all the same.
#[test]
fn sums_that_cannot_be_added_up_are_told() {
    let folder = tempfile::tempdir().expect("a scratch folder");
    let calls = shards(folder.path());
    let (path, _) = tally(&calls[0], &sheet(), &[]);
    let (header, mut state) = read_tally(&path).expect("a tally");
    let rows = std::fs::read(sheet()).expect("the sheet");
    let (rows, _) = parse_sheet(&rows).expect("rows");
    let matched = match_samples(&header.samples_in_calls, &rows, false).expect("strata");
    // The sums end with two numbers of seven bits a byte: records kept, and how many of them vary.
    for _ in 0..2 {
        state.pop();
        while state.last().is_some_and(|byte| byte & 0x80 != 0) {
            state.pop();
        }
    }
    let most = [[0xff; 9].as_slice(), &[1]].concat(); // 2^64 - 1
    state.extend([most.clone(), most].concat());
    TallyRows::create(&path, &matched.strata)
        .and_then(|rows| rows.finish(&path, header, &state))
        .expect("a tally");
    let run = measure(&[path], &[]);
    assert_eq!(run.code, Some(1), "{}", run.stderr);
    for word in ["larger than loci", "make the tally again"] {
        assert!(run.stderr.contains(word), "{}", run.stderr);
    }
    assert!(!run.stderr.contains("panicked"), "{}", run.stderr);
}

#[test]
fn the_header_follows_its_schema() {
    let folder = tempfile::tempdir().expect("a scratch folder");
    let calls = shards(folder.path());
    let (path, _) = tally(&calls[0], &sheet(), &[]);
    let (header, _) = genewane::report::tally::read_tally(&path).expect("a tally");
    let schema = run(["schema", "tally"]).json();
    let validator = jsonschema::draft202012::new(&schema).expect("a sound schema");
    assert!(validator.is_valid(&serde_json::to_value(header).expect("JSON")));
}
