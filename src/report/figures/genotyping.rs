//! Call rate and Hardy-Weinberg proportions by stratum, a panel a population.

use super::drawing::{Anchor, Drawing, Shape};
use super::scale::Scale;
use super::subject::Subject;
use super::table::{Cell, Table};
use super::{Figure, PANEL_WIDTH, Panel, numbers, specification};
use crate::report::wire::Stratum;

const ROW: f64 = 38.0;
const TOP: f64 = 44.0;
const RATE: [f64; 2] = [12.0, 148.0];
const REJECTED: [f64; 2] = [174.0, 308.0];

/// How complete the genotypes are, and how they fit Hardy-Weinberg proportions.
pub fn figure(subjects: &[Subject]) -> Option<Figure> {
    let strata = || subjects.iter().flat_map(|s| s.strata.iter().copied());
    let rate = strata().next()?.hardy_weinberg.false_discovery_rate;
    let most = strata()
        .flat_map(|s| [deficit_share(s) + excess_share(s)])
        .fold(0.05, f64::max);
    let table = table(strata());
    Some(Figure {
        name: "genotyping",
        title: "Call rate and Hardy-Weinberg proportions".to_owned(),
        caption: format!(
            "Left: share of genotypes called, in percent. Right: share of tested loci, in percent, that \
             depart from Hardy-Weinberg proportions by the exact test at a false discovery rate of {} % \
             (Benjamini & Hochberg 1995): solid with too few heterozygotes, hatched with too many. Too \
             few over many loci point to a mixed sample, inbreeding or alleles that fail to amplify; \
             too many to duplicated loci. Shares of a whole sample have no interval.",
            numbers::level(rate)
        ),
        panels: subjects.iter().map(|s| panel(s, most)).collect(),
        specification: specification::genotyping(&table),
        table,
    })
}

fn share(part: u64, whole: u64) -> f64 {
    match whole {
        0 => 0.0,
        whole => part as f64 / whole as f64,
    }
}

fn deficit_share(s: &Stratum) -> f64 {
    share(s.hardy_weinberg.deficit, s.hardy_weinberg.tested)
}

fn excess_share(s: &Stratum) -> f64 {
    share(s.hardy_weinberg.excess, s.hardy_weinberg.tested)
}

fn panel(subject: &Subject, most: f64) -> Panel {
    let mut d = Drawing::new();
    d.name(
        "name",
        (8.0, 17.0),
        Anchor::Start,
        (subject.population, 304.0),
    );
    d.text("small", (RATE[0], 36.0), Anchor::Start, "Call rate, %");
    d.text(
        "small",
        (REJECTED[0], 36.0),
        Anchor::Start,
        "Loci that depart, %",
    );
    let rate = Scale::linear([0.0, 1.0], RATE);
    let rejected = Scale::linear([0.0, most], REJECTED);
    let mut words = Vec::new();
    for (i, s) in subject.strata.iter().enumerate() {
        words.push(row(&mut d, s, (&rate, &rejected), TOP + ROW * i as f64));
    }
    let bottom = TOP + ROW * subject.strata.len() as f64;
    for (scale, pixels, most) in [(&rate, RATE, 2), (&rejected, REJECTED, 3)] {
        d.line("axis", (pixels[0], bottom), (pixels[1], bottom));
        let places = scale.places(most).saturating_sub(2);
        for tick in scale.ticks(most) {
            let at = scale.at(tick);
            d.line("axis", (at, bottom), (at, bottom + 4.0));
            let label = numbers::decimals(100.0 * tick, places);
            d.text("tick", (at, bottom + 16.0), Anchor::Middle, &label);
        }
    }
    Panel {
        title: subject.population.to_owned(),
        description: words.join("; "),
        width: PANEL_WIDTH,
        height: bottom + 24.0,
        body: d.into_body(),
    }
}

fn row(d: &mut Drawing, s: &Stratum, (rate, rejected): (&Scale, &Scale), top: f64) -> String {
    let hw = &s.hardy_weinberg;
    let visit = format!(
        "{}, {}",
        s.visit,
        numbers::counted(s.individuals, "individual", "individuals")
    );
    d.name(
        "small",
        (RATE[0], top + 14.0),
        Anchor::Start,
        (&visit, 150.0),
    );
    let counts = format!(
        "{} of {}",
        numbers::count(hw.rejected),
        numbers::count(hw.tested)
    );
    d.text("small", (REJECTED[0], top + 14.0), Anchor::Start, &counts);
    let y = top + 26.0;
    let words = format!(
        "{visit}: call rate {} %; {counts} loci depart from Hardy-Weinberg proportions, {} with too few \
         and {} with too many heterozygotes",
        numbers::decimals(100.0 * s.call_rate, 1),
        numbers::count(hw.deficit),
        numbers::count(hw.excess)
    );
    d.begin(&words);
    d.line("grid", (RATE[0], y), (RATE[1], y));
    d.line("deep line", (RATE[0], y), (rate.at(s.call_rate), y));
    d.mark("deep solid", Shape::Circle, (rate.at(s.call_rate), y));
    let middle = rejected.at(deficit_share(s));
    let end = rejected.at(deficit_share(s) + excess_share(s));
    d.line("grid", (REJECTED[0], y), (REJECTED[1], y));
    if hw.deficit > 0 {
        let size = (middle - REJECTED[0], 10.0);
        d.rectangle("plum area", (REJECTED[0], y - 5.0), size);
    }
    if hw.excess > 0 {
        d.hatched("ochre", (middle, y - 5.0), (end - middle, 10.0));
    }
    d.end();
    words
}

fn table<'a>(strata: impl Iterator<Item = &'a Stratum>) -> Table {
    let mut table = Table::new(
        "Call rate and exact tests of Hardy-Weinberg proportions by population and visit.",
        &[
            ("population", "Population"),
            ("visit", "Visit"),
            ("individuals", "Individuals"),
            ("call_rate", "Call rate"),
            ("tested", "Loci tested"),
            ("rejected", "Loci that depart"),
            ("deficit", "Too few heterozygotes"),
            ("excess", "Too many heterozygotes"),
            ("false_discovery_rate", "False discovery rate"),
        ],
    );
    table.rows.extend(strata.map(|s| {
        let hw = &s.hardy_weinberg;
        vec![
            Cell::from(s.population.as_str()),
            Cell::from(s.visit.as_str()),
            Cell::from(s.individuals),
            Cell::from(s.call_rate),
            Cell::from(hw.tested),
            Cell::from(hw.rejected),
            Cell::from(hw.deficit),
            Cell::from(hw.excess),
            Cell::from(hw.false_discovery_rate),
        ]
    }));
    table
}
