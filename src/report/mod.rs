//! What leaves the house: wire types, and the files that carry them.

pub mod assemble;
pub mod design;
pub mod figures;
pub mod forecast;
pub mod headline;
mod json;
pub mod page;
pub mod parquet;
pub mod screen_wire;
pub mod screening;
pub mod summary;
pub mod table;
pub mod tally;
pub mod tally_counts;
pub mod verdict;
pub mod warnings;
pub mod wire;
mod words;

pub use json::Output;
pub use words::{CAUTIONS, methods, screen_methods};
