//! What a report must not do to those who open it, and what the package may be made of.

mod common;

use std::process::Command;

use common::{fixture, run};
use serde_json::Value;

/// Licences whose terms a binary meets by carrying their texts.
const LICENCES: [&str; 11] = [
    "MIT",
    "MIT-0",
    "Apache-2.0",
    "Apache-2.0 WITH LLVM-exception",
    "BSD-2-Clause",
    "BSD-3-Clause",
    "CC0-1.0",
    "ISC",
    "Unicode-3.0",
    "Unlicense",
    "Zlib",
];

/// Whether an SPDX expression can be met: one side of every OR, both of every AND. Old manifests part
/// alternatives by a slash.
fn is_met(expression: &str) -> bool {
    let flat = expression.replace('/', " OR ").replace(['(', ')'], "");
    // AND binds closer in SPDX; in the one expression with both, the brackets are around the OR.
    flat.split(" AND ")
        .all(|part| part.split(" OR ").any(|one| LICENCES.contains(&one.trim())))
}

#[test]
fn every_dependency_has_a_licence_that_is_met() {
    assert!(is_met("(MIT OR GPL-3.0) AND Unicode-3.0") && !is_met("GPL-3.0 OR AGPL-3.0"));
    let got = Command::new(env!("CARGO"))
        .args(["metadata", "--format-version", "1", "--locked", "--offline"])
        .args(["--filter-platform", "x86_64-unknown-linux-gnu"])
        .current_dir(common::root())
        .output()
        .expect("cargo starts");
    if !got.status.success() {
        eprintln!("SKIPPED: cargo has not the sources of every dependency here");
        return;
    }
    let metadata: Value = serde_json::from_slice(&got.stdout).expect("JSON");
    let packages = metadata["packages"].as_array().expect("packages");
    assert!(packages.len() > 50);
    for package in packages {
        let licence = package["license"].as_str().unwrap_or("none");
        assert!(is_met(licence), "{}: {licence}", package["name"]);
    }
}

/// Calls whose header and records hold what terminals, spreadsheets and browsers would act on.
fn hostile_calls(folder: &std::path::Path) -> std::path::PathBuf {
    use std::io::Read;
    let packed = std::fs::read(fixture("demo/calls.vcf.gz")).unwrap();
    let mut text = String::new();
    flate2::read::MultiGzDecoder::new(&packed[..])
        .read_to_string(&mut text)
        .unwrap();
    let mut out = String::new();
    for line in text.lines() {
        let mut cells: Vec<String> = line.split('\t').map(str::to_owned).collect();
        if line.starts_with("#CHROM") {
            cells.push("\u{1b}[2Jgone\u{7}".to_owned());
            cells.push("<script>alert(1)</script>".to_owned());
        } else if !line.starts_with('#') {
            cells[2] = "=HYPERLINK(1)".to_owned();
            cells.extend(["0/1".to_owned(), "0/1".to_owned()]);
        }
        out += &cells.join("\t");
        out.push('\n');
    }
    let path = folder.join("hostile.vcf");
    std::fs::write(&path, out).unwrap();
    path
}

#[test]
fn names_do_nothing_to_terminal_spreadsheet_and_page() {
    let folder = tempfile::tempdir().unwrap();
    let path = |name: &str| folder.path().join(name);
    let calls = hostile_calls(folder.path());
    let mut arguments = vec!["measure".into(), calls.into_os_string(), "--samples".into()];
    arguments.push(fixture("demo/samples.tsv").into_os_string());
    arguments.extend(["--generation-years", "2", "--loci"].map(Into::into));
    arguments.push(path("loci.tsv").into_os_string());
    arguments.extend(["-o".into(), path("report.json").into_os_string()]);
    let got = run(arguments);
    assert_eq!(got.code, Some(0), "{}", got.stderr);
    let is_raw = |text: &str| {
        text.chars()
            .any(|c| c.is_control() && c != '\n' && c != '\t')
    };
    assert!(!is_raw(&got.stderr), "{:?}", got.stderr);

    let report = std::fs::read_to_string(path("report.json")).unwrap();
    assert!(!is_raw(&report));
    let report: Value = serde_json::from_str(&report).unwrap();
    let not_listed = report["samples"]["not_listed"].to_string();
    assert!(
        not_listed.contains("[2Jgone"),
        "nothing is lost: {not_listed}"
    );

    let table = std::fs::read_to_string(path("loci.tsv")).unwrap();
    let cells = table.lines().flat_map(|line| line.split('\t'));
    let formula = |cell: &&str| cell.starts_with(['=', '@']);
    assert_eq!(cells.filter(formula).count(), 0);
    assert!(table.contains("'=HYPERLINK(1)"));

    let page = run([
        std::ffi::OsString::from("page"),
        path("report.json").into_os_string(),
    ]);
    let page = String::from_utf8(page.stdout).unwrap();
    assert!(!page.contains("<script>alert") && page.contains("&lt;script&gt;alert"));
    assert!(!page.contains('\u{1b}'));

    // Every problem of a sheet is shown with its control characters written out.
    std::fs::write(
        path("sheet.tsv"),
        "sample\tpopulation\tyear\na\tX\u{1b}[31m\t2001\n",
    )
    .unwrap();
    let arguments = [
        "measure".into(),
        fixture("demo/calls.vcf.gz").into_os_string(),
        "--samples".into(),
    ];
    let got = run(arguments
        .into_iter()
        .chain([path("sheet.tsv").into_os_string()]));
    assert_eq!(got.code, Some(2));
    assert!(
        !is_raw(&got.stderr) && got.stderr.contains("row 2"),
        "{:?}",
        got.stderr
    );
}
