//! What leaves the house: wire types, and the files that carry them.

pub mod assemble;
mod json;
pub mod wire;

pub use json::{WholeFile, write_json, write_whole};
