//! The exact Wright-Fisher chain of a whole number of gene copies, and the closed forms of the trade
//! that stand beside it.
//!
//! States are 0..=2N copies of an allele. A generation draws 2N copies from the frequency of the one
//! before. Vectors are multiplied with the matrix, whose rows are cut where they no longer matter;
//! powers are never formed.

use super::jacobi::ln_beta;
use super::matrix::{Matrix, solve_columns};

/// A row keeps what is above this share of its largest entry: about 8.5 standard deviations.
pub(crate) const CUT: f64 = 1e-16;

/// Probabilities of 0..=n successes in n draws at success chance `p`: by the ratio of neighbours
/// outwards from the mode, which cannot underflow, then scaled to add up to 1.
pub fn binomial_probabilities(n: u32, p: f64) -> Vec<f64> {
    let mut out = vec![0.0; n as usize + 1];
    let (start, band) = binomial_band(n, p, 0.0);
    out[start..start + band.len()].copy_from_slice(&band);
    out
}

/// The stretch of a binomial distribution above `cut` times its largest term: the first number of
/// successes and the probabilities from there on.
pub(crate) fn binomial_band(n: u32, p: f64, cut: f64) -> (usize, Vec<f64>) {
    let size = n as usize + 1;
    if p <= 0.0 {
        return (0, vec![1.0]);
    }
    if p >= 1.0 {
        return (size - 1, vec![1.0]);
    }
    let mode = (((f64::from(n) + 1.0) * p) as usize).min(size - 1);
    let odds = p / (1.0 - p);
    let mut below = Vec::new();
    let mut term = 1.0;
    for k in (0..mode).rev() {
        term = term / odds * (k + 1) as f64 / (size - 1 - k) as f64;
        if term <= cut {
            break;
        }
        below.push(term);
    }
    let start = mode - below.len();
    let mut band: Vec<f64> = below.into_iter().rev().collect();
    band.push(1.0);
    term = 1.0;
    for k in mode + 1..size {
        term = term * odds * (size - k) as f64 / k as f64;
        if term <= cut {
            break;
        }
        band.push(term);
    }
    let sum: f64 = band.iter().sum();
    for v in &mut band {
        *v /= sum;
    }
    (start, band)
}

/// Copies of an allele among the first 2N = `copies` drawn from a frequency that is Beta(a, b): the
/// beta-binomial distribution over 0..=2N.
pub fn founder_copies(copies: u32, a: f64, b: f64) -> Vec<f64> {
    let n = f64::from(copies);
    let mut log = ln_beta(a, b + n) - ln_beta(a, b);
    let mut out = vec![log.exp()];
    for k in 0..copies {
        let k = f64::from(k);
        log += ((n - k) / (k + 1.0) * (a + k) / (b + n - k - 1.0)).ln();
        out.push(log.exp());
    }
    out
}

/// The chain of one population size, with or without additive selection.
#[derive(Debug, Clone)]
pub struct Chain {
    rows: Vec<(usize, Vec<f64>)>,
}

impl Chain {
    /// Neutral drift of `copies` = 2N gene copies (at least 1).
    pub fn neutral(copies: u32) -> Self {
        Chain::selected(copies, 0.0)
    }

    /// Drift after selection: fitness 1, 1 + s, 1 + 2s of genotypes with 0, 1, 2 copies of the allele.
    pub fn selected(copies: u32, s: f64) -> Self {
        let rows = (0..=copies)
            .map(|k| {
                let p = f64::from(k) / f64::from(copies);
                let after = p * (1.0 + s + s * p) / (1.0 + 2.0 * s * p);
                binomial_band(copies, after, CUT)
            })
            .collect();
        Chain { rows }
    }

    /// Gene copies, 2N.
    pub fn copies(&self) -> usize {
        self.rows.len() - 1
    }

