//! The estimate again without each individual in turn, from the genotypes of a panel of loci.
//!
//! With centred unit vectors u and n typed, leaving out individual i turns the product r of two loci
//! into r - k u_i v_i, k = n/(n-1), and the squared length of u into 1 - k u_i^2 (exact for complete
//! data). So every delete-one sum of squared correlations follows from sums over loci, at the cost of
//! one pass over S x S x loci instead of one for each individual. With missing genotypes the mean of
//! a locus moves for the typed only; the terms left out are of order 1/S of the change, and the
//! tests hold the variance against the plain recomputation.

use std::ops::Range;

use ndarray::{Array1, Array2, ArrayView1, Axis, Slice};

use super::LinkagePairs;
use super::panel::{LinkagePanel, PanelLocus};
use crate::merge::gram::PairSums;

/// Below this squared length what is left of a locus varies no more.
const NOTHING_LEFT: f64 = 1e-9;

/// The panel with loci of one contig side by side, and who leaves what behind.
pub(super) struct Ordered<'a> {
    individuals: usize,
    loci: Vec<&'a PanelLocus>,
    /// Rows by locus in the new order.
    rows: Vec<Range<usize>>,
    /// rows x individuals.
    vectors: Array2<f64>,
    /// rows x individuals: the factor 1/(1 - k u_i^2) by which a row grows to unit length again
    /// without i; 0 where nothing is left of it.
    growth: Array2<f64>,
    /// loci x individuals.
    typed: Array2<f64>,
    /// Loci between which no pair is formed: contigs, or each locus by itself.
    groups: Vec<Range<usize>>,
    by_contig: bool,
}

impl<'a> Ordered<'a> {
    pub(super) fn of(panel: &'a LinkagePanel, pairs: LinkagePairs) -> Self {
        let s = panel.individuals;
        let mut order: Vec<usize> = (0..panel.loci.len()).collect();
        order.sort_by_key(|&l| panel.loci[l].contig);
        let loci: Vec<&PanelLocus> = order.iter().map(|&l| &panel.loci[l]).collect();
        let row_count = panel.vectors.len() / s;
        let (mut vectors, mut growth) =
            (Array2::zeros((row_count, s)), Array2::zeros((row_count, s)));
        let mut typed = Array2::zeros((loci.len(), s));
        let mut rows = Vec::with_capacity(loci.len());
        let mut next = 0;
        for (l, locus) in loci.iter().enumerate() {
            let masks = &panel.typed[order[l] * s..(order[l] + 1) * s];
            typed.row_mut(l).assign(&ArrayView1::from(masks));
            rows.push(next..next + locus.rows.len());
            let k = locus.inflation();
            for row in locus.rows.clone() {
                let u = ArrayView1::from(&panel.vectors[row * s..(row + 1) * s]);
                vectors.row_mut(next).assign(&u);
                growth
                    .row_mut(next)
                    .assign(&u.map(|u| match 1.0 - k * u * u {
                        left if left > NOTHING_LEFT => 1.0 / left,
                        _ => 0.0,
                    }));
                next += 1;
            }
        }
        let by_contig = pairs == LinkagePairs::BetweenContigs;
        let groups = groups(&loci, by_contig);
        Ordered {
            individuals: s,
            loci,
            rows,
            vectors,
            growth,
            typed,
            groups,
            by_contig,
        }
    }

