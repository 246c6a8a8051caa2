//! Individuals and pairs of individuals: published formulas on small invented data, enumeration of
//! relatives, and the packed comparison against the plain one.

use std::time::Instant;

use genewane::locus::Counts;
use genewane::locus::individuals::{
    Closeness, MomentInbreeding, MultilocusHeterozygosity, PackedGenotypes, PairCounts,
    UnitingInbreeding, expected_chance_matches, expected_homozygosity, expected_homozygosity_at,
    inbreeding_from_runs, probability_of_identity, probability_of_identity_sibs,
    probability_of_identity_unbiased, row_blocks, sharing_inbreeding, sharing_kinship,
};
use proptest::prelude::*;

/// Dosages of four invented individuals at twelve loci; 3 is missing.
const FOUR: [[u8; 12]; 4] = [
    [0, 1, 2, 1, 1, 0, 2, 1, 0, 1, 2, 1],
    [0, 1, 1, 1, 2, 0, 2, 0, 1, 1, 2, 0],
    [2, 0, 1, 0, 1, 1, 0, 1, 2, 2, 0, 1],
    [0, 1, 2, 1, 1, 0, 2, 1, 0, 1, 3, 1],
];
/// Invented frequencies of the counted allele at the twelve loci, from 25 individuals.
const FREQUENCIES: [f64; 12] = [
    0.3, 0.4, 0.5, 0.2, 0.6, 0.1, 0.7, 0.35, 0.25, 0.5, 0.45, 0.3,
];

fn call(dosage: u8) -> Option<[u16; 2]> {
    match dosage {
        0 => Some([0, 0]),
        1 => Some([0, 1]),
        2 => Some([1, 1]),
        _ => None,
    }
}

fn plainly(first: &[u8], second: &[u8]) -> PairCounts {
    let mut counts = PairCounts::default();
    first
        .iter()
        .zip(second)
        .for_each(|(&x, &y)| counts.add(call(x), call(y)));
    counts
}

fn packed(individuals: &[impl AsRef<[u8]>]) -> PackedGenotypes {
    let mut packed = PackedGenotypes::new(individuals.len());
    for locus in 0..individuals[0].as_ref().len() {
        let dosages: Vec<u8> = individuals.iter().map(|g| g.as_ref()[locus]).collect();
        packed.push(&dosages);
    }
    packed
}

fn near(got: f64, want: f64) {
    assert!((got - want).abs() < 1e-9, "{got}, expected {want}");
}

/// Manichaikul et al. (2010): the count form and the form of squared differences agree exactly.
#[test]
fn robust_kinship() {
    let rows = [
        (0, 1, [12, 3, 0, 6, 5, 5], 1.0 / 4.0, 3.0 / 11.0),
        (0, 2, [12, 3, 4, 6, 5, 9], -11.0 / 20.0, -5.0 / 11.0),
        (0, 3, [11, 6, 0, 6, 6, 0], 1.0 / 2.0, 1.0 / 2.0),
        (1, 2, [12, 1, 3, 5, 5, 11], -1.0 / 2.0, -1.0 / 2.0),
        (1, 3, [11, 3, 0, 5, 6, 5], 1.0 / 4.0, 3.0 / 11.0),
        (2, 3, [11, 3, 3, 5, 6, 8], -7.0 / 20.0, -3.0 / 11.0),
    ];
    let packed = packed(&FOUR);
    for (i, j, [shared, both, nothing, first, second, mismatching], between, within) in rows {
        let want = PairCounts {
            shared,
            heterozygous_first: first,
            heterozygous_second: second,
            both_heterozygous: both,
            nothing_in_common: nothing,
            mismatching,
        };
        let got = packed.compare(i, j);
        assert_eq!(got, want, "{i} and {j}");
        assert_eq!(got, plainly(&FOUR[i], &FOUR[j]));
        near(got.kinship_between().unwrap(), between);
        near(got.kinship_within().unwrap(), within);
        let squares: f64 = FOUR[i]
            .iter()
            .zip(&FOUR[j])
            .filter(|&(&x, &y)| x < 3 && y < 3)
            .map(|(&x, &y)| (f64::from(x) - f64::from(y)).powi(2))
            .sum();
        let typed_both = |k: usize| {
            (0..12)
                .filter(|&l| FOUR[k][l] == 1 && FOUR[i][l] < 3 && FOUR[j][l] < 3)
                .count() as f64
        };
        near(
            between,
            0.5 - squares / (4.0 * typed_both(i).min(typed_both(j))),
        );
        assert_eq!(got.explained_by_dropout(), mismatching - nothing);
    }
}

