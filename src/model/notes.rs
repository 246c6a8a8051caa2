//! What is told to a person: problems that stop the work, notes that do not.

/// One problem of a sheet, a programme or another small input file.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Problem {
    /// 1-based row (line) of the file, where one is to blame.
    pub row: Option<u64>,
    /// What is wrong, with the offending value.
    pub what: String,
    /// What the user can do.
    pub cure: String,
}

impl Problem {
    /// A problem of one row of the file.
    pub fn at(row: u64, what: impl Into<String>, cure: impl Into<String>) -> Self {
        Problem {
            row: Some(row),
            what: what.into(),
            cure: cure.into(),
        }
    }

    /// A problem of the file, or of several rows together.
    pub fn of_all(what: impl Into<String>, cure: impl Into<String>) -> Self {
        Problem {
            row: None,
            what: what.into(),
            cure: cure.into(),
        }
    }
}

/// Something the reader of a result must know that stops nothing.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Note {
    /// A stable name for programs, such as `generation_length_missing`.
    pub code: &'static str,
    /// What it concerns: a population, a stratum, or `sheet`, `calls`, `programme`.
    pub place: String,
    /// One or two sentences for a person.
    pub text: String,
}

impl Note {
    /// A note about a place.
    pub fn new(code: &'static str, place: impl Into<String>, text: impl Into<String>) -> Self {
        Note {
            code,
            place: place.into(),
            text: text.into(),
        }
    }
}

/// How many names a note spells out before it goes on with a count.
const NAMES_SPELLED_OUT: usize = 10;

/// Names in quotes, separated by commas; beyond ten the rest as a count.
pub fn spell_out<'a>(names: impl IntoIterator<Item = &'a str>) -> String {
    let names: Vec<&str> = names.into_iter().collect();
    let mut out = String::new();
    for (i, name) in names.iter().take(NAMES_SPELLED_OUT).enumerate() {
        if i > 0 {
            out.push_str(", ");
        }
        out.push_str(&format!("'{name}'"));
    }
    if names.len() > NAMES_SPELLED_OUT {
        out.push_str(&format!(" and {} more", names.len() - NAMES_SPELLED_OUT));
    }
    out
}

/// The candidate a person most likely meant by `written`: the same letters and digits in other case
/// or punctuation, else one holding the other as a whole, else the least edit distance if that is
/// at most a third of the longer word. The first of equals. `None` when nothing is near.
pub fn nearest<'a>(
    written: &str,
    candidates: impl IntoIterator<Item = &'a str>,
) -> Option<&'a str> {
    let plain = plain_letters(written);
    if plain.is_empty() {
        return None;
    }
    candidates
        .into_iter()
        .filter_map(|candidate| {
            let other = plain_letters(candidate);
            if other.is_empty() {
                return None;
            }
            let longer = plain.len().max(other.len());
            let shorter = plain.len().min(other.len());
            let distance = edit_distance(&plain, &other);
            let holds = shorter >= 3 && (starts(&plain, &other) || starts(&other, &plain));
            (holds || 3 * distance <= longer).then_some((distance, candidate))
        })
        .min_by_key(|&(distance, _)| distance)
        .map(|(_, candidate)| candidate)
}

/// The letters and digits of a name in lower case: what stays when case, blanks and marks differ.
pub fn plain_letters(name: &str) -> Vec<char> {
    name.chars()
        .filter(|c| c.is_alphanumeric())
        .flat_map(char::to_lowercase)
        .collect()
}

fn starts(whole: &[char], part: &[char]) -> bool {
    whole.starts_with(part)
}

/// Least number of insertions, deletions, substitutions and swaps of neighbours (Damerau 1964), each
/// letter touched once.
fn edit_distance(a: &[char], b: &[char]) -> usize {
    let mut table = vec![vec![0; b.len() + 1]; a.len() + 1];
    for i in 0..=a.len() {
        for j in 0..=b.len() {
            table[i][j] = match (i, j) {
                (0, _) => j,
                (_, 0) => i,
                _ => {
                    let substituted = table[i - 1][j - 1] + usize::from(a[i - 1] != b[j - 1]);
                    let mut least = substituted
                        .min(table[i - 1][j] + 1)
                        .min(table[i][j - 1] + 1);
                    if i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1] {
                        least = least.min(table[i - 2][j - 2] + 1);
                    }
                    least
                }
            };
        }
    }
    table[a.len()][b.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    // The textbook pair: kitten -> sitten -> sittin -> sitting.
    #[test]
    fn distance_of_the_textbook_pair() {
        let (a, b) = (plain_letters("kitten"), plain_letters("sitting"));
        assert_eq!(edit_distance(&a, &b), 3);
        assert_eq!(
            edit_distance(&plain_letters("alder"), &plain_letters("aldre")),
            1
        );
    }

    #[test]
    fn nearest_forgives_case_marks_slips_and_short_forms() {
        let headers = ["Sample ID", "pop", "jahr", "sex"];
        assert_eq!(nearest("sample", headers), Some("Sample ID"));
        assert_eq!(nearest("population", headers), Some("pop"));
        assert_eq!(nearest("year", headers), None);
        assert_eq!(nearest("censis", ["baseline", "census"]), Some("census"));
        assert_eq!(nearest("", headers), None);
    }

    #[test]
    fn long_lists_end_in_a_count() {
        let names: Vec<String> = (0..12).map(|i| format!("s{i}")).collect();
        let text = spell_out(names.iter().map(String::as_str));
        assert!(text.ends_with("'s9' and 2 more"), "{text}");
    }
}
