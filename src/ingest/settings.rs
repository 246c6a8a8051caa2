//! Settings files in TOML, walked by hand so that every problem is told at once with its line.
//!
//! A derived reader stops at the first problem; a person who mends a file wants all of them.

use toml::Spanned;
use toml::de::{DeTable, DeValue};

use crate::error::Problem;
use crate::model::nearest;

/// A value with its place in the text.
pub type Value<'a> = Spanned<DeValue<'a>>;

/// What a number must be, as a test and in words.
#[derive(Clone, Copy)]
pub struct Bound {
    holds: fn(f64) -> bool,
    words: &'static str,
}

/// Any finite number.
pub const FINITE: Bound = Bound {
    holds: |_| true,
    words: "that is finite",
};
/// Above 0.
pub const ABOVE_ZERO: Bound = Bound {
    holds: |x| x > 0.0,
    words: "above 0",
};
/// 0 or more.
pub const AT_LEAST_ZERO: Bound = Bound {
    holds: |x| x >= 0.0,
    words: "of 0 or more",
};
/// 1 or more.
pub const AT_LEAST_ONE: Bound = Bound {
    holds: |x| x >= 1.0,
    words: "of 1 or more",
};
/// 2 or more.
pub const AT_LEAST_TWO: Bound = Bound {
    holds: |x| x >= 2.0,
    words: "of 2 or more",
};
/// Above 0 and below 1.
pub const SHARE: Bound = Bound {
    holds: |x| x > 0.0 && x < 1.0,
    words: "above 0 and below 1; write 0.9 for 90 %",
};
/// Above 0, at most 2: equal families bring Ne/N to twice the census.
pub const RATIO: Bound = Bound {
    holds: |x| x > 0.0 && x <= 2.0,
    words: "above 0 and at most 2",
};

/// Walks a document, collecting its problems.
pub struct Walker<'a> {
    text: &'a str,
    problems: Vec<Problem>,
}

/// Reads a whole document, given as the bytes of its file, with `read`; or every problem, in the
/// order of the file.
pub fn walk<T>(
    bytes: &[u8],
    read: impl FnOnce(&mut Walker, &DeTable) -> T,
) -> Result<T, Vec<Problem>> {
    let text = std::str::from_utf8(bytes).map_err(|e| {
        let row = line_at(bytes, e.valid_up_to());
        vec![Problem::at(
            row,
            "the text is not UTF-8",
            "save the file as UTF-8",
        )]
    })?;
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    let (document, broken) = DeTable::parse_recoverable(text);
    if !broken.is_empty() {
        // Values near broken syntax are guesses, so they are not judged.
        let told = |e: &toml::de::Error| Problem {
            row: e.span().map(|span| line_at(text.as_bytes(), span.start)),
            what: format!("this is not TOML: {}", e.message()),
            cure: "write 'key = value', text in quotes, and tables as [name]".to_string(),
        };
        let mut problems: Vec<Problem> = broken.iter().map(told).collect();
        problems.sort_by_key(|problem| problem.row);
        return Err(problems);
    }
    let mut walker = Walker {
        text,
        problems: Vec::new(),
    };
    let value = read(&mut walker, document.get_ref());
    if walker.problems.is_empty() {
        Ok(value)
    } else {
        walker.problems.sort_by_key(|problem| problem.row);
        Err(walker.problems)
    }
}

/// 1-based line of a byte.
fn line_at(text: &[u8], byte: usize) -> u64 {
    1 + text.iter().take(byte).filter(|&&b| b == b'\n').count() as u64
}

/// The value of a key.
pub fn find<'t, 'v>(table: &'t DeTable<'v>, name: &str) -> Option<&'t Value<'v>> {
    table
        .iter()
        .find(|(key, _)| key.get_ref().as_ref() == name)
        .map(|(_, value)| value)
}

