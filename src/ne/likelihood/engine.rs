//! Log-likelihood of every column with its slopes, by carrying functions back and measures forth.

use statrs::function::factorial::ln_binomial;

use super::columns::{Binomials, Columns, Count, log_peak};
use super::jet::{Jet, Sums, pairs};
use super::{BetaPrior, CountPanel, NoFit};
use crate::ne::diffusion::{Drift, Grid};
use crate::ne::jacobi::Rule;
use crate::ne::matrix::Matrix;

/// Columns treated together: the matrices of one block stay in the second-level cache.
const BLOCK: usize = 256;
/// At smaller rates (2Ne above 2000) the chain and the diffusion cannot be told apart, and the chain's
/// matrices become large.
const LEAST_CHAIN_RATE: f64 = 1.0 / 2000.0;

/// How drift is computed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Kernel {
    /// The diffusion: any real drift rate and number of generations.
    Diffusion,
    /// The exact chain of 2N gene copies, for small populations.
    Chain,
}

/// What one pass over the columns gives.
#[derive(Debug, Clone, Default)]
pub(super) struct Evaluation {
    /// Weighted sum of log P(later counts | baseline count).
    pub log_likelihood: f64,
    /// Slopes of each column, `stride` numbers a column; empty when not asked for.
    pub slopes: Vec<f64>,
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
}

/// Receives the deletions of one column: what its slopes become when an individual of dosage g is
/// taken out of visit v, less the slopes with all, at (v * 3 + g) * stride; zeros where nobody of
/// that dosage can be in that sample.
pub(super) type DeletionSink<'a> = dyn FnMut(usize, &[f64]) + 'a;

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
                Kernel::Chain if u > LEAST_CHAIN_RATE => self.grid.chain(points, t, u),
                _ => self.grid.diffuse(points, t, u),
            }
        };
        (0..self.gaps.len()).map(make).collect()
    }

    /// Evaluates all columns at the drift rates.
    pub fn evaluate(&self, rates: &[f64], ask: Ask) -> Evaluation {
        self.pass(rates, ask, None)
    }

    /// Evaluates all columns with their slopes, and hands on the deletions column by column.
    pub fn evaluate_deletions(&self, rates: &[f64], sink: &mut DeletionSink<'_>) -> Evaluation {
        self.pass(rates, Ask::Slopes, Some(sink))
    }

    fn pass(&self, rates: &[f64], ask: Ask, mut sink: Option<&mut DeletionSink<'_>>) -> Evaluation {
        let drifts = self.drifts(rates);
        let count = self.rates();
        let stride = count + pairs(count);
        let mut out = Evaluation {
            log_likelihood: self.constant,
            stride,
            ..Evaluation::default()
        };
        for start in (0..self.columns.len()).step_by(BLOCK) {
            let block = Block {
                engine: self,
                start,
                size: BLOCK.min(self.columns.len() - start),
                drifts: &drifts,
            };
            block.evaluate(ask, &mut out, &mut sink);
        }
        out
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
}

/// A block of columns on its way through one pass.
struct Block<'a> {
    engine: &'a Engine,
    start: usize,
    size: usize,
    drifts: &'a [Drift],
}

