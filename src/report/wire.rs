//! The report as it leaves the house: format `genewane-report`, version 1.
//!
//! Every doc comment here becomes the description of the field in the JSON Schema.

use std::collections::BTreeMap;

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// Name of the format.
pub const FORMAT: &str = "genewane-report";
/// Version of the format.
pub const FORMAT_VERSION: u32 = 1;

/// What a set of genotype calls says about the diversity of monitored populations.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Report {
    /// Always `genewane-report`.
    pub format: String,
    /// Version of this format.
    pub format_version: u32,
    /// What made this report, from what.
    pub provenance: Provenance,
    /// Which samples were used.
    pub samples: Samples,
    /// Which records were used.
    pub loci: Loci,
    /// Each population at each visit, by population, then year.
    pub strata: Vec<Stratum>,
    /// Pairs of strata: visits of one population, and populations of one visit.
    pub comparisons: Vec<Comparison>,
    /// Effective population size by every method that applies.
    pub effective_size: Vec<EffectiveSize>,
    /// Effective size of each population in one statement.
    pub effective_size_summary: Vec<EffectiveSizeSummary>,
    /// Baseline alleles not seen at the latest visit, the commonest at the baseline first.
    pub losses: Vec<Loss>,
    /// Alleles that the latest sample still holds in few copies, with their carriers.
    pub at_risk: Vec<AtRisk>,
    /// How many individuals each latest sample's scarce alleles hang on, the most first.
    pub carriers: Vec<Carrier>,
    /// Pairs of a female and a male of a latest sample that hold the most scarce alleles together, each of
    /// them some that the other lacks; empty where the sheet gives no sexes. They say nothing of kinship:
    /// hold them against the pedigree before pairing animals.
    pub carrier_pairs: Vec<CarrierPair>,
    /// Frequency spectrum of each latest sample: what a forecast starts from.
    pub allele_spectra: Vec<AlleleSpectrum>,
    /// What a reader should know before using a number.
    pub warnings: Vec<Warning>,
    /// What holds for every report.
    pub cautions: Vec<String>,
}

/// A number with its interval.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Estimate {
    /// The value; null when it could not be made (see `absent_because`).
    pub estimate: Option<f64>,
    /// Standard error on the scale of the value.
    pub standard_error: Option<f64>,
    /// Lower and upper limit.
    pub interval: Option<[f64; 2]>,
    /// Coverage that the interval aims at.
    pub level: f64,
    /// Loci in the estimate.
    pub loci: u64,
    /// Gene copies that samples are rarefied to, the same for all strata and loci (richness only).
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub gene_copies: Option<u32>,
    /// What the interval counts: `loci_and_individuals` is the full one; with `loci` or
    /// `individuals` alone it is too narrow.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub interval_counts: Option<IntervalCounts>,
    /// Why there is no value.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub absent_because: Option<String>,
}

/// Sources of uncertainty that an interval counts.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "snake_case")]
pub enum IntervalCounts {
    /// Block jackknife over the genome and delete-one over the sampled individuals.
    LociAndIndividuals,
    /// Block jackknife over the genome alone.
    Loci,
    /// Delete-one over the sampled individuals alone.
    Individuals,
}

/// What made the report.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Provenance {
    /// Program name.
    pub program: String,
    /// Program version.
    pub version: String,
    /// Command and options that shape the result; threads and output names do not.
    pub arguments: Vec<String>,
    /// Input files.
    pub inputs: Vec<InputFile>,
    /// Values in force for options that were not given as well as for those that were.
    pub settings: BTreeMap<String, String>,
    /// Unit and source of each kind of estimate.
    pub methods: BTreeMap<String, String>,
    /// Time of the run, only when asked for: reports of the same input are otherwise the same bytes.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub stamp: Option<String>,
}

/// One input file.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct InputFile {
    /// `calls`, `samples` or `programme`.
    pub role: String,
    /// Name as given; `-` is standard input.
    pub name: String,
    /// Format found by the first bytes.
    pub format: String,
    /// Size in bytes, as read.
    pub bytes: u64,
    /// SHA-256 of these bytes, in hexadecimal.
    pub sha256: String,
}

