//! The integer sums behind the matrices.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use super::super::bounds::{self, MOST_ALLELES, MOST_LOCI};
use super::Product;
use super::missing::MissingSums;

/// Up to so many rows, sums of integers of at most 2^44 stay within i64.
const NARROW_ROWS: u64 = 1 << 18;
/// The most that one row adds to a cell: 2^44, and what rounding the parts of a vector can add to that.
const MOST_OF_A_ROW: i128 = (1 << 44) + (1 << 28);
/// Sets of cutoffs.
const MASKS: u8 = 8;

/// The sums of one contig, by set of cutoffs (a mask of bits).
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub(super) struct ContigSums {
    pub(super) bins: BTreeMap<u8, BinSums>,
}

impl ContigSums {
    pub(super) fn bin_mut(&mut self, mask: u8, individuals: usize) -> &mut BinSums {
        self.bins
            .entry(mask)
            .or_insert_with(|| BinSums::new(individuals))
    }

    pub(super) fn has_size(&self, n: usize) -> bool {
        self.bins.values().all(|bin| {
            bin.vectors.has_size(n)
                && bin.by_typed.len() == n + 1
                && bin.missing.as_ref().is_none_or(|m| m.has_size(n))
        })
    }

    pub(super) fn is_bounded(&self) -> bool {
        self.bins.keys().all(|&mask| mask < MASKS) && self.bins.values().all(BinSums::is_bounded)
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
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
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

#[derive(Debug, Clone, Copy, Default, PartialEq, Serialize, Deserialize)]
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

    fn is_bounded(&self) -> bool {
        let numbers =
            |of: fn(&TypedTally) -> &u64, most| bounds::add_up(self.by_typed.iter().map(of), most);
        bounds::fine([&self.own])
            && self.vectors.is_bounded()
            && numbers(|t| &t.loci, MOST_LOCI)
            && numbers(|t| &t.weight, MOST_ALLELES)
            && numbers(|t| &t.squared_weight, 16 * MOST_ALLELES)
            && self.missing.iter().all(|m| m.is_bounded())
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

/// A symmetric matrix of integers: the diagonal, then what is above it row by row.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub(super) struct Triangle {
    size: usize,
    rows: u64,
    cells: Cells,
}

/// Which of the two it is depends on the number of rows added only.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
enum Cells {
    Narrow(Vec<i64>),
    Wide(Vec<i128>),
}

impl Triangle {
    pub(super) fn new(size: usize) -> Self {
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

    /// Whether it is a matrix of this size, as wide as its rows ask for.
    pub(super) fn has_size(&self, n: usize) -> bool {
        let cells = match &self.cells {
            Cells::Narrow(cells) if self.rows <= NARROW_ROWS => cells.len(),
            Cells::Wide(cells) if self.rows > NARROW_ROWS => cells.len(),
            _ => return false,
        };
        self.size == n && cells == n * (n + 1) / 2
    }

    /// Whether no cell is larger than so many rows make it.
    pub(super) fn is_bounded(&self) -> bool {
        let most = i128::from(self.rows) * MOST_OF_A_ROW;
        self.rows <= MOST_ALLELES
            && match &self.cells {
                Cells::Narrow(cells) => cells.iter().all(|&c| i128::from(c).abs() <= most),
                Cells::Wide(cells) => cells.iter().all(|&c| (-most..=most).contains(&c)),
            }
    }

    /// Individuals.
    pub(super) fn size(&self) -> usize {
        self.size
    }

    /// Adds a number below 2^43 to every cell of two of the listed individuals, which rise, and to the
    /// diagonal cells of each.
    pub(super) fn add_square(&mut self, listed: &[usize], number: i64) {
        self.count(1);
        let size = self.size;
        for (n, &i) in listed.iter().enumerate() {
            // Where the cell (i, j) lies is j - i beyond the end of the rows above.
            let row = size + i * (2 * size - i - 1) / 2;
            let after = listed[n + 1..].iter().map(|&j| row + j - i - 1);
            let places = std::iter::once(i).chain(after);
            match &mut self.cells {
                Cells::Narrow(cells) => places.for_each(|at| cells[at] += number),
                Cells::Wide(cells) => places.for_each(|at| cells[at] += i128::from(number)),
            }
        }
    }

    pub(super) fn merge(&mut self, other: &Triangle) {
        self.count(other.rows);
        match (&mut self.cells, &other.cells) {
            (Cells::Narrow(mine), Cells::Narrow(theirs)) => {
                mine.iter_mut().zip(theirs).for_each(|(c, v)| *c += v);
            }
            #[expect(
                clippy::unreachable,
                reason = "`count` widens by the number of rows, and `has_size` holds what was read to the same"
            )]
            (Cells::Narrow(_), Cells::Wide(_)) => unreachable!("count widens"),
            (Cells::Wide(mine), Cells::Narrow(theirs)) => {
                mine.iter_mut()
                    .zip(theirs)
                    .for_each(|(c, &v)| *c += i128::from(v));
            }
            (Cells::Wide(mine), Cells::Wide(theirs)) => {
                mine.iter_mut().zip(theirs).for_each(|(c, v)| *c += v);
            }
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
