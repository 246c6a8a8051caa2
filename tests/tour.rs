//! The tour of README.md: every command is run, and what it says is what stands there.
//!
//! `GENEWANE_WRITE_TOUR=1 cargo test --release --test tour` writes what the commands say into README.md.

mod common;

use std::fmt::Write as _;

use common::{genewane, root};

const BEGIN: &str = "```console\n";
const END: &str = "```\n";

/// What a command says on both streams, ended by its exit code where that is not 0.
fn said(folder: &std::path::Path, command: &str) -> String {
    let mut words = command.split_whitespace();
    assert_eq!(words.next(), Some("genewane"), "{command}");
    let output = genewane()
        .args(words)
        .current_dir(folder)
        .output()
        .expect("the built program starts");
    let mut text = String::from_utf8(output.stdout).expect("text");
    text += &String::from_utf8(output.stderr).expect("text");
    match output.status.code() {
        Some(0) => {}
        code => writeln!(text, "(exit code {})", code.unwrap_or(-1)).expect("a string"),
    }
    // No line of README.md ends in blanks.
    text.lines()
        .map(|line| format!("{}\n", line.trim_end()))
        .collect()
}

#[test]
fn the_commands_say_what_the_tour_shows() {
    let path = root().join("README.md");
    let readme = std::fs::read_to_string(&path).expect("README.md");
    let folder = tempfile::tempdir().expect("a scratch folder");
    std::os::unix::fs::symlink(root().join("fixtures"), folder.path().join("fixtures"))
        .expect("a link to the demo");
    let mut made = String::new();
    let mut rest = readme.as_str();
    let mut commands = 0;
    while let Some(at) = rest.find(BEGIN) {
        let (before, from) = rest.split_at(at + BEGIN.len());
        let (block, after) = from.split_at(from.find(END).expect("an end of the block"));
        made += before;
        for command in block.lines().filter_map(|line| line.strip_prefix("$ ")) {
            commands += 1;
            write!(made, "$ {command}\n{}", said(folder.path(), command)).expect("a string");
        }
        rest = after;
    }
    made += rest;
    assert!(commands >= 6, "the tour has {commands} commands");
    if std::env::var_os("GENEWANE_WRITE_TOUR").is_some() {
        std::fs::write(&path, &made).expect("README.md can be written");
    } else {
        for (shown, said) in readme.lines().zip(made.lines()) {
            assert_eq!(
                shown, said,
                "run GENEWANE_WRITE_TOUR=1 cargo test --release --test tour"
            );
        }
        assert_eq!(readme, made);
    }
}
