//! The number of ancestors of a sample, and what their types say of the sample's.

use statrs::function::factorial::{ln_binomial, ln_factorial};
use statrs::function::gamma::ln_gamma;

/// Probability below which the highest states are dropped as the process runs.
const NEGLIGIBLE: f64 = 1e-20;
/// Mean number of events in one piece of the uniformised process.
const EVENTS_A_PIECE: f64 = 8.0;

/// Chance that `n` lineages have j = 0..=n ancestors a scaled time `time` = t/(2Ne) back (entry 0
/// is 0 unless n is 0).
///
/// Pure death at rate k(k-1)/2 (Tavare 1984, Theor Popul Biol 26:119-164), by uniformisation: only
/// positive numbers are added, where the closed form's alternating sum loses every digit.
pub fn ancestors(n: usize, time: f64) -> Vec<f64> {
    let mut now = vec![0.0; n + 1];
    now[n] = 1.0;
    let rate = |k: usize| k as f64 * k.saturating_sub(1) as f64 / 2.0;
    let (mut top, mut left) = (n, time);
    while left > 0.0 && top > 1 {
        let fastest = rate(top);
        let piece = left.min(EVENTS_A_PIECE / fastest);
        let events = fastest * piece;
        let mut weight = (-events).exp();
        let mut state = now.clone();
        let mut sum: Vec<f64> = state.iter().map(|s| s * weight).collect();
        let mut count = 0.0;
        while count < events || weight > 1e-22 {
            count += 1.0;
            weight *= events / count;
            for k in 1..=top {
                let stay = state[k] * (1.0 - rate(k) / fastest);
                let arrive = if k < top {
                    state[k + 1] * rate(k + 1) / fastest
                } else {
                    0.0
                };
                state[k] = stay + arrive;
            }
            for (s, v) in sum.iter_mut().zip(&state) {
                *s += weight * v;
            }
        }
        now = sum;
        left -= piece;
        while top > 1 && now[top] < NEGLIGIBLE {
            now[top] = 0.0;
            top -= 1;
        }
    }
    now
}

/// Chance that `n` gene copies have j = 0..=n ancestors `generations` back in a population of
/// `copies` gene copies: each picks its parent at random, so the occupied parents follow a simple
/// recursion over lineages (Stirling numbers of the second kind without the numbers).
pub fn discrete_ancestors(n: usize, copies: u32, generations: u32) -> Vec<f64> {
    let m = f64::from(copies);
    // parents[i][j]: i copies have j parents one generation back.
    let mut parents = vec![vec![1.0]];
    for i in 0..n {
        let last = &parents[i];
        let next = (0..=i + 1)
            .map(|j| {
                let old = last.get(j).map_or(0.0, |p| p * j as f64 / m);
                let new = if j == 0 {
                    0.0
                } else {
                    last[j - 1] * (m - (j - 1) as f64).max(0.0) / m
                };
                old + new
            })
            .collect();
        parents.push(next);
    }
    let mut now = vec![0.0; n + 1];
    now[n] = 1.0;
    for _ in 0..generations {
        let mut next = vec![0.0; n + 1];
        for (i, p) in now.iter().enumerate() {
            for (j, q) in parents[i].iter().enumerate() {
                next[j] += p * q;
            }
        }
        now = next;
    }
    now
}

/// Chance of descendant counts `c` when the ancestors have counts `a`, by allele: Polya's urn, prod
/// C(c_i - 1, a_i - 1) / C(n - 1, j - 1). Zero unless every allele has ancestors exactly when it
/// has descendants.
pub fn urn(c: &[u64], a: &[u64]) -> f64 {
    let (n, j): (u64, u64) = (c.iter().sum(), a.iter().sum());
    if c.len() != a.len() || n < j || j == 0 {
        return f64::from(n == 0 && j == 0 && c.len() == a.len());
    }
    let mut log = -ln_binomial(n - 1, j - 1);
    for (&c, &a) in c.iter().zip(a) {
        if (c == 0) != (a == 0) || c < a {
            return 0.0;
        }
        if c > 0 {
            log += ln_binomial(c - 1, a - 1);
        }
    }
    log.exp()
}

/// Chance of unordered counts `u` when the frequencies are Dirichlet(`alpha`).
pub fn dirichlet_multinomial(u: &[u64], alpha: &[f64]) -> f64 {
    let (m, total): (u64, f64) = (u.iter().sum(), alpha.iter().sum());
    let mut log = ln_factorial(m) + ln_gamma(total) - ln_gamma(total + m as f64);
    for (&u, &a) in u.iter().zip(alpha) {
        log += ln_gamma(u as f64 + a) - ln_gamma(a) - ln_factorial(u);
    }
    log.exp()
}

