//! Notes and findings as warnings of the report.

use super::wire::Warning;
use crate::model::Note;

/// A note of an earlier part, as the report writes it.
pub fn warning(note: &Note) -> Warning {
    Warning {
        code: note.code.to_owned(),
        place: note.place.clone(),
        text: note.text.clone(),
    }
}
