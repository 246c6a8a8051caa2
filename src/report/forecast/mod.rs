//! A forecast from a report.

mod document;
mod starts;
mod text;

pub use document::{
    Band, FORECAST_FORMAT, FORECAST_VERSION, Forecast, Limit, Population, Scenario, SizeNeeded,
    SizeToday, Step, Watched, WatchedStep,
};
pub use starts::{Counted, counted, starts};
pub use text::text_table;

use super::wire::{Provenance, Report};
use crate::outlook::forecast as outlook;
use crate::outlook::forecast::{Horizon, Start};

/// What every forecast assumes.
const ASSUMPTIONS: [&str; 6] = [
    "Generations are discrete; alleles are neutral unless a selection coefficient is given; nobody \
     comes in unless the scenario says so.",
    "Bands count drift, the uncertainty of the effective size and of today's diversity and \
     frequencies. They do not count what a scenario gets wrong.",
    "Drift of means is drawn for at most 1000 alleles at a time: linked loci drift together, and a \
     band over more would be too narrow.",
    "The effective size is taken to stay what it was over the interval of its estimate, unless the \
     scenario says otherwise.",
    "Newcomers breed like residents, the source keeps its diversity and the effective size stays as \
     the scenario says: newcomers are m/(Ne + m) of the parents. Bands then count the effective size \
     and today's diversity, not the drift of means.",
    "Alleles are followed only where nobody comes in: a report does not say which alleles the source \
     shares.",
];

/// A job of a forecast: one population under one scenario.
#[derive(Debug, Clone, Copy)]
pub struct Job<'a> {
    /// The population.
    pub start: &'a Start,
    /// The scenario.
    pub scenario: &'a outlook::Scenario,
    /// Its place among the populations.
    pub index: usize,
    /// The watched alleles of all populations.
    pub watched: &'a [Counted<'a>],
    /// How far and how finely.
    pub horizon: Horizon,
}

impl Job<'_> {
    /// The future as the document tells it.
    pub fn run(&self) -> Scenario {
        let mut out = Scenario {
            scenario: self.scenario.name.clone(),
            first_effective_size: None,
            steps: Vec::new(),
            limit: None,
            watched: Vec::new(),
            notes: Vec::new(),
            absent_because: None,
        };
        let Some(projection) = outlook::project(self.start, self.scenario, &self.horizon) else {
            out.absent_because =
                Some("the effective size is not known: give sizes in the scenario".to_owned());
            return out;
        };
        if self.start.alleles == 0 {
            out.notes
                .push("the report has no spectrum of alleles for this population".to_owned());
        }
        if self.scenario.is_open() {
            out.notes
                .push("alleles are not followed where individuals come in".to_owned());
        }
        out.first_effective_size = Some(projection.first_size);
        out.steps = projection.rows.iter().map(|row| self.step(row)).collect();
        out.limit = Some(self.limit(&projection.limit));
        let shown: Vec<usize> = projection.rows.iter().map(|row| row.generation).collect();
        out.watched = self
            .watched
            .iter()
            .filter(|counted| counted.start == self.index)
            .map(|counted| self.watch(counted.allele, counted.counts, &shown))
            .collect();
        out
    }

    fn year(&self, generations: f64) -> Option<f64> {
        Some(self.start.year + generations * self.start.generation_years?)
    }

    fn step(&self, row: &outlook::Row) -> Step {
        let followed = self.start.alleles > 0;
        // Heterozygosity drifts with the alleles of the spectrum: without one it is not followed.
        let if_followed =
            |b: Option<outlook::Band>| b.filter(|_| followed || self.scenario.is_open()).map(band);
        let alleles = self.start.alleles as f64;
        Step {
            generation: row.generation as u64,
            year: self.year(row.generation as f64),
            expected_heterozygosity: if_followed(row.expected_heterozygosity),
            observed_heterozygosity: if_followed(row.observed_heterozygosity),
            kept_since_baseline: if_followed(row.kept_since_baseline),
            allelic_richness: if_followed(row.allelic_richness),
            alleles_left: row.alleles_left.filter(|_| followed).map(|b| Band {
                median: alleles * b.median,
                central_50: b.central_50.map(|x| alleles * x),
                central_95: b.central_95.map(|x| alleles * x),
            }),
            inbreeding: band(row.inbreeding),
        }
    }

    fn limit(&self, limit: &outlook::LimitTime) -> Limit {
        Limit {
            keep: self.horizon.keep,
            share_of: share_of(self.start).to_owned(),
            chance_crossed: limit.crossed,
            chance_crossed_today: limit.crossed_now,
            generations: limit.median,
            generations_central_95: limit.central_95,
            year: limit.median.and_then(|t| self.year(t)),
        }
    }

    fn watch(&self, allele: &outlook::Watched, counts: (u32, u32), shown: &[usize]) -> Watched {
        let found = outlook::chances(
            self.start,
            self.scenario,
            allele,
            counts,
            shown,
            &self.horizon,
        );
        let absent = found.is_none().then(|| {
            "individuals come in and the list gives no source_frequency for this allele".to_owned()
        });
        let way = |way: &outlook::Way| match way {
            outlook::Way::Chain => "chain",
            outlook::Way::Diffusion => "diffusion",
            outlook::Way::Paths => "paths",
        };
        let step = |fate: &outlook::Fate| WatchedStep {
            generation: fate.generation as u64,
            year: self.year(fate.generation as f64),
            lost: fate.lost,
            still_there: fate.still_there,
            fixed: fate.fixed,
        };
        let fates = found.as_ref().map(|f| f.fates.iter().map(step).collect());
        let ways = found
            .as_ref()
            .map(|f| f.ways.iter().map(|w| way(w).to_owned()).collect());
        Watched {
            contig: allele.contig.clone(),
            position: allele.position,
            allele: allele.allele.clone(),
            copies: counts.0.into(),
            gene_copies: counts.1.into(),
            selection_coefficient: allele.selection,
            steps: fates.unwrap_or_default(),
            fixed_in_the_end: found.as_ref().and_then(|f| f.fixed_in_the_end),
            computed_by: ways.unwrap_or_default(),
            absent_because: absent,
        }
    }
}

