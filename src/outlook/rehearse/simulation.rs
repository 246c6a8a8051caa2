//! The engine: from a scenario and a seed to genotypes and truth, in memory or unit by unit.

use rayon::prelude::*;

use super::calls::{CallRow, MISSING, SampleQuality, genotype};
use super::check;
use super::dice::{Dice, Purpose};
use super::genome::{Contig, Genome, Unit, allele_texts};
use super::meiosis::{Layout, transmit};
use super::population::History;
use super::sampling::{Sample, SampledStratum};
use super::scenario::Scenario;
use super::truth::{GoneTruth, LocusTruth, Truth};
use crate::error::{Error, Result};
use crate::model::{Individual, Locus, MISSING_DOSAGE, Strata, Stratum, stable_hash};

/// A locus of the simulated calls.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct SimulatedLocus {
    /// Index of its contig.
    pub contig: usize,
    /// 1-based position.
    pub position: u64,
    /// Texts of its alleles, the reference first.
    pub alleles: Vec<String>,
}

/// A simulated survey: genotypes as the laboratory reports them, and the truth.
#[derive(Debug, Clone)]
pub struct Simulation {
    /// Contigs in the order of the calls.
    pub contigs: Vec<Contig>,
    /// Populations at visits, by name of population, then generation.
    pub strata: Vec<SampledStratum>,
    /// Samples, by stratum.
    pub samples: Vec<Sample>,
    /// Loci in the order of the calls.
    pub loci: Vec<SimulatedLocus>,
    /// What really happened.
    pub truth: Truth,
    calls: Vec<[u8; 2]>,
}

/// Dosages of the samples of one stratum at the biallelic loci.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Dosages {
    /// Number of samples.
    pub individuals: usize,
    /// Indices of the loci.
    pub loci: Vec<usize>,
    /// Copies of the second allele, [`MISSING_DOSAGE`] where missing, locus by locus: the row of
    /// the l-th locus is `values[l * individuals..(l + 1) * individuals]`.
    pub values: Vec<u8>,
}

/// Everything drawn before the first unit.
pub(super) struct Stage<'a> {
    pub scenario: &'a Scenario,
    pub seed: u64,
    pub genome: Genome,
    pub history: History,
    quality: SampleQuality,
}

/// One unit, done.
pub(super) struct Outcome {
    pub loci: Vec<SimulatedLocus>,
    pub rows: Vec<CallRow>,
    pub truth: Vec<LocusTruth>,
    pub gone: Vec<GoneTruth>,
}

/// Simulates on the calling thread; see [`simulate_with_threads`].
///
/// # Errors
///
/// [`Error::Sheet`] with every problem of the scenario.
pub fn simulate(scenario: &Scenario, seed: u64) -> Result<Simulation> {
    let stage = Stage::new(scenario, seed)?;
    let outcomes: Vec<Outcome> = stage
        .genome
        .units
        .iter()
        .map(|unit| stage.run(unit))
        .collect();
    Ok(stage.gather(outcomes))
}

/// Simulates on the threads of the current rayon pool. The result is that of [`simulate`].
///
/// # Errors
///
/// [`Error::Sheet`] with every problem of the scenario.
pub fn simulate_with_threads(scenario: &Scenario, seed: u64) -> Result<Simulation> {
    let stage = Stage::new(scenario, seed)?;
    let outcomes = stage
        .genome
        .units
        .par_iter()
        .map(|unit| stage.run(unit))
        .collect();
    Ok(stage.gather(outcomes))
}

impl<'a> Stage<'a> {
    /// Checks the scenario and draws places and pedigree.
    pub fn new(scenario: &'a Scenario, seed: u64) -> Result<Self> {
        let problems = check::problems(scenario);
        if !problems.is_empty() {
            return Err(Error::Sheet {
                path: "scenario".into(),
                problems,
            });
        }
        let genome = Genome::place(scenario, seed);
        let history = History::draw(scenario, seed);
        let quality = SampleQuality::draw(&scenario.genotyping, history.samples.len(), seed);
        Ok(Stage {
            scenario,
            seed,
            genome,
            history,
            quality,
        })
    }

    /// Simulates one unit.
    pub fn run(&self, unit: &Unit) -> Outcome {
        let contig = &self.genome.contigs[unit.contig];
        let layout = Layout::new(self.scenario, unit, contig.length_bp, contig.map_morgans);
        let transmission = transmit(self.scenario, &self.history, unit, layout, self.seed);
        let rows = genotype(self.scenario, unit, &transmission, &self.quality, self.seed);
        let mut dice = Dice::new(self.seed, Purpose::AlleleTexts, unit.number, 0);
        let (mut loci, mut truth) = (Vec::new(), Vec::new());
        for row in &rows {
            let position = u64::from(unit.sites[row.site].position);
            let alleles = allele_texts(transmission.layout.alleles[row.site] as usize, &mut dice);
            truth.push(LocusTruth {
                contig: contig.name.clone(),
                position,
                alleles: alleles.clone(),
                duplicated: unit.sites.get(row.site + 1).is_some_and(|next| next.shadow),
                copies: transmission
                    .copies
                    .iter()
                    .map(|c| c[row.site].clone())
                    .collect(),
            });
            loci.push(SimulatedLocus {
                contig: unit.contig,
                position,
                alleles,
            });
        }
        let mut gone = Vec::new();
        for (population, list) in transmission.gone.iter().enumerate() {
            let first = self
                .history
                .strata
                .iter()
                .position(|s| s.population == population);
            for lost in list.iter().filter(|g| !unit.sites[g.locus].shadow) {
                let Some(first) = first else { continue };
                let baseline = &transmission.copies[first][lost.locus];
                gone.push(GoneTruth {
                    population: self.scenario.population[population].name.clone(),
                    contig: contig.name.clone(),
                    position: u64::from(unit.sites[lost.locus].position),
                    allele: lost.allele,
                    generation: lost.generation,
                    baseline_copies: baseline[lost.allele as usize],
                    baseline_total: baseline.iter().sum(),
                });
            }
        }
        Outcome {
            loci,
            rows,
            truth,
            gone,
        }
    }

