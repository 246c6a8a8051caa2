//! Every pair formed, one by one, against the sums; and the laws of merging.

use super::*;
use proptest::prelude::*;

/// A locus of a made-up stratum.
#[derive(Debug, Clone)]
struct Made {
    contig: u64,
    alleles: usize,
    calls: Vec<Option<[u16; 2]>>,
}

impl Made {
    fn genotypes(&self) -> Genotypes {
        let mut genotypes = Genotypes::default();
        genotypes.reset(self.calls.len(), self.alleles);
        for (slot, call) in self.calls.iter().enumerate() {
            if let Some([a, b]) = *call {
                genotypes.set(slot, a, b);
            }
        }
        genotypes
    }

    fn counts(&self) -> Counts {
        Counts::of(self.alleles.max(2), self.calls.iter().copied())
    }
}

/// A small generator, so that examples need no file: the constants are Knuth's MMIX (TAOCP 2).
struct Dice(u64);

impl Dice {
    fn below(&mut self, n: u64) -> u64 {
        self.0 = self
            .0
            .wrapping_mul(6364136223846793005)
            .wrapping_add(1442695040888963407);
        (self.0 >> 33) % n
    }
}

/// Loci of two to `alleles` alleles; one call in `missing_one_in` is missing (0: none).
fn made(
    seed: u64,
    loci: usize,
    individuals: usize,
    alleles: u64,
    missing_one_in: u64,
) -> Vec<Made> {
    let mut dice = Dice(seed);
    (0..loci)
        .map(|_| {
            let alleles = 2 + dice.below(alleles - 1);
            let rare = 1 + dice.below(12);
            let mut allele = || {
                if dice.below(12) < rare {
                    dice.below(alleles) as u16
                } else {
                    0
                }
            };
            let pairs: Vec<[u16; 2]> = (0..individuals).map(|_| [allele(), allele()]).collect();
            let calls = pairs
                .into_iter()
                .map(|p| (missing_one_in == 0 || dice.below(missing_one_in) > 0).then_some(p))
                .collect();
            Made {
                contig: dice.below(5) * 977,
                alleles: alleles as usize,
                calls,
            }
        })
        .collect()
}

fn gathered(loci: &[Made]) -> GramStratum {
    let individuals = loci[0].calls.len();
    let mut gram = GramStratum::new(individuals).unwrap();
    for locus in loci {
        gram.add(
            locus.contig,
            &locus.genotypes(),
            0..individuals,
            &locus.counts(),
        );
    }
    gram
}

/// The kept alleles of a locus as centred unit vectors, and the typed mask.
struct Plain {
    contig: u64,
    vectors: Vec<Vec<f64>>,
    typed: Vec<f64>,
}

fn plain(loci: &[Made], cutoff: FrequencyCutoff) -> Vec<Plain> {
    loci.iter()
        .filter_map(|locus| {
            let counts = locus.counts();
            let n = f64::from(counts.typed);
            let typed: Vec<f64> = locus
                .calls
                .iter()
                .map(|c| if c.is_some() { 1.0 } else { 0.0 })
                .collect();
            let vectors: Vec<Vec<f64>> = (0..counts.copies.len() as u16)
                .filter(|&a| cutoff.keeps(counts.copies[a as usize], counts.gene_copies()))
                .filter_map(|a| {
                    let dosage = |c: &[u16; 2]| c.iter().filter(|&&x| x == a).count() as f64;
                    let mean = locus.calls.iter().flatten().map(dosage).sum::<f64>() / n;
                    let centred: Vec<f64> = locus
                        .calls
                        .iter()
                        .map(|c| c.as_ref().map_or(0.0, |c| dosage(c) - mean))
                        .collect();
                    let length = centred.iter().map(|v| v * v).sum::<f64>().sqrt();
                    (length > 1e-9).then(|| centred.iter().map(|v| v / length).collect())
                })
                .collect();
            (vectors.len() > 1 && counts.typed >= 10).then_some(Plain {
                contig: locus.contig,
                vectors,
                typed,
            })
        })
        .collect()
}