    /// The distribution of copies one generation later; 2N + 1 numbers in and out.
    pub fn forward(&self, distribution: &[f64]) -> Vec<f64> {
        let mut out = vec![0.0; self.rows.len()];
        for ((start, row), &mass) in self.rows.iter().zip(distribution) {
            if mass > 0.0 {
                for (o, p) in out[*start..].iter_mut().zip(row) {
                    *o += mass * p;
                }
            }
        }
        out
    }

    /// The expectation of a function of the copies one generation later, by copies now.
    pub fn backward(&self, function: &[f64]) -> Vec<f64> {
        self.rows
            .iter()
            .map(|(start, row)| {
                row.iter()
                    .zip(&function[*start..])
                    .map(|(p, f)| p * f)
                    .sum()
            })
            .collect()
    }

    /// The distribution of copies `generations` after `copies` were there.
    pub fn after(&self, copies: usize, generations: u32) -> Vec<f64> {
        let mut now = vec![0.0; self.rows.len()];
        now[copies.min(self.copies())] = 1.0;
        for _ in 0..generations {
            now = self.forward(&now);
        }
        now
    }

    /// Times and chances of absorption, by elimination on the 2N - 1 inner states.
    ///
    /// `None` where the system is singular (2N of 1 has no inner state and gives empty answers).
    pub fn absorption(&self) -> Option<Absorption> {
        let inner = self.copies().saturating_sub(1);
        let last = self.copies();
        let system = self.inner_system();
        let reach = |state: usize| {
            move |k: usize| {
                let (start, row) = &self.rows[k + 1];
                state
                    .checked_sub(*start)
                    .and_then(|i| row.get(i))
                    .copied()
                    .unwrap_or(0.0)
            }
        };
        let (fix, lose) = (reach(last), reach(0));
        let right = Matrix::from_fn(inner, 3, |k, j| match j {
            0 => 1.0,
            1 => fix(k),
            _ => lose(k),
        });
        let solved = solve_columns(system.clone(), right)?;
        let column = |j: usize| -> Vec<f64> { (0..inner).map(|k| solved.row(k)[j]).collect() };
        let (fixation, loss) = (column(1), column(2));
        let weighted = Matrix::from_fn(inner, 2, |k, j| if j == 0 { fixation[k] } else { loss[k] });
        let times = solve_columns(system, weighted)?;
        Some(Absorption {
            mean_time: column(0),
            mean_time_to_fixation: (0..inner).map(|k| times.row(k)[0] / fixation[k]).collect(),
            mean_time_to_loss: (0..inner).map(|k| times.row(k)[1] / loss[k]).collect(),
            fixation,
        })
    }

    /// Expected number of generations spent with 1..2N copies when `copies` (1..2N) are there now,
    /// now included; place k is k + 1 copies.
    pub fn visits(&self, copies: usize) -> Option<Vec<f64>> {
        let inner = self.copies().saturating_sub(1);
        let start = Matrix::from_fn(inner, 1, |k, _| f64::from(k + 1 == copies));
        Some(solve_columns(self.inner_system().transposed(), start)?.data)
    }

    /// Identity less the matrix, between inner states.
    fn inner_system(&self) -> Matrix {
        let inner = self.copies().saturating_sub(1);
        let mut out = Matrix::identity(inner);
        for k in 0..inner {
            let (start, row) = &self.rows[k + 1];
            for (i, p) in row.iter().enumerate() {
                let state = start + i;
                if state > 0 && state <= inner {
                    out.row_mut(k)[state - 1] -= p;
                }
            }
        }
        out
    }
}

/// What becomes of an allele in the end, by its copies now: place k is k + 1 copies.
#[derive(Debug, Clone, PartialEq)]
pub struct Absorption {
    /// Mean generations until it is lost or fixed.
    pub mean_time: Vec<f64>,
    /// Mean generations until it is fixed, among cases in which it is.
    pub mean_time_to_fixation: Vec<f64>,
    /// Mean generations until it is lost, among cases in which it is.
    pub mean_time_to_loss: Vec<f64>,
    /// Chance that it is fixed.
    pub fixation: Vec<f64>,
}

