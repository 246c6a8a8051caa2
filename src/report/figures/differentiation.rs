//! FST: between the populations of a visit as a matrix, between the visits of a population as rows.

use super::drawing::{Anchor, Drawing, Shape};
use super::scale::{Scale, extent};
use super::subject::Subject;
use super::table::{Cell, Table, cells};
use super::{Figure, PANEL_WIDTH, Panel, numbers, specification};
use crate::report::wire::{Comparison, Estimate, Kind, Report};

const CELL: (f64, f64) = (54.0, 34.0);
const LABEL_WIDTH: f64 = 110.0;
const ROW: f64 = 36.0;

/// FST between the populations of each visit.
pub fn between_populations(report: &Report) -> Option<Figure> {
    let pairs: Vec<Pair> = report
        .comparisons
        .iter()
        .filter_map(|c| pair(report, c))
        .collect();
    let first = pairs.first()?;
    let level = first.comparison.fst_weir_cockerham.level;
    let largest = pairs
        .iter()
        .filter_map(|p| p.comparison.fst_weir_cockerham.estimate)
        .fold(0.0, f64::max);
    let mut visits: Vec<(f64, &str)> = Vec::new();
    for p in &pairs {
        if !visits.iter().any(|(_, visit)| *visit == p.visit) {
            visits.push((p.year, p.visit));
        }
    }
    visits.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(b.1)));
    let panels = visits.iter().map(|(_, visit)| {
        let pairs: Vec<&Pair> = pairs.iter().filter(|p| p.visit == *visit).collect();
        matrix(report, visit, &pairs, largest)
    });
    let table = table(
        pairs.iter().map(|p| p.comparison),
        "Differentiation between the populations of a visit, five ways, with intervals.",
    );
    Some(Figure {
        name: "differentiation",
        title: "Differentiation between populations".to_owned(),
        caption: format!(
            "FST of Weir & Cockerham (1984), no unit: 0 where populations share their allele \
             frequencies, 1 where each has its own alleles. Below the diagonal the estimate, with a \
             stronger tint for a larger one; above it the limits of its {} % interval, the lower on top. \
             An estimate can fall below 0 by chance. The table holds FST of Hudson et al. (1992), GST of \
             Nei (1973), standardised GST of Hedrick (2005) and D of Jost (2008) as well.",
            numbers::level(level)
        ),
        panels: panels.collect(),
        specification: specification::matrix(&table),
        table,
    })
}

struct Pair<'a> {
    comparison: &'a Comparison,
    visit: &'a str,
    year: f64,
    from: &'a str,
    to: &'a str,
}

fn pair<'a>(report: &'a Report, comparison: &'a Comparison) -> Option<Pair<'a>> {
    let stratum = |name: &str| report.strata.iter().find(|s| s.stratum == name);
    (comparison.kind == Kind::BetweenPopulations)
        .then(|| stratum(&comparison.from).zip(stratum(&comparison.to)))
        .flatten()
        .map(|(from, to)| Pair {
            comparison,
            visit: &from.visit,
            year: from.year,
            from: &from.population,
            to: &to.population,
        })
}

