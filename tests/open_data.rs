//! `genewane measure` against published values from real data: ten microsatellites of a freshwater
//! snail, 42 samples of 25 sites between 2006 and 2011 (Lamy, Pointier, Jarne & David 2012,
//! Molecular Ecology 21:1394-1410, tables 2, 4 and 5). The files are not part of this package; where
//! they are absent every test here says so and checks nothing.

mod common;

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::sync::OnceLock;

use common::{close, comparison, estimate, measure, stratum};
use serde_json::Value;

// One locus of PICO in 2007 is typed in a single individual of 24. The paper counts it in the gene
// diversity of that sample (printed 0.911; 0.901 without it) and not in the temporal theta of the
// site (printed 0.006; 0.002 with it). So each of the two is compared at the call rate it was
// printed for; every other locus of every sample is typed in at least 14 of 32 or in nobody.
/// Every typed locus counts.
const ALL_TYPED: &str = "0";
/// Loci typed in at least a tenth of the individuals count.
const WITHOUT_ONE_OF_24: &str = "0.1";

/// One line of the published table.
struct Published {
    id: String,
    site: String,
    year: u32,
    richness: f64,
    diversity: f64,
    inbreeding: f64,
    temporal_fst: Option<f64>,
}

fn published(folder: &Path) -> Vec<Published> {
    let path = folder.join("published_site_values.tsv");
    let mut reader = csv::ReaderBuilder::new()
        .delimiter(b'\t')
        .from_path(path)
        .expect("the published values are there");
    let header = reader.headers().expect("a header").clone();
    let column = |name: &str| header.iter().position(|h| h == name).expect("a column");
    let [id, site, year, richness, diversity, inbreeding, fst] =
        ["SiteID", "SITE", "YEAR", "RA", "He", "f", "Fst.temp"].map(column);
    reader
        .records()
        .map(|row| {
            let row = row.expect("a row");
            let number = |i: usize| row[i].parse::<f64>().expect("a number");
            Published {
                id: row[id].to_string(),
                site: row[site].to_string(),
                year: row[year].parse().expect("a year"),
                richness: number(richness),
                diversity: number(diversity),
                inbreeding: number(inbreeding),
                temporal_fst: row[fst].parse().ok(),
            }
        })
        .collect()
}

/// The folder, and the report over all 42 samples with every typed locus; made once for all tests.
fn snail() -> Option<&'static (PathBuf, Value)> {
    static MADE: OnceLock<Option<(PathBuf, Value)>> = OnceLock::new();
    MADE.get_or_init(|| snail_at(ALL_TYPED)).as_ref()
}

fn snail_at(call_rate: &str) -> Option<(PathBuf, Value)> {
    let folder = common::open_data("snail")?;
    let report = measure(
        &folder.join("snail.vcf.gz"),
        &folder.join("samples.tsv"),
        &options(call_rate),
    );
    Some((folder, report))
}

/// 28 gene copies are 14 individuals, as in the paper; two generations a year.
fn options(call_rate: &str) -> Vec<&str> {
    let mut options = vec![
        "--gene-copies",
        "28",
        "--generation-years",
        "0.5",
        "--quiet",
    ];
    options.extend(["--min-call-rate", call_rate]);
    options
}

/// Published: gene diversity (table 2), to the three printed decimals.
#[test]
fn gene_diversity_equals_the_paper() {
    let Some((folder, report)) = snail() else {
        return;
    };
    let rows = published(folder);
    assert_eq!(rows.len(), 42);
    for want in rows {
        let here = stratum(report, &format!("{}@{}", want.site, want.year));
        close(
            &want.id,
            estimate(here, "expected_heterozygosity"),
            want.diversity,
            0.001,
        );
    }
}

