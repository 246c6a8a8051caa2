//! Screening finds what a simulation planted: recaptures, replicates with known error and dropout,
//! families, duplicated loci. The truth comes from `truth.json` of the simulation, which knows
//! nothing of screening.

mod common;

use std::collections::BTreeSet;
use std::path::{Path, PathBuf};

use common::{close, run};
use serde_json::Value;

/// A simulated folder: calls, sheet, truth.
struct Planted {
    _folder: tempfile::TempDir,
    path: PathBuf,
    truth: Value,
}

fn planted(scenario: &str) -> Planted {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("scenario.toml");
    std::fs::write(&file, scenario).unwrap();
    let path = folder.path().join("out");
    genewane::outlook::rehearse::rehearse(&file, &path, None, 2).unwrap();
    let truth = std::fs::read(path.join("truth.json")).unwrap();
    Planted {
        truth: serde_json::from_slice(&truth).unwrap(),
        path,
        _folder: folder,
    }
}

fn screen(calls: &Path, sheet: &Path, options: &[&str]) -> Value {
    let mut arguments: Vec<std::ffi::OsString> = vec!["screen".into(), calls.into()];
    arguments.extend(["--samples".into(), sheet.into()]);
    arguments.extend(options.iter().map(Into::into));
    run(arguments).json()
}

impl Planted {
    fn calls(&self) -> PathBuf {
        self.path.join("calls.vcf.gz")
    }

    fn sheet(&self) -> PathBuf {
        self.path.join("samples.tsv")
    }

    fn screen(&self, options: &[&str]) -> Value {
        screen(&self.calls(), &self.sheet(), options)
    }
}

fn names(list: &Value) -> Vec<String> {
    let text = |v: &Value| v.as_str().unwrap().to_owned();
    list.as_array().unwrap().iter().map(text).collect()
}

/// Unordered pairs of names, from groups of any size.
fn pairs<'a>(groups: impl IntoIterator<Item = &'a Value>) -> BTreeSet<[String; 2]> {
    let mut all = BTreeSet::new();
    for group in groups {
        let names = names(group);
        for (i, a) in names.iter().enumerate() {
            for b in &names[i + 1..] {
                all.insert([a.min(b).clone(), a.max(b).clone()]);
            }
        }
    }
    all
}

fn matched(report: &Value) -> BTreeSet<[String; 2]> {
    pairs(
        report["same_individual"]
            .as_array()
            .unwrap()
            .iter()
            .map(|g| &g["samples"]),
    )
}

const UNLINKED: &str = r#"
[[chromosome]]
name = "u"
length_bp = 90_000_000
unlinked = true
"#;

/// 500 samples of two visits at 100 loci, 40 of them recaptured, 1 % miscalls, 2 % dropout, 3 %
/// missing: all pairs are found and no other.
#[test]
fn every_recapture_is_found_at_100_loci_and_no_false_one() {
    let scenario = format!(
        r#"
seed = 5
{UNLINKED}
[[loci]]
count = 100
frequencies = {{ minor = [0.2, 0.5] }}
[[population]]
name = "Sedge Loch"
size = 600
[[visit]]
generation = 2
individuals = 250
plan = "I"
[[visit]]
generation = 3
individuals = 250
plan = "I"
recaptured = 40
[genotyping]
miscall_rate = 0.005
dropout_rate = 0.02
missing_rate = 0.03
"#
    );
    let planted = planted(&scenario);
    let report = planted.screen(&[]);
    let truth = pairs(planted.truth["recaptures"].as_array().unwrap());
    assert_eq!(truth.len(), 40);
    assert_eq!(matched(&report), truth);
    for group in report["same_individual"].as_array().unwrap() {
        assert_eq!(group["kind"], "between_visits");
    }
    // A recaptured animal belongs to both visits: kept in both, and said.
    let odd: Vec<_> = report["samples"].as_array().unwrap().iter().collect();
    assert!(odd.iter().all(|sample| sample["use"] == true));
    assert_eq!(report["strata"][0]["tells"], "full_sibs");
}

