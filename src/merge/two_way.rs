//! Sums of terms over loci, ready to leave out any block of loci or any one individual.

use std::marker::PhantomData;
use std::ops::Range;

use super::fixed::{BATCH_LOCI, from_fixed, to_fixed};
use super::windows::{Blocking, Windows};
use crate::locus::Terms;

/// Sums of the terms `T` over loci: in all, by genome window, and what each individual's absence
/// would change. Merging is associative and commutative; an empty one is the identity.
#[derive(Debug, Clone, PartialEq)]
pub struct TwoWay<T> {
    total: Vec<i128>,
    windows: Windows,
    /// By individual, then term: the sum over loci of (terms without the individual - terms).
    absences: Vec<i128>,
    groups: Vec<Range<usize>>,
    batch: Batch,
    kind: PhantomData<T>,
}

/// Sums of the loci since the last flush, in i64.
#[derive(Debug, Clone, PartialEq)]
struct Batch {
    loci: u32,
    place: Option<(u64, u64)>,
    window: Vec<i64>,
    absences: Vec<i64>,
}

impl<T: Terms> TwoWay<T> {
    /// Empty sums. `groups`: the individuals by independent sample (one range a stratum), counted
    /// from 0; `most_windows`: the bound of [`Windows`].
    pub fn new(groups: Vec<Range<usize>>, most_windows: usize) -> Self {
        let individuals = groups.last().map_or(0, |g| g.end);
        TwoWay {
            total: vec![0; T::LEN],
            windows: Windows::new(T::LEN, most_windows),
            absences: vec![0; individuals * T::LEN],
            groups,
            batch: Batch {
                loci: 0,
                place: None,
                window: vec![0; T::LEN],
                absences: vec![0; individuals * T::LEN],
            },
            kind: PhantomData,
        }
    }

    /// Adds a locus with its terms; returns them in fixed point for [`TwoWay::absence_row`].
    pub fn add(&mut self, contig_hash: u64, position: u64, terms: &T, fixed: &mut [i64]) {
        write_fixed(terms, fixed);
        let key = self.windows.key(contig_hash, position);
        let same_window = self
            .batch
            .place
            .is_some_and(|(c, p)| self.windows.key(c, p) == key);
        if !same_window {
            self.flush_window();
            self.batch.place = Some((contig_hash, position));
        }
        if self.batch.loci == BATCH_LOCI {
            self.flush();
            self.batch.place = Some((contig_hash, position));
        }
        self.batch.loci += 1;
        for (sum, &term) in self.batch.window.iter_mut().zip(fixed.iter()) {
            *sum = sum.wrapping_add(term);
        }
    }

    /// The change of the terms when one individual is left out, as a row for [`TwoWay::add_absences`].
    pub fn absence_row(without: &T, with: &[i64], row: &mut [i64]) {
        write_fixed(without, row);
        for (r, w) in row.iter_mut().zip(with) {
            *r = r.wrapping_sub(*w);
        }
    }

    /// Adds, for the individuals from `first` on, the row of each one's genotype class. Missing
    /// genotypes have a class whose row is zero.
    ///
    /// `rows` holds one row of [`Terms::LEN`] numbers a class. The sums stay inside i64 by the bound
    /// of [`BATCH_LOCI`], so plain wrapping addition is exact.
    pub fn add_absences<C: Copy + Into<usize>>(
        &mut self,
        first: usize,
        classes: &[C],
        rows: &[i64],
    ) {
        let width = T::LEN;
        let sums = &mut self.batch.absences[first * width..(first + classes.len()) * width];
        for (sum, &class) in sums.chunks_exact_mut(width).zip(classes) {
            let class: usize = class.into();
            let row = &rows[class * width..class * width + width];
            for (s, r) in sum.iter_mut().zip(row) {
                *s = s.wrapping_add(*r);
            }
        }
    }

    /// Adds other sums over the same individuals.
    pub fn merge(&mut self, mut other: TwoWay<T>) {
        self.flush();
        other.flush();
        for (a, b) in self.total.iter_mut().zip(&other.total) {
            *a += b;
        }
        for (a, b) in self.absences.iter_mut().zip(&other.absences) {
            *a += b;
        }
        self.windows.merge(other.windows);
    }

    /// Moves what has been added into the totals; must be called before reading.
    pub fn flush(&mut self) {
        self.flush_window();
        for (total, sum) in self.absences.iter_mut().zip(&mut self.batch.absences) {
            *total += i128::from(std::mem::take(sum));
        }
        self.batch.loci = 0;
    }

    fn flush_window(&mut self) {
        if let Some((contig_hash, position)) = self.batch.place.take() {
            self.windows.add(contig_hash, position, &self.batch.window);
            for (total, sum) in self.total.iter_mut().zip(&mut self.batch.window) {
                *total += i128::from(std::mem::take(sum));
            }
        }
    }

    /// Individuals by independent sample.
    pub fn groups(&self) -> &[Range<usize>] {
        &self.groups
    }

    /// The sums over all loci.
    pub fn total(&self) -> T {
        read_fixed(self.total.iter().copied())
    }

    /// The cut of the genome into the blocks of [`TwoWay::blocks`].
    pub fn blocking(&self) -> Blocking {
        self.windows.blocking()
    }

    /// For each jackknife block, the sums of its own loci and the sums without them.
    pub fn blocks(&self) -> Vec<(T, T)> {
        let without = |block: &[i128]| {
            read_fixed(
                self.total
                    .iter()
                    .zip(block)
                    .map(|(total, part)| total - part),
            )
        };
        self.windows
            .blocks()
            .iter()
            .map(|b| (read_fixed(b.iter().copied()), without(b)))
            .collect()
    }

    /// The sums without one individual: exactly what a recount without it would give.
    pub fn without_individual(&self, individual: usize) -> T {
        let change = &self.absences[individual * T::LEN..(individual + 1) * T::LEN];
        read_fixed(
            self.total
                .iter()
                .zip(change)
                .map(|(total, change)| total + change),
        )
    }
}

fn write_fixed<T: Terms>(terms: &T, fixed: &mut [i64]) {
    let mut values = [0.0; 64];
    let values = &mut values[..T::LEN];
    terms.write(values);
    for (f, v) in fixed.iter_mut().zip(values) {
        *f = to_fixed(*v);
    }
}

fn read_fixed<T: Terms>(sums: impl Iterator<Item = i128>) -> T {
    let mut values = [0.0; 64];
    for (value, sum) in values.iter_mut().zip(sums) {
        *value = from_fixed(sum);
    }
    T::read(&values[..T::LEN])
}
