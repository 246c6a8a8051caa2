//! Estimators: sums to estimates with intervals. No streaming, no files.

pub mod demographic;
pub mod diffusion;
pub mod heterozygote_excess;
pub mod linkage;
pub mod prior;
pub mod temporal;
pub mod wright_fisher;
