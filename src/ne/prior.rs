//! The spectrum of allele frequencies, from the baseline counts.
//!
//! A flat prior is wrong as soon as rare alleles abound, and then says "missed" of alleles that are
//! lost. Beta(a, b) is fitted to the baseline counts of all loci, given that each is polymorphic in
//! its baseline sample: loci that nobody saw vary cannot be counted.

use std::collections::BTreeMap;

use super::jacobi::ln_beta;
use super::likelihood::BetaPrior;

/// Shapes are sought between these: narrower spectra than Beta(200, 200) or wider than Beta(.01, .01)
/// cannot be told from them.
const BOUNDS: [f64; 2] = [0.01, 200.0];
/// The search ends when its corners agree to this in log-likelihood.
const TOLERANCE: f64 = 1e-9;
/// Steps of the search; it takes about 80.
const MOST_STEPS: usize = 500;

/// A fitted spectrum.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FittedPrior {
    /// The prior.
    pub prior: BetaPrior,
    /// Loci used: polymorphic in the baseline sample.
    pub loci: u64,
    /// Whether a shape lies on the edge of what is searched.
    pub at_edge: bool,
}

/// Fits Beta(a, b) to (copies, copies typed) of one allele a locus by maximum likelihood: the
/// beta-binomial over 1 - P(0) - P(n). Counts of 0 and of n are passed over. `None` where no locus
/// is polymorphic in at least three copies.
///
/// The allele counted must be chosen without regard to its count, for instance the first one listed
/// as alternate; the others then have the prior with its shapes exchanged.
pub fn fit_prior(counts: impl IntoIterator<Item = (u32, u32)>) -> Option<FittedPrior> {
    fit_prior_to_classes(counts.into_iter().map(|(x, n)| (x, n, 1)))
}

/// The same from (copies, copies typed, loci).
pub fn fit_prior_to_classes(
    classes: impl IntoIterator<Item = (u32, u32, u64)>,
) -> Option<FittedPrior> {
    let mut distinct: BTreeMap<(u32, u32), u64> = BTreeMap::new();
    for (x, n, loci) in classes {
        if x > 0 && x < n && n > 2 {
            let sum = distinct.entry((n, x)).or_default();
            *sum = sum.saturating_add(loci);
        }
    }
    let loci = distinct
        .values()
        .fold(0u64, |sum, &n| sum.saturating_add(n));
    if loci == 0 {
        return None;
    }
    let [low, high] = BOUNDS.map(f64::ln);
    let cost = |at: [f64; 2]| {
        let inside = at.map(|v| v.clamp(low, high));
        // Outside, the cost at the edge plus a slope back in.
        let out: f64 = at.iter().zip(&inside).map(|(v, i)| (v - i).abs()).sum();
        -log_likelihood(&distinct, inside.map(f64::exp)) / loci as f64 + out
    };
    let best = nelder_mead(cost).map(|v| v.clamp(low, high));
    let at_edge = best.iter().any(|&v| v - low < 1e-3 || high - v < 1e-3);
    let [a, b] = best.map(f64::exp);
    Some(FittedPrior {
        prior: BetaPrior { a, b },
        loci,
        at_edge,
    })
}

fn log_likelihood(counts: &BTreeMap<(u32, u32), u64>, [a, b]: [f64; 2]) -> f64 {
    let whole = ln_beta(a, b);
    let mut sum = 0.0;
    let mut polymorphic = (0, 0.0);
    for (&(n, x), &times) in counts {
        let (n_f, x_f) = (f64::from(n), f64::from(x));
        if polymorphic.0 != n {
            let none = (ln_beta(a, b + n_f) - whole).exp();
            let all = (ln_beta(a + n_f, b) - whole).exp();
            // Where nearly every locus is monomorphic rounding may leave nothing of the difference.
            polymorphic = (n, (1.0 - none - all).max(1e-15).ln());
        }
        let log = ln_beta(a + x_f, b + n_f - x_f) - whole - polymorphic.1;
        sum += times as f64 * log;
    }
    sum
}

