//! `##` lines of a header: contigs, and the numbering of names that binary records use.
#![expect(
    clippy::indexing_slicing,
    reason = "places were found in the same line"
)]

use std::collections::HashMap;
use std::sync::Arc;

use super::fault::{Fault, WRITE_AGAIN, quote};
use super::limits::MAX_NAMES;

/// One `##KEY=<NAME=VALUE,...>` line, as far as it matters here.
#[derive(Debug, Default, PartialEq, Eq)]
pub(super) struct MetaLine {
    /// KEY.
    pub key: String,
    /// `ID`.
    pub id: Option<String>,
    /// `length`, where it is a number.
    pub length: Option<u64>,
    /// `IDX`, as written.
    pub index: Option<String>,
}

impl MetaLine {
    /// Reads a line without its `##`; `None` when it has no `<...>` value.
    ///
    /// A quote that is never closed is common in descriptions written by hand. ID comes first and IDX
    /// last, so they are found without regard to quotes then.
    pub fn parse(line: &[u8]) -> Option<Self> {
        let equals = memchr::memchr(b'=', line)?;
        let inner = line[equals + 1..].strip_prefix(b"<")?.strip_suffix(b">")?;
        let mut meta = MetaLine {
            key: text(&line[..equals]),
            ..MetaLine::default()
        };
        let fields =
            split_unquoted(inner).unwrap_or_else(|| inner.split(|&byte| byte == b',').collect());
        for field in fields {
            let Some(equals) = memchr::memchr(b'=', field) else {
                continue;
            };
            let value = &field[equals + 1..];
            match &field[..equals] {
                b"ID" => meta.id = Some(text(value)),
                b"length" => meta.length = std::str::from_utf8(value).ok()?.parse().ok(),
                b"IDX" => meta.index = Some(text(value)),
                _ => {}
            }
        }
        Some(meta)
    }
}

fn text(bytes: &[u8]) -> String {
    String::from_utf8_lossy(bytes).into_owned()
}

/// Splits at commas outside of double quotes; a backslash guards the next byte inside of them.
/// `None` when a quote is never closed.
fn split_unquoted(inner: &[u8]) -> Option<Vec<&[u8]>> {
    let mut fields = Vec::new();
    let (mut start, mut quoted, mut guarded) = (0, false, false);
    for (i, &byte) in inner.iter().enumerate() {
        match byte {
            _ if guarded => guarded = false,
            b'\\' if quoted => guarded = true,
            b'"' => quoted = !quoted,
            b',' if !quoted => {
                fields.push(&inner[start..i]);
                start = i + 1;
            }
            _ => {}
        }
    }
    fields.push(&inner[start..]);
    (!quoted).then_some(fields)
}

/// Names by the numbers that binary records use: the order of the header unless `IDX` says otherwise.
#[derive(Debug, Default, Clone)]
pub(super) struct Numbering {
    names: HashMap<u32, Arc<str>>,
    numbers: HashMap<Arc<str>, u32>,
    next: u32,
}

impl Numbering {
    /// The numbering of INFO, FILTER and FORMAT names, in which `PASS` is always 0.
    pub fn of_keys() -> Self {
        let mut numbering = Numbering::default();
        numbering.insert(0, "PASS");
        numbering
    }

    fn insert(&mut self, number: u32, name: &str) {
        let name: Arc<str> = name.into();
        self.names.insert(number, Arc::clone(&name));
        self.numbers.insert(name, number);
        self.next = self.next.max(number.saturating_add(1));
    }

    /// Adds a name, which keeps its number when it is listed again; true when it is new.
    ///
    /// # Errors
    /// `IDX` is no number, or is taken by another name, or there are more than [`MAX_NAMES`].
    pub fn add(&mut self, name: &str, index: Option<&str>) -> Result<bool, Fault> {
        let known = self.numbers.get(name).copied();
        let number = match index {
            Some(index) => index.parse().map_err(|_| {
                let index = quote(index.as_bytes());
                Fault::new(format!("IDX={index} is not a number"), WRITE_AGAIN)
            })?,
            None => known.unwrap_or(self.next),
        };
        let name_for_message = || quote(name.as_bytes());
        match (known, self.names.get(&number)) {
            (Some(same), _) if same == number => Ok(false),
            (Some(_), _) => Err(Fault::new(
                format!("{} has two different IDX numbers", name_for_message()),
                WRITE_AGAIN,
            )),
            (None, Some(other)) => Err(Fault::new(
                format!(
                    "{} and {} have the same IDX={number}",
                    quote(other.as_bytes()),
                    name_for_message()
                ),
                WRITE_AGAIN,
            )),
            (None, None) if self.names.len() == MAX_NAMES => Err(Fault::new(
                format!("the header lists more than the {MAX_NAMES} names that are read"),
                "drop ## lines that are not needed",
            )),
            (None, None) => {
                self.insert(number, name);
                Ok(true)
            }
        }
    }

    /// The name of a number.
    pub fn name(&self, number: u32) -> Option<&str> {
        self.names.get(&number).map(AsRef::as_ref)
    }

    /// The number of a name.
    pub fn number(&self, name: &str) -> Option<u32> {
        self.numbers.get(name).copied()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn takes_lines_apart_at_unquoted_commas() {
        let line = br#"FORMAT=<ID=GT,Number=1,Type=String,Description="a \"b\", c=<d>",IDX=7>"#;
        let meta = MetaLine::parse(line).unwrap();
        assert_eq!(meta.id.as_deref(), Some("GT"));
        assert_eq!(meta.index.as_deref(), Some("7"));
        let contig = MetaLine::parse(b"contig=<ID=lake,length=1000>").unwrap();
        assert_eq!((contig.key.as_str(), contig.length), ("contig", Some(1000)));
        let careless = br#"INFO=<ID=DP,Number=1,Description="depth, so-called,IDX=3>"#;
        let meta = MetaLine::parse(careless).unwrap();
        assert_eq!(
            (meta.id.as_deref(), meta.index.as_deref()),
            (Some("DP"), Some("3"))
        );
        for bad in ["source=x", "FORMAT=<ID=GT", "=<>", "FORMAT=<lake>", ""] {
            assert_eq!(
                MetaLine::parse(bad.as_bytes()).and_then(|m| m.id),
                None,
                "{bad}"
            );
        }
    }

    /// VCF 4.3, section 6.2.1: PASS is 0, a name listed twice counts once, IDX overrides the order.
    #[test]
    fn numbers_names_as_the_standard_does() {
        let mut keys = Numbering::of_keys();
        for name in ["DP", "PASS", "q10", "DP", "GT"] {
            keys.add(name, None).unwrap();
        }
        assert_eq!(
            ["PASS", "DP", "q10", "GT"].map(|n| keys.number(n)),
            [0, 1, 2, 3].map(Some)
        );
        let mut keys = Numbering::of_keys();
        keys.add("GT", Some("9")).unwrap();
        keys.add("DP", None).unwrap();
        assert_eq!(
            (keys.name(9), keys.name(10), keys.name(1)),
            (Some("GT"), Some("DP"), None)
        );
        assert!(keys.add("GQ", Some("9")).is_err());
        assert!(keys.add("GT", Some("8")).is_err());
        assert!(keys.add("GQ", Some("x")).is_err());
    }
}