/// Published: allelic richness of 14 individuals (table 2), to the two printed decimals.
#[test]
fn allelic_richness_equals_the_paper() {
    let Some((folder, report)) = snail() else {
        return;
    };
    let rows = published(folder);
    assert_eq!(rows.len(), 42);
    for want in rows {
        let here = stratum(report, &format!("{}@{}", want.site, want.year));
        close(
            &want.id,
            estimate(here, "allelic_richness"),
            want.richness,
            0.006,
        );
    }
}

/// Published: f (table 2), estimated in the manner of Weir & Cockerham 1984; ours is one minus the
/// ratio of summed heterozygosities, so the two agree only to their small-sample difference.
#[test]
fn inbreeding_agrees_with_the_paper() {
    let Some((folder, report)) = snail() else {
        return;
    };
    for want in published(folder) {
        let here = stratum(report, &format!("{}@{}", want.site, want.year));
        close(
            &want.id,
            estimate(here, "inbreeding_coefficient"),
            want.inbreeding,
            0.005,
        );
    }
}

/// Published: mean pairwise theta (Weir & Cockerham 1984) between the visits of a site (table 5).
#[test]
fn temporal_theta_equals_the_paper() {
    let Some((folder, whole)) = snail_at(WITHOUT_ONE_OF_24) else {
        return;
    };
    // A report compares each visit with the first and with the one before. Of four visits that
    // leaves one pair out, so GEF is measured once more from its second visit on.
    let scratch = tempfile::tempdir().expect("a scratch folder");
    let sheet = scratch.path().join("later.tsv");
    let text = std::fs::read_to_string(folder.join("samples.tsv")).expect("the sheet");
    let kept: Vec<&str> = text
        .lines()
        .filter(|l| !l.contains("\tGEF\t2006\t"))
        .collect();
    std::fs::write(&sheet, kept.join("\n") + "\n").expect("a scratch file");
    let later = measure(
        &folder.join("snail.vcf.gz"),
        &sheet,
        &options(WITHOUT_ONE_OF_24),
    );

    let mut visits: BTreeMap<String, Vec<u32>> = BTreeMap::new();
    let mut printed = BTreeMap::new();
    for row in published(&folder) {
        visits.entry(row.site.clone()).or_default().push(row.year);
        if let Some(fst) = row.temporal_fst {
            printed.insert(row.site, fst);
        }
    }
    let mut equal = 0;
    for (site, years) in visits.iter().filter(|(_, years)| years.len() > 1) {
        let mut thetas = Vec::new();
        for (i, a) in years.iter().enumerate() {
            for b in &years[i + 1..] {
                let (from, to) = (format!("{site}@{a}"), format!("{site}@{b}"));
                let here = comparison(&whole, &from, &to)
                    .or_else(|| comparison(&later, &from, &to))
                    .unwrap_or_else(|| panic!("no comparison of {from} and {to}"));
                thetas.push(estimate(here, "fst_weir_cockerham"));
            }
        }
        let mean = thetas.iter().sum::<f64>() / thetas.len() as f64;
        close(site, mean, printed[site], 0.001);
        equal += 1;
    }
    assert_eq!(equal, 12);
}

/// The same genotypes as BGZF text, as BCF, and on standard input.
#[test]
fn every_form_of_the_calls_gives_the_same_numbers() {
    let Some((folder, text)) = snail() else {
        return;
    };
    let sheet = folder.join("samples.tsv");
    let options = options(ALL_TYPED);
    let text = common::without_provenance(text.clone());
    let binary = common::without_provenance(measure(&folder.join("snail.bcf"), &sheet, &options));
    assert_eq!(text, binary);
    for name in ["snail.vcf.gz", "snail.bcf"] {
        let bytes = std::fs::read(folder.join(name)).expect("the calls");
        let mut arguments: Vec<std::ffi::OsString> = vec!["measure".into(), "-".into()];
        arguments.extend(["--samples".into(), sheet.clone().into()]);
        arguments.extend(options.iter().map(Into::into));
        let piped = common::run_with_stdin(arguments, bytes).json();
        assert_eq!(
            text,
            common::without_provenance(piped),
            "{name} on standard input"
        );
    }
}
