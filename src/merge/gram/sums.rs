//! The integer sums behind the matrices.

use std::collections::BTreeMap;

use super::{LocusWeights, Product, TERM_BITS, TypedRow, power_of_two};

/// Up to so many rows, sums of integers of at most 2^44 stay within i64.
const NARROW_ROWS: u64 = 1 << 18;

/// The sums of one contig, by set of cutoffs (a mask of bits).
#[derive(Debug, Clone, Default, PartialEq)]
pub(super) struct ContigSums {
    pub(super) bins: BTreeMap<u8, BinSums>,
}

impl ContigSums {
    pub(super) fn bin_mut(&mut self, mask: u8, individuals: usize) -> &mut BinSums {
        self.bins
            .entry(mask)
            .or_insert_with(|| BinSums::new(individuals))
    }

    pub(super) fn merge(&mut self, other: ContigSums) {
        for (mask, sums) in other.bins {
            match self.bins.entry(mask) {
                std::collections::btree_map::Entry::Vacant(place) => {
                    place.insert(sums);
                }
                std::collections::btree_map::Entry::Occupied(mut place) => {
                    place.get_mut().merge(sums);
                }
            }
        }
    }
}

/// The sums of the loci that pass one set of cutoffs.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct BinSums {
    /// G, in units of 2^(-2 VECTOR_BITS).
    pub(super) vectors: Triangle,
    /// Squared correlations of loci with themselves, in units of 2^(-4 VECTOR_BITS).
    pub(super) own: i128,
    /// By number typed: loci, their weights and their squared weights.
    pub(super) by_typed: Vec<TypedTally>,
    /// What only loci with missing genotypes need.
    pub(super) missing: Option<Box<MissingSums>>,
}

#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub(super) struct TypedTally {
    pub(super) loci: u64,
    pub(super) weight: u64,
    pub(super) squared_weight: u64,
}

impl BinSums {
    fn new(individuals: usize) -> Self {
        BinSums {
            vectors: Triangle::new(individuals),
            own: 0,
            by_typed: vec![TypedTally::default(); individuals + 1],
            missing: None,
        }
    }

    /// Counts a locus, with its squared correlation with itself.
    pub(super) fn add_locus(&mut self, typed: usize, weight: u64, own: i128) {
        self.own += own;
        let tally = &mut self.by_typed[typed];
        tally.loci += 1;
        tally.weight += weight;
        tally.squared_weight += weight * weight;
    }

    pub(super) fn add_vectors(&mut self, product: Product<'_>, rows: u64) {
        self.vectors.add(product, rows);
    }

    pub(super) fn missing_mut(&mut self, individuals: usize) -> &mut MissingSums {
        self.missing
            .get_or_insert_with(|| Box::new(MissingSums::new(individuals)))
    }

    fn merge(&mut self, other: BinSums) {
        self.vectors.merge(&other.vectors);
        self.own += other.own;
        for (mine, theirs) in self.by_typed.iter_mut().zip(&other.by_typed) {
            mine.loci += theirs.loci;
            mine.weight += theirs.weight;
            mine.squared_weight += theirs.squared_weight;
        }
        if let Some(theirs) = other.missing {
            match &mut self.missing {
                Some(mine) => mine.merge(&theirs),
                none => *none = Some(theirs),
            }
        }
    }
}

/// Sums over loci with missing genotypes.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct MissingSums {
    /// B and H, in units of 2^-WEIGHT_BITS.
    pub(super) b: Triangle,
    pub(super) h: Triangle,
    /// p and q, in units of 2^-TERM_BITS.
    pub(super) p: Vec<i128>,
    pub(super) q: Vec<i128>,
    /// By individual: weights of the loci at which it is typed.
    pub(super) typed: Vec<u64>,
}

impl MissingSums {
    fn new(individuals: usize) -> Self {
        MissingSums {
            b: Triangle::new(individuals),
            h: Triangle::new(individuals),
            p: vec![0; individuals],
            q: vec![0; individuals],
            typed: vec![0; individuals],
        }
    }

