//! Log-likelihood of every column with its slopes, by carrying functions back and measures forth.

use statrs::function::factorial::ln_binomial;

use super::columns::{Binomials, Columns, Count, log_peak};
use super::{BetaPrior, CountPanel, NoFit};
use crate::ne::diffusion::{Drift, Grid};
use crate::ne::jacobi::Rule;
use crate::ne::matrix::Matrix;

/// Columns treated together: the matrices of one block stay in the second-level cache.
const BLOCK: usize = 256;
/// A column whose scaled likelihood falls below this no longer pulls at the estimate: such a change
/// is not drift at this size, and rounding would be all that is left of it.
const FLOOR: f64 = 1e-13;

/// How drift is computed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Kernel {
    /// The diffusion: any real drift rate and number of generations.
    Diffusion,
    /// The exact chain of 2N gene copies, for small populations.
    Chain,
}

/// A value per locus with slopes along every drift rate: matrices of one row a column of counts.
struct Jet {
    value: Matrix,
    first: Vec<Option<Matrix>>,
    second: Vec<Option<Matrix>>,
}

/// Place of the pair (p, q), p <= q, in a list of all pairs of `rates` drift rates.
pub(super) fn pair(rates: usize, p: usize, q: usize) -> usize {
    let (p, q) = (p.min(q), p.max(q));
    p * rates - p * (p + 1) / 2 + q
}

/// Number of pairs.
pub(super) fn pairs(rates: usize) -> usize {
    rates * (rates + 1) / 2
}

impl Jet {
    fn constant(value: Matrix, rates: usize) -> Self {
        Jet {
            value,
            first: vec![None; rates],
            second: vec![None; pairs(rates)],
        }
    }

    fn matrices(&mut self) -> impl Iterator<Item = &mut Matrix> {
        std::iter::once(&mut self.value)
            .chain(self.first.iter_mut().flatten())
            .chain(self.second.iter_mut().flatten())
    }

    /// Multiplies each row by a likelihood, element by element.
    fn weigh<'a>(&mut self, likelihood: impl Fn(usize) -> &'a [f64]) {
        for matrix in self.matrices() {
            for i in 0..matrix.rows {
                for (v, l) in matrix.row_mut(i).iter_mut().zip(likelihood(i)) {
                    *v *= l;
                }
            }
        }
    }

    /// Applies a drift matrix that depends on rate `p`; product rule for the slopes.
    fn drift(&self, [m, m1, m2]: &[Matrix; 3], p: usize, slopes: bool) -> Jet {
        let rates = self.first.len();
        let mut out = Jet::constant(self.value.times(m), rates);
        if !slopes {
            return out;
        }
        let add = |target: &mut Option<Matrix>, left: &Matrix, right: &Matrix| match target {
            Some(t) => left.add_product(right, t),
            None => *target = Some(left.times(right)),
        };
        for q in 0..rates {
            if let Some(f) = &self.first[q] {
                add(&mut out.first[q], f, m);
            }
            for r in q..rates {
                let target = &mut out.second[pair(rates, q, r)];
                if let Some(s) = &self.second[pair(rates, q, r)] {
                    add(target, s, m);
                }
                if let (true, Some(f)) = (q == p, &self.first[r]) {
                    add(target, f, m1);
                }
                if let (true, Some(f)) = (r == p, &self.first[q]) {
                    add(target, f, m1);
                }
            }
        }
        add(&mut out.first[p], &self.value, m1);
        add(&mut out.second[pair(rates, p, p)], &self.value, m2);
        out
    }

    fn first_row(&self, p: usize, i: usize) -> Option<&[f64]> {
        self.first[p].as_ref().map(|m| m.row(i))
    }

    fn second_row(&self, p: usize, q: usize, i: usize) -> Option<&[f64]> {
        self.second[pair(self.first.len(), p, q)]
            .as_ref()
            .map(|m| m.row(i))
    }
}

