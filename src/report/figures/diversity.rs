//! Diversity over the years, a panel a population, with the loss that drift alone would make.

use super::drawing::{Anchor, Drawing, Shape, width_of};
use super::scale::{Scale, extent};
use super::subject::{Drift, Subject};
use super::table::{Cell, Table, cells};
use super::{Figure, PANEL_WIDTH, Panel, numbers, specification};
use crate::report::wire::{Estimate, Report, Stratum};

const LEFT: f64 = 46.0;
const RIGHT: f64 = PANEL_WIDTH - 10.0;
const UPPER: [f64; 2] = [202.0, 92.0];
const LOWER: [f64; 2] = [314.0, 244.0];
const HEIGHT: f64 = 356.0;
/// Observed and expected heterozygosity of one year stand side by side.
const ASIDE: f64 = 3.5;

/// Heterozygosity and richness by year.
pub fn figure(report: &Report, subjects: &[Subject]) -> Option<Figure> {
    if report.strata.is_empty() {
        return None;
    }
    let limits = Limits::of(report);
    let copies = report
        .strata
        .iter()
        .find_map(|s| s.allelic_richness.gene_copies);
    let richness = match copies {
        Some(n) => format!("Allelic richness, alleles in {n} gene copies"),
        None => "Allelic richness, alleles".to_owned(),
    };
    let level = report.strata[0].expected_heterozygosity.level;
    Some(Figure {
        name: "diversity",
        title: "Diversity over the years".to_owned(),
        caption: format!(
            "Expected heterozygosity (the chance that two gene copies of the sample differ, 0 to 1), \
             observed heterozygosity (the share of individuals with two different copies, 0 to 1) and \
             allelic richness, means over loci. Bars are {} % intervals. The dashed line is the \
             expected heterozygosity that drift alone would leave of the baseline's, \
             H(1 \u{2212} 1/(2Ne)) to the power of the generations (Wright 1931); its band spans the \
             interval of the effective size and takes the baseline as known. All populations share \
             the vertical scales, which do not start at zero.",
            numbers::level(level)
        ),
        panels: subjects
            .iter()
            .map(|s| panel(s, &limits, &richness))
            .collect(),
        table: table(report, subjects, &richness),
        specification: specification::diversity(&table(report, subjects, &richness)),
    })
}

/// Scales that all panels share.
struct Limits {
    heterozygosity: [f64; 2],
    richness: [f64; 2],
}

impl Limits {
    fn of(report: &Report) -> Self {
        let all = |pick: &dyn Fn(&Stratum) -> Vec<&Estimate>| {
            let values = report.strata.iter().flat_map(|s| {
                let values = pick(s).into_iter().flat_map(limits_of);
                values.collect::<Vec<_>>()
            });
            extent(values, 0.06, [0.0, 1.0])
        };
        Limits {
            heterozygosity: all(&|s| vec![&s.observed_heterozygosity, &s.expected_heterozygosity]),
            richness: all(&|s| vec![&s.allelic_richness]),
        }
    }
}

fn limits_of(e: &Estimate) -> impl Iterator<Item = f64> {
    let interval = e.interval.unwrap_or([f64::NAN; 2]);
    e.estimate.into_iter().chain(interval)
}

fn panel(subject: &Subject, limits: &Limits, richness: &str) -> Panel {
    let mut d = Drawing::new();
    d.name(
        "name",
        (8.0, 17.0),
        Anchor::Start,
        (subject.population, 304.0),
    );
    legend(&mut d, subject);
    let years = subject.strata.iter().map(|s| s.year);
    let [first, last] = extent(years, 0.08, [0.0, 1.0]);
    let years = match last > first {
        true => [first, last],
        false => [first - 1.0, last + 1.0],
    };
    let x = Scale::linear(years, [LEFT, RIGHT]);
    let y = Scale::linear(limits.heterozygosity, UPPER);
    d.text(
        "small",
        (8.0, 82.0),
        Anchor::Start,
        "Heterozygosity, 0 to 1",
    );
    frame(&mut d, &y, UPPER);
    if let Some(drift) = subject.drift() {
        expectation(&mut d, subject, &drift, &x, &y);
    }
    series(
        &mut d,
        subject,
        "plum hollow",
        Shape::Diamond,
        ASIDE,
        (&x, &y),
        |s| ("observed heterozygosity", &s.observed_heterozygosity),
    );
    series(
        &mut d,
        subject,
        "deep solid",
        Shape::Circle,
        -ASIDE,
        (&x, &y),
        |s| ("expected heterozygosity", &s.expected_heterozygosity),
    );
    let y = Scale::linear(limits.richness, LOWER);
    d.text("small", (8.0, LOWER[1] - 10.0), Anchor::Start, richness);
    frame(&mut d, &y, LOWER);
    series(
        &mut d,
        subject,
        "ochre solid",
        Shape::Triangle,
        0.0,
        (&x, &y),
        |s| ("allelic richness", &s.allelic_richness),
    );
    year_ticks(&mut d, subject, &x);
    Panel {
        title: subject.population.to_owned(),
        description: description(subject),
        width: PANEL_WIDTH,
        height: HEIGHT,
        body: d.into_body(),
    }
}

