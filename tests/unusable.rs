//! Data from which no effective size follows: each is told by name, and no number stands in its place.

mod common;

use std::fmt::Write as _;

use common::{Run, run};
use serde_json::Value;

/// Animals of one population as (year, number), typed at loci that vary or do not.
fn measured(visits: &[(u32, usize)], varying: bool, options: &[&str]) -> Run {
    let folder = tempfile::tempdir().expect("a scratch folder");
    let mut table = String::from("sample,locus,allele_1,allele_2\n");
    let mut map = String::from("locus,contig,position\n");
    let mut sheet = String::from("sample,population,year\n");
    for locus in 0..40 {
        writeln!(map, "l{locus},reed_1,{}", 100_000 * (locus + 1)).expect("a string");
    }
    for &(year, animals) in visits {
        for i in 0..animals {
            writeln!(sheet, "a{year}-{i},Withy,{year}").expect("a string");
            for locus in 0..40 {
                // Something that differs between animals, loci and years.
                let dice = (i * 7 + locus * 5 + year as usize * 3 + i * locus) % 4;
                let alleles = match (varying, dice) {
                    (false, _) | (_, 0) => "A,A",
                    (_, 1 | 2) => "A,G",
                    _ => "G,G",
                };
                writeln!(table, "a{year}-{i},l{locus},{alleles}").expect("a string");
            }
        }
    }
    let path = |name: &str| folder.path().join(name).into_os_string();
    std::fs::write(path("calls.csv"), table).expect("a scratch file");
    std::fs::write(path("map.csv"), map).expect("a scratch file");
    std::fs::write(path("sheet.csv"), sheet).expect("a scratch file");
    let mut arguments = vec!["measure".into(), path("calls.csv")];
    arguments.extend(["--samples".into(), path("sheet.csv")]);
    arguments.extend(["--locus-map".into(), path("map.csv")]);
    arguments.extend(["--generation-years", "2", "--quiet"].map(Into::into));
    arguments.extend(options.iter().map(Into::into));
    run(arguments)
}

fn sizes<'a>(report: &'a Value, method: &str) -> Vec<&'a Value> {
    let all = report["effective_size"].as_array().expect("a list");
    all.iter().filter(|e| e["method"] == method).collect()
}

fn told(report: &Value, code: &str) -> bool {
    let warnings = report["warnings"].as_array().expect("a list");
    warnings.iter().any(|w| w["code"] == code)
}

#[test]
fn one_visit_has_no_temporal_size() {
    let report = measured(&[(2010, 12)], true, &[]).json();
    for method in ["temporal_fs", "temporal_fc", "temporal_likelihood"] {
        assert!(sizes(&report, method).is_empty(), "{method}");
    }
    assert_eq!(report["comparisons"].as_array().expect("a list").len(), 0);
}

#[test]
fn few_individuals_have_none_and_are_told() {
    let report = measured(&[(2010, 12), (2020, 4)], true, &[]).json();
    assert!(told(&report, "few_individuals"));
    for entry in sizes(&report, "temporal_fs") {
        assert!(entry["estimate"].is_null(), "{entry}");
        let text = entry.to_string();
        assert!(text.contains("too few individuals"), "{text}");
    }
    let of_likelihood = sizes(&report, "temporal_likelihood");
    assert!(of_likelihood.iter().all(|e| e["estimate"].is_null()));
}

#[test]
fn without_variation_there_is_none_and_it_is_told() {
    let report = measured(&[(2010, 12), (2020, 12)], false, &[]).json();
    assert!(told(&report, "nothing_varies"));
    let all = report["effective_size"].as_array().expect("a list");
    assert!(all.iter().all(|e| e["estimate"].is_null()), "{all:?}");
}

#[test]
fn a_baseline_that_no_visit_has_is_refused() {
    let run = measured(&[(2010, 12), (2020, 12)], true, &["--baseline", "2011"]);
    assert_eq!(run.code, Some(2));
    assert!(run.stderr.contains("'2011'"), "{}", run.stderr);
}

#[test]
fn visits_before_the_baseline_are_not_held_against_it() {
    let options = ["--baseline", "2020"];
    let report = measured(&[(2010, 12), (2020, 12), (2030, 12)], true, &options).json();
    assert!(told(&report, "visits_before_baseline"));
    for entry in sizes(&report, "temporal_fs") {
        assert!(
            entry["generations"].as_f64().is_some_and(|t| t > 0.0),
            "{entry}"
        );
    }
}

#[test]
fn a_census_below_the_sample_is_refused() {
    let options = ["--sampling-plan", "1", "--census", "5"];
    let run = measured(&[(2010, 12), (2020, 12)], true, &options);
    let words = match run.code {
        Some(0) => run.json()["warnings"].to_string(),
        _ => run.stderr.clone(),
    };
    assert!(words.contains("census"), "{words}");
}

#[test]
fn linkage_on_one_contig_says_what_it_lacks() {
    let report = measured(&[(2010, 12), (2020, 12)], true, &[]).json();
    for entry in sizes(&report, "linkage") {
        let text = entry.to_string();
        let lacks = entry["estimate"].is_null() || text.contains("chromosome");
        assert!(lacks, "{text}");
    }
}
