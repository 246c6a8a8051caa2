//! What is wrong with a piece of a file, before its place is known.
#![expect(
    clippy::indexing_slicing,
    reason = "cut at the length of what is shown"
)]

use std::path::Path;

use super::limits::MAX_QUOTED;
use crate::error::{Error, Place};

/// A problem and its cure; [`Fault::at`] adds the file and the place.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Fault {
    /// What is wrong.
    pub problem: String,
    /// What the user can do.
    pub cure: &'static str,
}

impl Fault {
    /// A fault with its cure.
    pub fn new(problem: impl Into<String>, cure: &'static str) -> Self {
        Fault {
            problem: problem.into(),
            cure,
        }
    }

    /// The error to report.
    pub fn at(self, path: &Path, place: Place) -> Error {
        Error::Calls {
            path: path.into(),
            place,
            problem: self.problem,
            cure: self.cure.into(),
        }
    }
}

/// Cure of what only the program that wrote the file can mend.
pub(super) const WRITE_AGAIN: &str = "write the file again with the program that made it";
/// Cure of a damaged or unfinished copy.
pub(super) const COPY_AGAIN: &str =
    "the file is damaged or was not copied to its end: copy or make it again";

/// A piece of a file for a message: printable, and short whatever the file holds.
pub(super) fn quote(bytes: &[u8]) -> String {
    let shown = &bytes[..bytes.len().min(4 * MAX_QUOTED)];
    let text = String::from_utf8_lossy(shown);
    let mut out: String = text
        .chars()
        .take(MAX_QUOTED)
        .flat_map(char::escape_debug)
        .collect();
    if text.chars().count() > MAX_QUOTED || shown.len() < bytes.len() {
        out.push_str("...");
    }
    format!("\"{out}\"")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn quoted_pieces_are_short_and_printable() {
        assert_eq!(quote(b"0/1"), "\"0/1\"");
        assert_eq!(quote(b"a\tb\x00"), "\"a\\tb\\0\"");
        assert!(quote(&vec![b'A'; 1 << 20]).len() < 60);
        assert!(quote(&[0xff; 50]).ends_with("...\""));
    }
}