/// Which samples were used.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Samples {
    /// Samples in the calls.
    pub in_calls: u64,
    /// Rows of the sheet.
    pub in_sheet: u64,
    /// Individuals in use.
    pub used: u64,
    /// Samples in the calls that the sheet does not list.
    pub not_listed: Vec<String>,
    /// Samples of the sheet that are not in the calls (only with leave to be absent).
    pub absent: Vec<String>,
    /// Samples set aside as replicates of another.
    pub replicates: Vec<String>,
    /// Samples in use with no called genotype at any locus.
    pub without_calls: Vec<String>,
}

/// Which records and genotypes were used.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Loci {
    /// Records read.
    pub read: u64,
    /// Records with at least one diploid genotype among the individuals in use.
    pub kept: u64,
    /// Kept records that vary among the individuals in use: the set on which the headline values rest.
    pub polymorphic: u64,
    /// Records set aside, by reason.
    pub set_aside: BTreeMap<String, u64>,
    /// Genotypes of the individuals in use by what became of them.
    pub genotypes: BTreeMap<String, u64>,
    /// Loci whose genotypes were kept for methods that need individuals.
    pub panel: u64,
}

/// One population at one visit.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Stratum {
    /// `population@visit`.
    pub stratum: String,
    /// Population name.
    pub population: String,
    /// Visit label.
    pub visit: String,
    /// Mean year of sampling.
    pub year: f64,
    /// Individuals in use.
    pub individuals: u64,
    /// Loci that vary among all individuals in use and are typed here: the headline set.
    pub typed_loci: u64,
    /// Of these, loci that vary here.
    pub polymorphic_loci: u64,
    /// Share of these loci that vary here.
    pub polymorphic_share: Estimate,
    /// Share of genotypes of kept records that are diploid and complete.
    pub call_rate: f64,
    /// Mean share of heterozygous individuals over the headline set.
    pub observed_heterozygosity: Estimate,
    /// Mean unbiased gene diversity over the headline set.
    pub expected_heterozygosity: Estimate,
    /// FIS = 1 - sum of observed / sum of expected.
    pub inbreeding_coefficient: Estimate,
    /// Mean number of alleles expected in the fixed number of gene copies.
    pub allelic_richness: Estimate,
    /// The same for alleles that none of the other strata of this visit holds.
    pub private_allelic_richness: Estimate,
    /// The other strata of the visit, which private richness depends on.
    pub private_against: Vec<String>,
    /// 1 / (1 - mean expected heterozygosity).
    pub effective_alleles: Estimate,
    /// Values per record of the file, varying or not. A file of variable sites alone inflates these
    /// just as it does the headline values.
    pub per_site: PerSite,
    /// Exact tests of Hardy-Weinberg proportions.
    pub hardy_weinberg: HardyWeinberg,
}

/// Heterozygosity per record of the file.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct PerSite {
    /// Records typed in the stratum.
    pub sites: u64,
    /// Observed heterozygosity.
    pub observed_heterozygosity: Estimate,
    /// Unbiased expected heterozygosity.
    pub expected_heterozygosity: Estimate,
}

/// Exact tests of Hardy-Weinberg proportions (mid-p) with the false discovery rate controlled.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct HardyWeinberg {
    /// Loci tested: those that vary in the stratum.
    pub tested: u64,
    /// False discovery rate at which loci are rejected (Benjamini & Hochberg 1995).
    pub false_discovery_rate: f64,
    /// Loci rejected.
    pub rejected: u64,
    /// Of these, loci with too many heterozygotes.
    pub excess: u64,
    /// Of these, loci with too few heterozygotes.
    pub deficit: u64,
}

/// What a comparison is for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "snake_case")]
pub enum Kind {
    /// A visit against the baseline of its population.
    SinceBaseline,
    /// A visit against the one before.
    BetweenVisits,
    /// Two populations at one visit.
    BetweenPopulations,
}

/// A pair of strata.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Comparison {
    /// The first (earlier) stratum.
    pub from: String,
    /// The second (later) stratum.
    pub to: String,
    /// What it is for.
    pub kind: Kind,
    /// Generations between the visits; null where unknown or where both are at one visit.
    pub generations: Option<f64>,
    /// Theta of Weir & Cockerham (1984).
    pub fst_weir_cockerham: Estimate,
    /// FST of Hudson et al. (1992), ratio of sums (Bhatia et al. 2013).
    pub fst_hudson: Estimate,
    /// GST of Nei (1973) with the unbiased diversities of Nei & Chesser (1983).
    pub gst_nei: Estimate,
    /// Standardised GST of Hedrick (2005).
    pub gst_hedrick: Estimate,
    /// D of Jost (2008).
    pub jost_d: Estimate,
    /// Standardised change of allele frequency, Nei & Tajima (1981); null between populations.
    pub fc: Option<Estimate>,
    /// The same by Pollak (1983).
    pub fk: Option<Estimate>,
    /// The same by Jorde & Ryman (2007).
    pub fs: Option<Estimate>,
    /// Second minus first, over the loci typed in both.
    pub change: Change,
    /// Alleles of the first and what became of them; null between populations.
    pub alleles: Option<AlleleFates>,
    /// Loci that varied in the first and show one allele in the second; null between populations.
    pub loci_fixed_since: Option<u64>,
    /// Loci whose change is too large for drift at the estimated size; null where not tested.
    pub outlier_loci: Option<Outliers>,
}

