//! The pedigree: sizes, parents and movement of every generation, drawn once for all loci.

use std::ops::Range;

use super::dice::{Dice, Purpose};
use super::families::{Brood, Scheme, realised_same_parent};
use super::numbers::{adults, expected_same_parent, father_variance, females, migrants, released};
use super::sampling::{self, Sample, SampledStratum};
use super::scenario::{Mating, Scenario};

/// Where an individual comes from.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Origin {
    /// Drawn from the first frequencies of the population with this index.
    Founder(u32),
    /// Mother and father, as indices among all adults of the generation before.
    Child([u32; 2]),
}

/// Chance that two gametes of the next generation of a population come from the same parent here.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SameParent {
    /// From the family sizes that came about.
    pub realised: Option<f64>,
    /// From the scenario's numbers.
    pub expected: f64,
}

/// The adults of one generation, population by population, and the juveniles sampled with them.
#[derive(Debug, Clone, PartialEq)]
pub struct Generation {
    /// The adults of each population, as indices among all adults; females come first.
    pub ranges: Vec<Range<u32>>,
    /// Females among them.
    pub females: Vec<u32>,
    /// Origin of every adult.
    pub origins: Vec<Origin>,
    /// Origin of every juvenile that is sampled and never breeds.
    pub juveniles: Vec<Origin>,
    /// By population: drift on the way to the next generation; `None` without offspring there.
    pub same_parent: Vec<Option<SameParent>>,
}

/// All generations, settling ones first, and who is sampled.
#[derive(Debug, Clone, PartialEq)]
pub struct History {
    /// Settling generations before generation 0.
    pub settling: usize,
    /// Generations, the settling ones included.
    pub generations: Vec<Generation>,
    /// Populations at visits, by name of population, then generation.
    pub strata: Vec<SampledStratum>,
    /// Samples, by stratum.
    pub samples: Vec<Sample>,
}

/// The parents one population offers to the next generation.
pub struct Parents {
    start: u32,
    adults: u32,
    females: u32,
    broods: Broods,
}

enum Broods {
    TwoSexes { mothers: Brood, fathers: Brood },
    Pairs(Brood),
    Hermaphrodites(Brood),
}

/// Where the individuals born into one generation of a population come from.
pub struct Sources {
    /// Number born in the population itself.
    pub local: u32,
    /// Other populations and the number from each.
    pub others: Vec<(usize, u32)>,
}

impl History {
    /// Draws the pedigree of a checked scenario.
    pub fn draw(scenario: &Scenario, seed: u64) -> History {
        let settling = scenario.settling_generations as usize;
        let last = scenario
            .visit
            .iter()
            .map(|v| v.generation)
            .max()
            .unwrap_or(0);
        let mut generations = vec![founders(scenario)];
        let mut samples = Vec::new();
        let mut strata = sampling::strata(scenario);
        sampling::take(
            scenario,
            seed,
            &mut generations,
            None,
            &mut strata,
            &mut samples,
        );
        for index in 1..=settling + last as usize {
            let now = index.checked_sub(settling).map(|g| g as u32);
            let mut dice = Dice::new(seed, Purpose::Pedigree, 0, index as u64);
            let parents = &generations[index - 1];
            let offered: Vec<Option<Parents>> = (0..scenario.population.len())
                .map(|p| Parents::new(scenario, p, parents, &mut dice))
                .collect();
            let (next, same_parent, sources) = breed(scenario, now, &offered, &mut dice);
            generations[index - 1].same_parent = same_parent;
            generations.push(next);
            let born = Some((&offered[..], &sources[..]));
            sampling::take(
                scenario,
                seed,
                &mut generations,
                born,
                &mut strata,
                &mut samples,
            );
        }
        sampling::finish(scenario, &mut strata, &mut samples);
        History {
            settling,
            generations,
            strata,
            samples,
        }
    }

    /// Position of a generation of the scenario in `generations`.
    pub fn index(&self, generation: u32) -> usize {
        self.settling + generation as usize
    }
}

impl Parents {
    fn new(
        scenario: &Scenario,
        population: usize,
        generation: &Generation,
        dice: &mut Dice,
    ) -> Option<Self> {
        let range = generation.ranges[population].clone();
        let (adults, females) = (range.end - range.start, generation.females[population]);
        if adults == 0 {
            return None;
        }
        let settings = &scenario.population[population];
        let brood = |variance: Option<f64>, parents: u32, dice: &mut Dice| {
            Brood::new(Scheme::for_variance(variance, parents), parents, dice)
        };
        let broods = match scenario.mating {
            Mating::Random => Broods::TwoSexes {
                mothers: brood(settings.family_variance, females, dice),
                fathers: brood(father_variance(settings), adults - females, dice),
            },
            Mating::Pairs => Broods::Pairs(brood(
                settings.family_variance,
                females.min(adults - females),
                dice,
            )),
            Mating::Selfing => {
                Broods::Hermaphrodites(brood(settings.family_variance, adults, dice))
            }
        };
        Some(Parents {
            start: range.start,
            adults,
            females,
            broods,
        })
    }

