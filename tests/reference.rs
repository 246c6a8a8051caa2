//! `genewane measure` against general-purpose libraries: msprime simulated the genotypes of
//! `fixtures/reference`, tskit and scipy computed `expected.json` (its README gives every formula).

mod common;

use common::{close, comparison, estimate, fixture, stratum};
use serde_json::Value;

/// Per-locus terms are kept in steps of 2^-40 (about 1e-12); means over loci keep that precision.
const EXACT: f64 = 1e-9;

fn expected() -> Value {
    let text = std::fs::read_to_string(fixture("reference/expected.json")).expect("the fixture");
    serde_json::from_str(&text).expect("expected.json is JSON")
}

fn report() -> Value {
    let copies = expected()["gene_copies"].to_string();
    common::measure(
        &fixture("reference/calls.vcf"),
        &fixture("reference/samples.tsv"),
        &["--gene-copies", &copies, "--generation-years", "2"],
    )
}

fn number(value: &Value, field: &str) -> f64 {
    value[field]
        .as_f64()
        .unwrap_or_else(|| panic!("{field}: {}", value[field]))
}

/// Sources: tskit `diversity` (gene diversity, heterozygotes), scipy `hypergeom` (rarefaction).
#[test]
fn diversity_within_strata() {
    let (report, expected) = (report(), expected());
    let (sites, variable) = (
        number(&expected, "sites"),
        number(&expected, "variable_sites"),
    );
    assert_eq!(report["loci"]["read"].as_f64(), Some(sites));
    assert_eq!(report["loci"]["polymorphic"].as_f64(), Some(variable));
    for want in expected["strata"].as_array().expect("strata") {
        let name = want["stratum"].as_str().expect("a name");
        let got = stratum(&report, name);
        let sums = [
            ("expected_heterozygosity", number(want, "diversity_sum")),
            (
                "observed_heterozygosity",
                number(want, "heterozygosity_sum"),
            ),
            ("allelic_richness", number(want, "richness_sum")),
        ];
        for (field, sum) in sums {
            close(
                &format!("{name} {field}"),
                estimate(got, field),
                sum / variable,
                EXACT,
            );
            if field != "allelic_richness" {
                let per_site = estimate(&got["per_site"], field);
                close(
                    &format!("{name} {field} per site"),
                    per_site,
                    sum / sites,
                    EXACT,
                );
            }
        }
        let coefficient = 1.0 - sums[1].1 / sums[0].1;
        let got_coefficient = estimate(got, "inbreeding_coefficient");
        close(
            &format!("{name} inbreeding"),
            got_coefficient,
            coefficient,
            EXACT,
        );
        assert_eq!(got["individuals"], want["individuals"], "{name}");
        assert_eq!(got["typed_loci"].as_f64(), Some(variable), "{name}");
        assert_eq!(got["polymorphic_loci"], want["polymorphic_sites"], "{name}");
    }
}

/// Source: every genotype table with the same allele copies, weighed with scipy's `gammaln`; the
/// false discovery rate is controlled by scipy's `false_discovery_control`. In Tarnside two
/// populations were sampled as one, so its rejections are deficits.
#[test]
fn hardy_weinberg_rejections() {
    let (report, expected) = (report(), expected());
    for want in expected["strata"].as_array().expect("strata") {
        let name = want["stratum"].as_str().expect("a name");
        let (got, want) = (
            &stratum(&report, name)["hardy_weinberg"],
            &want["hardy_weinberg"],
        );
        assert_eq!(got["tested"], want["tested"], "{name}");
        assert_eq!(got["rejected"], want["rejected_mid_p"], "{name}");
        assert_eq!(got["deficit"], want["rejected_mid_p"], "{name}");
        assert_eq!(got["excess"], 0, "{name}");
    }
}

/// Source: tskit `diversity` and `divergence`. Hudson's ratio is (Hb - Hw) / Hb of their sums, and
/// tskit's `Fst` is F / (2 - F) of it.
#[test]
fn differentiation_between_strata() {
    let (report, expected) = (report(), expected());
    let mut compared = 0;
    for want in expected["pairs"].as_array().expect("pairs") {
        let name = |end: &str| want[end].as_str().expect("a name");
        let Some(got) = comparison(&report, name("from"), name("to"))
            .or_else(|| comparison(&report, name("to"), name("from")))
        else {
            continue;
        };
        compared += 1;
        let what = format!("{} and {}", name("from"), name("to"));
        let within = (number(want, "diversity_from") + number(want, "diversity_to")) / 2.0;
        let between = number(want, "divergence");
        let hudson = estimate(got, "fst_hudson");
        close(&what, hudson, (between - within) / between, EXACT);
        close(
            &what,
            hudson / (2.0 - hudson),
            number(want, "fst_tskit"),
            EXACT,
        );
    }
    // Two populations against their baselines, one pair in 2004, three pairs in 2020.
    assert_eq!(compared, 6);
}

/// Source: tskit `sample_count_stat` with the summands of Nei & Tajima 1981 (Fc), Pollak 1983 (Fk)
/// and Jorde & Ryman 2007 (Fs); multi-locus means weighted by alleles - 1.
#[test]
fn temporal_f_between_visits() {
    let (report, expected) = (report(), expected());
    let mut compared = 0;
    for want in expected["pairs"].as_array().expect("pairs") {
        if want["temporal"].is_null() {
            continue;
        }
        let (from, to) = (
            want["from"].as_str().expect("name"),
            want["to"].as_str().expect("name"),
        );
        let got = comparison(&report, from, to).expect("a comparison since the baseline");
        for field in ["fc", "fk", "fs"] {
            let want = number(&want["temporal"], field);
            close(
                &format!("{from} to {to} {field}"),
                estimate(got, field),
                want,
                EXACT,
            );
        }
        assert_eq!(
            got["generations"].as_f64(),
            want["temporal"]["generations"].as_f64()
        );
        compared += 1;
    }
    assert_eq!(compared, 2);
}