/// Second minus first, paired over loci.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Change {
    /// Difference of observed heterozygosity.
    pub observed_heterozygosity: Estimate,
    /// Difference of expected heterozygosity.
    pub expected_heterozygosity: Estimate,
    /// Expected heterozygosity of the second as a share of that of the first.
    pub expected_heterozygosity_kept: Estimate,
    /// Difference of allelic richness.
    pub allelic_richness: Estimate,
}

/// What became of the alleles of the first stratum.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct AlleleFates {
    /// Alleles seen in the first, over loci typed in both.
    pub baseline: u64,
    /// Of these, alleles not seen in the second.
    pub not_seen_again: u64,
    /// How many would be missed or lost at the estimated effective size; null where that is unknown.
    pub expected_not_seen_again: Option<f64>,
    /// Interval of that number over drift, sampling and the uncertainty of the effective size.
    pub expected_interval: Option<[f64; 2]>,
    /// More alleles are missing than the estimated effective size explains.
    pub faster_than_explained: Option<bool>,
    /// Alleles not seen again that are called lost.
    pub probably_lost: Option<u64>,
    /// Expected share of these calls that are wrong.
    pub expected_share_wrong: Option<f64>,
    /// Why the later fields are null.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub absent_because: Option<String>,
}

/// Loci whose change drift does not explain.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Outliers {
    /// Loci tested.
    pub tested: u64,
    /// False discovery rate of the list.
    pub false_discovery_rate: f64,
    /// Loci beyond it.
    pub found: u64,
    /// The loci, the least likely first (at most 100).
    pub list: Vec<OutlierLocus>,
    /// What else than selection makes such loci, as far as this data set leaves it open; empty when none
    /// was found.
    pub other_causes: Vec<String>,
}

/// One locus that changed more than drift explains.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct OutlierLocus {
    /// Contig.
    pub contig: String,
    /// 1-based position.
    pub position: u64,
    /// Frequency of the first alternate allele in the first stratum.
    pub frequency_from: f64,
    /// The same in the second.
    pub frequency_to: f64,
    /// Two-sided chance of so large a change under drift and sampling.
    pub p: f64,
    /// The same after control of the false discovery rate.
    pub q: f64,
}

/// One estimate of effective population size.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct EffectiveSize {
    /// Population name.
    pub population: String,
    /// Method: `temporal_fs`, `temporal_fc`, `temporal_fk`, `temporal_likelihood`,
    /// `temporal_likelihood_by_interval`, `linkage`, `heterozygote_excess`, `demographic`.
    pub method: String,
    /// Variant of the method, in words; null where there is one only.
    pub variant: Option<String>,
    /// First stratum (temporal methods).
    pub from: Option<String>,
    /// Second stratum, or the one stratum.
    pub to: String,
    /// Which generations the size refers to.
    pub refers_to: String,
    /// Generations between the strata.
    pub generations: Option<f64>,
    /// Sampling plan assumed (temporal methods).
    pub plan: Option<Plan>,
    /// Effective size in diploid individuals; null when unbounded or absent.
    pub estimate: Option<f64>,
    /// The data show no more drift than sampling alone makes: the size cannot be bounded from above.
    pub unbounded: bool,
    /// Lower and upper limit; the upper is null when unbounded.
    pub interval: Option<(Option<f64>, Option<f64>)>,
    /// 1/(2Ne), the scale on which the interval is made: the share of heterozygosity lost per generation.
    pub drift_rate: Estimate,
    /// Coverage that the interval aims at.
    pub level: f64,
    /// Loci in the estimate.
    pub loci: u64,
    /// Individuals: harmonic mean over loci and strata.
    pub individuals: Option<f64>,
    /// Effective size over census size, where the census is known.
    pub share_of_census: Option<f64>,
    /// Whether this is the value to quote for its method and interval.
    pub headline: bool,
    /// What a reader should know of this estimate.
    pub notes: Vec<String>,
    /// Why there is no estimate.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub absent_because: Option<String>,
}

