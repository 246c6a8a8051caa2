//! Published examples and values worked out by hand, by exact enumeration or in exact fractions,
//! each with its source beside it.

use genewane::locus::Counts;
use genewane::locus::change::{krimbas_tsakas, temporal_terms};
use genewane::locus::diversity::{
    effective_alleles, effective_alleles_of_sample, expected_heterozygosity, heterozygote_excess,
    inbreeding, observed_heterozygosity,
};
use genewane::locus::fstatistics::{
    Components, NeiDiversity, RatioTerms, hudson, nei, weir_cockerham,
};
use genewane::locus::hardy_weinberg::{
    Direction, HardyWeinbergCache, Method, TABLE_BUDGET, chi_square, expected_heterozygotes,
    expected_homozygotes, heterozygote_distribution, test_many_alleles, test_two_alleles,
};
use genewane::locus::richness::{Rarefaction, absence, private_richness, richness};
use genewane::merge::histogram::{PValueHistogram, Rejections};
use genewane::model::SamplingPlan;
use genewane::ne::estimate::quantile;
use genewane::ne::interval::{block_jackknife, individual_variance_centred};
use genewane::ne::temporal::{
    TemporalSample, chi_square_limits, corrected_fs, drift_rate_fc, drift_rate_fk, drift_rate_fs,
    drift_rate_fs_linear,
};
use genewane::ne::testing::benjamini_hochberg;
use statrs::distribution::{ChiSquared, ContinuousCDF};

#[track_caller]
fn close(value: f64, expected: f64, tolerance: f64) {
    assert!(
        (value - expected).abs() <= tolerance,
        "{value} is not {expected}"
    );
}

#[track_caller]
fn relatively_close(value: f64, expected: f64, tolerance: f64) {
    close(value, expected, tolerance * expected.abs());
}

/// Counts of genotypes written as `1/2`, with `./.` for a missing one; alleles count from 1.
fn counts(alleles: usize, genotypes: &str) -> Counts {
    let code = |text: &str| text.parse::<u16>().ok().map(|allele| allele - 1);
    let pair = |text: &str| {
        let (a, b) = text.split_once('/')?;
        Some([code(a)?, code(b)?])
    };
    Counts::of(alleles, genotypes.split_whitespace().map(pair))
}

/// Counts of which only the gene copies are known.
fn copies(copies: &[u32]) -> Counts {
    let typed = copies.iter().sum::<u32>() / 2;
    Counts {
        typed,
        copies: copies.to_vec(),
        ..Counts::empty(copies.len())
    }
}

/// Three populations at three loci, invented: `G3[locus][population]`.
fn three_populations() -> [[Counts; 3]; 3] {
    [
        [
            counts(2, "1/1 1/2 1/1 1/2 ./."),
            counts(2, "2/2 1/2 2/2 2/2"),
            counts(2, "1/2 1/2 2/2 1/1 1/2 2/2"),
        ],
        [
            counts(4, "1/2 1/3 2/2 1/2 3/3"),
            counts(4, "2/3 3/3 ./. 2/3"),
            counts(4, "1/1 1/2 1/4 4/4 1/2 2/4"),
        ],
        [
            counts(2, "1/1 1/1 1/2 1/1 1/1"),
            counts(2, "1/2 2/2 1/2 1/2"),
            counts(2, "1/1 1/2 ./. 1/1 2/2 1/2"),
        ],
    ]
}

/// Gene copies at the first and the later visit, 3 generations apart, invented.
fn two_visits() -> [[Counts; 2]; 4] {
    [
        [copies(&[30, 10]), copies(&[22, 18])],
        [copies(&[12, 20, 8]), copies(&[20, 14, 6])],
        [copies(&[38, 2]), copies(&[36, 0])],
        [copies(&[5, 9, 14, 10]), copies(&[9, 11, 12, 8])],
    ]
}

/// Exact fractions: closed form, and share of distinct pairs of gene copies that differ.
#[test]
fn heterozygosity_and_inbreeding() {
    let loci = three_populations();
    // (typed, Ho, He, FIS) by population and locus.
    let expected = [
        [
            (4, 1.0 / 2.0, 3.0 / 7.0, -1.0 / 6.0),
            (5, 3.0 / 5.0, 11.0 / 15.0, 2.0 / 11.0),
            (5, 1.0 / 5.0, 1.0 / 5.0, 0.0),
        ],
        [
            (4, 1.0 / 4.0, 1.0 / 4.0, 0.0),
            (3, 2.0 / 3.0, 8.0 / 15.0, -0.25),
            (4, 3.0 / 4.0, 15.0 / 28.0, -0.4),
        ],
        [
            (6, 1.0 / 2.0, 35.0 / 66.0, 0.05714285714285714),
            (6, 2.0 / 3.0, 47.0 / 66.0, 0.06382978723404255),
            (5, 2.0 / 5.0, 8.0 / 15.0, 0.25),
        ],
    ];
    // Means of Ho and He over the loci, and FIS from them.
    let means = [
        (
            0.43333333333333335,
            0.45396825396825397,
            0.045454545454545456,
        ),
        (0.5555555555555556, 0.4396825396825397, -0.26353790613718414),
        (0.5222222222222223, 0.591919191919192, 0.11774744027303755),
    ];
    for (population, row) in expected.iter().enumerate() {
        let (mut observed_sum, mut expected_sum) = (0.0, 0.0);
        for (locus, &(typed, ho, he, fis)) in row.iter().enumerate() {
            let sample = &loci[locus][population];
            let observed = observed_heterozygosity(sample).unwrap();
            let unbiased = expected_heterozygosity(sample).unwrap();
            assert_eq!(sample.typed, typed);
            close(observed, ho, 1e-12);
            close(unbiased, he, 1e-12);
            close(inbreeding(observed, unbiased).unwrap(), fis, 1e-12);
            observed_sum += observed;
            expected_sum += unbiased;
        }
        let (ho, he, fis) = means[population];
        close(observed_sum / 3.0, ho, 1e-12);
        close(expected_sum / 3.0, he, 1e-12);
        close(inbreeding(observed_sum, expected_sum).unwrap(), fis, 1e-12);
    }
}