    /// The truth without loci.
    pub fn truth(&self) -> Truth {
        Truth::new(self.scenario, self.seed, &self.history)
    }

    fn gather(self, outcomes: Vec<Outcome>) -> Simulation {
        let mut truth = self.truth();
        let (mut loci, mut calls) = (Vec::new(), Vec::new());
        for outcome in outcomes {
            loci.extend(outcome.loci);
            calls.extend(outcome.rows.into_iter().flat_map(|row| row.calls));
            truth.loci.extend(outcome.truth);
            truth.gone.extend(outcome.gone);
        }
        truth.finish();
        let History {
            strata, samples, ..
        } = self.history;
        Simulation {
            contigs: self.genome.contigs,
            strata,
            samples,
            loci,
            truth,
            calls,
        }
    }
}

impl Simulation {
    /// Called alleles of every sample at a locus, the lower code first; `None` is missing.
    pub fn genotypes(&self, locus: usize) -> impl Iterator<Item = Option<[u16; 2]>> + '_ {
        let n = self.samples.len();
        let row = &self.calls[locus * n..(locus + 1) * n];
        row.iter()
            .map(|&[a, b]| ([a, b] != MISSING).then(|| [u16::from(a), u16::from(b)]))
    }

    /// Dosages of a stratum (with one population: of a visit) at its biallelic loci, replicates
    /// left out.
    pub fn dosages(&self, stratum: usize) -> Dosages {
        let chosen: Vec<usize> = self.strata[stratum]
            .samples
            .clone()
            .filter(|&s| self.first(s))
            .collect();
        let loci: Vec<usize> = (0..self.loci.len())
            .filter(|&l| self.loci[l].alleles.len() == 2)
            .collect();
        let mut values = Vec::with_capacity(loci.len() * chosen.len());
        for &locus in &loci {
            let row = &self.calls[locus * self.samples.len()..];
            values.extend(chosen.iter().map(|&s| match row[s] {
                MISSING => MISSING_DOSAGE,
                [a, b] => a + b,
            }));
        }
        Dosages {
            individuals: chosen.len(),
            loci,
            values,
        }
    }

    /// The strata and individuals as the estimators know them, replicates left out.
    pub fn model_strata(&self) -> Strata {
        let mut model = Strata::default();
        for (index, stratum) in self.strata.iter().enumerate() {
            let start = model.individuals.len();
            let samples = stratum.samples.clone().filter(|&s| self.first(s));
            model.individuals.extend(samples.map(|s| Individual {
                sample: self.samples[s].name.clone(),
                stratum: index,
                sex: self.samples[s].sex,
                batch: None,
            }));
            let truth = &self.truth.strata[index];
            model.strata.push(Stratum {
                name: truth.stratum.clone(),
                population: truth.population.clone(),
                visit: truth.visit.clone(),
                year: stratum.year,
                generation: Some(f64::from(stratum.generation)),
                slots: start..model.individuals.len(),
            });
        }
        model
    }

    /// Fills one locus as the reader of calls would, with the slots of [`Simulation::model_strata`].
    pub fn fill_locus(&self, index: usize, locus: &mut Locus) {
        let simulated = &self.loci[index];
        let contig = &self.contigs[simulated.contig].name;
        locus.contig.clone_from(contig);
        locus.contig_hash = stable_hash(contig.as_bytes());
        locus.position = simulated.position;
        locus.id.clear();
        locus.record = index as u64 + 1;
        locus.clear_alleles();
        for allele in &simulated.alleles {
            locus.push_allele(allele.as_bytes());
        }
        let slots = (0..self.samples.len()).filter(|&s| self.first(s)).count();
        locus.genotypes.reset(slots, simulated.alleles.len());
        let calls = self
            .genotypes(index)
            .enumerate()
            .filter(|&(s, _)| self.first(s));
        for (slot, (_, call)) in calls.enumerate() {
            if let Some([a, b]) = call {
                locus.genotypes.set(slot, a, b);
            }
        }
    }

    /// Whether a sample is not the replicate of another.
    fn first(&self, sample: usize) -> bool {
        self.samples[sample].replicate_of.is_none()
    }
}