fn matrix(report: &Report, visit: &str, pairs: &[&Pair], largest: f64) -> Panel {
    let is_in = |name: &str| pairs.iter().any(|p| p.from == name || p.to == name);
    let mut names: Vec<&str> = Vec::new();
    for s in report.strata.iter().filter(|s| is_in(&s.population)) {
        if !names.contains(&s.population.as_str()) {
            names.push(&s.population);
        }
    }
    let place = |name: &str| names.iter().position(|n| *n == name);
    let mut d = Drawing::new();
    let title = format!("Visit {visit}");
    d.name("name", (8.0, 17.0), Anchor::Start, (&title, 304.0));
    let longest = names.iter().map(|n| super::drawing::width_of(n, 12.0));
    let longest = longest.fold(0.0, f64::max).min(LABEL_WIDTH) + 6.0;
    let (left, top) = (8.0 + longest, 30.0 + 0.9 * longest);
    let size = names.len() as f64;
    for (i, name) in names.iter().enumerate() {
        let at = i as f64 + 0.5;
        let y = top + at * CELL.1 + 4.0;
        d.name("", (8.0, y), Anchor::Start, (name, LABEL_WIDTH));
        let x = left + at * CELL.0;
        let short = super::drawing::shortened(name, LABEL_WIDTH, 12.0);
        let words = super::drawing::isolated(&short);
        d.turned_text("", (x, top - 6.0), Anchor::Start, -60.0, &words);
        let diagonal = (left + i as f64 * CELL.0, top + i as f64 * CELL.1);
        d.line("grid", diagonal, (diagonal.0 + CELL.0, diagonal.1 + CELL.1));
    }
    for p in pairs {
        if let Some((a, b)) = place(p.from).zip(place(p.to)) {
            cell(&mut d, p, (left, top), (a.min(b), a.max(b)), largest);
        }
    }
    for i in 0..=names.len() {
        let at = i as f64;
        let (x, y) = (left + at * CELL.0, top + at * CELL.1);
        d.line("grid", (left, y), (left + size * CELL.0, y));
        d.line("grid", (x, top), (x, top + size * CELL.1));
    }
    let bottom = top + size * CELL.1;
    legend(&mut d, left.min(60.0), bottom + 14.0, largest);
    let words = pairs.iter().map(|p| {
        let value = numbers::estimate(&p.comparison.fst_weir_cockerham, 3);
        format!("{} and {}: {value}", p.from, p.to)
    });
    let words: Vec<_> = words.take(60).collect();
    // A label that leans right reaches beyond the last column.
    let width = left + size * CELL.0 + 0.5 * longest;
    Panel {
        title,
        description: format!("FST of {} pairs. {}", pairs.len(), words.join("; ")),
        width: width.max(PANEL_WIDTH),
        height: bottom + 46.0,
        body: d.into_body(),
    }
}

fn cell(d: &mut Drawing, p: &Pair, at: (f64, f64), (low, high): (usize, usize), largest: f64) {
    let e = &p.comparison.fst_weir_cockerham;
    let corner =
        |row: usize, column: usize| (at.0 + column as f64 * CELL.0, at.1 + row as f64 * CELL.1);
    let (x, y) = corner(high, low);
    let middle = x + CELL.0 / 2.0;
    d.begin(&format!(
        "{} and {}: {}",
        p.from,
        p.to,
        numbers::estimate(e, 4)
    ));
    match e.estimate {
        Some(fst) => {
            d.rectangle(&format!("step-{}", step(fst, largest)), (x, y), CELL);
            d.text(
                "",
                (middle, y + 21.0),
                Anchor::Middle,
                &numbers::decimals(fst, 3),
            );
        }
        None => d.text("small soft", (middle, y + 21.0), Anchor::Middle, "none"),
    }
    let (x, y) = corner(low, high);
    let middle = x + CELL.0 / 2.0;
    if let Some(limits) = e.interval {
        for (i, limit) in limits.into_iter().enumerate() {
            let y = y + 14.0 + 14.0 * i as f64;
            d.text(
                "tick",
                (middle, y),
                Anchor::Middle,
                &numbers::decimals(limit, 3),
            );
        }
    }
    d.end();
}

/// One of five tints.
fn step(fst: f64, largest: f64) -> usize {
    match largest > 0.0 {
        true => (5.0 * fst / largest).clamp(0.0, 4.0) as usize,
        false => 0,
    }
}

