//! Recombination and disequilibrium.

use super::super::dice::{Dice, Purpose};
use super::super::genome::{Site, Unit};
use super::super::meiosis::{Layout, gamete};
use super::*;

/// Recombination between loci at all distances, within and across words, against Haldane's map
/// function r = (1 - exp(-2d))/2 (Haldane 1919).
#[test]
fn recombination_follows_haldanes_map() {
    let s = scenario(
        "chromosome = [{ name = \"c\", length_bp = 100_000_000, map_length_cm = 200 }]\n\
         loci = [{ count = 201 }]\npopulation = [{ name = \"p\", size = 2 }]\n\
         visit = [{ generation = 0, individuals = 1 }]",
    );
    let site = |i: u32| Site {
        position: 1 + i * 499_000,
        set: 0,
        shadow: false,
    };
    let unit = Unit {
        number: 0,
        contig: 0,
        sites: (0..201).map(site).collect(),
    };
    let layout = Layout::new(&s, &unit, 100_000_000, Some(2.0));
    let (mother, father) = (vec![0; 4], vec![u64::MAX; 4]);
    let mut dice = Dice::new(1, Purpose::Meiosis, 0, 0);
    let gametes = 100_000;
    let (mut apart, mut ones) = ([0.0; 201], 0.0);
    let mut crossovers = 0.0;
    for _ in 0..gametes {
        let mut child = vec![0; 4];
        gamete(&layout, [&mother, &father], &mut child, &mut dice);
        let codes: Vec<u16> = (0..201).map(|l| layout.code(&child, l)).collect();
        for (l, apart) in apart.iter_mut().enumerate() {
            *apart += f64::from(u8::from(codes[l] != codes[0]));
        }
        ones += f64::from(codes[100]);
        crossovers += codes.windows(2).filter(|w| w[0] != w[1]).count() as f64;
    }
    let n = f64::from(gametes);
    for l in [1, 2, 10, 63, 64, 65, 128, 200] {
        let d = 499_000.0 * f64::from(l) / 1e8 * 2.0;
        let r = (1.0 - (-2.0 * d).exp()) / 2.0;
        let error = (r * (1.0 - r) / n).sqrt();
        let got = apart[l as usize] / n;
        assert!((got - r).abs() < 4.0 * error, "{l}: {got}, not {r}");
    }
    assert!((ones / n - 0.5).abs() < 4.0 * (0.25 / n).sqrt());
    // Of 200 steps of 0.998 cM, each shows an odd number of crossovers with probability r.
    let step = (1.0 - (-2.0 * 0.00998f64).exp()) / 2.0;
    assert!((crossovers / n - 200.0 * step).abs() < 4.0 * (200.0 * step / n).sqrt());
}

/// Mean squared correlation of dosages over pairs of loci (rows of `individuals`), minor allele
/// at or above 0.05 in the sample.
fn mean_r2(rows: &[&[u8]], pairs: impl Fn(usize, usize) -> bool) -> f64 {
    let n = rows.first().map_or(0, |r| r.len()) as f64;
    let standard: Vec<Option<Vec<f64>>> = rows
        .iter()
        .map(|row| {
            let mean = row.iter().map(|&d| f64::from(d)).sum::<f64>() / n;
            let p = mean / 2.0;
            let centred: Vec<f64> = row.iter().map(|&d| f64::from(d) - mean).collect();
            let length = centred.iter().map(|c| c * c).sum::<f64>().sqrt();
            (p.min(1.0 - p) >= 0.05 && length > 0.0)
                .then(|| centred.iter().map(|c| c / length).collect())
        })
        .collect();
    let (mut sum, mut count) = (0.0, 0.0);
    for a in 0..rows.len() {
        for b in 0..a {
            if let (Some(x), Some(y), true) = (&standard[a], &standard[b], pairs(a, b)) {
                sum += x.iter().zip(y).map(|(x, y)| x * y).sum::<f64>().powi(2);
                count += 1.0;
            }
        }
    }
    sum / count
}

/// METHODS 6 check [6.4]: mean r^2 of unlinked loci after six generations, against a simulation
/// made apart in numpy (its standard error in the last column), with random mating and with pairs.
/// Its r is from Burrows' Delta, whose covariance divides by S - 1 (Weir 1979).
#[test]
fn disequilibrium_of_unlinked_loci_agrees_with_another_simulation() {
    for (mating, size, sample, want, error) in [
        ("random", 50, 50.0, 0.02744, 9e-5),
        ("random", 100, 25.0, 0.0482, 12e-5),
        ("pairs", 100, 50.0, 0.02775, 11e-5),
    ] {
        let s = scenario(&format!(
            "mating = \"{mating}\"\nsettling_generations = 6\n{}\
             population = [{{ name = \"p\", size = {size} }}]\n\
             visit = [{{ generation = 0, individuals = {sample} }}]",
            unlinked("loci = [{ count = 80, frequencies = { minor = [0.1, 0.5] } }]")
        ));
        let values: Vec<f64> = (0..300)
            .map(|seed| {
                let dosages = run(&s, seed).dosages(0);
                let rows: Vec<&[u8]> = dosages.values.chunks(dosages.individuals).collect();
                (sample / (sample - 1.0f64)).powi(2) * mean_r2(&rows, |_, _| true)
            })
            .collect();
        let mean = Mean::of(&values);
        let both = Mean {
            error: mean.error.hypot(error),
            ..mean
        };
        both.agrees(want, 4.0, 0.02, mating);
    }
}

