//! The report in a few lines for a terminal. The report itself holds everything; this is a first look.

use std::fmt::Write;

use super::wire::{Estimate, Kind, Report, Stratum};

/// Warnings told in full; the others are counted.
const MOST_WARNINGS: usize = 12;

/// A short text: a table a population, effective size, alleles, warnings.
pub fn summary(report: &Report) -> String {
    let mut out = String::new();
    let _ = writeln!(
        out,
        "{} individuals, {} loci ({} vary); intervals of {:.0} %",
        report.samples.used,
        report.loci.kept,
        report.loci.polymorphic,
        100.0
            * report
                .strata
                .first()
                .map_or(0.95, |s| s.observed_heterozygosity.level)
    );
    let mut start = 0;
    while start < report.strata.len() {
        let population = &report.strata[start].population;
        let visits = report.strata[start..]
            .iter()
            .take_while(|s| s.population == *population);
        let visits: Vec<&Stratum> = visits.collect();
        start += visits.len();
        population_table(&mut out, report, population, &visits);
    }
    for warning in report.warnings.iter().take(MOST_WARNINGS) {
        let _ = writeln!(
            out,
            "note: {}: {}",
            plain(&warning.place),
            plain(&warning.text)
        );
    }
    let more = report.warnings.len().saturating_sub(MOST_WARNINGS);
    if more > 0 {
        let _ = writeln!(out, "note: {more} more in the report");
    }
    out
}

fn population_table(out: &mut String, report: &Report, population: &str, visits: &[&Stratum]) {
    let header = [
        "visit",
        "individuals",
        "observed het.",
        "expected het.",
        "allelic richness",
    ];
    let mut rows = vec![header.map(str::to_owned)];
    rows.extend(visits.iter().map(|s| {
        [
            plain(&s.visit),
            s.individuals.to_string(),
            with_interval(&s.observed_heterozygosity, 3),
            with_interval(&s.expected_heterozygosity, 3),
            with_interval(&s.allelic_richness, 2),
        ]
    }));
    let widths: Vec<usize> = (0..header.len())
        .map(|column| {
            rows.iter()
                .map(|row| row[column].chars().count())
                .max()
                .unwrap_or(0)
        })
        .collect();
    let _ = writeln!(out, "\n{}", plain(population));
    for row in rows {
        let cells = row
            .iter()
            .zip(&widths)
            .map(|(cell, &width)| format!("{cell:<width$}"));
        let _ = writeln!(out, "  {}", cells.collect::<Vec<_>>().join("  ").trim_end());
    }
    if let Some(size) = report
        .effective_size_summary
        .iter()
        .find(|s| s.population == population)
    {
        let _ = writeln!(out, "  effective size: {}", size.text);
    }
    let latest = visits
        .last()
        .map(|s| s.stratum.as_str())
        .unwrap_or_default();
    let since = report
        .comparisons
        .iter()
        .find(|c| c.kind == Kind::SinceBaseline && c.to == latest);
    if let Some((comparison, alleles)) = since.and_then(|c| c.alleles.as_ref().map(|a| (c, a))) {
        let lost = match alleles.probably_lost {
            Some(lost) => format!("; {lost} probably gone from the population"),
            None => String::new(),
        };
        let kept = &comparison.change.expected_heterozygosity_kept;
        let _ = writeln!(
            out,
            "  since {}: keeps {} of its expected heterozygosity; {} of {} alleles not seen again{lost}",
            plain(&comparison.from),
            with_interval(kept, 2),
            alleles.not_seen_again,
            alleles.baseline
        );
    }
}

/// `0.241 (0.221 to 0.261)`, or a dash.
fn with_interval(estimate: &Estimate, digits: usize) -> String {
    match (estimate.estimate, estimate.interval) {
        (Some(value), Some([low, high])) => {
            format!("{value:.digits$} ({low:.digits$} to {high:.digits$})")
        }
        (Some(value), None) => format!("{value:.digits$} (no interval)"),
        (None, _) => "-".to_owned(),
    }
}

/// Names come from input files: nothing in them may steer a terminal.
fn plain(text: &str) -> String {
    text.chars()
        .map(|c| if c.is_control() { ' ' } else { c })
        .collect()
}

/// A first look at a screening report, a few lines.
pub fn screen_summary(report: &super::screen_wire::ScreenReport) -> String {
    let groups = |kind: &str| {
        report
            .same_individual
            .iter()
            .filter(|g| g.kind == kind)
            .count()
    };
    let left_out = report.samples.iter().filter(|sample| !sample.used).count();
    let mut out = format!(
        "{} samples at {} loci ({} vary); {left_out} should not be used\n",
        report.samples.len(),
        report.loci.kept,
        report.loci.varying
    );
    out.push_str(&format!(
        "one individual: {} group(s) within a visit, {} between visits, {} between populations, {} of declared replicates\n",
        groups("within_visit"),
        groups("between_visits"),
        groups("between_populations"),
        groups("declared_replicates"),
    ));
    let wrong = report
        .replicates
        .iter()
        .filter(|check| check.matches == Some(false))
        .count();
    if wrong > 0 {
        out.push_str(&format!(
            "{wrong} declared replicate(s) do not match: check the labels\n"
        ));
    }
    for stratum in &report.strata {
        if matches!(stratum.tells.as_deref(), Some("nobody" | "unrelated_only")) {
            out.push_str(&format!(
                "{}: the panel cannot tell close relatives apart\n",
                stratum.stratum
            ));
        }
    }
    let rejected: u64 = report.odd_heterozygotes.rejected.values().sum();
    out.push_str(&format!(
        "families of full sibs: {}; loci with odd heterozygotes: {rejected}\n",
        report.families.families.len()
    ));
    out
}