impl Block<'_> {
    fn count(&self, i: usize, visit: usize) -> Count {
        self.engine.columns.column(self.start + i)[visit]
    }

    /// The scaled likelihood of the count of column `i` at a later visit, at the grid's nodes.
    fn likelihood(&self, i: usize, visit: usize) -> &[f64] {
        self.engine.at_grid.get(self.count(i, visit))
    }

    fn evaluate(&self, ask: Ask, out: &mut Evaluation, sink: &mut Option<&mut DeletionSink<'_>>) {
        let slopes = ask == Ask::Slopes;
        let (first, later) = self.carry_back(slopes, sink.is_some());
        let rates = self.engine.rates();
        let base = out.slopes.len();
        for i in 0..self.size {
            let posterior = self.engine.posterior(self.count(i, 0));
            let sums = Sums::of(&first, i, &posterior, slopes);
            let weight = self.engine.columns.weights[self.start + i];
            out.log_likelihood += weight * sums.log_value();
            if slopes {
                out.slopes.extend(sums.log_slopes(rates));
            }
        }
        if let Some(sink) = sink {
            let size = self.engine.columns.visits * 3 * out.stride;
            let mut deletions = vec![0.0; self.size * size];
            let all = &out.slopes[base..];
            let mut write = |i: usize, visit: usize, g: u32, sums: Sums| {
                let at = i * size + (visit * 3 + g as usize) * out.stride;
                let own = &all[i * out.stride..];
                let place = deletions[at..at + out.stride].iter_mut();
                for ((o, new), old) in place.zip(sums.log_slopes(rates)).zip(own) {
                    *o = new - old;
                }
            };
            self.delete_baseline(&first, &mut write);
            self.delete_later(&later, &mut write);
            for (i, deletions) in deletions.chunks_exact(size).enumerate() {
                sink(self.start + i, deletions);
            }
        }
    }

    /// Carries the chance of all later samples back to the baseline. With `keep`, also returns the
    /// chance of all samples after visit v as a function of the frequency at v, for the newest visit
    /// first and down to visit 1.
    fn carry_back(&self, slopes: bool, keep: bool) -> (Jet, Vec<Jet>) {
        let ones = Matrix::from_fn(self.size, self.engine.grid.nodes.len(), |_, _| 1.0);
        let mut function = Jet::constant(ones, self.engine.rates());
        let mut kept = Vec::new();
        for visit in (1..self.engine.columns.visits).rev() {
            if keep {
                kept.push(function.clone());
            }
            function.weigh(|i| self.likelihood(i, visit));
            let rate = self.engine.rate_of_gap[visit - 1];
            function = function.drift(&self.drifts[visit - 1].backward, rate, slopes);
        }
        (function, kept)
    }

    /// Taking one out of the baseline changes the posterior only.
    fn delete_baseline(&self, first: &Jet, write: &mut impl FnMut(usize, usize, u32, Sums)) {
        for i in 0..self.size {
            for g in 0..3 {
                if let Some(less) = without(self.count(i, 0), g) {
                    let posterior = self.engine.posterior(less);
                    write(i, 0, g, Sums::of(first, i, &posterior, true));
                }
            }
        }
    }

    /// Taking one out of a later visit changes its likelihood only: what comes before (a measure,
    /// carried forth) and after (a function, carried back) stay.
    fn delete_later(&self, later: &[Jet], write: &mut impl FnMut(usize, usize, u32, Sums)) {
        let (engine, visits) = (self.engine, self.engine.columns.visits);
        let mut start = Matrix::zeros(self.size, engine.prior.nodes.len());
        for i in 0..self.size {
            start
                .row_mut(i)
                .copy_from_slice(&engine.posterior(self.count(i, 0)));
        }
        let mut measure = Jet::constant(start, engine.rates());
        for visit in 1..visits {
            let rate = engine.rate_of_gap[visit - 1];
            measure = measure.drift(&self.drifts[visit - 1].forward, rate, true);
            let product = measure.times(&later[visits - 1 - visit]);
            for i in 0..self.size {
                for g in 0..3 {
                    if let Some(less) = without(self.count(i, visit), g) {
                        let likelihood = engine.at_grid.get(less);
                        write(i, visit, g, Sums::of(&product, i, likelihood, true));
                    }
                }
            }
            measure.weigh(|i| self.likelihood(i, visit));
        }
    }
}

/// A count without one individual of dosage `g`; `None` where no such individual can be in it.
pub(super) fn without((x, n): Count, g: u32) -> Option<Count> {
    (n >= 2 && x >= g && n - x >= 2 - g).then(|| (x - g, n - 2))
}
