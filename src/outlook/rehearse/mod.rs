//! Simulated populations with known truth: for practice, for demos, and to prove the estimators.
//!
//! ```text
//! scenario -> check -> genome (places) + population (pedigree, sampling) -> meiosis + watch -> calls -> truth, write
//! ```
//! Chance comes in streams named by purpose, unit of the genome and generation ([`Dice`]), the
//! pedigree is drawn once for all loci, and units (a chromosome, or 1024 unlinked loci) are then
//! independent: any number of threads gives the same bytes.

mod calls;
mod check;
mod dice;
mod families;
mod genome;
mod meiosis;
mod numbers;
mod population;
mod records;
mod reference;
mod sampling;
mod scenario;
mod simulation;
#[cfg(test)]
mod theory;
mod truth;
mod watch;
mod write;

pub use calls::phred_likelihoods;
pub use check::{problems, read_scenario};
pub use dice::{Dice, Purpose};
pub use families::{Scheme, realised_same_parent};
pub use genome::Contig;
pub use population::History;
pub use reference::scenario_reference;
pub use sampling::{Sample, SampledStratum, Source};
pub use scenario::{
    Bottleneck, Chromosome, Field, Frequencies, Genotyping, LocusSet, Mating, Migration, Plan,
    Population, Release, Scenario, Spacing, Visit,
};
pub use simulation::{Dosages, SimulatedLocus, Simulation, simulate, simulate_with_threads};
pub use truth::{
    Drift, GenerationTruth, GoneTruth, IntervalTruth, LocusTruth, StratumTruth, Truth,
};
pub use write::{Summary, rehearse};
