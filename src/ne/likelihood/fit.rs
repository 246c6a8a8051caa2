//! The drift rates that make the likelihood largest.

use super::engine::{Ask, Engine, Evaluation};
use super::jet::pair;
use super::{BetaPrior, CountPanel, Kernel, NoFit};
use crate::ne::matrix::{Matrix, solve};

/// Drift rates are kept at or below this: 2Ne = 2.
const LARGEST_RATE: f64 = 0.5;
/// Where the search starts: it brackets from 2Ne of 4 to no drift at all.
const COARSE_RATES: [f64; 8] = [
    0.0,
    1.0 / 16384.0,
    1.0 / 4096.0,
    1.0 / 1024.0,
    1.0 / 256.0,
    1.0 / 64.0,
    1.0 / 16.0,
    0.25,
];
/// Above this rate (2Ne under 100) the exact chain replaces the diffusion.
///
/// Measured with infinitely many loci of the exact chain, samples of 20 to 100 gene copies, 1 to 10
/// generations: the diffusion finds 0.993 to 0.998 of the true size at 2N = 200, 0.984 to 0.995 at
/// 100, 0.955 to 0.985 at 40, 0.904 to 0.973 at 20, 0.809 to 0.964 at 10 and 0.717 to 0.962 at 4;
/// lowest with most gene copies sampled. The chain finds 1.0000 throughout. In 600 simulated
/// populations of separate sexes each, 1/mean(1/Ne) was, by diffusion and chain, 9.93 and 10.58 (true
/// 10.5), 25.30 and 25.85 (true 25.5), 50.99 and 51.62 (true 50.5).
const CHAIN_RATE: f64 = 1.0 / 100.0;
/// A step of less than this share of the standard error ends the search.
const SMALL_STEP: f64 = 1e-5;
/// Newton steps before the search gives up refining; it takes 4 to 8 as a rule.
const MOST_STEPS: usize = 60;

/// A fit of one drift rate, or of one an interval.
#[derive(Debug, Clone, PartialEq)]
pub struct Fit {
    /// Drift rates u = 1/(2Ne) that make the likelihood largest, each from 0 (no drift) to 0.5.
    pub rates: Vec<f64>,
    /// The same, moved on by one Newton step where a rate is held at 0: may be negative, and is then
    /// nearly unbiased where rates cut at 0 would not be.
    pub signed_rates: Vec<f64>,
    /// Logarithm of P(later counts | baseline counts) at [`Fit::rates`].
    pub log_likelihood: f64,
    /// Slope of it in each rate: 0 unless the rate is 0 or 0.5.
    pub score: Vec<f64>,
    /// Minus its second derivatives, square; sums of products of slopes where those do not curve
    /// down, as happens at a rate of 0.
    pub information: Matrix,
    /// Whether [`Fit::information`] is minus the second derivatives.
    pub observed: bool,
    /// How drift was computed.
    pub kernel: Kernel,
    /// Rows of the panel used.
    pub rows: usize,
}

/// One effective size for all intervals.
///
/// `limit` is the smallest baseline minor allele frequency of the rows used.
///
/// # Errors
/// [`NoFit`] says why there is no estimate.
pub fn fit_constant(panel: &CountPanel, prior: BetaPrior, limit: f64) -> Result<Fit, NoFit> {
    let mut engine = Engine::new(panel, prior, limit)?;
    Ok(constant(&mut engine)?.0)
}

/// One effective size an interval, all found together.
///
/// # Errors
/// [`NoFit`] says why there is no estimate.
pub fn fit_by_interval(panel: &CountPanel, prior: BetaPrior, limit: f64) -> Result<Fit, NoFit> {
    let mut engine = Engine::new(panel, prior, limit)?;
    let start = constant(&mut engine)?.0.rates[0];
    Ok(by_interval(&mut engine, start)?.0)
}

/// Log-likelihood at each of `rates`, one rate for all intervals.
///
/// # Errors
/// [`NoFit`] says why there is none.
pub fn profile(
    panel: &CountPanel,
    prior: BetaPrior,
    limit: f64,
    kernel: Kernel,
    rates: &[f64],
) -> Result<Vec<f64>, NoFit> {
    let mut engine = Engine::new(panel, prior, limit)?;
    engine.kernel = kernel;
    Ok(rates
        .iter()
        .map(|&u| {
            engine
                .evaluate(&[u.clamp(0.0, LARGEST_RATE)], Ask::Value)
                .log_likelihood
        })
        .collect())
}

