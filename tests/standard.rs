//! The example files of the VCF standard (samtools/hts-specs, folder `test/vcf`), read in place.
//!
//! Every valid file with samples must be read, with the counts of its index; every invalid file must
//! end as its index asks. The folder is not part of the package: without it the tests say so and pass.

use std::collections::HashMap;
use std::fs;
use std::path::{Path, PathBuf};

use genewane::ingest::{self, Decoder, RecordBatch, Remarks, Selection};
use genewane::model::{CallTally, Locus, Verdict};
use genewane::{Error, Result};

const FOLDER: &str = "../shared/data/vcf-standard";

/// What a whole file comes to.
#[derive(Default)]
struct Outcome {
    samples: usize,
    records: u64,
    verdicts: HashMap<Verdict, u64>,
    multiallelic: u64,
    tally: CallTally,
    warnings: Vec<String>,
    remarks: Remarks,
}

impl Outcome {
    fn with_genotypes(&self) -> u64 {
        self.records
            - self
                .verdicts
                .get(&Verdict::NoGenotypeField)
                .copied()
                .unwrap_or(0)
    }

    fn is_told(&self) -> bool {
        !self.warnings.is_empty() || !self.remarks.is_empty()
    }
}

fn read(path: &Path) -> Result<Outcome> {
    let mut reader = ingest::open(path)?;
    let mut decoder = Decoder::new(&reader, Selection::all(reader.header()));
    let (mut batch, mut locus) = (RecordBatch::default(), Locus::default());
    let mut out = Outcome {
        samples: reader.header().samples.len(),
        ..Outcome::default()
    };
    while reader.next_batch(&mut batch)? {
        for index in 0..batch.len() {
            let verdict = decoder.decode(&batch, index, &mut locus)?;
            out.records += 1;
            *out.verdicts.entry(verdict).or_default() += 1;
            out.multiallelic +=
                u64::from(verdict != Verdict::NoGenotypeField && locus.allele_count() > 2);
        }
    }
    out.tally = decoder.take_tally();
    out.remarks = decoder.take_remarks();
    out.remarks.merge(reader.remarks());
    out.warnings = reader.warnings().to_vec();
    Ok(out)
}

/// The rows of an index by column name; `None`, said aloud, when the folder is absent.
fn index(name: &str) -> Option<Vec<HashMap<String, String>>> {
    let path = Path::new(FOLDER).join(name);
    let Ok(text) = fs::read_to_string(&path) else {
        eprintln!("SKIPPED: {} is absent", path.display());
        return None;
    };
    let mut lines = text
        .lines()
        .map(|line| line.split('\t').map(str::to_string));
    let head: Vec<String> = lines.next()?.collect();
    Some(
        lines
            .map(|row| head.iter().cloned().zip(row).collect())
            .collect(),
    )
}

fn file(row: &HashMap<String, String>) -> PathBuf {
    Path::new(FOLDER).join(&row["file"])
}

fn number(row: &HashMap<String, String>, column: &str) -> u64 {
    row[column].parse().unwrap()
}

/// `calls_by_ploidy` of the index, as in `1:2;2:5;3:1`: haploid, diploid, more.
fn ploidies(text: &str) -> [u64; 3] {
    let mut out = [0; 3];
    for part in text.split(';').filter(|part| !part.is_empty()) {
        let (ploidy, count) = part.split_once(':').unwrap();
        out[ploidy.parse::<usize>().unwrap().min(3) - 1] += count.parse::<u64>().unwrap();
    }
    out
}

#[test]
fn every_valid_file_is_read() {
    let Some(rows) = index("valid_index.tsv") else {
        return;
    };
    assert!(rows.len() > 40);
    for row in &rows {
        let path = file(row);
        let outcome = read(&path);
        if number(row, "n_samples") == 0 {
            let message = outcome.err().unwrap().to_string();
            assert!(message.contains("no sample columns"), "{message}");
            continue;
        }
        let out = outcome.unwrap_or_else(|e| panic!("{e}"));
        let name = path.display();
        assert_eq!(out.samples as u64, number(row, "n_samples"), "{name}");
        assert_eq!(out.records, number(row, "n_records"), "{name}");
        assert_eq!(
            out.with_genotypes(),
            number(row, "records_with_GT"),
            "{name}"
        );
        assert_eq!(out.multiallelic, number(row, "multiallelic"), "{name}");
        let [haploid, diploid, more] = ploidies(&row["calls_by_ploidy"]);
        let tally = out.tally;
        assert_eq!(
            (tally.haploid, tally.other_ploidy),
            (haploid, more),
            "{name}"
        );
        let kept_apart = tally.spanning_deletion + tally.unspecified_allele;
        assert_eq!(tally.diploid + kept_apart, diploid, "{name}");
        assert_eq!(tally.missing + tally.partly_missing, 0, "{name}");
    }
}

#[test]
fn every_invalid_file_ends_as_it_should() {
    let Some(rows) = index("invalid_index.tsv") else {
        return;
    };
    assert!(rows.len() > 200);
    for row in &rows {
        let path = file(row);
        let name = format!("{} ({})", path.display(), row["cause_stated_in_file"]);
        match (read(&path), row["expected"].as_str()) {
            (Err(e), "reject") => assert_names_the_file(&e, &path),
            (Err(e), _) if row["blind"] == "yes" => assert_names_the_file(&e, &path),
            (Ok(_), "reject") => panic!("{name}: was read"),
            (Ok(out), "warn") => assert!(out.is_told(), "{name}: nothing was told"),
            // The index itself prefers this one to be refused: the value under GT is no genotype.
            (Err(e), "warn") if name.contains("body_format_002") => {
                assert_names_the_file(&e, &path)
            }
            (Ok(_), "ignore") => {}
            (Err(e), _) => panic!("{name}: {e}"),
            (Ok(_), other) => panic!("{name}: unknown expectation {other}"),
        }
    }
}

fn assert_names_the_file(error: &Error, path: &Path) {
    let Error::Calls {
        path: named,
        problem,
        cure,
        ..
    } = error
    else {
        panic!("{error}")
    };
    assert_eq!(named, path);
    assert!(!problem.is_empty() && !cure.is_empty());
}
