//! The individuals that carry what is at risk, a panel a population.

use std::collections::BTreeMap;

use super::drawing::{Anchor, Drawing};
use super::scale::Scale;
use super::subject::Subject;
use super::table::{Cell, Table};
use super::{Figure, PANEL_WIDTH, Panel, numbers, specification};
use crate::report::wire::Report;

const ROW: f64 = 21.0;
const NAME_WIDTH: f64 = 120.0;
/// Individuals drawn of one population; the table has all.
const MOST_ROWS: usize = 15;

/// Carriers of alleles at risk, those of most alleles first.
pub fn figure(report: &Report, subjects: &[Subject]) -> Option<Figure> {
    let all: Vec<(&str, Vec<Carrier>)> = subjects
        .iter()
        .map(|s| (s.population, carriers(report, s.population)))
        .filter(|(_, carriers)| !carriers.is_empty())
        .collect();
    let most = all.iter().flat_map(|(_, c)| c).map(|c| c.alleles).max()?;
    let mut table = Table::new(
        "Individuals by the number of alleles at risk that they carry.",
        &[
            ("population", "Population"),
            ("individual", "Individual"),
            ("alleles", "Alleles at risk carried"),
            ("alone", "Of these, carried by no other in the sample"),
        ],
    );
    for (population, carriers) in &all {
        for c in carriers {
            table.rows.push(vec![
                Cell::from(*population),
                Cell::from(c.name),
                Cell::from(c.alleles),
                Cell::from(c.alone),
            ]);
        }
    }
    Some(Figure {
        name: "carriers",
        title: "Who carries what is at risk".to_owned(),
        caption: "Individuals of the latest visit that carry alleles held in few copies: how many such \
                  alleles each one carries, and (solid) how many of them no other sampled individual \
                  carries. Counts of alleles. The sample shows carriers; animals that were not sampled \
                  may carry them too."
            .to_owned(),
        panels: all.iter().map(|(name, c)| panel(name, c, most)).collect(),
        specification: specification::carriers(&table),
        table,
    })
}

struct Carrier<'a> {
    name: &'a str,
    alleles: u64,
    alone: u64,
}

fn carriers<'a>(report: &'a Report, population: &str) -> Vec<Carrier<'a>> {
    let mut counts: BTreeMap<&str, (u64, u64)> = BTreeMap::new();
    for allele in report.at_risk.iter().filter(|a| a.population == population) {
        for name in &allele.carriers {
            let count = counts.entry(name).or_default();
            count.0 += 1;
            count.1 += u64::from(allele.carriers.len() == 1);
        }
    }
    let mut carriers: Vec<Carrier> = counts
        .into_iter()
        .map(|(name, (alleles, alone))| Carrier {
            name,
            alleles,
            alone,
        })
        .collect();
    carriers.sort_by(|a, b| {
        (b.alleles, b.alone)
            .cmp(&(a.alleles, a.alone))
            .then(a.name.cmp(b.name))
    });
    carriers
}

fn panel(population: &str, carriers: &[Carrier], most: u64) -> Panel {
    let shown = &carriers[..carriers.len().min(MOST_ROWS)];
    let mut d = Drawing::new();
    d.name("name", (8.0, 17.0), Anchor::Start, (population, 304.0));
    let left = NAME_WIDTH + 16.0;
    let x = Scale::linear([0.0, most as f64], [left, PANEL_WIDTH - 44.0]);
    for (i, c) in shown.iter().enumerate() {
        let y = 30.0 + ROW * i as f64;
        let words = format!(
            "{}: {}, {} in no other",
            c.name,
            numbers::counted(c.alleles, "allele", "alleles"),
            numbers::count(c.alone)
        );
        d.name("", (8.0, y + 12.0), Anchor::Start, (c.name, NAME_WIDTH));
        d.begin(&words);
        let end = x.at(c.alleles as f64);
        d.rectangle("plum band", (left, y + 1.0), (end - left, 14.0));
        d.rectangle("plum area", (left, y + 1.0), (x.at(c.alone as f64) - left, 14.0));
        d.rectangle("box", (left, y + 1.0), (end - left, 14.0));
        d.text("small", (end + 5.0, y + 12.0), Anchor::Start, &numbers::count(c.alleles));
        d.end();
    }
    let mut bottom = 34.0 + ROW * shown.len() as f64;
    d.rectangle("plum area", (8.0, bottom), (14.0, 11.0));
    d.rectangle("box", (8.0, bottom), (14.0, 11.0));
    d.text("small", (27.0, bottom + 10.0), Anchor::Start, "in no other sampled individual");
    d.rectangle("plum band", (200.0, bottom), (14.0, 11.0));
    d.rectangle("box", (200.0, bottom), (14.0, 11.0));
    d.text("small", (219.0, bottom + 10.0), Anchor::Start, "in others too");
    if carriers.len() > shown.len() {
        let more = (carriers.len() - shown.len()) as u64;
        bottom += 18.0;
        let words = format!("{} more in the table", numbers::counted(more, "individual", "individuals"));
        d.text("small soft", (8.0, bottom + 10.0), Anchor::Start, &words);
    }
    let words = shown.iter().map(|c| format!("{}: {}", c.name, c.alleles));
    Panel {
        title: population.to_owned(),
        description: format!(
            "{}. Alleles at risk carried: {}",
            numbers::counted(carriers.len() as u64, "carrier", "carriers"),
            words.collect::<Vec<_>>().join("; ")
        ),
        width: PANEL_WIDTH,
        height: bottom + 18.0,
        body: d.into_body(),
    }
}