/// Chance of fixation from frequency `p` under fitness 1, 1 + s, 1 + 2s (Kimura 1962, Genetics
/// 47:713-719): (1 - exp(-4 Ne s p)) / (1 - exp(-4 Ne s)), and p itself without selection.
pub fn fixation_chance(effective_size: f64, s: f64, p: f64) -> f64 {
    let strength = 4.0 * effective_size * s;
    if strength.abs() < 1e-8 {
        p
    } else if strength > 0.0 {
        (-strength * p).exp_m1() / (-strength).exp_m1()
    } else {
        // The same with both exponentials turned round, so that neither overflows.
        (strength * (1.0 - p)).exp() * (strength * p).exp_m1() / strength.exp_m1()
    }
}

/// Mean generations until an allele of frequency `p` is lost or fixed in a population of `size`
/// individuals, by the diffusion (Kimura & Ohta 1969, Genetics 61:763-771).
pub fn time_to_absorption(size: f64, p: f64) -> f64 {
    -4.0 * size * (p * p.ln() + (1.0 - p) * (-p).ln_1p())
}

/// Mean generations until fixation among cases in which the allele is fixed; see [`time_to_absorption`].
pub fn time_to_fixation(size: f64, p: f64) -> f64 {
    -4.0 * size * (1.0 - p) * (-p).ln_1p() / p
}

/// Mean generations until loss among cases in which the allele is lost; see [`time_to_absorption`].
pub fn time_to_loss(size: f64, p: f64) -> f64 {
    -4.0 * size * p * p.ln() / (1.0 - p)
}

/// Expected generations spent per unit of frequency at `x`, from `p`, by the diffusion (Ewens 2004,
/// Mathematical Population Genetics).
pub fn sojourn(size: f64, p: f64, x: f64) -> f64 {
    if x >= p {
        4.0 * size * p / x
    } else {
        4.0 * size * (1.0 - p) / (1.0 - x)
    }
}

/// Share of expected heterozygosity left after `generations` (Wright 1931): (1 - 1/(2Ne))^t.
pub fn heterozygosity_left(effective_size: f64, generations: f64) -> f64 {
    (generations * (-0.5 / effective_size).ln_1p()).exp()
}

/// Chance that none of `individuals` carries an allele of frequency `p`: (1 - p)^(2n).
pub fn missed_by_sample(p: f64, individuals: f64) -> f64 {
    (2.0 * individuals * (-p).ln_1p()).exp()
}

/// Expected number of alleles, of these frequencies, left after one generation of `size`
/// individuals (Allendorf 1986, Zoo Biol 5:181-190).
pub fn alleles_kept(frequencies: &[f64], size: f64) -> f64 {
    frequencies
        .iter()
        .map(|&p| 1.0 - missed_by_sample(p, size))
        .sum()
}

