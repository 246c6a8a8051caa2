//! Reads the sources and DEVELOPERS.md, and fails where the two differ: an arrow between parts that
//! the import table does not permit, an outside crate beyond its fence, a dependency without its
//! reason or without a use, a long file that nobody defended. The tables are read from the page
//! itself, between marks such as `<!-- imports -->`, so the page cannot drift.

mod common;

use std::collections::{BTreeMap, BTreeSet};
use std::path::{Path, PathBuf};

/// Lines of code, tests not counted, beyond which a file must be defended.
const LONG_FILE: usize = 400;

/// A source file, with comments and strings blanked out.
struct Source {
    /// Path below `src`, with `/`.
    path: String,
    /// The part it belongs to: its top folder, or the file's own name.
    part: String,
    /// Names from the crate root to the module the file holds: `["locus", "counts"]`.
    module: Vec<String>,
    code: String,
    lines_without_tests: usize,
}

fn sources() -> Vec<Source> {
    let src = common::root().join("src");
    let mut files = Vec::new();
    collect(&src, &mut files);
    files.sort();
    files.iter().map(|path| read_source(&src, path)).collect()
}

fn collect(folder: &Path, files: &mut Vec<PathBuf>) {
    for entry in std::fs::read_dir(folder).expect("a source folder") {
        let path = entry.expect("an entry").path();
        if path.is_dir() {
            collect(&path, files);
        } else if path.extension().is_some_and(|e| e == "rs") {
            files.push(path);
        }
    }
}

fn read_source(src: &Path, file: &Path) -> Source {
    let below = file.strip_prefix(src).expect("a file below src");
    let path = below.to_string_lossy().replace('\\', "/");
    let mut module: Vec<String> = path
        .trim_end_matches(".rs")
        .split('/')
        .map(str::to_string)
        .collect();
    if matches!(
        module.last().map(String::as_str),
        Some("mod" | "lib" | "main")
    ) && path != "main.rs"
    {
        module.pop();
    }
    let part = path.split(['/', '.']).next().expect("a name").to_string();
    let text = std::fs::read_to_string(file).expect("a source file");
    let without_tests = text
        .split("#[cfg(test)]\nmod ")
        .next()
        .expect("a first piece");
    let lines_without_tests = without_tests.lines().count();
    Source {
        path,
        part,
        module,
        code: blank(&text),
        lines_without_tests,
    }
}

/// Replaces comments, string and character literals by spaces; line breaks stay.
fn blank(text: &str) -> String {
    let bytes = text.as_bytes();
    let mut out = Vec::with_capacity(bytes.len());
    let mut i = 0;
    while i < bytes.len() {
        let length = match bytes[i] {
            b'/' if bytes.get(i + 1) == Some(&b'/') => line_length(&bytes[i..]),
            b'/' if bytes.get(i + 1) == Some(&b'*') => block_comment_length(&bytes[i..]),
            b'"' => string_length(&bytes[i..]),
            b'r' if !after_word(bytes, i) => raw_string_length(&bytes[i..]),
            b'\'' => character_length(&bytes[i..]),
            _ => 0,
        };
        if length == 0 {
            out.push(bytes[i]);
            i += 1;
        } else {
            let end = (i + length).min(bytes.len());
            out.extend(
                bytes[i..end]
                    .iter()
                    .map(|&b| if b == b'\n' { b } else { b' ' }),
            );
            i = end;
        }
    }
    String::from_utf8(out).expect("whole literals are replaced, so the rest is still UTF-8")
}

fn after_word(bytes: &[u8], i: usize) -> bool {
    i > 0 && (bytes[i - 1].is_ascii_alphanumeric() || bytes[i - 1] == b'_')
}

fn line_length(rest: &[u8]) -> usize {
    rest.iter().position(|&b| b == b'\n').unwrap_or(rest.len())
}

fn block_comment_length(rest: &[u8]) -> usize {
    let (mut depth, mut i) = (0, 0);
    while i < rest.len() {
        if rest[i..].starts_with(b"/*") {
            depth += 1;
            i += 2;
        } else if rest[i..].starts_with(b"*/") {
            depth -= 1;
            i += 2;
            if depth == 0 {
                return i;
            }
        } else {
            i += 1;
        }
    }
    rest.len()
}