/// What one pass over the columns gives.
#[derive(Debug, Clone, Default)]
pub(super) struct Evaluation {
    /// Weighted sum of log P(later counts | baseline count).
    pub log_likelihood: f64,
    /// Slopes of each column, `stride` numbers a column; empty when not asked for.
    pub slopes: Vec<f64>,
    /// What the slopes of a column become when an individual of dosage g is taken out of visit v, less
    /// the slopes with all: at ((column * visits + v) * 3 + g) * stride. Empty when not asked for.
    pub deletions: Vec<f64>,
    /// Numbers in one set of slopes.
    pub stride: usize,
}

/// What is asked of a pass.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum Ask {
    /// The log-likelihood alone.
    Value,
    /// And the slopes of every column.
    Slopes,
    /// And those after the deletion of one individual of each dosage from each visit.
    Deletions,
}

/// All that stays the same while drift rates are tried.
pub(super) struct Engine {
    pub columns: Columns,
    pub gaps: Vec<f64>,
    /// Drift rate that governs each interval.
    pub rate_of_gap: Vec<usize>,
    pub kernel: Kernel,
    grid: Grid,
    prior: Rule,
    at_grid: Binomials,
    at_prior: Binomials,
    constant: f64,
}

impl Engine {
    /// Prepares the rows of `panel` whose baseline minor allele frequency is at least `limit`.
    pub fn new(panel: &CountPanel, prior: BetaPrior, limit: f64) -> Result<Self, NoFit> {
        if panel.visits() < 2 {
            return Err(NoFit::TooFewVisits);
        }
        if panel.gaps.iter().any(|&t| !(t > 0.0 && t.is_finite())) {
            return Err(NoFit::NoTimeBetween);
        }
        if !(prior.a > 0.0 && prior.b > 0.0 && prior.a.is_finite() && prior.b.is_finite()) {
            return Err(NoFit::NoPrior);
        }
        let columns = Columns::gather(panel, limit);
        if columns.len() == 0 {
            return Err(NoFit::NoLoci);
        }
        let order = Grid::order_for(columns.most_copies());
        let grid = Grid::new(order);
        let rule = Rule::beta(order + 2, prior.a, prior.b);
        let visits = columns.visits;
        let with_deletions = |baseline: bool| {
            columns
                .counts
                .iter()
                .enumerate()
                .filter(move |(i, _)| (i % visits == 0) == baseline)
                .flat_map(|(_, &count)| {
                    std::iter::once(count).chain((0..3).filter_map(move |g| without(count, g)))
                })
        };
        let at_grid = Binomials::new(&grid.nodes, with_deletions(false));
        let at_prior = Binomials::new(&rule.nodes, with_deletions(true));
        let constant = (0..columns.len())
            .map(|c| {
                let later = &columns.column(c)[1..];
                let logs: f64 = later
                    .iter()
                    .map(|&(x, n)| ln_binomial(n.into(), x.into()) + log_peak((x, n)))
                    .sum();
                columns.weights[c] * logs
            })
            .sum();
        Ok(Engine {
            rate_of_gap: vec![0; panel.gaps.len()],
            gaps: panel.gaps.clone(),
            kernel: Kernel::Diffusion,
            columns,
            grid,
            prior: rule,
            at_grid,
            at_prior,
            constant,
        })
    }

    /// Number of drift rates.
    pub fn rates(&self) -> usize {
        self.rate_of_gap.iter().max().map_or(0, |m| m + 1)
    }

    fn drifts(&self, rates: &[f64]) -> Vec<Drift> {
        let make = |gap: usize| {
            let points = if gap == 0 {
                &self.prior.nodes
            } else {
                &self.grid.nodes
            };
            let (t, u) = (self.gaps[gap], rates[self.rate_of_gap[gap]]);
            match self.kernel {
                Kernel::Chain if u > 0.0 => self.grid.chain(points, t, u),
                _ => self.grid.diffuse(points, t, u),
            }
        };
        (0..self.gaps.len()).map(make).collect()
    }

