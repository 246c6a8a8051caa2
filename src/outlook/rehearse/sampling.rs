//! Who is sampled at each visit.

use super::dice::{Dice, Purpose};
use super::numbers::adults;
use super::population::{Generation, Origin, Parents, Sources};
use super::scenario::{Mating, Plan, Scenario, Visit};
use crate::model::Sex;

/// One population at one visit.
#[derive(Debug, Clone, PartialEq)]
pub struct SampledStratum {
    /// Index of the population in the scenario.
    pub population: usize,
    /// Index of the visit in the scenario.
    pub visit: usize,
    /// Its generation.
    pub generation: u32,
    /// Its year.
    pub year: f64,
    /// Its samples, replicates last.
    pub samples: std::ops::Range<usize>,
}

/// Where the genotypes of a sample come from: positions in [`super::History::generations`].
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Source {
    /// An adult.
    Adult {
        /// Position of its generation.
        generation: usize,
        /// Index among all adults of the generation.
        adult: usize,
    },
    /// A juvenile that never breeds.
    Juvenile {
        /// Position of its generation.
        generation: usize,
        /// Index among the sampled juveniles of the generation.
        juvenile: usize,
    },
}

/// One sample: a column of the calls and a row of the sheet.
#[derive(Debug, Clone, PartialEq)]
pub struct Sample {
    /// Its name.
    pub name: String,
    /// Index of its stratum.
    pub stratum: usize,
    /// Its sex; `None` for hermaphrodites.
    pub sex: Option<Sex>,
    /// Whose genotypes it has.
    pub source: Source,
    /// The sample that it repeats, for the sheet.
    pub replicate_of: Option<usize>,
    /// The sample of an earlier visit that is the same animal.
    pub recapture_of: Option<usize>,
    /// Number of its planted family of full siblings in its stratum.
    pub family: Option<u32>,
}

/// The strata of a scenario, by name of population, then generation, without samples so far.
pub fn strata(scenario: &Scenario) -> Vec<SampledStratum> {
    let mut populations: Vec<usize> = (0..scenario.population.len()).collect();
    populations.sort_by(|&a, &b| {
        scenario.population[a]
            .name
            .cmp(&scenario.population[b].name)
    });
    let mut visits: Vec<usize> = (0..scenario.visit.len()).collect();
    visits.sort_by_key(|&v| scenario.visit[v].generation);
    let mut strata = Vec::new();
    for population in populations {
        for &visit in &visits {
            let settings = &scenario.visit[visit];
            if visited(settings, scenario, population) {
                strata.push(SampledStratum {
                    population,
                    visit,
                    generation: settings.generation,
                    year: scenario.start_year
                        + f64::from(settings.generation) * scenario.generation_years,
                    samples: 0..0,
                });
            }
        }
    }
    strata
}

/// Whether a population is among those of a visit: named, or not excluded and there.
pub fn visited(visit: &Visit, scenario: &Scenario, population: usize) -> bool {
    let name = &scenario.population[population].name;
    let there = adults(scenario, population, visit.generation) > 0;
    there && (visit.populations.is_empty() || visit.populations.contains(name))
}

/// What a generation was born from: the parents each population offered, and the sources of the
/// adults of each.
pub type Birth<'a> = (&'a [Option<Parents>], &'a [Sources]);

/// Takes the samples of the newest generation, where it is visited. The founders of all have no
/// birth.
pub fn take(
    scenario: &Scenario,
    seed: u64,
    generations: &mut [Generation],
    birth: Option<Birth>,
    strata: &mut [SampledStratum],
    samples: &mut Vec<Sample>,
) {
    let index = generations.len() - 1;
    let Some(now) = index.checked_sub(scenario.settling_generations as usize) else {
        return;
    };
    let generation = &mut generations[index];
    for stratum in 0..strata.len() {
        if strata[stratum].generation as usize != now {
            continue;
        }
        let mut dice = Dice::new(seed, Purpose::Sampling, stratum as u64, now as u64);
        let visit = &scenario.visit[strata[stratum].visit];
        let mut taken = recaptures(visit, stratum, strata, samples, &mut dice);
        let wanted = visit.individuals.saturating_sub(taken.len() as u32);
        let place = Place {
            scenario,
            population: strata[stratum].population,
            stratum,
            index,
        };
        match visit.plan {
            Plan::I => place.adults(generation, wanted, &mut dice, &mut taken),
            Plan::II => place.juveniles(generation, visit, wanted, birth, &mut dice, &mut taken),
        }
        dice.shuffle(&mut taken);
        let start = samples.len();
        samples.append(&mut taken);
        for which in dice.choose((samples.len() - start) as u32, visit.replicates) {
            let original = start + which as usize;
            let copy = Sample {
                replicate_of: Some(original),
                recapture_of: None,
                ..samples[original].clone()
            };
            samples.push(copy);
        }
        strata[stratum].samples = start..samples.len();
    }
}

