//! What became of the alleles of the baseline, a panel a population.

use super::drawing::{Anchor, Drawing};
use super::scale::Scale;
use super::subject::Subject;
use super::table::{Cell, Table};
use super::{Figure, PANEL_WIDTH, Panel, numbers, specification};
use crate::report::wire::{AlleleFates, LossCall, Report};

const LEFT: f64 = 8.0;
const RIGHT: f64 = PANEL_WIDTH - 8.0;
const BAR: f64 = 22.0;

/// Kept alleles, and those not seen again by what probably happened to them.
pub fn figure(report: &Report, subjects: &[Subject]) -> Option<Figure> {
    let fates: Vec<Fates> = subjects.iter().filter_map(|s| fates(report, s)).collect();
    if fates.is_empty() {
        return None;
    }
    let table = table(&fates);
    Some(Figure {
        name: "allele-fates",
        title: "Alleles of the baseline: kept, missed, lost".to_owned(),
        caption: "Alleles seen at the baseline, over loci typed at both visits. The upper bar has all \
                  of them; the lower bar shows those not seen again, larger: probably lost from the \
                  population, probably still there but missed by the sample, or uncertain. The diamond \
                  with its bar marks how many alleles drift and sampling at the estimated effective \
                  size would leave in sight, with its interval. Counts of alleles."
            .to_owned(),
        panels: fates.iter().map(panel).collect(),
        specification: specification::fates(&table),
        table,
    })
}

/// The fates of one population's alleles, which add up to the baseline.
struct Fates<'a> {
    population: &'a str,
    from: &'a str,
    to: &'a str,
    all: &'a AlleleFates,
    kept: u64,
    parts: Vec<Part>,
}

/// Alleles not seen again, of one fate.
struct Part {
    fate: Fate,
    alleles: u64,
}

#[derive(Clone, Copy, PartialEq, Eq)]
enum Fate {
    Missed,
    Uncertain,
    MissedOrUncertain,
    Lost,
    Unknown,
}

impl Fate {
    fn name(self) -> &'static str {
        match self {
            Fate::Missed => "missed",
            Fate::Uncertain => "uncertain",
            Fate::MissedOrUncertain => "missed or uncertain",
            Fate::Lost => "probably lost",
            Fate::Unknown => "not seen again, fate unknown",
        }
    }
}

fn fates<'a>(report: &'a Report, subject: &Subject<'a>) -> Option<Fates<'a>> {
    let comparison = subject.since_baseline?;
    let all = comparison.alleles.as_ref()?;
    let gone = all.not_seen_again.min(all.baseline);
    let listed = report
        .losses
        .iter()
        .filter(|l| l.population == subject.population);
    let mut of_call = [0u64; 3];
    let mut complete = 0u64;
    for loss in listed {
        complete += u64::from(loss.call.is_some());
        match loss.call {
            Some(LossCall::Missed) => of_call[0] += 1,
            Some(LossCall::Uncertain) => of_call[1] += 1,
            Some(LossCall::Lost) => of_call[2] += 1,
            None => {}
        }
    }
    // The list of losses is cut at a number of lines; the counts of the comparison are not.
    let parts = match all.probably_lost.map(|n| n.min(gone)) {
        None => vec![(Fate::Unknown, gone)],
        Some(lost) if complete == gone && of_call[2] == lost => vec![
            (Fate::Missed, of_call[0]),
            (Fate::Uncertain, of_call[1]),
            (Fate::Lost, lost),
        ],
        Some(lost) => vec![(Fate::MissedOrUncertain, gone - lost), (Fate::Lost, lost)],
    };
    Some(Fates {
        population: subject.population,
        from: &comparison.from,
        to: &comparison.to,
        all,
        kept: all.baseline - gone,
        parts: parts
            .into_iter()
            .map(|(fate, alleles)| Part { fate, alleles })
            .collect(),
    })
}

fn panel(fates: &Fates) -> Panel {
    let mut d = Drawing::new();
    d.name(
        "name",
        (8.0, 17.0),
        Anchor::Start,
        (fates.population, 304.0),
    );
    let baseline = fates.all.baseline;
    let gone = baseline - fates.kept;
    let words = format!(
        "{}: {} kept, {} not seen again",
        numbers::counted(baseline, "baseline allele", "baseline alleles"),
        numbers::count(fates.kept),
        numbers::count(gone)
    );
    d.text("small", (8.0, 38.0), Anchor::Start, &words);
    let x = Scale::linear([0.0, baseline.max(1) as f64], [LEFT, RIGHT]);
    let edge = x.at(fates.kept as f64);
    d.rectangle("deep area", (LEFT, 46.0), (edge - LEFT, BAR));
    d.rectangle("box", (LEFT, 46.0), (RIGHT - LEFT, BAR));
    expected(&mut d, fates, &x);
    if gone > 0 {
        // Lines that open the small part above into the whole bar below.
        for (from, to) in [(edge, LEFT), (RIGHT, RIGHT)] {
            d.line("grid", (from, 46.0 + BAR), (to, 104.0));
        }
        zoomed(&mut d, fates, gone);
    }
    let parts = fates
        .parts
        .iter()
        .map(|p| format!("{} {}", numbers::count(p.alleles), p.fate.name()));
    let parts: Vec<_> = parts.collect();
    let shown = fates.parts.iter().filter(|p| p.alleles > 0).count();
    Panel {
        title: fates.population.to_owned(),
        description: format!("{words}: {}", parts.join(", ")),
        width: PANEL_WIDTH,
        height: 140.0 + 17.0 * shown as f64,
        body: d.into_body(),
    }
}

