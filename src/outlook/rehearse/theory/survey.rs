//! Sampling plans, genotyping, and what is planted.

use super::super::calls::MISSING;
use super::*;

/// METHODS 4 check [4.4]: expectation of numerator over expectation of denominator of Fs (both
/// alleles) for both sampling plans, by exact enumeration elsewhere. Hermaphrodites, because the
/// enumeration is of the Wright-Fisher model.
#[test]
fn sampling_plans_have_the_enumerated_drift_signal() {
    for (plan, n, x, y, t, p, want) in [
        ("I", 10, 5, 8, 3, 0.2, 0.217782932),
        ("II", 10, 5, 8, 3, 0.2, 0.319900440),
        ("I", 4, 2, 3, 1, 0.5, 0.335483871),
        ("II", 4, 2, 3, 1, 0.5, 0.598802395),
        ("I", 4, 2, 3, 2, 0.3, 0.461410788),
        ("II", 4, 2, 3, 2, 0.3, 0.722521138),
    ] {
        let s = scenario(&format!(
            "mating = \"selfing\"\nsettling_generations = 0\n{}\
             population = [{{ name = \"p\", size = {n} }}]\n\
             visit = [{{ generation = 0, individuals = {x}, plan = \"{plan}\" }}, \
             {{ generation = {t}, individuals = {y}, plan = \"{plan}\" }}]",
            unlinked(&format!(
                "loci = [{{ count = 64, frequencies = {{ list = [{}, {p}] }} }}]",
                1.0 - p
            ))
        ));
        let frequencies = |simulation: &Simulation, stratum: usize| -> Vec<f64> {
            let d = simulation.dosages(stratum);
            let sums = d
                .values
                .chunks(d.individuals)
                .map(|row| row.iter().map(|&g| f64::from(g)).sum::<f64>());
            sums.map(|sum| sum / (2.0 * d.individuals as f64)).collect()
        };
        let (mut numerators, mut denominators) = (Vec::new(), Vec::new());
        for seed in 0..2500 {
            let simulation = run(&s, seed);
            let (x, y) = (frequencies(&simulation, 0), frequencies(&simulation, 1));
            let (mut numerator, mut denominator) = (0.0, 0.0);
            for (x, y) in x.iter().zip(&y) {
                let z = (x + y) / 2.0;
                numerator += (x - y) * (x - y);
                denominator += z * (1.0 - z);
            }
            numerators.push(numerator);
            denominators.push(denominator);
        }
        // Numerator minus expected ratio times denominator has mean 0; scaled to the ratio.
        let scale = Mean::of(&denominators).mean;
        let ratio: Vec<f64> = numerators
            .iter()
            .zip(&denominators)
            .map(|(n, d)| want + (n - want * d) / scale)
            .collect();
        Mean::of(&ratio).agrees(want, 4.0, 0.03, &format!("plan {plan}, N {n}"));
    }
}

fn survey(genotyping: &str, visit: &str, loci: &str) -> Scenario {
    scenario(&format!(
        "{}population = [{{ name = \"p\", size = 60 }}]\n\
         visit = [{{ generation = 0, individuals = 40 }}, {{ generation = 1, individuals = 40, {visit} }}]\n\
         genotyping = {{ {genotyping} }}",
        unlinked(loci)
    ))
}

const LOCI: &str = "loci = [{ count = 2000, frequencies = { minor = [0.2, 0.5] } }]";

/// Missing data have their mean rate and fall as unevenly as told (gamma factors of mean 1).
#[test]
fn missing_data_are_as_many_and_as_uneven_as_told() {
    let s = survey(
        "missing_rate = 0.1, missing_spread_loci = 0.5, missing_spread_samples = 1.0",
        "plan = \"II\"",
        LOCI,
    );
    let (mut rates, mut by_sample) = (Vec::new(), Vec::new());
    for seed in 0..20 {
        let simulation = run(&s, seed);
        let mut missing = vec![0.0; simulation.samples.len()];
        for locus in 0..simulation.loci.len() {
            for (sample, call) in simulation.genotypes(locus).enumerate() {
                missing[sample] += f64::from(u8::from(call.is_none())) / 2000.0;
            }
        }
        rates.push(missing.iter().sum::<f64>() / missing.len() as f64);
        by_sample.extend(missing);
    }
    Mean::of(&rates).agrees(0.1, 4.0, 0.05, "missing");
    let mean = Mean::of(&by_sample).mean;
    let n = by_sample.len() as f64;
    let variance = by_sample.iter().map(|m| (m - mean).powi(2)).sum::<f64>() / n;
    let spread = variance.sqrt() / mean;
    assert!(
        (0.9..1.1).contains(&spread),
        "spread among samples {spread}"
    );
}

