//! The built program from outside: exit codes, messages, files left behind, bytes, schema.
//!
//! 0 done; 1 the work failed (I/O, broken calls); 2 usage or an invalid sheet; 3 a breach.

mod common;

use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::Stdio;

use common::{Run, fixture, measure_run, run};

/// A folder of its own for one test, with a small sound pair of calls and sheet to spoil.
struct Case {
    folder: tempfile::TempDir,
}

const HEADER: &str = "##fileformat=VCFv4.3\n\
    ##contig=<ID=reed_1,length=1000>\n\
    ##FORMAT=<ID=GT,Number=1,Type=String,Description=\"Genotype\">\n";
const COLUMNS: &str = "#CHROM\tPOS\tID\tREF\tALT\tQUAL\tFILTER\tINFO";
const RECORDS: [&str; 3] = [
    "reed_1\t10\t.\tA\tG\t.\t.\t.\tGT\t0/1\t0/0\t1/1\t0/1",
    "reed_1\t20\t.\tC\tT,G\t.\t.\t.\tGT\t0/2\t1/1\t0/1\t2/2",
    "reed_1\t30\t.\tG\tA\t.\t.\t.\tGT\t0/0\t0/1\t./.\t0/1",
];
const SHEET: &str = "sample,population,year\n\
    otter_1,Withy,2011\notter_2,Withy,2011\notter_3,Withy,2019\notter_4,Withy,2019\n";

impl Case {
    fn new() -> Self {
        let case = Case {
            folder: tempfile::tempdir().expect("a scratch folder"),
        };
        case.calls(&sound_calls());
        case.sheet(SHEET);
        case
    }

    fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    fn calls(&self, text: &str) {
        std::fs::write(self.path("calls.vcf"), text).expect("a scratch file");
    }

    fn sheet(&self, text: &str) {
        std::fs::write(self.path("sheet.csv"), text).expect("a scratch file");
    }

    fn files(&self) -> Vec<String> {
        let mut names: Vec<String> = std::fs::read_dir(self.folder.path())
            .expect("the scratch folder")
            .map(|entry| {
                entry
                    .expect("an entry")
                    .file_name()
                    .to_string_lossy()
                    .into_owned()
            })
            .collect();
        names.sort();
        names
    }

    fn measure(&self, options: &[&str]) -> Run {
        measure_run(&self.path("calls.vcf"), &self.path("sheet.csv"), options)
    }

    /// Runs with an output file, and asserts the exit code, that every `part` is in the message,
    /// that the message is no panic, and that no output of any name is left behind.
    #[track_caller]
    fn fails(&self, code: i32, parts: &[&str]) {
        let before = self.files();
        let report = self.path("report.json").to_string_lossy().into_owned();
        let got = self.measure(&["-o", &report, "--quiet"]);
        assert_eq!(
            got.code,
            Some(code),
            "exit code; the message was:\n{}",
            got.stderr
        );
        assert!(got.stdout.is_empty(), "words belong on stderr");
        assert!(!got.stderr.contains("panicked"), "{}", got.stderr);
        for part in parts {
            assert!(
                got.stderr.contains(part),
                "no {part:?} in the message:\n{}",
                got.stderr
            );
        }
        assert_eq!(self.files(), before, "a failed run leaves nothing");
    }
}

fn calls_of(records: &[&str]) -> String {
    let samples = "\tFORMAT\totter_1\totter_2\totter_3\totter_4\n";
    format!("{HEADER}{COLUMNS}{samples}{}\n", records.join("\n"))
}

fn sound_calls() -> String {
    calls_of(&RECORDS)
}

fn path_text(path: &Path) -> String {
    path.to_string_lossy().into_owned()
}

// The sound case: without it every failure below could be one for the wrong reason.