/// The sums over one pair of loci, straight from their definition.
fn plain_pair(x: &Plain, y: &Plain) -> PairSums {
    let dot = |a: &[f64], b: &[f64]| a.iter().zip(b).map(|(u, v)| u * v).sum::<f64>();
    let (k, l) = (x.vectors.len() as f64, y.vectors.len() as f64);
    let weight = (k - 1.0) * (l - 1.0);
    let squares: f64 = x
        .vectors
        .iter()
        .flat_map(|u| y.vectors.iter().map(move |v| dot(u, v).powi(2)))
        .sum();
    // P = diag(m) - m m'/n; under permutation of the typed, E r^2 = tr(P Q)/((n-1)(n'-1)).
    let (n, m) = (dot(&x.typed, &x.typed), dot(&y.typed, &y.typed));
    let individuals = x.typed.len();
    let p =
        |t: &[f64], n: f64, i: usize, j: usize| (if i == j { t[i] } else { 0.0 }) - t[i] * t[j] / n;
    let mut trace = 0.0;
    for i in 0..individuals {
        for j in 0..individuals {
            trace += p(&x.typed, n, i, j) * p(&y.typed, m, i, j);
        }
    }
    let both = dot(&x.typed, &y.typed);
    PairSums {
        squared_correlation: weight / (k * l) * squares,
        expected_by_sampling: weight * trace / ((n - 1.0) * (m - 1.0)),
        attenuation: weight * both.powi(2) * (1.0 - 2.0 / n) * (1.0 - 2.0 / m)
            / ((n - 1.0) * (m - 1.0)),
        typed_at_both: weight * both,
        weight,
    }
}

fn plain_sums(loci: &[Plain]) -> (PairSums, PairSums) {
    let (mut between, mut all) = (PairSums::default(), PairSums::default());
    for (i, x) in loci.iter().enumerate() {
        for y in &loci[..i] {
            let pair = plain_pair(x, y);
            all.add(&pair);
            if x.contig != y.contig {
                between.add(&pair);
            }
        }
    }
    (between, all)
}

fn assert_close(got: &PairSums, want: &PairSums, tolerance: f64) {
    let cells = |s: &PairSums| {
        [
            s.squared_correlation,
            s.expected_by_sampling,
            s.attenuation,
            s.typed_at_both,
            s.weight,
        ]
    };
    for (got, want) in cells(got).into_iter().zip(cells(want)) {
        assert!(
            (got - want).abs() <= tolerance * want.abs(),
            "{got} against {want}"
        );
    }
}

#[test]
fn sums_are_those_of_every_pair_formed() {
    for (seed, alleles, missing) in [(1, 2, 0), (2, 2, 6), (3, 6, 0), (4, 6, 4)] {
        let loci = made(seed, 150, 23, alleles, missing);
        let mut gram = gathered(&loci);
        for cutoff in FrequencyCutoff::ALL {
            let (between, all) = plain_sums(&plain(&loci, cutoff));
            assert!(all.weight > 100.0);
            let pairs = gram.pairs(cutoff);
            assert_close(&pairs.between(), &between, 2e-7);
            assert_close(&pairs.all(), &all, 2e-7);
        }
    }
}

#[test]
fn complete_data_expect_one_over_individuals_less_one() {
    let loci = made(5, 80, 31, 2, 0);
    let all = gathered(&loci).pairs(FrequencyCutoff::TwoPercent).all();
    let expected = all.expected_by_sampling / all.weight;
    assert!((expected - 1.0 / 30.0).abs() < 1e-14, "{expected}");
    assert_eq!(all.typed_at_both / all.weight, 31.0);
}

/// Rounding to 2^-22 must not show: the excess over sampling is a small difference.
#[test]
fn rounding_moves_the_excess_by_less_than_a_millionth() {
    for (seed, individuals, missing) in [(11, 50, 0), (12, 25, 10), (13, 100, 20)] {
        let loci = made(seed, 500, individuals, 2, missing);
        let (between, _) = plain_sums(&plain(&loci, FrequencyCutoff::FivePercent));
        let got = gathered(&loci)
            .pairs(FrequencyCutoff::FivePercent)
            .between();
        let excess =
            |s: &PairSums| (s.squared_correlation - s.expected_by_sampling) / s.attenuation;
        // These made-up loci are independent, so the true excess is 0; 0.001 is that of Ne near 330.
        let error = (excess(&got) - excess(&between)).abs() / 0.001;
        println!("{individuals} individuals: relative error {error:.2e} of an excess of 0.001");
        assert!(error < 1e-6, "{error}");
    }
}

