//! Mid-p of loci with two alleles by look-up: in one stratum the same counts come back again and
//! again, and a row of the distribution serves all its numbers of heterozygotes.

use std::collections::HashMap;

use super::{Direction, Margins, TIE};
use crate::locus::Counts;

/// Values kept in all rows together: 8 MB of them. Beyond, all rows are dropped and begun anew.
const VALUE_BUDGET: usize = 1_000_000;

/// The test of one locus with two alleles as the streaming path needs it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MidP {
    /// Mid-p of the exact two-sided test.
    pub mid_p: f64,
    /// Which way the heterozygotes depart.
    pub direction: Direction,
}

/// Rows of mid-p by number of typed individuals and copies of the rarer allele.
///
/// A value never depends on what the cache holds: it is always read from a row, and a row is worked
/// out from its own key alone.
#[derive(Debug, Clone)]
pub struct HardyWeinbergCache {
    /// Where in `values` a row starts.
    starts: HashMap<(u32, u64), usize>,
    /// Mid-p by half the number of heterozygotes, row after row.
    values: Vec<f64>,
    budget: usize,
    weights: Vec<f64>,
    /// Weights from the rarest table to the commonest, with half their number of heterozygotes.
    ascending: Vec<(f64, usize)>,
    /// Sums of the weights before each place of `ascending`, and of all.
    sums: Vec<f64>,
}

impl Default for HardyWeinbergCache {
    fn default() -> Self {
        HardyWeinbergCache {
            starts: HashMap::new(),
            values: Vec::new(),
            budget: VALUE_BUDGET,
            weights: Vec::new(),
            ascending: Vec::new(),
            sums: Vec::new(),
        }
    }
}

impl HardyWeinbergCache {
    /// Mid-p and direction of a locus where exactly two alleles are seen. `None` otherwise: a fixed
    /// locus is no test, and more alleles need their genotypes
    /// ([`test_many_alleles`](super::test_many_alleles)).
    pub fn mid_p(&mut self, counts: &Counts) -> Option<MidP> {
        let mut seen = counts.copies.iter().copied().filter(|&copies| copies > 0);
        let (first, _second) = (seen.next()?, seen.next()?);
        if seen.next().is_some() {
            return None;
        }
        let margins = Margins::of(counts.typed, first)?;
        if !margins.allows(u64::from(counts.heterozygotes)) {
            return None;
        }
        let start = match self.starts.get(&(counts.typed, margins.minor())) {
            Some(&start) => start,
            None => self.make_row(counts.typed, &margins),
        };
        Some(MidP {
            mid_p: self.values[start + counts.heterozygotes as usize / 2],
            direction: Direction::of(counts.heterozygotes, counts.typed, margins.product()),
        })
    }

    /// Works out a row and returns its start.
    fn make_row(&mut self, typed: u32, margins: &Margins) -> usize {
        let length = margins.minor() as usize / 2 + 1;
        if self.values.len() + length > self.budget {
            self.starts.clear();
            self.values.clear();
        }
        self.weights.clear();
        self.weights.resize(length, 0.0);
        margins.visit(|h, weight| self.weights[h as usize / 2] = weight);
        self.sort_weights();
        let start = self.values.len();
        self.values.resize(start + length, 0.0);
        let all = self.sums[length];
        // The ties of a table are the window of weights within TIE of its own.
        let (mut from, mut to) = (0, 0);
        for &(weight, half) in &self.ascending {
            while self.ascending[from].0 < weight * (1.0 - TIE) {
                from += 1;
            }
            while to < length && self.ascending[to].0 <= weight * (1.0 + TIE) {
                to += 1;
            }
            let mid = 0.5 * (self.sums[from] + self.sums[to]);
            self.values[start + half] = (mid / all).min(1.0);
        }
        self.starts.insert((typed, margins.minor()), start);
        start
    }

    /// Fills `ascending` and `sums`. The distribution rises and then falls (its steps shrink all
    /// the way), so the rarest table left is always at one of its two ends.
    fn sort_weights(&mut self) {
        self.ascending.clear();
        self.sums.clear();
        self.sums.push(0.0);
        let (mut low, mut high) = (0, self.weights.len());
        let mut sum = 0.0;
        while low < high {
            let half = if self.weights[low] <= self.weights[high - 1] {
                low += 1;
                low - 1
            } else {
                high -= 1;
                high
            };
            sum += self.weights[half];
            self.ascending.push((self.weights[half], half));
            self.sums.push(sum);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::test_two_alleles;
    use super::*;

    fn sample(homozygotes: u32, heterozygotes: u32, others: u32) -> Counts {
        let copies = vec![2 * homozygotes + heterozygotes, 2 * others + heterozygotes];
        Counts {
            typed: homozygotes + heterozygotes + others,
            heterozygotes,
            copies,
            heterozygous: vec![heterozygotes; 2],
        }
    }

    #[test]
    fn a_look_up_is_the_test() {
        let mut cache = HardyWeinbergCache::default();
        let mut small = HardyWeinbergCache {
            budget: 20,
            ..HardyWeinbergCache::default()
        };
        for typed in 1..25 {
            for h in 0..=typed {
                for homozygotes in 0..=typed - h {
                    let counts = sample(homozygotes, h, typed - h - homozygotes);
                    let found = cache.mid_p(&counts);
                    assert_eq!(found, small.mid_p(&counts));
                    if counts.alleles_seen() < 2 {
                        assert_eq!(found, None);
                        continue;
                    }
                    let test = test_two_alleles(typed, counts.copies[1], h).unwrap();
                    let found = found.unwrap();
                    assert!((found.mid_p - test.mid_p).abs() < 1e-14, "{counts:?}");
                    let fewer = test.deficit < test.excess;
                    assert!(!fewer || found.direction == Direction::Deficit || test.mid_p > 0.2);
                }
            }
        }
        assert!(small.values.len() <= 20);
    }

    #[test]
    fn more_alleles_are_not_for_the_cache() {
        let three = Counts::of(3, [Some([0, 1]), Some([1, 2])]);
        assert_eq!(HardyWeinbergCache::default().mid_p(&three), None);
        let two_of_three = Counts::of(3, [Some([0, 2]), Some([2, 2])]);
        assert!(HardyWeinbergCache::default().mid_p(&two_of_three).is_some());
    }
}
