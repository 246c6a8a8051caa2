//! What is left after so many generations under one management or another.
//!
//! Each draw takes a drift rate from what is believed of it, loci from the spectrum of the latest
//! sample, frequencies from their posterior, and lets them drift; what is told of a draw is a share
//! of what the same draw starts with, so that the report's own values stand at the start.

mod chance;
mod project;
mod rate;
mod scenario;
mod spectrum;
mod watch_list;
mod watched;

pub use project::{Band, LimitTime, Projection, Row, band, project};
pub use rate::DriftRate;
pub use scenario::{Arrival, Scenario, Size, parse_scenarios, read_scenarios};
pub use spectrum::Spectrum;
pub use watch_list::{Watched, parse_watched, read_watched};
pub use watched::{Chances, Fate, Way, chances};

/// A population as a forecast finds it.
#[derive(Debug, Clone, PartialEq)]
pub struct Start {
    /// Its name.
    pub population: String,
    /// Its latest stratum.
    pub stratum: String,
    /// Year of that stratum.
    pub year: f64,
    /// Years in a generation; `None` where nobody knows.
    pub generation_years: Option<f64>,
    /// What is believed of 1/(2Ne); `None` where there is no estimate.
    pub rate: Option<DriftRate>,
    /// Expected heterozygosity and its standard error.
    pub expected_heterozygosity: Option<[f64; 2]>,
    /// FIS and its standard error.
    pub inbreeding_coefficient: Option<[f64; 2]>,
    /// Allelic richness and its standard error.
    pub allelic_richness: Option<[f64; 2]>,
    /// Gene copies of the richness.
    pub gene_copies: u32,
    /// Expected heterozygosity as a share of the baseline's, with its standard error.
    pub kept_since_baseline: Option<[f64; 2]>,
    /// Alleles by copies in the latest sample.
    pub spectrum: Spectrum,
    /// Alleles that the latest sample shows at the loci of the spectrum.
    pub alleles: u64,
    /// Other strata that the report compares it with.
    pub sources: Vec<SourceStratum>,
}

/// A stratum that individuals may come from.
#[derive(Debug, Clone, PartialEq)]
pub struct SourceStratum {
    /// Its name.
    pub stratum: String,
    /// Its expected heterozygosity.
    pub within: f64,
    /// Chance that a gene copy of it and one of the population differ.
    pub between: f64,
}

impl Start {
    /// The source of this name.
    pub fn source(&self, stratum: &str) -> Option<&SourceStratum> {
        self.sources.iter().find(|s| s.stratum == stratum)
    }
}

/// How far and how finely to look.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Horizon {
    /// Generations ahead.
    pub generations: usize,
    /// Draws.
    pub draws: usize,
    /// Seed of all chance.
    pub seed: u64,
    /// Share of the baseline's expected heterozygosity that must be kept.
    pub keep: f64,
}

/// Effective size that keeps a share of heterozygosity over so many generations: 1/(2(1 - R^(1/t)))
/// (Soule, Gilpin, Conway & Foose 1986). `None` for a share of 1 or more, which no size keeps.
pub fn size_needed(share: f64, generations: f64) -> Option<f64> {
    (share > 0.0 && share < 1.0 && generations > 0.0)
        .then(|| -0.5 / (share.ln() / generations).exp_m1())
}

/// Generations until heterozygosity has fallen to a share: ln R / ln(1 - u).
pub fn generations_until(share: f64, rate: f64) -> Option<f64> {
    (share > 0.0 && share < 1.0 && rate > 0.0 && rate < 1.0).then(|| share.ln() / (-rate).ln_1p())
}

#[cfg(test)]
mod tests {
    use super::*;

    // Arithmetic; check 11.2 of the methods: 90 % over 100 years, generations of 1 to 25 years
    // (Soule, Gilpin, Conway & Foose 1986).
    #[test]
    fn size_that_keeps_ninety_percent() {
        for (length, size) in [
            (1.0, 474.8111229517124),
            (2.5, 190.07457137111893),
            (5.0, 95.16243531127202),
            (10.0, 47.706546906486125),
            (25.0, 19.233540654740573),
        ] {
            let got = size_needed(0.9, 100.0 / length).unwrap();
            assert!((got - size).abs() < 1e-4 * size, "{got} is not {size}");
            // And back: that size takes as many generations.
            let back = generations_until(0.9, 0.5 / got).unwrap();
            assert!((back - 100.0 / length).abs() < 1e-9, "{back}");
        }
        assert_eq!(size_needed(1.0, 10.0), None);
    }
}
