//! What later documents ask of a report: the latest visit of a population, its baseline, the
//! effective size to quote.

use super::wire::{Comparison, EffectiveSize, Kind, Report, Stratum};

/// Methods in the order in which they are quoted where several have an estimate: the likelihood uses
/// every visit; Fs is the least biased of the standardised changes; linkage speaks of the parents of
/// one sample. The rest are told when asked for by name.
const QUOTED: [&str; 6] = [
    "temporal_likelihood",
    "temporal_fs",
    "linkage",
    "temporal_fc",
    "temporal_fk",
    "demographic",
];

impl Report {
    /// Names of the populations, in order.
    pub fn populations(&self) -> Vec<&str> {
        let mut names: Vec<&str> = self.strata.iter().map(|s| s.population.as_str()).collect();
        names.dedup();
        names
    }

    /// The latest stratum of a population.
    pub fn latest(&self, population: &str) -> Option<&Stratum> {
        self.strata
            .iter()
            .filter(|s| s.population == population)
            .max_by(|a, b| a.year.total_cmp(&b.year))
    }

    /// The latest visit of a population against its baseline.
    pub fn since_baseline(&self, population: &str) -> Option<&Comparison> {
        self.ending_latest(population, Kind::SinceBaseline)
    }

    /// The comparison in time of this kind that ends at the latest visit of a population.
    pub fn ending_latest(&self, population: &str, kind: Kind) -> Option<&Comparison> {
        let latest = &self.latest(population)?.stratum;
        self.comparisons
            .iter()
            .find(|c| c.kind == kind && c.to == *latest)
    }

    /// The stratum of this name.
    pub fn stratum(&self, name: &str) -> Option<&Stratum> {
        self.strata.iter().find(|s| s.stratum == name)
    }

    /// The effective size to quote for a population: by `method`, or by the first in order that has
    /// an estimate; the headline of the method, since the baseline rather than since a later visit,
    /// up to the latest visit.
    pub fn quoted_size(&self, population: &str, method: Option<&str>) -> Option<&EffectiveSize> {
        let of_method = |name: &str| {
            let latest = self.latest(population)?;
            let baseline = self.since_baseline(population).map(|c| c.from.as_str());
            self.effective_size
                .iter()
                .filter(|e| e.population == population && e.method == name)
                .filter(|e| e.to == latest.stratum && e.drift_rate.estimate.is_some())
                .min_by_key(|e| {
                    let since_baseline = e.from.is_none() || e.from.as_deref() == baseline;
                    (!e.headline, !since_baseline)
                })
        };
        match method {
            Some(name) => of_method(name),
            None => QUOTED.iter().find_map(|name| of_method(name)),
        }
    }

    /// Length of a generation in years as the report uses it: years over generations of the
    /// comparison since the baseline, or of any other in time. `None` where no generations are known.
    pub fn generation_years(&self, population: &str) -> Option<f64> {
        let in_time = |c: &&Comparison| c.kind != Kind::BetweenPopulations;
        let of_population = |c: &&Comparison| {
            self.stratum(&c.to)
                .is_some_and(|s| s.population == population)
        };
        let length = |c: &Comparison| {
            let years = self.stratum(&c.to)?.year - self.stratum(&c.from)?.year;
            let generations = c.generations.filter(|&t| t > 0.0)?;
            Some(years / generations).filter(|&l| l > 0.0)
        };
        self.since_baseline(population)
            .and_then(length)
            .or_else(|| {
                self.comparisons
                    .iter()
                    .filter(in_time)
                    .filter(of_population)
                    .find_map(length)
            })
    }
}