/// Where the kept alleles would end at the estimated effective size.
fn expected(d: &mut Drawing, fates: &Fates, x: &Scale) {
    let Some(expected) = fates.all.expected_not_seen_again else {
        return;
    };
    let baseline = fates.all.baseline as f64;
    let y = 46.0 + BAR + 12.0;
    let mut words = format!("{} expected to be out of sight", numbers::size(expected));
    if let Some([low, high]) = fates.all.expected_interval {
        let [start, end] = [high, low].map(|n| x.at(baseline - n));
        d.line("ink whisker", (start, y), (end, y));
        for at in [start, end] {
            d.line("ink whisker", (at, y - 3.0), (at, y + 3.0));
        }
        words = format!(
            "{words} ({} to {})",
            numbers::size(low),
            numbers::size(high)
        );
    }
    d.begin(&words);
    d.mark(
        "ink solid",
        super::drawing::Shape::Diamond,
        (x.at(baseline - expected), y),
    );
    d.end();
}

fn zoomed(d: &mut Drawing, fates: &Fates, gone: u64) {
    let x = Scale::linear([0.0, gone as f64], [LEFT, RIGHT]);
    let mut from = 0;
    let mut row = 0.0;
    for part in fates.parts.iter().filter(|p| p.alleles > 0) {
        let start = x.at(from as f64);
        from += part.alleles;
        let size = (x.at(from as f64) - start, BAR);
        let percent = numbers::percent(part.alleles as f64 / gone as f64);
        let words = format!("{} {}", numbers::count(part.alleles), part.fate.name());
        d.begin(&format!("{words}, {percent} % of those not seen again"));
        filling(d, part.fate, (start, 104.0), size);
        let y = 134.0 + 17.0 * row;
        filling(d, part.fate, (LEFT, y), (16.0, 11.0));
        d.text("small", (LEFT + 22.0, y + 10.0), Anchor::Start, &words);
        d.end();
        row += 1.0;
    }
}

fn filling(d: &mut Drawing, fate: Fate, at: (f64, f64), size: (f64, f64)) {
    match fate {
        Fate::Lost => {
            d.rectangle("plum area", at, size);
            d.rectangle("box", at, size);
        }
        Fate::Uncertain => d.hatched("ochre", at, size),
        Fate::MissedOrUncertain => d.hatched("deep", at, size),
        Fate::Missed => {
            d.rectangle("deep band", at, size);
            d.rectangle("box", at, size);
        }
        Fate::Unknown => d.rectangle("box", at, size),
    }
}

fn table(fates: &[Fates]) -> Table {
    let mut table = Table::new(
        "Alleles of the baseline by what became of them. A row for each population and fate.",
        &[
            ("population", "Population"),
            ("from", "Baseline"),
            ("to", "Latest visit"),
            ("fate", "Fate"),
            ("alleles", "Alleles"),
            ("share", "Share of baseline alleles"),
            ("expected_not_seen_again", "Expected out of sight"),
            ("expected_low", "lower limit"),
            ("expected_high", "upper limit"),
            (
                "expected_share_wrong",
                "Expected share of wrong calls of loss",
            ),
            ("absent_because", "Why a value is absent"),
        ],
    );
    for f in fates {
        let kept = [("kept", f.kept)];
        let parts = f.parts.iter().map(|p| (p.fate.name(), p.alleles));
        for (fate, alleles) in kept.into_iter().chain(parts) {
            let interval = f.all.expected_interval;
            let share = (f.all.baseline > 0).then(|| alleles as f64 / f.all.baseline as f64);
            table.rows.push(vec![
                Cell::from(f.population),
                Cell::from(f.from),
                Cell::from(f.to),
                Cell::from(fate),
                Cell::from(alleles),
                Cell::maybe(share),
                Cell::maybe(f.all.expected_not_seen_again),
                Cell::maybe(interval.map(|i| i[0])),
                Cell::maybe(interval.map(|i| i[1])),
                Cell::maybe(f.all.expected_share_wrong),
                Cell::from(f.all.absent_because.clone().unwrap_or_default()),
            ]);
        }
    }
    table
}