#[test]
fn a_sound_input_gives_a_report_and_nothing_else() {
    let case = Case::new();
    let report = path_text(&case.path("report.json"));
    let got = case.measure(&["-o", &report, "--quiet"]);
    assert_eq!((got.code, got.stderr.as_str()), (Some(0), ""));
    assert!(got.stdout.is_empty());
    assert_eq!(case.files(), ["calls.vcf", "report.json", "sheet.csv"]);
    let file = std::fs::read(case.path("report.json")).expect("the report");
    let printed = case.measure(&["--quiet"]);
    assert_eq!(common::without_provenance(printed.json()), {
        let value = serde_json::from_slice(&file).expect("the file is JSON");
        common::without_provenance(value)
    });
}

// Sheets: exit code 2, with the row.

#[test]
fn a_sample_that_the_calls_do_not_have() {
    let case = Case::new();
    case.sheet(&SHEET.replace("otter_3", "stoat_3"));
    case.fails(2, &["sheet.csv", "row 4", "stoat_3"]);
}

#[test]
fn a_sample_listed_twice() {
    let case = Case::new();
    case.sheet(&SHEET.replace("otter_4", "otter_1"));
    case.fails(2, &["sheet.csv", "row 5", "otter_1"]);
}

#[test]
fn a_year_that_is_no_number() {
    let case = Case::new();
    case.sheet(&SHEET.replace("otter_2,Withy,2011", "otter_2,Withy,last spring"));
    case.fails(2, &["sheet.csv", "row 3", "last spring"]);
}

#[test]
fn a_blank_year() {
    let case = Case::new();
    case.sheet(&SHEET.replace("otter_2,Withy,2011", "otter_2,Withy,"));
    case.fails(2, &["sheet.csv", "row 3", "year"]);
}

#[test]
fn a_sheet_without_a_required_column() {
    let case = Case::new();
    case.sheet(&SHEET.replace("population", "pond"));
    case.fails(2, &["sheet.csv", "population"]);
}

#[test]
fn an_empty_sheet() {
    let case = Case::new();
    case.sheet("");
    case.fails(2, &["sheet.csv"]);
}

#[test]
fn a_sheet_with_a_header_alone() {
    let case = Case::new();
    case.sheet("sample,population,year\n");
    case.fails(2, &["sheet.csv"]);
}

#[test]
fn all_problems_of_a_sheet_are_told_at_once() {
    let case = Case::new();
    let spoilt = SHEET.replace("otter_2,Withy,2011", "otter_2,Withy,x");
    case.sheet(&spoilt.replace("otter_4", "otter_1"));
    case.fails(2, &["row 3", "row 5", "otter_1"]);
    case.sheet(&spoilt.replace("otter_3", "stoat_3"));
    case.fails(2, &["row 3", "row 4", "stoat_3"]);
    case.sheet(
        &SHEET
            .replace("otter_3", "stoat_3")
            .replace("otter_2", "stoat_2"),
    );
    case.fails(2, &["row 3", "stoat_2", "row 4", "stoat_3"]);
}

// Calls: exit code 1, with the record.

#[test]
fn a_genotype_beyond_the_listed_alleles() {
    let case = Case::new();
    let spoilt = RECORDS[1].replace("2/2", "2/3");
    case.calls(&calls_of(&[RECORDS[0], &spoilt, RECORDS[2]]));
    case.fails(1, &["calls.vcf", "record 2", "reed_1:20"]);
}

#[test]
fn a_record_with_too_few_columns() {
    let case = Case::new();
    case.calls(&calls_of(&[
        RECORDS[0],
        RECORDS[1],
        "reed_1\t30\t.\tG\tA\t.\t.\t.\tGT\t0/0",
    ]));
    case.fails(1, &["calls.vcf", "record 3"]);
}

#[test]
fn a_position_that_is_no_number() {
    let case = Case::new();
    let spoilt = RECORDS[2].replace("\t30\t", "\tthirty\t");
    case.calls(&calls_of(&[RECORDS[0], RECORDS[1], &spoilt]));
    case.fails(1, &["calls.vcf", "record 3"]);
}

