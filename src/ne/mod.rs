//! Estimators: sums to estimates with intervals. No streaming, no files.

pub mod coalescent;
pub mod demographic;
pub mod diffusion;
pub mod estimate;
pub mod heterozygote_excess;
pub mod interval;
pub mod jacobi;
pub mod likelihood;
pub mod linkage;
pub mod matrix;
pub mod prior;
pub mod temporal;
pub mod testing;
pub mod wright_fisher;
