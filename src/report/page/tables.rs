//! Tables of the page: those behind figures, and those that stand alone.

use serde::Serialize;

use crate::report::figures::numbers::{count, decimals, level, plain};
use crate::report::figures::subject::Subject;
use crate::report::figures::table::{Cell, Table};
use crate::report::wire::{AtRisk, CarrierPair, InputFile, Loci, Loss, LossCall, Report, Samples};

use super::answer::{short_size, warnings_of, when};

/// Rows of one table on the page: a browser on a phone stays quick, and the report has the rest.
const MOST_ROWS: usize = 1500;
/// Characters of an allele: a long insertion would push everything else away.
const MOST_LETTERS: usize = 40;

/// A table as the template sets it.
#[derive(Debug, Clone, Serialize)]
pub struct TableView {
    /// What it holds.
    pub caption: String,
    /// Headings, each with whether its column holds numbers.
    pub columns: Vec<ColumnView>,
    /// Texts of the cells.
    pub rows: Vec<Vec<String>>,
    /// What was cut, in words.
    pub cut: Option<String>,
}

/// A heading.
#[derive(Debug, Clone, Serialize)]
pub struct ColumnView {
    /// Words.
    pub heading: String,
    /// Whether the column holds numbers.
    pub numeric: bool,
}

impl TableView {
    /// A table of data, cut at a number of rows.
    pub fn of(table: &Table) -> TableView {
        let is_number = |cell: &Cell| !matches!(cell, Cell::Text(_));
        let columns = table.columns.iter().enumerate().map(|(i, column)| {
            let mut cells = table.rows.iter().map(|row| &row[i]);
            ColumnView {
                heading: column.heading.clone(),
                numeric: !table.rows.is_empty() && cells.all(is_number),
            }
        });
        let shown = table.rows.iter().take(MOST_ROWS);
        let rows = shown.map(|row| row.iter().map(Cell::text).collect());
        let more = table.rows.len().saturating_sub(MOST_ROWS) as u64;
        TableView {
            caption: table.caption.clone(),
            columns: columns.collect(),
            rows: rows.collect(),
            cut: (more > 0).then(|| format!("{} more rows are in the report.", count(more))),
        }
    }
}

/// All populations at a glance.
pub fn overview(report: &Report, subjects: &[Subject]) -> Table {
    let mut table = Table::new(
        "All populations at a glance. Ranges are intervals.",
        &[
            ("population", "Population"),
            ("visits", "Visits"),
            ("period", "First and latest visit"),
            ("lost", "Expected heterozygosity lost, %"),
            ("range", "interval"),
            ("size", "Effective size, individuals"),
            ("gone", "Baseline alleles probably gone"),
            ("warnings", "Warnings"),
        ],
    );
    for subject in subjects {
        let kept = subject
            .since_baseline
            .map(|c| &c.change.expected_heterozygosity_kept);
        let percent = |kept: f64| decimals(100.0 * (1.0 - kept), 1);
        let range = kept.and_then(|k| k.interval);
        let alleles = subject.since_baseline.and_then(|c| c.alleles.as_ref());
        let ends = (subject.strata.first(), subject.strata.last());
        let period = match ends {
            (Some(first), Some(last)) if subject.strata.len() > 1 => {
                format!("{} to {}", when(first), when(last))
            }
            (Some(only), _) => when(only),
            _ => String::new(),
        };
        table.rows.push(vec![
            Cell::from(subject.population),
            Cell::from(subject.strata.len() as u64),
            Cell::from(period),
            match kept.and_then(|k| k.estimate) {
                Some(kept) => Cell::from(percent(kept)),
                None => Cell::from("unknown"),
            },
            Cell::from(range.map_or_else(String::new, |[low, high]| {
                format!("{} to {}", percent(high), percent(low))
            })),
            Cell::from(short_size(subject.size)),
            match alleles.map(|a| (a.probably_lost, a.baseline)) {
                Some((Some(lost), all)) => Cell::from(format!("{} of {}", count(lost), count(all))),
                _ => Cell::from("unknown"),
            },
            Cell::from(warnings_of(report, subject.population)),
        ]);
    }
    table
}

