//! A tidy genotype table as calls: one row for each sample and locus.
//!
//! | column | |
//! |---|---|
//! | `sample` | name as in the sample sheet |
//! | `locus` | name of the locus |
//! | `allele_1`, `allele_2` | bases (A, C, G, T) or fragment lengths (whole numbers); blank or NA is missing |
//!
//! Delimited by commas, tabs or semicolons; further columns are ignored, but for `population`, which
//! must not contradict itself. The table becomes the same records as a VCF with one record a locus:
//! alleles named as written, in ascending order, the locus as identifier. Without a map of loci each
//! locus stands on a contig of its own, which is what unlinked loci are. The table is held in memory.
#![expect(
    clippy::indexing_slicing,
    reason = "numbers were given out by the same lists"
)]

mod map;

use std::collections::{BTreeMap, BTreeSet, HashMap};
use std::path::Path;

use super::sheet::table::{self, Record, Table};
use crate::error::{Error, Result};
use crate::model::{Problem, nearest};

pub(super) use map::{LocusMap, read_locus_map};

/// More alleles than this are no locus: a column is in the wrong place, or lengths are not binned.
const MOST_ALLELES: usize = 200;
/// Problems told; a table with a slip in each row has one slip, told often enough.
const MOST_TOLD: usize = 50;

const NAMES: [&str; 4] = ["sample", "locus", "allele_1", "allele_2"];

/// Whether a file that begins like this is a tidy table: its first line names a sample and a locus.
pub(super) fn looks_tidy(start: &[u8]) -> bool {
    let start = start.strip_prefix(b"\xEF\xBB\xBF").unwrap_or(start);
    let line = start
        .split(|&b| b == b'\n' || b == b'\r')
        .find(|l| !l.trim_ascii().is_empty());
    let Some(line) = line.and_then(|line| std::str::from_utf8(line).ok()) else {
        return false;
    };
    let words = || {
        let cells = line.split([',', '\t', ';']);
        cells.map(|cell| cell.trim().trim_matches('"').to_lowercase())
    };
    !line.starts_with('#') && words().any(|w| w == "sample") && words().any(|w| w == "locus")
}

/// The text of calls that a tidy table stands for.
///
/// # Errors
/// [`Error::Sheet`] with the problems of the table, by row.
pub(super) fn as_calls(path: &Path, bytes: &[u8], map: Option<&LocusMap>) -> Result<Vec<u8>> {
    calls(bytes, map).map_err(|mut problems| {
        problems.sort_by_key(|problem| problem.row);
        let more = problems.len().saturating_sub(MOST_TOLD);
        problems.truncate(MOST_TOLD);
        if more > 0 {
            problems.push(Problem::of_all(
                format!("{more} more problem(s)"),
                "mend these first",
            ));
        }
        sheet(path, problems)
    })
}

fn calls(bytes: &[u8], map: Option<&LocusMap>) -> std::result::Result<Vec<u8>, Vec<Problem>> {
    let table = table::split(bytes)?;
    let panel = Panel::read(&table)?;
    let mut loci: Vec<(&str, u64, &Locus)> = Vec::new();
    let mut problems = Vec::new();
    for locus in &panel.loci {
        match map {
            None => loci.push((&locus.name, 1, locus)),
            Some(map) => match map.get(&locus.name) {
                Some((contig, position)) => loci.push((contig, *position, locus)),
                None => problems.push(Problem::at(
                    locus.first_row,
                    format!("the map of loci does not list locus '{}'", locus.name),
                    match nearest(&locus.name, map.keys().map(String::as_str)) {
                        Some(near) => format!("did you mean '{near}'? else add it to the map"),
                        None => "add it to the map".to_string(),
                    },
                )),
            },
        }
    }
    if !problems.is_empty() {
        return Err(problems);
    }
    loci.sort_by(|a, b| (a.0, a.1, &a.2.name).cmp(&(b.0, b.1, &b.2.name)));
    Ok(panel.text(&loci))
}

fn sheet(path: &Path, problems: Vec<Problem>) -> Error {
    Error::Sheet {
        path: path.to_path_buf(),
        problems,
    }
}

/// Alleles of one genotype, as places in the list of the locus; none is missing.
type Alleles = [Option<u32>; 2];

/// The genotypes of one locus.
struct Locus {
    name: String,
    first_row: u64,
    /// Allele as written to its number in order of appearance.
    alleles: BTreeMap<Allele, u32>,
    /// By number of the sample.
    genotypes: HashMap<u32, (Alleles, u64)>,
}

