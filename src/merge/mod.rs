//! Sums that merge: the same bytes for any order, any number of threads and any sharding.

mod bounds;
pub mod carriers;
mod entry;
pub mod fates;
mod fixed;
pub mod gram;
pub mod histogram;
pub mod panel;
mod scheme;
pub mod screen;
pub mod spectrum;
mod stored;
mod sums;
mod two_way;
mod windows;

pub use crate::locus::Terms;
pub use fixed::{BATCH_LOCI, FRACTION_BITS, from_fixed, to_fixed};
pub use scheme::{Pair, Scheme};
pub use sums::{LocusView, PairSums, StratumSums, Sums};
pub use two_way::TwoWay;
pub use windows::{Blocking, ENOUGH_BLOCKS, Windows};
