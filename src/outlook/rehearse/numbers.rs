//! Numbers that follow from the scenario alone: sizes, sexes, movement, expected drift.

use super::families::Scheme;
use super::scenario::{Bottleneck, Mating, Population, Release, Scenario};

/// Variance of family size of fathers.
pub fn father_variance(population: &Population) -> Option<f64> {
    population
        .male_family_variance
        .or(population.family_variance)
}

/// Number of adults of a population in a generation; 0 before it starts.
pub fn adults(scenario: &Scenario, population: usize, generation: u32) -> u32 {
    let settings = &scenario.population[population];
    let Some(age) = generation.checked_sub(settings.starts_at) else {
        return 0;
    };
    if age == 0 && settings.starts_at > 0 {
        return released(scenario, population, generation)
            .map(|(_, n)| n)
            .sum();
    }
    let inside = |b: &&Bottleneck| (b.from..=b.to).contains(&generation);
    if let Some(bottleneck) = settings.bottleneck.iter().find(inside) {
        return bottleneck.size;
    }
    if let Some(&size) = settings.sizes.get(age as usize).or(settings.sizes.last()) {
        return size;
    }
    let grown =
        f64::from(settings.size.unwrap_or(0)) * (1.0 + settings.growth_rate).powi(age as i32);
    let limit = f64::from(settings.largest_size.unwrap_or(u32::MAX / 4));
    grown.round().min(limit).max(2.0) as u32
}

/// Females among so many adults: at least one of each sex.
pub fn females(scenario: &Scenario, population: usize, adults: u32) -> u32 {
    if scenario.mating == Mating::Selfing || adults < 2 {
        return 0;
    }
    let share = scenario.population[population].female_share;
    ((f64::from(adults) * share).round() as u32).clamp(1, adults - 1)
}

/// Individuals released into a population in a generation, by population of birth.
pub fn released<'a>(
    scenario: &'a Scenario,
    population: usize,
    generation: u32,
) -> impl Iterator<Item = (usize, u32)> + 'a {
    let name = &scenario.population[population].name;
    let here = move |r: &&Release| r.to == *name && r.generation == generation;
    scenario.release.iter().filter(here).filter_map(|r| {
        scenario
            .population
            .iter()
            .position(|p| p.name == r.from)
            .map(|from| (from, r.number))
    })
}

/// Expected share of migrants among the adults of a population, by population of birth, with the
/// number where it is fixed.
pub fn migrants(
    scenario: &Scenario,
    population: usize,
    generation: u32,
) -> impl Iterator<Item = (usize, Option<f64>, u32)> + '_ {
    let name = &scenario.population[population].name;
    scenario.migration.iter().filter_map(move |m| {
        let now = generation >= m.first_generation
            && m.last_generation.is_none_or(|last| generation <= last);
        let from = scenario.population.iter().position(|p| p.name == m.from)?;
        (now && m.to == *name).then_some((from, m.rate, m.number.unwrap_or(0)))
    })
}

/// Chance of the same parent for two local gametes by the scenario's numbers, migrants taken off
/// at their expected number.
pub fn expected_same_parent(
    scenario: &Scenario,
    population: usize,
    generation: Option<u32>,
    parents: (u32, u32),
) -> f64 {
    let mut local = f64::from(adults(scenario, population, generation.unwrap_or(0)));
    if let Some(generation) = generation {
        local -= released(scenario, population, generation)
            .map(|(_, n)| f64::from(n))
            .sum::<f64>();
        let before = local;
        for (_, rate, number) in migrants(scenario, population, generation) {
            local -= rate.map_or(f64::from(number), |rate| before * rate);
        }
    }
    let offspring = local.round().max(1.0) as u32;
    let settings = &scenario.population[population];
    let (adults, females) = parents;
    let chance = |variance, parents, gametes| {
        Scheme::for_variance(variance, parents).same_parent(parents, gametes)
    };
    // Gametes of one sex only can share a parent: (n - 1) of the (2n - 1) others.
    let same_sex = f64::from(offspring - 1) / f64::from(2 * offspring - 1);
    match scenario.mating {
        Mating::Selfing => chance(settings.family_variance, adults, 2 * offspring),
        Mating::Pairs => {
            same_sex
                * chance(
                    settings.family_variance,
                    females.min(adults - females),
                    offspring,
                )
        }
        Mating::Random => {
            let mothers = chance(settings.family_variance, females, offspring);
            let fathers = chance(father_variance(settings), adults - females, offspring);
            same_sex * (mothers + fathers) / 2.0
        }
    }
}
