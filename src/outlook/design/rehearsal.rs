//! The simulated population behind a power: two visits of a population of constant size.

use crate::outlook::rehearse::{
    Chromosome, Frequencies, Genotyping, LocusSet, Mating, Plan, Population, Scenario, Spacing,
    Visit,
};

/// Length of a simulated chromosome in base pairs and centimorgans: a middling one.
const CHROMOSOME: (u64, f64) = (50_000_000, 100.0);

/// What is simulated.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Setting {
    /// Breeding adults, half of each sex, at least 2.
    pub adults: u32,
    /// Individuals at each visit.
    pub individuals: u32,
    /// Loci.
    pub loci: u32,
    /// Alleles a locus.
    pub alleles: u32,
    /// Generations between the visits.
    pub generations: u32,
    /// Chromosomes.
    pub chromosomes: u32,
}

/// The scenario of a setting: juveniles of plan II, minor allele frequencies evenly from 0.05 to 0.5
/// where there are two alleles.
pub fn scenario(setting: &Setting) -> Scenario {
    let visit = |generation: u32| Visit {
        generation,
        label: None,
        individuals: setting.individuals,
        populations: Vec::new(),
        plan: Plan::II,
        recaptured: 0,
        replicates: 0,
        full_sib_families: 0,
        full_sib_family_size: 3,
    };
    Scenario {
        title: String::new(),
        seed: 1,
        start_year: 0.0,
        generation_years: 1.0,
        mating: Mating::Random,
        settling_generations: 3,
        chromosome: vec![Chromosome {
            name: "design".to_string(),
            length_bp: CHROMOSOME.0,
            map_length_cm: Some(CHROMOSOME.1),
            unlinked: false,
            copies: setting.chromosomes,
        }],
        loci: vec![LocusSet {
            count: setting.loci,
            alleles: setting.alleles,
            frequencies: match setting.alleles {
                2 => Frequencies::Minor([0.05, 0.5]),
                _ => Frequencies::Dirichlet(1.0),
            },
            chromosomes: Vec::new(),
            spacing: Spacing::Random,
            duplicated: false,
        }],
        population: vec![Population {
            name: "design".to_string(),
            size: Some(setting.adults),
            sizes: Vec::new(),
            growth_rate: 0.0,
            largest_size: None,
            bottleneck: Vec::new(),
            female_share: 0.5,
            family_variance: None,
            male_family_variance: None,
            starts_at: 0,
            divergence: 0.0,
        }],
        migration: Vec::new(),
        release: Vec::new(),
        visit: vec![visit(0), visit(setting.generations)],
        genotyping: Genotyping::default(),
    }
}
