//! Sums to report: asks the estimators, words the answers.

mod batches;
mod comparisons;
mod effective_size;
mod latest;
mod losses;
mod strata;

pub use batches::notes as batch_notes;
pub use comparisons::comparisons;
pub use effective_size::{Fits, effective_size, fits, summaries};
pub use latest::{allele_spectra, at_risk, carrier_pairs, carriers};
pub use losses::losses;
pub use strata::strata;

use super::wire;
use crate::merge::Sums;
use crate::model::{Comparison, Programme, Strata};
use crate::ne::estimate::{Absence, Estimate, VarianceParts};

/// Everything that the sections of a report are made from.
#[derive(Debug)]
pub struct Findings<'a> {
    /// Who was sampled where and when.
    pub strata: &'a Strata,
    /// The comparisons, in the order of the pairs of the sums.
    pub comparisons: &'a [Comparison],
    /// The sums over loci, flushed.
    pub sums: &'a Sums,
    /// What the programme knows of each population.
    pub programme: &'a Programme,
    /// Coverage that intervals aim at.
    pub level: f64,
    /// Rate at which false discoveries are controlled.
    pub false_discovery_rate: f64,
    /// The likelihood fits, made once by [`Findings::fitted`] for every section that needs them.
    pub fits: Vec<Fits>,
}

impl Findings<'_> {
    /// The findings with their likelihood fits.
    pub fn fitted(mut self) -> Self {
        self.fits = fits(&self);
        self
    }

    /// An estimate as the report writes it, its limits held inside `range`.
    fn wire(&self, estimate: &Estimate, range: [f64; 2]) -> wire::Estimate {
        let held = |x: f64| x.clamp(range[0], range[1]);
        wire::Estimate {
            estimate: estimate.value.ok(),
            standard_error: estimate.standard_error(),
            interval: estimate
                .interval(self.level)
                .map(|[low, high]| [held(low), held(high)]),
            level: self.level,
            loci: estimate.loci,
            gene_copies: None,
            interval_counts: estimate.parts().map(|parts| match parts {
                VarianceParts::LociAndIndividuals => wire::IntervalCounts::LociAndIndividuals,
                VarianceParts::Loci => wire::IntervalCounts::Loci,
                VarianceParts::Individuals => wire::IntervalCounts::Individuals,
            }),
            absent_because: estimate
                .value
                .err()
                .map(|why: Absence| why.text().to_owned()),
        }
    }
}

/// No bound on the limits of an interval.
const ANY: [f64; 2] = [f64::NEG_INFINITY, f64::INFINITY];
/// Limits of a share.
const SHARE: [f64; 2] = [0.0, 1.0];
/// Limits of a number that cannot be negative.
const POSITIVE: [f64; 2] = [0.0, f64::INFINITY];

fn ratio(numerator: f64, denominator: f64) -> Option<f64> {
    (denominator > 0.0).then(|| numerator / denominator)
}
