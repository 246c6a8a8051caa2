//! Counts of all loci, with equal loci held once.

use std::collections::HashMap;

use crate::ne::matrix::Matrix;

/// Gene copies of one allele per locus and visit. A multi-allelic locus of K alleles enters as K
/// rows, each allele against the rest, of weight (K-1)/K; a biallelic one as one row of weight 1.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct CountPanel {
    /// Generations between each visit and the next, oldest first; one fewer than visits.
    pub gaps: Vec<f64>,
    /// Copies of the allele, row after row, `visits` numbers each.
    copies: Vec<u32>,
    /// Gene copies typed, likewise; 0 where nobody was typed: that visit then says nothing.
    totals: Vec<u32>,
    /// Weight of each row.
    weights: Vec<f64>,
}

impl CountPanel {
    /// An empty panel of visits that lie `gaps` generations apart.
    pub fn new(gaps: Vec<f64>) -> Self {
        CountPanel {
            gaps,
            ..CountPanel::default()
        }
    }

    /// Number of visits.
    pub fn visits(&self) -> usize {
        self.gaps.len() + 1
    }

    /// Adds one row: copies of the allele and gene copies typed by visit, oldest first. Copies beyond
    /// the total are cut to it.
    pub fn push(&mut self, copies: &[u32], totals: &[u32], weight: f64) {
        assert_eq!((copies.len(), totals.len()), (self.visits(), self.visits()));
        self.copies
            .extend(copies.iter().zip(totals).map(|(&x, &n)| x.min(n)));
        self.totals.extend_from_slice(totals);
        self.weights.push(weight);
    }

    /// Number of rows.
    pub fn len(&self) -> usize {
        self.weights.len()
    }

    /// Whether there is no row.
    pub fn is_empty(&self) -> bool {
        self.weights.is_empty()
    }

    /// Copies and gene copies typed of row `i` at the oldest visit.
    pub fn first(&self, i: usize) -> (u32, u32) {
        let visits = self.visits();
        (self.copies[i * visits], self.totals[i * visits])
    }

    /// Whether row `i` can be used: the baseline minor allele frequency is at least `limit` and some
    /// later visit has typed copies.
    pub fn usable(&self, i: usize, limit: f64) -> bool {
        let visits = self.visits();
        let (x, n) = (self.copies[i * visits], self.totals[i * visits]);
        n > 0
            && f64::from(x.min(n - x)) >= limit * f64::from(n)
            && self.totals[i * visits + 1..(i + 1) * visits]
                .iter()
                .any(|&n| n > 0)
    }
}

/// A count of copies among copies typed.
pub(super) type Count = (u32, u32);

/// The distinct rows of a panel that are in use.
#[derive(Debug, Clone)]
pub(super) struct Columns {
    /// Number of visits.
    pub visits: usize,
    /// Counts, `visits` a column.
    pub counts: Vec<Count>,
    /// Sum of the weights of the rows behind each column.
    pub weights: Vec<f64>,
    /// Column of each row of the panel; `None` where the row is not used.
    pub of_row: Vec<Option<usize>>,
}

impl Columns {
    /// Gathers the usable rows; see [`CountPanel::usable`]. Order: by counts, so that it does not
    /// depend on the order of the loci.
    pub fn gather(panel: &CountPanel, limit: f64) -> Self {
        let visits = panel.visits();
        let key = |i: usize| {
            let range = i * visits..(i + 1) * visits;
            (&panel.copies[range.clone()], &panel.totals[range])
        };
        let mut rows: Vec<usize> = (0..panel.len())
            .filter(|&i| panel.usable(i, limit))
            .collect();
        rows.sort_by(|&i, &j| key(i).cmp(&key(j)).then(i.cmp(&j)));
        let mut columns = Columns {
            visits,
            counts: Vec::new(),
            weights: Vec::new(),
            of_row: vec![None; panel.len()],
        };
        let mut last: Option<usize> = None;
        for i in rows {
            if last.is_none_or(|j| key(j) != key(i)) {
                let (copies, totals) = key(i);
                columns
                    .counts
                    .extend(copies.iter().copied().zip(totals.iter().copied()));
                columns.weights.push(0.0);
                last = Some(i);
            }
            let column = columns.weights.len() - 1;
            columns.weights[column] += panel.weights[i];
            columns.of_row[i] = Some(column);
        }
        columns
    }

    /// Number of columns.
    pub fn len(&self) -> usize {
        self.weights.len()
    }

    /// The counts of a column by visit.
    pub fn column(&self, c: usize) -> &[Count] {
        &self.counts[c * self.visits..(c + 1) * self.visits]
    }

    /// Most gene copies of any sample.
    pub fn most_copies(&self) -> u32 {
        self.counts.iter().map(|&(_, n)| n).max().unwrap_or(0)
    }
}

/// Binomial likelihoods of the counts that occur, at fixed nodes, each scaled so that its largest
/// possible value is 1.
pub(super) struct Binomials {
    rows: HashMap<Count, usize>,
    values: Matrix,
}

impl Binomials {
    /// Tabulates the given counts at `nodes`.
    pub fn new(nodes: &[f64], counts: impl Iterator<Item = Count>) -> Self {
        let mut distinct: Vec<Count> = counts.collect();
        distinct.sort_unstable();
        distinct.dedup();
        let logs: Vec<(f64, f64)> = nodes.iter().map(|&x| (x.ln(), (-x).ln_1p())).collect();
        let mut values = Matrix::zeros(distinct.len(), nodes.len());
        for (i, &(x, n)) in distinct.iter().enumerate() {
            let peak = log_peak((x, n));
            let (seen, other) = (f64::from(x), f64::from(n - x));
            for (v, (log, log_rest)) in values.row_mut(i).iter_mut().zip(&logs) {
                // 0 times an infinite logarithm is a certain event, not a number without value.
                let first = if x == 0 { 0.0 } else { seen * log };
                let second = if n == x { 0.0 } else { other * log_rest };
                *v = (first + second - peak).exp();
            }
        }
        let rows = distinct
            .into_iter()
            .enumerate()
            .map(|(i, count)| (count, i))
            .collect();
        Binomials { rows, values }
    }

    /// The scaled likelihood of a tabulated count at the nodes.
    pub fn get(&self, count: Count) -> &[f64] {
        self.values.row(self.rows[&count])
    }
}

/// Logarithm of p^x (1-p)^(n-x) at p = x/n.
pub(super) fn log_peak((x, n): Count) -> f64 {
    let part = |k: u32| {
        if k == 0 {
            0.0
        } else {
            f64::from(k) * (f64::from(k) / f64::from(n)).ln()
        }
    };
    part(x) + part(n - x)
}