/// Chance that a copy of an allele in a large population dies out within `generations` when each
/// copy leaves a Poisson(1) number (Fisher 1930): the limit of the chain for rare alleles.
pub fn copy_dies_out(generations: u32) -> f64 {
    (0..generations).fold(0.0, |q: f64, _| (q - 1.0).exp())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn close(got: f64, want: f64, relative: f64) {
        assert!(
            (got - want).abs() <= relative * want.abs(),
            "{got} is not {want}"
        );
    }

    /// Closed form, equal to the matrix.
    #[test]
    fn heterozygosity_falls_by_the_chain_and_by_the_formula() {
        for (h, ne, t, want) in [
            (0.6, 50.0, 10.0, 0.5426292450052826),
            (1.0, 50.0, 100.0, 0.3660323412732292),
            (0.75, 10.0, 5.0, 0.5803357031249998),
            (1.0, 500.0, 100.0, 0.9047921471137089),
        ] {
            close(h * heterozygosity_left(ne, t), want, 1e-12);
        }
        let after = Chain::neutral(100).after(30, 10);
        let h: f64 = after
            .iter()
            .enumerate()
            .map(|(k, p)| p * 2.0 * (k as f64 / 100.0) * (1.0 - k as f64 / 100.0))
            .sum();
        close(h, 0.42 * heterozygosity_left(50.0, 10.0), 1e-12);
    }

    /// Exact enumeration (matrix powers), 2N = 100.
    #[test]
    fn one_copy_and_five_copies_are_lost() {
        let chain = Chain::neutral(100);
        for (t, want) in [
            (1, 0.36603234127322953),
            (2, 0.5290529260953449),
            (5, 0.7289928827526992),
            (10, 0.8386106446748572),
            (20, 0.9091313601902897),
            (50, 0.9588781575979624),
            (100, 0.9769559112613482),
        ] {
            close(chain.after(1, t)[0], want, 1e-10);
        }
        close(chain.after(1, 50)[100], 3.7159911903046924e-5, 1e-8);
        close(chain.after(1, 100)[100], 0.0014302860825874107, 1e-9);
        for (t, want) in [
            (1, 0.005920529220334024),
            (5, 0.20093522298247818),
            (10, 0.40944809009038485),
            (20, 0.6168292711859549),
            (50, 0.8081723995655586),
        ] {
            close(chain.after(5, t)[0], want, 1e-10);
        }
    }

    /// Arithmetic (Fisher 1930).
    #[test]
    fn one_copy_in_one_generation() {
        for (n, want) in [
            (1.0, 0.25),
            (5.0, 0.3486784401000001),
            (500.0, 0.36769542477096373),
        ] {
            close(missed_by_sample(1.0 / (2.0 * n), n), want, 1e-12);
        }
        close(copy_dies_out(1), (-1.0f64).exp(), 1e-15);
    }

    /// Fundamental matrix of the exact chain, N = 50; diffusion by Kimura & Ohta (1969).
    #[test]
    fn absorption_times() {
        let times = Chain::neutral(100).absorption().unwrap();
        for (copies, mean, fix, loss) in [
            (1, 10.536923063848192, 196.74168779997055, 8.65606685439241),
            (5, 38.398848487073955, 192.67330457790325, 30.2791402717672),
            (10, 63.45446330576835, 187.42573795330532, 49.67987723381984),
            (
                50,
                136.60227838202783,
                136.60227838202803,
                136.60227838202786,
            ),
        ] {
            close(times.mean_time[copies - 1], mean, 1e-9);
            close(times.mean_time_to_fixation[copies - 1], fix, 1e-9);
            close(times.mean_time_to_loss[copies - 1], loss, 1e-9);
            close(times.fixation[copies - 1], copies as f64 / 100.0, 1e-10);
        }
        for (p, mean, fix, loss) in [
            (
                0.01,
                11.200306870969468,
                198.99664990932873,
                9.303374113107255,
            ),
            (0.1, 65.01659467828964, 189.6489281840873, 51.16855762208989),
        ] {
            close(time_to_absorption(50.0, p), mean, 1e-10);
            close(time_to_fixation(50.0, p), fix, 1e-10);
            close(time_to_loss(50.0, p), loss, 1e-10);
        }
        // Textbook: about 15 generations to loss, 4N to fixation, N = 1000.
        close(time_to_loss(1000.0, 0.0005), 15.20940962389611, 1e-9);
        close(time_to_fixation(1000.0, 0.0005), 3998.9998332912137, 1e-9);
        close(time_to_absorption(1000.0, 0.0005), 17.201304835729772, 1e-9);
    }

    /// Exact chain by elimination in another implementation; formula of Kimura (1962).
    #[test]
    fn fixation_under_selection() {
        for (s, one, ten, kimura_one, kimura_ten) in [
            (
                0.01,
                0.02279298809721722,
                0.20872398793001437,
                0.02290058367058745,
                0.20964108215325955,
            ),
            (
                0.02,
                0.039501285873008586,
                0.3325371899898442,
                0.039942126411477624,
                0.3358309116701862,
            ),
            (
                -0.01,
                0.0031269079004331473,
                0.03428248922391612,
                0.0031618661213722817,
                0.03465343780550409,
            ),
            (
                0.05,
                0.09308643633978624,
                0.6224976495416709,
                0.09516690253473127,
                0.6321492583604866,
            ),
        ] {
            let chain = Chain::selected(100, s).absorption().unwrap();
            close(chain.fixation[0], one, 1e-9);
            close(chain.fixation[9], ten, 1e-9);
            close(fixation_chance(50.0, s, 0.01), kimura_one, 1e-10);
            close(fixation_chance(50.0, s, 0.1), kimura_ten, 1e-10);
        }
        for (ne, s, want) in [
            (1000.0, 0.01, 0.019801326693244747),
            (250.0, 0.01, 0.004987747250692534),
            (1000.0, -0.001, 3.735206033720002e-5),
        ] {
            close(fixation_chance(ne, s, 0.0005), want, 1e-10);
        }
        assert_eq!(fixation_chance(100.0, 0.0, 0.3), 0.3);
        assert!(fixation_chance(1e5, -0.5, 0.5) >= 0.0);
    }

    /// Fundamental matrix, N = 50 from 10 copies; diffusion by Ewens (2004).
    #[test]
    fn visits_to_a_state() {
        let visits = Chain::neutral(100).visits(10).unwrap();
        for (copies, exact, diffusion) in [
            (5, 1.8356389232336006, 1.8947368421052633),
            (20, 0.9995328791032645, 1.0),
            (50, 0.39933444924704403, 0.4),
        ] {
            close(visits[copies - 1], exact, 1e-9);
            close(
                sojourn(50.0, 0.1, copies as f64 / 100.0) / 100.0,
                diffusion,
                1e-12,
            );
        }
    }

    /// Arithmetic.
    #[test]
    fn missed_and_kept() {
        for (p, n, want) in [
            (0.05, 30.0, 0.046069798986951946),
            (0.01, 150.0, 0.04904089407128572),
            (0.1, 10.0, 0.12157665459056935),
        ] {
            close(missed_by_sample(p, n), want, 1e-12);
        }
        close(
            alleles_kept(&[0.7, 0.1, 0.1, 0.05, 0.05], 5.0),
            3.1051633364232423,
            1e-12,
        );
    }

    /// Exact matrix, N = 50, five copies, 40 gene copies sampled later.
    #[test]
    fn not_seen_and_lost() {
        let chain = Chain::neutral(100);
        for (t, unseen, lost) in [
            (10, 0.5077233634032298, 0.806439332131353),
            (20, 0.6602540703517913, 0.9342301681795022),
            (50, 0.818640064790022, 0.9872133484852732),
        ] {
            let after = chain.after(5, t);
            let p: f64 = after
                .iter()
                .enumerate()
                .map(|(k, m)| m * (1.0 - k as f64 / 100.0).powi(40))
                .sum();
            close(p, unseen, 1e-10);
            close(after[0] / p, lost, 1e-10);
        }
    }

    #[test]
    fn forward_and_backward_are_transposes() {
        let chain = Chain::neutral(37);
        let f: Vec<f64> = (0..38).map(|k| (k as f64).sin()).collect();
        let d = chain.after(11, 3);
        let mut g = f.clone();
        for _ in 0..3 {
            g = chain.backward(&g);
        }
        let dot: f64 = d.iter().zip(&f).map(|(a, b)| a * b).sum();
        assert!((dot - g[11]).abs() < 1e-13);
    }

    #[test]
    fn founders_are_beta_binomial() {
        let founders = founder_copies(30, 2.5, 0.4);
        let sum: f64 = founders.iter().sum();
        let mean: f64 = founders.iter().enumerate().map(|(k, p)| k as f64 * p).sum();
        close(sum, 1.0, 1e-11);
        close(mean, 30.0 * 2.5 / 2.9, 1e-11);
        assert_eq!(binomial_probabilities(3, 0.0), [1.0, 0.0, 0.0, 0.0]);
        assert_eq!(binomial_probabilities(2, 1.0), [0.0, 0.0, 1.0]);
        close(binomial_probabilities(4, 0.5)[2], 0.375, 1e-14);
    }
}
