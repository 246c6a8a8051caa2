//! Reports made for tests, of invented places.

use crate::report::CAUTIONS;
use crate::report::wire::*;

/// A value with its interval at 95 %.
pub fn estimate(value: f64, interval: [f64; 2]) -> Estimate {
    Estimate {
        estimate: Some(value),
        standard_error: Some((interval[1] - interval[0]) / 4.0),
        interval: Some(interval),
        level: 0.95,
        loci: 1400,
        gene_copies: None,
        interval_counts: Some(IntervalCounts::LociAndIndividuals),
        absent_because: None,
    }
}

/// A value that could not be made.
pub fn absent(why: &str) -> Estimate {
    Estimate {
        estimate: None,
        standard_error: None,
        interval: None,
        interval_counts: None,
        absent_because: Some(why.to_owned()),
        ..estimate(0.0, [0.0, 0.0])
    }
}

/// One population at one visit.
pub fn stratum(population: &str, visit: &str, year: f64, n: u64, he: f64) -> Stratum {
    Stratum {
        stratum: format!("{population}@{visit}"),
        population: population.to_owned(),
        visit: visit.to_owned(),
        year,
        individuals: n,
        typed_loci: 1400,
        polymorphic_loci: 1310,
        polymorphic_share: estimate(0.936, [0.91, 0.96]),
        call_rate: 0.981,
        observed_heterozygosity: estimate(he - 0.01, [he - 0.035, he + 0.015]),
        expected_heterozygosity: estimate(he, [he - 0.02, he + 0.02]),
        inbreeding_coefficient: estimate(0.03, [-0.01, 0.07]),
        allelic_richness: Estimate {
            gene_copies: Some(44),
            ..estimate(2.1 + he, [2.0 + he, 2.2 + he])
        },
        private_allelic_richness: absent("no other population was sampled at this visit"),
        private_against: Vec::new(),
        effective_alleles: estimate(1.0 / (1.0 - he), [1.3, 1.6]),
        per_site: PerSite {
            sites: 1500,
            observed_heterozygosity: estimate(0.28, [0.26, 0.30]),
            expected_heterozygosity: estimate(0.29, [0.27, 0.31]),
        },
        hardy_weinberg: HardyWeinberg {
            tested: 1310,
            false_discovery_rate: 0.05,
            rejected: 12,
            excess: 4,
            deficit: 8,
        },
    }
}

/// Two strata against each other.
pub fn comparison(from: &str, to: &str, kind: Kind) -> Comparison {
    let in_time = kind != Kind::BetweenPopulations;
    let f = || in_time.then(|| estimate(0.08, [0.06, 0.10]));
    Comparison {
        from: from.to_owned(),
        to: to.to_owned(),
        kind,
        generations: in_time.then_some(5.0),
        fst_weir_cockerham: estimate(0.031, [0.022, 0.040]),
        fst_hudson: estimate(0.032, [0.023, 0.041]),
        gst_nei: estimate(0.016, [0.011, 0.021]),
        gst_hedrick: estimate(0.045, [0.032, 0.058]),
        jost_d: estimate(0.015, [0.010, 0.020]),
        fc: f(),
        fk: f(),
        fs: f(),
        change: Change {
            observed_heterozygosity: estimate(-0.03, [-0.05, -0.01]),
            expected_heterozygosity: estimate(-0.034, [-0.05, -0.018]),
            expected_heterozygosity_kept: estimate(0.89, [0.84, 0.94]),
            allelic_richness: estimate(-0.1, [-0.15, -0.05]),
        },
        alleles: in_time.then_some(AlleleFates {
            baseline: 212,
            not_seen_again: 31,
            expected_not_seen_again: Some(26.0),
            expected_interval: Some([15.0, 38.0]),
            faster_than_explained: Some(false),
            probably_lost: Some(14),
            expected_share_wrong: Some(0.04),
            absent_because: None,
        }),
        loci_fixed_since: in_time.then_some(6),
        outlier_loci: None,
    }
}

