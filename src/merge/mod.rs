//! Sums that merge: the same bytes for any order, any number of threads and any sharding.

mod fixed;
pub mod gram;
pub mod histogram;
pub mod panel;
mod scheme;
mod sums;
mod two_way;
mod windows;

pub use fixed::{BATCH_LOCI, FRACTION_BITS, Terms, from_fixed, to_fixed};
pub use scheme::Scheme;
pub use sums::{LocusView, PairSums, StratumSums, Sums};
pub use two_way::TwoWay;
pub use windows::{ENOUGH_BLOCKS, Windows};
