//! The completions in `completions/` say what the flags say. `GENEWANE_WRITE_COMPLETIONS=1 cargo test
//! --release --test completions` writes them anew.

use std::fs;
use std::path::{Path, PathBuf};

use clap_complete::Shell;

/// Shells and the name that each looks for.
const SHELLS: [(Shell, &str); 3] = [
    (Shell::Bash, "genewane.bash"),
    (Shell::Zsh, "_genewane"),
    (Shell::Fish, "genewane.fish"),
];

fn folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("completions")
}

#[test]
fn completions_say_what_the_flags_say() {
    for (shell, name) in SHELLS {
        let mut bytes = Vec::new();
        clap_complete::generate(shell, &mut genewane::cli::command(), "genewane", &mut bytes);
        let path = folder().join(name);
        if std::env::var_os("GENEWANE_WRITE_COMPLETIONS").is_some_and(|value| value == "1") {
            fs::create_dir_all(folder()).expect("completions/ can be made");
            fs::write(&path, &bytes).expect("completions/ can be written");
        }
        let kept = fs::read(&path).unwrap_or_default();
        assert!(
            kept == bytes,
            "completions/{name} differs from the flags; write it anew with GENEWANE_WRITE_COMPLETIONS=1"
        );
    }
}

/// bash takes what was written, and completes a command with it.
#[test]
fn bash_completes_a_command() {
    let script = format!(
        ". {}; COMP_WORDS=(genewane mea); COMP_CWORD=1; _genewane genewane mea genewane; echo \"${{COMPREPLY[@]}}\"",
        folder().join("genewane.bash").display()
    );
    let Ok(got) = std::process::Command::new("bash")
        .args(["-c", &script])
        .output()
    else {
        eprintln!("SKIPPED: there is no bash");
        return;
    };
    assert_eq!(String::from_utf8_lossy(&got.stdout).trim(), "measure");
}