fn string_length(rest: &[u8]) -> usize {
    let mut i = 1;
    while i < rest.len() {
        match rest[i] {
            b'\\' => i += 2,
            b'"' => return i + 1,
            _ => i += 1,
        }
    }
    rest.len()
}

fn raw_string_length(rest: &[u8]) -> usize {
    let hashes = rest[1..].iter().take_while(|&&b| b == b'#').count();
    if rest.get(1 + hashes) != Some(&b'"') {
        return 0;
    }
    let close: Vec<u8> = std::iter::once(b'"')
        .chain(std::iter::repeat_n(b'#', hashes))
        .collect();
    let start = 2 + hashes;
    let inside = rest[start..].windows(close.len()).position(|w| w == close);
    inside.map_or(rest.len(), |at| start + at + close.len())
}

/// The length of a character literal; 0 for a lifetime.
fn character_length(rest: &[u8]) -> usize {
    if rest.get(1) == Some(&b'\\') {
        return rest[3..]
            .iter()
            .position(|&b| b == b'\'')
            .map_or(0, |at| 4 + at);
    }
    let close = rest.iter().skip(2).take(4).position(|&b| b == b'\'');
    match close {
        Some(at) if std::str::from_utf8(&rest[1..2 + at]).is_ok_and(|s| s.chars().count() == 1) => {
            3 + at
        }
        _ => 0,
    }
}

fn is_word(b: u8) -> bool {
    b.is_ascii_alphanumeric() || b == b'_'
}

/// Every place where `word` stands as a whole word and not behind `::` or `.`; the text behind it.
fn uses_of<'a>(code: &'a str, word: &'a str) -> impl Iterator<Item = (usize, &'a str)> {
    code.match_indices(word).filter_map(move |(at, _)| {
        let before = code[..at].trim_end();
        let clean = at == 0 || !is_word(code.as_bytes()[at - 1]);
        let rest = &code[at + word.len()..];
        let whole = rest.bytes().next().is_none_or(|b| !is_word(b));
        (clean && whole && !before.ends_with("::") && !before.ends_with('.')).then_some((at, rest))
    })
}

fn first_word(text: &str) -> &str {
    let end = text.bytes().position(|b| !is_word(b)).unwrap_or(text.len());
    &text[..end]
}

/// The first names behind `prefix::`, also from a braced list.
fn heads(rest: &str) -> Vec<String> {
    let Some(rest) = rest.trim_start().strip_prefix("::") else {
        return Vec::new();
    };
    let rest = rest.trim_start();
    let Some(list) = rest.strip_prefix('{') else {
        return vec![first_word(rest).to_string()];
    };
    let (mut depth, mut names, mut expecting) = (0, Vec::new(), true);
    for (i, b) in list.bytes().enumerate() {
        match b {
            b'{' => depth += 1,
            b'}' if depth == 0 => break,
            b'}' => depth -= 1,
            b',' if depth == 0 => expecting = true,
            _ if expecting && depth == 0 && is_word(b) => {
                names.push(first_word(&list[i..]).to_string());
                expecting = false;
            }
            _ => {}
        }
    }
    names
}

/// What a file names at the root of the crate: `crate::NAME`, or `genewane::NAME` in main.
fn named_at_root(source: &Source) -> BTreeSet<String> {
    let mut names = BTreeSet::new();
    for prefix in ["crate", "genewane"] {
        for (_, rest) in uses_of(&source.code, prefix) {
            names.extend(heads(rest));
        }
    }
    names
        .into_iter()
        .filter(|name| !name.is_empty())
        .map(|name| match name.as_str() {
            "Result" | "Error" => "error".to_string(),
            _ => name,
        })
        .collect()
}

