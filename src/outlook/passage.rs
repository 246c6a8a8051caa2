//! From a baseline count to what may be found later, averaged over the effective sizes believed.

use crate::ne::diffusion::{Grid, SHORTEST_SERIES};
use crate::ne::jacobi::Rule;
use crate::ne::likelihood::{BetaPrior, RateWeight};
use crate::ne::matrix::Matrix;
use crate::ne::wright_fisher::{CUT, Chain, binomial_band, copy_dies_out};

/// Up to so many gene copies (2Ne, rounded to a whole number) the chain is exact; beyond, the
/// diffusion differs by less than a hundredth where it matters.
pub(super) const MOST_EXACT_COPIES: u32 = 2000;
/// Nodes over the baseline frequency: enough for loss within one generation of 2000 copies, which
/// needs frequencies of 1/2000 told apart, and for 10 000 copies of a baseline sample.
const BASELINE_NODES: usize = 256;

/// How one interval's drift is computed.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Size {
    NoDrift,
    Copies(u32),
    Rate(f64),
}

fn size_of(rate: f64) -> Size {
    let copies = (1.0 / rate).round();
    if rate <= 0.0 || !copies.is_finite() {
        Size::NoDrift
    } else if copies <= f64::from(MOST_EXACT_COPIES) {
        Size::Copies((copies as u32).max(1))
    } else {
        Size::Rate(rate)
    }
}

/// Drift from the baseline to a later visit.
///
/// The population draws its first 2N copies from the baseline frequency as generation 1. 2Ne is
/// rounded to a whole number while the chain is exact; a fraction of a generation mixes the two
/// neighbouring numbers of generations.
#[derive(Debug, Clone)]
pub(super) struct Passage {
    pool: Pool,
    /// Rule of the prior of the baseline frequency, over the sizes in which it is possible.
    prior: Rule,
    /// By node of the prior, the weight of those sizes.
    possible: Vec<f64>,
    /// Nodes of the later frequency.
    pub nodes: Vec<f64>,
    /// Expectation at each baseline node of a function given at [`Passage::nodes`].
    carry: Matrix,
}

impl Passage {
    /// Prepares for later samples of up to `later_copies` gene copies. `counts` are those that the prior is
    /// bent to (see [`spectrum`]); without any it stays as it is.
    pub fn new(
        prior: BetaPrior,
        counts: &[BaselineCount],
        pool: Pool,
        rates: &[RateWeight],
        generations: f64,
        later_copies: u32,
    ) -> Self {
        let grid = Grid::new(Grid::order_for(later_copies));
        let mut rule = spectrum(prior, counts);
        let possible: Vec<f64> = rule
            .nodes
            .iter()
            .map(|&p| pool.possible(rates, p))
            .collect();
        for (weight, share) in rule.weights.iter_mut().zip(&possible) {
            *weight *= share;
        }
        let mut carry = Matrix::zeros(rule.nodes.len(), grid.nodes.len());
        for r in rates.iter().filter(|r| r.weight > 0.0) {
            let part = match size_of(r.rate) {
                Size::NoDrift => grid.carry(&rule.nodes, 0.0),
                Size::Copies(copies) => {
                    grid.exact(&pool.near(&rule.nodes, copies), generations, copies)
                }
                Size::Rate(u) => grid.carry(&rule.nodes, scaled_time(u, generations)),
            };
            for (i, &p) in rule.nodes.iter().enumerate() {
                if pool.holds(r, p) {
                    let share = r.weight / possible[i];
                    for (c, p) in carry.row_mut(i).iter_mut().zip(part.row(i)) {
                        *c += share * p;
                    }
                }
            }
        }
        Passage {
            pool,
            possible,
            prior: rule,
            nodes: grid.nodes,
            carry,
        }
    }

    /// The function, given at [`Passage::nodes`], carried to the baseline frequency.
    pub fn back(&self, function: &[f64]) -> Vec<f64> {
        (0..self.carry.rows)
            .map(|i| dot(self.carry.row(i), function))
            .collect()
    }

    /// Chance that an allele is gone from the population, by baseline frequency.
    pub fn lost(&self, rates: &[RateWeight], generations: f64) -> Vec<f64> {
        let mut out = vec![0.0; self.prior.nodes.len()];
        for r in rates.iter().filter(|r| r.weight > 0.0) {
            let part = match size_of(r.rate) {
                Size::NoDrift => continue,
                Size::Copies(copies) => lost_exactly(
                    &self.pool.near(&self.prior.nodes, copies),
                    copies,
                    generations,
                ),
                Size::Rate(u) => lost_from_many(&self.prior.nodes, u, generations),
            };
            let nodes = self.prior.nodes.iter().zip(&self.possible);
            for ((o, chance), (&p, possible)) in out.iter_mut().zip(part).zip(nodes) {
                if self.pool.holds(r, p) {
                    *o += r.weight / possible * chance;
                }
            }
        }
        out
    }