impl Walker<'_> {
    /// 1-based line of a value.
    pub fn row(&self, value: &Value) -> u64 {
        line_at(self.text.as_bytes(), value.span().start)
    }

    /// Notes a problem of a value.
    pub fn complain(&mut self, value: &Value, what: impl Into<String>, cure: &str) {
        let row = self.row(value);
        self.problems.push(Problem::at(row, what, cure));
    }

    /// Notes a problem of a line.
    pub fn complain_at(&mut self, row: u64, what: impl Into<String>, cure: impl Into<String>) {
        self.problems.push(Problem::at(row, what, cure));
    }

    /// Notes a problem of the file as a whole.
    pub fn complain_of_all(&mut self, what: &str, cure: &str) {
        self.problems.push(Problem::of_all(what, cure));
    }

    /// A key that nobody reads is a setting that silently does nothing: refused.
    pub fn refuse_unknown(&mut self, table: &DeTable, known: &[&str], whose: &str) {
        for key in table.keys() {
            let name = key.get_ref().as_ref();
            if known.contains(&name) {
                continue;
            }
            let cure = match nearest(name, known.iter().copied()) {
                Some(near) => format!("did you mean '{near}'?"),
                None => format!("the keys are {}", known.join(", ")),
            };
            let row = line_at(self.text.as_bytes(), key.span().start);
            self.complain_at(row, format!("unknown key '{name}'{whose}"), cure);
        }
    }

    /// A table.
    pub fn table<'t, 'v>(&mut self, value: &'t Value<'v>, name: &str) -> Option<&'t DeTable<'v>> {
        if let DeValue::Table(table) = value.get_ref() {
            return Some(table);
        }
        let cure = format!("write it as [{name}]");
        self.complain(value, format!("{name} is not a table"), &cure);
        None
    }

    /// The tables of a list `[[name]]`, each with the value it is, for its place.
    pub fn tables<'t, 'v>(
        &mut self,
        top: &'t DeTable<'v>,
        name: &str,
    ) -> Vec<(&'t Value<'v>, &'t DeTable<'v>)> {
        let Some(value) = find(top, name) else {
            return Vec::new();
        };
        let DeValue::Array(items) = value.get_ref() else {
            let cure = format!("write each as [[{name}]]");
            self.complain(value, format!("{name} is not a list of tables"), &cure);
            return Vec::new();
        };
        let mut tables = Vec::new();
        for item in items.iter() {
            match item.get_ref() {
                DeValue::Table(table) => tables.push((item, table)),
                _ => {
                    let cure = format!("write each as [[{name}]]");
                    self.complain(item, format!("this {name} is not a table"), &cure);
                }
            }
        }
        tables
    }

    /// A number within its bound.
    pub fn number(&mut self, table: &DeTable, name: &str, bound: Bound) -> Option<f64> {
        let value = find(table, name)?;
        let number = number(value).filter(|&x| x.is_finite() && (bound.holds)(x));
        if number.is_none() {
            self.complain(
                value,
                format!("{name} is not a number {}", bound.words),
                "write digits without quotes, with a dot as decimal mark",
            );
        }
        number
    }

    /// Numbers within their bound: at least one.
    pub fn numbers(&mut self, table: &DeTable, name: &str, bound: Bound) -> Option<Vec<f64>> {
        let value = find(table, name)?;
        let numbers: Option<Vec<f64>> = match value.get_ref() {
            DeValue::Array(items) => items
                .iter()
                .map(|item| number(item).filter(|&x| x.is_finite() && (bound.holds)(x)))
                .collect(),
            _ => number(value)
                .filter(|&x| x.is_finite() && (bound.holds)(x))
                .map(|x| vec![x]),
        };
        let numbers = numbers.filter(|list| !list.is_empty());
        if numbers.is_none() {
            self.complain(
                value,
                format!("{name} is not a list of numbers, each {}", bound.words),
                "write numbers in brackets: [50, 60, 80]",
            );
        }
        numbers
    }

    /// A whole number of `least` to `most`.
    pub fn whole(&mut self, table: &DeTable, name: &str, least: i64, most: i64) -> Option<i64> {
        let value = find(table, name)?;
        let whole = integer(value).filter(|n| (least..=most).contains(n));
        if whole.is_none() {
            self.complain(
                value,
                format!("{name} is not a whole number from {least} to {most}"),
                "write digits without quotes",
            );
        }
        whole
    }

    /// Yes or no.
    pub fn flag(&mut self, table: &DeTable, name: &str) -> Option<bool> {
        let value = find(table, name)?;
        match value.get_ref() {
            DeValue::Boolean(flag) => Some(*flag),
            _ => {
                self.complain(
                    value,
                    format!("{name} is neither true nor false"),
                    "write true or false without quotes",
                );
                None
            }
        }
    }

    /// Text that is not blank.
    pub fn text(&mut self, table: &DeTable, name: &str) -> Option<String> {
        let value = find(table, name)?;
        match value.get_ref() {
            DeValue::String(text) if !text.trim().is_empty() => Some(text.trim().to_string()),
            _ => {
                self.complain(value, format!("{name} is no text"), "write it in quotes");
                None
            }
        }
    }

    /// One text, or a list of texts.
    pub fn texts(&mut self, table: &DeTable, name: &str) -> Vec<String> {
        let Some(value) = find(table, name) else {
            return Vec::new();
        };
        let one = |value: &Value| match value.get_ref() {
            DeValue::String(text) if !text.trim().is_empty() => Some(text.trim().to_string()),
            _ => None,
        };
        let texts: Option<Vec<String>> = match value.get_ref() {
            DeValue::Array(items) => items.iter().map(one).collect(),
            _ => one(value).map(|text| vec![text]),
        };
        match texts.filter(|list| !list.is_empty()) {
            Some(texts) => texts,
            None => {
                self.complain(
                    value,
                    format!("{name} is no text and no list of texts"),
                    "write \"Alder\" or [\"Alder\", \"Birch\"]",
                );
                Vec::new()
            }
        }
    }
}

/// A whole number, as written.
pub(super) fn integer(value: &Value) -> Option<i64> {
    match value.get_ref() {
        DeValue::Integer(digits) => i64::from_str_radix(digits.as_str(), digits.radix()).ok(),
        _ => None,
    }
}

/// A number, whole or not.
pub(super) fn number(value: &Value) -> Option<f64> {
    match value.get_ref() {
        DeValue::Float(digits) => digits.as_str().parse().ok(),
        _ => integer(value).map(|whole| whole as f64),
    }
}
