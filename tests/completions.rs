//! The shell completions in `completions/` know what the flags know. `GENEWANE_WRITE_COMPLETIONS=1 cargo
//! test --release --test completions` writes them anew.

use std::fs;
use std::path::{Path, PathBuf};
use std::process::Command;

use clap_complete::{Shell, generate};
use tempfile::TempDir;

const SHELLS: [Shell; 3] = [Shell::Bash, Shell::Zsh, Shell::Fish];

fn folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("completions")
}

/// The name under which each shell looks for the completions of a program.
fn file_name(shell: Shell) -> &'static str {
    match shell {
        Shell::Zsh => "_genewane",
        Shell::Fish => "genewane.fish",
        _ => "genewane.bash",
    }
}

fn script(shell: Shell) -> String {
    let mut bytes = Vec::new();
    generate(shell, &mut genewane::cli::command(), "genewane", &mut bytes);
    String::from_utf8(bytes).expect("completions are UTF-8")
}

#[test]
fn completions_know_what_the_flags_know() {
    if std::env::var_os("GENEWANE_WRITE_COMPLETIONS").is_some_and(|value| value == "1") {
        fs::create_dir_all(folder()).expect("completions/ can be made");
        for shell in SHELLS {
            fs::write(folder().join(file_name(shell)), script(shell))
                .expect("completions/ can be written");
        }
    }
    for shell in SHELLS {
        let name = file_name(shell);
        let kept = fs::read_to_string(folder().join(name)).unwrap_or_default();
        // Thousands of lines: the first that differs says enough.
        let flags = script(shell);
        let differs = kept
            .lines()
            .zip(flags.lines())
            .position(|(kept, flags)| kept != flags)
            .unwrap_or_else(|| kept.lines().count().min(flags.lines().count()));
        assert!(
            kept == flags,
            "completions/{name} differs from the flags at line {}; write it anew with \
             GENEWANE_WRITE_COMPLETIONS=1\nkept:  {:?}\nflags: {:?}",
            differs + 1,
            kept.lines().nth(differs),
            flags.lines().nth(differs)
        );
    }
}

#[test]
fn completions_are_the_same_each_time_and_name_every_flag() {
    for shell in SHELLS {
        let text = script(shell);
        assert_eq!(text, script(shell));
        for command in genewane::cli::command().get_subcommands() {
            assert!(text.contains(command.get_name()), "{shell}");
            for flag in command.get_arguments().filter_map(|flag| flag.get_long()) {
                // fish writes `-l flag`, the others `--flag`.
                let written = match shell {
                    Shell::Fish => format!("-l {flag} "),
                    _ => format!("--{flag}"),
                };
                assert!(text.contains(&written), "{shell}: --{flag} is missing");
            }
        }
    }
}

/// A folder with the file of each shell, apart from `completions/`, which another test may be writing.
fn written() -> TempDir {
    let folder = tempfile::tempdir().expect("a temporary folder");
    for shell in SHELLS {
        fs::write(folder.path().join(file_name(shell)), script(shell)).expect("a file in it");
    }
    folder
}

/// What bash offers behind words already typed, the last of them unfinished.
fn offered_by_bash(words: &[&str]) -> Option<Vec<String>> {
    let files = written();
    let play = r#"
        source "$1" && shift
        COMP_WORDS=("$@") COMP_CWORD=$(($# - 1)) COMPREPLY=()
        last=${COMP_WORDS[COMP_CWORD]} before=${COMP_WORDS[COMP_CWORD - 1]}
        _genewane genewane "$last" "$before" && printf '%s\n' "${COMPREPLY[@]}"
    "#;
    let shell = Command::new("bash")
        .args(["--norc", "--noprofile", "-c", play, "bash"])
        .arg(files.path().join(file_name(Shell::Bash)))
        .args(words)
        .output()
        .ok()?;
    let told = String::from_utf8_lossy(&shell.stderr);
    assert!(shell.status.success() && told.is_empty(), "bash: {told}");
    let offered = String::from_utf8(shell.stdout).expect("offers are UTF-8");
    Some(offered.lines().map(str::to_string).collect())
}

#[test]
fn bash_completes_commands_and_flags() {
    let Some(commands) = offered_by_bash(&["genewane", "me"]) else {
        eprintln!("SKIPPED: there is no bash");
        return;
    };
    assert_eq!(commands, ["measure"]);
    let flags = offered_by_bash(&["genewane", "measure", "--sampl"]).expect("bash was there");
    assert_eq!(flags, ["--samples", "--sampling-plan"]);
}

/// The other shells read their file without complaint; those that are not installed are skipped aloud.
#[test]
fn each_shell_reads_its_file() {
    let files = written();
    for (shell, program, check) in [
        (Shell::Bash, "bash", "-n"),
        (Shell::Zsh, "zsh", "-n"),
        (Shell::Fish, "fish", "--no-execute"),
    ] {
        let file = files.path().join(file_name(shell));
        match Command::new(program).arg(check).arg(file).output() {
            Ok(out) => assert!(
                out.status.success(),
                "{program}: {}",
                String::from_utf8_lossy(&out.stderr)
            ),
            Err(_) => eprintln!("SKIPPED: there is no {program}"),
        }
    }
}