/// Arithmetic: 6 and 2 copies, sum p^2 = 5/8, He = 3/7.
#[test]
fn effective_number_of_alleles() {
    let sample = copies(&[6, 2]);
    close(effective_alleles_of_sample(&sample).unwrap(), 1.6, 1e-12);
    close(
        effective_alleles(expected_heterozygosity(&sample).unwrap()).unwrap(),
        1.75,
        1e-12,
    );
}

/// Arithmetic: 20 individuals, 12 heterozygous, both alleles at one half:
/// Hexp = 1/2 40/39, D = 0.6 78/40 - 1 = 0.17.
#[test]
fn excess_of_heterozygotes() {
    let mut genotypes = vec![Some([0, 1]); 12];
    genotypes.extend([Some([0, 0]); 4]);
    genotypes.extend([Some([1, 1]); 4]);
    let excess = heterozygote_excess(&Counts::of(2, genotypes));
    assert_eq!(excess.alleles, 2);
    close(excess.sum / 2.0, 0.17, 1e-12);
}

/// Exact fractions of the formula of Hurlbert (1971) and El Mousadik & Petit (1996).
#[test]
fn rarefied_richness() {
    let sample = copies(&[10, 5, 3, 1, 1]);
    let expected = [
        (1, 1.0),
        (2, 161.0 / 95.0),
        (5, 2359.0 / 816.0),
        (10, 179143.0 / 46189.0),
        (20, 5.0),
    ];
    for (gene_copies, alleles) in expected {
        let mut table = Rarefaction::new(gene_copies);
        close(richness(&sample, &mut table).unwrap(), alleles, 1e-12);
    }
    let identity = 1.0 + expected_heterozygosity(&sample).unwrap();
    close(
        richness(&sample, &mut Rarefaction::new(2)).unwrap(),
        identity,
        1e-12,
    );
}

/// Richness by listing every subset of copies, private richness (Kalinowski 2004) in exact
/// fractions, the first of them also by listing every triple of subsets.
#[test]
fn private_alleles() {
    let [_, samples, _] = three_populations();
    let expected = [
        (
            2,
            [26.0 / 15.0, 23.0 / 15.0, 113.0 / 66.0],
            [868.0 / 2475.0, 1348.0 / 2475.0, 21.0 / 22.0],
        ),
        (
            6,
            [41.0 / 14.0, 2.0, 379.0 / 132.0],
            [29.0 / 3960.0, 13.0 / 385.0, 361.0 / 360.0],
        ),
    ];
    for (gene_copies, all, private) in expected {
        let mut table = Rarefaction::new(gene_copies);
        for population in 0..3 {
            close(
                richness(&samples[population], &mut table).unwrap(),
                all[population],
                1e-12,
            );
            let own = private_richness(population, &samples, &mut table).unwrap();
            close(own, private[population], 1e-12);
        }
    }
    // Arithmetic: allele 4 is missed by 2 of the 12 copies of the third with C(8,2)/C(12,2).
    let missed = absence(&samples[2], 3, &mut Rarefaction::new(2)).unwrap();
    close(missed, 28.0 / 66.0, 1e-12);
}

