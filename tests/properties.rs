//! Laws of the whole program on random calls: what may not matter does not, and numbers stay in their
//! ranges. No expected number is needed: each law holds two runs against each other.

mod common;

use std::fmt::Write as _;
use std::path::PathBuf;

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use serde_json::Value;

use common::run;

/// Random calls of two populations at two visits.
#[derive(Clone)]
struct Data {
    /// Sample names in the order of the columns.
    columns: Vec<String>,
    /// Rows of the sheet: sample, population, year.
    sheet: Vec<[String; 3]>,
    records: Vec<Record>,
}

#[derive(Clone)]
struct Record {
    contig: usize,
    position: u64,
    alleles: Vec<&'static str>,
    /// By column.
    genotypes: Vec<Option<[usize; 2]>>,
}

const BASES: [&str; 4] = ["A", "C", "G", "T"];
const CONTIGS: usize = 4;

impl Data {
    /// Frequencies drift a little between strata, so that every estimator has something to say; some loci
    /// have three or four alleles, some genotypes are missing.
    fn random(seed: u64) -> Data {
        let mut chance = ChaCha8Rng::seed_from_u64(seed);
        let mut sheet = Vec::new();
        for population in ["Alder", "Birch"] {
            for year in ["2001", "2011"] {
                for i in 0..12 {
                    let name = format!("{population}-{year}-{i}");
                    sheet.push([name, population.to_owned(), year.to_owned()]);
                }
            }
        }
        let columns: Vec<String> = sheet.iter().map(|row| row[0].clone()).collect();
        let records = (0..90)
            .map(|i| {
                let kinds = if i % 9 == 0 {
                    chance.random_range(3..=4)
                } else {
                    2
                };
                let start: f64 = chance.random_range(0.15..0.85);
                let mut frequencies = Vec::new();
                for _ in 0..4 {
                    let shift: f64 = chance.random_range(-0.2..0.2);
                    frequencies.push((start + shift).clamp(0.05, 0.95));
                }
                let genotypes = (0..columns.len())
                    .map(|column| {
                        let first = frequencies[column / 12];
                        let mut copy = || match chance.random_bool(first) {
                            true => 0,
                            false => chance.random_range(1..kinds),
                        };
                        let pair = [copy(), copy()];
                        (!chance.random_bool(0.04)).then_some(pair)
                    })
                    .collect();
                Record {
                    contig: i / (90 / CONTIGS + 1),
                    position: 1000 + 37_000 * i as u64,
                    alleles: BASES[..kinds].to_vec(),
                    genotypes,
                }
            })
            .collect();
        Data {
            columns,
            sheet,
            records,
        }
    }

    fn calls(&self) -> String {
        let mut text = "##fileformat=VCFv4.2\n".to_owned();
        for contig in 0..CONTIGS {
            let _ = writeln!(text, "##contig=<ID=c{contig},length=100000000>");
        }
        text += "##FORMAT=<ID=GT,Number=1,Type=String,Description=\"Genotype\">\n";
        text += "#CHROM\tPOS\tID\tREF\tALT\tQUAL\tFILTER\tINFO\tFORMAT";
        for name in &self.columns {
            let _ = write!(text, "\t{name}");
        }
        text.push('\n');
        for record in &self.records {
            let (reference, others) = record.alleles.split_first().unwrap();
            let _ = write!(
                text,
                "c{}\t{}\t.\t{reference}\t{}\t.\t.\t.\tGT",
                record.contig,
                record.position,
                others.join(",")
            );
            for genotype in &record.genotypes {
                let _ = match genotype {
                    Some([a, b]) => write!(text, "\t{a}/{b}"),
                    None => write!(text, "\t./."),
                };
            }
            text.push('\n');
        }
        text
    }

