//! Genotyping batches, pooled baselines and pairs of carriers, through the built program.

mod common;

use std::fmt::Write as _;
use std::path::Path;

use common::run;
use serde_json::Value;

/// One animal of the table: name, year, further columns of the sheet, loci typed, and the loci at which
/// it is heterozygous.
struct Animal {
    name: String,
    columns: String,
    typed: usize,
    heterozygous: Vec<usize>,
}

const LOCI: usize = 20;

fn measure(folder: &Path, header: &str, animals: &[Animal]) -> Value {
    let mut table = String::from("sample,locus,allele_1,allele_2\n");
    let mut sheet = format!("sample,population,{header}\n");
    for animal in animals {
        writeln!(sheet, "{},Sedgemoor,{}", animal.name, animal.columns).expect("a string");
        for locus in 0..LOCI {
            let alleles = match (locus < animal.typed, animal.heterozygous.contains(&locus)) {
                (false, _) => "NA,NA",
                (true, true) => "A,G",
                (true, false) => "A,A",
            };
            writeln!(table, "{},l{locus:02},{alleles}", animal.name).expect("a string");
        }
    }
    let [calls, list, report] = ["calls.csv", "sheet.csv", "report.json"].map(|f| folder.join(f));
    std::fs::write(&calls, table).expect("a scratch file");
    std::fs::write(&list, sheet).expect("a scratch file");
    let done = run([
        "measure".as_ref(),
        calls.as_os_str(),
        "--samples".as_ref(),
        list.as_os_str(),
        "--generation-years".as_ref(),
        "5".as_ref(),
        "-o".as_ref(),
        report.as_os_str(),
    ]);
    assert_eq!(done.code, Some(0), "{}", done.stderr);
    serde_json::from_slice(&std::fs::read(report).expect("a report")).expect("JSON")
}

fn warning<'a>(report: &'a Value, code: &str) -> Option<&'a Value> {
    let warnings = report["warnings"].as_array().expect("warnings");
    warnings.iter().find(|w| w["code"] == code)
}

/// Two batches of six at the first visit, with so many loci typed; a third batch at the second.
fn batches(first: [usize; 6], second: [usize; 6]) -> Vec<Animal> {
    let old = first
        .iter()
        .map(|&n| (n, "x"))
        .chain(second.iter().map(|&n| (n, "y")));
    let mut animals: Vec<Animal> = (0..)
        .zip(old)
        .map(|(i, (typed, batch))| Animal {
            name: format!("old{i}"),
            columns: format!("2010,{batch}"),
            typed,
            heterozygous: (0..LOCI).filter(|l| (l + i) % 3 == 0).collect(),
        })
        .collect();
    animals.extend((0..8).map(|i| Animal {
        name: format!("new{i}"),
        columns: "2020,z".to_owned(),
        typed: LOCI,
        heterozygous: (0..LOCI).filter(|l| (l + i) % 4 == 0).collect(),
    }));
    animals
}

#[test]
fn a_call_rate_that_goes_with_the_batch_is_told() {
    let folder = tempfile::tempdir().expect("a scratch folder");
    let animals = batches([20, 20, 19, 20, 20, 19], [12, 13, 11, 14, 12, 12]);
    let report = measure(folder.path(), "year,batch", &animals);
    let told = warning(&report, "batches_differ").expect("a warning");
    let text = told["text"].as_str().expect("text");
    // scipy.stats.f_oneway on the same rates: F = 242.0, p = 2.46e-08.
    assert!(text.starts_with("call rate"), "{text}");
    assert!(text.contains("F 242.0 on 1 and 10 degrees"), "{text}");
    assert!(
        text.contains("\"x\" 0.983") && text.contains("\"y\" 0.617"),
        "{text}"
    );
    let apart = warning(&report, "batch_goes_with_visit").expect("a warning");
    assert_eq!(apart["where"], "Sedgemoor@2020");
}

