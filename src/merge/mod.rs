//! Sums that merge: the same bytes for any order, any number of threads and any sharding.

pub mod gram;
pub mod histogram;
pub mod panel;
