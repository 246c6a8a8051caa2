//! How probable each effective size is, for predictions that must not rest on one.

use super::{BetaPrior, DosagePanel, NoFit, TwoWay, profile};

/// Standard errors on each side that the grid of rates covers.
const REACH: f64 = 3.5;
/// Rates below this stand for no drift: 2Ne of a million.
const NO_DRIFT: f64 = 1e-6;

/// A drift rate u = 1/(2Ne) and its weight.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RateWeight {
    /// Drift rate, 0 or more; 0 is a population without drift.
    pub rate: f64,
    /// Weight; all of one list add up to 1.
    pub weight: f64,
}

impl RateWeight {
    /// One effective size, certain; `None` is unbounded.
    pub fn certain(effective_size: Option<f64>) -> Vec<RateWeight> {
        let rate = effective_size.map_or(0.0, |ne| 0.5 / ne);
        vec![RateWeight { rate, weight: 1.0 }]
    }
}

/// Weights of `points` (at least 2) evenly spaced rates by the likelihood of a constant effective
/// size, flattened by the two-way inflation so that it is as wide as the honest interval.
///
/// # Errors
/// [`NoFit`] where the panel cannot be fitted, or `result` is not of one rate.
pub fn rate_weights(
    panel: &DosagePanel,
    prior: BetaPrior,
    limit: f64,
    result: &TwoWay,
    points: usize,
) -> Result<Vec<RateWeight>, NoFit> {
    let [interval] = result.intervals[..] else {
        return Err(NoFit::Uninformative);
    };
    let reach = REACH * interval.standard_error();
    let low = (interval.rate - reach).max(0.0);
    let high = (interval.rate + reach).clamp(low + NO_DRIFT, 0.5);
    let steps = points.max(2) - 1;
    let rates: Vec<f64> = (0..=steps)
        .map(|i| low + (high - low) * i as f64 / steps as f64)
        .collect();
    let logs = profile(&panel.counts(), prior, limit, result.fit.kernel, &rates)?;
    let top = logs.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    let raw: Vec<f64> = logs
        .iter()
        .map(|l| ((l - top) / result.inflation).exp())
        .collect();
    let sum: f64 = raw.iter().sum();
    Ok(rates
        .into_iter()
        .zip(raw)
        .map(|(rate, weight)| RateWeight {
            rate: if rate < NO_DRIFT { 0.0 } else { rate },
            weight: weight / sum,
        })
        .collect())
}
