//! The program when the machine fails it: full disks, pipes that end, signals, few file handles. Real
//! means: the kernel's own full device, named pipes, signals, and a small file system where the tests
//! may mount one.
#![cfg(unix)]

mod common;

use std::fs;
use std::io::Write;
use std::os::unix::process::ExitStatusExt;
use std::path::{Path, PathBuf};
use std::process::{Child, Command, Stdio};
use std::time::{Duration, Instant};

use common::{fixture, genewane};

fn measure(output: &Path) -> Command {
    let mut command = genewane();
    command.arg("measure").arg(fixture("demo/calls.vcf.gz"));
    command.arg("--samples").arg(fixture("demo/samples.tsv"));
    command.args(["--generation-years", "2", "--quiet", "-o"]);
    command.arg(output);
    command
}

fn names(folder: &Path) -> Vec<String> {
    let entries = fs::read_dir(folder).expect("a folder");
    let mut names: Vec<String> = entries
        .map(|e| e.unwrap().file_name().into_string().unwrap())
        .collect();
    names.sort();
    names
}

/// Waits until something holds, at most half a minute.
fn wait_until(what: &str, holds: impl Fn() -> bool) {
    let start = Instant::now();
    while !holds() {
        assert!(start.elapsed() < Duration::from_secs(30), "never: {what}");
        std::thread::sleep(Duration::from_millis(5));
    }
}

fn send(signal: &str, child: &Child) {
    let id = child.id().to_string();
    let sent = Command::new("kill").args([signal, &id]).status();
    assert!(sent.expect("kill").success());
}

fn pipe(folder: &Path) -> PathBuf {
    let path = folder.join("calls.pipe");
    let made = Command::new("mkfifo").arg(&path).status();
    assert!(made.expect("mkfifo").success());
    path
}

/// Starts a measurement of a named pipe, and opens the pipe for writing.
fn of_a_pipe(folder: &Path, output: &Path) -> (Child, fs::File) {
    let pipe = pipe(folder);
    let mut command = genewane();
    command.arg("measure").arg(&pipe).arg("--samples");
    command
        .arg(fixture("demo/samples.tsv"))
        .arg("-o")
        .arg(output);
    command.args(["--quiet", "--generation-years", "2"]);
    let child = command.stderr(Stdio::piped()).spawn().expect("a process");
    let writer = fs::OpenOptions::new().write(true).open(&pipe);
    (child, writer.expect("the other end"))
}

#[test]
fn a_full_disk_is_told_and_nothing_is_left() {
    let folder = tempfile::tempdir().unwrap();
    // The kernel's device that is always full, as standard output.
    let full = fs::OpenOptions::new().write(true).open("/dev/full");
    let mut command = genewane();
    command.args(["schema", "report"]);
    let got = command.stdout(full.expect("/dev/full")).output().unwrap();
    let words = String::from_utf8_lossy(&got.stderr);
    assert_eq!(got.status.code(), Some(1), "{words}");
    assert!(
        words.contains("standard output") && words.contains("space"),
        "{words}"
    );

    // A file system of 64 KiB, where the tests may mount one.
    let place = folder.path().join("small");
    fs::create_dir(&place).unwrap();
    let mount = Command::new("mount")
        .args(["-t", "tmpfs", "-o", "size=64k", "tmpfs"])
        .arg(&place)
        .stderr(Stdio::null())
        .status();
    if !mount.is_ok_and(|status| status.success()) {
        eprintln!("SKIPPED: no file system can be mounted here; only /dev/full was tried");
        return;
    }
    let outcome = std::panic::catch_unwind(|| {
        for name in ["report.json", "loci"] {
            let mut command = measure(&match name {
                "loci" => folder.path().join("report.json"),
                name => place.join(name),
            });
            if name == "loci" {
                command.arg("--loci").arg(place.join("loci.tsv"));
            }
            let got = command.output().unwrap();
            let words = String::from_utf8_lossy(&got.stderr);
            assert_eq!(got.status.code(), Some(1), "{words}");
            assert!(
                words.contains("space") && !words.contains("panicked"),
                "{words}"
            );
            assert_eq!(names(&place), [""; 0], "nothing is left behind");
            assert!(!folder.path().join("report.json").exists());
        }
    });
    let _ = Command::new("umount").arg(&place).status();
    if let Err(panic) = outcome {
        std::panic::resume_unwind(panic);
    }
}

#[test]
fn a_pipe_that_ends_half_way_leaves_nothing() {
    let calls = fs::read(fixture("demo/calls.vcf.gz")).unwrap();
    for share in [0, 1, calls.len() / 3, calls.len() - 29, calls.len() - 1] {
        let folder = tempfile::tempdir().unwrap();
        let output = folder.path().join("report.json");
        let (child, mut writer) = of_a_pipe(folder.path(), &output);
        writer.write_all(&calls[..share]).unwrap();
        drop(writer);
        let got = child.wait_with_output().unwrap();
        let words = String::from_utf8_lossy(&got.stderr);
        assert_eq!(got.status.code(), Some(1), "{share} bytes: {words}");
        assert!(words.contains("calls.pipe"), "{words}");
        assert_eq!(names(folder.path()), ["calls.pipe"]);
    }
}

