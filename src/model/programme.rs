//! What a monitoring programme knows of its populations beside the genotypes.

use std::collections::BTreeMap;

/// How the individuals of a visit were taken (Nei & Tajima 1981; Waples 1989).
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum SamplingPlan {
    /// Plan I: sampled after they reproduced, or put back: the sample may be among the parents.
    One,
    /// Plan II: sampled before reproduction and removed, or offspring that never become parents.
    Two,
}

/// Life-history figures for the adjustment of linkage estimates under overlapping generations.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LifeHistory {
    /// Age at maturity, in years.
    pub maturity: f64,
    /// Adult life span (oldest breeding age - age at maturity + 1), in years.
    pub adult_life_span: f64,
    /// Coefficient of variation of fecundity with age, where known.
    pub fecundity_cv: Option<f64>,
}

/// Settings of one population; each absent value falls back to the programme's, then to the default.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct PopulationSettings {
    /// Baseline visit label or year as written; the earliest visit when absent.
    pub baseline: Option<String>,
    /// Generation length in years.
    pub generation_years: Option<f64>,
    /// Census size at the baseline (individuals).
    pub census: Option<f64>,
    /// Sampling plan.
    pub plan: Option<SamplingPlan>,
    /// Haploid number of chromosomes.
    pub chromosomes: Option<u32>,
    /// Life history.
    pub life_history: Option<LifeHistory>,
    /// Breeding males and females per generation, where counted.
    pub breeders: Option<(f64, f64)>,
    /// Offspring counted per parent (parents without offspring included), where known.
    pub family_sizes: Vec<u32>,
}

/// Settings for all populations and for each by name.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Programme {
    /// Settings that hold for every population unless its own say otherwise.
    pub all: PopulationSettings,
    /// Settings by population name.
    pub by_population: BTreeMap<String, PopulationSettings>,
}

impl Programme {
    /// The value for a population: its own, else the common one.
    pub fn get<T: Clone>(
        &self,
        population: &str,
        field: impl Fn(&PopulationSettings) -> Option<T>,
    ) -> Option<T> {
        self.by_population
            .get(population)
            .and_then(&field)
            .or_else(|| field(&self.all))
    }
}
