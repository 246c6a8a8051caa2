//! What the tests of the built program share: where things are, how it is run, how a report is read.
#![allow(dead_code)] // each test file uses its own part

use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};

use serde_json::Value;

/// The folder of the package.
pub fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

/// A folder of scratch files, gone at the end.
pub struct Case {
    folder: tempfile::TempDir,
}

impl Case {
    /// An empty folder.
    pub fn empty() -> Self {
        Case {
            folder: tempfile::tempdir().expect("a scratch folder"),
        }
    }

    /// With `report.json`, the report of the demonstration data.
    pub fn with_report(report: &Value) -> Self {
        let case = Case::empty();
        case.write("report.json", &report.to_string());
        case
    }

    /// A file of the folder.
    pub fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    /// Writes a file of the folder.
    pub fn write(&self, name: &str, text: &str) {
        std::fs::write(self.path(name), text).expect("a scratch file");
    }
}

/// The report of the demonstration data with a generation length in years.
pub fn demo_report(generation_years: &str) -> Value {
    measure(
        &fixture("demo/calls.vcf.gz"),
        &fixture("demo/samples.tsv"),
        &["--generation-years", generation_years, "--quiet"],
    )
}

/// A file under `fixtures/`.
pub fn fixture(name: &str) -> PathBuf {
    root().join("fixtures").join(name)
}

/// The optional folder of open data beside the package. It is used in place and never copied.
/// `None`, and a line on stderr, when it is not there.
pub fn open_data(name: &str) -> Option<PathBuf> {
    let path = root().join("../shared/data").join(name);
    if path.exists() {
        return Some(path);
    }
    eprintln!(
        "SKIPPED: the open data folder {} is not here; nothing was checked",
        path.display()
    );
    None
}

/// What a run of the program left.
#[derive(Debug)]
pub struct Run {
    /// Exit code; `None` when a signal ended it.
    pub code: Option<i32>,
    /// Standard output.
    pub stdout: Vec<u8>,
    /// Standard error.
    pub stderr: String,
}

impl Run {
    /// Standard output as JSON, of a run that must have succeeded.
    pub fn json(&self) -> Value {
        assert_eq!(self.code, Some(0), "the run failed:\n{}", self.stderr);
        serde_json::from_slice(&self.stdout).expect("standard output is one JSON document")
    }
}

/// The built program, quiet about everything in the environment.
pub fn genewane() -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_genewane"));
    command.stdin(Stdio::null());
    command
}

/// Runs the program with arguments of any path-like type.
pub fn run<A: AsRef<std::ffi::OsStr>>(arguments: impl IntoIterator<Item = A>) -> Run {
    finish(
        genewane()
            .args(arguments)
            .output()
            .expect("the built program starts"),
    )
}

/// Runs the program with bytes on standard input. A reader that stops early is not an error here.
pub fn run_with_stdin<A: AsRef<std::ffi::OsStr>>(
    arguments: impl IntoIterator<Item = A>,
    input: Vec<u8>,
) -> Run {
    let mut child = genewane()
        .args(arguments)
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .expect("the built program starts");
    let mut stdin = child.stdin.take().expect("stdin is piped");
    let feeder = std::thread::spawn(move || {
        let _ = stdin.write_all(&input);
    });
    let output = child.wait_with_output().expect("the built program ends");
    feeder.join().expect("the feeder ends");
    finish(output)
}

/// What a finished process left.
pub fn finish(output: std::process::Output) -> Run {
    Run {
        code: output.status.code(),
        stdout: output.stdout,
        stderr: String::from_utf8_lossy(&output.stderr).into_owned(),
    }
}

/// The report of `measure` over `calls` with `sheet` and further options.
pub fn measure(calls: &Path, sheet: &Path, options: &[&str]) -> Value {
    measure_run(calls, sheet, options).json()
}

/// The run of `measure` over `calls` with `sheet` and further options.
pub fn measure_run(calls: &Path, sheet: &Path, options: &[&str]) -> Run {
    let mut arguments: Vec<std::ffi::OsString> = vec!["measure".into(), calls.into()];
    arguments.extend(["--samples".into(), sheet.into()]);
    arguments.extend(options.iter().map(Into::into));
    run(arguments)
}

/// The report without its provenance, which names the input files.
pub fn without_provenance(mut report: Value) -> Value {
    report
        .as_object_mut()
        .expect("a report is an object")
        .remove("provenance");
    report
}

/// The element of a list whose `key` is `value`.
pub fn find<'a>(list: &'a Value, key: &str, value: &str) -> &'a Value {
    list.as_array()
        .unwrap_or_else(|| panic!("not a list: {list}"))
        .iter()
        .find(|item| item[key] == value)
        .unwrap_or_else(|| panic!("no element with {key} = {value}"))
}

/// The stratum of this name.
pub fn stratum<'a>(report: &'a Value, name: &str) -> &'a Value {
    find(&report["strata"], "stratum", name)
}

/// The comparison between two strata, in this order; `None` when the report has none.
pub fn comparison<'a>(report: &'a Value, from: &str, to: &str) -> Option<&'a Value> {
    report["comparisons"]
        .as_array()
        .expect("comparisons is a list")
        .iter()
        .find(|item| item["from"] == from && item["to"] == to)
}

/// The number in the `estimate` of a field.
pub fn estimate(parent: &Value, field: &str) -> f64 {
    parent[field]["estimate"]
        .as_f64()
        .unwrap_or_else(|| panic!("{field} has no estimate: {}", parent[field]))
}

/// Asserts that two numbers differ by at most `tolerance`.
#[track_caller]
pub fn close(what: &str, got: f64, expected: f64, tolerance: f64) {
    assert!(
        (got - expected).abs() <= tolerance,
        "{what}: got {got}, expected {expected} (within {tolerance})"
    );
}