/// An allele: bases or a fragment length. Lengths are in the order of their numbers.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord)]
enum Allele {
    Length(u32),
    Bases(String),
}

/// Everything that a table holds, samples and loci in order of appearance.
#[derive(Default)]
struct Panel {
    samples: Vec<String>,
    loci: Vec<Locus>,
    sample_numbers: HashMap<String, u32>,
    locus_numbers: HashMap<String, usize>,
    populations: HashMap<u32, (String, u64)>,
    problems: Vec<Problem>,
    told_crowded: BTreeSet<usize>,
}

impl Panel {
    fn read(table: &Table) -> std::result::Result<Panel, Vec<Problem>> {
        let [sample, locus, first, second] = columns(&table.header, NAMES)?;
        let population = optional_column(&table.header, "population");
        let mut panel = Panel::default();
        for record in &table.records {
            let texts = [sample, locus, first, second].map(|column| cell(record, column));
            let [Ok(sample), Ok(locus), Ok(first), Ok(second)] = texts else {
                panel.problems.push(not_text(record.row));
                continue;
            };
            if sample.is_empty() || locus.is_empty() {
                panel.complain(record.row, "sample or locus is blank", "fill it in");
                continue;
            }
            let number = panel.sample(sample);
            if let Some(Ok(name)) = population.map(|column| cell(record, column)) {
                panel.population(record.row, number, name);
            }
            panel.genotype(record.row, number, locus, [first, second]);
        }
        if table.records.is_empty() {
            panel.problems.push(Problem::of_all(
                "there is a header row but no genotype below it",
                "write one row for each sample and locus",
            ));
        }
        match panel.problems.is_empty() {
            true => Ok(panel),
            false => Err(panel.problems),
        }
    }

    fn complain(&mut self, row: u64, what: impl Into<String>, cure: &str) {
        self.problems.push(Problem::at(row, what, cure));
    }

    fn sample(&mut self, name: &str) -> u32 {
        if let Some(&number) = self.sample_numbers.get(name) {
            return number;
        }
        let number = self.samples.len() as u32;
        self.samples.push(name.to_string());
        self.sample_numbers.insert(name.to_string(), number);
        number
    }

    fn population(&mut self, row: u64, sample: u32, name: &str) {
        let first = self
            .populations
            .entry(sample)
            .or_insert((name.to_string(), row))
            .clone();
        if first.0 != name {
            let sample = &self.samples[sample as usize];
            let what = format!(
                "sample '{sample}' is under population '{name}' here and '{}' in row {}",
                first.0, first.1
            );
            self.complain(row, what, "correct one of them; two animals need two names");
        }
    }

    fn genotype(&mut self, row: u64, sample: u32, locus: &str, texts: [&str; 2]) {
        let index = match self.locus_numbers.get(locus) {
            Some(&index) => index,
            None => {
                self.loci.push(Locus {
                    name: locus.to_string(),
                    first_row: row,
                    alleles: BTreeMap::new(),
                    genotypes: HashMap::new(),
                });
                self.locus_numbers
                    .insert(locus.to_string(), self.loci.len() - 1);
                self.loci.len() - 1
            }
        };
        let mut alleles: Alleles = [None; 2];
        for (place, text) in alleles.iter_mut().zip(texts) {
            match read_allele(text) {
                Ok(None) => {}
                Ok(Some(allele)) => match self.loci[index].number(allele) {
                    Ok(number) => *place = Some(number),
                    Err(other) => {
                        let what = format!(
                            "allele '{text}' of locus '{locus}' is coded otherwise than '{other}' before it"
                        );
                        self.complain(row, what, "code a locus by bases or by lengths throughout");
                    }
                },
                Err((what, cure)) => self.complain(row, format!("locus '{locus}': {what}"), cure),
            }
        }
        if self.loci[index].alleles.len() > MOST_ALLELES && self.told_crowded.insert(index) {
            let what = format!("locus '{locus}' has more than {MOST_ALLELES} alleles");
            self.complain(row, what, "check the columns; bin fragment lengths first");
        }
        let before = self.loci[index].genotypes.insert(sample, (alleles, row));
        if let Some((_, first)) = before {
            let name = &self.samples[sample as usize];
            let what = format!("sample '{name}' has locus '{locus}' in row {first} already");
            self.complain(
                row,
                what,
                "keep one row; a second genotyping needs its own sample name",
            );
        }
    }