/// Fits one rate, and leaves the engine with the kernel that suits it; returns the last evaluation
/// with it.
pub(super) fn constant(engine: &mut Engine) -> Result<(Fit, Evaluation), NoFit> {
    engine.rate_of_gap.fill(0);
    engine.kernel = Kernel::Diffusion;
    let coarse: Vec<f64> = COARSE_RATES
        .iter()
        .map(|&u| engine.evaluate(&[u], Ask::Value).log_likelihood)
        .collect();
    let best = (0..coarse.len())
        .max_by(|&i, &j| coarse[i].total_cmp(&coarse[j]))
        .unwrap_or(0);
    let low = COARSE_RATES[best.saturating_sub(1)];
    let high = COARSE_RATES.get(best + 1).copied().unwrap_or(LARGEST_RATE);
    let (mut u, mut last) = climb(engine, low, COARSE_RATES[best], high);
    if u > CHAIN_RATE {
        // The diffusion finds sizes that are somewhat too small, never half.
        engine.kernel = Kernel::Chain;
        (u, last) = climb(engine, 0.5 * u, u, (1.2 * u).min(LARGEST_RATE));
    }
    finish(engine, vec![u], last)
}

/// Newton steps on one rate between two bounds; halves the bracket where a step leaves it.
pub(super) fn climb(engine: &Engine, mut low: f64, start: f64, mut high: f64) -> (f64, Evaluation) {
    let mut u = start;
    let mut last = engine.evaluate(&[u], Ask::Slopes);
    for _ in 0..MOST_STEPS {
        let (score, information) = totals(engine, &last);
        let (s, i) = (score[0], information.data[0]);
        if (u <= 0.0 && s <= 0.0) || (u >= LARGEST_RATE && s >= 0.0) || s == 0.0 {
            break;
        }
        if s > 0.0 {
            low = u
        } else {
            high = u
        }
        let newton = u + s / i;
        let next = if i > 0.0 && newton >= low && newton <= high && newton != u {
            newton
        } else if low > 0.0 {
            (low * high).sqrt()
        } else {
            0.5 * high
        };
        let step = (next - u).abs();
        u = next;
        last = engine.evaluate(&[u], Ask::Slopes);
        if (i > 0.0 && step * i.sqrt() < SMALL_STEP) || step < 1e-12 {
            break;
        }
    }
    (u, last)
}

/// Fits one rate an interval, from the rate `start` for all, with the engine's kernel: that of the
/// constant fit, so that their likelihoods can be compared.
pub(super) fn by_interval(engine: &mut Engine, start: f64) -> Result<(Fit, Evaluation), NoFit> {
    let count = engine.gaps.len();
    for (gap, rate) in engine.rate_of_gap.iter_mut().enumerate() {
        *rate = gap;
    }
    let mut rates = vec![start; count];
    let mut last = engine.evaluate(&rates, Ask::Slopes);
    let mut damping = 0.0;
    for _ in 0..MOST_STEPS {
        let (score, information) = totals(engine, &last);
        let Some(step) = bounded_step(&rates, &score, &information, damping) else {
            damping = if damping == 0.0 { 1e-3 } else { damping * 10.0 };
            if damping > 1e6 {
                break;
            }
            continue;
        };
        let next: Vec<f64> = rates
            .iter()
            .zip(&step)
            .map(|(u, s)| (u + s).clamp(0.0, LARGEST_RATE))
            .collect();
        let size = (0..count)
            .map(|p| (next[p] - rates[p]).abs() * information.row(p)[p].abs().sqrt())
            .fold(0.0, f64::max);
        let tried = engine.evaluate(&next, Ask::Slopes);
        // Rounding alone may lower the likelihood of a step that no longer matters.
        if tried.log_likelihood >= last.log_likelihood - 1e-9 * last.log_likelihood.abs() {
            (rates, last) = (next, tried);
            damping *= 0.1;
            if size < SMALL_STEP {
                break;
            }
        } else {
            damping = if damping == 0.0 { 1e-2 } else { damping * 10.0 };
        }
    }
    finish(engine, rates, last)
}

