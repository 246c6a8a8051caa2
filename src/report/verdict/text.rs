//! The verdict as a short table for a terminal.

use super::document::{Answer, Indicator, Place, Rule, Verdict};

/// Rules and answers in aligned columns, the sum in the last line.
pub fn text_table(verdict: &Verdict) -> String {
    let mut rows = vec![["", "rule", "where", "value", "limit"].map(str::to_owned)];
    for rule in &verdict.rules {
        for place in &rule.places {
            let answer = match (place.answer, rule.binding) {
                (answer, true) => word(answer).to_owned(),
                (answer, false) => format!("({})", word(answer)),
            };
            rows.push([
                answer,
                rule.rule.clone(),
                place.place.clone(),
                value(place),
                limit(rule),
            ]);
        }
    }
    let mut text = aligned(&rows);
    if let Some(indicator) = &verdict.indicator {
        text.push_str(&indicator_lines(indicator));
    }
    let count = |name: &str| verdict.counts.get(name).copied().unwrap_or(0);
    let told = verdict.rules.iter().filter(|rule| !rule.binding).count();
    text.push_str(&format!(
        "{}: {} met, {} breached, {} cannot tell{}\n",
        word(verdict.answer),
        count("met"),
        count("breached"),
        count("cannot_tell"),
        match told {
            0 => String::new(),
            n => format!("; {n} more rule(s) in brackets are told, not counted"),
        }
    ));
    text
}

fn word(answer: Answer) -> &'static str {
    match answer {
        Answer::Met => "met",
        Answer::CannotTell => "cannot tell",
        Answer::Breached => "BREACHED",
    }
}

/// The value with its interval, or why there is none.
pub fn value(place: &Place) -> String {
    let value = match place.value {
        Some(value) => number(value),
        None if place.unbounded => "unbounded".to_owned(),
        None => place.reason.clone(),
    };
    let end = |end: Option<f64>| end.map_or_else(|| "unbounded".to_owned(), number);
    match place.interval {
        Some([low, high]) => format!("{value} ({} to {})", end(low), end(high)),
        None => value,
    }
}

/// The limit in words, with the unit of what it limits.
pub fn limit(rule: &Rule) -> String {
    let limit = &rule.limit;
    let side = limit.side.replace('_', " ");
    match (limit.number, limit.flag) {
        (Some(limit), _) => {
            let words = format!("{side} {} {}", number(limit), unit(&rule.measure));
            words.trim_end().to_owned()
        }
        (None, Some(flag)) => format!("must be {}", if flag { "yes" } else { "no" }),
        (None, None) => side,
    }
}

/// What the numbers of a measure count; nothing for a number without a unit, and for a field of the report, whose
/// schema has it.
fn unit(measure: &str) -> &'static str {
    match measure {
        "effective_size" => "individuals",
        "inbreeding_per_generation" => "a generation",
        "heterozygosity_kept" => "of the baseline",
        "alleles_probably_lost" => "alleles",
        "share_probably_lost" => "of the baseline's alleles",
        "share_of_census" => "of the census",
        "populations_above" => "(share of the populations)",
        _ => "",
    }
}

/// Three digits, or all before the point.
fn number(value: f64) -> String {
    let size = value.abs();
    if size == 0.0 || size >= 100.0 || value == value.round() {
        format!("{value:.0}")
    } else {
        let places = (2 - size.log10().floor() as i32).clamp(0, 8) as usize;
        format!("{value:.places$}")
    }
}

fn aligned(rows: &[[String; 5]]) -> String {
    let width = |column: usize| {
        rows.iter()
            .map(|r| r[column].chars().count())
            .max()
            .unwrap_or(0)
    };
    let widths: Vec<usize> = (0..5).map(width).collect();
    let mut text = String::new();
    for row in rows {
        let cells: Vec<String> = row
            .iter()
            .zip(&widths)
            .map(|(cell, &width)| format!("{cell:<width$}"))
            .collect();
        text.push_str(cells.join("  ").trim_end());
        text.push('\n');
    }
    text
}

fn indicator_lines(indicator: &Indicator) -> String {
    let size = number(indicator.size);
    let mut text = format!("populations with an effective size above {size}:\n");
    for species in &indicator.species {
        let share = species.share.map_or_else(|| "no share".to_owned(), percent);
        text.push_str(&format!(
            "  {}: {} of {} assessed ({share}), {} of {} assessed\n",
            species.species, species.above, species.assessed, species.assessed, species.total
        ));
    }
    let mean = indicator.mean.map_or_else(|| "none".to_owned(), percent);
    text.push_str(&format!(
        "  mean over {} of {} species: {mean}\n",
        indicator.species_assessed, indicator.species_total
    ));
    text
}

fn percent(share: f64) -> String {
    format!("{:.1} %", 100.0 * share)
}