#[test]
fn calls_without_sample_columns() {
    let case = Case::new();
    case.calls(&format!(
        "{HEADER}{COLUMNS}\nreed_1\t10\t.\tA\tG\t.\t.\t.\n"
    ));
    case.fails(1, &["calls.vcf"]);
}

#[test]
fn calls_without_any_genotype_field() {
    let case = Case::new();
    let record = "reed_1\t10\t.\tA\tG\t.\t.\t.\tDP\t4\t5\t6\t7";
    case.calls(&calls_of(&[record]));
    case.fails(1, &["calls.vcf", "no_genotype_field 1"]);
}

#[test]
fn empty_calls() {
    let case = Case::new();
    case.calls("");
    case.fails(1, &["calls.vcf"]);
}

#[test]
fn calls_with_a_header_alone() {
    let case = Case::new();
    case.calls(calls_of(&[]).trim_end_matches('\n'));
    case.fails(1, &["calls.vcf", "no record"]);
}

#[test]
fn calls_that_are_something_else() {
    let case = Case::new();
    case.calls("name of the lake;number of otters\nWithy;12\n");
    case.fails(1, &["calls.vcf"]);
}

#[test]
fn calls_that_are_not_there() {
    let case = Case::new();
    std::fs::remove_file(case.path("calls.vcf")).expect("it was there");
    case.fails(1, &["calls.vcf"]);
}

#[test]
fn gzip_that_ends_too_early() {
    let case = Case::new();
    let text = std::fs::read(fixture("reference/calls.vcf")).expect("the fixture");
    let mut writer = flate2::write::GzEncoder::new(Vec::new(), flate2::Compression::default());
    writer.write_all(&text).expect("memory");
    let whole = writer.finish().expect("memory");
    case.sheet(&std::fs::read_to_string(fixture("reference/samples.tsv")).expect("the fixture"));
    std::fs::write(case.path("calls.vcf"), &whole).expect("a scratch file");
    assert_eq!(
        case.measure(&["--quiet"]).code,
        Some(0),
        "the whole file is sound"
    );
    std::fs::write(case.path("calls.vcf"), &whole[..whole.len() / 2]).expect("a scratch file");
    case.fails(1, &["calls.vcf"]);
}

#[test]
fn block_gzip_that_ends_too_early() {
    let case = Case::new();
    let text = std::fs::read(fixture("reference/calls.vcf")).expect("the fixture");
    let mut writer = noodles_bgzf::io::Writer::new(Vec::new());
    writer.write_all(&text).expect("memory");
    let whole = writer.finish().expect("memory");
    case.sheet(&std::fs::read_to_string(fixture("reference/samples.tsv")).expect("the fixture"));
    std::fs::write(case.path("calls.vcf"), &whole).expect("a scratch file");
    assert_eq!(
        case.measure(&["--quiet"]).code,
        Some(0),
        "the whole file is sound"
    );
    // In the middle of a block, and between blocks: only the empty end block is missing then.
    for length in [whole.len() / 2, whole.len() - 28] {
        std::fs::write(case.path("calls.vcf"), &whole[..length]).expect("a scratch file");
        case.fails(1, &["calls.vcf"]);
    }
}

// Output: whole or not at all.

#[test]
fn a_failure_leaves_the_report_of_before_alone() {
    let case = Case::new();
    std::fs::write(case.path("report.json"), "the report of last year").expect("a scratch file");
    case.calls(&calls_of(&[RECORDS[0], "reed_1\t20"]));
    let report = path_text(&case.path("report.json"));
    assert_eq!(case.measure(&["-o", &report, "--quiet"]).code, Some(1));
    let kept = std::fs::read_to_string(case.path("report.json")).expect("it is still there");
    assert_eq!(kept, "the report of last year");
    assert_eq!(case.files(), ["calls.vcf", "report.json", "sheet.csv"]);
}