/// A damped Newton step of the rates that are free to move; `None` where the damped curvature is
/// not that of a maximum.
fn bounded_step(
    rates: &[f64],
    score: &[f64],
    information: &Matrix,
    damping: f64,
) -> Option<Vec<f64>> {
    let stuck = |p: usize| {
        (rates[p] <= 0.0 && score[p] <= 0.0) || (rates[p] >= LARGEST_RATE && score[p] >= 0.0)
    };
    let free: Vec<usize> = (0..rates.len()).filter(|&p| !stuck(p)).collect();
    let mut step = vec![0.0; rates.len()];
    let matrix = Matrix::from_fn(free.len(), free.len(), |i, j| {
        let value = information.row(free[i])[free[j]];
        if i == j {
            value + damping * value.abs().max(1.0)
        } else {
            value
        }
    });
    let right: Vec<f64> = free.iter().map(|&p| score[p]).collect();
    if free.is_empty() {
        return Some(step);
    }
    let solved = solve(matrix, right.clone())?;
    // An ascent direction, or the curvature is wrong.
    let ascent: f64 = solved.iter().zip(&right).map(|(a, b)| a * b).sum();
    if ascent.is_nan() || ascent < 0.0 {
        return None;
    }
    for (&p, s) in free.iter().zip(solved) {
        step[p] = s;
    }
    Some(step)
}

/// Weighted sums of slopes and curvatures over the columns.
pub(super) fn totals(engine: &Engine, evaluation: &Evaluation) -> (Vec<f64>, Matrix) {
    let rates = engine.rates();
    let mut sums = vec![0.0; evaluation.stride];
    for (slopes, weight) in evaluation
        .slopes
        .chunks_exact(evaluation.stride)
        .zip(&engine.columns.weights)
    {
        for (sum, s) in sums.iter_mut().zip(slopes) {
            *sum += weight * s;
        }
    }
    let information = Matrix::from_fn(rates, rates, |p, q| -sums[rates + pair(rates, p, q)]);
    sums.truncate(rates);
    (sums, information)
}

/// Weighted sum of products of the columns' slopes: the information expected of columns that obey
/// the model, never negative.
fn outer_products(engine: &Engine, evaluation: &Evaluation) -> Matrix {
    let rates = engine.rates();
    let mut out = Matrix::zeros(rates, rates);
    for (slopes, weight) in evaluation
        .slopes
        .chunks_exact(evaluation.stride)
        .zip(&engine.columns.weights)
    {
        for p in 0..rates {
            for q in 0..rates {
                out.row_mut(p)[q] += weight * slopes[p] * slopes[q];
            }
        }
    }
    out
}

/// Whether a symmetric matrix has only positive eigenvalues, by Cholesky's factor.
fn is_positive(matrix: &Matrix) -> bool {
    let n = matrix.rows;
    let mut factor = Matrix::zeros(n, n);
    for i in 0..n {
        for j in 0..=i {
            let dot: f64 = factor.row(i)[..j]
                .iter()
                .zip(&factor.row(j)[..j])
                .map(|(a, b)| a * b)
                .sum();
            let rest = matrix.row(i)[j] - dot;
            if i == j {
                if rest.is_nan() || rest <= 0.0 {
                    return false;
                }
                factor.row_mut(i)[i] = rest.sqrt();
            } else {
                factor.row_mut(i)[j] = rest / factor.row(j)[j];
            }
        }
    }
    true
}

fn finish(engine: &Engine, rates: Vec<f64>, last: Evaluation) -> Result<(Fit, Evaluation), NoFit> {
    let (score, mut information) = totals(engine, &last);
    let observed = is_positive(&information);
    if !observed {
        information = outer_products(engine, &last);
        if !is_positive(&information) {
            return Err(NoFit::Uninformative);
        }
    }
    let mut signed_rates = rates.clone();
    if rates.iter().any(|&u| u <= 0.0) {
        let step = solve(information.clone(), score.clone()).ok_or(NoFit::Uninformative)?;
        for (u, s) in signed_rates.iter_mut().zip(step) {
            *u += s;
        }
    }
    let rows = engine.columns.of_row.iter().flatten().count();
    let fit = Fit {
        rates,
        signed_rates,
        log_likelihood: last.log_likelihood,
        score,
        information,
        observed,
        kernel: engine.kernel,
        rows,
    };
    Ok((fit, last))
}
