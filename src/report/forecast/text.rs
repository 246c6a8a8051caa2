//! The forecast as a short table for a terminal: the last row of each scenario.

use super::document::{Band, Forecast, Limit};

/// One line a population and scenario.
pub fn text_table(forecast: &Forecast) -> String {
    let mut rows = vec![
        [
            "population",
            "scenario",
            "when",
            "heterozygosity kept",
            "alleles left",
            "inbreeding",
            "limit",
        ]
        .map(str::to_owned),
    ];
    for population in &forecast.populations {
        for scenario in &population.scenarios {
            let mut row: [String; 7] = Default::default();
            row[0].clone_from(&population.population);
            row[1].clone_from(&scenario.scenario);
            match scenario.steps.last() {
                None => row[2] = scenario.absent_because.clone().unwrap_or_default(),
                Some(step) => {
                    row[2] = match step.year {
                        Some(year) => format!("{year:.0}"),
                        None => format!("{} generations", step.generation),
                    };
                    row[3] = range(step.kept_since_baseline, 3);
                    row[4] = range(step.alleles_left, 0);
                    row[5] = range(Some(step.inbreeding), 3);
                    row[6] = scenario.limit.as_ref().map(limit).unwrap_or_default();
                }
            }
            rows.push(row);
        }
    }
    aligned(&rows)
}

fn range(band: Option<Band>, digits: usize) -> String {
    band.map_or_else(
        || "-".to_owned(),
        |b| {
            let [low, high] = b.central_95;
            format!("{:.digits$} ({low:.digits$} to {high:.digits$})", b.median)
        },
    )
}

fn limit(limit: &Limit) -> String {
    let share = 100.0 * limit.keep;
    let when = match (limit.generations, limit.year) {
        (Some(0.0), _) => "already crossed".to_owned(),
        (_, Some(year)) => format!("crossed about {year:.0}"),
        (Some(generations), None) => format!("crossed in {generations:.0} generations"),
        (None, None) => "not crossed in 2000 generations".to_owned(),
    };
    format!("{share:.0} % of {}: {when}", limit.share_of)
}

fn aligned(rows: &[[String; 7]]) -> String {
    let width = |c: usize| rows.iter().map(|r| r[c].chars().count()).max().unwrap_or(0);
    let widths: Vec<usize> = (0..7).map(width).collect();
    let mut text = String::new();
    for row in rows {
        let cells = row
            .iter()
            .zip(&widths)
            .map(|(cell, &w)| format!("{cell:<w$}"));
        text.push_str(cells.collect::<Vec<_>>().join("  ").trim_end());
        text.push('\n');
    }
    text
}
