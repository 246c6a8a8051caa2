//! The programme's limits and whether they are kept, as a verdict says.

use crate::report::figures::numbers::{counted, percent};
use crate::report::figures::table::{Cell, Table};
use crate::report::verdict::{Answer, Indicator, Place, Rule, Verdict, limit, value};

use super::tables::TableView;
use super::view::{PlacedText, Section};

/// The part of the page for one verdict, the `index`-th of them.
pub fn section(verdict: &Verdict, index: usize) -> Section {
    let number = |joint: &str| match index {
        0 => String::new(),
        more => format!("{joint}{}", more + 1),
    };
    let indicator = verdict.indicator.as_ref();
    let mut notes = verdict.notes.clone();
    notes.push(origin(verdict));
    Section {
        id: format!("verdict{}", number("-")),
        heading: format!("The limits of the programme{}", number(", policy ")),
        words: vec![sum(verdict)],
        statements: indicator.map(indicator_words).unwrap_or_default(),
        open_table: Some(TableView::of(&rules(verdict))),
        notes,
        ..Section::default()
    }
}

fn sum(verdict: &Verdict) -> String {
    let count = |name: &str| verdict.counts.get(name).copied().unwrap_or(0);
    let whole = match verdict.answer {
        Answer::Met => "Every limit that binds is kept.",
        Answer::CannotTell => {
            "No limit that binds is clearly broken, but the data do not show that all are kept."
        }
        Answer::Breached => "At least one limit that binds is broken.",
    };
    let rules = counted(
        count("met") + count("breached") + count("cannot_tell"),
        "rule that binds",
        "rules that bind",
    );
    format!(
        "{whole} Of {rules}: kept everywhere {}, broken somewhere {}, not told by the data {} (the \
         interval crosses the limit, or there is no value).",
        count("met"),
        count("breached"),
        count("cannot_tell"),
    )
}

fn origin(verdict: &Verdict) -> String {
    let settings = &verdict.provenance.settings;
    let policy = settings.get("policy").map_or("unknown", String::as_str);
    format!(
        "Policy: {policy}. A rule of thumb from the literature is not law; the programme sets its limits."
    )
}

fn rules(verdict: &Verdict) -> Table {
    let mut table = Table::new(
        "Each rule of the policy and its answer, place by place.",
        &[
            ("rule", "Rule"),
            ("where", "Where"),
            ("answer", "Answer"),
            ("value", "Value and interval"),
            ("limit", "Limit"),
            ("binding", "Binds"),
            ("reason", "Why"),
            ("source", "Source of the limit"),
        ],
    );
    for rule in &verdict.rules {
        let rows = rule.places.iter().map(|place| row(rule, place));
        table.rows.extend(rows);
    }
    table
}

fn row(rule: &Rule, place: &Place) -> Vec<Cell> {
    let value = match place.value.is_none() && !place.unbounded {
        true => String::new(),
        false => value(place),
    };
    vec![
        Cell::from(rule.rule.as_str()),
        Cell::from(place.place.as_str()),
        Cell::from(word(place.answer)),
        Cell::from(value),
        Cell::from(limit(rule)),
        Cell::from(if rule.binding { "yes" } else { "no, told only" }),
        Cell::from(place.reason.as_str()),
        Cell::from(rule.source.as_deref().unwrap_or("none named")),
    ]
}

fn word(answer: Answer) -> &'static str {
    match answer {
        Answer::Met => "kept",
        Answer::CannotTell => "? not told by the data",
        Answer::Breached => "\u{2715} broken",
    }
}

fn indicator_words(indicator: &Indicator) -> Vec<PlacedText> {
    let share = |share: Option<f64>, range: Option<[f64; 2]>| match (share, range) {
        (Some(share), Some([low, high])) => {
            format!(
                "{} % ({} to {})",
                percent(share),
                percent(low),
                percent(high)
            )
        }
        (Some(share), None) => format!("{} %", percent(share)),
        (None, _) => "no share, since no population was assessed".to_owned(),
    };
    let size = indicator.size;
    let mut words = vec![PlacedText {
        place: format!("Populations with an effective size above {size}"),
        text: format!(
            "{} as a mean over {} of {} species. {}",
            share(indicator.mean, indicator.range),
            indicator.species_assessed,
            indicator.species_total,
            indicator.source
        ),
    }];
    words.extend(indicator.species.iter().map(|species| PlacedText {
        place: species.species.clone(),
        text: format!(
            "{}: {} of {} assessed, of {} in all",
            share(species.share, species.range),
            species.above,
            counted(species.assessed, "population", "populations"),
            species.total
        ),
    }));
    words
}