    fn report(&self, options: &[&str]) -> Value {
        let folder = tempfile::tempdir().unwrap();
        let path = |name: &str| -> PathBuf { folder.path().join(name) };
        std::fs::write(path("calls.vcf"), self.calls()).unwrap();
        let mut sheet = "sample\tpopulation\tyear\n".to_owned();
        for row in &self.sheet {
            let _ = writeln!(sheet, "{}", row.join("\t"));
        }
        std::fs::write(path("sheet.tsv"), sheet).unwrap();
        let mut arguments = vec!["measure".into(), path("calls.vcf").into_os_string()];
        arguments.extend(["--samples".into(), path("sheet.tsv").into_os_string()]);
        let settings = ["--generation-years", "2", "--sampling-plan", "2", "--quiet"];
        arguments.extend(settings.iter().chain(options).map(Into::into));
        let mut report = common::without_provenance(run(arguments).json());
        // The order of the file is remarked on, and each name is its own.
        let warnings = report["warnings"].as_array_mut().unwrap();
        warnings.retain(|w| w["code"] != "calls" && w["place"] != "calls");
        report
    }
}

/// The same numbers under the same keys, wherever both have a number; lists of the same length.
fn alike(path: &str, a: &Value, b: &Value, tolerance: f64, skip: &dyn Fn(&str) -> bool) {
    if skip(path) {
        return;
    }
    match (a, b) {
        (Value::Number(x), Value::Number(y)) => {
            let (x, y) = (x.as_f64().unwrap(), y.as_f64().unwrap());
            let scale = x.abs().max(y.abs()).max(1.0);
            assert!((x - y).abs() <= tolerance * scale, "{path}: {x} and {y}");
        }
        (Value::Array(x), Value::Array(y)) => {
            assert_eq!(x.len(), y.len(), "{path}");
            for (i, (x, y)) in x.iter().zip(y).enumerate() {
                alike(&format!("{path}/{i}"), x, y, tolerance, skip);
            }
        }
        (Value::Object(x), Value::Object(y)) => {
            let keys = |m: &serde_json::Map<String, Value>| m.keys().cloned().collect::<Vec<_>>();
            assert_eq!(keys(x), keys(y), "{path}");
            for (key, x) in x {
                alike(&format!("{path}/{key}"), x, &y[key], tolerance, skip);
            }
        }
        _ => assert_eq!(a, b, "{path}"),
    }
}

fn shuffle<T>(list: &mut [T], chance: &mut ChaCha8Rng) {
    for i in (1..list.len()).rev() {
        list.swap(i, chance.random_range(0..=i));
    }
}

#[test]
fn orders_and_threads_change_no_byte() {
    for seed in 1..=4 {
        let mut chance = ChaCha8Rng::seed_from_u64(100 + seed);
        let data = Data::random(seed);
        let wanted = data.report(&["--threads", "1"]);
        let same = |what: &str, got: Value| alike(what, &got, &wanted, 0.0, &|_| false);
        same("threads ", data.report(&["--threads", "5"]));

        let mut columns = data.clone();
        let mut order: Vec<usize> = (0..data.columns.len()).collect();
        shuffle(&mut order, &mut chance);
        columns.columns = order.iter().map(|&i| data.columns[i].clone()).collect();
        for record in &mut columns.records {
            record.genotypes = order.iter().map(|&i| record.genotypes[i]).collect();
        }
        same("columns ", columns.report(&[]));

        let mut rows = data.clone();
        shuffle(&mut rows.sheet, &mut chance);
        // Carriers are listed in the order of the sheet; sums over individuals differ in their last digits.
        alike("", &rows.report(&[]), &wanted, 1e-9, &|path| {
            names_alleles(path) || path.starts_with("/carriers/")
        });

        let mut records = data.clone();
        shuffle(&mut records.records, &mut chance);
        same("records ", records.report(&[]));
    }
}

/// Lists by allele name alleles, which the new labels move; their counts stay.
fn names_alleles(path: &str) -> bool {
    ["/losses/", "/at_risk/", "/outlier_loci/", "/carrier_pairs/"]
        .iter()
        .any(|list| path.starts_with(list))
}

#[test]
fn labels_of_alleles_change_no_number() {
    for seed in 11..=13 {
        let mut chance = ChaCha8Rng::seed_from_u64(seed);
        let data = Data::random(seed);
        let mut other = data.clone();
        for record in &mut other.records {
            let mut codes: Vec<usize> = (0..record.alleles.len()).collect();
            shuffle(&mut codes, &mut chance);
            for genotype in record.genotypes.iter_mut().flatten() {
                *genotype = genotype.map(|allele| codes[allele]);
            }
        }
        alike(
            "",
            &data.report(&[]),
            &other.report(&[]),
            1e-6,
            &names_alleles,
        );
    }
}

