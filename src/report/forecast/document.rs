//! The forecast as it leaves the house: format `genewane-forecast`, version 1.

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

use crate::report::wire::Provenance;

/// Name of the format.
pub const FORECAST_FORMAT: &str = "genewane-forecast";
/// Version of the format.
pub const FORECAST_VERSION: u32 = 1;

/// What will be left of the diversity of each population under each scenario.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Forecast {
    /// Always `genewane-forecast`.
    pub format: String,
    /// Version of this format.
    pub format_version: u32,
    /// What made this forecast, from what.
    pub provenance: Provenance,
    /// Share of the baseline's expected heterozygosity that limits are about.
    pub keep: f64,
    /// Draws behind each band.
    pub draws: u64,
    /// Seed of all chance: the same seed gives the same bytes.
    pub seed: u64,
    /// Each population.
    pub populations: Vec<Population>,
    /// What a forecast assumes.
    pub assumptions: Vec<String>,
    /// What holds for every report.
    pub cautions: Vec<String>,
}

/// The future of one population.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Population {
    /// Its name.
    pub population: String,
    /// Its latest stratum, where the forecast starts.
    pub stratum: String,
    /// Year of that stratum.
    pub year: f64,
    /// Years in a generation; null where nobody knows, and then years are null everywhere.
    pub generation_years: Option<f64>,
    /// Generations ahead.
    pub generations: u64,
    /// Effective size today.
    pub effective_size: SizeToday,
    /// Alleles that the latest sample shows at loci which vary among all individuals of the report.
    pub alleles: u64,
    /// Expected heterozygosity today as a share of the baseline's; null without a baseline.
    pub kept_since_baseline: Option<f64>,
    /// Effective sizes that would keep the share, by what it is a share of.
    pub sizes_needed: Vec<SizeNeeded>,
    /// Each scenario, the status quo first.
    pub scenarios: Vec<Scenario>,
}

/// The effective size that the forecast starts from.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct SizeToday {
    /// Effective size in diploid individuals; null when unbounded or absent.
    pub estimate: Option<f64>,
    /// Lower and upper limit; the upper is null when unbounded.
    pub interval: Option<[Option<f64>; 2]>,
    /// The data show no more drift than sampling alone makes: draws reach sizes with next to none.
    pub unbounded: bool,
    /// Method of the estimate.
    pub method: Option<String>,
    /// Why there is none.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub absent_because: Option<String>,
}

/// The constant effective size that keeps a share of expected heterozygosity over the horizon.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct SizeNeeded {
    /// `today` or `baseline`: what the share is a share of.
    pub share_of: String,
    /// The share.
    pub keep: f64,
    /// Generations over which it is kept.
    pub generations: f64,
    /// Years over which it is kept.
    pub years: Option<f64>,
    /// 1/(2(1 - R^(1/t))) individuals; null where no size keeps it any more.
    pub effective_size: Option<f64>,
    /// Why there is none.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub absent_because: Option<String>,
}

/// Median and central ranges over the draws.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Band {
    /// Half of the draws lie below.
    pub median: f64,
    /// The middle half of the draws.
    pub central_50: [f64; 2],
    /// The middle 95 % of the draws.
    pub central_95: [f64; 2],
}

/// The future under one scenario.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Scenario {
    /// Name as in the scenario file; `status quo` is always there.
    pub scenario: String,
    /// Effective size of the first generation over the draws: 2.5 %, median, 97.5 %.
    pub first_effective_size: Option<[f64; 3]>,
    /// From today to the horizon; at most 41 rows, evenly spread.
    pub steps: Vec<Step>,
    /// When the share of the baseline's (or, without one, today's) heterozygosity is lost.
    pub limit: Option<Limit>,
    /// Alleles that somebody watches.
    pub watched: Vec<Watched>,
    /// What a reader should know of this scenario.
    pub notes: Vec<String>,
    /// Why there are no steps.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub absent_because: Option<String>,
}

/// One generation.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Step {
    /// Generations from the latest visit.
    pub generation: u64,
    /// Year.
    pub year: Option<f64>,
    /// Expected heterozygosity over the loci of the report.
    pub expected_heterozygosity: Option<Band>,
    /// Observed heterozygosity, if mating stays as it is (the same FIS).
    pub observed_heterozygosity: Option<Band>,
    /// Expected heterozygosity as a share of the baseline's.
    pub kept_since_baseline: Option<Band>,
    /// Allelic richness, at the gene copies of the report; null where individuals come in.
    pub allelic_richness: Option<Band>,
    /// Alleles of today's sample that are left; null where individuals come in.
    pub alleles_left: Option<Band>,
    /// Inbreeding accrued since the latest visit: chance that two copies of an individual descend
    /// from one copy of today.
    pub inbreeding: Band,
}

/// When a share of heterozygosity is no longer kept.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Limit {
    /// The share.
    pub keep: f64,
    /// `baseline`, or `today` where there is no baseline.
    pub share_of: String,
    /// Share of the draws in which it is not kept up to the horizon.
    pub chance_crossed: f64,
    /// Share of the draws in which it is not kept today.
    pub chance_crossed_today: f64,
    /// Median generations from today until then; null beyond 2000.
    pub generations: Option<f64>,
    /// The middle 95 % of the draws; an end beyond 2000 generations is null.
    pub generations_central_95: [Option<f64>; 2],
    /// The median as a year.
    pub year: Option<f64>,
}

/// A watched allele.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Watched {
    /// Contig.
    pub contig: String,
    /// 1-based position.
    pub position: u64,
    /// The allele as in the list.
    pub allele: String,
    /// Copies in the latest sample.
    pub copies: u64,
    /// Gene copies typed in the latest sample.
    pub gene_copies: u64,
    /// s of fitness 1, 1 + s, 1 + 2s with 0, 1, 2 copies.
    pub selection_coefficient: f64,
    /// What may become of it, by generation, averaged over what is believed of the effective size
    /// and of the frequency today.
    pub steps: Vec<WatchedStep>,
    /// Chance that it is fixed in the end (Kimura 1962); null when newcomers go on coming.
    pub fixed_in_the_end: Option<f64>,
    /// How the chances were computed: `chain` (exact), `diffusion`, `paths` (simulated).
    pub computed_by: Vec<String>,
    /// Why there are no chances.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub absent_because: Option<String>,
}

/// A watched allele at one generation; the three chances add up to 1.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct WatchedStep {
    /// Generations from the latest visit.
    pub generation: u64,
    /// Year.
    pub year: Option<f64>,
    /// No copy is left in the population.
    pub lost: f64,
    /// Some copies are left beside others.
    pub still_there: f64,
    /// Every copy is of this allele.
    pub fixed: f64,
}
