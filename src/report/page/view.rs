//! What the template sets: words, drawings and tables, already worded and drawn.

use std::collections::BTreeMap;

use serde::Serialize;

use super::answer::sentences;
use super::causes::outlier_words;
use super::tables::{self, TableView};
use crate::report::figures::numbers::{chance, count, counted};
use crate::report::figures::subject::Subject;
use crate::report::figures::table::Table;
use crate::report::figures::{Figure, PANEL_WIDTH};
use crate::report::wire::{Report, Warning};

/// Warnings of one kind that stand open; the rest opens with a touch.
const OPEN_WARNINGS: usize = 6;

/// The page.
#[derive(Debug, Serialize)]
pub struct View {
    title: String,
    facts: Vec<String>,
    level: Option<String>,
    answers: Vec<Answer>,
    overview: Option<TableView>,
    warnings: Vec<Warnings>,
    warning_count: usize,
    cautions: Vec<String>,
    sections: Vec<Section>,
    samples: TableView,
    records: TableView,
    genotypes: TableView,
    name_lists: Vec<NameList>,
    without_samples: bool,
    program: String,
    stamp: Option<String>,
    command: String,
    inputs: TableView,
    settings: TableView,
    methods: TableView,
}

/// The answer for one population.
#[derive(Debug, Serialize)]
struct Answer {
    population: String,
    sentences: [String; 2],
    notes: Vec<String>,
}

/// Warnings of one kind.
#[derive(Debug, Serialize)]
struct Warnings {
    kind: String,
    open: Vec<PlacedText>,
    more: Vec<PlacedText>,
}

/// Words on a place, such as a population.
#[derive(Debug, Serialize)]
pub struct PlacedText {
    pub place: String,
    pub text: String,
}

/// A part of the page with figures.
#[derive(Debug, Default, Serialize)]
pub struct Section {
    pub id: String,
    pub heading: String,
    /// Paragraphs, first of all.
    pub words: Vec<String>,
    pub statements: Vec<PlacedText>,
    /// A table that stands open.
    pub open_table: Option<TableView>,
    pub figures: Vec<FigureView>,
    pub tables: Vec<Listing>,
    /// What a reader should know beside it, in small.
    pub notes: Vec<String>,
}

/// A long table that opens with a touch.
#[derive(Debug, Serialize)]
pub struct Listing {
    title: String,
    table: TableView,
}

/// A figure as the template sets it.
#[derive(Debug, Serialize)]
pub struct FigureView {
    name: &'static str,
    title: String,
    caption: String,
    panels: Vec<PanelView>,
    table: TableView,
}

#[derive(Debug, Serialize)]
struct PanelView {
    title: String,
    svg: String,
    wide: bool,
}

#[derive(Debug, Serialize)]
struct NameList {
    what: &'static str,
    names: Vec<String>,
}

impl View {
    /// The view of a report and its figures.
    pub fn of(
        report: &Report,
        subjects: &[Subject],
        figures: &[Figure],
        beside: Vec<Section>,
        without_samples: bool,
    ) -> View {
        let p = &report.provenance;
        let mut command = vec![p.program.clone()];
        command.extend(p.arguments.iter().cloned());
        View {
            title: title(subjects),
            facts: facts(report, subjects),
            level: tables::interval_level(report),
            answers: subjects.iter().map(|s| answer(report, s)).collect(),
            overview: (subjects.len() > 1)
                .then(|| TableView::of(&tables::overview(report, subjects))),
            warnings: warnings(&report.warnings),
            warning_count: report.warnings.len(),
            cautions: report.cautions.clone(),
            sections: beside
                .into_iter()
                .chain(sections(report, subjects, figures))
                .collect(),
            samples: TableView::of(&tables::samples(&report.samples)),
            records: TableView::of(&tables::records(&report.loci)),
            genotypes: TableView::of(&tables::genotypes(&report.loci)),
            name_lists: match without_samples {
                true => Vec::new(),
                false => name_lists(report),
            },
            without_samples,
            program: format!("{} {}", p.program, p.version),
            stamp: p.stamp.clone(),
            command: command.join(" "),
            inputs: TableView::of(&tables::inputs(&p.inputs)),
            settings: TableView::of(&tables::pairs(
                "Settings in force",
                ["Setting", "Value"],
                &p.settings,
            )),
            methods: TableView::of(&tables::pairs(
                "Units and sources of the estimates",
                ["Estimate", "Unit and source"],
                &p.methods,
            )),
        }
    }
}

fn title(subjects: &[Subject]) -> String {
    match subjects {
        [only] => format!("Genetic monitoring of {}", only.population),
        _ => "Genetic monitoring report".to_owned(),
    }
}

fn facts(report: &Report, subjects: &[Subject]) -> Vec<String> {
    let mut facts = vec![
        counted(subjects.len() as u64, "population", "populations"),
        counted(report.strata.len() as u64, "sample", "samples") + " (population at a visit)",
    ];
    facts.extend(tables::period(report));
    facts.push(counted(report.samples.used, "individual", "individuals"));
    facts.push(counted(
        report.loci.polymorphic,
        "locus that varies",
        "loci that vary",
    ));
    facts
}

fn answer(report: &Report, subject: &Subject) -> Answer {
    let mut notes = subject.size.map(|e| e.notes.clone()).unwrap_or_default();
    // The sentence says it already.
    notes.retain(|note| !note.ends_with("no upper bound"));
    Answer {
        population: subject.population.to_owned(),
        sentences: sentences(report, subject),
        notes,
    }
}