/// Exact fractions, from the closed form of Weir & Cockerham (1984) and from a nested analysis of
/// variance of 0/1 indicators, which agree.
#[test]
fn variance_components() {
    let loci = three_populations();
    // Components by allele, added up, then theta, F and f.
    let expected = [
        (
            193.0 / 1536.0,
            -1.0 / 168.0,
            3.0 / 7.0,
            [
                0.22917726887192535,
                0.2183206106870229,
                -0.014084507042253521,
            ],
        ),
        (
            139.0 / 7560.0 - 757.0 / 41580.0 + 967.0 / 11880.0 + 53.0 / 2079.0,
            -13.0 / 840.0 - 2.0 / 165.0 + 317.0 / 9240.0 + 37.0 / 924.0,
            3.0 / 14.0 + 1.0 / 4.0 + 3.0 / 28.0 + 1.0 / 14.0,
            [0.13439594276399203, 0.1930809635935519, 0.06779661016949153],
        ),
        (
            2643.0 / 28600.0,
            -51.0 / 3080.0,
            3.0 / 7.0,
            [
                0.18320361238191432,
                0.15037728001901254,
                -0.04018912529550828,
            ],
        ),
    ];
    let ratios = |components: Components| {
        [
            components.theta().unwrap(),
            components.total_inbreeding().unwrap(),
            components.inbreeding_within().unwrap(),
        ]
    };
    let mut all = Components::default();
    for (samples, (a, b, c, statistics)) in loci.iter().zip(expected) {
        let components = weir_cockerham(samples).unwrap();
        close(components.a, a, 1e-12);
        close(components.b, b, 1e-12);
        close(components.c, c, 1e-12);
        for (value, expected) in ratios(components).into_iter().zip(statistics) {
            close(value, expected, 1e-12);
        }
        all += components;
    }
    close(all.a, 5356133.0 / 16473600.0, 1e-12);
    close(all.b, 4.0 / 165.0, 1e-12);
    close(all.c, 3.0 / 2.0, 1e-12);
    let overall = [
        0.17580751695018426,
        0.18891594610405807,
        0.015904572564612324,
    ];
    for (value, expected) in ratios(all).into_iter().zip(overall) {
        close(value, expected, 1e-12);
    }
    let pairs = [
        (
            0,
            1,
            [
                0.31881718977905027,
                0.26260061585003514,
                -0.08252788104089219,
            ],
        ),
        (
            0,
            2,
            [
                0.08545209841942016,
                0.17678748802853714,
                0.09986944308905564,
            ],
        ),
        (
            1,
            2,
            [
                0.16565937367260633,
                0.15936178429985265,
                -0.007547983610092733,
            ],
        ),
    ];
    for (first, second, statistics) in pairs {
        let mut sum = Components::default();
        for samples in &loci {
            sum += weir_cockerham(&[&samples[first], &samples[second]]).unwrap();
        }
        for (value, expected) in ratios(sum).into_iter().zip(statistics) {
            close(value, expected, 1e-12);
        }
    }
}

/// Exact fractions; at the loci of two alleles by the form of Bhatia et al. (2013) and by
/// heterozygosities within and between (Hudson, Slatkin & Maddison 1992).
#[test]
fn hudson_ratio() {
    let loci = three_populations();
    let expected = [
        (
            (0, 1),
            [
                (39.0 / 112.0, 11.0 / 16.0),
                (1.0 / 30.0, 2.0 / 3.0),
                (13.0 / 56.0, 3.0 / 5.0),
            ],
            0.3140420347243375,
        ),
        (
            (0, 2),
            [
                (115.0 / 1848.0, 13.0 / 24.0),
                (23.0 / 440.0, 31.0 / 40.0),
                (4.0 / 75.0, 21.0 / 50.0),
            ],
            0.0966423212104594,
        ),
        (
            (1, 2),
            [
                (25.0 / 528.0, 7.0 / 16.0),
                (97.0 / 330.0, 11.0 / 12.0),
                (-1.0 / 105.0, 21.0 / 40.0),
            ],
            0.17654850692544705,
        ),
    ];
    for ((first, second), terms, ratio) in expected {
        let mut sum = RatioTerms::default();
        for (samples, (numerator, denominator)) in loci.iter().zip(terms) {
            let locus = hudson(&samples[first], &samples[second]).unwrap();
            close(locus.numerator, numerator, 1e-12);
            close(locus.denominator, denominator, 1e-12);
            sum += locus;
        }
        close(sum.ratio().unwrap(), ratio, 1e-12);
    }
}

/// Exact fractions of Nei & Chesser (1983), Nei (1987), Hedrick (2005), Jost (2008) and Meirmans &
/// Hedrick (2011).
#[test]
fn standardised_differentiation() {
    // Ho, Hs, Ht, GST, GST' (Nei), D, GST' (Hedrick), G''ST.
    let expected = [
        [
            0.4166666666666667,
            0.40327380952380953,
            0.5047949735449735,
            0.20111365869636424,
            0.2741071428571429,
            0.25519534497090607,
            0.4049857341578906,
            0.45935162094763093,
        ],
        [
            0.6444444444444445,
            0.6659420289855073,
            0.7460547504025765,
            0.10738182603064969,
            0.15286526348133353,
            0.35972523499638465,
            0.428479108423818,
            0.45760100564911127,
        ],
        [
            0.45,
            0.41808510638297874,
            0.4826950354609929,
            0.1338524831031443,
            0.18818425945052675,
            0.16654478976234002,
            0.27810483920790396,
            0.32338794128609716,
        ],
    ];
    let overall = [
        0.5037037037037037,
        0.49576698163076516,
        0.5778482531361809,
        0.1420464128080903,
        0.19894024512084624,
        0.24417660639582553,
        0.35153860817373583,
        0.39454029758750986,
    ];
    let all = |d: &NeiDiversity| {
        [
            d.observed,
            d.within,
            d.total,
            d.gst().unwrap(),
            d.gst_prime().unwrap(),
            d.jost_d().unwrap(),
            d.gst_hedrick().unwrap(),
            d.gst_double_prime().unwrap(),
        ]
    };
    let mut mean = NeiDiversity {
        samples: 3,
        observed: 0.0,
        within: 0.0,
        total: 0.0,
    };
    for (samples, expected) in three_populations().iter().zip(expected) {
        let diversity = nei(samples).unwrap();
        for (value, expected) in all(&diversity).into_iter().zip(expected) {
            close(value, expected, 1e-12);
        }
        mean.observed += diversity.observed / 3.0;
        mean.within += diversity.within / 3.0;
        mean.total += diversity.total / 3.0;
    }
    for (value, expected) in all(&mean).into_iter().zip(overall) {
        close(value, expected, 1e-12);
    }
    close(mean.inbreeding().unwrap(), -0.01600897673102726, 1e-12);
}