    /// Weights of the baseline nodes given a count of copies among copies typed; they add up to 1.
    pub fn posterior(&self, copies: u32, typed: u32) -> Vec<f64> {
        let (x, rest) = (f64::from(copies), f64::from(typed.saturating_sub(copies)));
        let logs = self
            .prior
            .nodes
            .iter()
            .zip(&self.prior.weights)
            .map(|(p, w)| w.ln() + x * p.ln() + rest * (-p).ln_1p());
        let logs: Vec<f64> = logs.collect();
        let top = logs.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        let mut out: Vec<f64> = logs.iter().map(|l| (l - top).exp()).collect();
        let sum: f64 = out.iter().sum();
        for v in &mut out {
            *v /= sum;
        }
        out
    }
}

pub(super) fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

/// What the gene copies were drawn from whose sample is the baseline.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Pool {
    /// A source without end, in which any frequency is possible.
    Endless,
    /// The 2Ne copies of a population as large as it has been since: an allele that is there at all has one
    /// of them, so that lower frequencies are not believed, whatever the prior says of them.
    Finite,
}

impl Pool {
    /// Whether a frequency is nearest to a possible one in a population of this size.
    fn holds(self, r: &RateWeight, p: f64) -> bool {
        self == Pool::Endless || 2.0 * p.min(1.0 - p) >= r.rate
    }

    /// Weight of the sizes in which it is.
    fn possible(self, rates: &[RateWeight], p: f64) -> f64 {
        let able = rates.iter().filter(|r| self.holds(r, p));
        able.map(|r| r.weight).sum()
    }

    /// The nearest frequencies of whole copies, at least one of either allele.
    fn near(self, frequencies: &[f64], copies: u32) -> Vec<f64> {
        let all = f64::from(copies);
        let most = (all - 1.0).max(1.0);
        let nearest = |&p: &f64| match self {
            Pool::Endless => p,
            Pool::Finite => (p * all).round().clamp(1.0, most) / all,
        };
        frequencies.iter().map(nearest).collect()
    }
}

/// Alleles of one count in the baseline sample.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct BaselineCount {
    /// Copies of the allele.
    pub copies: u32,
    /// Gene copies typed.
    pub typed: u32,
    /// Number of alleles.
    pub alleles: u64,
}

/// How many alleles the Beta prior is worth beside those seen.
const PRIOR_ALLELES: f64 = 50.0;
/// Steps of the fit; further ones moved no chance of the demo by more than 0.002.
const STEPS: usize = 60;

/// The spectrum of frequencies: the Beta prior bent to the counts, since no Beta has the shape that drift
/// gives a spectrum near 0 and 1.
///
/// Maximum a posteriori under a Dirichlet process around the Beta prior (Ferguson 1973, Ann Stat 1:209-230)
/// worth [`PRIOR_ALLELES`], on the nodes of the prior, by expectation and maximisation (Dempster, Laird &
/// Rubin 1977, J R Stat Soc B 39:1-38), given that an allele and another beside it were seen.
fn spectrum(prior: BetaPrior, counts: &[BaselineCount]) -> Rule {
    let mut rule = Rule::beta(BASELINE_NODES, prior.a, prior.b);
    let varying = |c: &&BaselineCount| 0 < c.copies && c.copies < c.typed && c.alleles > 0;
    let counts: Vec<&BaselineCount> = counts.iter().filter(varying).collect();
    let Some(most) = counts.iter().map(|c| c.typed).max() else {
        return rule;
    };
    let alleles: f64 = counts.iter().map(|c| c.alleles as f64).sum();
    // Chance that a sample shows both alleles, by node.
    let shown: Vec<f64> = rule
        .nodes
        .iter()
        .map(|&p| {
            let n = f64::from(most);
            1.0 - (n * (-p).ln_1p()).exp() - (n * p.ln()).exp()
        })
        .collect();
    let start: Vec<f64> = rule
        .weights
        .iter()
        .zip(&shown)
        .map(|(w, s)| w * s)
        .collect();
    let start = normalised(start);
    let likelihoods: Vec<Vec<f64>> = counts
        .iter()
        .map(|c| {
            let (x, rest) = (f64::from(c.copies), f64::from(c.typed - c.copies));
            let logs: Vec<f64> = rule
                .nodes
                .iter()
                .map(|p| x * p.ln() + rest * (-p).ln_1p())
                .collect();
            let top = logs.iter().copied().fold(f64::NEG_INFINITY, f64::max);
            let of = logs.iter().zip(&shown);
            of.map(|(l, s)| if *s > 0.0 { (l - top).exp() / s } else { 0.0 })
                .collect()
        })
        .collect();
    let mut seen = start.clone();
    for _ in 0..STEPS {
        let mut next: Vec<f64> = start.iter().map(|s| PRIOR_ALLELES * s).collect();
        for (c, likelihood) in counts.iter().zip(&likelihoods) {
            let sum = dot(&seen, likelihood);
            if sum > 0.0 {
                let share = c.alleles as f64 / sum;
                for ((n, s), l) in next.iter_mut().zip(&seen).zip(likelihood) {
                    *n += share * s * l;
                }
            }
        }
        seen = next
            .into_iter()
            .map(|n| n / (PRIOR_ALLELES + alleles))
            .collect();
    }
    let back = seen.iter().zip(&shown);
    let weights = back
        .map(|(g, s)| if *s > 0.0 { g / s } else { 0.0 })
        .collect();
    rule.weights = normalised(weights);
    rule
}

