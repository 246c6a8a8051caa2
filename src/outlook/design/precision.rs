//! Precision of estimates of effective size, by the formulas of the trade.
//!
//! They count loci as if each drifted on its own and in a pedigree of its own. Loci share both, so
//! with many loci the real precision is worse: these are bounds that no design of that size beats.

use crate::ne::linkage::{
    Mating, effective_size, excess_of, expected_by_sampling, parametric_interval,
};
use crate::ne::temporal::chi_square_limits;

/// What a design leads one to expect.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Expected {
    /// Coefficient of variation of the estimate of 1/Ne; Ne itself has no finite moments.
    pub cv: f64,
    /// The signal: F (temporal) or r2 (linkage).
    pub signal: f64,
    /// Interval of Ne at that signal; `None` at the top is unbounded.
    pub interval: Option<(f64, Option<f64>)>,
}

/// A temporal design.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Temporal {
    /// Independent alleles: over loci, alleles less one.
    pub independent_alleles: f64,
    /// Individuals at the first visit.
    pub first: f64,
    /// Individuals at the later visit.
    pub later: f64,
    /// Generations between them.
    pub generations: f64,
    /// True effective size.
    pub effective_size: f64,
}

impl Temporal {
    /// 2Ne/(tS), S the harmonic mean of the samples: sampling's share of the signal over drift's.
    fn noise(&self) -> f64 {
        let samples = 2.0 / (1.0 / self.first + 1.0 / self.later);
        2.0 * self.effective_size / (self.generations * samples)
    }
}

/// Two visits: E F = 1/(2S0) + 1/(2St) + t/(2Ne), CV = sqrt(2/n') (1 + 2Ne/(tS)), limits by
/// chi-square (Nei & Tajima 1981; Waples 1989).
pub fn temporal(design: &Temporal, level: f64) -> Expected {
    let sampling = 0.5 / design.first + 0.5 / design.later;
    let signal = sampling + design.generations / (2.0 * design.effective_size);
    let limits = chi_square_limits(signal, design.independent_alleles, level);
    let size = |f: f64| {
        let drift = f - sampling;
        (drift > 0.0).then(|| design.generations / (2.0 * drift))
    };
    Expected {
        cv: (2.0 / design.independent_alleles).sqrt() * (1.0 + design.noise()),
        signal,
        interval: limits.and_then(|[low, high]| Some((size(high)?, size(low)))),
    }
}

/// One visit, by linkage between `comparisons` independent pairs of alleles under random mating:
/// CV = sqrt(2/n) (1 + 3Ne/S) (Hill 1981), E r2 and limits by Waples (2006).
pub fn linkage(comparisons: f64, individuals: f64, true_size: f64, level: f64) -> Expected {
    let mating = Mating::Random;
    let sampling = expected_by_sampling(individuals);
    let signal = sampling + excess_of(true_size, individuals, mating);
    let size = |r: f64| effective_size(r - sampling, individuals, mating);
    let limits = parametric_interval(signal, comparisons, level);
    Expected {
        cv: (2.0 / comparisons).sqrt() * (1.0 + 3.0 * true_size / individuals),
        signal,
        interval: limits.and_then(|(low, high)| Some((size(high)?, size(low)))),
    }
}

/// Independent alleles needed for a CV of 1/Ne with the samples of a design: 2 [(1 + 2Ne/(tS))/CV]^2,
/// rounded up.
pub fn loci_for_cv(design: &Temporal, cv: f64) -> f64 {
    round_up(2.0 * ((1.0 + design.noise()) / cv).powi(2))
}

/// Individuals needed at each visit for a CV of 1/Ne with so many independent alleles, rounded up;
/// `None` where no number reaches it.
pub fn individuals_for_cv(design: &Temporal, cv: f64) -> Option<f64> {
    let spare = cv / (2.0 / design.independent_alleles).sqrt() - 1.0;
    (spare > 0.0)
        .then(|| round_up(2.0 * design.effective_size / (design.generations * spare)).max(1.0))
}

/// Rounds up, forgiving the last digits of a number that should be whole.
fn round_up(value: f64) -> f64 {
    (value * (1.0 - 1e-12)).ceil()
}

/// Chance that none of the individuals carries an allele of frequency p, with inbreeding f:
/// [(1 - p)^2 + f p (1 - p)]^n.
pub fn missed(frequency: f64, individuals: f64, inbreeding: f64) -> f64 {
    without(frequency, inbreeding).powf(individuals)
}

fn without(p: f64, f: f64) -> f64 {
    (1.0 - p) * (1.0 - p) + f * p * (1.0 - p)
}

