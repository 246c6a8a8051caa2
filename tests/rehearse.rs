//! Rehearsal files: the demo is what its scenario gives, and threads change no byte.

use std::io::Read;
use std::path::{Path, PathBuf};

use genewane::outlook::rehearse::rehearse;

fn fixture(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("fixtures")
        .join(name)
}

fn text_of(path: &Path) -> String {
    let mut text = String::new();
    let bytes = std::fs::read(path).unwrap();
    flate2::read::MultiGzDecoder::new(&bytes[..])
        .read_to_string(&mut text)
        .unwrap();
    text
}

#[test]
fn the_demo_is_what_its_scenario_gives() {
    let out = tempfile::tempdir().unwrap();
    rehearse(&fixture("demo/scenario.toml"), out.path(), None, 2).unwrap();
    let remake = "; remake it: genewane rehearse fixtures/demo/scenario.toml -o fixtures/demo";
    let calls = text_of(&out.path().join("calls.vcf.gz"));
    assert!(
        calls == text_of(&fixture("demo/calls.vcf.gz")),
        "demo calls are out of date{remake}"
    );
    let sheet = std::fs::read_to_string(out.path().join("samples.tsv")).unwrap();
    let kept = std::fs::read_to_string(fixture("demo/samples.tsv")).unwrap();
    assert!(sheet == kept, "demo sheet is out of date{remake}");
}

#[test]
fn threads_change_no_byte() {
    let [one, two, seven] = [1, 2, 7].map(|threads| {
        let out = tempfile::tempdir().unwrap();
        rehearse(&fixture("demo/scenario.toml"), out.path(), Some(7), threads).unwrap();
        [
            "calls.vcf.gz",
            "calls.vcf.gz.tbi",
            "samples.tsv",
            "truth.json",
        ]
        .map(|name| std::fs::read(out.path().join(name)).unwrap())
    });
    assert!(one == two && one == seven);
    assert!(
        one[0].ends_with(b"\x1b\x00\x03\x00\x00\x00\x00\x00\x00\x00\x00\x00"),
        "no end-of-file block"
    );
}

/// The page of scenario keys is made from the doc comments; `REMAKE=1` writes it anew.
#[test]
fn the_page_of_scenario_keys_is_up_to_date() {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("docs/scenario.md");
    let page = genewane::outlook::rehearse::scenario_reference();
    if std::env::var_os("REMAKE").is_some() {
        std::fs::create_dir_all(path.parent().unwrap()).unwrap();
        std::fs::write(&path, &page).unwrap();
    }
    let kept = std::fs::read_to_string(&path).unwrap_or_default();
    assert!(
        page == kept,
        "docs/scenario.md is out of date: run REMAKE=1 cargo test --release --test rehearse"
    );
    assert!(!page.contains("|  |\n"), "a key without a description");
}