/// Baseline alleles that the latest sample does not show.
pub fn losses(losses: &[Loss]) -> Table {
    let mut table = Table::new(
        "Baseline alleles not seen at the latest visit, the commonest at the baseline first. Copies are \
         gene copies typed.",
        &[
            ("population", "Population"),
            ("locus", "Locus"),
            ("contig", "Contig"),
            ("position", "Position"),
            ("allele", "Allele"),
            ("baseline_count", "Seen at the baseline"),
            ("baseline_copies", "of copies"),
            ("latest_copies", "Copies at the latest visit, none of it"),
            ("probability_lost", "Probability that it is lost"),
            ("call", "Call"),
        ],
    );
    table.rows.extend(losses.iter().map(|l| {
        vec![
            Cell::from(l.population.as_str()),
            Cell::from(cut(&l.locus)),
            Cell::from(l.contig.as_str()),
            Cell::from(l.position),
            Cell::from(cut(&l.allele)),
            Cell::from(l.baseline_count),
            Cell::from(l.baseline_copies),
            Cell::from(l.latest_copies),
            Cell::maybe(l.probability_lost),
            Cell::from(match l.call {
                Some(LossCall::Lost) => "probably lost",
                Some(LossCall::Missed) => "missed",
                Some(LossCall::Uncertain) => "uncertain",
                None => "unknown",
            }),
        ]
    }));
    table
}

/// Alleles held in few copies, with their carriers.
pub fn at_risk(alleles: &[AtRisk]) -> Table {
    let mut table = Table::new(
        "Alleles that the latest sample holds in few copies. Allele 0 is the reference of the record.",
        &[
            ("population", "Population"),
            ("stratum", "Stratum"),
            ("contig", "Contig"),
            ("position", "Position"),
            ("allele", "Allele"),
            ("copies", "Copies"),
            ("gene_copies", "of gene copies"),
            ("carriers", "Carriers"),
        ],
    );
    table.rows.extend(alleles.iter().map(|a| {
        vec![
            Cell::from(a.population.as_str()),
            Cell::from(a.stratum.as_str()),
            Cell::from(a.contig.as_str()),
            Cell::from(a.position),
            Cell::from(cut(&a.allele)),
            Cell::from(a.copies),
            Cell::from(a.gene_copies),
            Cell::from(a.carriers.join(", ")),
        ]
    }));
    table
}

/// Pairs of carriers that would bring scarce alleles together.
pub fn carrier_pairs(pairs: &[CarrierPair]) -> Table {
    let mut table = Table::new(
        "Pairs of a female and a male of the latest sample that hold the most scarce alleles together. \
         Their kinship is not considered: hold them against the pedigree.",
        &[
            ("population", "Population"),
            ("female", "Female"),
            ("male", "Male"),
            ("only_female", "Only she carries"),
            ("only_male", "Only he carries"),
            ("both", "Both carry"),
            ("together", "Together"),
        ],
    );
    table.rows.extend(pairs.iter().map(|p| {
        vec![
            Cell::from(p.population.as_str()),
            Cell::from(p.female.as_str()),
            Cell::from(p.male.as_str()),
            Cell::from(p.only_female),
            Cell::from(p.only_male),
            Cell::from(p.both),
            Cell::from(p.together),
        ]
    }));
    table
}

/// A word that is not too long to stand in a cell.
fn cut(word: &str) -> String {
    let letters = word.chars().count();
    match letters > MOST_LETTERS {
        true => {
            let start: String = word.chars().take(MOST_LETTERS).collect();
            format!("{start}\u{2026} ({letters} letters)")
        }
        false => word.to_owned(),
    }
}

