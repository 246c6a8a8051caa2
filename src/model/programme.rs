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
    /// Length of the genetic map, in centimorgans.
    pub map_length_cm: Option<f64>,
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

impl PopulationSettings {
    /// Takes every value that `stronger` has.
    pub fn overrule(&mut self, stronger: &PopulationSettings) {
        fn take<T: Clone>(mine: &mut Option<T>, theirs: &Option<T>) {
            if theirs.is_some() {
                mine.clone_from(theirs);
            }
        }
        take(&mut self.baseline, &stronger.baseline);
        take(&mut self.generation_years, &stronger.generation_years);
        take(&mut self.census, &stronger.census);
        take(&mut self.plan, &stronger.plan);
        take(&mut self.chromosomes, &stronger.chromosomes);
        take(&mut self.map_length_cm, &stronger.map_length_cm);
        take(&mut self.life_history, &stronger.life_history);
        take(&mut self.breeders, &stronger.breeders);
        if !stronger.family_sizes.is_empty() {
            self.family_sizes.clone_from(&stronger.family_sizes);
        }
    }
}

impl Programme {
    /// Takes every value given as a flag: flags win over the common and over each population's.
    pub fn overrule(&mut self, flags: &PopulationSettings) {
        self.all.overrule(flags);
        for settings in self.by_population.values_mut() {
            settings.overrule(flags);
        }
    }

    /// All settings of a population: its own, and the common ones where it has none.
    pub fn settings(&self, population: &str) -> PopulationSettings {
        let mut settings = self.all.clone();
        if let Some(own) = self.by_population.get(population) {
            settings.overrule(own);
        }
        settings
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn flags_win_over_populations_and_populations_over_all() {
        let own = PopulationSettings {
            census: Some(40.0),
            ..Default::default()
        };
        let mut programme = Programme {
            all: PopulationSettings {
                census: Some(500.0),
                generation_years: Some(4.0),
                ..Default::default()
            },
            by_population: BTreeMap::from([("Alder".to_string(), own)]),
        };
        assert_eq!(programme.settings("Alder").census, Some(40.0));
        assert_eq!(programme.settings("Alder").generation_years, Some(4.0));
        assert_eq!(programme.settings("Birch").census, Some(500.0));
        let flags = PopulationSettings {
            census: Some(60.0),
            ..Default::default()
        };
        programme.overrule(&flags);
        assert_eq!(programme.get("Alder", |s| s.census), Some(60.0));
        assert_eq!(programme.get("Birch", |s| s.census), Some(60.0));
        assert_eq!(programme.get("Alder", |s| s.generation_years), Some(4.0));
    }
}