/// 60 replicates with 2 % miscalls and 5 % dropout a gene copy: both rates inside their intervals.
#[test]
fn error_and_dropout_of_replicates_are_inside_their_intervals() {
    let scenario = format!(
        r#"
seed = 8
{UNLINKED}
[[loci]]
count = 400
frequencies = {{ minor = [0.02, 0.5] }}
[[population]]
name = "Sedge Loch"
size = 200
[[visit]]
generation = 1
individuals = 120
replicates = 60
[genotyping]
miscall_rate = 0.02
dropout_rate = 0.05
"#
    );
    let planted = planted(&scenario);
    let report = planted.screen(&[]);
    let checks = report["replicates"].as_array().unwrap();
    assert_eq!(checks.len(), 60);
    assert!(checks.iter().all(|check| check["matches"] == true));
    let quality = &report["genotyping"][0];
    assert_eq!(
        (&quality["from"], &quality["pairs"]),
        (&"declared_replicates".into(), &60.into())
    );
    for (name, truth) in [("error_rate", 0.02), ("dropout_rate", 0.05)] {
        let rate = &quality[name];
        let limits = [&rate["interval"][0], &rate["interval"][1]].map(|v| v.as_f64().unwrap());
        assert!(limits[0] <= truth && truth <= limits[1], "{name}: {rate}");
        assert!(
            limits[1] - limits[0] < truth,
            "{name} says too little: {rate}"
        );
    }
    // Replicates are read here, and left out by the cleaned sheet.
    let replicates = report["samples"].as_array().unwrap().iter();
    let left_out = replicates.filter(|sample| sample["use"] == false).count();
    assert_eq!(left_out, 60);
}

/// Four families of three full sibs among 60 juveniles at 2000 loci: every pair is of the first
/// degree, and the families are found.
#[test]
fn full_sibs_are_found_at_2000_loci() {
    let scenario = r#"
seed = 3
[[chromosome]]
name = "c"
length_bp = 50_000_000
copies = 20
[[loci]]
count = 2000
frequencies = { minor = [0.1, 0.5] }
[[population]]
name = "Sedge Loch"
size = 400
[[visit]]
generation = 1
individuals = 60
full_sib_families = 4
full_sib_family_size = 3
[genotyping]
miscall_rate = 0.002
"#;
    let planted = planted(scenario);
    let report = planted.screen(&[]);
    let families = report["families"]["families"].as_array().unwrap();
    let found = pairs(families.iter().map(|f| &f["samples"]));
    let truth = pairs(planted.truth["full_siblings"].as_array().unwrap());
    assert_eq!(truth.len(), 12);
    assert!(
        truth.is_subset(&found),
        "missed {:?}",
        truth.difference(&found)
    );
    // What else is found are sibs by chance among 400 parents: few.
    assert!(found.len() <= 16, "{found:?}");
    let first: Vec<&Value> = report["relatives"]["pairs"]
        .as_array()
        .unwrap()
        .iter()
        .filter(|pair| truth.contains(&sorted(names(&pair["samples"]))))
        .collect();
    assert_eq!(first.len(), 12);
    for pair in first {
        close(
            "kinship of full sibs",
            pair["kinship"].as_f64().unwrap(),
            0.25,
            0.08,
        );
        assert_eq!(
            (&pair["class"], &pair["likely"]),
            (&"first".into(), &"full_sibs".into())
        );
        assert!(pair["standard_error"].as_f64().unwrap() < 0.05);
    }
    let effect = &report["families"]["effect"][0];
    assert_eq!(effect["whole"]["individuals"], 60);
    let thinned = effect["one_each"]["individuals"].as_u64().unwrap();
    assert!(thinned <= 52);
    let size = |which: &str| effect[which]["estimate"].as_f64().unwrap_or(f64::INFINITY);
    assert!(
        size("one_each") > size("whole"),
        "families raise linkage: {effect}"
    );
}

fn sorted(mut names: Vec<String>) -> [String; 2] {
    names.sort();
    names.try_into().unwrap()
}

/// 20 duplicated loci among 400 are told by their heterozygotes, and few others with them.
#[test]
fn duplicated_loci_are_told() {
    let scenario = format!(
        r#"
seed = 11
{UNLINKED}
[[loci]]
count = 380
frequencies = {{ minor = [0.1, 0.5] }}
[[loci]]
count = 20
frequencies = {{ minor = [0.3, 0.5] }}
duplicated = true
[[population]]
name = "Sedge Loch"
size = 300
[[visit]]
generation = 1
individuals = 100
[[visit]]
generation = 3
individuals = 100
"#
    );
    let report = planted(&scenario).screen(&[]);
    let odd = &report["odd_heterozygotes"];
    let loci = odd["loci"].as_array().unwrap();
    let duplicated = loci.iter().filter(|locus| locus["duplicated_like"] == true);
    assert!((18..=21).contains(&duplicated.count()), "{odd}");
    assert!(loci.len() <= 25);
}

