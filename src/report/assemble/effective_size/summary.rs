//! The estimates of one population side by side, and whether they agree.

use crate::report::assemble::Findings;
use crate::report::wire::{ChangeTest, EffectiveSize, EffectiveSizeSummary};

/// One statement a population.
pub fn summaries(findings: &Findings, entries: &[EffectiveSize]) -> Vec<EffectiveSizeSummary> {
    let mut populations: Vec<&str> = findings
        .strata
        .strata
        .iter()
        .map(|s| s.population.as_str())
        .collect();
    populations.dedup();
    populations
        .into_iter()
        .map(|population| of(findings, population, entries))
        .collect()
}

fn of(findings: &Findings, population: &str, entries: &[EffectiveSize]) -> EffectiveSizeSummary {
    let latest = findings
        .strata
        .strata
        .iter()
        .rev()
        .find(|s| s.population == population);
    let latest = latest.map(|s| s.name.as_str()).unwrap_or_default();
    let quoted: Vec<&EffectiveSize> = entries
        .iter()
        .filter(|e| e.population == population && e.headline && e.to == latest)
        .filter(|e| e.method != "temporal_likelihood_by_interval" && e.interval.is_some())
        .filter(|e| since_baseline(findings, e))
        .collect();
    let agree = (quoted.len() > 1).then(|| pairs(&quoted).all(|(a, b)| overlap(a, b)));
    let said: Vec<String> = quoted.iter().map(|e| say(e)).collect();
    let verdict = match agree {
        None if quoted.is_empty() => {
            "no estimate: two visits with a known generation length, or linkage in one sample, are \
             needed"
        }
        None => "one method only",
        Some(true) => "the intervals overlap",
        Some(false) => {
            "the intervals do not overlap: the methods refer to different generations; migration, a \
             recent change of size, overlapping generations, relatives in the sample, or a wrong \
             sampling plan are the usual causes"
        }
    };
    let text = if said.is_empty() {
        verdict.to_owned()
    } else {
        format!("{}: {verdict}", said.join(", "))
    };
    let fits = findings
        .fits
        .iter()
        .find(|f| f.visits.population == population);
    EffectiveSizeSummary {
        population: population.to_owned(),
        text,
        agree,
        has_changed: fits.and_then(|f| f.change).map(|change| ChangeTest {
            statistic: change.statistic,
            degrees: change.degrees_of_freedom as u32,
            p: change.p,
        }),
    }
}

/// Temporal estimates of the whole time since the baseline; single-sample estimates always.
fn since_baseline(findings: &Findings, entry: &EffectiveSize) -> bool {
    let Some(from) = &entry.from else { return true };
    findings.comparisons.iter().any(|c| {
        c.kind == crate::model::ComparisonKind::SinceBaseline
            && findings.strata.strata[c.from].name == *from
            && findings.strata.strata[c.to].name == entry.to
    })
}

fn pairs<'a>(
    all: &'a [&'a EffectiveSize],
) -> impl Iterator<Item = (&'a EffectiveSize, &'a EffectiveSize)> {
    all.iter()
        .enumerate()
        .flat_map(|(i, a)| all[i + 1..].iter().map(move |b| (*a, *b)))
}

fn overlap(a: &EffectiveSize, b: &EffectiveSize) -> bool {
    match (a.drift_rate.interval, b.drift_rate.interval) {
        (Some([low_a, high_a]), Some([low_b, high_b])) => low_a <= high_b && low_b <= high_a,
        _ => false,
    }
}

fn say(entry: &EffectiveSize) -> String {
    let number = |size: Option<f64>| size.map_or("unbounded".to_owned(), |n| format!("{n:.0}"));
    let (low, high) = entry.interval.unwrap_or_default();
    let method = match entry.method.as_str() {
        "temporal_fs" => "temporal Fs".to_owned(),
        other => other.replace('_', " "),
    };
    format!(
        "{method} {} ({} to {})",
        number(entry.estimate),
        number(low),
        number(high)
    )
}