#[test]
fn batches_alike_raise_no_alarm() {
    let folder = tempfile::tempdir().expect("a scratch folder");
    let animals = batches([20, 19, 18, 20, 19, 18], [19, 20, 18, 18, 20, 19]);
    let report = measure(folder.path(), "year,batch", &animals);
    assert_eq!(warning(&report, "batches_differ"), None);
}

#[test]
fn visits_that_share_a_batch_are_not_told_apart() {
    let folder = tempfile::tempdir().expect("a scratch folder");
    let mut animals = batches([20; 6], [20; 6]);
    for animal in &mut animals {
        animal.columns = animal.columns.replace(",z", ",y");
    }
    let report = measure(folder.path(), "year,batch", &animals);
    assert_eq!(warning(&report, "batch_goes_with_visit"), None);
}

#[test]
fn a_baseline_of_several_years_is_pooled_by_its_label() {
    let folder = tempfile::tempdir().expect("a scratch folder");
    let animal = |i: usize, year: u32, visit: &str, heterozygous: Vec<usize>| Animal {
        name: format!("a{year}-{i}"),
        columns: format!("{year},{visit}"),
        typed: LOCI,
        heterozygous,
    };
    // Locus 3 varies in one year of the baseline only, and locus 4 in the other only.
    let mut animals = Vec::new();
    for i in 0..6 {
        animals.push(animal(i, 2001, "early", vec![0, 3]));
        animals.push(animal(i, 2003, "early", vec![0, 4]));
        animals.push(animal(i, 2012, "late", vec![0]));
    }
    let report = measure(folder.path(), "year,visit", &animals);
    let strata = report["strata"].as_array().expect("strata");
    let first = &strata[0];
    assert_eq!(first["stratum"], "Sedgemoor@early");
    // The mean year of the pooled sample, weighted by its animals.
    assert_eq!(first["year"], 2002.0);
    assert_eq!(first["individuals"], 12);
    // Both alleles that one year alone showed are followed from the pooled baseline.
    let losses = report["losses"].as_array().expect("losses");
    let mut lost: Vec<&str> = losses.iter().filter_map(|l| l["locus"].as_str()).collect();
    lost.sort_unstable();
    assert_eq!(lost, ["l03", "l04"]);
    assert!(
        losses.iter().all(|l| l["baseline_copies"] == 24),
        "{losses:?}"
    );
    // 2012 less 2002 at five years a generation.
    assert_eq!(report["comparisons"][0]["generations"], 2.0);
}

#[test]
fn pairs_of_carriers_hold_what_neither_holds_alone() {
    let folder = tempfile::tempdir().expect("a scratch folder");
    let animal = |name: &str, sex: &str, heterozygous: Vec<usize>| Animal {
        name: name.to_owned(),
        columns: format!("2020,{sex}"),
        typed: LOCI,
        heterozygous,
    };
    // By hand: f1 carries alleles 0 to 3, m1 3 to 5, m2 only what f1 has too, f2 nothing.
    let mut animals = vec![
        animal("f1", "F", vec![0, 1, 2, 3]),
        animal("f2", "F", vec![]),
        animal("m1", "M", vec![3, 4, 5]),
        animal("m2", "M", vec![1]),
        animal("u1", "", vec![7, 8, 9]),
    ];
    animals.extend((0..6).map(|i| animal(&format!("n{i}"), "M", vec![])));
    let report = measure(folder.path(), "year,sex", &animals);
    let pairs = report["carrier_pairs"].as_array().expect("pairs");
    assert_eq!(pairs.len(), 1, "{pairs:?}");
    let pair = &pairs[0];
    assert_eq!(
        (&pair["female"], &pair["male"]),
        (&"f1".into(), &"m1".into())
    );
    let numbers = ["only_female", "only_male", "both", "together"].map(|n| pair[n].as_u64());
    assert_eq!(numbers, [Some(3), Some(2), Some(1), Some(6)]);
}
