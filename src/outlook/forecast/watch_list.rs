//! The list of alleles to watch, as a table.

use std::path::Path;

use crate::error::{Error, Problem, Result};
use crate::model::nearest;

/// An allele to watch.
#[derive(Debug, Clone, PartialEq)]
pub struct Watched {
    /// 1-based line of the file.
    pub row: u64,
    /// Contig.
    pub contig: String,
    /// 1-based position.
    pub position: u64,
    /// Allele: code or text as in the report.
    pub allele: String,
    /// Its population; all where absent.
    pub population: Option<String>,
    /// s of fitness 1, 1 + s, 1 + 2s; 0 is neutral.
    pub selection: f64,
    /// Copies seen and gene copies typed at the latest visit, where the file says so.
    pub counts: Option<(u32, u32)>,
    /// Frequency where newcomers come from.
    pub source_frequency: Option<f64>,
}

/// Reads the list of watched alleles.
///
/// # Errors
/// [`Error::Io`] when it cannot be read, [`Error::Sheet`] with every problem found.
pub fn read_watched(path: &Path) -> Result<(Vec<Watched>, Vec<u8>)> {
    let bytes = std::fs::read(path).map_err(|e| Error::io(path, "read", e))?;
    match parse_watched(&bytes) {
        Ok(watched) => Ok((watched, bytes)),
        Err(problems) => Err(Error::Sheet {
            path: path.to_path_buf(),
            problems,
        }),
    }
}

const COLUMNS: [&str; 8] = [
    "contig",
    "position",
    "allele",
    "population",
    "selection_coefficient",
    "copies",
    "gene_copies",
    "source_frequency",
];
const NEEDED: usize = 3;

/// Watched alleles from the bytes of a table delimited by tabs, semicolons or commas, or every
/// problem in the order of the file.
pub fn parse_watched(bytes: &[u8]) -> std::result::Result<Vec<Watched>, Vec<Problem>> {
    let Ok(text) = std::str::from_utf8(bytes) else {
        return Err(vec![Problem::of_all(
            "the text is not UTF-8",
            "save the file as UTF-8",
        )]);
    };
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    let header = text.lines().next().unwrap_or_default();
    let delimiter = [b'\t', b';', b',']
        .into_iter()
        .find(|d| header.as_bytes().contains(d));
    let mut reader = csv::ReaderBuilder::new()
        .delimiter(delimiter.unwrap_or(b','))
        .trim(csv::Trim::All)
        .flexible(true)
        .comment(Some(b'#'))
        .from_reader(text.as_bytes());
    let mut problems = Vec::new();
    let names: Vec<String> = match reader.headers() {
        Ok(names) => names.iter().map(str::to_string).collect(),
        Err(_) => Vec::new(),
    };
    for name in names.iter().filter(|n| !COLUMNS.contains(&n.as_str())) {
        if let Some(near) = nearest(name, COLUMNS) {
            problems.push(Problem::at(
                1,
                format!("unknown column '{name}'"),
                format!("did you mean '{near}'?"),
            ));
        }
    }
    let place = |name: &str| names.iter().position(|n| n == name);
    for name in COLUMNS[..NEEDED].iter().filter(|n| place(n).is_none()) {
        problems.push(Problem::at(
            1,
            format!("no column '{name}'"),
            format!("give a header row with {}", COLUMNS[..NEEDED].join(", ")),
        ));
    }
    let mut watched = Vec::new();
    if problems.is_empty() {
        for record in reader.records() {
            match record {
                Ok(record) => {
                    let row = record.position().map_or(0, csv::Position::line);
                    let cell = |name: &str| {
                        let text = record.get(place(name)?)?;
                        (!text.is_empty()).then_some(text)
                    };
                    watched.extend(one(row, cell, &mut problems));
                }
                Err(e) => problems.push(Problem::of_all(
                    format!("a row that cannot be read: {e}"),
                    "mend its quotes",
                )),
            }
        }
    }
    if problems.is_empty() && watched.is_empty() {
        problems.push(Problem::of_all(
            "there is no row",
            "name an allele to watch",
        ));
    }
    match problems.is_empty() {
        true => Ok(watched),
        false => Err(problems),
    }
}