    /// By left-out individual: the sum of squared correlations over ordered pairs of loci of
    /// different groups.
    pub(super) fn squared_correlations(&self) -> Vec<f64> {
        let weights = self.row_weights();
        let weighted = scale_rows(&self.vectors, &weights);
        let gram = self.vectors.t().dot(&weighted);
        // t: by row, the weighted squared correlations with all rows of other groups.
        let mut t = &row_dots(&self.vectors.dot(&gram), &self.vectors) * &weights;
        // e = w g k^(1/2) u: what left-out individuals take from the products.
        let mut taken = &self.growth * &weighted;
        let mut taken_square = Array2::zeros(taken.raw_dim());
        for (l, rows) in self.rows.iter().enumerate() {
            let k = self.loci[l].inflation();
            for row in rows.clone() {
                taken.row_mut(row).mapv_inplace(|v| v * k.sqrt());
                let square = &taken.row(row) * &self.vectors.row(row) * k.sqrt();
                taken_square.row_mut(row).assign(&square);
            }
        }
        let mut second = squared_rows(&taken.t().dot(&self.vectors));
        let mut third = taken_square.sum_axis(Axis(0)).mapv(|v| v * v);
        for group in &self.groups {
            let rows = self.rows[group.start].start..self.rows[group.end - 1].end;
            let part =
                |m: &'_ Array2<f64>| m.slice_axis(Axis(0), Slice::from(rows.clone())).to_owned();
            let (u, w, e) = (part(&self.vectors), part(&weighted), part(&taken));
            let own_t = if self.by_contig {
                second -= &squared_rows(&e.t().dot(&u));
                row_dots(&u.dot(&u.t().dot(&w)), &u)
            } else {
                let r = u.dot(&u.t());
                second -= &(&r.dot(&e) * &e).sum_axis(Axis(0));
                (&r * &r).dot(&weights.slice_axis(Axis(0), Slice::from(rows.clone())))
            };
            for (row, own) in rows.clone().zip(own_t) {
                t[row] -= weights[row] * own;
            }
            third -= &part(&taken_square).sum_axis(Axis(0)).mapv(|v| v * v);
        }
        // Weights grow by 1 + y: sum (1+y)(1+y') r^2, the product of two y by its rank-one part.
        let total = t.sum();
        let grown = (&self.growth - 1.0).t().dot(&t);
        let first = grown.mapv(|g| total + 2.0 * g + if total > 0.0 { g * g / total } else { 0.0 });
        (first - 2.0 * second + third).to_vec()
    }

    /// By left-out individual: all other sums over ordered pairs of loci of different groups.
    pub(super) fn expectations(&self) -> Vec<PairSums> {
        let remaining = self.remaining_weights();
        if self
            .loci
            .iter()
            .all(|l| l.typed as usize == self.individuals)
        {
            return self.complete_expectations(&remaining);
        }
        let mut sums = self.ordered_pairs(0..self.loci.len(), &remaining);
        for group in &self.groups {
            let own = if group.len() == 1 {
                self.own_pairs(group.start, &remaining)
            } else {
                self.ordered_pairs(group.clone(), &remaining)
            };
            sums.iter_mut()
                .zip(&own)
                .for_each(|(sum, own)| sum.subtract(own));
        }
        sums
    }

    /// With nobody missing, every pair expects 1/(n-1) from the n = S - 1 who remain.
    fn complete_expectations(&self, remaining: &Array2<f64>) -> Vec<PairSums> {
        let mut pairs = remaining.sum_axis(Axis(0)).mapv(|k| k * k);
        for group in &self.groups {
            let own = remaining
                .slice_axis(Axis(0), Slice::from(group.clone()))
                .sum_axis(Axis(0));
            pairs -= &own.mapv(|k| k * k);
        }
        pairs
            .iter()
            .map(|&weight| own_sums((self.individuals - 1) as f64, weight))
            .collect()
    }

    /// loci x individuals: the weight of a locus without each individual, less where one of its
    /// rows has nothing left.
    fn remaining_weights(&self) -> Array2<f64> {
        let mut weights = Array2::zeros(self.typed.raw_dim());
        for (l, rows) in self.rows.iter().enumerate() {
            for i in 0..self.individuals {
                let left = rows
                    .clone()
                    .filter(|&row| self.growth[[row, i]] > 0.0)
                    .count();
                weights[[l, i]] = self.loci[l].weight * left as f64 / rows.len() as f64;
            }
        }
        weights
    }

    /// By left-out individual: the sums over the pair of a locus with itself.
    fn own_pairs(&self, locus: usize, remaining: &Array2<f64>) -> Vec<PairSums> {
        let n = f64::from(self.loci[locus].typed);
        (0..self.individuals)
            .map(|i| own_sums(n - self.typed[[locus, i]], remaining[[locus, i]].powi(2)))
            .collect()
    }

