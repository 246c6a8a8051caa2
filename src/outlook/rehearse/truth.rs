//! What really happened: the document `truth.json`.

use schemars::JsonSchema;
use serde::Serialize;

use super::population::{History, SameParent};
use super::scenario::{Plan, Scenario};

/// Name of the format in the document.
pub const TRUTH_FORMAT: &str = "genewane-truth";
/// Version of the format.
pub const TRUTH_VERSION: u32 = 1;

/// Everything about a simulated population that a survey of it can only estimate.
#[derive(Debug, Clone, PartialEq, Serialize, JsonSchema)]
pub struct Truth {
    /// Always `genewane-truth`.
    pub format: String,
    /// Version of this format.
    pub format_version: u32,
    /// Title of the scenario.
    pub title: String,
    /// Seed that was used.
    pub seed: u64,
    /// The scenario with all defaults written out.
    pub scenario: Scenario,
    /// Populations at visits, by population and generation.
    pub strata: Vec<StratumTruth>,
    /// Drift between visits: each visit and the next, then the first and the last where there are
    /// more than two.
    pub intervals: Vec<IntervalTruth>,
    /// Adults of each population in each generation.
    pub generations: Vec<GenerationTruth>,
    /// Pairs of samples of one animal at different visits: the earlier, the later.
    pub recaptures: Vec<[String; 2]>,
    /// Pairs of samples of one animal at one visit: the first, the second.
    pub replicates: Vec<[String; 2]>,
    /// Planted families of full siblings.
    pub full_siblings: Vec<Vec<String>>,
    /// Loci in the order of the calls.
    pub loci: Vec<LocusTruth>,
    /// Alleles some adult had at the population's first visit and none has at its last.
    pub gone: Vec<GoneTruth>,
}

/// One population at one visit.
#[derive(Debug, Clone, PartialEq, Serialize, JsonSchema)]
pub struct StratumTruth {
    /// `population@visit`.
    pub stratum: String,
    /// Population.
    pub population: String,
    /// Visit label, or the year.
    pub visit: String,
    /// Year.
    pub year: f64,
    /// Generation.
    pub generation: u32,
    /// Sampling plan.
    pub plan: Plan,
    /// Breeding adults of that generation.
    pub adults: u32,
    /// Samples taken, replicates included.
    pub samples: u32,
    /// Chance that two gene copies of the adults differ, mean over loci (Nei 1978 for all 2N
    /// copies); `null` without loci.
    pub expected_heterozygosity: Option<f64>,
}

/// Drift of one population from one visit to another.
#[derive(Debug, Clone, PartialEq, Serialize, JsonSchema)]
pub struct IntervalTruth {
    /// Population.
    pub population: String,
    /// Stratum of the earlier visit.
    pub from: String,
    /// Stratum of the later visit.
    pub to: String,
    /// Generations between them.
    pub generations: u32,
    /// From the family sizes that came about; migrants are not counted.
    pub realised: Drift,
    /// From the numbers of the scenario.
    pub expected: Drift,
}

/// Drift over a number of generations.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, JsonSchema)]
pub struct Drift {
    /// Harmonic mean of the effective sizes of the generations from the earlier visit to the one
    /// before the later; `null` when no two gametes had a parent in common, or none was seen.
    pub effective_size: Option<f64>,
    /// Share of expected heterozygosity kept: product of 1 - 1/(2Ne).
    pub heterozygosity_kept: Option<f64>,
}

/// Adults of one population in one generation.
#[derive(Debug, Clone, PartialEq, Serialize, JsonSchema)]
pub struct GenerationTruth {
    /// Population.
    pub population: String,
    /// Generation.
    pub generation: u32,
    /// Breeding adults.
    pub adults: u32,
    /// Females among them (0 for hermaphrodites).
    pub females: u32,
    /// Inverse of the chance that two gametes of the next adults come from the same parent, from
    /// the family sizes that came about (Crow & Denniston 1988); `null` in the last generation and
    /// where no two had a parent in common.
    pub effective_size: Option<f64>,
    /// The same from the numbers of the scenario.
    pub expected_effective_size: Option<f64>,
}