/// The argument of Hedrick (2005) and Jost (2008), by algebra: two populations of ten equally common
/// alleles each, none shared.
#[test]
fn nothing_shared_is_complete_differentiation() {
    let apart = NeiDiversity {
        samples: 2,
        observed: 0.9,
        within: 0.9,
        total: 0.95,
    };
    close(apart.gst().unwrap(), 0.05263157894736842, 1e-12);
    close(apart.jost_d().unwrap(), 1.0, 1e-12);
    close(apart.gst_hedrick().unwrap(), 1.0, 1e-12);
}

/// Exact fractions: Krimbas & Tsakas (1971), Nei & Tajima (1981), Pollak (1983), Jorde & Ryman
/// (2007). With two alleles Fk = Fs = Fc/(1 - Fc/4).
#[test]
fn temporal_change_by_locus() {
    // Fa, Fc, Fk, and numerator and denominator of Fs.
    let expected = [
        (
            0.21333333333333335,
            0.16842105263157894,
            0.17582417582417584,
            2.0 / 25.0,
            91.0 / 200.0,
        ),
        (
            0.09870039682539683,
            0.08908045977011494,
            0.08361344537815125,
            13.0 / 200.0,
            503.0 / 800.0,
        ),
        (
            0.05263157894736842,
            0.1,
            0.10256410256410256,
            1.0 / 200.0,
            39.0 / 800.0,
        ),
        (
            0.0312812049062049,
            0.02738739417518288,
            0.028624314853851238,
            1089.0 / 57760.0,
            170367.0 / 231040.0,
        ),
    ];
    for ([first, later], (fa, fc, fk, numerator, denominator)) in two_visits().iter().zip(expected)
    {
        let terms = temporal_terms(first, later).unwrap();
        close(krimbas_tsakas(first, later).unwrap(), fa, 1e-10);
        close(terms.fc, fc, 1e-10);
        close(terms.fk, fk, 1e-10);
        close(terms.fs_numerator, numerator, 1e-10);
        close(terms.fs_denominator, denominator, 1e-10);
    }
}

/// Exact fractions of the distribution of Levene (1949) and Haldane (1954); the first sample has the
/// size of Table 1 of Wigginton, Cutler & Abecasis (2005).
#[test]
fn heterozygotes_given_allele_counts() {
    let expected = [
        2.2528461190398866e-13,
        1.3366886972969994e-10,
        2.117314896518447e-08,
        1.403477302835085e-06,
        4.693851868370673e-05,
        0.0008704961646796521,
        0.009374574081165484,
        0.0592830208561322,
        0.2144650460383606,
        0.40635482407268325,
        0.3096036754839491,
    ];
    let chances = heterozygote_distribution(100, 21).unwrap();
    assert_eq!(chances.len(), expected.len());
    for (chance, expected) in chances.into_iter().zip(expected) {
        relatively_close(chance, expected, 1e-9);
    }
    let small = heterozygote_distribution(5, 4).unwrap();
    for (chance, expected) in small.into_iter().zip([1.0 / 21.0, 4.0 / 7.0, 8.0 / 21.0]) {
        close(chance, expected, 1e-12);
    }
    let tie = heterozygote_distribution(6, 4).unwrap();
    for (chance, expected) in tie.into_iter().zip([1.0 / 33.0, 16.0 / 33.0, 16.0 / 33.0]) {
        close(chance, expected, 1e-12);
    }
}

/// Exact fractions, from the distribution above.
#[test]
fn exact_test_of_two_alleles() {
    let expected = [
        (9, 4.836330302966134e-05, 2.4894043687807975e-05),
        (11, 0.0009188594677093134, 0.00048361138536948735),
        (13, 0.010293433548874797, 0.005606146508292055),
        (15, 0.069576454405007, 0.0399349439769409),
        (17, 0.2840415004433676, 0.1768089774241873),
        (19, 1.0, 0.7968225879636583),
        (21, 0.5936451759273167, 0.43884333818534216),
    ];
    let mut cache = HardyWeinbergCache::default();
    for (heterozygotes, p, mid_p) in expected {
        let test = test_two_alleles(100, 21, heterozygotes).unwrap();
        close(test.p, p, 1e-9);
        close(test.mid_p, mid_p, 1e-9);
        let homozygotes = (21 - heterozygotes) / 2;
        let sample = biallelic(
            100 - heterozygotes - homozygotes,
            heterozygotes,
            homozygotes,
        );
        close(cache.mid_p(&sample).unwrap().mid_p, mid_p, 1e-9);
    }
    // Exact fractions: the tails of 1/21, 4/7, 8/21.
    let test = test_two_alleles(5, 4, 2).unwrap();
    close(test.deficit, 13.0 / 21.0, 1e-12);
    close(test.excess, 20.0 / 21.0, 1e-12);
}