/// Samples by what became of them.
pub fn samples(samples: &Samples) -> Table {
    let mut table = Table::new("Samples", &[("what", "Samples"), ("number", "Number")]);
    let rows = [
        ("in the genotype calls", samples.in_calls),
        ("in the sample sheet", samples.in_sheet),
        ("used", samples.used),
        (
            "in the calls but not in the sheet",
            samples.not_listed.len() as u64,
        ),
        (
            "in the sheet but not in the calls",
            samples.absent.len() as u64,
        ),
        ("set aside as replicates", samples.replicates.len() as u64),
        (
            "used, without a single called genotype",
            samples.without_calls.len() as u64,
        ),
    ];
    table
        .rows
        .extend(rows.map(|(what, n)| vec![Cell::from(what), Cell::from(n)]));
    table
}

/// Records by what became of them.
pub fn records(loci: &Loci) -> Table {
    let mut table = Table::new(
        "Records of the calls",
        &[("what", "Records"), ("number", "Number")],
    );
    let mut row = |what: String, n: u64| table.rows.push(vec![Cell::from(what), Cell::from(n)]);
    row("read".to_owned(), loci.read);
    row("kept".to_owned(), loci.kept);
    row(
        "kept that vary (headline values rest on these)".to_owned(),
        loci.polymorphic,
    );
    row(
        "kept for methods that need individuals".to_owned(),
        loci.panel,
    );
    for (reason, n) in &loci.set_aside {
        row(format!("set aside: {}", words(reason)), *n);
    }
    table
}

/// Genotypes by what became of them.
pub fn genotypes(loci: &Loci) -> Table {
    let mut table = Table::new(
        "Genotypes of the individuals in use",
        &[("what", "Genotypes"), ("number", "Number")],
    );
    let rows = loci.genotypes.iter();
    table
        .rows
        .extend(rows.map(|(what, n)| vec![Cell::from(words(what)), Cell::from(*n)]));
    table
}

/// Input files with their digests.
pub fn inputs(files: &[InputFile]) -> Table {
    let mut table = Table::new(
        "Input files",
        &[
            ("role", "Role"),
            ("name", "Name"),
            ("format", "Format"),
            ("bytes", "Bytes"),
            ("sha256", "SHA-256"),
        ],
    );
    table.rows.extend(files.iter().map(|file| {
        vec![
            Cell::from(file.role.as_str()),
            Cell::from(file.name.as_str()),
            Cell::from(file.format.as_str()),
            Cell::from(file.bytes),
            Cell::from(file.sha256.as_str()),
        ]
    }));
    table
}

/// Names and texts in two columns.
pub fn pairs<'a>(
    caption: &str,
    headings: [&str; 2],
    rows: impl IntoIterator<Item = (&'a String, &'a String)>,
) -> Table {
    let mut table = Table::new(caption, &[("name", headings[0]), ("text", headings[1])]);
    let rows = rows.into_iter();
    table
        .rows
        .extend(rows.map(|(name, text)| vec![Cell::from(words(name)), Cell::from(text.as_str())]));
    table
}

/// A name for programs as words.
pub fn words(name: &str) -> String {
    name.replace('_', " ")
}

/// Coverage of intervals in percent, of all there are in a report.
pub fn interval_level(report: &Report) -> Option<String> {
    let estimate = report.strata.first()?;
    Some(level(estimate.expected_heterozygosity.level))
}

/// Years as plain text, for the head of the page.
pub fn period(report: &Report) -> Option<String> {
    let years = || {
        report
            .strata
            .iter()
            .map(|s| s.year)
            .filter(|y| y.is_finite())
    };
    let first = years().min_by(f64::total_cmp)?.floor();
    let last = years().max_by(f64::total_cmp)?.floor();
    Some(match first == last {
        true => plain(first),
        false => format!("{} to {}", plain(first), plain(last)),
    })
}