/// Expected kinship of relatives by enumeration of genotype pairs that share 0, 1 or 2 alleles by
/// descent, weighted by integers: the same at every frequency.
#[test]
fn robust_kinship_of_relatives() {
    // Sixteenths of sharing none, one and both alleles by descent.
    for (sharing, kinship, class) in [
        ([0, 0, 16], 0.5, Closeness::Same),
        ([0, 16, 0], 0.25, Closeness::First),
        ([4, 8, 4], 0.25, Closeness::First),
        ([8, 8, 0], 0.125, Closeness::Second),
        ([12, 4, 0], 0.0625, Closeness::Third),
        ([16, 0, 0], 0.0, Closeness::Unrelated),
    ] {
        for tenths in [1u32, 3, 5] {
            let p = [10 - tenths, tenths];
            let mut total = PairCounts::default();
            let mut add = |first: [u16; 2], second: [u16; 2], weight: u32| {
                let mut one = PairCounts::default();
                one.add(Some(first), Some(second));
                total.merge(&PairCounts {
                    shared: weight * one.shared,
                    heterozygous_first: weight * one.heterozygous_first,
                    heterozygous_second: weight * one.heterozygous_second,
                    both_heterozygous: weight * one.both_heterozygous,
                    nothing_in_common: weight * one.nothing_in_common,
                    mismatching: weight * one.mismatching,
                });
            };
            for a in [0u16, 1] {
                for b in [0u16, 1] {
                    let two = p[a as usize] * p[b as usize];
                    add([a, b], [a, b], sharing[2] * two * 100);
                    for c in [0u16, 1] {
                        let three = two * p[c as usize];
                        add([a, b], [a, c], sharing[1] * three * 10);
                        for d in [0u16, 1] {
                            add([a, b], [c, d], sharing[0] * three * p[d as usize]);
                        }
                    }
                }
            }
            near(total.kinship_between().unwrap(), kinship);
            assert_eq!(Closeness::of(kinship), class);
        }
    }
}

/// Weir & Goudet (2017) on the first three individuals, by arithmetic.
#[test]
fn allele_sharing() {
    let pairs = [(0, 1), (0, 2), (1, 2)];
    let sharing = pairs.map(|(i, j)| plainly(&FOUR[i], &FOUR[j]).allele_sharing().unwrap());
    for (got, want) in sharing
        .into_iter()
        .zip([0.6666666666666666, 0.3333333333333333, 0.375])
    {
        near(got, want);
    }
    let mean = sharing.iter().sum::<f64>() / 3.0;
    near(mean, 0.4583333333333333);
    let kinship = [
        0.38461538461538464,
        -0.23076923076923078,
        -0.15384615384615385,
    ];
    for (m, want) in sharing.into_iter().zip(kinship) {
        near(sharing_kinship(m, mean).unwrap(), want);
    }
    let inbreeding = [
        0.07692307692307693,
        0.23076923076923078,
        0.23076923076923078,
    ];
    for (individual, want) in FOUR.iter().zip(inbreeding) {
        let homozygous = individual.iter().filter(|&&x| x != 1).count() as f64 / 12.0;
        near(sharing_inbreeding(homozygous, mean).unwrap(), want);
    }
    assert_eq!(sharing_kinship(0.5, 1.0), None);
}

