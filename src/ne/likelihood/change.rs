//! Has the effective size changed between the visits?

use statrs::distribution::{ChiSquared, ContinuousCDF};

use super::Fit;

/// Likelihood-ratio test of one effective size against one an interval.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SizeChange {
    /// Twice the gain in log-likelihood over the variance inflation.
    pub statistic: f64,
    /// Intervals less one.
    pub degrees_of_freedom: usize,
    /// Chance of a statistic at least as large with one effective size throughout.
    pub p: f64,
}

/// Compares two fits of the same panel; `None` where there is one interval only.
///
/// Loci share one pedigree and the sampled individuals, so twice the gain is larger than chi-square
/// by the factor that the true variance has over the curvature's: `inflation` is that factor (at
/// least 1 is used), for instance the two-way variance times the information of the constant fit
/// (Chandler & Bate 2007, Biometrika 94:167-183, for composite likelihoods).
pub fn size_change(one: &Fit, by_interval: &Fit, inflation: f64) -> Option<SizeChange> {
    let degrees_of_freedom = by_interval.rates.len().checked_sub(one.rates.len())?;
    let distribution = ChiSquared::new(degrees_of_freedom as f64).ok()?;
    let gain = (by_interval.log_likelihood - one.log_likelihood).max(0.0);
    let statistic = 2.0 * gain / inflation.max(1.0);
    Some(SizeChange {
        statistic,
        degrees_of_freedom,
        p: distribution.sf(statistic),
    })
}
