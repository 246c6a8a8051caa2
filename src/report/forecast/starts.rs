//! From a report: what each population starts with, and the counts of watched alleles.

use crate::error::Problem;
use crate::model::{nearest, spell_out};
use crate::outlook::forecast::{DriftRate, SourceStratum, Spectrum, Start, Watched};
use crate::report::tally_counts::TalliedCounts;
use crate::report::wire::{EffectiveSize, Estimate, Kind, Report};

/// The populations of a report; a generation length given wins over the report's.
pub fn starts(report: &Report, generation_years: Option<f64>) -> Vec<Start> {
    report
        .populations()
        .into_iter()
        .filter_map(|name| start(report, name, generation_years))
        .collect()
}

fn start(report: &Report, name: &str, generation_years: Option<f64>) -> Option<Start> {
    let latest = report.latest(name)?;
    let spectrum = report
        .allele_spectra
        .iter()
        .find(|s| s.population == name && s.stratum == latest.stratum);
    let spectrum = Spectrum::new(spectrum.map_or(&[], |s| s.classes.as_slice()));
    let kept = report
        .since_baseline(name)
        .and_then(|c| normal(&c.change.expected_heterozygosity_kept));
    Some(Start {
        population: name.to_owned(),
        stratum: latest.stratum.clone(),
        year: latest.year,
        generation_years: generation_years.or_else(|| report.generation_years(name)),
        rate: report.quoted_size(name, None).and_then(rate),
        expected_heterozygosity: normal(&latest.expected_heterozygosity),
        inbreeding_coefficient: normal(&latest.inbreeding_coefficient),
        allelic_richness: normal(&latest.allelic_richness),
        gene_copies: latest.allelic_richness.gene_copies.unwrap_or(2),
        kept_since_baseline: kept,
        alleles: spectrum.alleles(),
        spectrum,
        sources: sources(report, &latest.stratum),
    })
}

/// Value and standard error; an estimate without the latter is taken as it stands.
fn normal(estimate: &Estimate) -> Option<[f64; 2]> {
    Some([estimate.estimate?, estimate.standard_error.unwrap_or(0.0)])
}

fn rate(size: &EffectiveSize) -> Option<DriftRate> {
    let rate = &size.drift_rate;
    let value = rate.estimate?;
    let half = rate.interval.map(|[low, high]| (high - low) / 2.0);
    Some(match (rate.standard_error, half) {
        (Some(error), Some(half)) => DriftRate::estimated(value, error, half, rate.level),
        _ => DriftRate::certain(value),
    })
}

/// Strata that the report compares with a stratum, with the diversity within them and between.
fn sources(report: &Report, stratum: &str) -> Vec<SourceStratum> {
    let diversity = |name: &str| report.stratum(name)?.expected_heterozygosity.estimate;
    report
        .comparisons
        .iter()
        .filter(|c| c.kind == Kind::BetweenPopulations)
        .filter_map(|c| {
            let other = match stratum {
                s if c.from == s => &c.to,
                s if c.to == s => &c.from,
                _ => return None,
            };
            let (own, within) = (diversity(stratum)?, diversity(other)?);
            // FST = 1 - Hw/Hb, where Hw is the mean of both.
            let fst = c.fst_hudson.estimate.filter(|&f| f < 1.0)?;
            Some(SourceStratum {
                stratum: other.clone(),
                within,
                between: ((own + within) / 2.0 / (1.0 - fst)).clamp(0.0, 1.0),
            })
        })
        .collect()
}

/// A watched allele in one population.
#[derive(Debug, Clone, Copy)]
pub struct Counted<'w> {
    /// The allele.
    pub allele: &'w Watched,
    /// Index of the population among the starts.
    pub start: usize,
    /// Copies and gene copies typed at the latest visit.
    pub counts: (u32, u32),
}

/// Watched alleles by population with their counts: those of the list, else of a tally, else of the
/// report where it lists the allele as scarce. Or every row that none of them knows.
pub fn counted<'w>(
    report: &Report,
    starts: &[Start],
    watched: &'w [Watched],
    tallied: &TalliedCounts,
) -> Result<Vec<Counted<'w>>, Vec<Problem>> {
    let mut found = Vec::new();
    let mut problems = Vec::new();
    for allele in watched {
        let names = || starts.iter().map(|s| s.population.as_str());
        if let Some(name) = &allele.population
            && !names().any(|n| n == name)
        {
            let cure = match nearest(name, names()) {
                Some(near) => format!("did you mean '{near}'?"),
                None => format!("the report has {}", spell_out(names())),
            };
            let what = format!("no population '{name}' in the report");
            problems.push(Problem::at(allele.row, what, cure));
            continue;
        }
        let before = found.len();
        for (start, name) in names().enumerate() {
            if allele.population.as_deref().is_some_and(|p| p != name) {
                continue;
            }
            let stratum = &starts[start].stratum;
            let of_tally = tallied.of(&allele.contig, allele.position, &allele.allele, stratum);
            let of_tally = of_tally.filter(|&(copies, _)| copies > 0);
            let counts = allele.counts.or(of_tally);
            if let Some(counts) = counts.or_else(|| listed(report, name, allele)) {
                found.push(Counted {
                    allele,
                    start,
                    counts,
                });
            }
        }
        if found.len() == before {
            problems.push(not_listed(report, allele));
        }
    }
    match problems.is_empty() {
        true => Ok(found),
        false => Err(problems),
    }
}

/// Copies of an allele that the report lists as scarce.
fn listed(report: &Report, population: &str, allele: &Watched) -> Option<(u32, u32)> {
    report
        .at_risk
        .iter()
        .find(|a| {
            a.population == population
                && a.contig == allele.contig
                && a.position == allele.position
                && a.allele == allele.allele
        })
        .map(|a| (a.copies as u32, a.gene_copies as u32))
}

fn not_listed(report: &Report, allele: &Watched) -> Problem {
    let place = format!("{}:{}", allele.contig, allele.position);
    let gone = report.losses.iter().find(|loss| {
        loss.contig == allele.contig
            && loss.position == allele.position
            && loss.allele == allele.allele
            && allele
                .population
                .as_deref()
                .is_none_or(|p| p == loss.population)
    });
    match gone {
        Some(loss) => Problem::at(
            allele.row,
            format!(
                "allele {} at {place} was not seen at the latest visit of {}",
                allele.allele, loss.population
            ),
            "see 'losses' in the report for the chance that it is gone",
        ),
        None => Problem::at(
            allele.row,
            format!(
                "allele {} at {place} is not listed in the report",
                allele.allele
            ),
            "the report lists scarce alleles (at_risk) as written in the calls; for any other give \
             --tally with the tallies of the calls, or copies and gene_copies of the latest visit",
        ),
    }
}
