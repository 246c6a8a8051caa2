//! The scenario: what is simulated, in the words of its file. One doc comment a key.

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// Populations, their history, the visits and the genotyping, as written in a scenario file (TOML).
///
/// Generations are discrete and counted from 0, the generation of `start_year`. The adults of a
/// generation are born together from the adults of the one before, breed once, and are gone.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Scenario {
    /// One line that says what the scenario shows; repeated in the truth.
    #[serde(default)]
    pub title: String,
    /// Seed of all chance. The same scenario and seed give the same files, byte for byte.
    #[serde(default = "one_u64")]
    pub seed: u64,
    /// Calendar year of generation 0.
    #[serde(default = "year_2000")]
    pub start_year: f64,
    /// Length of a generation in years.
    #[serde(default = "one")]
    pub generation_years: f64,
    /// How parents meet: `random` (two sexes, every offspring of its own random mother and father),
    /// `pairs` (two sexes, one partner for life) or `selfing` (hermaphrodites, any two gametes, so
    /// that a share 1/N of the offspring is selfed).
    #[serde(default)]
    pub mating: Mating,
    /// Generations of random mating before generation 0, at the sizes of generation 0. They give
    /// the first adults parents, and their loci the disequilibrium that drift makes.
    #[serde(default = "one_u32")]
    pub settling_generations: u32,
    /// The chromosomes.
    pub chromosome: Vec<Chromosome>,
    /// Sets of loci that are scattered over the chromosomes.
    pub loci: Vec<LocusSet>,
    /// The populations.
    pub population: Vec<Population>,
    /// Regular movement between populations.
    #[serde(default)]
    pub migration: Vec<Migration>,
    /// Single releases, also those that found a population.
    #[serde(default)]
    pub release: Vec<Release>,
    /// When and how the populations are sampled.
    pub visit: Vec<Visit>,
    /// What the laboratory does to the genotypes.
    #[serde(default)]
    pub genotyping: Genotyping,
}

/// How parents meet.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "snake_case")]
pub enum Mating {
    /// Two sexes; mother and father of each offspring are drawn on their own.
    #[default]
    Random,
    /// Two sexes; as many pairs as the rarer sex allows, kept for life.
    Pairs,
    /// Hermaphrodites; both gametes are drawn from all adults, the same one included.
    Selfing,
}

/// One chromosome, or several alike.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Chromosome {
    /// Name of the contig in the calls.
    pub name: String,
    /// Length in base pairs, 1000 to 536870911 (as far as a `.tbi` index reaches).
    pub length_bp: u64,
    /// Length of the genetic map in centimorgans (Haldane's map: crossovers fall at random and
    /// without interference). Absent: 1 centimorgan a megabase.
    pub map_length_cm: Option<f64>,
    /// Every locus is inherited on its own, as if on its own chromosome.
    #[serde(default)]
    pub unlinked: bool,
    /// Makes this many chromosomes alike, named `name_1`, `name_2` and so on.
    #[serde(default = "one_u32")]
    pub copies: u32,
}

/// Loci of one kind, scattered over the chromosomes in proportion to their lengths.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct LocusSet {
    /// Number of loci.
    pub count: u32,
    /// Alleles of each locus, 2 to 64. Two are bases; more are repeats of different length.
    #[serde(default = "two")]
    pub alleles: u32,
    /// Allele frequencies before generation 0.
    #[serde(default)]
    pub frequencies: Frequencies,
    /// Names of the chromosomes that carry them. Absent: all.
    #[serde(default)]
    pub chromosomes: Vec<String>,
    /// `random` places or `even` distances.
    #[serde(default)]
    pub spacing: Spacing,
    /// Each locus is two copies of a duplicated stretch that the reads cannot tell apart: an
    /// individual shows two alleles where its four gene copies hold two.
    #[serde(default)]
    pub duplicated: bool,
}

/// Allele frequencies of a set of loci before generation 0.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "snake_case")]
pub enum Frequencies {
    /// Frequency of the second of two alleles from a beta distribution with these two shapes:
    /// `{ beta = [0.5, 0.5] }`.
    Beta([f64; 2]),
    /// Frequencies of any number of alleles from a symmetric Dirichlet distribution of this shape:
    /// `{ dirichlet = 1.0 }`.
    Dirichlet(f64),
    /// The same frequencies at every locus, one an allele, of sum 1: `{ list = [0.7, 0.2, 0.1] }`.
    List(Vec<f64>),
    /// Frequency of the rarer of two alleles evenly between these limits; either allele may be the
    /// rarer one: `{ minor = [0.05, 0.5] }`.
    Minor([f64; 2]),
}

impl Default for Frequencies {
    fn default() -> Self {
        Frequencies::Dirichlet(1.0)
    }
}

/// Places of the loci of a set.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "snake_case")]
pub enum Spacing {
    /// Anywhere, each locus on its own.
    #[default]
    Random,
    /// The same distance from one to the next.
    Even,
}