/// Disequilibrium made by mixing two populations decays by (1 - c) a generation once the mixture
/// mates at random (Robbins 1918); covariance of dosages is twice D.
#[test]
fn mixture_disequilibrium_decays_with_recombination() {
    let s = scenario(
        "settling_generations = 0\n\
         chromosome = [{ name = \"c\", length_bp = 40_000_400, map_length_cm = 40 }]\n\
         loci = [{ count = 5, spacing = \"even\", frequencies = { list = [0.5, 0.5] } }]\n\
         population = [{ name = \"a\", size = 200, divergence = 0.99 }, \
         { name = \"b\", size = 200, divergence = 0.99 }, \
         { name = \"mix\", size = 2000, starts_at = 1 }]\n\
         release = [{ from = \"a\", to = \"mix\", generation = 1, number = 1000 }, \
         { from = \"b\", to = \"mix\", generation = 1, number = 1000 }]\n\
         visit = [{ generation = 2, individuals = 2000, populations = [\"mix\"] }, \
         { generation = 5, individuals = 2000, populations = [\"mix\"] }]",
    );
    let covariance = |x: &[u8], y: &[u8]| {
        let n = x.len() as f64;
        let mean = |v: &[u8]| v.iter().map(|&d| f64::from(d)).sum::<f64>() / n;
        let (mx, my) = (mean(x), mean(y));
        x.iter()
            .zip(y)
            .map(|(&a, &b)| (f64::from(a) - mx) * (f64::from(b) - my))
            .sum::<f64>()
            / n
    };
    let mut ratios = [const { Vec::new() }; 5];
    for seed in 0..150 {
        let simulation = run(&s, seed);
        let [before, after] = [0, 1].map(|v| simulation.dosages(v));
        let row = |d: &super::super::Dosages, l: usize| {
            d.values[l * d.individuals..(l + 1) * d.individuals].to_vec()
        };
        for (step, ratios) in ratios.iter_mut().enumerate().skip(1) {
            let [first, last] = [&before, &after].map(|d| covariance(&row(d, 0), &row(d, step)));
            // Only where the two populations were fixed for different alleles at both loci.
            if first.abs() > 0.4 {
                ratios.push(last / first);
            }
        }
    }
    for (step, ratios) in ratios.iter().enumerate().skip(1) {
        let c = (1.0 - (-2.0 * 0.08 * step as f64).exp()) / 2.0;
        Mean::of(ratios).agrees((1.0 - c).powi(3), 4.0, 0.05, &format!("distance {step}"));
    }
}

/// In a population of constant size, r^2 of loci at recombination rate c settles near
/// [(1-c)^2 + c^2]/[2 Ne c (2 - c)] + 1/S (Weir & Hill 1980), so close loci have more.
#[test]
fn linked_loci_settle_at_the_drift_expectation() {
    let s = scenario(
        "settling_generations = 40\n\
         chromosome = [{ name = \"c\", length_bp = 200_000_400, map_length_cm = 200, copies = 4 }]\n\
         loci = [{ count = 80, spacing = \"even\", frequencies = { list = [0.5, 0.5] } }]\n\
         population = [{ name = \"p\", size = 100 }]\n\
         visit = [{ generation = 0, individuals = 100 }]",
    );
    let mut values = [const { Vec::new() }; 2];
    for seed in 0..120 {
        let simulation = run(&s, seed);
        let dosages = simulation.dosages(0);
        let rows: Vec<&[u8]> = dosages.values.chunks(dosages.individuals).collect();
        for (apart, values) in [1, 3].into_iter().zip(&mut values) {
            values.push(mean_r2(&rows, |a, b| a / 20 == b / 20 && a - b == apart));
        }
    }
    for (apart, values) in [1.0, 3.0].into_iter().zip(&values) {
        let c = (1.0 - (-2.0f64 * 0.1 * apart).exp()) / 2.0;
        let want = ((1.0 - c).powi(2) + c * c) / (2.0 * 100.5 * c * (2.0 - c)) + 1.0 / 99.0;
        // The formula is a ratio of expectations: within a tenth of the mean ratio.
        let mean = Mean::of(values);
        assert!(
            (mean.mean - want).abs() < 0.1 * want + 3.0 * mean.error,
            "{} {want}",
            mean.mean
        );
    }
}