fn legend(d: &mut Drawing, left: f64, y: f64, largest: f64) {
    if largest <= 0.0 {
        return;
    }
    for i in 0..5 {
        let x = left + 46.0 * i as f64;
        d.rectangle(&format!("step-{i}"), (x, y), (46.0, 10.0));
        d.rectangle("box", (x, y), (46.0, 10.0));
        let label = numbers::decimals(largest * i as f64 / 5.0, 3);
        d.text("tick", (x, y + 23.0), Anchor::Middle, &label);
    }
    let label = numbers::decimals(largest, 3);
    d.text("tick", (left + 230.0, y + 23.0), Anchor::Middle, &label);
}

/// FST between the visits of each population.
pub fn in_time(subjects: &[Subject]) -> Option<Figure> {
    let all = || subjects.iter().flat_map(|s| s.in_time.iter().copied());
    let level = all().next()?.fst_weir_cockerham.level;
    let values = all().flat_map(|c| {
        let e = &c.fst_weir_cockerham;
        e.estimate
            .into_iter()
            .chain(e.interval.into_iter().flatten())
    });
    let limits = extent(values.chain([0.0]), 0.08, [0.0, 0.1]);
    let x = Scale::linear(limits, [LEFT, RIGHT]);
    let with_time = subjects.iter().filter(|s| !s.in_time.is_empty());
    let table = table(
        all(),
        "Change between the visits of a population: differentiation, standardised change of allele \
         frequency, and diversity.",
    );
    Some(Figure {
        name: "change-in-time",
        title: "Change of allele frequencies between visits".to_owned(),
        caption: format!(
            "FST of Weir & Cockerham (1984) between two visits of one population, no unit, with {} % \
             intervals. Discs: against the baseline; squares: against the visit before. An interval \
             that reaches 0 fits no change at all.",
            numbers::level(level)
        ),
        panels: with_time.map(|s| rows(s, &x)).collect(),
        specification: specification::in_time(&table),
        table,
    })
}

const LEFT: f64 = 12.0;
const RIGHT: f64 = PANEL_WIDTH - 12.0;

fn rows(subject: &Subject, x: &Scale) -> Panel {
    let mut d = Drawing::new();
    d.name(
        "name",
        (8.0, 17.0),
        Anchor::Start,
        (subject.population, 304.0),
    );
    let top = 28.0;
    let bottom = top + ROW * subject.in_time.len() as f64 + 2.0;
    d.line("limit", (x.at(0.0), top), (x.at(0.0), bottom));
    let mut words = Vec::new();
    for (i, c) in subject.in_time.iter().enumerate() {
        let y = top + ROW * i as f64;
        let label = time_label(subject, c);
        let value = numbers::estimate(&c.fst_weir_cockerham, 3);
        words.push(format!("{label}: {value}"));
        let wide = super::drawing::width_of(&label, 11.0).min(296.0);
        d.rectangle("step-0", (LEFT - 2.0, y), (wide + 4.0, 14.0));
        d.name("small", (LEFT, y + 11.0), Anchor::Start, (&label, 296.0));
        d.begin(&format!("{label}: {value}"));
        dot(&mut d, &c.fst_weir_cockerham, c.kind, x, y + 24.0);
        d.end();
    }
    d.line("axis", (LEFT, bottom), (RIGHT, bottom));
    let places = x.places(4);
    for tick in x.ticks(4) {
        d.line("axis", (x.at(tick), bottom), (x.at(tick), bottom + 4.0));
        let label = numbers::decimals(tick, places);
        d.text("tick", (x.at(tick), bottom + 16.0), Anchor::Middle, &label);
    }
    d.text(
        "small",
        (160.0, bottom + 33.0),
        Anchor::Middle,
        "FST, no unit",
    );
    Panel {
        title: subject.population.to_owned(),
        description: words.join("; "),
        width: PANEL_WIDTH,
        height: bottom + 42.0,
        body: d.into_body(),
    }
}

