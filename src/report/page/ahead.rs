//! What may be left in the years ahead, as forecasts say.

use crate::report::figures::Figure;
use crate::report::figures::fans::Future;
use crate::report::figures::numbers::{
    count, decimals, percent, percent_with_interval, size, year,
};
use crate::report::figures::table::{Cell, Table};
use crate::report::forecast::{Forecast, Limit, Population, Step, Watched, WatchedStep};

use super::read::Companions;
use super::view::{PlacedText, Section, chosen, listing};

/// The part of the page for all forecasts; none without one.
pub fn section(companions: &Companions, futures: &[Future], figures: &[Figure]) -> Option<Section> {
    let forecasts = &companions.forecasts;
    let first = forecasts.first()?;
    let mut tables = Vec::new();
    let watched = watched(futures);
    if !watched.rows.is_empty() {
        tables.push(listing(
            "Watched alleles at the end of each scenario",
            &watched,
        ));
    }
    let mut notes: Vec<String> = Vec::new();
    for future in futures {
        for note in &future.scenario.notes {
            let note = format!("{}: {note}.", future.scenario_name());
            if !notes.contains(&note) {
                notes.push(note);
            }
        }
    }
    notes.extend(first.assumptions.iter().cloned());
    notes.extend(forecasts.iter().map(origin));
    let mut statements: Vec<PlacedText> = futures.iter().map(statement).collect();
    statements.extend(sizes_needed(forecasts));
    Some(Section {
        id: "forecast".to_owned(),
        heading: "What may be left in the years ahead".to_owned(),
        words: vec![
            "Projections, not promises: each presumes that its scenario comes true. Ranges in brackets \
             hold the middle 95 % of simulated futures."
                .to_owned(),
        ],
        statements,
        figures: chosen(figures, &["forecast-heterozygosity", "forecast-alleles"]),
        tables,
        notes,
        ..Section::default()
    })
}

fn origin(forecast: &Forecast) -> String {
    let command = forecast.provenance.arguments.join(" ");
    format!(
        "Made by {} {} {command}: {} draws, seed {}.",
        forecast.provenance.program,
        forecast.provenance.version,
        count(forecast.draws),
        forecast.seed
    )
}

/// One scenario of one population in a sentence or two.
fn statement(future: &Future) -> PlacedText {
    let place = format!(
        "{}, {}",
        future.population.population,
        future.scenario_name()
    );
    let text = match future.scenario.steps.last() {
        None => {
            let why = future.scenario.absent_because.as_deref();
            format!(
                "no projection: {}.",
                why.unwrap_or("no reason was recorded")
            )
        }
        Some(last) => at_the_end(future, last),
    };
    PlacedText { place, text }
}

fn at_the_end(future: &Future, last: &Step) -> String {
    let when = match last.year {
        Some(at) => format!("by {}", year(at)),
        None => format!("after {} generations", last.generation),
    };
    let mut clauses = Vec::new();
    if let Some(kept) = future.kept(last) {
        clauses.push(format!(
            "{} of the expected heterozygosity of {} is left",
            percent_with_interval(kept.median, Some(kept.central_95)),
            future.share_of()
        ));
    }
    if let Some(left) = last.alleles_left {
        let [low, high] = left.central_95;
        clauses.push(format!(
            "{} ({} to {}) of the {} alleles of today's sample are left",
            decimals(left.median, 0),
            decimals(low, 0),
            decimals(high, 0),
            count(future.population.alleles)
        ));
    }
    clauses.push(format!(
        "inbreeding since the latest visit is {}",
        percent_with_interval(last.inbreeding.median, Some(last.inbreeding.central_95))
    ));
    let limit = future.scenario.limit.as_ref().map(limit_words);
    format!(
        "{when} {}.{}",
        clauses.join(", "),
        limit.unwrap_or_default()
    )
}

fn limit_words(limit: &Limit) -> String {
    let keep = format!("{} %", percent(limit.keep));
    let of = match limit.share_of.as_str() {
        "baseline" => "the baseline's",
        _ => "today's",
    };
    let when = match (limit.generations, limit.year) {
        (Some(0.0), _) => "is not kept today".to_owned(),
        (_, Some(at)) => format!("is kept until about {}", year(at.round())),
        (Some(t), None) => format!("is kept for about {} generations", decimals(t, 0)),
        (None, _) => "is kept beyond 2000 generations".to_owned(),
    };
    format!(
        " {keep} of {of} expected heterozygosity {when}; {} % of the futures fall below it before the horizon.",
        percent(limit.chance_crossed)
    )
}

