//! One locus at a time: genotypes to counts, counts to statistics. No float enters a count; no
//! file is opened here.

mod counts;
pub mod change;
pub mod diversity;
pub mod fstatistics;
pub mod hardy_weinberg;
pub mod individuals;
pub mod richness;

pub use counts::Counts;