/// One effective size.
pub fn size(
    method: &str,
    from: Option<&str>,
    to: &str,
    n: f64,
    interval: (Option<f64>, Option<f64>),
) -> EffectiveSize {
    EffectiveSize {
        population: to.split('@').next().unwrap().to_owned(),
        method: method.to_owned(),
        variant: None,
        from: from.map(str::to_owned),
        to: to.to_owned(),
        refers_to: "harmonic mean over the generations between".to_owned(),
        generations: from.map(|_| 5.0),
        plan: from.map(|_| Plan::II),
        estimate: Some(n),
        unbounded: false,
        interval: Some(interval),
        drift_rate: estimate(0.5 / n, [0.3 / n, 0.8 / n]),
        level: 0.95,
        loci: 1400,
        individuals: Some(28.9),
        share_of_census: None,
        headline: matches!(method, "temporal_fs" | "linkage"),
        notes: Vec::new(),
        absent_because: None,
    }
}

/// Aldermere, three visits, with everything; Birkholm, sampled once.
pub fn two_populations() -> Report {
    let strata = vec![
        stratum("Aldermere", "2004", 2004.0, 30, 0.31),
        stratum("Aldermere", "2014", 2014.0, 26, 0.295),
        stratum("Aldermere", "2024", 2024.0, 28, 0.276),
        stratum("Birkholm", "2024", 2024.0, 22, 0.29),
    ];
    let [first, second, third] = ["Aldermere@2004", "Aldermere@2014", "Aldermere@2024"];
    let mut outlying = comparison(first, third, Kind::SinceBaseline);
    outlying.outlier_loci = Some(outliers());
    let bounds = |low: f64, high: f64| (Some(low), Some(high));
    Report {
        format: FORMAT.to_owned(),
        format_version: FORMAT_VERSION,
        provenance: provenance(),
        samples: Samples {
            in_calls: 108,
            in_sheet: 107,
            used: 106,
            not_listed: vec!["X1".to_owned(), "X2".to_owned()],
            absent: Vec::new(),
            replicates: vec!["A7b".to_owned()],
            without_calls: Vec::new(),
        },
        loci: Loci {
            read: 1512,
            kept: 1500,
            polymorphic: 1400,
            set_aside: [("one_allele_only".to_owned(), 12)].into(),
            genotypes: [
                ("diploid".to_owned(), 155_981),
                ("missing".to_owned(), 3019),
            ]
            .into(),
            panel: 1400,
        },
        strata,
        comparisons: vec![
            comparison(first, second, Kind::SinceBaseline),
            outlying,
            comparison(second, third, Kind::BetweenVisits),
            comparison(third, "Birkholm@2024", Kind::BetweenPopulations),
        ],
        effective_size: vec![
            size("temporal_fs", Some(first), second, 44.0, bounds(25.0, 98.0)),
            size("temporal_fs", Some(first), third, 38.0, bounds(24.0, 71.0)),
            size("temporal_fc", Some(first), third, 41.0, (Some(26.0), None)),
            size("linkage", None, third, 35.0, bounds(21.0, 66.0)),
            size("linkage", None, "Birkholm@2024", 120.0, (Some(60.0), None)),
        ],
        effective_size_summary: vec![EffectiveSizeSummary {
            population: "Aldermere".to_owned(),
            text: "The methods agree on a few dozen.".to_owned(),
            agree: Some(true),
            has_changed: Some(ChangeTest {
                statistic: 0.7,
                degrees: 1,
                p: 0.40,
            }),
        }],
        losses: losses(),
        at_risk: at_risk(),
        carriers: vec![
            carrier("elk 12", 3, 4.2),
            carrier("elk 3", 1, 1.9),
            carrier("elk 9", 0, 0.6),
        ],
        carrier_pairs: vec![CarrierPair {
            population: "Aldermere".to_owned(),
            stratum: "Aldermere@2024".to_owned(),
            female: "elk 12".to_owned(),
            male: "elk 3".to_owned(),
            only_female: 3,
            only_male: 1,
            both: 1,
            together: 5,
        }],
        allele_spectra: Vec::new(),
        warnings: vec![Warning {
            code: "plan_not_stated".to_owned(),
            place: "Aldermere".to_owned(),
            text: "The sampling plan was not stated; plan II was assumed.".to_owned(),
        }],
        cautions: CAUTIONS.map(str::to_owned).to_vec(),
    }
}