/// Lowest point of a function of two numbers near (0, 0) (Nelder & Mead 1965, Comput J 7:308-313).
fn nelder_mead(cost: impl Fn([f64; 2]) -> f64) -> [f64; 2] {
    let mut corners: Vec<([f64; 2], f64)> = [[0.0, 0.0], [-1.0, 0.0], [0.0, -1.0]]
        .map(|at| (at, cost(at)))
        .to_vec();
    let towards = |from: [f64; 2], to: [f64; 2], share: f64| {
        [
            from[0] + share * (to[0] - from[0]),
            from[1] + share * (to[1] - from[1]),
        ]
    };
    for _ in 0..MOST_STEPS {
        corners.sort_by(|x, y| x.1.total_cmp(&y.1));
        let width = (0..2)
            .map(|i| {
                (corners[2].0[i] - corners[0].0[i])
                    .abs()
                    .max((corners[1].0[i] - corners[0].0[i]).abs())
            })
            .fold(0.0, f64::max);
        if corners[2].1 - corners[0].1 < TOLERANCE && width < 1e-5 {
            break;
        }
        let middle = towards(corners[0].0, corners[1].0, 0.5);
        let try_at = |share: f64| {
            let at = towards(middle, corners[2].0, share);
            (at, cost(at))
        };
        let mirrored = try_at(-1.0);
        if mirrored.1 < corners[0].1 {
            let further = try_at(-2.0);
            corners[2] = if further.1 < mirrored.1 {
                further
            } else {
                mirrored
            };
        } else if mirrored.1 < corners[1].1 {
            corners[2] = mirrored;
        } else {
            let nearer = try_at(if mirrored.1 < corners[2].1 { -0.5 } else { 0.5 });
            if nearer.1 < corners[2].1.min(mirrored.1) {
                corners[2] = nearer;
            } else {
                let best = corners[0].0;
                for corner in &mut corners[1..] {
                    corner.0 = towards(best, corner.0, 0.5);
                    corner.1 = cost(corner.0);
                }
            }
        }
    }
    corners.sort_by(|x, y| x.1.total_cmp(&y.1));
    corners[0].0
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::ne::wright_fisher::founder_copies;

    /// Expected counts themselves as data: the likelihood is largest at the shapes that made them.
    #[test]
    fn finds_the_shapes_that_made_the_counts() {
        for (a, b) in [(1.0, 1.0), (0.2, 0.8), (0.1, 1.0), (0.3, 0.3), (3.0, 12.0)] {
            let counts = [50u32, 44].into_iter().flat_map(|n| {
                founder_copies(n, a, b)
                    .into_iter()
                    .enumerate()
                    .flat_map(move |(x, p)| {
                        let times = (p * 200_000.0).round() as usize;
                        std::iter::repeat_n((x as u32, n), times)
                    })
            });
            let fitted = fit_prior(counts).unwrap();
            assert!(
                (fitted.prior.a / a - 1.0).abs() < 0.02,
                "{a} {b} {fitted:?}"
            );
            assert!(
                (fitted.prior.b / b - 1.0).abs() < 0.02,
                "{a} {b} {fitted:?}"
            );
            assert!(!fitted.at_edge);
        }
    }

    #[test]
    fn odd_data_stay_within_bounds() {
        assert_eq!(fit_prior([(0, 40), (40, 40), (0, 0), (1, 2)]), None);
        for counts in [
            vec![(20, 40); 500],
            vec![(1, 40); 500],
            vec![(1, 3)],
            vec![(39, 40), (1, 40)],
        ] {
            let prior = fit_prior(counts).unwrap().prior;
            for shape in [prior.a, prior.b] {
                assert!(
                    (BOUNDS[0] * 0.999..=BOUNDS[1] * 1.001).contains(&shape),
                    "{prior:?}"
                );
            }
        }
    }
}