/// The document around the scenarios of each population, which are in the order of `starts`.
pub fn forecast(
    report: &Report,
    starts: &[Start],
    horizons: &[Horizon],
    scenarios: Vec<Vec<Scenario>>,
    provenance: Provenance,
) -> Forecast {
    let first = horizons.first();
    let populations = starts.iter().zip(horizons).zip(scenarios);
    Forecast {
        format: FORECAST_FORMAT.to_owned(),
        format_version: FORECAST_VERSION,
        provenance,
        keep: first.map_or(0.9, |h| h.keep),
        draws: first.map_or(0, |h| h.draws as u64),
        seed: first.map_or(0, |h| h.seed),
        populations: populations
            .map(|((start, horizon), scenarios)| population(report, start, horizon, scenarios))
            .collect(),
        assumptions: ASSUMPTIONS.map(str::to_owned).into(),
        cautions: super::CAUTIONS
            .iter()
            .map(|&text| text.to_owned())
            .collect(),
    }
}

fn population(
    report: &Report,
    start: &Start,
    horizon: &Horizon,
    scenarios: Vec<Scenario>,
) -> Population {
    let quoted = report.quoted_size(&start.population, None);
    let generations = horizon.generations as f64;
    let needed = |share_of: &str, share: f64| {
        let effective_size = outlook::size_needed(share, generations);
        SizeNeeded {
            share_of: share_of.to_owned(),
            keep: horizon.keep,
            generations,
            years: start.generation_years.map(|l| l * generations),
            absent_because: effective_size
                .is_none()
                .then(|| "less than this share is left already".to_owned()),
            effective_size,
        }
    };
    let kept = start.kept_since_baseline.map(|[kept, _]| kept);
    let mut sizes_needed = vec![needed("today", horizon.keep)];
    sizes_needed.extend(kept.map(|kept| needed("baseline", horizon.keep / kept)));
    Population {
        population: start.population.clone(),
        stratum: start.stratum.clone(),
        year: start.year,
        generation_years: start.generation_years,
        generations: horizon.generations as u64,
        effective_size: SizeToday {
            estimate: quoted.and_then(|q| q.estimate),
            interval: quoted
                .and_then(|q| q.interval)
                .map(|(low, high)| [low, high]),
            unbounded: quoted.is_some_and(|q| q.unbounded),
            method: quoted.map(|q| q.method.clone()),
            absent_because: quoted
                .is_none()
                .then(|| "the report has no estimate up to the latest visit".to_owned()),
        },
        alleles: start.alleles,
        kept_since_baseline: kept,
        sizes_needed,
        scenarios,
    }
}

fn share_of(start: &Start) -> &'static str {
    match start.kept_since_baseline {
        Some(_) => "baseline",
        None => "today",
    }
}

fn band(b: outlook::Band) -> Band {
    Band {
        median: b.median,
        central_50: b.central_50,
        central_95: b.central_95,
    }
}