#[test]
fn the_same_bytes_for_any_number_of_threads() {
    let demo = |name: &str| common::fixture(&format!("demo/{name}"));
    let with = |threads: &str| {
        screen(
            &demo("calls.vcf.gz"),
            &demo("samples.tsv"),
            &["--threads", threads],
        )
    };
    let one = with("1");
    assert_eq!(one, with("2"));
    assert_eq!(one, with("7"));
}

/// The report keeps to its schema, as a validator written elsewhere reads it.
#[test]
fn the_report_keeps_to_its_schema() {
    let schema = run(["schema", "screen"]).json();
    let validator = jsonschema::draft202012::new(&schema).unwrap();
    let demo = |name: &str| common::fixture(&format!("demo/{name}"));
    let report = screen(&demo("calls.vcf.gz"), &demo("samples.tsv"), &[]);
    let faults: Vec<String> = validator
        .iter_errors(&report)
        .map(|e| e.to_string())
        .collect();
    assert!(faults.is_empty(), "{faults:?}");
}

const CALLS: &str = "##fileformat=VCFv4.3\n##contig=<ID=1>\n\
    ##FORMAT=<ID=GT,Number=1,Type=String,Description=\"Genotype\">\n\
    #CHROM\tPOS\tID\tREF\tALT\tQUAL\tFILTER\tINFO\tFORMAT\ta1\ta2\ta3\ta4\ta5\ta6\n";

/// The columns `use` and `why` stand behind all that was there, and measure heeds them.
#[test]
fn the_cleaned_sheet_keeps_everything_and_is_heeded() {
    let folder = tempfile::tempdir().unwrap();
    let file = |name: &str| folder.path().join(name);
    // a4 repeats a3 under another name; a6 has no genotype at all.
    let mut calls = CALLS.to_owned();
    for (l, position) in (0..60usize).zip((100..).step_by(100)) {
        let mixed = |i: usize| (l * 31 + i * 17 + 7).wrapping_mul(0x9e37_79b9) >> 7;
        let genotype = |i: usize| ["0/0", "0/1", "1/1"][mixed(i) % 3];
        let own: Vec<&str> = [0, 1, 2, 2, 4].map(genotype).to_vec();
        calls += &format!(
            "1\t{position}\t.\tA\tC\t.\t.\t.\tGT\t{}\t./.\n",
            own.join("\t")
        );
    }
    std::fs::write(file("calls.vcf"), calls).unwrap();
    let sheet = "sample,tag,population,year,use\n\
        a1,red,Alder,2003,\na2,blue,Alder,2003,no\na3,,Alder,2003,\na4,,Alder,2003,\n\
        a5,,Alder,2003,\na6,,Alder,2003,\n";
    std::fs::write(file("sheet.csv"), sheet).unwrap();
    let clean = file("clean.tsv");
    let report = screen(
        &file("calls.vcf"),
        &file("sheet.csv"),
        &["--write-sheet", clean.to_str().unwrap()],
    );
    let group = &report["same_individual"][0];
    assert_eq!(
        (names(&group["samples"]), &group["kind"]),
        (vec!["a3".into(), "a4".into()], &"within_visit".into())
    );
    let text = std::fs::read_to_string(&clean).unwrap();
    let expected = "sample\ttag\tpopulation\tyear\tuse\twhy\n\
        a1\tred\tAlder\t2003\tyes\t\na2\tblue\tAlder\t2003\tno\t\n\
        a3\t\tAlder\t2003\tyes\tsame individual as a4 (0 of 60 loci differ)\n\
        a4\t\tAlder\t2003\tno\tsame individual as a3 (0 of 60 loci differ)\n\
        a5\t\tAlder\t2003\tyes\t\na6\t\tAlder\t2003\tno\tno genotype\n";
    assert_eq!(text, expected);
    let measured = common::measure(&file("calls.vcf"), &clean, &[]);
    assert_eq!(measured["samples"]["used"], 3);
    let warnings = measured["warnings"].as_array().unwrap();
    let told = warnings
        .iter()
        .find(|w| w["code"] == "rows_not_used")
        .unwrap();
    assert!(
        told["text"].as_str().unwrap().starts_with("3 row(s)"),
        "{told}"
    );
    assert!(
        measured["samples"]["not_listed"]
            .as_array()
            .unwrap()
            .is_empty()
    );
}