/// Each locus twice, side by side: nothing new is known of the population.
#[test]
fn loci_told_twice_change_no_estimate() {
    for seed in 21..=22 {
        let data = Data::random(seed);
        let mut twice = data.clone();
        twice.records = data
            .records
            .iter()
            .flat_map(|record| {
                let mut again = record.clone();
                again.position += 1;
                [record.clone(), again]
            })
            .collect();
        let (once, twice) = (data.report(&[]), twice.report(&[]));
        let mut compared = 0;
        each_estimate("", &once, &mut |path, estimate| {
            let other = twice.pointer(path).unwrap();
            if let (Some(x), Some(y)) = (estimate.as_f64(), other.as_f64()) {
                compared += 1;
                let close = (x - y).abs() <= 1e-5 * x.abs().max(1.0);
                assert!(close, "{path}: {x} and {y}");
            } else {
                assert_eq!(estimate, other, "{path}");
            }
        });
        assert!(compared > 60, "{compared}");
    }
}

/// An individual that the laboratory could not type is in the sheet and changes no estimate.
#[test]
fn an_individual_without_a_genotype_changes_no_estimate() {
    let data = Data::random(31);
    let mut more = data.clone();
    more.columns.push("empty".to_owned());
    let row = ["empty", "Birch", "2011"].map(str::to_owned);
    more.sheet.push(row);
    for record in &mut more.records {
        record.genotypes.push(None);
    }
    // The number of gene copies would follow from the fewest individuals listed.
    let options = ["--gene-copies", "16"];
    let (without, with) = (data.report(&options), more.report(&options));
    each_estimate("", &without, &mut |path, estimate| {
        let other = with.pointer(path).unwrap();
        match (estimate.as_f64(), other.as_f64()) {
            (Some(x), Some(y)) => {
                assert!(
                    (x - y).abs() <= 1e-9 * x.abs().max(1.0),
                    "{path}: {x} and {y}"
                );
            }
            _ => assert_eq!(estimate, other, "{path}"),
        }
    });
}

/// Visits every value under a key `estimate`.
fn each_estimate(path: &str, value: &Value, see: &mut dyn FnMut(&str, &Value)) {
    match value {
        Value::Object(map) => {
            for (key, value) in map {
                let path = format!("{path}/{key}");
                match key.as_str() {
                    "estimate" => see(&path, value),
                    _ => each_estimate(&path, value, see),
                }
            }
        }
        Value::Array(list) => {
            for (i, value) in list.iter().enumerate() {
                each_estimate(&format!("{path}/{i}"), value, see);
            }
        }
        _ => {}
    }
}

#[test]
fn numbers_stay_in_their_ranges() {
    for seed in 41..=44 {
        let data = Data::random(seed);
        let mut richness_before = 0.0;
        for copies in [2, 6, 12, 18] {
            let report = data.report(&["--gene-copies", &copies.to_string()]);
            let stratum = common::stratum(&report, "Alder@2001");
            let of = |field: &str| common::estimate(stratum, field);
            let (he, ho) = (of("expected_heterozygosity"), of("observed_heterozygosity"));
            assert!((0.0..=1.0).contains(&he) && (0.0..=1.0).contains(&ho));
            let richness = of("allelic_richness");
            assert!(richness > richness_before, "A(g) rises in g");
            richness_before = richness;
            if copies == 2 {
                // A(2) = 1 + He: two copies differ with the chance He (Hurlbert 1971; Nei 1978).
                common::close("A(2)", richness, 1.0 + he, 1e-9);
            }
            for comparison in report["comparisons"].as_array().unwrap() {
                let fst = comparison["fst_hudson"]["estimate"].as_f64().unwrap();
                assert!((-1.0..=1.0).contains(&fst), "{fst}");
            }
            for size in report["effective_size"].as_array().unwrap() {
                if let Some(n) = size["estimate"].as_f64() {
                    assert!(n > 0.0, "{size}");
                }
            }
            for loss in report["losses"].as_array().unwrap() {
                if let Some(p) = loss["probability_lost"].as_f64() {
                    assert!((0.0..=1.0).contains(&p), "{loss}");
                }
            }
        }
    }
}
