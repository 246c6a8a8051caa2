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
use genewane::locus::richness::{Rarefaction, absence, private_richness, richness};

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
