//! Sums of terms over loci, ready to leave out any block of loci or any one individual.

use std::marker::PhantomData;
use std::ops::Range;

use serde::{Deserialize, Serialize};

use super::bounds;
use super::fixed::{BATCH_LOCI, from_fixed};
use super::windows::{Blocking, Windows};
use crate::locus::{GenotypeClasses, Terms};

/// Sums of the terms `T` over loci: in all, by genome window, and what each individual's absence
/// would change. Merging is associative and commutative; an empty one is the identity.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(bound = "")]
pub struct TwoWay<T> {
    total: Vec<i128>,
    windows: Windows,
    /// By individual, then term: the sum over loci of (terms without the individual - terms).
    absences: Vec<i128>,
    groups: Vec<Range<usize>>,
    #[serde(skip)]
    batch: Batch,
    #[serde(skip)]
    kind: PhantomData<T>,
}

/// Sums of the loci since the last flush, in i64.
#[derive(Debug, Clone, PartialEq, Default)]
struct Batch {
    loci: u32,
    place: Option<(u64, u64)>,
    window: Vec<i64>,
    /// By group: what is to be added to each of its individuals.
    common: Vec<i64>,
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
            batch: Batch {
                loci: 0,
                place: None,
                window: vec![0; T::LEN],
                common: vec![0; groups.len() * T::LEN],
                absences: vec![0; individuals * T::LEN],
            },
            groups,
            kind: PhantomData,
        }
    }

    /// Adds a locus with its terms in fixed point.
    pub fn add(&mut self, contig_hash: u64, position: u64, fixed: &[i64]) {
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
        for (sum, &term) in self.batch.window.iter_mut().zip(fixed) {
            *sum = sum.wrapping_add(term);
        }
    }

    /// Adds, for the individuals of a group, what the absence of each would change: the row of its
    /// genotype class. `rows` holds a row of [`Terms::LEN`] numbers a class and one for missing
    /// genotypes; it is spent.
    ///
    /// The row of the commonest class goes to the whole group once, and the others add what theirs has
    /// beside it. The sums stay inside i64 by the bound of [`BATCH_LOCI`], so plain wrapping addition is
    /// exact.
    pub fn add_absences(&mut self, group: usize, classes: &GenotypeClasses, rows: &mut [i64]) {
        let width = T::LEN;
        let common = &mut self.batch.common[group * width..(group + 1) * width];
        let commonest = classes.commonest * width..(classes.commonest + 1) * width;
        for (sum, &r) in common.iter_mut().zip(&rows[commonest.clone()]) {
            *sum = sum.wrapping_add(r);
        }
        let (before, from) = rows.split_at_mut(commonest.start);
        let (shared, after) = from.split_at_mut(width);
        for row in before
            .chunks_exact_mut(width)
            .chain(after.chunks_exact_mut(width))
        {
            for (r, s) in row.iter_mut().zip(shared.iter()) {
                *r = r.wrapping_sub(*s);
            }
        }
        let group = self.groups[group].clone();
        let sums = &mut self.batch.absences[group.start * width..group.end * width];
        for &(individual, class) in &classes.others {
            let at = individual as usize * width;
            let row = usize::from(class) * width;
            for (s, r) in sums[at..at + width].iter_mut().zip(&rows[row..row + width]) {
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
        let width = T::LEN;
        for (group, common) in self
            .groups
            .iter()
            .zip(self.batch.common.chunks_exact_mut(width))
        {
            let cells = group.start * width..group.end * width;
            let totals = self.absences[cells.clone()].chunks_exact_mut(width);
            for (totals, sums) in totals.zip(self.batch.absences[cells].chunks_exact_mut(width)) {
                for ((total, sum), common) in totals.iter_mut().zip(sums).zip(common.iter()) {
                    *total += i128::from(std::mem::take(sum).wrapping_add(*common));
                }
            }
            common.fill(0);
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

    /// Whether both hold sums of the same terms over the same individuals.
    pub(super) fn same_shape(&self, other: &TwoWay<T>) -> bool {
        self.groups == other.groups
            && self.total.len() == other.total.len()
            && self.absences.len() == other.absences.len()
            && self.windows.same_shape(&other.windows)
    }

    /// Whether the sums can be added up further.
    pub(super) fn is_bounded(&self) -> bool {
        bounds::terms(self.total.iter().chain(&self.absences)) && self.windows.is_bounded()
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

fn read_fixed<T: Terms>(sums: impl Iterator<Item = i128>) -> T {
    let mut values = [0.0; 64];
    for (value, sum) in values.iter_mut().zip(sums) {
        *value = from_fixed(sum);
    }
    T::read(&values[..T::LEN])
}
