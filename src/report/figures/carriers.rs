//! The individuals that carry what is at risk, a panel a population.

use super::drawing::{Anchor, Drawing, Shape};
use super::scale::Scale;
use super::subject::Subject;
use super::table::{Cell, Table};
use super::{Figure, PANEL_WIDTH, Panel, numbers, specification};
use crate::report::wire::{Carrier, Report};

const ROW: f64 = 21.0;
const NAME_WIDTH: f64 = 120.0;
const LEFT: f64 = NAME_WIDTH + 16.0;
/// Individuals drawn of one population; the table has all.
const MOST_ROWS: usize = 15;

/// Carriers of scarce alleles, in the order of the report.
pub fn figure(report: &Report, subjects: &[Subject]) -> Option<Figure> {
    let all: Vec<(&str, Vec<&Carrier>)> = subjects
        .iter()
        .map(|s| {
            let own = report.carriers.iter();
            let own = own.filter(|c| c.population == s.population);
            (s.population, own.collect::<Vec<_>>())
        })
        .filter(|(_, carriers)| !carriers.is_empty())
        .collect();
    if all.is_empty() {
        return None;
    }
    let carriers = all.iter().flat_map(|(_, c)| c);
    let most = carriers.fold(1.0, |most, c| {
        f64::max(most, (c.only_carrier as f64).max(c.would_vanish))
    });
    let table = table(report, &all);
    Some(Figure {
        name: "carriers",
        title: "Who carries what is at risk".to_owned(),
        caption: "Individuals of the latest visit on whom scarce alleles hang. Bars: alleles that this \
                  individual alone carries among those sampled. Diamonds: alleles expected to vanish \
                  from the sampled individuals if it does not breed and every other has two offspring; \
                  exact for the sample, so without interval. Counts of alleles. Animals that were not \
                  sampled may carry them too."
            .to_owned(),
        panels: all
            .iter()
            .map(|(name, carriers)| panel(name, carriers, most))
            .collect(),
        specification: specification::carriers(&table),
        table,
    })
}

fn table(report: &Report, all: &[(&str, Vec<&Carrier>)]) -> Table {
    let mut table = Table::new(
        "Individuals by the scarce alleles that hang on them.",
        &[
            ("population", "Population"),
            ("individual", "Individual"),
            ("only_carrier", "Alleles it alone carries"),
            (
                "would_vanish",
                "Alleles expected to vanish without its offspring",
            ),
            ("listed", "Alleles at risk listed with it as a carrier"),
        ],
    );
    for (population, carriers) in all {
        for c in carriers {
            let at_risk = report.at_risk.iter();
            let listed =
                at_risk.filter(|a| a.population == *population && a.carriers.contains(&c.sample));
            table.rows.push(vec![
                Cell::from(*population),
                Cell::from(c.sample.as_str()),
                Cell::from(c.only_carrier),
                Cell::from(c.would_vanish),
                Cell::from(listed.count() as u64),
            ]);
        }
    }
    table
}

fn panel(population: &str, carriers: &[&Carrier], most: f64) -> Panel {
    let shown = &carriers[..carriers.len().min(MOST_ROWS)];
    let mut d = Drawing::new();
    d.name("name", (8.0, 17.0), Anchor::Start, (population, 304.0));
    let x = Scale::linear([0.0, most], [LEFT, PANEL_WIDTH - 14.0]);
    let bottom = 32.0 + ROW * shown.len() as f64;
    for tick in x.ticks(4) {
        let at = x.at(tick);
        d.line("grid", (at, 28.0), (at, bottom));
        let label = numbers::decimals(tick, x.places(4));
        d.text("tick", (at, bottom + 16.0), Anchor::Middle, &label);
    }
    for (i, c) in shown.iter().enumerate() {
        row(&mut d, c, &x, 30.0 + ROW * i as f64);
    }
    d.line("axis", (LEFT, bottom), (PANEL_WIDTH - 14.0, bottom));
    let middle = (LEFT + PANEL_WIDTH - 14.0) / 2.0;
    d.text("small", (middle, bottom + 33.0), Anchor::Middle, "Alleles");
    let mut y = bottom + 52.0;
    d.rectangle("plum area", (8.0, y - 10.0), (14.0, 11.0));
    d.text("small", (27.0, y), Anchor::Start, "carried by it alone");
    d.mark("ink hollow", Shape::Diamond, (160.0, y - 4.0));
    d.text("small", (170.0, y), Anchor::Start, "expected to vanish");
    if carriers.len() > shown.len() {
        let more = (carriers.len() - shown.len()) as u64;
        y += 17.0;
        let words = counted_more(more);
        d.text("small soft", (8.0, y), Anchor::Start, &words);
    }
    let words = shown.iter().map(|c| sentence(c));
    Panel {
        title: population.to_owned(),
        description: format!(
            "{}. {}",
            numbers::counted(carriers.len() as u64, "carrier", "carriers"),
            words.collect::<Vec<_>>().join("; ")
        ),
        width: PANEL_WIDTH,
        height: y + 8.0,
        body: d.into_body(),
    }
}

fn row(d: &mut Drawing, c: &Carrier, x: &Scale, y: f64) {
    d.name("", (8.0, y + 12.0), Anchor::Start, (&c.sample, NAME_WIDTH));
    d.begin(&sentence(c));
    let size = (x.at(c.only_carrier as f64) - LEFT, 12.0);
    d.rectangle("plum area", (LEFT, y + 2.0), size);
    let at = (x.at(c.would_vanish), y + 8.0);
    d.mark("ink hollow", Shape::Diamond, at);
    d.end();
}

fn counted_more(n: u64) -> String {
    let counted = numbers::counted(n, "more individual", "more individuals");
    format!("{counted} in the table")
}

fn sentence(c: &Carrier) -> String {
    format!(
        "{}: {} carried by it alone, {} expected to vanish without its offspring",
        c.sample,
        numbers::counted(c.only_carrier, "allele", "alleles"),
        numbers::decimals(c.would_vanish, 1)
    )
}
