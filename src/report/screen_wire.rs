//! The screening report as it leaves the house: format `genewane-screen`, version 1.
//!
//! Every doc comment here becomes the description of the field in the JSON Schema.

use std::collections::BTreeMap;

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

use super::wire::{Provenance, Warning};

/// Name of the format.
pub const SCREEN_FORMAT: &str = "genewane-screen";
/// Version of the format.
pub const SCREEN_FORMAT_VERSION: u32 = 1;

/// What genotype calls say about the samples and loci themselves.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct ScreenReport {
    /// Always `genewane-screen`.
    pub format: String,
    /// Version of this format.
    pub format_version: u32,
    /// What made this report, from what.
    pub provenance: Provenance,
    /// Records and loci.
    pub loci: ScreenedLoci,
    /// Each population at each visit: whether the panel can tell individuals there.
    pub strata: Vec<ScreenedStratum>,
    /// Every sample of the sheet that has calls, replicates included, by population and visit.
    pub samples: Vec<ScreenedSample>,
    /// Samples of the sheet that have no calls.
    pub absent: Vec<String>,
    /// Samples of the calls that the sheet does not list.
    pub not_listed: Vec<String>,
    /// Samples that are one individual.
    pub same_individual: Vec<SameIndividual>,
    /// Matching pairs that do not fit into a group of which every pair matches: look at them.
    pub chains: Vec<MatchingPair>,
    /// Each declared replicate against the sample it repeats.
    pub replicates: Vec<ReplicateCheck>,
    /// Error and dropout from declared replicates that match, and from undeclared ones found.
    pub genotyping: Vec<GenotypingQuality>,
    /// Related pairs.
    pub relatives: Relatives,
    /// Families of full sibs within strata, and what they do to effective size.
    pub families: Families,
    /// Loci with too many or too few heterozygotes.
    pub odd_heterozygotes: OddLoci<OddHeterozygoteLocus>,
    /// Loci whose missing genotypes gather in one visit or batch, by grouping.
    pub missing_together: BTreeMap<String, OddLoci<MissingTogetherLocus>>,
    /// What a reader should know before using a number.
    pub warnings: Vec<Warning>,
    /// What holds for every report.
    pub cautions: Vec<String>,
}

/// Records and loci.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct ScreenedLoci {
    /// Records read.
    pub read: u64,
    /// Records with at least one diploid genotype.
    pub kept: u64,
    /// Kept records that vary among the samples.
    pub varying: u64,
    /// Records set aside, by reason.
    pub set_aside: BTreeMap<String, u64>,
    /// Genotypes taken as missing by masks, by reason.
    pub masked_genotypes: BTreeMap<String, u64>,
    /// Loci of two alleles on which pairs are compared.
    pub compared_biallelic: u64,
    /// Loci of more alleles on which pairs are compared.
    pub compared_multiallelic: u64,
    /// Base pairs covered by compared loci without a gap wider than allowed: what `f_roh` refers to.
    pub covered_bp: u64,
    /// Why there are no runs of homozygosity.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub runs_absent_because: Option<String>,
}

/// One population at one visit.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct ScreenedStratum {
    /// `population@visit`.
    pub stratum: String,
    /// Samples with calls, replicates included.
    pub samples: u64,
    /// Distinct individuals among them, as far as can be told.
    pub individuals: u64,
    /// Loci behind the chances.
    pub loci: u64,
    /// log10 of the chance that two unrelated individuals have the same genotypes at all loci, loci
    /// taken as independent (Paetkau et al. 1998).
    pub log10_probability_of_identity: Option<f64>,
    /// log10 of the same chance for full sibs (Evett & Weir 1998).
    pub log10_probability_of_identity_sibs: Option<f64>,
    /// Pairs of unrelated individuals expected to match by chance.
    pub expected_chance_matches: Option<f64>,
    /// What the panel can tell apart by the guideline of Waits et al. (2001): `full_sibs` (chance at
    /// most 0.0001), `most_full_sibs` (0.01), `unrelated_only`, `nobody`.
    pub tells: Option<String>,
    /// Expected share of loci at which full sibs differ.
    pub full_sibs_differ: f64,
    /// Fewest shared loci at which a match tells anything; null when the whole panel does not.
    pub fewest_telling_loci: Option<u32>,
    /// Mismatches allowed between samples typed at every compared locus.
    pub most_mismatches: Option<u32>,
}

