//! One locus at a time: genotypes to counts, counts to statistics. No float enters a count; no
//! file is opened here.

mod classes;
mod counts;
mod terms;
pub mod change;
pub mod diversity;
pub mod fstatistics;
pub mod hardy_weinberg;
pub mod richness;

pub use classes::GenotypeClasses;
pub use counts::Counts;
pub use terms::{
    PairTerms, PrivateTerms, StratumTerms, pair_terms, private_terms, stratum_terms,
};
