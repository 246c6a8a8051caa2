//! Drift, family sizes, migration.

use super::*;

/// Natural logarithm of n!.
fn ln_factorial(n: usize) -> f64 {
    (2..=n).map(|k| (k as f64).ln()).sum()
}

/// The Wright-Fisher matrix of 2N gene copies, from binomial probabilities.
fn wright_fisher(copies: usize) -> Vec<Vec<f64>> {
    let row = |i: usize| {
        let p = i as f64 / copies as f64;
        let term = |k: usize| {
            let ln_choose = ln_factorial(copies) - ln_factorial(k) - ln_factorial(copies - k);
            ln_choose.exp() * p.powi(k as i32) * (1.0 - p).powi((copies - k) as i32)
        };
        (0..=copies).map(term).collect()
    };
    (0..=copies).map(row).collect()
}

fn step(distribution: &[f64], matrix: &[Vec<f64>]) -> Vec<f64> {
    let to = |k: usize| {
        distribution
            .iter()
            .zip(matrix)
            .map(|(d, row)| d * row[k])
            .sum()
    };
    (0..distribution.len()).map(to).collect()
}

/// Copies after some generations against the exact matrix: chi-square over one locus a run.
/// Hermaphrodites with random union of gametes are a Wright-Fisher population exactly.
#[test]
fn allele_copies_follow_the_wright_fisher_matrix() {
    let s = scenario(&format!(
        "mating = \"selfing\"\nsettling_generations = 0\n{}\
         population = [{{ name = \"p\", size = 8 }}]\n\
         visit = [{{ generation = 0, individuals = 1 }}, {{ generation = 5, individuals = 1 }}]",
        unlinked("loci = [{ count = 1, frequencies = { list = [0.7, 0.3] } }]")
    ));
    let matrix = wright_fisher(16);
    // Generation 0 is drawn from the frequencies: one step from there, five more to generation 5.
    let mut expected: Vec<f64> = {
        let p: f64 = 0.3;
        let choose = |k| (ln_factorial(16) - ln_factorial(k) - ln_factorial(16 - k)).exp();
        (0..=16)
            .map(|k| choose(k) * p.powi(k as i32) * (1.0 - p).powi(16 - k as i32))
            .collect()
    };
    for _ in 0..5 {
        expected = step(&expected, &matrix);
    }
    let runs = 20_000;
    let mut seen = [0.0; 17];
    for seed in 0..runs {
        let simulation = run(&s, seed);
        seen[simulation.truth.loci[0].copies[1][1] as usize] += 1.0;
    }
    let chi_square: f64 = seen
        .iter()
        .zip(&expected)
        .map(|(o, e)| (o - e * runs as f64).powi(2) / (e * runs as f64))
        .sum();
    // 16 degrees of freedom: 99.99 % quantile 45.92 (chi-square tables).
    assert!(chi_square < 45.92, "chi-square {chi_square}");
}

/// METHODS 8 check [8.4]: 2N = 100, allele at 0.05, lost by generation 1, 5, 10, 20 (own exact
/// matrix). Drawing the first adults is generation 1.
#[test]
fn rare_alleles_are_lost_at_the_exact_rate() {
    let s = scenario(&format!(
        "mating = \"selfing\"\nsettling_generations = 0\n{}\
         population = [{{ name = \"p\", size = 50 }}]\n\
         visit = [{{ generation = 0, individuals = 1 }}, {{ generation = 4, individuals = 1 }}, \
         {{ generation = 9, individuals = 1 }}, {{ generation = 19, individuals = 1 }}]",
        unlinked("loci = [{ count = 512, frequencies = { list = [0.95, 0.05] } }]")
    ));
    let mut shares = [const { Vec::new() }; 4];
    for seed in 0..400 {
        let simulation = run(&s, seed);
        for (stratum, shares) in shares.iter_mut().enumerate() {
            let p = true_frequencies(&simulation, stratum);
            shares.push(p.iter().filter(|&&p| p == 0.0).count() as f64 / p.len() as f64);
        }
    }
    let exact = [
        0.005920529220334024,
        0.20093522298247818,
        0.40944809009038485,
        0.6168292711859549,
    ];
    for (shares, exact) in shares.iter().zip(exact) {
        Mean::of(shares).agrees(exact, 4.0, 0.05, "share lost");
    }
}