/// Exact fractions: two tables of 16/33 tie, and mid-p halves both.
#[test]
fn ties_are_all_halved() {
    let test = test_two_alleles(6, 4, 4).unwrap();
    close(test.p, 1.0, 1e-12);
    close(test.mid_p, 17.0 / 33.0, 1e-12);
    let found = HardyWeinbergCache::default()
        .mid_p(&biallelic(2, 4, 0))
        .unwrap();
    close(found.mid_p, 17.0 / 33.0, 1e-12);
    assert_eq!(found.direction, Direction::Excess);
}

/// MN blood groups as used by Graffelman & Moreno (2013): published 0.6557, mid-p 0.6331, chi-square
/// p 0.6379, with continuity correction 0.6723; further digits recomputed from the counts.
#[test]
fn blood_groups() {
    let test = test_two_alleles(1000, 915, 489).unwrap();
    close(test.p, 0.6556634885620949, 1e-8);
    close(test.mid_p, 0.63309653294289, 1e-8);
    let one = ChiSquared::new(1.0).unwrap();
    let plain = chi_square([298, 489, 213], 0.0).unwrap();
    close(plain, 0.22148958764658774, 1e-8);
    close(one.sf(plain), 0.6379072637822231, 1e-8);
    let corrected = chi_square([298, 489, 213], 0.5).unwrap();
    close(corrected, 0.17895628988363968, 1e-8);
    close(one.sf(corrected), 0.6722717269404532, 1e-8);
}

/// Levene (1949), arithmetic; all expectations together are the 45 individuals.
#[test]
fn expected_genotypes() {
    let copies = [11, 30, 30, 19];
    let homozygotes = copies.map(|copies| expected_homozygotes(45, copies).unwrap());
    let expected = [
        0.6179775280898876,
        4.887640449438202,
        4.887640449438202,
        1.9213483146067416,
    ];
    for (value, expected) in homozygotes.into_iter().zip(expected) {
        close(value, expected, 1e-9);
    }
    close(
        expected_heterozygotes(45, 11, 30).unwrap(),
        3.707865168539326,
        1e-9,
    );
    let mut all: f64 = homozygotes.iter().sum();
    for (i, &first) in copies.iter().enumerate() {
        for &second in &copies[..i] {
            all += expected_heterozygotes(45, first, second).unwrap();
        }
    }
    close(all, 45.0, 1e-9);
}

/// Data of Louis & Dempster (1987), the first example of Guo & Thompson (1992): published exact p
/// 0.0174. Further digits and the number of tables by two independent enumerations.
#[test]
fn four_alleles_by_enumeration() {
    let table = lower_triangle(&[&[0], &[3, 1], &[5, 18, 1], &[3, 7, 5, 2]]);
    let test = test_many_alleles(&table, TABLE_BUDGET, 0, 0).unwrap();
    assert_eq!(test.method, Method::Enumeration { tables: 162365 });
    close(test.probability, 1.8080475056885331e-06, 1e-14);
    close(test.p, 0.017442334444, 1e-10);
    close(test.mid_p, 0.017438718, 1e-8);
    let shuffled = test_many_alleles(&table, 1000, 20_000, 1).unwrap();
    let Method::MonteCarlo { standard_error, .. } = shuffled.method else {
        panic!("162365 tables are more than 1000")
    };
    close(shuffled.p, 0.017442334444, 4.0 * standard_error);
    close(shuffled.mid_p, 0.017438718, 4.0 * standard_error);
}

/// Exact enumeration: 12 tables, of which some tie.
#[test]
fn three_alleles_with_ties() {
    let test = test_many_alleles(&lower_triangle(&[&[2], &[1, 1], &[0, 1, 1]]), 12, 0, 0).unwrap();
    assert_eq!(test.method, Method::Enumeration { tables: 12 });
    close(test.probability, 0.05194805194805224, 1e-9);
    close(test.p, 0.20346320346320457, 1e-9);
    close(test.mid_p, 0.15151515151515232, 1e-9);
}