/// The likelihood of small samples by the coalescent, to hold the fast path against.
#[cfg(test)]
pub(crate) mod oracle {
    use std::collections::BTreeMap;

    use super::*;

    /// P(all samples), oldest first, `times` between them, frequencies Dirichlet(`alpha`) at first
    /// (Berthier et al. 2002, Genetics 160:741-751; Anderson 2005, Genetics 170:955-967).
    pub(crate) fn likelihood(samples: &[Vec<u64>], times: &[f64], alpha: &[f64]) -> f64 {
        let mut now = BTreeMap::from([(samples[samples.len() - 1].clone(), 1.0)]);
        for m in (0..times.len()).rev() {
            let mut next: BTreeMap<Vec<u64>, f64> = BTreeMap::new();
            for (u, chance) in &now {
                let n: u64 = u.iter().sum();
                let g = ancestors(n as usize, times[m]);
                for a in vectors_up_to(u) {
                    let j: u64 = a.iter().sum();
                    let weight = chance * g[j as usize] * urn(u, &a);
                    if weight > 0.0 {
                        let joined: Vec<u64> =
                            a.iter().zip(&samples[m]).map(|(a, s)| a + s).collect();
                        let all: u64 = joined.iter().sum();
                        let log: f64 = joined
                            .iter()
                            .zip(&a)
                            .map(|(&u, &a)| ln_binomial(u, a))
                            .sum();
                        *next.entry(joined).or_default() +=
                            weight * (log - ln_binomial(all, j)).exp();
                    }
                }
            }
            now = next;
        }
        now.iter()
            .map(|(u, chance)| chance * dirichlet_multinomial(u, alpha))
            .sum()
    }

    fn vectors_up_to(u: &[u64]) -> Vec<Vec<u64>> {
        let mut all = vec![vec![]];
        for &limit in u {
            all = all
                .into_iter()
                .flat_map(|v: Vec<u64>| {
                    (0..=limit).map(move |k| v.iter().copied().chain([k]).collect())
                })
                .collect();
        }
        all
    }
}

#[cfg(test)]
mod tests {
    use super::oracle::likelihood;
    use super::*;

    fn close(got: f64, want: f64, absolute: f64) {
        assert!((got - want).abs() < absolute, "{got} is not {want}");
    }

    /// Closed form of Tavare (1984) at 50 digits, equal to the matrix exponential.
    #[test]
    fn ancestors_equal_the_closed_form() {
        for (n, t, want) in [
            (2, 0.1, vec![0.09516258196404043, 0.9048374180359595]),
            (
                3,
                1.0,
                vec![0.4730743724267685, 0.4771385592053676, 0.049787068367863944],
            ),
            (
                5,
                0.25,
                vec![
                    0.01150592902898913,
                    0.1439318215381085,
                    0.409864346997676,
                    0.3526129038113276,
                    0.0820849986238988,
                ],
            ),
            (
                6,
                0.1,
                vec![
                    0.00012801130943105465,
                    0.005702720152191217,
                    0.06540472322018494,
                    0.2713865421007255,
                    0.43424784306903746,
                    0.22313016014842982,
                ],
            ),
            (
                6,
                2.0,
                vec![
                    0.7144170450731608,
                    0.27675586549135683,
                    0.008801497825743253,
                    2.5585426465286682e-05,
                    6.183180138626608e-09,
                    9.357622968840175e-14,
                ],
            ),
        ] {
            let got = ancestors(n, t);
            for (j, want) in want.into_iter().enumerate() {
                close(got[j + 1], want, 1e-12);
            }
        }
        for (n, t, mean) in [
            (20, 0.1, 10.297729278018958),
            (50, 0.05, 22.529120922631165),
        ] {
            let got: f64 = ancestors(n, t)
                .iter()
                .enumerate()
                .map(|(j, p)| j as f64 * p)
                .sum();
            close(got, mean, 1e-10);
        }
    }

    #[test]
    fn ancestors_add_up_to_one_for_large_samples_and_short_times() {
        for (n, t) in [
            (400, 0.001),
            (400, 1.0),
            (1000, 0.01),
            (100, 0.0),
            (1, 3.0),
            (0, 1.0),
        ] {
            let got = ancestors(n, t);
            assert!(got.iter().all(|&p| p >= 0.0));
            close(got.iter().sum(), 1.0, 1e-12);
        }
    }