/// Individuals that show an allele of frequency p with this probability: ln(1 - probability) over the
/// log of the chance that one individual lacks it, rounded up (Brown & Marshall 1995).
pub fn individuals_to_see(frequency: f64, probability: f64, inbreeding: f64) -> f64 {
    round_up((1.0 - probability).ln() / without(frequency, inbreeding).ln()).max(1.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn close(got: f64, want: f64) {
        assert!(
            (got - want).abs() <= 1e-7 * want.abs(),
            "{got} is not {want}"
        );
    }

    // Nei & Tajima (1981), Waples (1989) as arithmetic, with chi-square quantiles of another library.
    // (n', S0, St, t, Ne): E F, CV, interval.
    #[test]
    fn temporal_designs() {
        for (n, s0, st, t, ne, f, cv, low, high) in [
            (
                100.0,
                50.0,
                50.0,
                5.0,
                50.0,
                0.07,
                0.1979898987322333,
                33.6420544585605,
                Some(73.46778081480771),
            ),
            (
                20.0,
                30.0,
                30.0,
                1.0,
                100.0,
                0.03833333333333333,
                2.4244128727957577,
                10.728560863848003,
                None,
            ),
            (
                1000.0,
                30.0,
                30.0,
                10.0,
                500.0,
                0.043333333333333335,
                0.1937925580499818,
                355.5181241093496,
                Some(776.5018562628956),
            ),
            (
                1000.0,
                50.0,
                50.0,
                10.0,
                500.0,
                0.03,
                0.1341640786499874,
                390.21268451221187,
                Some(663.5888954150729),
            ),
        ] {
            let design = Temporal {
                independent_alleles: n,
                first: s0,
                later: st,
                generations: t,
                effective_size: ne,
            };
            let got = temporal(&design, 0.95);
            close(got.signal, f);
            close(got.cv, cv);
            let (got_low, got_high) = got.interval.unwrap();
            close(got_low, low);
            match (got_high, high) {
                (Some(got), Some(want)) => close(got, want),
                (got, want) => assert_eq!(got, want),
            }
        }
    }

    // Hill (1981) as arithmetic: (n, S, Ne).
    #[test]
    fn linkage_designs() {
        for (n, s, ne, cv) in [
            (190.0, 50.0, 50.0, 0.41039134083406165),
            (4950.0, 50.0, 100.0, 0.14070529413628968),
            (4950.0, 50.0, 500.0, 0.6231234454607114),
        ] {
            close(linkage(n, s, ne, 0.95).cv, cv);
        }
        // The interval at r2 = 0.0273 from 50 individuals and 190 comparisons: 24.4763 to 260.4091
        // (Waples 2006 as arithmetic); here from the size at which that r2 is expected.
        let got = linkage(190.0, 50.0, 53.18038, 0.95).interval.unwrap();
        assert!(
            (got.0 - 24.4763).abs() < 1e-3 && (got.1.unwrap() - 260.4091).abs() < 1e-2,
            "{got:?}"
        );
    }

    // Brown & Marshall (1995): 30 outbreeding individuals for p = 0.05; the others by the formula.
    #[test]
    fn individuals_that_show_an_allele() {
        let wanted = [
            (0.5, 3.0),
            (0.1, 15.0),
            (0.05, 30.0),
            (0.02, 75.0),
            (0.01, 150.0),
        ];
        for (p, n) in wanted {
            assert_eq!(individuals_to_see(p, 0.95, 0.0), n);
        }
        // Fully inbred individuals are one gamete each: 59 (Brown & Marshall 1995).
        assert_eq!(individuals_to_see(0.05, 0.95, 1.0), 59.0);
        for (p, n, chance) in [
            (0.05, 30.0, 0.046069798986951946),
            (0.01, 150.0, 0.04904089407128572),
            (0.1, 10.0, 0.12157665459056569),
        ] {
            close(missed(p, n, 0.0), chance);
        }
    }

    // Algebra: the inverse of the CV, 288 alleles for S = 50, t = 10, Ne = 500, CV = 0.25; and back.
    #[test]
    fn what_a_cv_takes() {
        let design = Temporal {
            independent_alleles: 288.0,
            first: 50.0,
            later: 50.0,
            generations: 10.0,
            effective_size: 500.0,
        };
        assert_eq!(loci_for_cv(&design, 0.25), 288.0);
        assert_eq!(individuals_for_cv(&design, 0.25), Some(50.0));
        let few = Temporal {
            independent_alleles: 20.0,
            ..design
        };
        assert_eq!(individuals_for_cv(&few, 0.25), None);
    }
}
