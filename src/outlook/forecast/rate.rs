//! What is believed of the drift rate u = 1/(2Ne): Student's t around the estimate, as its interval
//! was made, cut off where no population can be.

use statrs::distribution::{ContinuousCDF, StudentsT};

use crate::ne::estimate::quantile;

/// u of one individual that selfs: no population drifts faster.
const FASTEST: f64 = 0.5;
/// Below this there is no drift to speak of: 2Ne of ten million.
const SLOWEST: f64 = 1e-7;

/// Belief about a drift rate.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct DriftRate {
    /// The estimate; 0 or less where the data show no drift.
    value: f64,
    /// Its standard error, 0 when it is taken as certain.
    error: f64,
    degrees: f64,
}

impl DriftRate {
    /// A rate without uncertainty.
    pub fn certain(value: f64) -> Self {
        DriftRate {
            value,
            error: 0.0,
            degrees: f64::INFINITY,
        }
    }

    /// A rate with its standard error; the degrees of freedom are those that make an interval of
    /// coverage `level` as wide as `half_width` on each side.
    pub fn estimated(value: f64, error: f64, half_width: f64, level: f64) -> Self {
        if error.is_nan() || error <= 0.0 {
            return DriftRate::certain(value);
        }
        DriftRate {
            value,
            error,
            degrees: degrees_of(half_width / error, level),
        }
    }

    /// Whether it has any spread.
    pub fn is_certain(&self) -> bool {
        self.error == 0.0
    }

    /// The rate below which it lies with this probability, given that it is above 0 and at most 1/2.
    pub fn quantile(&self, probability: f64) -> f64 {
        if self.is_certain() {
            return self.value.clamp(SLOWEST, FASTEST);
        }
        let Ok(t) = StudentsT::new(0.0, 1.0, self.degrees.clamp(1.0, 1e6)) else {
            return self.value.clamp(SLOWEST, FASTEST);
        };
        let scaled = |u: f64| (u - self.value) / self.error;
        let (low, high) = (t.cdf(scaled(SLOWEST)), t.cdf(scaled(FASTEST)));
        let at = low + (high - low) * probability;
        (self.value + self.error * t.inverse_cdf(at.clamp(1e-12, 1.0 - 1e-12)))
            .clamp(SLOWEST, FASTEST)
    }

    /// `count` rates of equal weight: the middles of as many equally probable slices.
    pub fn slices(&self, count: usize) -> Vec<f64> {
        match self.is_certain() {
            true => vec![self.quantile(0.5)],
            false => (0..count)
                .map(|i| self.quantile((i as f64 + 0.5) / count as f64))
                .collect(),
        }
    }
}

/// Degrees of freedom at which the two-sided quantile of this level is `multiple`.
fn degrees_of(multiple: f64, level: f64) -> f64 {
    let (mut low, mut high) = (1.0f64, 1e6f64);
    if multiple.is_nan() || multiple <= quantile(level, high) {
        return high;
    }
    for _ in 0..60 {
        let middle = (low * high).sqrt();
        if quantile(level, middle) > multiple {
            low = middle;
        } else {
            high = middle;
        }
    }
    (low * high).sqrt()
}

#[cfg(test)]
mod tests {
    use super::*;

    // Table of Student's t (Fisher & Yates): the two-sided 95 % quantiles at 5 and 29 degrees.
    #[test]
    fn degrees_come_back_from_the_table() {
        assert!((degrees_of(2.5706, 0.95) - 5.0).abs() < 1e-3);
        assert!((degrees_of(2.0452, 0.95) - 29.0).abs() < 0.05);
        assert_eq!(degrees_of(1.9, 0.95), 1e6);
    }

    #[test]
    fn slices_lie_in_bounds_and_a_far_estimate_is_not_cut() {
        let near_zero = DriftRate::estimated(-0.001, 0.002, 0.004, 0.95);
        let all = near_zero.slices(9);
        assert!(all.windows(2).all(|w| w[0] < w[1]) && all[0] > 0.0 && all[8] < 0.5);
        // Normal with mean 10 errors above 0: the cut changes nothing, so the median is the value.
        let far = DriftRate::estimated(0.02, 0.002, 0.00392, 0.95);
        assert!((far.quantile(0.5) - 0.02).abs() < 1e-6);
        assert!((far.quantile(0.975) - 0.02392).abs() < 1e-5);
        assert_eq!(DriftRate::certain(0.01).slices(9), [0.01]);
    }
}