/// What a file names by climbing with `super` to the root of the crate. A test module climbs one
/// step more, so these names can also be those of a sibling.
fn named_by_climbing(source: &Source) -> BTreeSet<String> {
    let mut names = BTreeSet::new();
    for (_, rest) in uses_of(&source.code, "super") {
        let (mut climbed, mut rest) = (1, rest);
        while let Some(next) = rest.trim_start().strip_prefix("::") {
            let Some(more) = next.trim_start().strip_prefix("super") else {
                break;
            };
            climbed += 1;
            rest = more;
        }
        if climbed == source.module.len() {
            names.extend(heads(rest));
        }
    }
    names
}

/// The rows of the table of DEVELOPERS.md behind a mark: cells without their code ticks.
fn table(mark: &str) -> Vec<Vec<String>> {
    let page = std::fs::read_to_string(common::root().join("DEVELOPERS.md")).expect("the page");
    let start = format!("<!-- {mark} -->");
    let behind = page
        .split_once(&start)
        .unwrap_or_else(|| panic!("no {start} in DEVELOPERS.md"))
        .1;
    let rows: Vec<Vec<String>> = behind
        .lines()
        .skip_while(|line| line.trim().is_empty())
        .take_while(|line| line.starts_with('|'))
        .skip(2)
        .map(|line| {
            line.trim_matches('|')
                .split('|')
                .map(|c| c.trim().replace('`', ""))
                .collect()
        })
        .collect();
    assert!(!rows.is_empty(), "an empty table behind {start}");
    rows
}

fn names(cell: &str) -> BTreeSet<String> {
    cell.split(',')
        .map(|n| n.trim().to_string())
        .filter(|n| !n.is_empty())
        .collect()
}

#[test]
fn every_arrow_is_in_the_table() {
    let permitted: BTreeMap<String, BTreeSet<String>> = table("imports")
        .into_iter()
        .map(|row| (row[0].clone(), names(&row[1])))
        .collect();
    let sources = sources();
    let parts: BTreeSet<&str> = sources.iter().map(|s| s.part.as_str()).collect();
    let listed: BTreeSet<&str> = permitted.keys().map(String::as_str).collect();
    assert_eq!(
        parts, listed,
        "the parts in src and the rows of the import table"
    );

    let (mut faults, mut arrows) = (Vec::new(), 0);
    for source in &sources {
        let at_root = named_at_root(source);
        for name in at_root.union(&named_by_climbing(source)) {
            let part = parts.contains(name.as_str());
            if part && *name != source.part {
                arrows += 1;
                if !permitted[&source.part].contains(name) {
                    faults.push(format!("src/{} names {name}", source.path));
                }
            } else if !part && at_root.contains(name) {
                // A macro exported at the root would hide an arrow; nothing else lives there.
                faults.push(format!(
                    "src/{} names {name}, which is no part",
                    source.path
                ));
            }
        }
    }
    assert!(
        faults.is_empty(),
        "arrows that DEVELOPERS.md does not permit:\n{}",
        faults.join("\n")
    );
    assert!(
        arrows > 0,
        "no arrow was found at all: the reader of this test is broken"
    );
}

#[test]
fn the_import_table_has_no_cycle() {
    let mut left: BTreeMap<String, BTreeSet<String>> = table("imports")
        .into_iter()
        .map(|row| (row[0].clone(), names(&row[1])))
        .collect();
    while let Some(part) = left
        .iter()
        .find(|(_, to)| to.iter().all(|t| !left.contains_key(t)))
        .map(|(p, _)| p.clone())
    {
        left.remove(&part);
    }
    assert!(
        left.is_empty(),
        "parts that import each other in a circle: {:?}",
        left.keys()
    );
}

#[test]
fn outside_crates_stay_behind_their_fences() {
    let sources = sources();
    let mut faults = Vec::new();
    for row in table("fences") {
        let places = names(&row[1]);
        for word in names(&row[0]) {
            for source in &sources {
                let allowed = places.iter().any(|place| {
                    source.path == *place
                        || (place.ends_with('/') && source.path.starts_with(place))
                });
                let used = match word.strip_suffix('*') {
                    Some(stem) => source.code.contains(stem),
                    None if word.contains("::") => source.code.contains(&word),
                    None => {
                        uses_of(&source.code, &word).any(|(_, r)| r.trim_start().starts_with("::"))
                    }
                };
                if used && !allowed {
                    faults.push(format!("src/{} uses {word}", source.path));
                }
            }
        }
    }
    assert!(
        faults.is_empty(),
        "outside crates beyond their fence:\n{}",
        faults.join("\n")
    );
}

