//! Words on stderr while calls are read: how much is done, how fast, how long it will take.
//!
//! On a terminal one line is written over and over and cleared at the end; elsewhere, as in the log
//! of a workflow, a line comes every half minute, so that short runs say nothing.

use std::io::{IsTerminal, Write};
use std::path::{Path, PathBuf};
use std::sync::Mutex;
use std::time::{Duration, Instant};

/// Time before the first word on a terminal, and between words there.
const ON_A_TERMINAL: [Duration; 2] = [Duration::from_millis(700), Duration::from_millis(200)];
/// The same in a log.
const IN_A_LOG: [Duration; 2] = [Duration::from_secs(30), Duration::from_secs(30)];

/// Tells how far the reading is.
pub struct Progress {
    /// Compressed bytes of all inputs; `None` where one is a pipe.
    total: Option<u64>,
    started: Instant,
    /// `None` where nothing is to be said.
    place: Option<Where>,
    state: Mutex<State>,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Where {
    Terminal,
    Log,
}

struct State {
    next: Instant,
    /// Characters of the line that stands on the terminal.
    standing: usize,
}

impl Progress {
    /// For files that are read once; `quiet` says nothing.
    pub fn new(paths: &[PathBuf], quiet: bool) -> Self {
        let stderr = std::io::stderr();
        let is_dumb = std::env::var_os("TERM").is_some_and(|term| term == "dumb");
        let place = match stderr.is_terminal() && !is_dumb {
            true => Where::Terminal,
            false => Where::Log,
        };
        let started = Instant::now();
        let first = match place {
            Where::Terminal => ON_A_TERMINAL[0],
            Where::Log => IN_A_LOG[0],
        };
        Progress {
            total: paths.iter().map(|path| size_of_file(path)).sum(),
            started,
            place: (!quiet).then_some(place),
            state: Mutex::new(State {
                next: started + first,
                standing: 0,
            }),
        }
    }

    /// So many compressed bytes have been taken.
    pub fn at(&self, bytes: u64) {
        let Some(place) = self.place else { return };
        let now = Instant::now();
        let Ok(mut state) = self.state.lock() else {
            return;
        };
        if now < state.next {
            return;
        }
        let line = line(bytes, self.total, now - self.started);
        let mut stderr = std::io::stderr().lock();
        // A closed stderr is no reason to stop.
        let _ = match place {
            Where::Log => {
                state.next = now + IN_A_LOG[1];
                writeln!(stderr, "genewane: {line}")
            }
            Where::Terminal => {
                state.next = now + ON_A_TERMINAL[1];
                let width = line.chars().count();
                let blank = " ".repeat(state.standing.saturating_sub(width));
                state.standing = width;
                write!(stderr, "\r{line}{blank}")
            }
        };
        let _ = stderr.flush();
    }
}

impl Drop for Progress {
    /// Clears the line, whatever the end.
    fn drop(&mut self) {
        let Ok(state) = self.state.get_mut() else {
            return;
        };
        if state.standing > 0 {
            eprint!("\r{}\r", " ".repeat(state.standing));
        }
    }
}

fn size_of_file(path: &Path) -> Option<u64> {
    let found = std::fs::metadata(path).ok()?;
    found.is_file().then_some(found.len())
}

/// `34 % read, 12.3 of 36.0 MB, 8.1 MB/s, 3 s left`
fn line(bytes: u64, total: Option<u64>, spent: Duration) -> String {
    let megabytes = |bytes: f64| format!("{:.1}", bytes / 1e6);
    let seconds = spent.as_secs_f64().max(1e-3);
    let rate = bytes as f64 / seconds;
    let rate_words = format!("{} MB/s", megabytes(rate));
    match total.filter(|&total| total > 0) {
        None => format!("{} MB read, {rate_words}", megabytes(bytes as f64)),
        Some(total) => {
            let share = (bytes as f64 / total as f64).min(1.0);
            let left = total.saturating_sub(bytes) as f64 / rate.max(1.0);
            format!(
                "{:.0} % read, {} of {} MB, {rate_words}, {} left",
                (100.0 * share).floor(),
                megabytes(bytes as f64),
                megabytes(total as f64),
                time(left)
            )
        }
    }
}

/// `45 s`, `12 min`, `3 h 20 min`
fn time(seconds: f64) -> String {
    match seconds {
        s if s < 90.0 => format!("{s:.0} s"),
        s if s < 5400.0 => format!("{:.0} min", s / 60.0),
        s => {
            let minutes = (s / 60.0).round() as u64;
            format!("{} h {} min", minutes / 60, minutes % 60)
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn share_rate_and_time_left_fit_together() {
        // 10 of 40 MB in 5 s: 2 MB/s, so 30 MB take 15 s more.
        let told = line(10_000_000, Some(40_000_000), Duration::from_secs(5));
        assert_eq!(told, "25 % read, 10.0 of 40.0 MB, 2.0 MB/s, 15 s left");
        let told = line(10_000_000, None, Duration::from_secs(5));
        assert_eq!(told, "10.0 MB read, 2.0 MB/s");
        // Nothing read yet, and more than was announced, as of a file that grows.
        assert!(line(0, Some(9), Duration::ZERO).starts_with("0 % read"));
        assert!(line(12, Some(9), Duration::from_secs(1)).starts_with("100 % read"));
    }

    #[test]
    fn times_are_told_in_the_unit_of_their_size() {
        assert_eq!(time(3.2), "3 s");
        assert_eq!(time(720.0), "12 min");
        assert_eq!(time(12_000.0), "3 h 20 min");
    }
}