fn warnings(all: &[Warning]) -> Vec<Warnings> {
    let mut kinds: BTreeMap<&str, Vec<&Warning>> = BTreeMap::new();
    for warning in all {
        kinds.entry(&warning.code).or_default().push(warning);
    }
    let placed = |w: &&Warning| PlacedText {
        place: w.place.clone(),
        text: w.text.clone(),
    };
    let one = |(code, list): (&str, Vec<&Warning>)| {
        let open = list.len().min(OPEN_WARNINGS);
        let mut kind = tables::words(code);
        if let Some(first) = kind.get(..1) {
            kind = first.to_uppercase() + &kind[1..];
        }
        Warnings {
            kind,
            open: list[..open].iter().map(placed).collect(),
            more: list[open..].iter().map(placed).collect(),
        }
    };
    kinds.into_iter().map(one).collect()
}

fn sections(report: &Report, subjects: &[Subject], figures: &[Figure]) -> Vec<Section> {
    let section = |id: &str, heading: &str, names: &[&str], words: Vec<String>| Section {
        id: id.to_owned(),
        heading: heading.to_owned(),
        words,
        figures: chosen(figures, names),
        ..Section::default()
    };
    let has = |name: &str| figures.iter().any(|f| f.name == name);
    let unless = |name: &str, words: String| {
        if has(name) { Vec::new() } else { vec![words] }
    };
    let mut alleles = section(
        "alleles",
        "Alleles kept, missed and lost",
        &["allele-fates"],
        {
            unless(
            "allele-fates",
            "No population has both a baseline and a later visit, so no allele can be followed."
                .to_owned(),
        )
        },
    );
    if !report.losses.is_empty() {
        alleles.tables.push(listing(
            "Alleles not seen again, one by one",
            &tables::losses(&report.losses),
        ));
    }
    let mut at_risk = section(
        "at-risk",
        "Alleles at risk and who carries them",
        &["carriers"],
        {
            unless(
                "carriers",
                "The report lists no allele at risk with carriers.".to_owned(),
            )
        },
    );
    if !report.at_risk.is_empty() {
        at_risk.tables.push(listing(
            "Alleles in few copies, one by one, with their carriers",
            &tables::at_risk(&report.at_risk),
        ));
    }
    if !report.carrier_pairs.is_empty() {
        at_risk.tables.push(listing(
            "Pairs of carriers that would bring scarce alleles together",
            &tables::carrier_pairs(&report.carrier_pairs),
        ));
    }
    let mut size = section(
        "effective-size",
        "Effective population size",
        &["effective-size"],
        {
            unless(
                "effective-size",
                "The report holds no estimate of effective size.".to_owned(),
            )
        },
    );
    size.statements = statements(subjects);
    vec![
        section("diversity", "Diversity", &["diversity"], {
            unless("diversity", "The report holds no sample.".to_owned())
        }),
        size,
        alleles,
        at_risk,
        section(
            "differentiation",
            "Differences between samples",
            &["differentiation", "change-in-time"],
            match has("differentiation") || has("change-in-time") {
                true => Vec::new(),
                false => vec!["There is only one sample, so nothing to compare.".to_owned()],
            },
        ),
        section(
            "outliers",
            "Loci out of line",
            &["outliers"],
            outlier_words(report),
        ),
        section("genotyping", "Quality of the genotypes", &["genotyping"], {
            unless("genotyping", "The report holds no sample.".to_owned())
        }),
    ]
}

/// The statement on the effective size of each population, and whether it has changed.
fn statements(subjects: &[Subject]) -> Vec<PlacedText> {
    let statement = |s: &Subject| {
        let summary = s.summary?;
        let mut text = summary.text.trim_end().to_owned();
        if !text.ends_with(['.', '!', '?']) {
            text.push('.');
        }
        if let Some(test) = &summary.has_changed {
            let df = counted(u64::from(test.degrees), "degree", "degrees");
            text += &format!(
                " Test of one size for all intervals between visits: p = {} (likelihood ratio {:.2}, {df} of freedom).",
                chance(test.p),
                test.statistic
            );
        }
        Some(PlacedText {
            place: s.population.to_owned(),
            text,
        })
    };
    subjects.iter().filter_map(statement).collect()
}

/// The figures of these names, in the order of the page.
pub fn chosen(figures: &[Figure], names: &[&str]) -> Vec<FigureView> {
    let chosen = figures.iter().filter(|f| names.contains(&f.name));
    chosen.map(figure).collect()
}

/// A table behind its title and number of rows.
pub fn listing(title: &str, table: &Table) -> Listing {
    Listing {
        title: format!("{title} ({})", count(table.rows.len() as u64)),
        table: TableView::of(table),
    }
}

fn figure(figure: &Figure) -> FigureView {
    let panel = |p: &crate::report::figures::Panel| PanelView {
        title: p.title.clone(),
        svg: p.element(figure.name != "differentiation"),
        wide: p.width > PANEL_WIDTH,
    };
    FigureView {
        name: figure.name,
        title: figure.title.clone(),
        caption: figure.caption.clone(),
        panels: figure.panels.iter().map(panel).collect(),
        table: TableView::of(&figure.table),
    }
}

fn name_lists(report: &Report) -> Vec<NameList> {
    let s = &report.samples;
    [
        ("In the calls but not in the sheet", &s.not_listed),
        ("In the sheet but not in the calls", &s.absent),
        ("Set aside as replicates", &s.replicates),
        ("Used, without a single called genotype", &s.without_calls),
    ]
    .into_iter()
    .filter(|(_, names)| !names.is_empty())
    .map(|(what, names)| NameList {
        what,
        names: names.clone(),
    })
    .collect()
}