/// Individuals of the population's visit before that are seen again.
fn recaptures(
    visit: &Visit,
    stratum: usize,
    strata: &[SampledStratum],
    samples: &[Sample],
    dice: &mut Dice,
) -> Vec<Sample> {
    let Some(before) = stratum.checked_sub(1).map(|b| &strata[b]) else {
        return Vec::new();
    };
    if before.population != strata[stratum].population {
        return Vec::new();
    }
    let range = before.samples.clone();
    let known: Vec<usize> = range
        .filter(|&s| samples[s].replicate_of.is_none())
        .collect();
    let chosen = dice.choose(known.len() as u32, visit.recaptured.min(visit.individuals));
    let again = chosen.into_iter().map(|which| {
        let first = known[which as usize];
        Sample {
            stratum,
            recapture_of: Some(first),
            family: None,
            ..samples[first].clone()
        }
    });
    again.collect()
}

struct Place<'a> {
    scenario: &'a Scenario,
    population: usize,
    stratum: usize,
    index: usize,
}

impl Place<'_> {
    fn sample(&self, sex: Option<Sex>, source: Source, family: Option<u32>) -> Sample {
        Sample {
            name: String::new(),
            stratum: self.stratum,
            sex,
            source,
            replicate_of: None,
            recapture_of: None,
            family,
        }
    }

    fn adults(
        &self,
        generation: &Generation,
        wanted: u32,
        dice: &mut Dice,
        taken: &mut Vec<Sample>,
    ) {
        let range = generation.ranges[self.population].clone();
        for which in dice.choose(range.end - range.start, wanted) {
            let sex = (self.scenario.mating != Mating::Selfing).then(|| {
                if which < generation.females[self.population] {
                    Sex::Female
                } else {
                    Sex::Male
                }
            });
            let adult = (range.start + which) as usize;
            taken.push(self.sample(
                sex,
                Source::Adult {
                    generation: self.index,
                    adult,
                },
                None,
            ));
        }
    }

    fn juveniles(
        &self,
        generation: &mut Generation,
        visit: &Visit,
        wanted: u32,
        birth: Option<Birth>,
        dice: &mut Dice,
        taken: &mut Vec<Sample>,
    ) {
        let mut born = |origin: Origin, family: Option<u32>, dice: &mut Dice| {
            let sex = self.any_sex(dice);
            let juvenile = generation.juveniles.len();
            generation.juveniles.push(origin);
            let source = Source::Juvenile {
                generation: self.index,
                juvenile,
            };
            taken.push(self.sample(sex, source, family));
        };
        let mut left = wanted;
        for family in 0..visit.full_sib_families {
            let origin = self.origin(birth, dice);
            for _ in 0..visit.full_sib_family_size.min(left) {
                born(origin, Some(family), dice);
                left -= 1;
            }
        }
        for _ in 0..left {
            let origin = self.origin(birth, dice);
            born(origin, None, dice);
        }
    }

    /// Origin of one juvenile: from the sources of the adults it was born with, in proportion.
    fn origin(&self, birth: Option<Birth>, dice: &mut Dice) -> Origin {
        let Some((offered, sources)) = birth else {
            return Origin::Founder(self.population as u32);
        };
        let sources = &sources[self.population];
        let total = sources.local + sources.others.iter().map(|&(_, n)| n).sum::<u32>();
        let mut point = dice.below(total.max(1));
        let mut from = self.population;
        if point >= sources.local {
            point -= sources.local;
            for &(other, number) in &sources.others {
                from = other;
                if point < number {
                    break;
                }
                point -= number;
            }
        }
        match &offered[from] {
            Some(parents) => Origin::Child(parents.one(dice)),
            None => Origin::Founder(self.population as u32),
        }
    }

    fn any_sex(&self, dice: &mut Dice) -> Option<Sex> {
        let share = self.scenario.population[self.population].female_share;
        let female = dice.uniform() < share;
        (self.scenario.mating != Mating::Selfing).then_some(if female {
            Sex::Female
        } else {
            Sex::Male
        })
    }
}

/// Puts the samples into the order of the strata and names them.
pub fn finish(scenario: &Scenario, strata: &mut [SampledStratum], samples: &mut Vec<Sample>) {
    let mut order: Vec<usize> = (0..samples.len()).collect();
    order.sort_by_key(|&s| samples[s].stratum);
    let mut place = vec![0; samples.len()];
    for (new, &old) in order.iter().enumerate() {
        place[old] = new;
    }
    let mut sorted: Vec<Sample> = order.iter().map(|&old| samples[old].clone()).collect();
    for sample in &mut sorted {
        sample.replicate_of = sample.replicate_of.map(|s| place[s]);
        sample.recapture_of = sample.recapture_of.map(|s| place[s]);
    }
    let mut start = 0;
    for (index, stratum) in strata.iter_mut().enumerate() {
        let count = sorted.iter().filter(|s| s.stratum == index).count();
        stratum.samples = start..start + count;
        start += count;
        let stem = slug(&scenario.population[stratum.population].name);
        let width = count.to_string().len().max(2);
        for (number, s) in stratum.samples.clone().enumerate() {
            sorted[s].name = match sorted[s].replicate_of {
                Some(original) => format!("{}-again", sorted[original].name),
                None => format!("{stem}-{}-{:0width$}", stratum.year, number + 1),
            };
        }
    }
    *samples = sorted;
}

/// A population's name as it begins the names of its samples.
pub fn slug(name: &str) -> String {
    let keep = |c: char| c.is_ascii_alphanumeric();
    name.chars()
        .filter(|&c| keep(c))
        .collect::<String>()
        .to_lowercase()
}
