//! Bytes to genotypes. The only place that knows the formats.

pub mod sheet;
pub mod programme;
