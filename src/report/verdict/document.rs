//! The verdict as it leaves the house: format `genewane-verdict`, version 1.

use std::collections::BTreeMap;

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

use crate::report::wire::Provenance;

/// Name of the format.
pub const VERDICT_FORMAT: &str = "genewane-verdict";
/// Version of the format.
pub const VERDICT_VERSION: u32 = 1;

/// A report held against the limits of a programme.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Verdict {
    /// Always `genewane-verdict`.
    pub format: String,
    /// Version of this format.
    pub format_version: u32,
    /// What made this verdict, from what.
    pub provenance: Provenance,
    /// Over the binding rules: `breached` if any is, else `cannot_tell` if any is, else `met`.
    pub answer: Answer,
    /// Answers of the binding rules by kind: `met`, `breached`, `cannot_tell`.
    pub counts: BTreeMap<String, u64>,
    /// What `cannot_tell` counts as for the exit code.
    pub on_uncertain: OnUncertain,
    /// Each rule with its answers, in the order of the policy.
    pub rules: Vec<Rule>,
    /// Share of populations with an effective size above 500 by species; null unless asked for.
    pub indicator: Option<Indicator>,
    /// What a reader should know before using the answers.
    pub notes: Vec<String>,
    /// What holds for every report.
    pub cautions: Vec<String>,
}

/// An answer.
#[derive(
    Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize, JsonSchema,
)]
#[serde(rename_all = "snake_case")]
pub enum Answer {
    /// The limit is kept.
    Met,
    /// The data do not say: the interval crosses the limit, or there is no value.
    CannotTell,
    /// The limit is not kept.
    Breached,
}

/// What `cannot_tell` counts as for the exit code.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "snake_case")]
pub enum OnUncertain {
    /// As met.
    Met,
    /// As breached: the cautious reading.
    Breached,
    /// As neither: it is told and leaves the exit code alone.
    Tell,
}

/// One rule of the policy and its answers.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Rule {
    /// Name as in the policy.
    pub rule: String,
    /// The measure, or the field of the report.
    pub measure: String,
    /// The limit.
    pub limit: Limit,
    /// `interval`: met or breached only where the whole interval is on one side; or `value`.
    pub by: String,
    /// Whether it counts for the answer and the exit code.
    pub binding: bool,
    /// Where the limit was published, as the policy says.
    pub source: Option<String>,
    /// The worst answer over the places.
    pub answer: Answer,
    /// One answer a place.
    pub places: Vec<Place>,
}

/// A limit: a side and a number, or true or false.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Limit {
    /// `above`, `at_least`, `below`, `at_most` or `is`.
    pub side: String,
    /// The number; null for `is`.
    pub number: Option<f64>,
    /// True or false; null for a number.
    pub flag: Option<bool>,
}

/// The answer of a rule for one population, pair of strata, or the report as a whole.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Place {
    /// Population, stratum pair, or `report`.
    #[serde(rename = "where")]
    pub place: String,
    /// The answer.
    pub answer: Answer,
    /// The value held against the limit, in the unit of its measure; null when unbounded or absent.
    pub value: Option<f64>,
    /// Lower and upper limit of its interval; null where unbounded; null as a whole where the value
    /// is a count or has no interval.
    pub interval: Option<[Option<f64>; 2]>,
    /// The value is not bounded from above.
    pub unbounded: bool,
    /// Where in the report, or in the policy, the value comes from.
    pub from: String,
    /// Why the answer is what it is.
    pub reason: String,
}

/// CBD headline indicator A.4: populations within species with an effective size above 500.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Indicator {
    /// The effective size to be above; this size itself does not pass.
    pub size: f64,
    /// Mean share over the species assessed, each with the same weight.
    pub mean: Option<f64>,
    /// The mean if every population whose interval holds the size were below, and above.
    pub range: Option<[f64; 2]>,
    /// Species with at least one population assessed.
    pub species_assessed: u64,
    /// Species named.
    pub species_total: u64,
    /// Each species.
    pub species: Vec<Species>,
    /// Where the definition was published.
    pub source: String,
}

/// The populations of one species.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Species {
    /// Name as in the policy; `not named` where it names none.
    pub species: String,
    /// Populations above over populations assessed.
    pub share: Option<f64>,
    /// The share if every population whose interval holds the size were below, and above.
    pub range: Option<[f64; 2]>,
    /// Populations above the size.
    pub above: u64,
    /// Populations with a size.
    pub assessed: u64,
    /// Populations with and without a size.
    pub total: u64,
    /// Each population.
    pub populations: Vec<Population>,
}

/// One population of a species.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Population {
    /// Its name.
    pub population: String,
    /// Effective size; null when unbounded or not assessed.
    pub effective_size: Option<f64>,
    /// Lower and upper limit; null where unbounded or not known.
    pub interval: Option<[Option<f64>; 2]>,
    /// Whether it counts as above; null when not assessed.
    pub above: Option<bool>,
    /// Its interval holds the size, or nothing is known of it.
    pub uncertain: bool,
    /// Where the size comes from.
    pub from: String,
    /// For a size from a census at a ratio of the population's own: the size at the ratio in use
    /// for populations without one.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub by_common_ratio: Option<f64>,
    /// Why it is not assessed.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub absent_because: Option<String>,
}