    /// By left-out individual: the sums over all ordered pairs of some loci, each with itself too.
    /// Matrices B and H shrink by the same ratio as their diagonals.
    fn ordered_pairs(&self, loci: Range<usize>, remaining: &Array2<f64>) -> Vec<PairSums> {
        let part = |m: &Array2<f64>| m.slice_axis(Axis(0), Slice::from(loci.clone())).to_owned();
        let (typed, remaining) = (part(&self.typed), part(remaining));
        let number: Vec<f64> = self.loci[loci.clone()]
            .iter()
            .map(|l| f64::from(l.typed))
            .collect();
        let weight: Vec<f64> = self.loci[loci].iter().map(|l| l.weight).collect();
        // individuals x individuals: row i, the vector without i.
        let without = |term: fn(f64) -> f64| -> Array2<f64> {
            let mut terms = remaining.clone();
            for ((l, i), cell) in terms.indexed_iter_mut() {
                *cell *= term(number[l] - typed[[l, i]]);
            }
            terms.t().dot(&typed)
        };
        let matrix = |term: fn(f64) -> f64| -> Array2<f64> {
            let factors = number
                .iter()
                .zip(&weight)
                .map(|(&n, &w)| w * term(n))
                .collect();
            scale_rows(&typed, &factors).t().dot(&typed)
        };
        let (p, q, h_diagonal) = (without(a), without(b), without(h));
        let number_typed = without(|_| 1.0);
        let (b_matrix, h_matrix) = (matrix(b), matrix(h));
        let (b_squares, h_squares) = (squares_without(&b_matrix), squares_without(&h_matrix));
        let total_weight = remaining.sum_axis(Axis(0));
        (0..self.individuals)
            .map(|i| {
                let others = || (0..self.individuals).filter(move |&j| j != i);
                let shrunk = |diagonal: &Array2<f64>, matrix: &Array2<f64>, squares: f64| {
                    let before: f64 = others().map(|j| matrix[[j, j]]).sum();
                    let after: f64 = others().map(|j| diagonal[[i, j]]).sum();
                    if before > 0.0 {
                        (after / before).powi(2) * squares
                    } else {
                        0.0
                    }
                };
                let vectors: f64 = others()
                    .map(|j| p[[i, j]] * (p[[i, j]] - 2.0 * q[[i, j]]))
                    .sum();
                PairSums {
                    squared_correlation: 0.0,
                    expected_by_sampling: vectors + shrunk(&q, &b_matrix, b_squares[i]),
                    attenuation: shrunk(&h_diagonal, &h_matrix, h_squares[i]),
                    typed_at_both: others().map(|j| number_typed[[i, j]].powi(2)).sum(),
                    weight: total_weight[i].powi(2),
                }
            })
            .collect()
    }

    fn row_weights(&self) -> Array1<f64> {
        self.loci
            .iter()
            .flat_map(|l| std::iter::repeat_n(l.row_weight, l.rows.len()))
            .collect()
    }
}

/// 1/(n-1), b = a/n and h = a (1 - 2/n) of the linkage sums.
fn a(n: f64) -> f64 {
    1.0 / (n - 1.0)
}

fn b(n: f64) -> f64 {
    a(n) / n
}

fn h(n: f64) -> f64 {
    a(n) * (1.0 - 2.0 / n)
}

/// The sums of pairs of loci at which the same n individuals are typed, of a total weight.
fn own_sums(n: f64, weight: f64) -> PairSums {
    PairSums {
        squared_correlation: 0.0,
        expected_by_sampling: weight * a(n),
        attenuation: weight * (n * h(n)).powi(2),
        typed_at_both: weight * n,
        weight,
    }
}

/// Runs of loci of one contig, or every locus by itself.
fn groups(loci: &[&PanelLocus], by_contig: bool) -> Vec<Range<usize>> {
    let mut groups: Vec<Range<usize>> = Vec::new();
    for l in 0..loci.len() {
        match groups.last_mut() {
            Some(last) if by_contig && loci[last.start].contig == loci[l].contig => {
                last.end = l + 1
            }
            _ => groups.push(l..l + 1),
        }
    }
    groups
}

fn scale_rows(matrix: &Array2<f64>, factors: &Array1<f64>) -> Array2<f64> {
    matrix * &factors.view().insert_axis(Axis(1))
}

/// By row: the product of the rows of two matrices.
fn row_dots(x: &Array2<f64>, y: &Array2<f64>) -> Array1<f64> {
    (x * y).sum_axis(Axis(1))
}

/// By row: the sum of squares.
fn squared_rows(x: &Array2<f64>) -> Array1<f64> {
    x.map_axis(Axis(1), |row| row.dot(&row))
}

/// By i: the sum of squares of a symmetric matrix without row and column i.
fn squares_without(matrix: &Array2<f64>) -> Vec<f64> {
    let rows = squared_rows(matrix);
    let all = rows.sum();
    (0..rows.len())
        .map(|i| all - 2.0 * rows[i] + matrix[[i, i]].powi(2))
        .collect()
}
