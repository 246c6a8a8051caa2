//! What leaves the house: wire types, and the files that carry them.

pub mod assemble;
pub mod headline;
mod json;
pub mod read;
pub mod table;
pub mod verdict;
pub mod warnings;
pub mod wire;
mod words;

pub use json::{Output, WholeFile};
pub use words::{CAUTIONS, methods};