    /// The calls as text, one record a locus.
    fn text(&self, loci: &[(&str, u64, &Locus)]) -> Vec<u8> {
        let mut out = String::from("##fileformat=VCFv4.3\n");
        out.push_str("##FORMAT=<ID=GT,Number=1,Type=String,Description=\"Genotype\">\n");
        out.push_str("#CHROM\tPOS\tID\tREF\tALT\tQUAL\tFILTER\tINFO\tFORMAT\t");
        out.push_str(&self.samples.join("\t"));
        for (contig, position, locus) in loci {
            let names: Vec<String> = locus.alleles.keys().map(Allele::to_text).collect();
            let mut place_of = vec![0; names.len()];
            for (place, &number) in locus.alleles.values().enumerate() {
                place_of[number as usize] = place;
            }
            let reference = names.first().map_or("N", String::as_str);
            let others = match names.len() {
                0 | 1 => ".".to_string(),
                _ => names[1..].join(","),
            };
            let name = &locus.name;
            out.push_str(&format!(
                "\n{contig}\t{position}\t{name}\t{reference}\t{others}\t.\t.\t.\tGT"
            ));
            for sample in 0..self.samples.len() as u32 {
                let alleles = locus.genotypes.get(&sample).map_or([None; 2], |(a, _)| *a);
                let text = alleles.map(|allele| {
                    allele.map_or(".".to_string(), |n| place_of[n as usize].to_string())
                });
                out.push_str(&format!("\t{}/{}", text[0], text[1]));
            }
        }
        out.push('\n');
        out.into_bytes()
    }
}

impl Locus {
    /// The number of an allele; the other coding, by example, where the locus has one.
    fn number(&mut self, allele: Allele) -> std::result::Result<u32, String> {
        let same =
            |other: &Allele| std::mem::discriminant(other) == std::mem::discriminant(&allele);
        if let Some(other) = self.alleles.keys().next().filter(|other| !same(other)) {
            return Err(other.to_text());
        }
        let next = self.alleles.len() as u32;
        Ok(*self.alleles.entry(allele).or_insert(next))
    }
}

impl Allele {
    fn to_text(&self) -> String {
        match self {
            Allele::Length(length) => length.to_string(),
            Allele::Bases(bases) => bases.clone(),
        }
    }
}

/// One allele; none when missing.
fn read_allele(text: &str) -> std::result::Result<Option<Allele>, (String, &'static str)> {
    let is_base = |b: u8| matches!(b.to_ascii_uppercase(), b'A' | b'C' | b'G' | b'T');
    if text.is_empty() || text.eq_ignore_ascii_case("na") {
        return Ok(None);
    }
    if text.bytes().all(is_base) {
        return Ok(Some(Allele::Bases(text.to_ascii_uppercase())));
    }
    if text.bytes().all(|b| b.is_ascii_digit()) {
        return match text.parse::<u32>() {
            Ok(0) => Err((
                "allele '0' is no length".to_string(),
                "write NA, or nothing, where an allele is missing",
            )),
            Ok(length) => Ok(Some(Allele::Length(length))),
            Err(_) => Err((format!("allele '{text}' is too long"), "check the columns")),
        };
    }
    if text.contains(['/', '|', ',', ';', ':', ' ', '+']) {
        return Err((
            format!("'{text}' holds more than one allele"),
            "write one allele in allele_1 and one in allele_2; individuals are diploid",
        ));
    }
    if text.parse::<f64>().is_ok() {
        return Err((
            format!("allele '{text}' is not a whole number"),
            "bin fragment lengths to whole numbers first",
        ));
    }
    Err((
        format!("allele '{text}' is neither bases nor a length"),
        "write bases (A, C, G, T), a whole number, or NA",
    ))
}

/// Places of columns by name.
fn columns<const N: usize>(
    header: &Record,
    names: [&str; N],
) -> std::result::Result<[usize; N], Vec<Problem>> {
    let found = names.map(|name| optional_column(header, name));
    let problems: Vec<Problem> = names
        .iter()
        .zip(found)
        .filter(|(_, found)| found.is_none())
        .map(|(name, _)| {
            let what = format!("there is no column '{name}'");
            Problem::at(
                header.row,
                what,
                format!("the header needs {}", names.join(", ")),
            )
        })
        .collect();
    match problems.is_empty() {
        true => Ok(found.map(Option::unwrap_or_default)),
        false => Err(problems),
    }
}

fn optional_column(header: &Record, name: &str) -> Option<usize> {
    let is = |field: &Vec<u8>| field.trim_ascii().eq_ignore_ascii_case(name.as_bytes());
    header.fields.iter().position(is)
}

