//! The weighing of designs as a short table for a terminal.

use super::document::{Design, Precision, Sampling};

/// Precision, then needs, then power.
pub fn text_table(design: &Design) -> String {
    let mut rows = vec![row([
        "method",
        "individuals",
        "loci",
        "generations",
        "Ne",
        "least CV",
        "narrowest interval",
    ])];
    rows.extend(design.precision.iter().map(precision));
    let mut text = aligned(&rows);
    for allele in &design.allele_detection {
        text.push_str(&format!(
            "an allele of frequency {} is seen with {:.0} % by {} individuals\n",
            allele.frequency,
            100.0 * allele.seen,
            allele.individuals
        ));
    }
    if !design.power.is_empty() {
        let head = [
            "declared",
            "individuals",
            "loci",
            "generations",
            "Ne",
            "power",
            "false alarms",
        ];
        let mut rows = vec![row(head)];
        for power in &design.power {
            let told = format!("{:.2} +- {:.2}", power.power, power.error);
            let alarms = format!("{:.2} at Ne {}", power.false_alarms, power.false_alarms_at);
            rows.push(sampled(&power.declared, &power.design, told, alarms));
        }
        text.push_str(&aligned(&rows));
    }
    text
}

fn precision(precision: &Precision) -> [String; 7] {
    let interval = match precision.narrowest_interval {
        Some((low, Some(high))) => format!("{low:.0} to {high:.0}"),
        Some((low, None)) => format!("{low:.0} to unbounded"),
        None => "unbounded".to_owned(),
    };
    let cv = format!("{:.3}", precision.least_cv);
    sampled(&precision.method, &precision.design, cv, interval)
}

fn sampled(name: &str, design: &Sampling, sixth: String, seventh: String) -> [String; 7] {
    let generations = design
        .generations
        .map_or_else(|| "-".to_owned(), |t| t.to_string());
    [
        name.to_owned(),
        design.individuals.to_string(),
        design.loci.to_string(),
        generations,
        design.effective_size.to_string(),
        sixth,
        seventh,
    ]
}

fn row(cells: [&str; 7]) -> [String; 7] {
    cells.map(str::to_owned)
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
