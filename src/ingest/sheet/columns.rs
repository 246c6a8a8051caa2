//! Which column of the sheet holds what.
#![expect(clippy::indexing_slicing, reason = "numbers of the same list")]

use crate::model::{Note, Problem, nearest, plain_letters};

use super::table::Record;

/// Headers that other sheets use for the required columns: only for advice, never taken by themselves.
const OTHER_WORDS: [(&str, &[&str]); 3] = [
    (
        "sample",
        &["id", "individual", "animal", "specimen", "name", "tag"],
    ),
    (
        "population",
        &[
            "site", "location", "locality", "stock", "group", "river", "lake", "herd",
        ],
    ),
    ("year", &["season", "time", "yr", "sampled", "collected"]),
];

const REQUIRED: [&str; 3] = ["sample", "population", "year"];
const OPTIONAL: [&str; 7] = [
    "visit",
    "sex",
    "generation",
    "replicate_of",
    "batch",
    "date",
    "use",
];

/// Places of the columns in use, and the number of columns of the header.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub(super) struct Columns {
    pub width: usize,
    pub sample: Option<usize>,
    pub population: Option<usize>,
    pub year: Option<usize>,
    pub date: Option<usize>,
    pub visit: Option<usize>,
    pub sex: Option<usize>,
    pub generation: Option<usize>,
    pub replicate_of: Option<usize>,
    pub batch: Option<usize>,
    pub used: Option<usize>,
}

impl Columns {
    /// Reads the header row; problems and notes are added to the lists.
    pub fn of(header: &Record, problems: &mut Vec<Problem>, notes: &mut Vec<Note>) -> Self {
        let mut names = Vec::with_capacity(header.fields.len());
        for (i, field) in header.fields.iter().enumerate() {
            match std::str::from_utf8(field) {
                Ok(name) => names.push(name.trim().to_string()),
                Err(_) => {
                    names.push(String::new());
                    problems.push(Problem::at(
                        header.row,
                        format!("the header of column {} is not UTF-8 text", i + 1),
                        "save the sheet as 'CSV UTF-8'",
                    ));
                }
            }
        }
        let mut find = |name: &str| find(name, &names, header.row, problems);
        let columns = Columns {
            width: names.len(),
            sample: find("sample"),
            population: find("population"),
            year: find("year"),
            date: find("date"),
            visit: find("visit"),
            sex: find("sex"),
            generation: find("generation"),
            replicate_of: find("replicate_of"),
            batch: find("batch"),
            used: find("use"),
        };
        let required = [
            ("sample", columns.sample.is_some()),
            ("population", columns.population.is_some()),
            ("year", columns.year.is_some() || columns.date.is_some()),
        ];
        for (name, _) in required.iter().filter(|(_, found)| !found) {
            problems.push(missing(name, &names, header.row));
        }
        for name in &names {
            let meant = OPTIONAL.iter().find(|optional| {
                !name.eq_ignore_ascii_case(optional)
                    && plain_letters(name) == plain_letters(optional)
            });
            if let Some(meant) = meant {
                notes.push(Note::new(
                    "column_ignored",
                    "sheet",
                    format!("Column '{name}' is ignored; name it '{meant}' to have it used."),
                ));
            }
        }
        columns
    }
}

/// The only column of that name; two are a problem, and the first is used.
fn find(name: &str, names: &[String], row: u64, problems: &mut Vec<Problem>) -> Option<usize> {
    let mut places = (0..names.len()).filter(|&i| names[i].eq_ignore_ascii_case(name));
    let first = places.next()?;
    if let Some(second) = places.next() {
        problems.push(Problem::at(
            row,
            format!(
                "columns {} and {} are both named '{name}'",
                first + 1,
                second + 1
            ),
            "rename or remove one of them",
        ));
    }
    Some(first)
}

fn missing(name: &str, names: &[String], row: u64) -> Problem {
    let others = OTHER_WORDS
        .iter()
        .find(|(known, _)| *known == name)
        .map_or(&[][..], |(_, w)| w);
    let headers = || names.iter().map(String::as_str).filter(|h| !h.is_empty());
    // A header that is a column of its own right is not a misspelt other one.
    let unknown = || {
        headers().filter(|h| {
            let own = REQUIRED
                .iter()
                .chain(&OPTIONAL)
                .any(|known| h.eq_ignore_ascii_case(known));
            !own
        })
    };
    let near = nearest(name, unknown())
        .or_else(|| others.iter().find_map(|word| nearest(word, unknown())));
    let what = if name == "year" {
        "there is no column 'year' (nor 'date')".to_string()
    } else {
        format!("there is no column '{name}'")
    };
    let cure = match near {
        Some(near) => format!("if '{near}' is meant, name it '{name}'"),
        None => format!(
            "add it; the header row has {}",
            headers()
                .map(|h| format!("'{h}'"))
                .collect::<Vec<_>>()
                .join(", ")
        ),
    };
    Problem::at(row, what, cure)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn columns(header: &[&str]) -> (Columns, Vec<Problem>, Vec<Note>) {
        let record = Record {
            row: 1,
            fields: header.iter().map(|h| h.as_bytes().to_vec()).collect(),
        };
        let (mut problems, mut notes) = (Vec::new(), Vec::new());
        let columns = Columns::of(&record, &mut problems, &mut notes);
        (columns, problems, notes)
    }

    #[test]
    fn headers_may_differ_in_case_and_blanks_and_stand_in_any_order() {
        let (columns, problems, notes) = columns(&["Year ", "note", " SAMPLE", "Population"]);
        assert_eq!(
            (columns.sample, columns.population, columns.year),
            (Some(2), Some(3), Some(0))
        );
        assert!(problems.is_empty() && notes.is_empty());
    }

    #[test]
    fn each_missing_column_is_told_with_the_nearest_header() {
        let (_, problems, _) = columns(&["Individual", "pop", "Season"]);
        let cures: Vec<&str> = problems.iter().map(|p| p.cure.as_str()).collect();
        assert_eq!(
            cures,
            [
                "if 'Individual' is meant, name it 'sample'",
                "if 'pop' is meant, name it 'population'",
                "if 'Season' is meant, name it 'year'",
            ]
        );
        let (_, problems, _) = columns(&["sample", "population", "depth"]);
        assert!(problems[0].cure.contains("'depth'"), "{problems:?}");
    }

    #[test]
    fn a_date_stands_in_for_a_year() {
        let (columns, problems, _) = columns(&["sample", "population", "date"]);
        assert_eq!((columns.year, columns.date), (None, Some(2)));
        assert!(problems.is_empty());
    }

    #[test]
    fn twice_the_same_column_and_near_optional_names_are_told() {
        let (_, problems, notes) =
            columns(&["sample", "Sample", "population", "year", "replicate of"]);
        assert_eq!(problems.len(), 1);
        assert!(problems[0].what.contains("columns 1 and 2"));
        assert!(notes[0].text.contains("'replicate_of'"));
    }
}
