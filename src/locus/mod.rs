//! One locus at a time: genotypes to counts, counts to statistics. No float enters a count; no
//! file is opened here.

pub mod change;
mod classes;
mod counts;
pub mod diversity;
pub mod fstatistics;
pub mod hardy_weinberg;
pub mod individuals;
mod lanes;
pub mod richness;
pub mod runs;
pub mod signs;
mod term_list;
mod terms;

pub use classes::GenotypeClasses;
pub use counts::Counts;
pub use lanes::StratumLanes;
pub use term_list::{Lane, Terms};
pub use terms::{
    PairTermLanes, PairTerms, PrivateTerms, StratumTermLanes, StratumTerms, pair_terms,
    private_terms, stratum_terms,
};