/// Rhesus groups of Cavalli-Sforza & Bodmer (1971), an example of Guo & Thompson (1992): published
/// estimate about 0.7; 100 000 shuffles of our own gave 0.7133 with standard error 0.0014.
#[test]
fn nine_alleles_by_shuffling() {
    let table = lower_triangle(&[
        &[1236],
        &[120, 3],
        &[18, 0, 0],
        &[982, 55, 7, 249],
        &[32, 1, 0, 12, 0],
        &[2582, 132, 20, 1162, 29, 1312],
        &[6, 0, 0, 4, 0, 4, 0],
        &[2, 0, 0, 0, 0, 0, 0, 0],
        &[115, 5, 2, 53, 1, 149, 0, 0, 4],
    ]);
    assert_eq!(table.iter().map(|&(_, count)| count).sum::<u32>(), 8297);
    let test = test_many_alleles(&table, 100_000, 5_000, 1).unwrap();
    let Method::MonteCarlo {
        shuffles: 5_000,
        standard_error,
    } = test.method
    else {
        panic!("expected shuffling, not {:?}", test.method)
    };
    close(standard_error, (0.7133f64 * 0.2867 / 5000.0).sqrt(), 5e-4);
    close(test.p, 0.7133, 4.0 * standard_error);
}

/// Third example of Guo & Thompson (1992): 250 552 020 tables enumerated independently, and 0.21656
/// with standard error 0.00029 by shuffling.
#[test]
fn eight_alleles_by_shuffling() {
    let test = test_many_alleles(&third_example(), 1000, 20_000, 1).unwrap();
    close(test.p, 0.215939821822, 4.0 * 0.0029);
    close(test.mid_p, 0.211345321822, 4.0 * 0.0029);
}

/// The same, every table: a few seconds.
#[test]
fn eight_alleles_by_enumeration() {
    let test = test_many_alleles(&third_example(), 300_000_000, 0, 0).unwrap();
    assert_eq!(
        test.method,
        Method::Enumeration {
            tables: 250_552_020
        }
    );
    close(test.p, 0.215939821822, 2e-6);
    close(test.mid_p, 0.211345321822, 2e-6);
}

fn third_example() -> Vec<([u16; 2], u32)> {
    lower_triangle(&[
        &[3],
        &[4, 2],
        &[2, 2, 2],
        &[3, 3, 2, 1],
        &[0, 1, 0, 0, 0],
        &[0, 0, 0, 0, 0, 1],
        &[0, 0, 1, 0, 0, 0, 0],
        &[0, 0, 0, 2, 1, 0, 0, 0],
    ])
}

/// Genotype counts printed as a lower triangle.
fn lower_triangle(rows: &[&[u32]]) -> Vec<([u16; 2], u32)> {
    let mut table = Vec::new();
    for (i, row) in rows.iter().enumerate() {
        for (j, &count) in row.iter().enumerate() {
            table.push(([j as u16, i as u16], count));
        }
    }
    table
}

/// Counts of a locus of two alleles from its three genotypes.
fn biallelic(first: u32, both: u32, second: u32) -> Counts {
    Counts {
        typed: first + both + second,
        heterozygotes: both,
        copies: vec![2 * first + both, 2 * second + both],
        heterozygous: vec![both; 2],
    }
}

/// Busing, Meijer & van der Leeden (1999) in exact fractions; with equal weights it is the ordinary
/// delete-one jackknife.
#[test]
fn weighted_block_jackknife() {
    let blocks = [
        (10.0, 0.12, 1.5),
        (20.0, 0.31, 2.8),
        (15.0, 0.1, 2.0),
        (5.0, 0.09, 0.7),
        (30.0, 0.45, 4.2),
    ];
    let numerator: f64 = blocks.iter().map(|block| block.1).sum();
    let denominator: f64 = blocks.iter().map(|block| block.2).sum();
    let estimate = numerator / denominator;
    relatively_close(estimate, 0.09553571428571428, 1e-9);
    let deletes = blocks.map(|(_, n, d)| (numerator - n) / (denominator - d));
    let expected = [
        0.0979381443298969,
        0.09047619047619047,
        0.10543478260869565,
        0.09333333333333334,
        0.08857142857142856,
    ];
    for (value, expected) in deletes.into_iter().zip(expected) {
        relatively_close(value, expected, 1e-9);
    }
    let weighted = block_jackknife(estimate, &deletes, &blocks.map(|block| block.0)).unwrap();
    assert_eq!(weighted.blocks, 5);
    relatively_close(weighted.bias_corrected, 0.09560264855606071, 1e-9);
    relatively_close(weighted.variance, 0.00013903385713960633, 1e-9);
    relatively_close(weighted.variance.sqrt(), 0.01179126189767687, 1e-9);
    let equal = block_jackknife(estimate, &deletes, &[1.0; 5]).unwrap();
    relatively_close(equal.variance, 0.00014557829950887, 1e-9);
    // The two are the same for blocks of one individual, as algebra has it.
    relatively_close(
        equal.variance,
        individual_variance_centred(&deletes).unwrap(),
        1e-9,
    );
}

/// Printed tables of Student's t, two-sided 5 % and 1 % points, and of the normal distribution.
#[test]
fn quantiles() {
    let expected = [
        (0.95, 1.0, 12.706205),
        (0.95, 2.0, 4.302653),
        (0.95, 4.0, 2.776445),
        (0.99, 4.0, 4.604095),
        (0.95, 10.0, 2.228139),
        (0.95, 28.0, 2.048407),
        (0.95, 120.0, 1.979930),
        (0.95, 1e9, 1.959964),
        (0.99, 1e9, 2.575829),
    ];
    for (level, degrees, expected) in expected {
        close(quantile(level, degrees), expected, 5e-6);
    }
}

