//! Exact tests of Hardy-Weinberg proportions, given the allele counts of one locus in one stratum.
//!
//! Tables are ordered by their probability. Tables within 1e-9 of the observed one's probability
//! are ties, and mid-p halves all of them.

mod cache;
mod many_alleles;
mod two_alleles;

pub use cache::{HardyWeinbergCache, MidP};
pub use many_alleles::{
    ManyAlleleTest, Method, SHUFFLES, TABLE_BUDGET, genotype_counts, test_many_alleles,
};
use two_alleles::Margins;
pub use two_alleles::{TwoAlleleTest, chi_square, heterozygote_distribution, test_two_alleles};

/// Relative difference up to which two probabilities are the same: far above the rounding of the
/// recursions, far below the difference of any two tables of samples that exist.
const TIE: f64 = 1e-9;

/// Which way the heterozygotes depart from their expectation.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Direction {
    /// Fewer heterozygotes than expected.
    Deficit,
    /// As many heterozygotes as expected, or more.
    Excess,
}

impl Direction {
    /// Of `heterozygotes` against the expectation `products`/(2n-1), where `products` is the sum of
    /// n_i n_j over pairs of alleles and `typed` is n. In whole numbers, so nothing is rounded.
    fn of(heterozygotes: u32, typed: u32, products: u64) -> Direction {
        let observed = u128::from(heterozygotes) * u128::from((2 * u64::from(typed)).max(1) - 1);
        if observed < u128::from(products) {
            Direction::Deficit
        } else {
            Direction::Excess
        }
    }
}

/// Expected homozygotes of an allele of `copies` copies among `typed` individuals, given the allele
/// counts: n_i (n_i - 1)/(2 (2n-1)) (Levene 1949, Ann Math Stat 20:91-94). `None` when nobody is
/// typed.
pub fn expected_homozygotes(typed: u32, copies: u32) -> Option<f64> {
    let copies = f64::from(copies);
    (typed > 0).then(|| copies * (copies - 1.0) / (2.0 * (2.0 * f64::from(typed) - 1.0)))
}

/// Expected heterozygotes of two alleles of `a` and `b` copies among `typed` individuals:
/// n_i n_j/(2n-1) (Levene 1949). `None` when nobody is typed.
pub fn expected_heterozygotes(typed: u32, a: u32, b: u32) -> Option<f64> {
    (typed > 0).then(|| f64::from(a) * f64::from(b) / (2.0 * f64::from(typed) - 1.0))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn direction_is_exact_at_the_expectation() {
        // 5 individuals, 3 and 7 copies: expectation 21/9, not a whole number.
        assert_eq!(Direction::of(1, 5, 21), Direction::Deficit);
        assert_eq!(Direction::of(3, 5, 21), Direction::Excess);
        // 2 individuals, 1 and 3 copies: expectation 1.
        assert_eq!(Direction::of(1, 2, 3), Direction::Excess);
        assert_eq!(Direction::of(0, 0, 0), Direction::Excess);
    }
}