fn legend(d: &mut Drawing, subject: &Subject) {
    d.mark("deep solid", Shape::Circle, (13.0, 35.0));
    d.text("small", (22.0, 39.0), Anchor::Start, "expected");
    d.mark("plum hollow", Shape::Diamond, (91.0, 35.0));
    d.text("small", (100.0, 39.0), Anchor::Start, "observed");
    d.mark("ochre solid", Shape::Triangle, (171.0, 35.5));
    d.text("small", (180.0, 39.0), Anchor::Start, "allelic richness");
    if let Some(drift) = subject.drift() {
        d.rectangle("deep band", (8.0, 50.0), (18.0, 10.0));
        d.line("deep line dashed", (8.0, 55.0), (26.0, 55.0));
        let words = format!("drift at Ne {}", numbers::effective_size(drift.size));
        d.text("small", (31.0, 59.0), Anchor::Start, &words);
    }
}

fn frame(d: &mut Drawing, y: &Scale, pixels: [f64; 2]) {
    let most = ((pixels[0] - pixels[1]) / 18.0) as usize;
    let places = y.places(most);
    for tick in y.ticks(most) {
        let at = y.at(tick);
        d.line("grid", (LEFT, at), (RIGHT, at));
        let label = numbers::decimals(tick, places);
        d.text("tick", (LEFT - 5.0, at + 4.0), Anchor::End, &label);
    }
    d.line("axis", (LEFT, pixels[0]), (RIGHT, pixels[0]));
}

fn year_ticks(d: &mut Drawing, subject: &Subject, x: &Scale) {
    let bottom = LOWER[0];
    let mut free_from = f64::NEG_INFINITY;
    for stratum in &subject.strata {
        let at = x.at(stratum.year);
        d.line("axis", (at, bottom), (at, bottom + 4.0));
        d.line("axis", (at, UPPER[0]), (at, UPPER[0] + 4.0));
        let label = numbers::year(stratum.year);
        let half = width_of(&label, 11.0) / 2.0;
        if at - half > free_from {
            d.text("tick", (at, bottom + 16.0), Anchor::Middle, &label);
            free_from = at + half + 4.0;
        }
    }
    let middle = (LEFT + RIGHT) / 2.0;
    d.text(
        "small",
        (middle, bottom + 33.0),
        Anchor::Middle,
        "Year of sampling",
    );
}

/// The line and band of drift from the baseline to the latest visit.
fn expectation(d: &mut Drawing, subject: &Subject, drift: &Drift, x: &Scale, y: &Scale) {
    const STEPS: usize = 24;
    let Some((from, to)) = subject.baseline_and_latest() else {
        return;
    };
    let Some(start) = from.expected_heterozygosity.estimate else {
        return;
    };
    let at = |i: usize, kept: &dyn Fn(f64) -> f64| {
        let share = i as f64 / STEPS as f64;
        let year = from.year + share * (to.year - from.year);
        (x.at(year), y.at(start * kept(share * drift.generations)))
    };
    if drift.kept_interval(0.0).is_some() {
        let limit = |which: usize| move |t: f64| drift.kept_interval(t).map_or(1.0, |i| i[which]);
        let (low, high) = (limit(0), limit(1));
        let there = (0..=STEPS).map(|i| at(i, &low));
        let back = (0..=STEPS).rev().map(|i| at(i, &high));
        d.polyline("deep band", there.chain(back), true);
    }
    let line = (0..=STEPS).map(|i| at(i, &|t| drift.kept(t)));
    d.polyline("deep line dashed", line, false);
}

fn series<'a>(
    d: &mut Drawing,
    subject: &Subject<'a>,
    class: &str,
    shape: Shape,
    aside: f64,
    (x, y): (&Scale, &Scale),
    pick: impl Fn(&'a Stratum) -> (&'static str, &'a Estimate),
) {
    let colour = class.split(' ').next().unwrap_or_default();
    let points = subject.strata.iter().filter_map(|s| {
        let value = pick(s).1.estimate?;
        Some((x.at(s.year) + aside, y.at(value)))
    });
    d.polyline(&format!("{colour} line"), points, false);
    for stratum in &subject.strata {
        let (what, e) = pick(stratum);
        let Some(value) = e.estimate else { continue };
        let at = x.at(stratum.year) + aside;
        d.begin(&format!(
            "{}, {what}: {}",
            stratum.visit,
            numbers::estimate(e, 3)
        ));
        if let Some([low, high]) = e.interval {
            d.line(
                &format!("{colour} whisker"),
                (at, y.at(low)),
                (at, y.at(high)),
            );
        }
        d.mark(class, shape, (at, y.at(value)));
        d.end();
    }
}

