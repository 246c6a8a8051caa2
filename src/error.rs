//! What can go wrong, where, and how to mend it. One exit code per class.

use std::cell::Cell;
use std::fmt;
use std::io;
use std::panic::AssertUnwindSafe;
use std::path::PathBuf;
use std::sync::Once;

pub use crate::model::Problem;

/// Result of everything that can fail here.
pub type Result<T> = std::result::Result<T, Error>;

/// A failure, worded once, for a person.
#[derive(Debug, thiserror::Error)]
pub enum Error {
    /// Options that do not go together, or an unknown name. Exit code 2.
    #[error("{0}")]
    Usage(String),
    /// An input sheet, programme, scenario or policy with problems, all of them at once. Exit code 2.
    #[error("{}", list(path, problems))]
    Sheet {
        /// The file as the user named it.
        path: PathBuf,
        /// Every problem found, in the order of the file.
        problems: Vec<Problem>,
    },
    /// Genotype calls that cannot be trusted. Exit code 1.
    #[error("{}: {place}: {problem}\n  cure: {cure}", path.display())]
    Calls {
        /// The file as the user named it (`-` for standard input).
        path: PathBuf,
        /// Where in the file.
        place: Place,
        /// What is wrong.
        problem: String,
        /// What the user can do.
        cure: String,
    },
    /// The operating system refused. Exit code 1; a broken pipe ends quietly with 0.
    #[error("{}: cannot {doing}: {source}", path.display())]
    Io {
        /// The file or stream.
        path: PathBuf,
        /// A verb phrase: "read", "create", "rename into place".
        doing: &'static str,
        /// The system's own words.
        source: io::Error,
    },
    /// A document of ours (report, tally) that cannot be used. Exit code 1.
    #[error("{}: {problem}\n  cure: {cure}", path.display())]
    Document {
        /// The file as the user named it.
        path: PathBuf,
        /// What is wrong, with the field's place.
        problem: String,
        /// What the user can do.
        cure: String,
    },
    /// A verdict that found a breach: the work was done, its answer is this. Exit code 3.
    #[error("{0}")]
    Breach(String),
}

impl Error {
    /// The process exit code of this class: 1 the work failed, 2 usage or an invalid sheet, 3 a
    /// breach.
    pub fn exit_code(&self) -> u8 {
        match self {
            Error::Usage(_) | Error::Sheet { .. } => 2,
            Error::Calls { .. } | Error::Io { .. } | Error::Document { .. } => 1,
            Error::Breach(_) => 3,
        }
    }

    /// Whether the reader of our output went away, which is no failure of ours.
    pub fn is_broken_pipe(&self) -> bool {
        matches!(self, Error::Io { source, .. } if source.kind() == io::ErrorKind::BrokenPipe)
    }

    /// An I/O failure with its path and what was being done.
    pub fn io(path: impl Into<PathBuf>, doing: &'static str, source: io::Error) -> Self {
        Error::Io {
            path: path.into(),
            doing,
            source,
        }
    }
}

/// A place in a file of genotype calls.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Place {
    /// Before the first record.
    Header,
    /// The record with this 1-based number.
    Record(u64),
    /// The record with this 1-based number, with its contig and position.
    Locus {
        /// 1-based number among the records of the file.
        record: u64,
        /// Contig as written.
        contig: String,
        /// 1-based position.
        position: u64,
    },
    /// A compressed block that starts at this byte of the file.
    Byte(u64),
    /// The end of the file.
    End,
}

impl fmt::Display for Place {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Place::Header => write!(f, "header"),
            Place::Record(n) => write!(f, "record {n}"),
            Place::Locus {
                record,
                contig,
                position,
            } => {
                write!(f, "record {record} ({contig}:{position})")
            }
            Place::Byte(offset) => write!(f, "block at byte {offset}"),
            Place::End => write!(f, "end of file"),
        }
    }
}

/// Runs a library on a file that someone may have made to harm: should it panic, that is a damaged file,
/// told as `broken`, and not a word of the panic itself comes out.
pub(crate) fn guarded<T>(
    broken: &str,
    read: impl FnOnce() -> std::result::Result<T, String>,
) -> std::result::Result<T, String> {
    static QUIET: Once = Once::new();
    QUIET.call_once(|| {
        let before = std::panic::take_hook();
        std::panic::set_hook(Box::new(move |panic| {
            if !GUARDED.get() {
                before(panic);
            }
        }));
    });
    let outer = GUARDED.replace(true);
    let outcome = std::panic::catch_unwind(AssertUnwindSafe(read));
    GUARDED.set(outer);
    outcome.unwrap_or_else(|_| Err(broken.to_owned()))
}

thread_local! {
    /// Whether a panic of this thread is going to be caught by [`guarded`].
    static GUARDED: Cell<bool> = const { Cell::new(false) };
}

fn list(path: &std::path::Path, problems: &[Problem]) -> String {
    let mut out = format!("{}: {} problem(s)", path.display(), problems.len());
    for p in problems {
        match p.row {
            Some(row) => out.push_str(&format!("\n  row {row}: {} ({})", p.what, p.cure)),
            None => out.push_str(&format!("\n  {} ({})", p.what, p.cure)),
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_panic_of_a_library_is_a_damaged_file() {
        assert_eq!(guarded("broken", || Ok(5)), Ok(5));
        assert_eq!(
            guarded::<()>("broken", || Err("cut".into())),
            Err("cut".into())
        );
        assert_eq!(
            guarded::<()>("broken", || panic!("inside")),
            Err("broken".into())
        );
        assert!(!GUARDED.get());
    }
}