/// One sample.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct ScreenedSample {
    /// Sample name.
    pub sample: String,
    /// `population@visit`.
    pub stratum: String,
    /// Whether the cleaned sheet says yes.
    #[serde(rename = "use")]
    pub used: bool,
    /// Why not, or what to know.
    pub why: Vec<String>,
    /// Typed records.
    pub typed: u64,
    /// Share of kept records that are typed.
    pub call_rate: f64,
    /// Typed loci that vary among all samples.
    pub typed_varying: u64,
    /// Of these, heterozygous ones.
    pub heterozygous: u64,
    /// Heterozygous over typed loci.
    pub heterozygosity: Option<f64>,
    /// Inbreeding by the method of moments, against the frequencies of its stratum.
    pub inbreeding_moments: Option<f64>,
    /// Loci behind it.
    pub inbreeding_moments_loci: u64,
    /// Inbreeding as the correlation of uniting gametes, ratio of sums (Yang et al. 2011).
    pub inbreeding_uniting: Option<f64>,
    /// Loci behind it.
    pub inbreeding_uniting_loci: u64,
    /// Runs of homozygosity.
    pub runs: Option<u64>,
    /// Their total length in base pairs.
    pub runs_bp: Option<u64>,
    /// Their share of the covered genome (McQuillan et al. 2008).
    pub f_roh: Option<f64>,
}

/// Samples that are one individual.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct SameIndividual {
    /// Sample names.
    pub samples: Vec<String>,
    /// Their strata, in the same order.
    pub strata: Vec<String>,
    /// `declared_replicates`, `within_visit`, `between_visits` (recaptures) or `between_populations`:
    /// the last of these that holds for a pair of the group.
    pub kind: String,
    /// Every pair of the group.
    pub pairs: Vec<MatchingPair>,
}

/// Two samples over their shared loci.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct MatchingPair {
    /// Both names.
    pub samples: [String; 2],
    /// Loci typed in both.
    pub shared_loci: u64,
    /// Of these, with different genotypes.
    pub mismatches: u64,
    /// Mismatches with an allele in common: the loss of one allele would explain them.
    pub dropout_like: u64,
    /// Mismatches without one (opposite homozygotes): the loss of one allele would not.
    pub nothing_in_common: u64,
    /// Mismatches allowed at so many shared loci.
    pub most_mismatches: Option<u32>,
}

/// A declared replicate.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct ReplicateCheck {
    /// The pair: replicate, then the sample it repeats.
    pub pair: MatchingPair,
    /// Whether it matches; null when too few loci are shared to tell.
    pub matches: Option<bool>,
}

/// A share with its exact binomial interval (Clopper & Pearson 1934).
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Share {
    /// Cases.
    pub cases: u64,
    /// Of so many.
    pub of: u64,
    /// Cases over all.
    pub share: Option<f64>,
    /// 95 % interval, each locus of each pair taken as independent.
    pub interval: Option<[f64; 2]>,
}

/// A rate with its likelihood interval.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Rate {
    /// The likeliest value.
    pub estimate: f64,
    /// 95 % interval from the profile likelihood.
    pub interval: [f64; 2],
}

/// Error and dropout from individuals genotyped twice.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct GenotypingQuality {
    /// `declared_replicates` or `found_within_visits`.
    pub from: String,
    /// Pairs of samples.
    pub pairs: u64,
    /// Genotype pairs that differ, over all compared loci.
    pub mismatches: Share,
    /// Chance for one genotyping of a heterozygote to show one allele: pairs of a heterozygote and a
    /// homozygote over these and twice those both heterozygous; loci of two alleles. Errors of other
    /// kinds count too.
    pub heterozygote_lost: Share,
    /// Chance that a gene copy is called as the other allele, by maximum likelihood together with
    /// `dropout_rate`; loci of two alleles in Hardy-Weinberg proportions.
    pub error_rate: Option<Rate>,
    /// Chance that a gene copy of a heterozygote is lost.
    pub dropout_rate: Option<Rate>,
}

/// Related pairs by robust kinship (Manichaikul et al. 2010).
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Relatives {
    /// Why there is none.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub absent_because: Option<String>,
    /// Pairs that are one individual by matching.
    pub matching: u64,
    /// Pairs that share too few loci for a match to tell.
    pub untold: u64,
    /// Other pairs by class of kinship: `same` (above 2^-1.5), `first` (2^-2.5), `second` (2^-3.5),
    /// `third` (2^-4.5), `unrelated`, `unknown`.
    pub by_class: BTreeMap<String, u64>,
    /// Pairs of the first and second degree, the closest first.
    pub pairs: Vec<RelatedPair>,
    /// Such pairs that are not listed.
    pub not_listed: u64,
}

