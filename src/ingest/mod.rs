//! Bytes to genotypes. The only place that knows the formats.

pub mod programme;
pub mod sheet;