fn description(subject: &Subject) -> String {
    let visits = subject.strata.iter().map(|s| {
        format!(
            "{}: expected heterozygosity {}, observed {}, allelic richness {}",
            s.visit,
            numbers::estimate(&s.expected_heterozygosity, 3),
            numbers::estimate(&s.observed_heterozygosity, 3),
            numbers::estimate(&s.allelic_richness, 2),
        )
    });
    visits.collect::<Vec<_>>().join("; ")
}

/// One row a stratum: every value of the strata that a person would copy.
fn table(report: &Report, subjects: &[Subject], richness: &str) -> Table {
    let mut table = Table::new(
        "Diversity by population and visit. Empty cells: no value; the last column says why.",
        &[
            ("population", "Population"),
            ("visit", "Visit"),
            ("year", "Mean year"),
            ("individuals", "Individuals"),
            ("loci", "Loci"),
            ("polymorphic_loci", "Loci that vary"),
            ("expected", "Expected heterozygosity"),
            ("expected_low", "lower limit"),
            ("expected_high", "upper limit"),
            ("observed", "Observed heterozygosity"),
            ("observed_low", "lower limit"),
            ("observed_high", "upper limit"),
            ("richness", richness),
            ("richness_low", "lower limit"),
            ("richness_high", "upper limit"),
            ("private_richness", "Private allelic richness"),
            ("private_richness_low", "lower limit"),
            ("private_richness_high", "upper limit"),
            ("effective_alleles", "Effective alleles"),
            ("effective_alleles_low", "lower limit"),
            ("effective_alleles_high", "upper limit"),
            ("inbreeding", "Inbreeding coefficient FIS"),
            ("inbreeding_low", "lower limit"),
            ("inbreeding_high", "upper limit"),
            (
                "drift_expectation",
                "Expected heterozygosity by drift alone",
            ),
            ("drift_low", "lower limit"),
            ("drift_high", "upper limit"),
            ("expected_per_site", "Expected heterozygosity per record"),
            ("absent_because", "Why a value is absent"),
        ],
    );
    for stratum in subjects.iter().flat_map(|subject| {
        let strata = subject.strata.iter();
        strata.map(move |&stratum| (subject, stratum))
    }) {
        table.rows.push(row(stratum.0, stratum.1));
    }
    debug_assert_eq!(table.rows.len(), report.strata.len());
    table
}

fn row(subject: &Subject, s: &Stratum) -> Vec<Cell> {
    let mut row = vec![
        Cell::from(s.population.as_str()),
        Cell::from(s.visit.as_str()),
        Cell::from(s.year),
        Cell::from(s.individuals),
        Cell::from(s.typed_loci),
        Cell::from(s.polymorphic_loci),
    ];
    let estimates = [
        &s.expected_heterozygosity,
        &s.observed_heterozygosity,
        &s.allelic_richness,
        &s.private_allelic_richness,
        &s.effective_alleles,
        &s.inbreeding_coefficient,
    ];
    row.extend(estimates.iter().flat_map(|e| cells(e)));
    row.extend(by_drift(subject, s).map(Cell::maybe));
    row.push(Cell::maybe(s.per_site.expected_heterozygosity.estimate));
    let mut reasons: Vec<&str> = estimates
        .iter()
        .filter_map(|e| e.absent_because.as_deref())
        .collect();
    reasons.dedup();
    row.push(Cell::from(reasons.join("; ")));
    row
}

/// Expected heterozygosity by drift alone at a visit, with limits.
fn by_drift(subject: &Subject, s: &Stratum) -> [Option<f64>; 3] {
    let value = || {
        let drift = subject.drift()?;
        let (from, to) = subject.baseline_and_latest()?;
        let start = from.expected_heterozygosity.estimate?;
        let share = (s.year - from.year) / (to.year - from.year);
        if !(0.0..=1.0).contains(&share) {
            return None;
        }
        let t = share * drift.generations;
        let interval = drift.kept_interval(t);
        Some([
            Some(start * drift.kept(t)),
            interval.map(|i| start * i[0]),
            interval.map(|i| start * i[1]),
        ])
    };
    value().unwrap_or([None; 3])
}

#[cfg(test)]
mod tests {
    use super::super::subject::subjects;
    use super::*;
    use crate::report::page::sample::two_populations;

    // Wright (1931): after 5 generations at Ne 38, (1 - 1/76)^5 = 0.93592 of 0.31 are left.
    #[test]
    fn drift_leaves_what_wright_says() {
        let report = two_populations();
        let subjects = subjects(&report);
        let latest = subjects[0].strata.last().unwrap();
        let [value, low, high] = by_drift(&subjects[0], latest).map(Option::unwrap);
        assert!((value - 0.31 * 0.935_92).abs() < 1e-5, "{value}");
        assert!(low < value && value < high);
        assert_eq!(by_drift(&subjects[1], subjects[1].strata[0]), [None; 3]);
    }
}