fn normalised(mut weights: Vec<f64>) -> Vec<f64> {
    let sum: f64 = weights.iter().sum();
    weights.iter_mut().for_each(|w| *w /= sum);
    weights
}

fn scaled_time(u: f64, generations: f64) -> f64 {
    -generations * (-u).ln_1p()
}

/// By the chain, at each baseline frequency.
fn lost_exactly(frequencies: &[f64], copies: u32, generations: f64) -> Vec<f64> {
    let chain = Chain::neutral(copies);
    let mut gone = vec![0.0; copies as usize + 1];
    gone[0] = 1.0;
    let whole = generations.floor() as u32;
    let fraction = generations - generations.floor();
    for _ in 1..whole {
        gone = chain.backward(&gone);
    }
    // With fewer than one whole generation there is no loss yet before the fraction.
    let later = if whole >= 1 {
        chain.backward(&gone)
    } else {
        gone.clone()
    };
    let share = if whole >= 1 { 1.0 - fraction } else { 0.0 };
    let mixed: Vec<f64> = gone
        .iter()
        .zip(&later)
        .map(|(g, l)| share * g + fraction * l)
        .collect();
    frequencies
        .iter()
        .map(|&p| {
            let (start, band) = binomial_band(copies, p, CUT);
            dot(&band, &mixed[start..])
        })
        .collect()
}

/// For many gene copies. Within short scaled times only rare alleles are lost, and each copy dies
/// out for itself. Beyond, the diffusion, at the time at which it gives rare alleles that same
/// chance: taken as it is it runs some two generations late.
pub(super) fn lost_from_many(frequencies: &[f64], u: f64, generations: f64) -> Vec<f64> {
    let whole = generations.floor();
    let fraction = generations - whole;
    let by = |generations: u32| {
        if generations == 0 {
            return vec![0.0; frequencies.len()];
        }
        let survives = 1.0 - copy_dies_out(generations - 1);
        let time = 2.0 * u / survives;
        if time >= SHORTEST_SERIES {
            return Grid::new(Grid::order_for(0)).lost(frequencies, time);
        }
        let gone = |p: f64| ((-p * survives).ln_1p() / u).exp();
        frequencies.iter().map(|&p| gone(p)).collect()
    };
    let mut out = by(whole as u32);
    if fraction > 0.0 {
        for (o, next) in out.iter_mut().zip(by(whole as u32 + 1)) {
            *o = (1.0 - fraction) * *o + fraction * next;
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The two large-population forms and the chain agree where one takes over from the other.
    #[test]
    fn ways_to_be_lost_agree_at_their_borders() {
        let p = [0.0005, 0.002, 0.005, 0.01, 0.03, 0.2];
        for generations in [1.0, 2.5, 10.0, 24.0, 50.0, 400.0, 3000.0] {
            let exact = lost_exactly(&p, 2000, generations);
            let many = lost_from_many(&p, 1.0 / 2000.0, generations);
            for (e, m) in exact.iter().zip(&many) {
                assert!((e - m).abs() < 0.004, "{generations}: {exact:?} {many:?}");
            }
        }
    }

    /// Series of Tavare (1984) with an unlimited number of lineages: N = 50, p = 0.05.
    #[test]
    fn diffusion_loss_equals_the_coalescent_series() {
        for (t, want) in [
            (5.0, 0.12855386680861747),
            (10.0, 0.3554505787168552),
            (20.0, 0.590973457233205),
            (50.0, 0.8013935243052651),
        ] {
            let got = Grid::new(66).lost(&[0.05], t / 100.0)[0];
            assert!((got - want).abs() < 1e-8, "{got} is not {want}");
        }
    }
}