#[test]
fn every_dependency_has_a_reason_and_a_use() {
    let text = std::fs::read_to_string(common::root().join("Cargo.toml")).expect("Cargo.toml");
    let manifest: toml::Table = text.parse().expect("Cargo.toml is TOML");
    let listed: BTreeMap<String, String> = table("dependencies")
        .into_iter()
        .map(|row| (row[0].clone(), row[1].clone()))
        .collect();
    let mut declared = BTreeSet::new();
    let code: String = sources().iter().map(|s| s.code.as_str()).collect();
    let mut unused = Vec::new();
    for section in ["dependencies", "dev-dependencies"] {
        for name in manifest[section].as_table().expect("a table").keys() {
            declared.insert(name.clone());
            let word = name.replace('-', "_");
            let used = uses_of(&code, &word).next().is_some();
            if section == "dependencies" && !used {
                unused.push(name.clone());
            }
        }
    }
    let with_reason: BTreeSet<String> = listed.keys().cloned().collect();
    assert_eq!(
        declared, with_reason,
        "Cargo.toml and the dependency table of DEVELOPERS.md"
    );
    assert!(
        listed.values().all(|reason| reason.len() >= 4),
        "a dependency without its reason"
    );
    assert!(
        unused.is_empty(),
        "dependencies that src does not use: {}",
        unused.join(", ")
    );
}

#[test]
fn long_files_are_defended() {
    let page = std::fs::read_to_string(common::root().join("DEVELOPERS.md")).expect("the page");
    let long: Vec<String> = sources()
        .iter()
        .filter(|s| s.lines_without_tests > LONG_FILE && !page.contains(&format!("`{}`", s.path)))
        .map(|s| format!("src/{}: {} lines", s.path, s.lines_without_tests))
        .collect();
    assert!(
        long.is_empty(),
        "split these, or defend them in DEVELOPERS.md under \"Long files\":\n{}",
        long.join("\n")
    );
}

/// Every file or folder of ours that a page names in code ticks is there.
#[test]
fn the_pages_name_what_is_there() {
    let mut named = 0;
    for page in ["README.md", "DEVELOPERS.md", "fixtures/README.md"] {
        let text = std::fs::read_to_string(common::root().join(page)).expect("the page");
        for piece in text.split('`').skip(1).step_by(2) {
            let ours = ["src/", "tests/", "fixtures/", "tools/", "man/", ".ci/"];
            if !ours.iter().any(|folder| piece.starts_with(folder)) || piece.contains(['*', ' ']) {
                continue;
            }
            assert!(
                common::root().join(piece).exists(),
                "{page} names {piece}, which is not there"
            );
            named += 1;
        }
    }
    assert!(
        named > 10,
        "only {named} paths were found: the reader of this test is broken"
    );
}

#[test]
fn the_reader_of_this_test_sees_paths_and_nothing_else() {
    let code = blank(
        "use crate::{error::{Error, Place}, model::Strata};\n\
         // crate::cli is only talked about\n\
         let text = \"crate::run\"; let raw = r#\"crate::report\"#; let quote = '\"';\n\
         fn f<'a>(x: &'a str) { crate::locus::counts::Counts::empty(2); }\n",
    );
    let source = Source {
        path: "merge/sums.rs".into(),
        part: "merge".into(),
        module: vec!["merge".into(), "sums".into()],
        code,
        lines_without_tests: 4,
    };
    let found: Vec<String> = named_at_root(&source).into_iter().collect();
    assert_eq!(found, ["error", "locus", "model"]);
    let climbing = Source {
        code: "use super::super::ne::Estimate; use super::x;".into(),
        ..source
    };
    assert_eq!(
        named_by_climbing(&climbing).into_iter().collect::<Vec<_>>(),
        ["ne"]
    );
}