    /// Exact fractions: S2(n,j) M!/(M-j)!/M^n.
    #[test]
    fn discrete_ancestors_equal_exact_fractions() {
        let one = discrete_ancestors(3, 10, 1);
        for (got, want) in one[1..].iter().zip([0.01, 0.27, 0.72]) {
            close(*got, want, 1e-15);
        }
        let one = discrete_ancestors(4, 20, 1);
        for (got, want) in one[1..].iter().zip([
            1.0 / 8000.0,
            133.0 / 8000.0,
            513.0 / 2000.0,
            2907.0 / 4000.0,
        ]) {
            close(*got, want, 1e-15);
        }
        let ten = discrete_ancestors(4, 20, 10);
        for (got, want) in ten[1..].iter().zip([
            0.12400646877386366,
            0.4995610194465796,
            0.3353316995513406,
            0.04110081222821612,
        ]) {
            close(*got, want, 1e-12);
        }
    }

    /// Exact fractions.
    #[test]
    fn urn_equals_exact_fractions() {
        for (a, want) in [
            ([1, 1], 0.25),
            ([1, 2], 1.0 / 6.0),
            ([2, 1], 1.0 / 3.0),
            ([2, 2], 0.5),
            ([3, 1], 0.25),
            ([3, 2], 1.0),
        ] {
            close(urn(&[3, 2], &a), want, 1e-14);
        }
        assert_eq!(urn(&[3, 0], &[2, 1]), 0.0);
    }

    /// Backward recursion, and a forward Wright-Fisher calculation extrapolated to large populations.
    #[test]
    fn likelihood_of_two_three_and_four_samples() {
        let two = |t| likelihood(&[vec![3, 1], vec![2, 2]], &[t], &[1.0, 1.0]);
        for (t, want) in [
            (0.02, 0.04649845446872249),
            (0.5, 0.027821948383754416),
            (2.0, 0.006186767508363921),
        ] {
            close(two(t), want, 1e-13);
        }
        let four = |a: f64| {
            likelihood(
                &[vec![5, 5], vec![4, 2], vec![6, 0], vec![3, 1]],
                &[0.2, 0.1, 0.3],
                &[a, a],
            )
        };
        close(four(1.0), 0.00036460161717369614, 1e-14);
        close(four(0.5), 0.00024190294035539674, 1e-14);
        let three = |t| likelihood(&[vec![4, 2, 2], vec![1, 0, 3]], &[t], &[1.0; 3]);
        for (t, want) in [
            (0.05, 0.0012270326723906437),
            (0.2, 0.0014216211310651456),
            (1.0, 0.001018129736705307),
        ] {
            close(three(t), want, 1e-14);
        }
        // Conditional on the locus being polymorphic in the pooled samples.
        let fixed = likelihood(&[vec![4, 0], vec![4, 0]], &[0.5], &[1.0, 1.0]);
        close(fixed, 0.13797667055946305, 1e-13);
        close(two(0.5) / (1.0 - 2.0 * fixed), 0.03842562912554538, 1e-12);
    }

    /// Four loci of 2, 3, 2 and 4 alleles three generations apart (backward recursion).
    #[test]
    fn likelihood_of_a_small_data_set() {
        let loci: [[&[u64]; 2]; 4] = [
            [&[30, 10], &[22, 18]],
            [&[12, 20, 8], &[20, 14, 6]],
            [&[38, 2], &[36, 0]],
            [&[5, 9, 14, 10], &[9, 11, 12, 8]],
        ];
        let log = |ne: f64| -> f64 {
            loci[..3]
                .iter()
                .map(|[b, c]| {
                    likelihood(
                        &[b.to_vec(), c.to_vec()],
                        &[3.0 / (2.0 * ne)],
                        &vec![1.0; b.len()],
                    )
                    .ln()
                })
                .sum()
        };
        // The fourth locus takes seconds here; the other three are held against the whole by its part.
        let fourth = |ne: f64| {
            likelihood(
                &[loci[3][0].to_vec(), loci[3][1].to_vec()],
                &[3.0 / (2.0 * ne)],
                &[1.0; 4],
            )
            .ln()
        };
        close(log(40.0) + fourth(40.0), -42.287433, 1e-5);
        close(log(1000.0) + fourth(1000.0), -42.807748, 1e-5);
    }
}