/// Method of moments (Nei 1978 correction), uniting gametes (Yang et al. 2011), by arithmetic.
#[test]
fn inbreeding_of_individuals() {
    let heterozygosity = [0.5, 0.4166666666666667, 0.4166666666666667];
    let moments = [
        -0.16551040634291375,
        0.028741328047571874,
        0.028741328047571874,
    ];
    let means = [
        -0.20634920634920637,
        -0.09798534798534801,
        0.45012626262626254,
    ];
    let ratios = [
        -0.2071357779980178,
        -0.0882061446977205,
        0.46679881070366686,
    ];
    for i in 0..3 {
        let mut share = MultilocusHeterozygosity::default();
        let mut moment = MomentInbreeding::default();
        let mut uniting = UnitingInbreeding::default();
        for (&dosage, p) in FOUR[i].iter().zip(FREQUENCIES) {
            share.add(call(dosage));
            moment.add(
                call(dosage).unwrap(),
                expected_homozygosity_at(p, 25.0).unwrap(),
            );
            uniting.add(dosage, p);
        }
        near(share.share().unwrap(), heterozygosity[i]);
        near(moment.expected, 6.8520408163265305);
        near(moment.value().unwrap(), moments[i]);
        near(uniting.mean_of_ratios().unwrap(), means[i]);
        near(uniting.ratio_of_sums().unwrap(), ratios[i]);
    }
    // From counts: 15 of 50 copies, and the share of alike pairs of copies, 1 - He.
    let calls = [[0, 1]; 15].into_iter().chain([[0, 0]; 10]).map(Some);
    let counts = Counts::of(2, calls);
    near(
        expected_homozygosity(&counts).unwrap(),
        expected_homozygosity_at(0.3, 25.0).unwrap(),
    );
}

/// Paetkau & Strobeck (1994) and Evett & Weir (1998): by sums over genotypes, and by listing all
/// parents and sib pairs.
#[test]
fn probability_of_identity_at_a_locus() {
    let tenth = [0.1; 10];
    let rows: [(&[f64], f64, f64); 6] = [
        (&[0.5, 0.5], 0.375, 0.59375),
        (&[0.9, 0.1], 0.6886, 0.83215),
        (&[0.25; 4], 0.109375, 0.40234375),
        (&tenth, 0.019, 0.30475),
        (&[0.5, 0.3, 0.2], 0.2166, 0.49415),
        (&[0.7, 0.1, 0.1, 0.05, 0.05], 0.2901375, 0.580034375),
    ];
    for (frequencies, identity, sibs) in rows {
        near(probability_of_identity(frequencies), identity);
        near(probability_of_identity_sibs(frequencies), sibs);
    }
    // All ordered draws of four distinct copies.
    for (copies, want) in [
        (&[4, 3, 3][..], 31.0 / 210.0),
        (&[6, 4], 38.0 / 105.0),
        (&[5, 2, 2, 1], 19.0 / 210.0),
    ] {
        near(probability_of_identity_unbiased(copies).unwrap(), want);
    }
    assert_eq!(probability_of_identity_unbiased(&[2, 1]), None);
    near(expected_chance_matches(5, 0.01), 0.1);
    assert_eq!(expected_chance_matches(0, 0.01), 0.0);
}

/// McQuillan et al. (2008), by arithmetic.
#[test]
fn runs_of_homozygosity() {
    let runs = [3_200_000, 1_500_000, 10_300_000];
    near(inbreeding_from_runs(&runs, 250_000_000).unwrap(), 0.06);
    assert_eq!(inbreeding_from_runs(&[], 0), None);
}

#[test]
fn what_cannot_be_said_is_absent() {
    let nothing = PairCounts::default();
    assert_eq!(nothing.kinship_between(), None);
    assert_eq!(nothing.kinship_within(), None);
    assert_eq!(nothing.allele_sharing(), None);
    assert_eq!(MultilocusHeterozygosity::default().share(), None);
    assert_eq!(MomentInbreeding::default().value(), None);
    assert_eq!(UnitingInbreeding::default().ratio_of_sums(), None);
    assert_eq!(expected_homozygosity(&Counts::empty(2)), None);
    let mut only_fixed = UnitingInbreeding::default();
    only_fixed.add(0, 0.0);
    assert_eq!(only_fixed.mean_of_ratios(), None);
    assert_eq!(PackedGenotypes::new(3).compare(0, 2), nothing);
}