fn one<'t>(
    row: u64,
    cell: impl Fn(&str) -> Option<&'t str>,
    problems: &mut Vec<Problem>,
) -> Option<Watched> {
    let before = problems.len();
    let complain = |problems: &mut Vec<Problem>, name: &str, cure: &str| {
        let text = cell(name).unwrap_or_default();
        problems.push(Problem::at(row, format!("{name} '{text}' cannot be"), cure));
    };
    for name in &COLUMNS[..NEEDED] {
        if cell(name).is_none() {
            complain(problems, name, "fill the cell");
        }
    }
    let whole = |problems: &mut Vec<Problem>, name: &str, least: u64| {
        let number = cell(name)?
            .parse::<u64>()
            .ok()
            .filter(|&n| n >= least && n <= 4_000_000_000);
        if number.is_none() {
            complain(
                problems,
                name,
                &format!("write a whole number of {least} or more"),
            );
        }
        number
    };
    let position = whole(problems, "position", 1);
    let copies = whole(problems, "copies", 1);
    let gene_copies = whole(problems, "gene_copies", 1);
    let real = |problems: &mut Vec<Problem>, name: &str, low: f64, high: f64| {
        let number = cell(name)?
            .parse::<f64>()
            .ok()
            .filter(|x| (low..=high).contains(x));
        if number.is_none() {
            complain(
                problems,
                name,
                &format!("write a number from {low} to {high}"),
            );
        }
        number
    };
    let selection = real(problems, "selection_coefficient", -0.5, 1.0);
    let source_frequency = real(problems, "source_frequency", 0.0, 1.0);
    if cell("copies").is_some() != cell("gene_copies").is_some() {
        complain(
            problems,
            "copies",
            "give copies and gene_copies side by side, or neither",
        );
    }
    if let (Some(copies), Some(all)) = (copies, gene_copies)
        && copies > all
    {
        complain(
            problems,
            "copies",
            &format!("there are only {all} gene copies"),
        );
    }
    (problems.len() == before).then_some(())?;
    Some(Watched {
        row,
        contig: cell("contig")?.to_string(),
        position: position?,
        allele: cell("allele")?.to_string(),
        population: cell("population").map(str::to_string),
        selection: selection.unwrap_or(0.0),
        counts: copies.zip(gene_copies).map(|(k, n)| (k as u32, n as u32)),
        source_frequency,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn tables_and_their_problems() {
        let sound = "contig\tposition\tallele\tcopies\tgene_copies\nreed_1\t7\tT\t2\t40\n";
        let got = parse_watched(sound.as_bytes()).unwrap();
        assert_eq!((got[0].counts, got[0].row), (Some((2, 40)), 2));
        let bad = "contig,position,allele,copies,gene_copies,selection_coefficient\n\
            reed_1,0,T,,,\nreed_1,7,,3,2,\nreed_1,7,T,3,,9\n";
        let problems = parse_watched(bad.as_bytes()).unwrap_err();
        for (row, part) in [
            (2, "position"),
            (3, "allele"),
            (3, "copies"),
            (4, "copies"),
            (4, "selection"),
        ] {
            assert!(
                problems
                    .iter()
                    .any(|p| p.row == Some(row) && p.what.contains(part)),
                "{row} {part}: {problems:?}"
            );
        }
        let names = parse_watched(b"contig,pos,allele\n").unwrap_err();
        assert!(
            names.iter().any(|p| p.cure.contains("'position'")),
            "{names:?}"
        );
        assert!(parse_watched(b"contig,position,allele\n").is_err());
        assert!(parse_watched(&[0xff, 0xfe]).is_err());
    }
}