#[test]
fn a_folder_that_is_not_there_to_write_into() {
    let case = Case::new();
    let report = path_text(&case.path("no_such_folder").join("report.json"));
    let got = case.measure(&["-o", &report, "--quiet"]);
    assert_eq!(got.code, Some(1), "{}", got.stderr);
    assert!(got.stderr.contains("no_such_folder"), "{}", got.stderr);
}

// Usage: exit code 2.

#[test]
fn unknown_options_and_commands() {
    for arguments in [
        &["measure", "--no-such-option"][..],
        &["no-such-command"],
        &["measure"],
        &[],
    ] {
        let got = run(arguments);
        assert_eq!(got.code, Some(2), "{arguments:?}: {}", got.stderr);
        assert!(got.stdout.is_empty(), "{arguments:?}");
        assert!(!got.stderr.is_empty(), "{arguments:?}");
    }
}

#[test]
fn values_that_cannot_be_meant() {
    let case = Case::new();
    for options in [
        &["--generation-years", "0"][..],
        &["--generation-years", "-2"],
        &["--generation-years", "nan"],
        &["--gene-copies", "0"],
        &["--gene-copies", "many"],
    ] {
        let got = case.measure(options);
        assert_eq!(got.code, Some(2), "{options:?}: {}", got.stderr);
    }
}

#[test]
fn version_and_help_go_to_standard_output() {
    let got = run(["--version"]);
    assert_eq!(got.code, Some(0));
    let version = format!("genewane {}\n", env!("CARGO_PKG_VERSION"));
    assert_eq!(String::from_utf8_lossy(&got.stdout), version);
    let got = run(["--help"]);
    assert_eq!(got.code, Some(0));
    assert!(String::from_utf8_lossy(&got.stdout).contains("measure"));
}

#[test]
fn a_reader_that_goes_away_is_no_failure() {
    let mut child = common::genewane()
        .arg("measure")
        .arg(fixture("reference/calls.vcf"))
        .arg("--samples")
        .arg(fixture("reference/samples.tsv"))
        .arg("--quiet")
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .expect("the built program starts");
    drop(child.stdout.take());
    let output = child.wait_with_output().expect("it ends");
    assert_eq!(output.status.code(), Some(0));
    assert_eq!(String::from_utf8_lossy(&output.stderr), "");
}

// Bytes: what is written depends on the input alone.

#[test]
fn the_number_of_threads_changes_no_byte() {
    let bytes = |threads: &str| {
        let got = measure_run(
            &fixture("reference/calls.vcf"),
            &fixture("reference/samples.tsv"),
            &["--generation-years", "2", "--threads", threads],
        );
        assert_eq!(got.code, Some(0), "{}", got.stderr);
        String::from_utf8(got.stdout).expect("JSON is UTF-8")
    };
    let one = bytes("1");
    // The record of how a report was made names no thread count: it would be a difference without
    // a meaning, and two reports of the same data must be the same file.
    assert_eq!(one, bytes("2"));
    assert_eq!(one, bytes("7"));
}

#[test]
fn shards_by_whole_contigs_give_what_the_whole_file_gives() {
    let text = std::fs::read_to_string(fixture("reference/calls.vcf")).expect("the fixture");
    let folder = tempfile::tempdir().expect("a scratch folder");
    let shard = |name: &str, mine: &dyn Fn(&str) -> bool| {
        let lines = text.lines().filter(|l| l.starts_with('#') || mine(l));
        let path = folder.path().join(name);
        std::fs::write(&path, lines.collect::<Vec<_>>().join("\n") + "\n").expect("a scratch file");
        path
    };
    let first = shard("first.vcf", &|l| {
        l.starts_with("scaffold_1") || l.starts_with("scaffold_2")
    });
    let rest = shard("rest.vcf", &|l| {
        l.starts_with("scaffold_3") || l.starts_with("scaffold_4")
    });
    let sheet = fixture("reference/samples.tsv");
    let report = |paths: &[&Path]| {
        let mut arguments: Vec<std::ffi::OsString> = vec!["measure".into()];
        arguments.extend(paths.iter().map(|p| p.as_os_str().to_owned()));
        arguments.extend(["--samples".into(), sheet.clone().into()]);
        arguments.extend(["--generation-years".into(), "2".into()]);
        common::without_provenance(run(arguments).json()).to_string()
    };
    let whole = report(&[&fixture("reference/calls.vcf")]);
    assert_eq!(whole, report(&[&first, &rest]));
    assert_eq!(whole, report(&[&rest, &first]));
}