/// Without errors, recaptures and replicates are the same animal at every locus; siblings share
/// their parents; all are named in the truth and the replicates in the sheet.
#[test]
fn planted_animals_are_what_the_truth_says() {
    let s = survey(
        "",
        "recaptured = 4, replicates = 3, full_sib_families = 2, full_sib_family_size = 5",
        LOCI,
    );
    let simulation = run(&s, 3);
    let truth = &simulation.truth;
    assert_eq!((truth.recaptures.len(), truth.replicates.len()), (4, 3));
    assert_eq!(
        truth.full_siblings.iter().map(Vec::len).collect::<Vec<_>>(),
        [5, 5]
    );
    assert_eq!(simulation.samples.len(), 83);
    let index = |name: &String| {
        simulation
            .samples
            .iter()
            .position(|s| s.name == *name)
            .unwrap()
    };
    let row = |sample: usize| -> Vec<_> {
        (0..simulation.loci.len())
            .map(|l| simulation.genotypes(l).nth(sample).unwrap())
            .collect()
    };
    for [first, second] in truth.recaptures.iter().chain(&truth.replicates) {
        assert_ne!(first, second);
        assert_eq!(row(index(first)), row(index(second)));
    }
    // Full siblings: correlation of dosages near 1/2 after the locus means are taken off.
    let related = |a: &String, b: &String| {
        let (a, b) = (row(index(a)), row(index(b)));
        let (mut ab, mut aa, mut bb) = (0.0, 0.0, 0.0);
        for l in 0..a.len() {
            let dosage = |g: Option<[u16; 2]>| f64::from(g.unwrap()[0] + g.unwrap()[1]);
            let copies = &truth.loci[l].copies[1];
            let mean = 2.0 * f64::from(copies[1]) / f64::from(copies[0] + copies[1]);
            let (x, y) = (dosage(a[l]) - mean, dosage(b[l]) - mean);
            ab += x * y;
            aa += x * x;
            bb += y * y;
        }
        ab / (aa * bb).sqrt()
    };
    for family in &truth.full_siblings {
        let r = related(&family[0], &family[1]);
        assert!((0.35..0.65).contains(&r), "siblings correlate by {r}");
    }
    let (one, other) = (&truth.full_siblings[0][0], &truth.full_siblings[1][0]);
    assert!(related(one, other).abs() < 0.3);
    let mut names: Vec<_> = simulation.samples.iter().map(|s| &s.name).collect();
    names.sort();
    names.dedup();
    assert_eq!(names.len(), 83);
}

/// Replicates tell the error rates: two calls of one animal differ as the rates say.
#[test]
fn errors_come_at_their_rates() {
    let differences = |genotyping: &str| {
        let s = survey(genotyping, "replicates = 40", LOCI);
        let shares: Vec<f64> = (0..10)
            .map(|seed| {
                let simulation = run(&s, seed);
                let (mut differ, mut heterozygous, mut all) = (0.0, 0.0, 0.0);
                for locus in 0..simulation.loci.len() {
                    let calls: Vec<_> = simulation.genotypes(locus).collect();
                    for (i, sample) in simulation.samples.iter().enumerate() {
                        let Some(first) = sample.replicate_of else {
                            continue;
                        };
                        let (a, b) = (calls[first].unwrap(), calls[i].unwrap());
                        differ += f64::from(u8::from(a != b));
                        heterozygous += f64::from(u8::from(a[0] != a[1] || b[0] != b[1]));
                        all += 1.0;
                    }
                }
                if genotyping.contains("dropout") {
                    differ / heterozygous
                } else {
                    differ / all
                }
            })
            .collect();
        Mean::of(&shares)
    };
    // Four gene copies, each miscalled with 0.01: first order 0.04, less what two errors hide.
    let e: f64 = 0.01;
    let miscalled = differences("miscall_rate = 0.01").mean;
    assert!((miscalled - 4.0 * e).abs() < 0.003, "{miscalled}");
    // A heterozygote stays one with d^2 + (1-d)^2 = 0.82. Two calls differ where one stays, or where
    // neither does and other alleles are left; pairs without a heterozygote are not counted below.
    let differ = 2.0 * 0.82 * 0.18 + 0.18 * 0.18 / 2.0;
    let seen = 1.0 - 0.18 * 0.18;
    differences("dropout_rate = 0.1").agrees(differ / seen, 4.0, 0.02, "dropout");
}

