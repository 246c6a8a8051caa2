//! From the breeders of one cohort to the effective size of a generation, where generations overlap
//! (Waples, Antao & Luikart 2014).

use crate::model::LifeHistory;

/// A linkage estimate of one cohort, adjusted for overlapping generations.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct BreedersPerGeneration {
    /// Nb/Ne.
    pub ratio: f64,
    /// Effective number of breeders of the cohort.
    pub breeders: f64,
    /// Effective size per generation.
    pub effective_size: f64,
}

/// Nb/Ne from age at maturity and adult life span, and from the variation of fecundity with age
/// where known. `None` unless both ages are positive.
pub fn breeders_per_generation(life: &LifeHistory) -> Option<f64> {
    let (span, maturity) = logarithms(life)?;
    Some(match life.fecundity_cv {
        None => 0.485 + 0.758 * (span - maturity),
        Some(cv) => 0.833 + 0.637 * span - 0.793 * maturity - 0.423 * cv,
    })
}

/// Adjusts the raw estimate of a sample from one cohort. `None` where the regressions leave their
/// range (a ratio or divisor not above 0) or an age is not positive.
///
/// For samples of mixed age there is no formula: the raw estimate is near Ne only when the sample
/// holds about as many cohorts as a generation has years, and too low otherwise.
pub fn adjust_for_overlap(raw: f64, life: &LifeHistory) -> Option<BreedersPerGeneration> {
    let (span, maturity) = logarithms(life)?;
    let divisor = match life.fecundity_cv {
        None => 1.103 - 0.245 * (span - maturity),
        Some(cv) => 0.991 - 0.206 * span + 0.256 * maturity + 0.137 * cv,
    };
    adjusted(raw, breeders_per_generation(life)?, divisor)
}

/// Adjusts the raw estimate where Nb/Ne itself is known.
pub fn adjust_with_known_ratio(raw: f64, ratio: f64) -> Option<BreedersPerGeneration> {
    adjusted(raw, ratio, 1.26 - 0.323 * ratio)
}

fn adjusted(raw: f64, ratio: f64, divisor: f64) -> Option<BreedersPerGeneration> {
    (ratio > 0.0 && divisor > 0.0).then(|| {
        let breeders = raw / divisor;
        BreedersPerGeneration {
            ratio,
            breeders,
            effective_size: breeders / ratio,
        }
    })
}

/// Decimal logarithms of adult life span and age at maturity.
fn logarithms(life: &LifeHistory) -> Option<(f64, f64)> {
    (life.adult_life_span > 0.0 && life.maturity > 0.0)
        .then(|| (life.adult_life_span.log10(), life.maturity.log10()))
}
