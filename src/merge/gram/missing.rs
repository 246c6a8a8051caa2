//! Sums over the individuals typed at loci with missing genotypes.
//!
//! Few genotypes are missing, so each locus adds what its missing ones take away: with e = 1 - m,
//! `sum w m_i m_j = sum w - sum w e_i - sum w e_j + sum w e_i e_j`, and `sum w e_i` is the diagonal
//! of the last sum. In integers the two sides are the same number.

use serde::{Deserialize, Serialize};

use super::super::bounds;
use super::sums::Triangle;
use super::{LocusRows, LocusWeights, TERM_BITS, WEIGHT_BITS, power_of_two};

/// Sums over loci with missing genotypes.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub(super) struct MissingSums {
    /// B and H, in units of 2^-WEIGHT_BITS.
    pub(super) b: TypedPairs,
    pub(super) h: TypedPairs,
    /// p and q, in units of 2^-TERM_BITS.
    pub(super) p: Typed,
    pub(super) q: Typed,
    /// Weights of the loci at which each individual is typed.
    pub(super) typed: Typed,
}

impl MissingSums {
    pub(super) fn new(individuals: usize) -> Self {
        MissingSums {
            b: TypedPairs::new(individuals),
            h: TypedPairs::new(individuals),
            p: Typed::new(individuals),
            q: Typed::new(individuals),
            typed: Typed::new(individuals),
        }
    }

    /// Adds a locus; `absent` lists the individuals that are not typed at it.
    pub(super) fn add(&mut self, locus: &LocusRows<'_>, absent: &[usize]) {
        let weights = LocusWeights::of(locus.counts.typed, locus.weight());
        let term = |w: f64| (w * power_of_two(TERM_BITS)).round() as i128;
        let cell = |w: f64| (w * power_of_two(WEIGHT_BITS)).round() as i64;
        self.b.add(cell(weights.b), absent);
        self.h.add(cell(weights.h), absent);
        self.p.add(term(weights.a), absent);
        self.q.add(term(weights.b), absent);
        self.typed.add(i128::from(locus.weight()), absent);
    }

    pub(super) fn has_size(&self, n: usize) -> bool {
        let lists = [&self.p, &self.q, &self.typed];
        self.b.absent.has_size(n)
            && self.h.absent.has_size(n)
            && lists.iter().all(|list| list.absent.len() == n)
    }

    pub(super) fn is_bounded(&self) -> bool {
        let pairs = [&self.b, &self.h];
        let lists = [&self.p, &self.q, &self.typed];
        pairs
            .iter()
            .all(|sums| bounds::fine([&sums.all]) && sums.absent.is_bounded())
            && lists
                .iter()
                .all(|sums| bounds::fine(sums.absent.iter().chain([&sums.all])))
    }

    pub(super) fn merge(&mut self, other: &MissingSums) {
        self.b.merge(&other.b);
        self.h.merge(&other.h);
        self.p.merge(&other.p);
        self.q.merge(&other.q);
        self.typed.merge(&other.typed);
    }
}

/// By individual, the sum of the weights of the loci at which it is typed.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub(super) struct Typed {
    all: i128,
    absent: Vec<i128>,
}

impl Typed {
    fn new(individuals: usize) -> Self {
        Typed {
            all: 0,
            absent: vec![0; individuals],
        }
    }

    fn add(&mut self, weight: i128, absent: &[usize]) {
        self.all += weight;
        absent.iter().for_each(|&i| self.absent[i] += weight);
    }

    fn merge(&mut self, other: &Typed) {
        self.all += other.all;
        for (a, b) in self.absent.iter_mut().zip(&other.absent) {
            *a += b;
        }
    }

    /// The sum of one individual.
    pub(super) fn of(&self, individual: usize) -> i128 {
        self.all - self.absent[individual]
    }
}

/// By pair of individuals, the sum of the weights of the loci at which both are typed.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub(super) struct TypedPairs {
    all: i128,
    /// The loci at which neither is typed; on the diagonal, those at which one is not.
    absent: Triangle,
}

impl TypedPairs {
    fn new(individuals: usize) -> Self {
        TypedPairs {
            all: 0,
            absent: Triangle::new(individuals),
        }
    }

    fn add(&mut self, weight: i64, absent: &[usize]) {
        self.all += i128::from(weight);
        self.absent.add_square(absent, weight);
    }

    fn merge(&mut self, other: &TypedPairs) {
        self.all += other.all;
        self.absent.merge(&other.absent);
    }

    /// Adds the sums to others in the layout of [`Triangle`].
    pub(super) fn add_to(&self, sums: &mut [i128]) {
        let size = self.absent.size();
        let mut cells = vec![0; sums.len()];
        self.absent.add_to(&mut cells);
        let (alone, both) = cells.split_at(size);
        let (diagonal, above) = sums.split_at_mut(size);
        for (sum, absent) in diagonal.iter_mut().zip(alone) {
            *sum += self.all - absent;
        }
        let pairs = (0..size).flat_map(|i| (i + 1..size).map(move |j| (i, j)));
        for ((sum, both), (i, j)) in above.iter_mut().zip(both).zip(pairs) {
            *sum += self.all - alone[i] - alone[j] + both;
        }
    }
}
