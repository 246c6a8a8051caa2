//! How one locus enters sums that can leave out any individual: its terms, and for each genotype class
//! of each stratum what the absence of one individual of that class changes.

use super::fixed::{lane_to_fixed, to_fixed};
use super::two_way::TwoWay;
use crate::locus::{GenotypeClasses, Lane, Terms};
use crate::model::Locus;

/// One locus on its way into the sums.
pub(super) struct Entry<'a> {
    pub(super) locus: &'a Locus,
    /// By stratum.
    pub(super) classes: &'a [GenotypeClasses],
    pub(super) buffers: &'a mut Buffers,
}

/// Reused numbers; hold nothing between loci.
#[derive(Debug, Clone, Default)]
pub(super) struct Buffers {
    fixed: Vec<i64>,
    rows: Vec<i64>,
}

impl Entry<'_> {
    /// Adds terms without any individual behind them.
    pub(super) fn add_terms<T: Terms>(&mut self, sums: &mut TwoWay<T>, terms: &T) {
        let Buffers { fixed, .. } = self.buffers;
        write_fixed(terms, fixed);
        sums.add(self.locus.contig_hash, self.locus.position, fixed);
    }

    /// Adds a locus to sums over the strata `members`. `terms` gives the terms of the whole, or without
    /// one individual of a class of a member (by their places in `members` and in its classes).
    pub(super) fn add<T: Terms>(
        &mut self,
        sums: &mut TwoWay<T>,
        members: &[usize],
        mut terms: impl FnMut(Option<(usize, usize)>) -> T,
    ) {
        self.add_terms(sums, &terms(None));
        let Buffers { fixed, rows } = self.buffers;
        let mut without = Vec::new();
        for (member, classes) in members.iter().map(|&s| &self.classes[s]).enumerate() {
            rows.clear();
            for (class, &(_, individuals)) in classes.classes.iter().enumerate() {
                if individuals > 0 {
                    write_fixed(&terms(Some((member, class))), &mut without);
                    rows.extend(without.iter().zip(&*fixed).map(|(w, f)| w.wrapping_sub(*f)));
                } else {
                    rows.resize(rows.len() + T::LEN, 0);
                }
            }
            rows.resize(rows.len() + T::LEN, 0);
            sums.add_absences(member, classes, rows);
        }
    }

    /// The same for a locus with two alleles, from a lane a term: the whole, then without one of each
    /// class of the first member, then of the second if there is one.
    pub(super) fn add_lanes<T: Terms>(
        &mut self,
        sums: &mut TwoWay<T>,
        members: &[usize],
        columns: &[&Lane],
    ) {
        let Buffers { fixed, rows } = self.buffers;
        let width = T::LEN;
        fixed.clear();
        rows.clear();
        rows.resize(2 * 4 * width, 0);
        for (term, column) in columns.iter().enumerate() {
            let lanes = lane_to_fixed(column);
            fixed.push(lanes[0]);
            for class in 0..3 {
                rows[class * width + term] = lanes[1 + class].wrapping_sub(lanes[0]);
                rows[(4 + class) * width + term] = lanes[4 + class].wrapping_sub(lanes[0]);
            }
        }
        sums.add(self.locus.contig_hash, self.locus.position, fixed);
        for ((member, rows), &s) in rows.chunks_exact_mut(4 * width).enumerate().zip(members) {
            sums.add_absences(member, &self.classes[s], rows);
        }
    }
}

fn write_fixed<T: Terms>(terms: &T, fixed: &mut Vec<i64>) {
    let mut values = [0.0; 64];
    let values = &mut values[..T::LEN];
    terms.write(values);
    fixed.clear();
    fixed.extend(values.iter().map(|&v| to_fixed(v)));
}
