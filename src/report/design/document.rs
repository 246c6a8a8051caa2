//! The weighing of designs as it leaves the house: format `genewane-design`, version 1.

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

use crate::report::wire::Provenance;

/// Name of the format.
pub const DESIGN_FORMAT: &str = "genewane-design";
/// Version of the format.
pub const DESIGN_VERSION: u32 = 1;

/// What sampling designs can tell.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Design {
    /// Always `genewane-design`.
    pub format: String,
    /// Version of this format.
    pub format_version: u32,
    /// What made this document.
    pub provenance: Provenance,
    /// Expected precision of each method for each combination asked for.
    pub precision: Vec<Precision>,
    /// Individuals that show an allele.
    pub allele_detection: Vec<AlleleDetection>,
    /// What it takes to reach a precision of the temporal estimate.
    pub needed_for_cv: Vec<NeededForCv>,
    /// Simulated chance to declare a decline; empty without simulations. The cheapest design first
    /// where costs are given, else the smallest.
    pub power: Vec<Power>,
    /// The first design in that order which reaches the power, by what is declared and the true
    /// effective size.
    pub smallest_with_power: Vec<Choice>,
    /// What the numbers assume.
    pub assumptions: Vec<String>,
    /// What holds for every report.
    pub cautions: Vec<String>,
}

/// One design.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Sampling {
    /// Individuals at each visit.
    pub individuals: u64,
    /// Loci.
    pub loci: u64,
    /// Generations between two visits; null for a method that needs one visit.
    pub generations: Option<u64>,
    /// True effective size.
    pub effective_size: f64,
    /// Cost of the samples of its visits and of the loci; null unless costs are given.
    pub cost: Option<f64>,
}

/// Expected precision of one method.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Precision {
    /// `temporal` or `linkage`.
    pub method: String,
    /// The design.
    pub design: Sampling,
    /// Coefficient of variation of the estimate of 1/Ne. A lower bound: loci share one pedigree and
    /// the same individuals, which the formula does not know.
    pub least_cv: f64,
    /// Expected F (temporal) or r2 (linkage).
    pub expected_signal: f64,
    /// 95 % interval of Ne at the expected signal, by chi-square: as narrow as it can be. The upper
    /// end is null when unbounded.
    pub narrowest_interval: Option<(f64, Option<f64>)>,
}

/// Individuals that show an allele.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct AlleleDetection {
    /// Frequency of the allele.
    pub frequency: f64,
    /// Probability to see it.
    pub seen: f64,
    /// Individuals needed: ln(1 - seen)/(2 ln(1 - p)), rounded up.
    pub individuals: u64,
    /// The same in fully inbred individuals, where it takes most.
    pub individuals_if_inbred: u64,
    /// Chance that each of the sample sizes asked for misses it.
    pub missed: Vec<Missed>,
}

/// Chance that a sample misses an allele.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Missed {
    /// Individuals.
    pub individuals: u64,
    /// (1 - p)^(2n).
    pub probability: f64,
}

/// What it takes to reach a precision of the temporal estimate.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct NeededForCv {
    /// Coefficient of variation of 1/Ne.
    pub cv: f64,
    /// The design: with its individuals, `loci_needed`; with its loci, `individuals_needed`.
    pub design: Sampling,
    /// Loci that reach it, at least.
    pub loci_needed: u64,
    /// Individuals at each visit that reach it, at least; null where no number does.
    pub individuals_needed: Option<u64>,
}

/// Simulated chance to declare a decline.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Power {
    /// What is declared: `size_below_limit_by_temporal_fs`, `size_below_limit_by_temporal_likelihood`,
    /// `size_below_limit_by_linkage` (the whole interval is below the limit), `heterozygosity_lower` or
    /// `richness_lower` (the whole interval of the change is below 0, or below the drop asked for),
    /// `allele_not_seen_again` (at least one allele of the first visit), `allele_called_lost` (at least one
    /// allele is called lost and no adult has it any more; a false alarm: one that some adult has).
    pub declared: String,
    /// The design.
    pub design: Sampling,
    /// Simulated populations.
    pub simulations: u64,
    /// Share of them in which it is declared.
    pub power: f64,
    /// Monte Carlo standard error of that share.
    pub error: f64,
    /// Share in which it is declared of a population where it should not be.
    pub false_alarms: f64,
    /// Effective size of that population.
    pub false_alarms_at: f64,
}

/// A design that reaches the power.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Choice {
    /// What is declared.
    pub declared: String,
    /// True effective size.
    pub effective_size: f64,
    /// Power to be reached.
    pub wanted: f64,
    /// The design; null where none reaches it.
    pub design: Option<Sampling>,
    /// Its power.
    pub power: Option<f64>,
    /// Its rate of false alarms.
    pub false_alarms: Option<f64>,
}