#[test]
fn an_output_folder_that_vanishes_is_told() {
    let folder = tempfile::tempdir().unwrap();
    let place = folder.path().join("results");
    fs::create_dir(&place).unwrap();
    let (child, mut writer) = of_a_pipe(folder.path(), &place.join("report.json"));
    let calls = fs::read(fixture("demo/calls.vcf.gz")).unwrap();
    let (first, rest) = calls.split_at(calls.len() / 2);
    writer.write_all(first).unwrap();
    wait_until("a temporary file", || !names(&place).is_empty());
    fs::remove_dir_all(&place).unwrap();
    writer.write_all(rest).unwrap();
    drop(writer);
    let got = child.wait_with_output().unwrap();
    let words = String::from_utf8_lossy(&got.stderr);
    assert_eq!(got.status.code(), Some(1), "{words}");
    assert!(words.contains("results/report.json"), "{words}");
}

#[test]
fn signals_that_can_be_caught_leave_nothing() {
    for (signal, number) in [("-TERM", 15), ("-INT", 2)] {
        let folder = tempfile::tempdir().unwrap();
        let output = folder.path().join("report.json");
        let (child, mut writer) = of_a_pipe(folder.path(), &output);
        let calls = fs::read(fixture("demo/calls.vcf.gz")).unwrap();
        writer.write_all(&calls[..calls.len() / 2]).unwrap();
        wait_until("a temporary file", || names(folder.path()).len() == 2);
        send(signal, &child);
        let got = child.wait_with_output().unwrap();
        assert_eq!(got.status.signal(), Some(number), "{:?}", got.status);
        assert!(String::from_utf8_lossy(&got.stderr).contains("stopped"));
        assert_eq!(names(folder.path()), ["calls.pipe"]);
    }
}

/// A kill cannot be caught. Whenever it comes, the final name holds the whole report or is not there,
/// and the next run gives the bytes of an undisturbed one.
#[test]
fn a_kill_at_any_moment_leaves_no_half_report() {
    let folder = tempfile::tempdir().unwrap();
    let whole = folder.path().join("whole.json");
    assert!(measure(&whole).status().unwrap().success());
    // The command line is part of a report; the name of its output is the only difference.
    let told = |path: &Path| {
        let text = fs::read_to_string(path).unwrap();
        text.replace(&path.display().to_string(), "OUT")
    };
    let wanted = told(&whole);
    let start = Instant::now();
    assert!(measure(&whole).status().unwrap().success());
    let once = start.elapsed();
    let mut killed = 0;
    for i in 0..9 {
        let output = folder.path().join(format!("report{i}.json"));
        let mut child = measure(&output).spawn().unwrap();
        std::thread::sleep(once * (i + 1) / 9);
        send("-KILL", &child);
        let status = child.wait().unwrap();
        killed += i32::from(status.signal() == Some(9));
        if output.exists() {
            assert_eq!(told(&output), wanted, "half a report after kill {i}");
        }
        assert!(measure(&output).status().unwrap().success());
        assert_eq!(told(&output), wanted);
    }
    assert!(killed >= 3, "{killed} of 9 runs were killed in time");
}

#[test]
fn a_reader_that_goes_away_is_no_failure() {
    let mut command = genewane();
    command.args(["schema", "report"]).stdout(Stdio::piped());
    let mut child = command.stderr(Stdio::piped()).spawn().unwrap();
    drop(child.stdout.take());
    let got = child.wait_with_output().unwrap();
    assert_eq!(got.status.code(), Some(0));
    assert!(
        got.stderr.is_empty(),
        "{}",
        String::from_utf8_lossy(&got.stderr)
    );
}

/// Few file handles: the work is done, or the file that could not be opened is named.
#[test]
fn few_file_handles_are_enough_or_told() {
    let folder = tempfile::tempdir().unwrap();
    let mut done = 0;
    for limit in [3, 4, 5, 6, 8, 12, 24] {
        let output = folder.path().join("report.json");
        let line = format!("ulimit -n {limit}; exec \"$0\" \"$@\"");
        let inner = measure(&output);
        let mut command = Command::new("sh");
        command.args(["-c", &line]).arg(inner.get_program());
        let got = command.args(inner.get_args()).output().unwrap();
        let words = String::from_utf8_lossy(&got.stderr);
        match got.status.code() {
            Some(0) => done += 1,
            Some(1 | 2 | 126 | 127) => assert!(!output.exists(), "{words}"),
            other => panic!("{limit} handles: {other:?} {words}"),
        }
        assert!(!words.contains("panicked"), "{limit} handles: {words}");
        let _ = fs::remove_file(&output);
        assert_eq!(names(folder.path()), [""; 0]);
    }
    assert!(done >= 1, "24 handles must do");
}

/// Nothing is written but beside the outputs: a folder for temporary files is not needed.
#[test]
fn a_missing_folder_for_temporary_files_does_not_matter() {
    let folder = tempfile::tempdir().unwrap();
    let mut command = measure(&folder.path().join("report.json"));
    let status = command.env("TMPDIR", "/nowhere/at/all").status().unwrap();
    assert!(status.success());
    assert_eq!(names(folder.path()), ["report.json"]);
}

/// A folder that takes no files is told before the calls are read.
#[test]
fn a_folder_that_takes_no_files_is_told_before_the_work() {
    let got = measure(Path::new("/proc/report.json")).output().unwrap();
    let words = String::from_utf8_lossy(&got.stderr);
    assert_eq!(got.status.code(), Some(1), "{words}");
    assert!(words.contains("/proc/report.json"), "{words}");
}