fn dot(d: &mut Drawing, e: &Estimate, kind: Kind, x: &Scale, y: f64) {
    let (colour, shape) = match kind {
        Kind::SinceBaseline => ("deep", Shape::Circle),
        _ => ("ochre", Shape::Square),
    };
    if let Some([low, high]) = e.interval {
        let whisker = format!("{colour} whisker");
        d.line(&whisker, (x.at(low), y), (x.at(high), y));
        for limit in [low, high] {
            d.line(&whisker, (x.at(limit), y - 4.0), (x.at(limit), y + 4.0));
        }
    }
    match e.estimate {
        Some(fst) => d.mark(&format!("{colour} solid"), shape, (x.at(fst), y)),
        None => {
            let words = numbers::reason(e.absent_because.as_deref());
            d.name("small soft", (LEFT, y + 3.0), Anchor::Start, (words, 296.0));
        }
    }
}

fn time_label(subject: &Subject, c: &Comparison) -> String {
    let visit = |name: &str| {
        let stratum = subject.stratum(name);
        stratum.map_or_else(|| name.to_owned(), |s| s.visit.clone())
    };
    let what = match c.kind {
        Kind::SinceBaseline => "since the baseline",
        _ => "since the visit before",
    };
    format!("{} to {}, {what}", visit(&c.from), visit(&c.to))
}

fn table<'a>(comparisons: impl Iterator<Item = &'a Comparison>, caption: &str) -> Table {
    let mut table = Table::new(
        caption,
        &[
            ("from", "From"),
            ("to", "To"),
            ("kind", "Kind"),
            ("generations", "Generations"),
            ("loci", "Loci"),
            ("fst", "FST (Weir & Cockerham 1984)"),
            ("fst_low", "lower limit"),
            ("fst_high", "upper limit"),
            ("fst_hudson", "FST (Hudson et al. 1992)"),
            ("fst_hudson_low", "lower limit"),
            ("fst_hudson_high", "upper limit"),
            ("gst", "GST (Nei 1973)"),
            ("gst_low", "lower limit"),
            ("gst_high", "upper limit"),
            ("gst_hedrick", "Standardised GST (Hedrick 2005)"),
            ("gst_hedrick_low", "lower limit"),
            ("gst_hedrick_high", "upper limit"),
            ("jost_d", "D (Jost 2008)"),
            ("jost_d_low", "lower limit"),
            ("jost_d_high", "upper limit"),
            ("fc", "Fc (Nei & Tajima 1981)"),
            ("fk", "Fk (Pollak 1983)"),
            ("fs", "Fs (Jorde & Ryman 2007)"),
            ("change_expected", "Change of expected heterozygosity"),
            ("change_expected_low", "lower limit"),
            ("change_expected_high", "upper limit"),
            ("change_richness", "Change of allelic richness"),
            ("change_richness_low", "lower limit"),
            ("change_richness_high", "upper limit"),
            ("loci_fixed_since", "Loci fixed since"),
        ],
    );
    for c in comparisons {
        let mut row = vec![
            Cell::from(c.from.as_str()),
            Cell::from(c.to.as_str()),
            Cell::from(kind_name(c.kind)),
            Cell::maybe(c.generations),
            Cell::from(c.fst_weir_cockerham.loci),
        ];
        let five = [
            &c.fst_weir_cockerham,
            &c.fst_hudson,
            &c.gst_nei,
            &c.gst_hedrick,
            &c.jost_d,
        ];
        row.extend(five.iter().flat_map(|e| cells(e)));
        let value = |e: &Option<Estimate>| Cell::maybe(e.as_ref().and_then(|e| e.estimate));
        row.extend([&c.fc, &c.fk, &c.fs].map(value));
        row.extend(cells(&c.change.expected_heterozygosity));
        row.extend(cells(&c.change.allelic_richness));
        row.push(c.loci_fixed_since.map_or(Cell::Missing, Cell::from));
        table.rows.push(row);
    }
    table
}

fn kind_name(kind: Kind) -> &'static str {
    match kind {
        Kind::SinceBaseline => "since the baseline",
        Kind::BetweenVisits => "since the visit before",
        Kind::BetweenPopulations => "between populations",
    }
}
