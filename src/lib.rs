//! Genetic monitoring of wild and captive populations, as one streaming pass.
//!
//! ```text
//! cli -> run -> ingest -> locus -> merge -> ne -> outlook -> report
//! ```
//! Genotype calls and a sample sheet come in ([`ingest`]); every locus becomes counts and terms per
//! stratum ([`locus`]); terms are added up as exact integers, so neither threads nor shards change a
//! digit ([`merge`]); estimators turn sums into estimates with intervals ([`ne`]); projections and
//! simulations build on these ([`outlook`]); [`report`] writes what leaves the house.
//! `DEVELOPERS.md` has the import table, and `tests/architecture.rs` keeps it true.
#![forbid(unsafe_code)]
#![cfg_attr(
    not(test),
    deny(
        clippy::unwrap_used,
        clippy::expect_used,
        clippy::panic,
        clippy::unreachable,
        clippy::todo
    )
)]

pub mod cli;
pub mod error;
pub mod files;
pub mod ingest;
pub mod locus;
pub mod merge;
pub mod model;
pub mod ne;
pub mod outlook;
pub mod report;
pub mod run;
pub mod screen;

pub use error::{Error, Result};