/// Sums over loci from which the multilocus estimates of change are taken.
#[derive(Default)]
struct TemporalSums {
    weight: f64,
    fc: f64,
    fk: f64,
    numerator: f64,
    denominator: f64,
    per_first: f64,
    per_later: f64,
}

impl TemporalSums {
    fn of(loci: &[[Counts; 2]]) -> Self {
        let mut sums = TemporalSums::default();
        for [first, later] in loci {
            let terms = temporal_terms(first, later).unwrap();
            let weight = f64::from(terms.weight());
            sums.weight += weight;
            sums.fc += weight * terms.fc;
            sums.fk += weight * terms.fk;
            sums.numerator += terms.fs_numerator;
            sums.denominator += terms.fs_denominator;
            sums.per_first += weight / f64::from(terms.first);
            sums.per_later += weight / f64::from(terms.later);
        }
        sums
    }

    fn samples(&self, plan: SamplingPlan, census: Option<f64>) -> TemporalSample {
        TemporalSample {
            generations: 3.0,
            first: self.weight / self.per_first,
            later: self.weight / self.per_later,
            plan,
            census,
        }
    }
}

/// Exact fractions; the corrections of both plans by Waples (1989), Pollak (1983), Nei & Tajima
/// (1981) and Jorde & Ryman (2007).
#[test]
fn temporal_effective_size() {
    let size = |rate: Option<f64>| 0.5 / rate.unwrap();
    let sums = TemporalSums::of(&two_visits());
    let (fc, fk) = (sums.fc / sums.weight, sums.fk / sums.weight);
    let fs = sums.numerator / sums.denominator;
    let two = sums.samples(SamplingPlan::Two, None);
    let one = sums.samples(SamplingPlan::One, Some(500.0));
    assert_eq!(sums.weight, 7.0);
    relatively_close(two.first, 19.558823529411764, 1e-8);
    relatively_close(two.later, 19.6875, 1e-8);
    relatively_close(fk, 0.07592687338659065, 1e-8);
    relatively_close(fc, 0.07553487924247963, 1e-8);
    relatively_close(fs, 65020.0 / 720033.0, 1e-8);
    relatively_close(size(drift_rate_fk(fk, &two)), 60.08137850807069, 1e-8);
    relatively_close(size(drift_rate_fk(fk, &one)), 55.62531750086894, 1e-8);
    relatively_close(size(drift_rate_fc(fc, &two)), 61.03976584709772, 1e-8);
    relatively_close(size(drift_rate_fc(fc, &one)), 56.445844350810766, 1e-8);
    relatively_close(corrected_fs(fs, &two).unwrap(), 0.03832031524840231, 1e-8);
    relatively_close(corrected_fs(fs, &one).unwrap(), 0.040281823494786, 1e-8);
    relatively_close(
        size(drift_rate_fs_linear(fs, &two)),
        39.14372807939098,
        1e-8,
    );
    relatively_close(
        size(drift_rate_fs_linear(fs, &one)),
        37.237638961258966,
        1e-8,
    );
    relatively_close(size(drift_rate_fs(fs, &two)), 38.639386663048185, 1e-8);
    // Fc with the weights K of some papers instead of K-1.
    let (mut weighted, mut weights) = (0.0, 0.0);
    for [first, later] in &two_visits() {
        let terms = temporal_terms(first, later).unwrap();
        weighted += f64::from(terms.alleles) * terms.fc;
        weights += f64::from(terms.alleles);
    }
    relatively_close(weighted / weights, 0.08305755102493038, 1e-8);
}

/// Waples (1989): 7 F over the chi-square quantiles 16.012764274629326 and 1.689869180677355 with 7
/// degrees of freedom, which a general statistics library gives.
#[test]
fn chi_square_interval() {
    let sums = TemporalSums::of(&two_visits());
    let fk = sums.fk / sums.weight;
    let [low, high] = chi_square_limits(fk, sums.weight, 0.95).unwrap();
    relatively_close(low, 0.03319152799546459, 1e-8);
    relatively_close(high, 0.3145143540005249, 1e-8);
    relatively_close(7.0 * fk / low, 16.012764274629326, 1e-8);
    relatively_close(7.0 * fk / high, 1.689869180677355, 1e-8);
    let samples = sums.samples(SamplingPlan::Two, None);
    let rates = [low, high].map(|f| drift_rate_fk(f, &samples).unwrap());
    // A negative rate: the upper limit of the size is unbounded.
    close(0.5 / rates[0], -84.4157, 1e-3);
    relatively_close(0.5 / rates[1], 5.691441486036802, 1e-8);
}

