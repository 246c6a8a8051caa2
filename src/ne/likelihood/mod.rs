//! The likelihood of any number of visits, and the effective size that makes it largest.
//!
//! Given the baseline count of a locus its frequency has a Beta(a + x0, b + n0 - x0) posterior;
//! drift carries the chance of all later counts back to it ([`super::diffusion`]). Conditioning on
//! the baseline count makes any choice of loci by their baseline frequency harmless.
//!
//! ```text
//! CountPanel -> columns (equal loci once) -> engine (log-likelihood, slopes) -> fit -> two_way
//! ```
//! Everything is a function of the drift rate u = 1/(2Ne): the likelihood is nearly a parabola in
//! u, sampling error is nearly normal on that scale, and u = 0 is a population without drift.

mod change;
mod columns;
mod engine;
mod fit;
mod jet;
mod two_way;
mod weights;

pub use change::{SizeChange, size_change};
pub use columns::CountPanel;
pub use engine::Kernel;
pub use fit::{Fit, fit_by_interval, fit_constant, profile};
pub use two_way::{DosagePanel, DriftInterval, TwoWay, two_way, two_way_by_interval};
pub use weights::{RateWeight, rate_weights};

/// Beta(a, b): what is believed of an allele's frequency before any count.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct BetaPrior {
    /// Shape towards the allele's presence; above 0.
    pub a: f64,
    /// Shape towards its absence; above 0.
    pub b: f64,
}

impl BetaPrior {
    /// Every frequency alike.
    pub const FLAT: BetaPrior = BetaPrior { a: 1.0, b: 1.0 };

    /// The same belief seen from the other allele.
    pub fn exchanged(self) -> Self {
        BetaPrior {
            a: self.b,
            b: self.a,
        }
    }
}

/// Why there is no estimate.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
pub enum NoFit {
    /// Fewer than two visits.
    #[error("fewer than two visits")]
    TooFewVisits,
    /// An interval between visits is not a positive number of generations.
    #[error("an interval between visits is not a positive number of generations")]
    NoTimeBetween,
    /// No locus passes the baseline frequency limit and is typed again later.
    #[error("no locus is variable enough at the baseline and typed again later")]
    NoLoci,
    /// All rows lie in one block: their variance is unknown.
    #[error("all loci lie in one block of the genome")]
    OneBlock,
    /// The prior's shapes are not positive numbers.
    #[error("the prior of allele frequencies has no positive shapes")]
    NoPrior,
    /// The likelihood is flat: the counts say nothing about drift.
    #[error("the counts carry no information on drift")]
    Uninformative,
}

#[cfg(test)]
mod calibration;
#[cfg(test)]
mod tests;