/// Variance of the true frequency, p(1-p)[1 - (1 - 1/2N)^t] (Wright 1931), its mean, and
/// heterozygosity (METHODS 8), with Ne from the truth; two sexes. That is (4N - 2)/(Vk + 2), or 4 Nm Nf/(Nm + Nf), where the
/// last factor counts pairs of gametes of one sex exactly (METHODS 7).
#[test]
fn variance_and_heterozygosity_follow_the_effective_size() {
    for (settings, effective) in [
        ("size = 40", 40.0 * 39.5 / 39.0),
        ("size = 40, family_variance = 0", 158.0 / 2.0),
        ("size = 40, family_variance = 6", 158.0 / 8.0),
        (
            "size = 40, female_share = 0.1",
            4.0 * 4.0 * 36.0 / 40.0 * 39.5 / 39.0,
        ),
    ] {
        let s = scenario(&format!(
            "settling_generations = 0\n{}\
             population = [{{ name = \"p\", {settings} }}]\n\
             visit = [{{ generation = 0, individuals = 1 }}, {{ generation = 8, individuals = 1 }}]",
            unlinked("loci = [{ count = 512, frequencies = { list = [0.6, 0.4] } }]")
        ));
        let (mut means, mut squares, mut kept) = (Vec::new(), Vec::new(), Vec::new());
        let mut truth = None;
        for seed in 0..400 {
            let simulation = run(&s, seed);
            let (before, after) = (
                true_frequencies(&simulation, 0),
                true_frequencies(&simulation, 1),
            );
            let n = before.len() as f64;
            means.push(after.iter().sum::<f64>() / n);
            let change = before.iter().zip(&after).map(|(x, y)| (y - x).powi(2));
            let base = before.iter().map(|x| x * (1.0 - x));
            squares.push(change.sum::<f64>() / base.sum::<f64>());
            let heterozygosity = |s: usize| simulation.truth.strata[s].expected_heterozygosity;
            kept.push(heterozygosity(1).unwrap() / heterozygosity(0).unwrap());
            truth = Some(simulation.truth.intervals[0].clone());
        }
        let expected = truth.unwrap().expected;
        let size = expected.effective_size.unwrap();
        assert!(
            (size - effective).abs() < 1e-9 * effective,
            "{settings}: Ne {size}"
        );
        let drift = 1.0 - (1.0 - 1.0 / (2.0 * size)).powi(8);
        Mean::of(&means).agrees(0.4, 4.0, 0.02, settings);
        Mean::of(&kept).agrees(expected.heterozygosity_kept.unwrap(), 4.0, 0.01, settings);
        // The base of `squares` is the sample of adults; half a percent for what that moves.
        let mean = Mean::of(&squares);
        let wide = Mean {
            error: mean.error + 0.01 * drift / 4.0,
            ..mean
        };
        wide.agrees(drift, 4.0, 0.05, settings);
    }
}

/// METHODS 7: with equal families the effective size is 2N - 1 (algebra), in every generation and
/// under every way of mating.
#[test]
fn equal_families_double_the_effective_size() {
    for mating in ["random", "pairs", "selfing"] {
        let s = scenario(&format!(
            "mating = \"{mating}\"\n{}\
             population = [{{ name = \"p\", size = 30, family_variance = 0 }}]\n\
             visit = [{{ generation = 0, individuals = 1 }}, {{ generation = 3, individuals = 1 }}]",
            unlinked("loci = [{ count = 1 }]")
        ));
        let truth = run(&s, 5).truth;
        for drift in [truth.intervals[0].realised, truth.intervals[0].expected] {
            let size = drift.effective_size.unwrap();
            assert!((size - 59.0).abs() < 1e-9, "{mating}: {size}");
        }
    }
}

/// Realised effective sizes scatter around the expected one: mean of 1/Ne (METHODS 7).
#[test]
fn realised_drift_is_the_expected_one_on_average() {
    for settings in [
        "",
        ", family_variance = 5",
        ", family_variance = 1, female_share = 0.3",
    ] {
        for mating in ["random", "pairs", "selfing"] {
            let s = scenario(&format!(
                "mating = \"{mating}\"\n{}\
                 population = [{{ name = \"p\", sizes = [30, 30, 20, 40, 40]{settings} }}]\n\
                 visit = [{{ generation = 0, individuals = 1 }}, {{ generation = 4, individuals = 1 }}]",
                unlinked("loci = [{ count = 1 }]")
            ));
            let inverse = |seed| {
                let interval = run(&s, seed).truth.intervals[0].clone();
                let [realised, expected] =
                    [interval.realised, interval.expected].map(|d| 1.0 / d.effective_size.unwrap());
                realised / expected
            };
            let ratios: Vec<f64> = (0..2000).map(inverse).collect();
            Mean::of(&ratios).agrees(1.0, 4.0, 0.01, &format!("{mating}{settings}"));
        }
    }
}