fn carrier(sample: &str, only_carrier: u64, would_vanish: f64) -> Carrier {
    Carrier {
        population: "Aldermere".to_owned(),
        stratum: "Aldermere@2024".to_owned(),
        sample: sample.to_owned(),
        only_carrier,
        would_vanish,
    }
}

fn outliers() -> Outliers {
    let locus = |contig: &str, position, to| OutlierLocus {
        contig: contig.to_owned(),
        position,
        frequency_from: 0.4,
        frequency_to: to,
        p: 1e-7,
        q: 1e-4,
    };
    Outliers {
        tested: 1310,
        false_discovery_rate: 0.05,
        found: 3,
        list: vec![
            locus("chr2", 1_200_000, 0.95),
            locus("chr10", 7_500_000, 0.02),
            locus("chr2", 1_250_000, 0.9),
        ],
        other_causes: vec!["linked loci: neighbours in the list may share one cause".to_owned()],
    }
}

/// 14 lost, 9 uncertain and 8 missed: the 31 alleles not seen again.
fn losses() -> Vec<Loss> {
    let calls = [
        (14, LossCall::Lost, 0.97),
        (9, LossCall::Uncertain, 0.6),
        (8, LossCall::Missed, 0.1),
    ];
    let all = calls.into_iter().flat_map(|(n, call, p)| {
        (0..n).map(move |i| Loss {
            locus: format!("chr1:{}", 1000 + i),
            contig: "chr1".to_owned(),
            position: 1000 + i,
            allele: "T".to_owned(),
            population: "Aldermere".to_owned(),
            baseline_count: 3,
            baseline_copies: 60,
            latest_count: 0,
            latest_copies: 56,
            probability_lost: Some(p),
            call: Some(call),
        })
    });
    all.collect()
}

fn at_risk() -> Vec<AtRisk> {
    let one = |position, carriers: &[&str]| AtRisk {
        population: "Aldermere".to_owned(),
        stratum: "Aldermere@2024".to_owned(),
        contig: "chr3".to_owned(),
        position,
        allele: "T".to_owned(),
        copies: carriers.len() as u64,
        gene_copies: 56,
        carriers: carriers.iter().map(|&c| c.to_owned()).collect(),
    };
    vec![one(52_000, &["elk 12"]), one(97_100, &["elk 12", "elk 3"])]
}

fn provenance() -> Provenance {
    let words = |pairs: &[(&str, &str)]| {
        let owned = pairs.iter();
        owned.map(|&(a, b)| (a.to_owned(), b.to_owned())).collect()
    };
    Provenance {
        program: "genewane".to_owned(),
        version: "0.1.0".to_owned(),
        arguments: ["measure", "calls.vcf.gz", "--samples", "samples.tsv"]
            .map(str::to_owned)
            .to_vec(),
        inputs: vec![InputFile {
            role: "calls".to_owned(),
            name: "calls.vcf.gz".to_owned(),
            format: "VCF 4.3, BGZF".to_owned(),
            bytes: 123_456,
            sha256: "ab".repeat(32),
        }],
        settings: words(&[("gene_copies", "44"), ("level", "0.95")]),
        methods: words(&[("observed_heterozygosity", "share of typed individuals")]),
        stamp: None,
    }
}

/// A report with nothing in it.
pub fn empty() -> Report {
    Report {
        samples: Samples::default(),
        loci: Loci::default(),
        strata: Vec::new(),
        comparisons: Vec::new(),
        effective_size: Vec::new(),
        effective_size_summary: Vec::new(),
        losses: Vec::new(),
        at_risk: Vec::new(),
        carriers: Vec::new(),
        carrier_pairs: Vec::new(),
        warnings: Vec::new(),
        ..two_populations()
    }
}