    pub(super) fn add_terms(&mut self, weights: &LocusWeights, weight: u64, typed: TypedRow<'_>) {
        let scale = power_of_two(TERM_BITS);
        let (a, b) = (
            (weights.a * scale).round() as i128,
            (weights.b * scale).round() as i128,
        );
        for (i, &is_typed) in typed.iter().enumerate() {
            if is_typed > 0.0 {
                self.p[i] += a;
                self.q[i] += b;
                self.typed[i] += weight;
            }
        }
    }

    pub(super) fn add_b(&mut self, product: Product<'_>, rows: u64) {
        self.b.add(product, rows);
    }

    pub(super) fn add_h(&mut self, product: Product<'_>, rows: u64) {
        self.h.add(product, rows);
    }

    fn merge(&mut self, other: &MissingSums) {
        self.b.merge(&other.b);
        self.h.merge(&other.h);
        for i in 0..self.p.len() {
            self.p[i] += other.p[i];
            self.q[i] += other.q[i];
            self.typed[i] += other.typed[i];
        }
    }
}

/// A symmetric matrix of integers: the diagonal, then what is above it row by row.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Triangle {
    size: usize,
    rows: u64,
    cells: Cells,
}

/// Which of the two it is depends on the number of rows added only.
#[derive(Debug, Clone, PartialEq)]
enum Cells {
    Narrow(Vec<i64>),
    Wide(Vec<i128>),
}

impl Triangle {
    fn new(size: usize) -> Self {
        Triangle {
            size,
            rows: 0,
            cells: Cells::Narrow(vec![0; size * (size + 1) / 2]),
        }
    }

    /// Adds a product of `rows` rows, whose cells are integers below 2^53.
    fn add(&mut self, product: Product<'_>, rows: u64) {
        self.count(rows);
        let diagonal = (0..self.size).map(|i| product[[i, i]] as i64);
        let above =
            (0..self.size).flat_map(|i| product.row(i).into_iter().skip(i + 1).map(|&v| v as i64));
        let values = diagonal.chain(above);
        match &mut self.cells {
            Cells::Narrow(cells) => cells.iter_mut().zip(values).for_each(|(c, v)| *c += v),
            Cells::Wide(cells) => {
                cells
                    .iter_mut()
                    .zip(values)
                    .for_each(|(c, v)| *c += i128::from(v));
            }
        }
    }

    fn merge(&mut self, other: &Triangle) {
        self.count(other.rows);
        match (&mut self.cells, &other.cells) {
            (Cells::Narrow(mine), Cells::Narrow(theirs)) => {
                mine.iter_mut().zip(theirs).for_each(|(c, v)| *c += v);
            }
            (Cells::Wide(mine), Cells::Narrow(theirs)) => {
                mine.iter_mut()
                    .zip(theirs)
                    .for_each(|(c, &v)| *c += i128::from(v));
            }
            (Cells::Wide(mine), Cells::Wide(theirs)) => {
                mine.iter_mut().zip(theirs).for_each(|(c, v)| *c += v);
            }
            (Cells::Narrow(_), Cells::Wide(_)) => unreachable!("count widens"),
        }
    }

    /// Counts rows about to be added, and widens the cells before they could overflow.
    fn count(&mut self, rows: u64) {
        self.rows += rows;
        if self.rows > NARROW_ROWS
            && let Cells::Narrow(cells) = &self.cells
        {
            self.cells = Cells::Wide(cells.iter().map(|&v| i128::from(v)).collect());
        }
    }

    /// Adds the cells to sums of the same layout.
    pub(super) fn add_to(&self, sums: &mut [i128]) {
        match &self.cells {
            Cells::Narrow(cells) => {
                sums.iter_mut()
                    .zip(cells)
                    .for_each(|(s, &v)| *s += i128::from(v));
            }
            Cells::Wide(cells) => sums.iter_mut().zip(cells).for_each(|(s, v)| *s += v),
        }
    }
}
