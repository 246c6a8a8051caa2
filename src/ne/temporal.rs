//! Effective size from the change of allele frequencies between two samples.
//!
//! From a multilocus F and the sample sizes to the drift rate 1/(2Ne), which may be negative and is
//! never clipped: intervals are made on this scale and inverted last, and a rate at or below 0 is an
//! unbounded size.

use statrs::distribution::{ChiSquared, ContinuousCDF};

use crate::model::SamplingPlan;

/// Two samples of one population.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TemporalSample {
    /// Individuals typed in the first sample, harmonic mean over loci (S0).
    pub first: f64,
    /// Individuals typed in the later sample, harmonic mean over loci (St).
    pub later: f64,
    /// Generations between them (t).
    pub generations: f64,
    /// How the individuals were taken.
    pub plan: SamplingPlan,
    /// Census size at the first sample (N); plan I needs it.
    pub census: Option<f64>,
}

impl TemporalSample {
    /// 1/N in plan I, 0 in plan II. `None` when a number the estimators need is absent: somebody
    /// typed in both samples, time between them, and in plan I the census size.
    fn overlap(&self) -> Option<f64> {
        if !(self.first > 0.0 && self.later > 0.5 && self.generations > 0.0) {
            return None;
        }
        match self.plan {
            SamplingPlan::Two => Some(0.0),
            SamplingPlan::One => self.census.filter(|&census| census > 0.0).map(f64::recip),
        }
    }
}

/// Drift rate from Fc (Nei & Tajima 1981, Genetics 98:625-640; plans of Waples 1989, Genetics
/// 121:379-391): [Fc - 1/(2 S0) - 1/(2 St) (+ 1/N in plan I)]/t.
///
/// `None` when nobody is typed, no time passed, or plan I lacks the census size.
pub fn drift_rate_fc(fc: f64, sample: &TemporalSample) -> Option<f64> {
    let drift = fc - 0.5 / sample.first - 0.5 / sample.later + sample.overlap()?;
    Some(drift / sample.generations)
}

/// Drift rate from Fk (Pollak 1983, Genetics 104:531-548): as [`drift_rate_fc`].
pub fn drift_rate_fk(fk: f64, sample: &TemporalSample) -> Option<f64> {
    drift_rate_fc(fk, sample)
}

/// Fs without what sampling adds (Fs'), the plan taken into account (Jorde & Ryman 2007, Genetics
/// 177:927-935). Exactly, the expectation of its parts gives 1 - (1 - 1/(2Ne))^t.
///
/// `None` as for [`drift_rate_fc`].
pub fn corrected_fs(fs: f64, sample: &TemporalSample) -> Option<f64> {
    let overlap = sample.overlap()?;
    let sampling = 0.5 * (1.0 / sample.first + 1.0 / sample.later);
    let drift = fs * (1.0 - 0.25 * sampling - 0.25 * overlap) - sampling + overlap;
    Some(drift / ((1.0 + 0.25 * fs) * (1.0 - 0.5 / sample.later)))
}

/// Drift rate from Fs, inverted exactly: 1 - (1 - Fs')^(1/t), also for a negative Fs'.
///
/// `None` as for [`drift_rate_fc`], and when Fs' is 1 or more: no drift explains that much change.
pub fn drift_rate_fs(fs: f64, sample: &TemporalSample) -> Option<f64> {
    let corrected = corrected_fs(fs, sample)?;
    (corrected < 1.0).then(|| -((-corrected).ln_1p() / sample.generations).exp_m1())
}

/// Drift rate from Fs by the linear approximation Fs'/t, which is below the exact one for positive
/// Fs' and more than one generation. `None` as for [`drift_rate_fc`].
pub fn drift_rate_fs_linear(fs: f64, sample: &TemporalSample) -> Option<f64> {
    Some(corrected_fs(fs, sample)? / sample.generations)
}

/// Limits of the true F around a measured one: n'F over the chi-square quantiles with n'
/// (`independent_alleles`) degrees of freedom, lowest first (Waples 1989). Too narrow where loci are
/// linked or share a pedigree.
///
/// `None` unless `level` lies between 0 and 1 and there is at least some independent allele.
pub fn chi_square_limits(f: f64, independent_alleles: f64, level: f64) -> Option<[f64; 2]> {
    if !(level > 0.0 && level < 1.0) {
        return None;
    }
    let distribution = ChiSquared::new(independent_alleles).ok()?;
    let [upper, lower] = [0.5 * (1.0 + level), 0.5 * (1.0 - level)]
        .map(|share| independent_alleles * f / distribution.inverse_cdf(share));
    Some([upper, lower])
}

#[cfg(test)]
mod tests {
    use super::*;

    const SAMPLE: TemporalSample = TemporalSample {
        first: 25.0,
        later: 30.0,
        generations: 4.0,
        plan: SamplingPlan::Two,
        census: None,
    };

    #[test]
    fn what_an_estimate_needs_and_lacks_makes_it_absent() {
        let rates = |sample: TemporalSample| {
            [
                drift_rate_fc,
                drift_rate_fk,
                drift_rate_fs,
                drift_rate_fs_linear,
            ]
            .map(|rate| rate(0.1, &sample))
        };
        assert_eq!(
            rates(TemporalSample {
                later: 0.0,
                ..SAMPLE
            }),
            [None; 4]
        );
        assert_eq!(
            rates(TemporalSample {
                generations: 0.0,
                ..SAMPLE
            }),
            [None; 4]
        );
        assert_eq!(
            rates(TemporalSample {
                plan: SamplingPlan::One,
                ..SAMPLE
            }),
            [None; 4]
        );
        assert!(rates(SAMPLE).iter().all(Option::is_some));
        assert_eq!(drift_rate_fs(3.9, &SAMPLE), None);
    }

    #[test]
    fn less_change_than_sampling_makes_is_a_negative_rate() {
        for rate in [
            drift_rate_fc,
            drift_rate_fk,
            drift_rate_fs,
            drift_rate_fs_linear,
        ] {
            assert!(rate(0.0, &SAMPLE).unwrap() < 0.0);
        }
    }

    #[test]
    fn the_exact_inversion_gives_back_the_rate() {
        // The Fs that is expected at Ne = 50, by solving the correction for Fs.
        let drift = 1.0 - (1.0f64 - 0.01).powi(4);
        let sampling = 0.5 / 25.0 + 0.5 / 30.0;
        let below = drift * (1.0 - 0.5 / 30.0);
        let fs = (below + sampling) / (1.0 - 0.25 * sampling - 0.25 * below);
        assert!((drift_rate_fs(fs, &SAMPLE).unwrap() - 0.01).abs() < 1e-14);
    }

    #[test]
    fn limits_need_a_level_and_alleles() {
        assert_eq!(chi_square_limits(0.1, 7.0, 1.0), None);
        assert_eq!(chi_square_limits(0.1, 0.0, 0.95), None);
        let [low, high] = chi_square_limits(0.1, 200_000.0, 0.95).unwrap();
        assert!(low < 0.1 && high > 0.1 && high - low < 0.002);
    }
}