/// The sizes that would keep the share, once a population.
fn sizes_needed(forecasts: &[Forecast]) -> Vec<PlacedText> {
    let mut told: Vec<PlacedText> = Vec::new();
    for population in forecasts.iter().flat_map(|f| &f.populations) {
        let sentences: Vec<String> = population.sizes_needed.iter().map(|needed| {
            let over = match needed.years {
                Some(years) => format!("{} years", decimals(years, 0)),
                None => format!("{} generations", decimals(needed.generations, 0)),
            };
            let of = if needed.share_of == "baseline" { "the baseline's" } else { "today's" };
            let keep = format!("{} %", percent(needed.keep));
            match needed.effective_size {
                Some(n) => format!("to keep {keep} of {of} expected heterozygosity over {over}, an effective size of {} is needed", size(n)),
                None => format!(
                    "{keep} of {of} expected heterozygosity cannot be kept over {over} at any size: {}",
                    needed.absent_because.as_deref().unwrap_or("no reason was recorded")
                ),
            }
        }).collect();
        let one = PlacedText {
            place: population.population.clone(),
            text: format!(
                "{}; it is {} now.",
                sentences.join("; "),
                size_today(population)
            ),
        };
        let is_told = |t: &PlacedText| t.place == one.place && t.text == one.text;
        if !told.iter().any(is_told) {
            told.push(one);
        }
    }
    told
}

fn size_today(population: &Population) -> String {
    let today = &population.effective_size;
    let end = |n: Option<f64>, none: &str| n.map_or_else(|| none.to_owned(), size);
    let range = today.interval.map(|[low, high]| {
        format!(
            " ({} to {})",
            end(low, "no lower limit"),
            end(high, "no upper limit")
        )
    });
    match today.estimate {
        Some(n) => format!("{}{}", size(n), range.unwrap_or_default()),
        None if today.unbounded => format!("without an upper limit{}", range.unwrap_or_default()),
        None => "not known".to_owned(),
    }
}

fn watched(futures: &[Future]) -> Table {
    let mut table = Table::new(
        "Chances of each watched allele at the end of each scenario; the three chances add up to 1.",
        &[
            ("population", "Population"),
            ("scenario", "Scenario"),
            ("contig", "Contig"),
            ("position", "Position"),
            ("allele", "Allele"),
            ("copies", "Copies in the latest sample"),
            ("gene_copies", "of gene copies"),
            ("selection", "Selection coefficient"),
            ("generation", "Generations ahead"),
            ("year", "Year"),
            ("lost", "Chance lost"),
            ("still_there", "Chance still there"),
            ("fixed", "Chance fixed"),
            ("in_the_end", "Chance fixed in the end"),
            ("absent_because", "Why a value is absent"),
        ],
    );
    for future in futures {
        let rows = future.scenario.watched.iter();
        table.rows.extend(rows.map(|w| watched_row(future, w)));
    }
    table
}

fn watched_row(future: &Future, watched: &Watched) -> Vec<Cell> {
    let last = watched.steps.last();
    let of = |pick: fn(&WatchedStep) -> f64| Cell::maybe(last.map(pick));
    vec![
        Cell::from(future.population.population.as_str()),
        Cell::from(future.scenario_name()),
        Cell::from(watched.contig.as_str()),
        Cell::from(watched.position),
        Cell::from(watched.allele.as_str()),
        Cell::from(watched.copies),
        Cell::from(watched.gene_copies),
        Cell::from(watched.selection_coefficient),
        last.map_or(Cell::Missing, |s| Cell::from(s.generation)),
        Cell::maybe(last.and_then(|s| s.year)),
        of(|s| s.lost),
        of(|s| s.still_there),
        of(|s| s.fixed),
        Cell::maybe(watched.fixed_in_the_end),
        Cell::from(watched.absent_because.as_deref().unwrap_or_default()),
    ]
}
