//! A sheet written anew with what became of its rows: every row and column stays.
#![expect(
    clippy::indexing_slicing,
    reason = "rows were made as wide as the header"
)]

use std::collections::HashMap;
use std::path::Path;

use super::table;
use crate::error::{Error, Result};

/// What became of one row.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct RowVerdict {
    /// Whether the sample is to be used.
    pub used: bool,
    /// Why not, or what to know of it; blank where there is nothing to say.
    pub why: String,
}

/// The sheet at `path` as tab-separated text, with the columns `use` and `why` set from the verdicts by
/// row number (added at the end where the sheet has none). Rows without a verdict keep what they say.
///
/// # Errors
/// [`Error::Io`] and [`Error::Sheet`] as for reading the sheet.
pub fn annotated(path: &Path, verdicts: &HashMap<u64, RowVerdict>) -> Result<String> {
    let bytes = std::fs::read(path).map_err(|e| Error::io(path, "read", e))?;
    let table = table::split(&bytes).map_err(|problems| Error::Sheet {
        path: path.to_path_buf(),
        problems,
    })?;
    let text = |field: &[u8]| String::from_utf8_lossy(field).trim().to_string();
    let mut header: Vec<String> = table.header.fields.iter().map(|f| text(f)).collect();
    let width = header.len();
    let mut column = |name: &str| {
        let found = header.iter().position(|h| h.eq_ignore_ascii_case(name));
        found.unwrap_or_else(|| {
            header.push(name.to_string());
            header.len() - 1
        })
    };
    let (used, why) = (column("use"), column("why"));
    let mut out = line(&header);
    for record in &table.records {
        let mut fields: Vec<String> = record.fields.iter().take(width).map(|f| text(f)).collect();
        fields.resize(header.len(), String::new());
        match verdicts.get(&record.row) {
            Some(verdict) => {
                fields[used] = if verdict.used { "yes" } else { "no" }.to_string();
                fields[why] = verdict.why.clone();
            }
            None if fields[used].is_empty() => fields[used] = "yes".to_string(),
            None => {}
        }
        out.push_str(&line(&fields));
    }
    Ok(out)
}

/// One line; fields with a tab, a line end or a quotation mark in quotes.
fn line(fields: &[String]) -> String {
    let quoted = fields.iter().map(|field| {
        if field.contains(['\t', '\n', '\r', '"']) {
            format!("\"{}\"", field.replace('"', "\"\""))
        } else {
            field.clone()
        }
    });
    quoted.collect::<Vec<_>>().join("\t") + "\n"
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rows_and_columns_stay() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("sheet.csv");
        std::fs::write(
            &path,
            "sample,note,population,year\na1,\"x, y\",Alder,2003\na2,,Alder,2004\n",
        )
        .unwrap();
        let verdict = RowVerdict {
            used: false,
            why: "same individual as a1".into(),
        };
        let text = annotated(&path, &HashMap::from([(3, verdict)])).unwrap();
        assert_eq!(
            text,
            "sample\tnote\tpopulation\tyear\tuse\twhy\na1\tx, y\tAlder\t2003\tyes\t\n\
             a2\t\tAlder\t2004\tno\tsame individual as a1\n"
        );
        // The sheet written is a sheet, and says no.
        let (rows, _) = super::super::parse_sheet(text.as_bytes()).unwrap();
        assert_eq!(
            rows.iter().map(|r| r.used).collect::<Vec<_>>(),
            [true, false]
        );
    }
}