    /// Mother and father of one of as many offspring as one likes.
    pub fn one(&self, dice: &mut Dice) -> [u32; 2] {
        let fathers_start = self.start + self.females;
        match &self.broods {
            Broods::TwoSexes { mothers, fathers } => [
                self.start + mothers.one(dice),
                fathers_start + fathers.one(dice),
            ],
            Broods::Pairs(pairs) => {
                let pair = pairs.one(dice);
                [self.start + pair, fathers_start + pair]
            }
            Broods::Hermaphrodites(all) => [self.start + all.one(dice), self.start + all.one(dice)],
        }
    }

    /// Mothers and fathers of all breeding offspring that stay.
    fn all(&self, offspring: u32, dice: &mut Dice) -> Vec<[u32; 2]> {
        let fathers_start = self.start + self.females;
        match &self.broods {
            Broods::TwoSexes { mothers, fathers } => {
                let mothers = mothers.all(offspring, dice);
                let fathers = fathers.all(offspring, dice);
                let pairs = mothers.into_iter().zip(fathers);
                pairs
                    .map(|(m, f)| [self.start + m, fathers_start + f])
                    .collect()
            }
            Broods::Pairs(pairs) => {
                let pairs = pairs.all(offspring, dice).into_iter();
                pairs.map(|p| [self.start + p, fathers_start + p]).collect()
            }
            Broods::Hermaphrodites(all) => {
                let gametes = all.all(2 * offspring, dice);
                gametes
                    .chunks_exact(2)
                    .map(|g| [self.start + g[0], self.start + g[1]])
                    .collect()
            }
        }
    }
}

fn founders(scenario: &Scenario) -> Generation {
    let mut generation = Generation::empty();
    for population in 0..scenario.population.len() {
        let n = adults(scenario, population, 0);
        generation.add(
            females(scenario, population, n),
            vec![Origin::Founder(population as u32); n as usize],
        );
    }
    generation
}

impl Generation {
    fn empty() -> Self {
        Generation {
            ranges: Vec::new(),
            females: Vec::new(),
            origins: Vec::new(),
            juveniles: Vec::new(),
            same_parent: Vec::new(),
        }
    }

    fn add(&mut self, females: u32, adults: Vec<Origin>) {
        let start = self.origins.len() as u32;
        self.origins.extend(adults);
        self.ranges.push(start..self.origins.len() as u32);
        self.females.push(females);
        self.same_parent.push(None);
    }
}

/// Where the adults of a population in a generation (`None`: settling) were born.
fn draw_sources(
    scenario: &Scenario,
    population: usize,
    generation: Option<u32>,
    offered: &[Option<Parents>],
    dice: &mut Dice,
) -> Sources {
    let mut local = adults(scenario, population, generation.unwrap_or(0));
    let mut others = Vec::new();
    let Some(generation) = generation else {
        return Sources { local, others };
    };
    let mut send = |from: usize, wanted: u32, local: &mut u32| {
        let number = if offered[from].is_some() {
            wanted.min(*local)
        } else {
            0
        };
        if number > 0 {
            *local -= number;
            others.push((from, number));
        }
    };
    for (from, number) in released(scenario, population, generation) {
        send(from, number, &mut local);
    }
    let before = local;
    for (from, rate, number) in migrants(scenario, population, generation) {
        let number = rate.map_or(number, |rate| dice.binomial(before, rate));
        send(from, number, &mut local);
    }
    Sources { local, others }
}

/// Draws the next generation: its adults, the drift by population, and where they were born.
fn breed(
    scenario: &Scenario,
    now: Option<u32>,
    offered: &[Option<Parents>],
    dice: &mut Dice,
) -> (Generation, Vec<Option<SameParent>>, Vec<Sources>) {
    let mut next = Generation::empty();
    let (mut drift, mut all_sources) = (Vec::new(), Vec::new());
    for (population, parents) in offered.iter().enumerate() {
        let sources = draw_sources(scenario, population, now, offered, dice);
        let mut born = Vec::new();
        if let Some(parents) = parents {
            born = parents.all(sources.local, dice);
        }
        drift.push(parents.as_ref().filter(|_| sources.local > 0).map(|p| {
            let sizes = family_sizes(&born, p.start, p.adults);
            SameParent {
                realised: realised_same_parent(&sizes),
                expected: expected_same_parent(scenario, population, now, (p.adults, p.females)),
            }
        }));
        for &(from, number) in &sources.others {
            if let Some(parents) = &offered[from] {
                born.extend((0..number).map(|_| parents.one(dice)));
            }
        }
        dice.shuffle(&mut born);
        let adults = born.into_iter().map(Origin::Child).collect::<Vec<_>>();
        next.add(females(scenario, population, adults.len() as u32), adults);
        all_sources.push(sources);
    }
    (next, drift, all_sources)
}

fn family_sizes(born: &[[u32; 2]], start: u32, adults: u32) -> Vec<u32> {
    let mut sizes = vec![0; adults as usize];
    for &parent in born.iter().flatten() {
        sizes[(parent - start) as usize] += 1;
    }
    sizes
}