/// Exact enumeration of both samples of a Wright-Fisher population: what sampling adds is taken off
/// to leave 1 - (1 - 1/(2N))^t.
#[test]
fn temporal_corrections_are_exact() {
    // N, individuals sampled first and later, t, plan, E(numerator)/E(denominator) of Fs.
    let expected = [
        (
            4.0,
            2.0,
            3.0,
            1,
            SamplingPlan::One,
            0.33548387096774207,
            0.125,
        ),
        (
            4.0,
            2.0,
            3.0,
            1,
            SamplingPlan::Two,
            0.5988023952095811,
            0.125,
        ),
        (
            4.0,
            2.0,
            3.0,
            2,
            SamplingPlan::One,
            0.4614107883817427,
            0.234375,
        ),
        (
            4.0,
            2.0,
            3.0,
            2,
            SamplingPlan::Two,
            0.7225211375864721,
            0.234375,
        ),
        (
            10.0,
            5.0,
            8.0,
            3,
            SamplingPlan::One,
            0.21778293246040953,
            0.142625,
        ),
        (
            10.0,
            5.0,
            8.0,
            3,
            SamplingPlan::Two,
            0.3199004397945516,
            0.142625,
        ),
    ];
    for (census, first, later, generations, plan, fs, corrected) in expected {
        let samples = TemporalSample {
            generations: f64::from(generations),
            first,
            later,
            plan,
            census: Some(census),
        };
        close(corrected_fs(fs, &samples).unwrap(), corrected, 1e-9);
        close(
            1.0 - (1.0 - 0.5 / census).powi(generations),
            corrected,
            1e-12,
        );
        close(drift_rate_fs(fs, &samples).unwrap(), 0.5 / census, 1e-9);
    }
}

/// Exact fractions: Fs without each locus, weighted by K-1 and unweighted.
#[test]
fn temporal_jackknife_over_loci() {
    let loci = two_visits();
    let all = TemporalSums::of(&loci);
    let mut deletes = Vec::new();
    let mut weights = Vec::new();
    for locus in &loci {
        let one = TemporalSums::of(std::slice::from_ref(locus));
        deletes.push((all.numerator - one.numerator) / (all.denominator - one.denominator));
        weights.push(one.weight);
    }
    let expected = [
        0.06279906245583466,
        0.08367607847021169,
        0.08997315787797505,
        0.13245033112582782,
    ];
    for (&value, expected) in deletes.iter().zip(expected) {
        relatively_close(value, expected, 1e-8);
    }
    let fs = all.numerator / all.denominator;
    let weighted = block_jackknife(fs, &deletes, &weights).unwrap();
    relatively_close(weighted.bias_corrected, 0.09480351855431102, 1e-8);
    relatively_close(weighted.variance, 0.0017791759469511584, 1e-8);
    let equal = block_jackknife(fs, &deletes, &[1.0; 4]).unwrap();
    relatively_close(equal.bias_corrected, 0.08453169451509952, 1e-8);
    relatively_close(equal.variance, 0.0019215884372485068, 1e-8);
}

/// The worked example of Benjamini & Hochberg (1995), which rejects four at 5 %; q from a general
/// statistics library.
#[test]
fn false_discovery_rate() {
    let p = [
        0.0001, 0.0004, 0.0019, 0.0095, 0.0201, 0.0278, 0.0298, 0.0344, 0.0459, 0.324, 0.4262,
        0.5719, 0.6528, 0.759, 1.0,
    ];
    let expected = [
        0.0015,
        0.003,
        0.0095,
        0.035625,
        0.0603,
        0.063857142857,
        0.063857142857,
        0.0645,
        0.0765,
        0.486,
        0.581181818182,
        0.714875,
        0.753230769231,
        0.813214285714,
        1.0,
    ];
    let adjusted = benjamini_hochberg(&p.map(Some));
    for (value, expected) in adjusted.iter().zip(expected) {
        close(value.unwrap(), expected, 1e-9);
    }
    assert_eq!(adjusted.iter().filter(|q| q.unwrap() <= 0.05).count(), 4);
    let mut histogram = PValueHistogram::default();
    for (i, p) in p.into_iter().enumerate() {
        histogram.add(
            p,
            if i == 2 {
                Direction::Excess
            } else {
                Direction::Deficit
            },
        );
    }
    let rejections = histogram.rejections(0.05);
    assert_eq!(
        rejections,
        Rejections {
            tested: 15,
            deficit: 3,
            excess: 1
        }
    );
}

/// Arithmetic: ties share a q, and a missing p is no test.
#[test]
fn false_discovery_rate_with_ties() {
    let p = [
        Some(0.01),
        Some(0.02),
        Some(0.02),
        Some(0.5),
        None,
        Some(0.04),
        Some(1e-5),
    ];
    let expected = [
        Some(0.03),
        Some(0.03),
        Some(0.03),
        Some(0.5),
        None,
        Some(0.048),
        Some(6e-5),
    ];
    for (value, expected) in benjamini_hochberg(&p).into_iter().zip(expected) {
        assert_eq!(value.is_some(), expected.is_some());
        if let (Some(value), Some(expected)) = (value, expected) {
            close(value, expected, 1e-12);
        }
    }
}