/// The trimmed text of a cell, blank beyond the end of the row.
fn cell(record: &Record, column: usize) -> std::result::Result<&str, ()> {
    let field = record.fields.get(column).map_or(&[][..], Vec::as_slice);
    let text = std::str::from_utf8(field).map_err(|_| ())?.trim();
    match text.chars().any(char::is_control) {
        true => Err(()),
        false => Ok(text),
    }
}

fn not_text(row: u64) -> Problem {
    Problem::at(
        row,
        "a cell is not UTF-8 text on one line",
        "save the table as 'CSV UTF-8'; check that every quotation mark is closed",
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    fn text(table: &str, map: Option<&str>) -> String {
        let map = map.map(|map| map::locus_map(map.as_bytes()).unwrap());
        String::from_utf8(calls(table.as_bytes(), map.as_ref()).unwrap()).unwrap()
    }

    fn records(text: &str) -> Vec<&str> {
        text.lines()
            .filter(|line| !line.starts_with("##"))
            .collect()
    }

    const TABLE: &str = "sample,locus,allele_1,allele_2\n\
        a,ms1,124,120\na,snp,g,A\nb,ms1,120,120\nb,snp,NA,\nc,ms1,NA,98\n";

    #[test]
    fn rows_become_records() {
        assert_eq!(
            records(&text(TABLE, None)),
            [
                "#CHROM\tPOS\tID\tREF\tALT\tQUAL\tFILTER\tINFO\tFORMAT\ta\tb\tc",
                "ms1\t1\tms1\t98\t120,124\t.\t.\t.\tGT\t2/1\t1/1\t./0",
                "snp\t1\tsnp\tA\tG\t.\t.\t.\tGT\t1/0\t./.\t./.",
            ]
        );
    }

    #[test]
    fn a_map_gives_places() {
        let map = "locus\tcontig\tposition\nsnp\tc1\t70\nms1\tc1\t500\nother\tc2\t1\n";
        let text = text(TABLE, Some(map));
        let places: Vec<&str> = records(&text)[1..].iter().map(|r| &r[..6]).collect();
        assert_eq!(places, ["c1\t70\t", "c1\t500"]);
        let short = map::locus_map(b"locus,contig,position\nms1,c1,5\n").unwrap();
        let problems = calls(TABLE.as_bytes(), Some(&short)).unwrap_err();
        assert_eq!(problems[0].row, Some(3));
    }

    #[test]
    fn faults_are_told_by_row() {
        let cases = [
            ("a,l,120/124,120", "more than one allele"),
            ("a,l,0,120", "allele '0'"),
            ("a,l,120.4,120", "not a whole number"),
            ("a,l,?,120", "neither bases nor a length"),
            ("a,l,120,A", "coded otherwise"),
            ("z,l,120,130", "in row 2 already"),
            (",l,120,130", "blank"),
        ];
        for (row, word) in cases {
            let table = format!("sample,locus,allele_1,allele_2\nz,l,120,120\n{row}\n");
            let problems = calls(table.as_bytes(), None).unwrap_err();
            assert_eq!(problems.len(), 1, "{row}: {problems:?}");
            assert_eq!(problems[0].row, Some(3), "{row}");
            assert!(problems[0].what.contains(word), "{row}: {problems:?}");
        }
        let table = "sample,locus,allele_1,allele_2,population\na,k,1,2,Alder\na,l,1,2,Birch\n";
        let problems = calls(table.as_bytes(), None).unwrap_err();
        assert!(
            problems[0]
                .what
                .contains("'Birch' here and 'Alder' in row 2")
        );
    }

    #[test]
    fn a_locus_of_400_alleles_is_told_once() {
        let mut table = String::from("sample,locus,allele_1,allele_2\n");
        for i in 0..200 {
            table += &format!("s{i},l,{},{}\n", 100 + 2 * i, 101 + 2 * i);
        }
        let problems = calls(table.as_bytes(), None).unwrap_err();
        assert_eq!((problems.len(), problems[0].row), (1, Some(102)));
    }

    #[test]
    fn only_tables_look_tidy() {
        assert!(looks_tidy(TABLE.as_bytes()));
        assert!(looks_tidy(b"\xEF\xBB\xBF\n\"Locus\";\"Sample\";x\n"));
        assert!(!looks_tidy(b"##fileformat=VCFv4.3\n"));
        assert!(!looks_tidy(b"sample,population,year\n"));
        assert!(!looks_tidy(b"\x1f\x8b\x08"));
    }
}