    /// Evaluates all columns at the drift rates.
    pub fn evaluate(&self, rates: &[f64], ask: Ask) -> Evaluation {
        let drifts = self.drifts(rates);
        let count = self.rates();
        let stride = count + pairs(count);
        let mut out = Evaluation {
            log_likelihood: self.constant,
            stride,
            ..Evaluation::default()
        };
        if ask >= Ask::Slopes {
            out.slopes.reserve(self.columns.len() * stride);
        }
        for start in (0..self.columns.len()).step_by(BLOCK) {
            let block = start..(start + BLOCK).min(self.columns.len());
            self.evaluate_block(block, &drifts, ask, &mut out);
        }
        out
    }

    fn evaluate_block(
        &self,
        block: std::ops::Range<usize>,
        drifts: &[Drift],
        ask: Ask,
        out: &mut Evaluation,
    ) {
        let (visits, rates, start) = (self.columns.visits, self.rates(), block.start);
        let size = block.len();
        let count = |i: usize, v: usize| self.columns.column(start + i)[v];
        let slopes = ask >= Ask::Slopes;
        let ones = Matrix::from_fn(size, self.grid.nodes.len(), |_, _| 1.0);
        // Chance of all samples after visit v, as a function of the frequency at v; newest last.
        let mut later = vec![Jet::constant(ones, rates)];
        for v in (1..visits).rev() {
            let mut f = Jet::constant(Matrix::default(), rates);
            std::mem::swap(&mut f, later.last_mut().expect("one a visit"));
            let kept = (ask == Ask::Deletions).then(|| f.duplicate());
            f.weigh(|i| self.at_grid.get(count(i, v)));
            let earlier = f.drift(&drifts[v - 1].backward, self.rate_of_gap[v - 1], slopes);
            if let Some(kept) = kept {
                *later.last_mut().expect("one a visit") = kept;
                later.push(earlier);
            } else {
                *later.last_mut().expect("one a visit") = earlier;
            }
        }
        let first = later.pop().expect("one a visit");
        let mut totals = Vec::with_capacity(size);
        for i in 0..size {
            let posterior = self.posterior(count(i, 0));
            let sums = Sums::of(&first, i, &posterior, slopes);
            out.log_likelihood += self.columns.weights[start + i] * (sums.value + FLOOR).ln();
            if slopes {
                totals.push(sums.log_slopes(rates));
                out.slopes.extend_from_slice(&totals[i]);
            }
        }
        if ask == Ask::Deletions {
            let base = out.deletions.len();
            out.deletions
                .resize(base + size * visits * 3 * out.stride, 0.0);
            let mut write = |i: usize, v: usize, g: u32, sums: Sums| {
                let at = base + ((i * visits + v) * 3 + g as usize) * out.stride;
                let place = &mut out.deletions[at..at + out.stride];
                for ((o, new), all) in place.iter_mut().zip(sums.log_slopes(rates)).zip(&totals[i])
                {
                    *o = new - all;
                }
            };
            self.delete_baseline(size, count, &first, &mut write);
            self.delete_later(size, count, &later, drifts, &mut write);
        }
    }

    /// Weights of the prior's nodes after a baseline count; they add up to 1.
    fn posterior(&self, baseline: Count) -> Vec<f64> {
        let likelihood = self.at_prior.get(baseline);
        let mut out: Vec<f64> = self
            .prior
            .weights
            .iter()
            .zip(likelihood)
            .map(|(w, l)| w * l)
            .collect();
        let sum: f64 = out.iter().sum();
        for v in &mut out {
            *v /= sum;
        }
        out
    }

    /// Taking one out of the baseline changes the posterior only.
    fn delete_baseline(
        &self,
        size: usize,
        count: impl Fn(usize, usize) -> Count,
        first: &Jet,
        write: &mut impl FnMut(usize, usize, u32, Sums),
    ) {
        for i in 0..size {
            for g in 0..3 {
                if let Some(less) = without(count(i, 0), g) {
                    write(i, 0, g, Sums::of(first, i, &self.posterior(less), true));
                }
            }
        }
    }