// Schema: read by a validator written elsewhere (crate `jsonschema`).

#[test]
fn reports_are_valid_under_the_printed_schema() {
    let schema = run(["schema", "report"]).json();
    let validator = jsonschema::validator_for(&schema).expect("a sound JSON Schema");
    let case = Case::new();
    let reference = measure_run(
        &fixture("reference/calls.vcf"),
        &fixture("reference/samples.tsv"),
        &["--generation-years", "2"],
    );
    for report in [case.measure(&[]).json(), reference.json()] {
        let errors: Vec<String> = validator
            .iter_errors(&report)
            .map(|e| format!("{}: {e}", e.instance_path()))
            .collect();
        assert!(errors.is_empty(), "{}", errors.join("\n"));
    }
    // The schema is no blanket: a report without its strata does not pass.
    let mut broken = case.measure(&[]).json();
    broken.as_object_mut().expect("an object").remove("strata");
    assert!(!validator.is_valid(&broken));
}

// Documents: what README prints is there.

#[test]
fn every_command_that_the_readme_names_is_there() {
    let text = std::fs::read_to_string(common::root().join("README.md")).expect("README.md");
    let help = String::from_utf8(run(["--help"]).stdout).expect("help is UTF-8");
    let commands: Vec<&str> = help
        .lines()
        .skip_while(|l| !l.starts_with("Commands:"))
        .skip(1)
        .map_while(|l| l.strip_prefix("  "))
        .filter_map(|l| l.split_whitespace().next())
        .collect();
    let mut named = 0;
    for (_, rest) in text
        .match_indices("`genewane ")
        .map(|(i, m)| (i, &text[i + m.len()..]))
    {
        let word: String = rest
            .chars()
            .take_while(|c| c.is_ascii_lowercase())
            .collect();
        if !word.is_empty() {
            assert!(
                commands.contains(&word.as_str()),
                "README names `genewane {word}`"
            );
            named += 1;
        }
    }
    assert!(named > 0, "README names no command");
}

/// The rounded excerpt of README.md, found again in the report on the demo.
#[test]
fn the_readme_shows_what_the_demo_says() {
    let text = std::fs::read_to_string(common::root().join("README.md")).expect("README.md");
    let block = text
        .split("```json\n")
        .nth(1)
        .and_then(|rest| rest.split("```").next());
    let shown: serde_json::Value =
        serde_json::from_str(block.expect("a JSON excerpt")).expect("the excerpt is JSON");
    let report = common::measure(
        &fixture("demo/calls.vcf.gz"),
        &fixture("demo/samples.tsv"),
        &["--generation-years", "2", "--quiet"],
    );
    let end = |end: &str| shown[end].as_str().expect("a stratum");
    let found = common::comparison(&report, end("from"), end("to")).expect("that comparison");
    let field = "expected_heterozygosity";
    let (shown, found) = (&shown["change"][field], &found["change"][field]);
    assert_eq!(
        (&shown["level"], &shown["loci"]),
        (&found["level"], &found["loci"])
    );
    for place in ["/estimate", "/interval/0", "/interval/1"] {
        let number = |value: &serde_json::Value| {
            value
                .pointer(place)
                .and_then(serde_json::Value::as_f64)
                .expect("a number")
        };
        common::close(place, number(shown), number(found), 0.0011);
    }
}