/// One related pair.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct RelatedPair {
    /// Both names.
    pub samples: [String; 2],
    /// Kinship, between-family form.
    pub kinship: f64,
    /// Standard error by leaving out blocks of neighbouring loci.
    pub standard_error: Option<f64>,
    /// 95 % interval from it.
    pub interval: Option<[f64; 2]>,
    /// Class of the kinship.
    pub class: String,
    /// Shared loci of two alleles.
    pub shared_loci: u64,
    /// Opposite homozygotes.
    pub opposite_homozygotes: u64,
    /// For the first degree within a stratum: `full_sibs` or `parent_offspring`, by the share of
    /// opposite homozygotes; null when too few are expected to tell.
    pub likely: Option<String>,
}

/// Families of full sibs.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Families {
    /// Why there are none.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub absent_because: Option<String>,
    /// The families.
    pub families: Vec<Family>,
    /// Effective size with and without them, by stratum that has any. Nothing was left out: siblings
    /// belong to a random sample, and leaving them out biases effective size upward where the sample
    /// was random (Waples & Anderson 2017).
    pub effect: Vec<FamilySizes>,
}

/// One family.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Family {
    /// `population@visit`.
    pub stratum: String,
    /// Sample names.
    pub samples: Vec<String>,
}

/// Effective size by linkage with families whole and thinned.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct FamilySizes {
    /// `population@visit`.
    pub stratum: String,
    /// From all distinct individuals.
    pub whole: FamilySize,
    /// From one individual of each family and all others.
    pub one_each: FamilySize,
}

/// One effective size.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct FamilySize {
    /// Individuals.
    pub individuals: u64,
    /// Loci at frequency 0.05 or more.
    pub loci: u64,
    /// Effective size by linkage, random mating; null when unbounded or absent.
    pub estimate: Option<f64>,
    /// Whether it has no upper bound.
    pub unbounded: bool,
    /// 95 % interval that counts individuals; null for an unbounded end.
    pub interval: Option<[Option<f64>; 2]>,
    /// Why there is no value.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub absent_because: Option<String>,
}

/// Loci found odd.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct OddLoci<T> {
    /// Loci tested.
    pub tested: u64,
    /// Loci rejected at the false discovery rate (Benjamini & Hochberg 1995), by direction.
    pub rejected: BTreeMap<String, u64>,
    /// False discovery rate.
    pub false_discovery_rate: f64,
    /// Rejected loci, lowest p first.
    pub loci: Vec<T>,
}

/// A locus with too many or too few heterozygotes.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct OddHeterozygoteLocus {
    /// Contig.
    pub contig: String,
    /// Position.
    pub position: u64,
    /// Identifier, empty when absent.
    pub id: String,
    /// p over all strata where it varies: one-sided mid-p scores, weighted by the root of sample size
    /// (Stouffer et al. 1949), two-sided.
    pub p: f64,
    /// `excess` or `deficit`.
    pub direction: String,
    /// Typed individuals in these strata.
    pub individuals: u64,
    /// Heterozygous ones.
    pub heterozygotes: u64,
    /// Expected ones.
    pub expected: f64,
    /// Frequency of an allele never seen that would explain a deficit (Brookfield 1996).
    pub unseen_allele_frequency: Option<f64>,
    /// Whether it looks like two loci read as one: an excess, and more than half heterozygous, which
    /// one locus of two alleles has not under random mating.
    pub duplicated_like: bool,
}

/// A locus whose missing genotypes gather in one group.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct MissingTogetherLocus {
    /// Contig.
    pub contig: String,
    /// Position.
    pub position: u64,
    /// Identifier, empty when absent.
    pub id: String,
    /// Exact one-sided p of the worst group (Fisher 1935), times the number of groups.
    pub p: f64,
    /// The group.
    pub group: String,
    /// Missing genotypes there.
    pub missing: u64,
    /// Samples there.
    pub samples: u64,
    /// Missing genotypes elsewhere.
    pub missing_elsewhere: u64,
    /// Samples elsewhere.
    pub samples_elsewhere: u64,
}