/// How the sample was taken (Nei & Tajima 1981; Waples 1989).
#[derive(
    Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize, JsonSchema,
)]
pub enum Plan {
    /// After reproduction or with replacement.
    I,
    /// Before reproduction and without replacement, or offspring that never breed.
    II,
}

/// The estimates of one population side by side.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct EffectiveSizeSummary {
    /// Population name.
    pub population: String,
    /// The statement.
    pub text: String,
    /// Whether the intervals of the methods overlap; null with fewer than two.
    pub agree: Option<bool>,
    /// Likelihood-ratio test of one size for all intervals between visits.
    pub has_changed: Option<ChangeTest>,
}

/// Test of a constant effective size.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct ChangeTest {
    /// Twice the gain in log-likelihood, over its inflation by linked loci and shared individuals.
    pub statistic: f64,
    /// Degrees of freedom: intervals less one.
    pub degrees: u32,
    /// Chance of so large a gain if the size never changed.
    pub p: f64,
}

/// An allele of the baseline that the latest sample does not show.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Loss {
    /// Identifier as written, or contig:position.
    pub locus: String,
    /// Contig.
    pub contig: String,
    /// 1-based position.
    pub position: u64,
    /// The allele as written.
    pub allele: String,
    /// Population name.
    pub population: String,
    /// Copies at the baseline.
    pub baseline_count: u64,
    /// Gene copies typed at the baseline.
    pub baseline_copies: u64,
    /// Copies at the latest visit: 0.
    pub latest_count: u64,
    /// Gene copies typed at the latest visit.
    pub latest_copies: u64,
    /// Chance that the whole population has lost it; null where the effective size is unknown.
    pub probability_lost: Option<f64>,
    /// The call.
    pub call: Option<LossCall>,
}

/// What to make of an allele not seen again.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "snake_case")]
pub enum LossCall {
    /// Gone from the population.
    Lost,
    /// Still there, not in the sample.
    Missed,
    /// Neither is likely enough.
    Uncertain,
}

/// An allele held in few copies and who carries it.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct AtRisk {
    /// Population name.
    pub population: String,
    /// Latest stratum.
    pub stratum: String,
    /// Contig.
    pub contig: String,
    /// 1-based position.
    pub position: u64,
    /// The allele as written.
    pub allele: String,
    /// Copies in the latest sample.
    pub copies: u64,
    /// Gene copies typed.
    pub gene_copies: u64,
    /// Carriers by sample name.
    pub carriers: Vec<String>,
}

/// What one individual of a latest sample stands for.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Carrier {
    /// Population name.
    pub population: String,
    /// Latest stratum.
    pub stratum: String,
    /// Sample name.
    pub sample: String,
    /// Alleles that it alone carries among the sampled animals.
    pub only_carrier: u64,
    /// Alleles expected to vanish from the sampled animals if it does not breed and every other has
    /// two offspring.
    pub would_vanish: f64,
}

/// A female and a male of a latest sample and the scarce alleles that they would bring together.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct CarrierPair {
    /// Population name.
    pub population: String,
    /// Latest stratum.
    pub stratum: String,
    /// Sample name of the female.
    pub female: String,
    /// Sample name of the male.
    pub male: String,
    /// Scarce alleles (at most four carriers in the sample) that she carries and he does not.
    pub only_female: u64,
    /// Scarce alleles that he carries and she does not.
    pub only_male: u64,
    /// Scarce alleles that both carry.
    pub both: u64,
    /// Scarce alleles that the two hold together: the sum of the three.
    pub together: u64,
}

/// Alleles of a latest sample by the copies in which they are held.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct AlleleSpectrum {
    /// Population name.
    pub population: String,
    /// Latest stratum.
    pub stratum: String,
    /// Loci, those that vary among all individuals in use and are typed here.
    pub loci: u64,
    /// `[copies, gene copies typed, alleles]`, in order; numbers above 64 are rounded by at most 3 %.
    pub classes: Vec<[u64; 3]>,
}

/// Something a reader should know.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Warning {
    /// Stable name.
    pub code: String,
    /// Stratum, population or file.
    #[serde(rename = "where")]
    pub place: String,
    /// What, and what to do.
    pub text: String,
}