/// More than two alleles: sharing one, none, and the same unordered genotype.
#[test]
fn many_alleles() {
    let mut counts = PairCounts::default();
    for (first, second) in [
        ([2, 5], [5, 2]),
        ([1, 1], [1, 4]),
        ([1, 2], [3, 4]),
        ([0, 0], [7, 7]),
    ] {
        counts.add(Some(first), Some(second));
    }
    counts.add(None, Some([1, 1]));
    assert_eq!(
        (counts.shared, counts.mismatching, counts.nothing_in_common),
        (4, 3, 2)
    );
    assert_eq!(counts.explained_by_dropout(), 1);
}

proptest! {
    #[test]
    fn packed_comparison_is_the_plain_one(
        individuals in (1usize..9, 1usize..200).prop_flat_map(|(n, loci)| {
            prop::collection::vec(prop::collection::vec(0u8..4, loci), n)
        }),
        blocks in 1usize..5,
    ) {
        let packed = packed(&individuals);
        let n = individuals.len();
        prop_assert_eq!((packed.individuals(), packed.loci()), (n, individuals[0].len()));
        let mut seen = vec![vec![false; n]; n];
        for rows in row_blocks(n, blocks) {
            packed.compare_rows(rows.clone(), |i, j, counts| {
                assert!(rows.contains(&i) && i < j && !seen[i][j]);
                seen[i][j] = true;
                assert_eq!(counts, plainly(&individuals[i], &individuals[j]));
            });
        }
        prop_assert_eq!(seen.iter().flatten().filter(|&&s| s).count(), n * (n - 1) / 2);
    }

    #[test]
    fn blocks_cover_every_row_once_and_evenly(n in 0usize..400, blocks in 1usize..9) {
        let ranges = row_blocks(n, blocks);
        prop_assert!(ranges.len() <= blocks.max(1));
        prop_assert_eq!(ranges.iter().flat_map(|r| r.clone()).collect::<Vec<_>>(), (0..n).collect::<Vec<_>>());
        let pairs = |r: &std::ops::Range<usize>| r.clone().map(|i| n - 1 - i).sum::<usize>();
        let most = ranges.iter().map(pairs).max().unwrap_or(0);
        prop_assert!(most <= n * n.saturating_sub(1) / 2 / blocks + n);
    }
}

/// All pairs of 2000 samples at 50 000 loci on two threads; run with `--ignored --nocapture`.
#[test]
#[ignore = "a measurement"]
fn two_thousand_samples_at_fifty_thousand_loci() {
    let (individuals, loci) = (2000, 50_000);
    let mut packed = PackedGenotypes::new(individuals);
    let mut state = 1u64;
    let mut dosages = vec![0; individuals];
    for _ in 0..loci {
        for dosage in &mut dosages {
            // Knuth's MMIX constants (TAOCP 2).
            state = state
                .wrapping_mul(6364136223846793005)
                .wrapping_add(1442695040888963407);
            *dosage = [0, 0, 0, 0, 1, 1, 2, 3][(state >> 61) as usize];
        }
        packed.push(&dosages);
    }
    let start = Instant::now();
    let pairs: u64 = std::thread::scope(|scope| {
        let workers: Vec<_> = row_blocks(individuals, 2)
            .into_iter()
            .map(|rows| {
                let packed = &packed;
                scope.spawn(move || {
                    let mut pairs = 0;
                    packed.compare_rows(rows, |_, _, counts| pairs += u64::from(counts.shared > 0));
                    pairs
                })
            })
            .collect();
        workers
            .into_iter()
            .map(|worker| worker.join().unwrap())
            .sum()
    });
    println!("{pairs} pairs at {loci} loci: {:?}", start.elapsed());
    assert_eq!(pairs, 1_999_000);
}