/// One locus.
#[derive(Debug, Clone, PartialEq, Serialize, JsonSchema)]
pub struct LocusTruth {
    /// Contig.
    pub contig: String,
    /// 1-based position.
    pub position: u64,
    /// Alleles as written, the reference first.
    pub alleles: Vec<String>,
    /// Two copies of a duplicated stretch; `copies` are those of the first.
    #[serde(skip_serializing_if = "std::ops::Not::not")]
    pub duplicated: bool,
    /// Gene copies of each allele among all adults, by stratum.
    pub copies: Vec<Vec<u32>>,
}

/// An allele that a population lost.
#[derive(Debug, Clone, PartialEq, Serialize, JsonSchema)]
pub struct GoneTruth {
    /// Population.
    pub population: String,
    /// Contig.
    pub contig: String,
    /// 1-based position.
    pub position: u64,
    /// Allele code: 0 is the reference.
    pub allele: u16,
    /// First generation without it.
    pub generation: u32,
    /// Gene copies among the adults of the first visit.
    pub baseline_copies: u32,
    /// Gene copies of all alleles there.
    pub baseline_total: u32,
}

impl Truth {
    /// The truth of a history, loci still to be added.
    pub fn new(scenario: &Scenario, seed: u64, history: &History) -> Self {
        let names = |pair: (usize, usize)| {
            [
                history.samples[pair.0].name.clone(),
                history.samples[pair.1].name.clone(),
            ]
        };
        let all = || history.samples.iter().enumerate();
        Truth {
            format: TRUTH_FORMAT.into(),
            format_version: TRUTH_VERSION,
            title: scenario.title.clone(),
            seed,
            scenario: Scenario {
                seed,
                ..scenario.clone()
            },
            strata: (0..history.strata.len())
                .map(|s| stratum(scenario, history, s))
                .collect(),
            intervals: intervals(scenario, history),
            generations: generations(scenario, history),
            recaptures: all()
                .filter_map(|(i, s)| Some(names((s.recapture_of?, i))))
                .collect(),
            replicates: all()
                .filter_map(|(i, s)| Some(names((s.replicate_of?, i))))
                .collect(),
            full_siblings: full_siblings(history),
            loci: Vec::new(),
            gone: Vec::new(),
        }
    }

    /// Fills in what follows from all loci.
    pub fn finish(&mut self) {
        for (s, stratum) in self.strata.iter_mut().enumerate() {
            let values = self
                .loci
                .iter()
                .filter_map(|l| heterozygosity(&l.copies[s]));
            let (sum, count) = values.fold((0.0, 0u32), |(sum, n), h| (sum + h, n + 1));
            stratum.expected_heterozygosity = (count > 0).then(|| sum / f64::from(count));
        }
    }
}

/// Chance that two different gene copies differ; `None` with fewer than two.
fn heterozygosity(copies: &[u32]) -> Option<f64> {
    let n: f64 = copies.iter().map(|&c| f64::from(c)).sum();
    let same: f64 = copies
        .iter()
        .map(|&c| f64::from(c) * (f64::from(c) - 1.0))
        .sum();
    (n > 1.0).then(|| 1.0 - same / (n * (n - 1.0)))
}

/// Label of a visit: its own, or the year.
pub fn visit_label(scenario: &Scenario, visit: usize) -> String {
    let settings = &scenario.visit[visit];
    let year = scenario.start_year + f64::from(settings.generation) * scenario.generation_years;
    settings.label.clone().unwrap_or_else(|| year.to_string())
}

/// Name of a stratum: `population@visit`.
pub fn stratum_name(scenario: &Scenario, history: &History, stratum: usize) -> String {
    let s = &history.strata[stratum];
    format!(
        "{}@{}",
        scenario.population[s.population].name,
        visit_label(scenario, s.visit)
    )
}

