//! The section on effective size: every method that applies, side by side.

mod counted;
mod likelihood;
mod linkage;
mod summary;
mod temporal;

pub use likelihood::{Fits, fits};
pub use summary::summaries;

use super::Findings;
use crate::model::SamplingPlan;
use crate::ne::estimate::Estimate;
use crate::report::wire;

/// All entries, by method, then population, then visit.
pub fn effective_size(findings: &Findings) -> Vec<wire::EffectiveSize> {
    let mut entries = temporal::entries(findings);
    entries.extend(likelihood::entries(findings));
    entries.extend(linkage::entries(findings));
    entries.extend(counted::entries(findings));
    entries
}

/// Fewest individuals in a sample from which an effective size is estimated: with fewer, the
/// variance over individuals itself is hardly known.
const FEWEST_INDIVIDUALS: usize = 5;

/// What an estimate of effective size is of.
#[derive(Debug, Clone, Default)]
struct Subject {
    population: String,
    method: &'static str,
    variant: Option<String>,
    from: Option<String>,
    to: String,
    refers_to: String,
    generations: Option<f64>,
    plan: Option<SamplingPlan>,
    individuals: Option<f64>,
    census: Option<f64>,
    headline: bool,
    notes: Vec<String>,
}

impl Findings<'_> {
    /// The entry of an estimate of 1/(2Ne): inverted last, unbounded where no drift shows.
    fn size(&self, subject: Subject, rate: &Estimate) -> wire::EffectiveSize {
        entry(subject, self.wire(rate, super::ANY))
    }
}

/// The entry of an estimate and interval of 1/(2Ne).
fn entry(subject: Subject, drift_rate: wire::Estimate) -> wire::EffectiveSize {
    let size = |u: f64| (u > 0.0).then(|| 0.5 / u);
    let interval = drift_rate
        .interval
        .map(|[low, high]| (size(high), size(low)));
    let estimate = drift_rate.estimate.and_then(size);
    wire::EffectiveSize {
        population: subject.population,
        method: subject.method.to_owned(),
        variant: subject.variant,
        from: subject.from,
        to: subject.to,
        refers_to: subject.refers_to,
        generations: subject.generations,
        plan: subject.plan.map(|plan| match plan {
            SamplingPlan::One => wire::Plan::I,
            SamplingPlan::Two => wire::Plan::II,
        }),
        estimate,
        unbounded: drift_rate.estimate.is_some() && estimate.is_none(),
        interval,
        level: drift_rate.level,
        loci: drift_rate.loci,
        individuals: subject.individuals,
        share_of_census: estimate.zip(subject.census).map(|(ne, census)| ne / census),
        headline: subject.headline,
        notes: subject.notes,
        absent_because: drift_rate.absent_because.clone(),
        drift_rate,
    }
}