/// One-way migration closes the gap between two populations by (1 - m) a generation (Wright 1931),
/// and moves the receiving one only.
#[test]
fn migration_moves_the_receiving_population() {
    let s = scenario(&format!(
        "{}population = [{{ name = \"a\", size = 400, divergence = 0.3 }}, \
         {{ name = \"b\", size = 400, divergence = 0.3 }}]\n\
         migration = [{{ from = \"a\", to = \"b\", rate = 0.2, first_generation = 1 }}]\n\
         visit = [{{ generation = 0, individuals = 1 }}, {{ generation = 4, individuals = 1 }}]",
        unlinked("loci = [{ count = 512, frequencies = { list = [0.5, 0.5] } }]")
    ));
    let (mut gaps, mut source) = (Vec::new(), Vec::new());
    for seed in 0..40 {
        let simulation = run(&s, seed);
        let [a0, a4, b0, b4] = [0, 1, 2, 3].map(|i| true_frequencies(&simulation, i));
        let (mut moved, mut stayed, mut base) = (0.0, 0.0, 0.0);
        for l in 0..a0.len() {
            let gap = b0[l] - a0[l];
            moved += gap * (b4[l] - a4[l]);
            stayed += gap * (a4[l] - a0[l]);
            base += gap * gap;
        }
        gaps.push(moved / base);
        source.push(stayed / base);
    }
    Mean::of(&gaps).agrees(0.8f64.powi(4), 4.0, 0.02, "gap left");
    let Mean { mean, error } = Mean::of(&source);
    assert!(
        mean.abs() < 4.0 * error + 0.005,
        "the source moved by {mean}"
    );
}

/// A population founded by release has its founders' number and then grows as told.
#[test]
fn founders_and_growth_come_as_told() {
    let s = scenario(&format!(
        "{}population = [{{ name = \"a\", sizes = [40, 30, 50] }}, \
         {{ name = \"b\", size = 10, growth_rate = 0.5, largest_size = 30, starts_at = 2, \
         bottleneck = [{{ from = 7, to = 7, size = 4 }}] }}]\n\
         release = [{{ from = \"a\", to = \"b\", generation = 2, number = 6 }}]\n\
         migration = [{{ from = \"a\", to = \"b\", number = 3, first_generation = 3, last_generation = 3 }}]\n\
         visit = [{{ generation = 8, individuals = 5 }}]",
        unlinked("loci = [{ count = 1 }]")
    ));
    let truth = run(&s, 1).truth;
    let sizes = |name: &str| -> Vec<u32> {
        truth
            .generations
            .iter()
            .filter(|g| g.population == name)
            .map(|g| g.adults)
            .collect()
    };
    assert_eq!(sizes("a"), [40, 30, 50, 50, 50, 50, 50, 50, 50]);
    assert_eq!(sizes("b"), [0, 0, 6, 15, 23, 30, 30, 4, 30]);
}

/// Prints how long runs of the size of a calibration study take.
#[test]
#[ignore = "a measurement, to be read"]
fn speed() {
    for (linkage, n, loci, t, sample) in [
        ("unlinked = true", 100, 1000, 10, 50),
        ("copies = 20", 100, 1000, 10, 50),
        ("unlinked = true", 1000, 20_000, 20, 100),
        ("copies = 20", 1000, 20_000, 20, 100),
        ("copies = 20", 500, 10_000, 50, 100),
        ("unlinked = true", 25, 300, 2, 25),
    ] {
        let s = scenario(&format!(
            "chromosome = [{{ name = \"c\", length_bp = 100_000_000, {linkage} }}]\n\
             loci = [{{ count = {loci} }}]\npopulation = [{{ name = \"p\", size = {n} }}]\n\
             visit = [{{ generation = 0, individuals = {sample} }}, {{ generation = {t}, individuals = {sample} }}]"
        ));
        let clock = std::time::Instant::now();
        let runs = (20_000_000 / (n * loci * t)).max(2);
        for seed in 0..runs {
            assert_eq!(run(&s, seed as u64).loci.len(), loci);
        }
        let each = clock.elapsed() / runs as u32;
        println!(
            "{linkage}, N {n}, {loci} loci, {t} generations, {sample} sampled twice: {each:?}"
        );
    }
}