fn stratum(scenario: &Scenario, history: &History, index: usize) -> StratumTruth {
    let s = &history.strata[index];
    let adults = &history.generations[history.index(s.generation)].ranges[s.population];
    StratumTruth {
        stratum: stratum_name(scenario, history, index),
        population: scenario.population[s.population].name.clone(),
        visit: visit_label(scenario, s.visit),
        year: s.year,
        generation: s.generation,
        plan: scenario.visit[s.visit].plan,
        adults: adults.end - adults.start,
        samples: s.samples.len() as u32,
        expected_heterozygosity: None,
    }
}

fn intervals(scenario: &Scenario, history: &History) -> Vec<IntervalTruth> {
    let mut intervals = Vec::new();
    let strata = &history.strata;
    let mut start = 0;
    while start < strata.len() {
        let population = strata[start].population;
        let count = strata[start..]
            .iter()
            .take_while(|s| s.population == population)
            .count();
        let mut pairs: Vec<(usize, usize)> = (start + 1..start + count)
            .map(|later| (later - 1, later))
            .collect();
        if count > 2 {
            pairs.push((start, start + count - 1));
        }
        intervals.extend(
            pairs
                .into_iter()
                .map(|pair| interval(scenario, history, pair)),
        );
        start += count;
    }
    intervals
}

fn interval(scenario: &Scenario, history: &History, (from, to): (usize, usize)) -> IntervalTruth {
    let population = history.strata[from].population;
    let (first, last) = (
        history.strata[from].generation,
        history.strata[to].generation,
    );
    let steps: Vec<Option<SameParent>> = (first..last)
        .map(|g| history.generations[history.index(g)].same_parent[population])
        .collect();
    IntervalTruth {
        population: scenario.population[population].name.clone(),
        from: stratum_name(scenario, history, from),
        to: stratum_name(scenario, history, to),
        generations: last - first,
        realised: drift(steps.iter().map(|s| s.and_then(|s| s.realised)).collect()),
        expected: drift(steps.iter().map(|s| s.map(|s| s.expected)).collect()),
    }
}

fn drift(chances: Option<Vec<f64>>) -> Drift {
    let Some(chances) = chances.filter(|c| !c.is_empty()) else {
        return Drift {
            effective_size: None,
            heterozygosity_kept: None,
        };
    };
    let sum: f64 = chances.iter().sum();
    Drift {
        effective_size: (sum > 0.0).then(|| chances.len() as f64 / sum),
        heterozygosity_kept: Some(chances.iter().map(|p| 1.0 - p / 2.0).product()),
    }
}

fn generations(scenario: &Scenario, history: &History) -> Vec<GenerationTruth> {
    let size = |p: f64| (p > 0.0).then(|| 1.0 / p);
    let mut list = Vec::new();
    for (index, population) in scenario.population.iter().enumerate() {
        for (number, generation) in history.generations[history.settling..].iter().enumerate() {
            let adults = &generation.ranges[index];
            let same_parent = generation.same_parent[index];
            list.push(GenerationTruth {
                population: population.name.clone(),
                generation: number as u32,
                adults: adults.end - adults.start,
                females: generation.females[index],
                effective_size: same_parent.and_then(|s| s.realised).and_then(size),
                expected_effective_size: same_parent.map(|s| s.expected).and_then(size),
            });
        }
    }
    list
}

fn full_siblings(history: &History) -> Vec<Vec<String>> {
    let mut families: std::collections::BTreeMap<(usize, u32), Vec<String>> = Default::default();
    for sample in history.samples.iter().filter(|s| s.replicate_of.is_none()) {
        if let Some(family) = sample.family {
            families
                .entry((sample.stratum, family))
                .or_default()
                .push(sample.name.clone());
        }
    }
    families.into_values().filter(|f| f.len() > 1).collect()
}