#[test]
fn contigs_beyond_the_groups_are_folded_without_regard_to_order() {
    let mut loci = made(7, 300, 12, 3, 7);
    for (i, locus) in loci.iter_mut().enumerate() {
        locus.contig = crate::model::stable_hash(&[(i % 90) as u8]);
    }
    let forward = gathered(&loci);
    let (first, second) = loci.split_at(130);
    let mut merged = gathered(second);
    merged.merge(gathered(first));
    loci.reverse();
    let mut backward = gathered(&loci);
    assert!(forward == backward && forward == merged);
    let pairs = backward.pairs(FrequencyCutoff::NoSingletons);
    assert!(pairs.grouped && pairs.contigs() <= MAXIMUM_CONTIG_GROUPS);
    let (_, all) = plain_sums(&plain(&loci, FrequencyCutoff::NoSingletons));
    // Within small groups the squared correlations of loci with themselves dominate.
    assert_close(&pairs.all(), &all, 2e-6);
}

#[test]
fn wide_cells_go_on_where_narrow_ones_stop() {
    let locus = &made(8, 1, 10, 2, 0)[0];
    let (genotypes, counts) = (locus.genotypes(), locus.counts());
    let mut gram = GramStratum::new(10).unwrap();
    let mut half = GramStratum::new(10).unwrap();
    for i in 0..300_000 {
        gram.add(1, &genotypes, 0..10, &counts);
        if i % 2 == 0 {
            half.add(1, &genotypes, 0..10, &counts);
        }
    }
    let mut twice = half.clone();
    twice.merge(half);
    assert!(gram == twice);
    let all = gram.pairs(FrequencyCutoff::FivePercent).all();
    assert!(
        (all.squared_correlation / all.weight - 1.0).abs() < 1e-6,
        "{all:?}"
    );
}

#[test]
fn few_and_many_individuals_have_a_reason() {
    assert_eq!(
        GramStratum::new(2).unwrap_err(),
        GramAbsent::TooFewIndividuals(2)
    );
    assert_eq!(
        GramStratum::new(1001).unwrap_err(),
        GramAbsent::TooManyIndividuals(1001)
    );
    assert!(
        GramAbsent::TooManyIndividuals(1001)
            .to_string()
            .contains("1001")
    );
    let nothing = GramStratum::new(5)
        .unwrap()
        .pairs(FrequencyCutoff::FivePercent);
    assert_eq!((nothing.contigs(), nothing.all()), (0, PairSums::default()));
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(12))]

    /// Any order, any cut in three, any grouping of the merge: the same integers.
    #[test]
    fn merging_is_associative_and_commutative(
        seed in 0u64..1000,
        cuts in (0usize..200, 0usize..200),
        missing in prop::sample::select(vec![0u64, 5]),
    ) {
        let loci = made(seed, 200, 11, 4, missing);
        let (i, j) = (cuts.0.min(cuts.1), cuts.0.max(cuts.1));
        let part = |range: Range<usize>| {
            let mut gram = GramStratum::new(11).unwrap();
            for locus in &loci[range] {
                gram.add(locus.contig, &locus.genotypes(), 0..11, &locus.counts());
            }
            gram
        };
        let whole = part(0..200);
        let (a, b, c) = (part(0..i), part(i..j), part(j..200));
        let mut left = a.clone();
        left.merge(b.clone());
        left.merge(c.clone());
        let mut right = c;
        right.merge(a);
        right.merge(b);
        right.merge(GramStratum::new(11).unwrap());
        prop_assert!(whole == left && whole == right);
    }
}

/// Prints loci per second; run with `--ignored --nocapture`.
#[test]
#[ignore = "a measurement of about ten seconds"]
fn a_million_loci_of_a_hundred_individuals() {
    for missing in [0, 10] {
        let loci: Vec<(u64, Genotypes, Counts)> = made(9, 2000, 100, 2, missing)
            .iter()
            .map(|l| (l.contig, l.genotypes(), l.counts()))
            .collect();
        let mut gram = GramStratum::new(100).unwrap();
        let start = std::time::Instant::now();
        for contig in 0..25 {
            for (_, genotypes, counts) in loci.iter().cycle().take(40_000) {
                gram.add(contig, genotypes, 0..100, counts);
            }
        }
        let added = start.elapsed();
        let pairs = gram.pairs(FrequencyCutoff::FivePercent);
        println!(
            "one call in {missing} missing: {added:?}, pairs of contigs after {:?}, {} loci kept",
            start.elapsed(),
            pairs.loci.iter().sum::<u64>()
        );
        assert_eq!(pairs.contigs(), 25);
    }
}
