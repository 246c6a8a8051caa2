//! p values of any number of tests in bounded memory, and the false discovery rate over them.

use serde::{Deserialize, Serialize};

use super::bounds::{self, MOST_LOCI};
use crate::locus::hardy_weinberg::Direction;

/// Bits of the fraction of a double that a bin drops: 8 are kept, so each octave has 256 bins and
/// rounding up changes p by less than 0.4 %.
const DROPPED_BITS: u32 = 44;
/// Lower limit of the scale: 2^-60. A smaller p is rounded up to it.
const SMALLEST: f64 = 1.0 / (1u64 << 60) as f64;
/// Bins: 60 octaves of 256, and one for 1 itself.
const BINS: usize = 60 * 256 + 1;

/// How many tests had which p, for deficits and excesses of heterozygotes apart. Counts only, so
/// merging in any order gives the same.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct PValueHistogram {
    deficit: Vec<u64>,
    excess: Vec<u64>,
}

impl Default for PValueHistogram {
    fn default() -> Self {
        PValueHistogram {
            deficit: vec![0; BINS],
            excess: vec![0; BINS],
        }
    }
}

/// Tests made and rejected at some false discovery rate.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub struct Rejections {
    /// Tests made.
    pub tested: u64,
    /// Rejected for a deficit of heterozygotes.
    pub deficit: u64,
    /// Rejected for an excess of heterozygotes.
    pub excess: u64,
}

impl Rejections {
    /// All rejected.
    pub fn rejected(&self) -> u64 {
        self.deficit + self.excess
    }
}

impl PValueHistogram {
    /// Adds one test with `p` in 0..=1.
    pub fn add(&mut self, p: f64, direction: Direction) {
        self.side(direction)[bin(p)] += 1;
    }

    /// Whether both have the same bins.
    pub(super) fn same_shape(&self, other: &PValueHistogram) -> bool {
        self.deficit.len() == other.deficit.len() && self.excess.len() == other.excess.len()
    }

    /// Whether there are no more tests than loci can be.
    pub(super) fn is_bounded(&self) -> bool {
        bounds::add_up(self.deficit.iter().chain(&self.excess), MOST_LOCI)
    }

    /// Adds all tests of another histogram; commutative and associative, with the default as
    /// identity.
    pub fn merge(&mut self, other: &PValueHistogram) {
        for direction in [Direction::Deficit, Direction::Excess] {
            let theirs = other.counts(direction);
            self.side(direction)
                .iter_mut()
                .zip(theirs)
                .for_each(|(own, their)| *own += their);
        }
    }

    /// Number of tests by bin.
    pub fn counts(&self, direction: Direction) -> &[u64] {
        match direction {
            Direction::Deficit => &self.deficit,
            Direction::Excess => &self.excess,
        }
    }

    /// Adds `tests` tests to bin `bin`, as [`PValueHistogram::counts`] numbers them. `None`, with
    /// nothing added, when there is no such bin.
    pub fn add_to_bin(&mut self, bin: usize, direction: Direction, tests: u64) -> Option<()> {
        *self.side(direction).get_mut(bin)? += tests;
        Some(())
    }

    /// Number of tests.
    pub fn tested(&self) -> u64 {
        self.deficit.iter().chain(&self.excess).sum()
    }

    /// Rejections by the step-up rule of Benjamini & Hochberg (1995, J R Stat Soc B 57:289-300) at
    /// false discovery rate `rate`, each p rounded up to the edge of its bin. That can only lose
    /// rejections, and only of a p within 0.4 % of the limit.
    pub fn rejections(&self, rate: f64) -> Rejections {
        let tested = self.tested();
        let mut running = Rejections {
            tested,
            ..Rejections::default()
        };
        let mut rejections = running;
        for bin in 0..BINS {
            running.deficit += self.deficit[bin];
            running.excess += self.excess[bin];
            if edge(bin) * tested as f64 <= rate * running.rejected() as f64 {
                rejections = running;
            }
        }
        rejections
    }

    fn side(&mut self, direction: Direction) -> &mut [u64] {
        match direction {
            Direction::Deficit => &mut self.deficit,
            Direction::Excess => &mut self.excess,
        }
    }
}

/// The bin with the lowest edge that is not below `p`. The bits of positive doubles are in the order
/// of their values, so rounding up is done on them.
fn bin(p: f64) -> usize {
    let p = p.clamp(SMALLEST, 1.0);
    let up = p.to_bits() + ((1 << DROPPED_BITS) - 1);
    ((up >> DROPPED_BITS) - (SMALLEST.to_bits() >> DROPPED_BITS)) as usize
}

/// Upper edge of a bin.
fn edge(bin: usize) -> f64 {
    f64::from_bits(((SMALLEST.to_bits() >> DROPPED_BITS) + bin as u64) << DROPPED_BITS)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bins_round_up_by_less_than_half_a_percent() {
        assert_eq!(
            (bin(1.0), edge(BINS - 1), edge(0)),
            (BINS - 1, 1.0, SMALLEST)
        );
        assert_eq!((bin(0.0), bin(1e-300), bin(SMALLEST)), (0, 0, 0));
        let mut p = 1.0;
        while p > SMALLEST {
            let up = edge(bin(p));
            assert!(up >= p && up < p * 1.004, "{p} {up}");
            assert_eq!(bin(up), bin(p));
            p *= 0.993;
        }
    }

    #[test]
    fn no_test_no_rejection() {
        assert_eq!(
            PValueHistogram::default().rejections(0.05),
            Rejections::default()
        );
    }

    #[test]
    fn merging_is_adding() {
        let mut all = PValueHistogram::default();
        let mut parts = [PValueHistogram::default(), PValueHistogram::default()];
        for (i, p) in [0.2, 1e-9, 0.2, 0.7, 0.0].into_iter().enumerate() {
            let direction = if i == 1 {
                Direction::Excess
            } else {
                Direction::Deficit
            };
            all.add(p, direction);
            parts[i % 2].add(p, direction);
        }
        let [mut merged, second] = parts;
        merged.merge(&second);
        assert_eq!(merged, all);
        let mut copy = PValueHistogram::default();
        for direction in [Direction::Deficit, Direction::Excess] {
            for (bin, &tests) in all.counts(direction).iter().enumerate() {
                copy.add_to_bin(bin, direction, tests).unwrap();
            }
        }
        assert_eq!(copy, all);
        assert_eq!(copy.add_to_bin(BINS, Direction::Excess, 1), None);
        assert_eq!(
            all.rejections(0.05),
            Rejections {
                tested: 5,
                deficit: 1,
                excess: 1
            }
        );
    }
}