    /// Taking one out of a later visit changes its likelihood only: what comes before (a measure,
    /// carried forth) and after (a function, carried back) stay.
    fn delete_later(
        &self,
        size: usize,
        count: impl Fn(usize, usize) -> Count,
        later: &[Jet],
        drifts: &[Drift],
        write: &mut impl FnMut(usize, usize, u32, Sums),
    ) {
        let rates = self.rates();
        let mut measure = Jet::constant(Matrix::zeros(size, self.prior.nodes.len()), rates);
        for i in 0..size {
            measure
                .value
                .row_mut(i)
                .copy_from_slice(&self.posterior(count(i, 0)));
        }
        for v in 1..self.columns.visits {
            measure = measure.drift(&drifts[v - 1].forward, self.rate_of_gap[v - 1], true);
            let after = &later[self.columns.visits - 1 - v];
            let product = measure.times(after);
            for i in 0..size {
                for g in 0..3 {
                    if let Some(less) = without(count(i, v), g) {
                        write(i, v, g, Sums::of(&product, i, self.at_grid.get(less), true));
                    }
                }
            }
            measure.weigh(|i| self.at_grid.get(count(i, v)));
        }
    }
}

impl Jet {
    fn duplicate(&self) -> Jet {
        Jet {
            value: self.value.clone(),
            first: self.first.clone(),
            second: self.second.clone(),
        }
    }

    /// Product, element by element, with the product rule for the slopes.
    fn times(&self, other: &Jet) -> Jet {
        let rates = self.first.len();
        let product = |a: &Option<Matrix>, b: &Matrix, out: &mut Option<Matrix>| {
            if let Some(a) = a {
                let out = out.get_or_insert_with(|| Matrix::zeros(b.rows, b.columns));
                for ((o, a), b) in out.data.iter_mut().zip(&a.data).zip(&b.data) {
                    *o += a * b;
                }
            }
        };
        let mut value = self.value.clone();
        for (v, o) in value.data.iter_mut().zip(&other.value.data) {
            *v *= o;
        }
        let mut out = Jet::constant(value, rates);
        for p in 0..rates {
            product(&self.first[p], &other.value, &mut out.first[p]);
            product(&other.first[p], &self.value, &mut out.first[p]);
            for q in p..rates {
                let k = pair(rates, p, q);
                product(&self.second[k], &other.value, &mut out.second[k]);
                product(&other.second[k], &self.value, &mut out.second[k]);
                for (a, b) in [(p, q), (q, p)] {
                    if let Some(b) = &other.first[b] {
                        product(&self.first[a], b, &mut out.second[k]);
                    }
                }
            }
        }
        out
    }
}

/// Integrals of one row of a jet.
struct Sums {
    value: f64,
    first: Vec<f64>,
    second: Vec<f64>,
}

impl Sums {
    fn of(jet: &Jet, row: usize, weights: &[f64], slopes: bool) -> Self {
        let dot =
            |r: Option<&[f64]>| r.map_or(0.0, |r| r.iter().zip(weights).map(|(a, b)| a * b).sum());
        let value = dot(Some(jet.value.row(row)));
        let rates = if slopes { jet.first.len() } else { 0 };
        let first = (0..rates).map(|p| dot(jet.first_row(p, row))).collect();
        let second = (0..rates)
            .flat_map(|p| (p..rates).map(move |q| (p, q)))
            .map(|(p, q)| dot(jet.second_row(p, q, row)))
            .collect();
        Sums {
            value,
            first,
            second,
        }
    }

    /// Slopes and curvatures of the logarithm.
    fn log_slopes(&self, rates: usize) -> Vec<f64> {
        let scale = 1.0 / (self.value + FLOOR);
        let mut out: Vec<f64> = self.first.iter().map(|f| f * scale).collect();
        for p in 0..rates {
            for q in p..rates {
                out.push(self.second[pair(rates, p, q)] * scale - out[p] * out[q]);
            }
        }
        out
    }
}

/// A count without one individual of dosage `g`; `None` where no such individual can be in it.
pub(super) fn without((x, n): Count, g: u32) -> Option<Count> {
    (n >= 2 && x >= g && n - x >= 2 - g).then(|| (x - g, n - 2))
}
