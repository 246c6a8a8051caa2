//! Simulated populations of known size: bias, spread and coverage. Ignored by default, run with
//! `cargo test --release --lib calibration -- --ignored --nocapture`.

use rand::{Rng, RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use super::engine::Engine;
use super::fit::climb;
use super::*;

/// A population of separate sexes in equal numbers and of free loci.
struct Population {
    loci: usize,
    /// Two gametes an individual, one byte a locus; the first half of the individuals are mothers.
    gametes: Vec<Vec<u8>>,
}

impl Population {
    /// Each gene copy drawn from frequencies that are uniform over loci.
    fn founders(size: usize, loci: usize, random: &mut ChaCha8Rng) -> Self {
        let p: Vec<f64> = (0..loci).map(|_| random.random::<f64>()).collect();
        let gamete = |random: &mut ChaCha8Rng| {
            p.iter()
                .map(|&p| u8::from(random.random::<f64>() < p))
                .collect()
        };
        let gametes = (0..2 * size).map(|_| gamete(random)).collect();
        Population { loci, gametes }
    }

    fn gamete(&self, parent: usize, random: &mut ChaCha8Rng) -> Vec<u8> {
        let (a, b) = (&self.gametes[2 * parent], &self.gametes[2 * parent + 1]);
        let mut word = 0u64;
        (0..self.loci)
            .map(|l| {
                if l % 64 == 0 {
                    word = random.next_u64();
                }
                let pick = word & 1 == 1;
                word >>= 1;
                if pick { a[l] } else { b[l] }
            })
            .collect()
    }

    fn offspring(&self, count: usize, random: &mut ChaCha8Rng) -> Self {
        let size = self.gametes.len() / 2;
        let mut gametes = Vec::new();
        for _ in 0..count {
            let mother = random.random_range(0..size / 2);
            let father = random.random_range(size / 2..size);
            gametes.push(self.gamete(mother, random));
            gametes.push(self.gamete(father, random));
        }
        Population {
            loci: self.loci,
            gametes,
        }
    }

    fn dosage(&self, individual: usize, locus: usize) -> u8 {
        self.gametes[2 * individual][locus] + self.gametes[2 * individual + 1][locus]
    }
}

/// Juveniles sampled from the surplus offspring of each visit's parents (plan II).
pub(super) fn simulate(
    size: usize,
    loci: usize,
    visits: &[usize],
    sample: usize,
    missing: f64,
    random: &mut ChaCha8Rng,
) -> DosagePanel {
    let mut population = Population::founders(size, loci, random).offspring(size, random);
    let mut samples = Vec::new();
    for generation in 0..=visits[visits.len() - 1] {
        if visits.contains(&generation) {
            samples.push(population.offspring(sample, random));
        }
        population = population.offspring(size, random);
    }
    let gaps = visits.windows(2).map(|w| (w[1] - w[0]) as f64).collect();
    let mut panel = DosagePanel::new(gaps, vec![sample; visits.len()]);
    for locus in 0..loci {
        let mut row: Vec<u8> = samples
            .iter()
            .flat_map(|s| (0..sample).map(move |i| s.dosage(i, locus)))
            .collect();
        for d in &mut row {
            if missing > 0.0 && random.random::<f64>() < missing {
                *d = 3;
            }
        }
        panel.push(&row, 1.0, (locus * 50 / loci) as u32);
    }
    panel
}

/// Relative bias of 1/mean(1/Ne), coefficient of variation of 1/Ne, coverage of the 95 % interval.
fn study(
    size: usize,
    loci: usize,
    visits: &[usize],
    sample: usize,
    missing: f64,
    runs: u64,
) -> [f64; 3] {
    let truth = 1.0 / (2.0 * (size as f64 + 0.5));
    let (mut rates, mut covered, mut curvature_covered) = (Vec::new(), 0.0, 0.0);
    let started = std::time::Instant::now();
    for run in 0..runs {
        let mut random = ChaCha8Rng::seed_from_u64(1000 * size as u64 + run);
        let panel = simulate(size, loci, visits, sample, missing, &mut random);
        let result = two_way(&panel, BetaPrior::FLAT, 0.05, 0.95).expect("a fit");
        let i = result.intervals[0];
        rates.push(i.rate);
        covered += f64::from(i.low <= truth && truth <= i.high) / runs as f64;
        let half = 1.96 / result.fit.information.data[0].sqrt();
        curvature_covered += f64::from((i.rate - truth).abs() <= half) / runs as f64;
    }
    let mean: f64 = rates.iter().sum::<f64>() / runs as f64;
    let variance = rates.iter().map(|r| (r - mean).powi(2)).sum::<f64>() / (runs - 1) as f64;
    let (bias, cv) = (truth / mean - 1.0, variance.sqrt() / mean);
    println!(
        "N {size}, {loci} loci, visits {visits:?}, S {sample}, missing {missing}: 1/mean(1/Ne) {:.1} \
         (bias {bias:+.3}), CV {cv:.3}, coverage {covered:.3} (curvature alone {curvature_covered:.3}), \
         {runs} runs, {:.2} s a run",
        0.5 / mean,
        started.elapsed().as_secs_f64() / runs as f64
    );
    [bias, cv, covered]
}

/// The four designs for which the method was worked out, two and three visits; expected spread and
/// coverage from an independent simulation in another language.
#[test]
#[ignore = "minutes: simulates hundreds of populations"]
fn bias_spread_and_coverage() {
    for (size, loci, visits, sample, cv) in [
        (50, 500, &[0, 4][..], 50, 0.16),
        (25, 300, &[0, 2], 25, 0.29),
        (100, 500, &[0, 10], 50, 0.11),
        (500, 2000, &[0, 5], 50, 0.22),
        (50, 1000, &[0, 2], 25, 0.2),
        (100, 500, &[0, 5, 10], 50, 0.11),
        (50, 500, &[0, 2, 4], 50, 0.14),
    ] {
        let runs = 100;
        let [bias, got, coverage] = study(size, loci, visits, sample, 0.0, runs);
        assert!(
            bias.abs() < 3.0 * cv / (runs as f64).sqrt() + 0.03,
            "bias {bias}"
        );
        assert!(got < 1.5 * cv, "spread {got} beside {cv}");
        assert!(coverage > 0.88, "coverage {coverage}");
    }
    study(100, 500, &[0, 10], 50, 0.2, 100);
}

/// Both kernels on the same simulated populations: where the chain is needed.
#[test]
#[ignore = "minutes: simulates hundreds of populations"]
fn small_populations_by_both_kernels() {
    for (size, loci, visits, sample) in [
        (10, 300, &[0, 3][..], 25),
        (25, 300, &[0, 2], 25),
        (50, 500, &[0, 4], 50),
    ] {
        let runs = 600;
        let mut means = [0.0; 2];
        for run in 0..runs {
            let mut random = ChaCha8Rng::seed_from_u64(77_000 * size as u64 + run);
            let counts = simulate(size, loci, visits, sample, 0.0, &mut random).counts();
            let mut engine = Engine::new(&counts, BetaPrior::FLAT, 0.05).expect("loci");
            for (mean, kernel) in means.iter_mut().zip([Kernel::Diffusion, Kernel::Chain]) {
                engine.kernel = kernel;
                *mean += climb(&engine, 0.0, 0.5 / size as f64, 0.5).0 / runs as f64;
            }
        }
        let [diffusion, chain] = means.map(|u| 0.5 / u);
        println!("N {size}: diffusion {diffusion:.2}, chain {chain:.2}");
    }
}

/// Every pair of counts with its exact chance as weight: what infinitely many loci would be under
/// the chain of `copies` gene copies.
fn infinite_panel(copies: u32, generations: u32, sample: u32) -> CountPanel {
    use crate::ne::wright_fisher::{Chain, binomial_probabilities, founder_copies};
    let chain = Chain::neutral(copies);
    let later: Vec<Vec<f64>> = (0..=copies)
        .map(|k| binomial_probabilities(sample, f64::from(k) / f64::from(copies)))
        .collect();
    let mut panel = CountPanel::new(vec![f64::from(generations)]);
    for x in 0..=sample {
        let mut f = founder_copies(copies, 1.0 + f64::from(x), 1.0 + f64::from(sample - x));
        for _ in 1..generations {
            f = chain.forward(&f);
        }
        for y in 0..=sample {
            let chance: f64 = f.iter().zip(&later).map(|(p, l)| p * l[y as usize]).sum();
            panel.push(&[x, y], &[sample, sample], 1e4 * chance);
        }
    }
    panel
}

/// Where the diffusion stops being good: the size it finds from infinitely many loci of the exact
/// chain. The chain's own kernel finds the truth, which proves its interpolation.
#[test]
#[ignore = "a measurement"]
fn diffusion_against_the_chain() {
    for sample in [20, 50, 100] {
        for copies in [4, 6, 10, 20, 40, 100, 200] {
            let mut line = format!("n {sample:3}, 2N {copies:3}:");
            for generations in [1, 2, 5, 10] {
                let panel = infinite_panel(copies, generations, sample);
                let found = |kernel| {
                    let mut engine = Engine::new(&panel, BetaPrior::FLAT, 0.05).unwrap();
                    engine.kernel = kernel;
                    let (u, _) = climb(
                        &engine,
                        0.3 / f64::from(copies),
                        1.2 / f64::from(copies),
                        0.5,
                    );
                    1.0 / u
                };
                line += &format!(
                    "  t {generations}: {:.4} {:.4}",
                    found(Kernel::Diffusion) / f64::from(copies),
                    found(Kernel::Chain) / f64::from(copies)
                );
            }
            println!("{line}");
        }
    }
}

/// 10 000 loci: estimate and interval, asked for within five seconds on one core for three visits.
#[test]
#[ignore = "a measurement of time"]
fn ten_thousand_loci_take_seconds() {
    for (size, visits) in [
        (100, &[0, 5, 10][..]),
        (40, &[0, 5, 10]),
        (100, &[0, 2, 4, 6, 8, 10]),
    ] {
        let mut random = ChaCha8Rng::seed_from_u64(7);
        let panel = simulate(size, 10_000, visits, 50, 0.03, &mut random);
        let started = std::time::Instant::now();
        let one = two_way(&panel, BetaPrior::FLAT, 0.05, 0.95).expect("a fit");
        println!(
            "N {size}, visits {visits:?}: {:.2} s, {:?}",
            started.elapsed().as_secs_f64(),
            one.intervals[0]
        );
        let started = std::time::Instant::now();
        let by = two_way_by_interval(&panel, BetaPrior::FLAT, 0.05, 0.95).expect("a fit");
        println!("by interval: {:.2} s", started.elapsed().as_secs_f64());
        for i in &by.intervals {
            println!(
                "  {:?} {:?}",
                i.effective_size(),
                i.effective_size_interval()
            );
        }
        println!("  {:?}", size_change(&one.fit, &by.fit, one.inflation));
    }
}
