//! Random damage to everything that comes from outside: nothing panics, nothing hangs, every refusal has
//! words. The same seed gives the same inputs.
//!
//! ```sh
//! GENEWANE_FUZZ_RUNS=10000000 GENEWANE_FUZZ_TARGET=text cargo test --release --test fuzz
//! ```
//! Runs are those of the quickest targets; slower ones get their share (`Target::share` of 1000).
//! GENEWANE_FUZZ_SEED picks other inputs. What fails is written to the folder for temporary files.

#[path = "../common/mod.rs"]
mod common;
mod mutate;
mod sums;
mod targets;

use std::collections::HashSet;
use std::hash::{BuildHasher, BuildHasherDefault, DefaultHasher};
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::atomic::Ordering;
use std::time::{Duration, Instant};

use mutate::Mutator;
use sums::renumbered;
use targets::{COMPARED, TARGETS, Target, repacked};

/// Runs of the quickest targets in an ordinary test.
const RUNS: u64 = 4000;
/// No input of 64 KiB takes longer than this, even on a machine that is busy.
const LONGEST: Duration = Duration::from_secs(20);

/// No input of 64 KiB makes the process hold more than this; the corpus and the answers seen are part of it.
const MOST_MEMORY: u64 = 2 << 30;

fn setting(name: &str) -> Option<String> {
    std::env::var(name).ok().filter(|value| !value.is_empty())
}

fn number(name: &str, otherwise: u64) -> u64 {
    setting(name).map_or(otherwise, |text| text.parse().expect("a number"))
}

#[test]
fn nothing_that_comes_in_panics_or_hangs() {
    let runs = number("GENEWANE_FUZZ_RUNS", RUNS);
    let seed = number("GENEWANE_FUZZ_SEED", 1);
    let wanted = setting("GENEWANE_FUZZ_TARGET");
    let mut failures = Vec::new();
    for target in TARGETS
        .iter()
        .filter(|t| wanted.as_deref().is_none_or(|w| w == t.name))
    {
        let start = Instant::now();
        let runs = (runs * target.share / 1000).max(20);
        let (read, ways) = fuzz(target, runs, seed, &mut failures);
        println!(
            "{}: {runs} runs, {read} read, {ways} different answers, {:.0} s",
            target.name,
            start.elapsed().as_secs_f64()
        );
    }
    println!(
        "{} genotypes compared with another library",
        COMPARED.load(Ordering::Relaxed)
    );
    assert!(failures.is_empty(), "{}", failures.join("\n"));
    if let Some(most) = most_memory() {
        println!("at most {} MiB", most >> 20);
        assert!(most < MOST_MEMORY, "{most} bytes at the worst moment");
    }
}

/// The most memory this process held so far, where the system tells (Linux).
fn most_memory() -> Option<u64> {
    let status = std::fs::read_to_string("/proc/self/status").ok()?;
    let line = status.lines().find(|line| line.starts_with("VmHWM:"))?;
    let kib: u64 = line.split_whitespace().nth(1)?.parse().ok()?;
    Some(kib << 10)
}

/// What is damaged is whole before.
#[test]
fn the_corpus_is_read() {
    for target in &TARGETS {
        for bytes in (target.corpus)() {
            let got = (target.read)(&bytes);
            assert!(got.is_ok(), "{}: {got:?}", target.name);
        }
    }
}

/// How many were read, and how many different answers there were.
fn fuzz(target: &Target, runs: u64, seed: u64, failures: &mut Vec<String>) -> (u64, usize) {
    let corpus = (target.corpus)();
    let mut mutator = Mutator::new(seed, corpus);
    let (mut read, mut ways) = (0, HashSet::new());
    let hasher = BuildHasherDefault::<DefaultHasher>::default();
    for run in 0..runs {
        let mut bytes = mutator.next();
        match target.name {
            "blocks" => bytes = repacked(bytes, run),
            // Three of four keep their shape.
            "sums" if run % 4 != 0 => bytes = renumbered(seed ^ run),
            _ => {}
        }
        let start = Instant::now();
        let outcome = catch_unwind(AssertUnwindSafe(|| (target.read)(&bytes)));
        let answer = match outcome {
            Ok(Ok(())) => {
                read += 1;
                String::new()
            }
            Ok(Err(words)) if words.len() > 10 => words,
            Ok(Err(words)) => fail(target, &bytes, &format!("no words: '{words}'"), failures),
            Err(panic) => fail(target, &bytes, &told(&*panic), failures),
        };
        if start.elapsed() > LONGEST {
            fail(target, &bytes, "too slow", failures);
        }
        // The answer without its numbers and names: a way through the reader.
        let way: String = answer
            .chars()
            .filter(|c| c.is_ascii_lowercase())
            .take(80)
            .collect();
        if ways.insert(hasher.hash_one(&way)) {
            mutator.keep(bytes);
        }
    }
    (read, ways.len())
}

fn told(panic: &(dyn std::any::Any + Send)) -> String {
    let text = panic.downcast_ref::<String>().cloned();
    let text = text.or_else(|| panic.downcast_ref::<&str>().map(|s| (*s).to_owned()));
    format!("panic: {}", text.unwrap_or_default())
}

/// Keeps the input and tells of it; returns a name for the way it went.
fn fail(target: &Target, bytes: &[u8], what: &str, failures: &mut Vec<String>) -> String {
    if failures.len() < 20 {
        let path =
            std::env::temp_dir().join(format!("genewane-{}-{}", target.name, failures.len()));
        let _ = std::fs::write(&path, bytes);
        failures.push(format!(
            "{}: {what}; the input is {}",
            target.name,
            path.display()
        ));
    }
    what.to_owned()
}