/// Genotypes called from many reads are the true ones; from two reads, half of the heterozygotes
/// show one allele only (coin tosses), and one sample in e^2 has no read (Poisson).
#[test]
fn depth_makes_calls() {
    let calls = |depth: f64| {
        let genotyping = format!("depth = {depth}, read_error_rate = 0.0, fields = [\"DP\"]");
        let s = survey(&genotyping, "plan = \"I\"", LOCI);
        (run(&s, 1), run(&survey("", "plan = \"I\"", LOCI), 1))
    };
    let (deep, truth) = calls(80.0);
    for locus in 0..deep.loci.len() {
        assert!(deep.genotypes(locus).eq(truth.genotypes(locus)));
    }
    let (shallow, truth) = calls(2.0);
    let (mut missing, mut all, mut kept, mut heterozygous) = (0.0, 0.0, 0.0, 0.0);
    for locus in 0..shallow.loci.len() {
        for (seen, real) in shallow.genotypes(locus).zip(truth.genotypes(locus)) {
            all += 1.0;
            missing += f64::from(u8::from(seen.is_none()));
            if let (Some(seen), Some([0, 1])) = (seen, real) {
                heterozygous += 1.0;
                kept += f64::from(u8::from(seen == [0, 1]));
            }
        }
    }
    assert!(
        (missing / all - (-2.0f64).exp()).abs() < 0.005,
        "{}",
        missing / all
    );
    // P(both alleles seen) with Poisson(1) reads of each, given at least one read.
    let both = (1.0 - (-1.0f64).exp()).powi(2) / (1.0 - (-2.0f64).exp());
    assert!(
        (kept / heterozygous - both).abs() < 0.02,
        "{} {both}",
        kept / heterozygous
    );
}

/// A duplicated locus shows two alleles in 1 - 2 (1/2)^4 of individuals at equal frequencies.
#[test]
fn duplicated_loci_have_too_many_heterozygotes() {
    let s = survey(
        "",
        "plan = \"II\"",
        "loci = [{ count = 500, duplicated = true, frequencies = { list = [0.5, 0.5] } }]",
    );
    let simulation = run(&s, 1);
    assert_eq!(simulation.loci.len(), 500);
    let calls = (0..500).flat_map(|l| simulation.genotypes(l).collect::<Vec<_>>());
    let heterozygous = calls.filter(|g| *g == Some([0, 1])).count() as f64 / (500.0 * 80.0);
    assert!((heterozygous - 0.875).abs() < 0.02, "{heterozygous}");
    assert!(simulation.truth.loci.iter().all(|l| l.duplicated));
}

/// The list of alleles that are gone is the one the copies at the visits tell; many alleles and
/// few share words.
#[test]
fn gone_alleles_agree_with_the_copies() {
    let s = scenario(
        "chromosome = [{ name = \"c\", length_bp = 1_000_000 }]\n\
         loci = [{ count = 150 }, { count = 40, alleles = 11 }, { count = 30, alleles = 3 }]\n\
         population = [{ name = \"b\", size = 12 }, { name = \"a\", size = 20 }]\n\
         migration = [{ from = \"a\", to = \"b\", rate = 0.05 }]\n\
         visit = [{ generation = 1, individuals = 5 }, { generation = 3, individuals = 5 }, \
         { generation = 7, individuals = 5 }]",
    );
    let simulation = run(&s, 1);
    let truth = &simulation.truth;
    let mut expected = 0;
    for locus in &truth.loci {
        for (population, first, last) in [("a", 0, 2), ("b", 3, 5)] {
            for allele in 0..locus.alleles.len() {
                let gone = truth.gone.iter().find(|g| {
                    g.population == population
                        && g.position == locus.position
                        && usize::from(g.allele) == allele
                });
                let lost = locus.copies[first][allele] > 0 && locus.copies[last][allele] == 0;
                assert_eq!(gone.is_some(), lost);
                if let Some(gone) = gone {
                    expected += 1;
                    assert!((2..=7).contains(&gone.generation));
                    let middle = locus.copies[first + 1][allele];
                    assert!(middle == 0 || gone.generation > 3);
                    assert_eq!(gone.baseline_copies, locus.copies[first][allele]);
                }
            }
        }
    }
    assert_eq!(truth.gone.len(), expected);
    assert!(expected > 50);
}

/// The locus and strata handed to the estimators hold the same calls.
#[test]
fn model_loci_hold_the_calls() {
    let s = scenario(
        "chromosome = [{ name = \"c\", length_bp = 1_000_000 }]\n\
         loci = [{ count = 20 }, { count = 5, alleles = 5 }]\n\
         population = [{ name = \"b\", size = 12 }, { name = \"a\", size = 20 }]\n\
         visit = [{ generation = 0, individuals = 6, replicates = 2 }, { generation = 2, individuals = 5 }]\n\
         genotyping = { missing_rate = 0.2 }",
    );
    let simulation = run(&s, 1);
    let strata = simulation.model_strata();
    let names: Vec<&str> = strata.strata.iter().map(|s| s.name.as_str()).collect();
    assert_eq!(names, ["a@2000", "a@2002", "b@2000", "b@2002"]);
    assert_eq!(strata.individuals.len(), 22);
    let mut locus = crate::model::Locus::default();
    for index in 0..simulation.loci.len() {
        simulation.fill_locus(index, &mut locus);
        let calls: Vec<_> = simulation.genotypes(index).collect();
        for (slot, individual) in strata.individuals.iter().enumerate() {
            let sample = simulation
                .samples
                .iter()
                .position(|s| s.name == individual.sample);
            assert_eq!(locus.genotypes.pair(slot), calls[sample.unwrap()]);
        }
    }
    assert_eq!(MISSING, [255, 255]);
}