/// One population and its numbers.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Population {
    /// Name, as in the sample sheet.
    pub name: String,
    /// Breeding adults, in its first generation or always. Give this or `sizes`.
    pub size: Option<u32>,
    /// Breeding adults by generation, from its first; the last number goes on for ever.
    #[serde(default)]
    pub sizes: Vec<u32>,
    /// Share by which the number of adults grows each generation (-0.1: shrinks by a tenth).
    #[serde(default)]
    pub growth_rate: f64,
    /// Growth stops at this number of adults.
    pub largest_size: Option<u32>,
    /// Stretches of generations with another number of adults.
    #[serde(default)]
    pub bottleneck: Vec<Bottleneck>,
    /// Share of females among the adults; not used with `mating = "selfing"`.
    #[serde(default = "half")]
    pub female_share: f64,
    /// Variance of the number of breeding offspring a parent has, at two on average: 0 when all
    /// families are made equal, 2 by chance alone (the default), more when few parents do most.
    /// Juveniles of plan II come from families before they are made equal.
    pub family_variance: Option<f64>,
    /// The same for fathers, where it differs.
    pub male_family_variance: Option<f64>,
    /// First generation with adults; above 0, all adults of that generation come from releases.
    #[serde(default)]
    pub starts_at: u32,
    /// How far its allele frequencies have drifted from the common ones before generation 0, on
    /// the scale of FST (Balding & Nichols 1995).
    #[serde(default)]
    pub divergence: f64,
}

/// Generations with another number of adults.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Bottleneck {
    /// First generation.
    pub from: u32,
    /// Last generation.
    pub to: u32,
    /// Breeding adults in each of them.
    pub size: u32,
}

/// Movement from one population to another in every generation: some of the adults of `to` were
/// born in `from`.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Migration {
    /// Population of their birth.
    pub from: String,
    /// Population where they breed.
    pub to: String,
    /// Share of the adults of `to` that came, each by its own chance. Give this or `number`.
    pub rate: Option<f64>,
    /// Number of adults of `to` that came, the same in every generation.
    pub number: Option<u32>,
    /// First generation of migrant adults.
    #[serde(default)]
    pub first_generation: u32,
    /// Last generation of migrant adults. Absent: no end.
    pub last_generation: Option<u32>,
}

/// Individuals born in one population and released into another, where they breed.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Release {
    /// Population of their birth, which keeps its own number.
    pub from: String,
    /// Population of their release.
    pub to: String,
    /// Generation among whose adults they are, 1 or later.
    pub generation: u32,
    /// How many.
    pub number: u32,
}

/// One visit to one or more populations.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Visit {
    /// Generation that is sampled; its year is `start_year` + generation x `generation_years`.
    pub generation: u32,
    /// Label for the sheet's column `visit`. Absent: the year.
    pub label: Option<String>,
    /// Individuals sampled in each population, recaptured ones and siblings included.
    pub individuals: u32,
    /// Names of the populations. Absent: all that exist in that generation.
    #[serde(default)]
    pub populations: Vec<String>,
    /// `I`: adults of that generation, without loss to them; `II`: juveniles born together with
    /// these adults, that never breed.
    #[serde(default)]
    pub plan: Plan,
    /// Of the individuals, how many are animals of the population's visit before, under new names.
    #[serde(default)]
    pub recaptured: u32,
    /// Individuals genotyped a second time; the sheet names them in `replicate_of`.
    #[serde(default)]
    pub replicates: u32,
    /// Of the individuals, this many families of full siblings; plan II only.
    #[serde(default)]
    pub full_sib_families: u32,
    /// Siblings in each of these families.
    #[serde(default = "three")]
    pub full_sib_family_size: u32,
}

/// Sampling plan (Nei & Tajima 1981; Waples 1989).
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
pub enum Plan {
    /// Among the parents.
    I,
    /// Apart from the parents.
    #[default]
    II,
}

/// What the laboratory does to the genotypes.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields, default)]
pub struct Genotyping {
    /// Chance that a gene copy is taken for another allele of its locus.
    pub miscall_rate: f64,
    /// Chance for each gene copy of a heterozygote not to be copied, so that the other one is
    /// called twice.
    pub dropout_rate: f64,
    /// Mean share of missing genotypes.
    pub missing_rate: f64,
    /// How unevenly they fall on the loci: coefficient of variation of the rate.
    pub missing_spread_loci: f64,
    /// How unevenly they fall on the samples: coefficient of variation of the rate.
    pub missing_spread_samples: f64,
    /// Mean number of reads a genotype. With it, genotypes are called from reads: the likeliest
    /// one, missing without a read.
    pub depth: Option<f64>,
    /// Coefficient of variation of the depth among loci.
    pub depth_spread_loci: f64,
    /// Coefficient of variation of the depth among samples.
    pub depth_spread_samples: f64,
    /// Chance that a read shows another allele.
    pub read_error_rate: f64,
    /// FORMAT fields written beside GT, in this order; they need `depth`.
    pub fields: Vec<Field>,
}

impl Default for Genotyping {
    fn default() -> Self {
        Genotyping {
            miscall_rate: 0.0,
            dropout_rate: 0.0,
            missing_rate: 0.0,
            missing_spread_loci: 0.0,
            missing_spread_samples: 0.0,
            depth: None,
            depth_spread_loci: 0.0,
            depth_spread_samples: 0.0,
            read_error_rate: 0.005,
            fields: Vec::new(),
        }
    }
}

/// A FORMAT field of the calls.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
pub enum Field {
    /// Reads by allele.
    AD,
    /// Reads.
    DP,
    /// Genotype quality: distance of the second likeliest genotype, phred-scaled, at most 99.
    GQ,
    /// Likelihoods of all genotypes, phred-scaled, the likeliest 0.
    PL,
}

fn one() -> f64 {
    1.0
}
fn half() -> f64 {
    0.5
}
fn year_2000() -> f64 {
    2000.0
}
fn one_u64() -> u64 {
    1
}
fn one_u32() -> u32 {
    1
}
fn two() -> u32 {
    2
}
fn three() -> u32 {
    3
}
