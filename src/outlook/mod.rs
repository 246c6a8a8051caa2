//! Projections and simulations that build on the estimates.

pub mod design;
pub mod forecast;
pub mod losses;
pub mod outliers;
mod passage;
pub mod rehearse;
pub mod verdict;
