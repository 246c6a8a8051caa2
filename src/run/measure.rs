//! The main job: genotype calls and a sample sheet in, one report out.

use std::collections::{BTreeMap, HashSet};
use std::sync::Arc;

use super::pipeline::{Collected, LocusTable, Source, collect};
use super::{available_threads, input_file, told};
use crate::error::{Error, Result};
use crate::ingest::programme::read_programme;
use crate::ingest::sheet::{Sheet, listed_samples, read_sheet};
use crate::ingest::{self, Selection};
use crate::merge::{LocusView, Scheme};
use crate::model::{
    Compared, Locus, Matched, MeasurePlan, Note, Programme, Verdict, comparisons,
    default_gene_copies, match_samples, told_absent,
};
use crate::report::assemble::{self, Findings};
use crate::report::table::{LocusTable as Table, TableFile};
use crate::report::warnings::{of_findings, warning};
use crate::report::wire::{
    FORMAT, FORMAT_VERSION, InputFile, Loci, Provenance, Report, Samples, Warning,
};
use crate::report::{CAUTIONS, Output, methods};

/// Runs `measure` and writes its outputs; returns the report for the summary.
pub fn measure(plan: &MeasurePlan, arguments: Vec<String>) -> Result<Report> {
    let inputs = Inputs::open(plan)?;
    let output = Output::create(plan.output.as_deref())?;
    let (report, table) = inputs.measure(plan, arguments)?;
    if let (Some(table), Some(path)) = (table, &plan.loci_output) {
        table.finish(path)?;
    }
    output.json(&report)?;
    Ok(report)
}

/// Everything that is known before the first record is read.
struct Inputs {
    sheet: Sheet,
    programme: Programme,
    programme_file: Option<InputFile>,
    sources: Vec<Source>,
    matched: Matched,
    compared: Compared,
    samples_in_calls: usize,
}

impl Inputs {
    fn open(plan: &MeasurePlan) -> Result<Inputs> {
        let sheet = read_sheet(&plan.sheet).map_err(|error| told_with_calls(error, plan))?;
        let (mut programme, programme_file) = match &plan.programme {
            Some(path) => {
                let read = read_programme(path)?;
                let file = input_file("programme", path, "TOML", read.bytes, read.digest);
                (read.programme, Some(file))
            }
            None => (Programme::default(), None),
        };
        programme.overrule(&plan.flags);
        let (sources, matched) = open_calls(plan, &sheet)?;
        let compared =
            comparisons(&matched.strata, &programme).map_err(|problems| Error::Sheet {
                path: plan.sheet.clone(),
                problems,
            })?;
        let samples_in_calls = sources[0].reader.header().samples.len();
        Ok(Inputs {
            sheet,
            programme,
            programme_file,
            sources,
            matched,
            compared,
            samples_in_calls,
        })
    }

    fn measure(
        mut self,
        plan: &MeasurePlan,
        arguments: Vec<String>,
    ) -> Result<(Report, Option<TableFile>)> {
        let strata = &self.matched.strata;
        let gene_copies = plan
            .gene_copies
            .or_else(|| default_gene_copies(strata))
            .unwrap_or(2);
        let pairs = &self.compared.comparisons;
        let scheme = Arc::new(Scheme::new(
            strata,
            pairs,
            plan.min_call_rate,
            gene_copies,
            plan.list_losses,
        ));
        let rows = Table::new(strata, pairs);
        let mut file = plan
            .loci_output
            .as_deref()
            .map(TableFile::create)
            .transpose()?;
        let failed = |e| Error::io(plan.loci_output.clone().unwrap_or_default(), "write", e);
        if let Some(file) = &mut file {
            use std::io::Write;
            file.write_all(rows.header().as_bytes()).map_err(failed)?;
        }
        let row = |locus: &Locus, view: &LocusView, out: &mut Vec<u8>| rows.row(locus, view, out);
        let table = file.as_mut().map(|out| LocusTable {
            out,
            row: &row,
            failed: &failed,
        });
        let threads = plan.threads.unwrap_or_else(available_threads);
        let collected = collect(
            &mut self.sources,
            &scheme,
            &plan.masks,
            threads,
            table,
            &|_| (),
        )?;
        if collected.sums.kept == 0 {
            return Err(nothing_kept(plan, &collected));
        }
        Ok((self.report(plan, arguments, &collected), file))
    }

    fn report(&self, plan: &MeasurePlan, arguments: Vec<String>, all: &Collected) -> Report {
        let findings = Findings {
            strata: &self.matched.strata,
            comparisons: &self.compared.comparisons,
            sums: &all.sums,
            programme: &self.programme,
            level: plan.level,
            false_discovery_rate: plan.false_discovery_rate,
            fits: Vec::new(),
        }
        .fitted();
        let effective_size = assemble::effective_size(&findings);
        Report {
            format: FORMAT.to_owned(),
            format_version: FORMAT_VERSION,
            provenance: self.provenance(plan, arguments, all),
            samples: self.samples(all),
            loci: loci(all),
            strata: assemble::strata(&findings),
            comparisons: assemble::comparisons(&findings),
            effective_size_summary: assemble::summaries(&findings, &effective_size),
            effective_size,
            losses: assemble::losses(&findings),
            at_risk: assemble::at_risk(&findings),
            carriers: assemble::carriers(&findings),
            carrier_pairs: assemble::carrier_pairs(&findings),
            allele_spectra: assemble::allele_spectra(&findings),
            warnings: self.warnings(all, &findings),
            cautions: CAUTIONS.iter().map(|&text| text.to_owned()).collect(),
        }
    }

    fn provenance(
        &self,
        plan: &MeasurePlan,
        arguments: Vec<String>,
        all: &Collected,
    ) -> Provenance {
        let calls = self.sources.iter().map(|source| {
            let digest = source.reader.digest();
            let format = source.reader.format();
            input_file(
                "calls",
                source.reader.path(),
                &format,
                digest.bytes,
                digest.sha256,
            )
        });
        let sheet = input_file(
            "samples",
            &plan.sheet,
            "table",
            self.sheet.bytes,
            self.sheet.digest.clone(),
        );
        let scheme = all.sums.scheme();
        let settings = [
            ("min_call_rate", plan.min_call_rate.to_string()),
            ("gene_copies", scheme.gene_copies.to_string()),
            ("level", plan.level.to_string()),
            (
                "false_discovery_rate",
                plan.false_discovery_rate.to_string(),
            ),
            ("list_losses", plan.list_losses.to_string()),
            ("most_genome_windows", scheme.most_windows().to_string()),
        ];
        Provenance {
            program: env!("CARGO_PKG_NAME").to_owned(),
            version: env!("CARGO_PKG_VERSION").to_owned(),
            arguments,
            inputs: calls
                .chain([sheet])
                .chain(self.programme_file.clone())
                .collect(),
            settings: settings
                .into_iter()
                .chain(plan.masks.settings())
                .map(|(name, value)| (name.to_owned(), value))
                .collect(),
            methods: methods(),
            stamp: None,
        }
    }

    fn samples(&self, all: &Collected) -> Samples {
        let individuals = &self.matched.strata.individuals;
        Samples {
            in_calls: self.samples_in_calls as u64,
            in_sheet: self.sheet.rows.len() as u64,
            used: individuals.len() as u64,
            not_listed: self.matched.not_listed.clone(),
            absent: self.matched.absent.clone(),
            replicates: self
                .matched
                .replicates
                .iter()
                .map(|r| r.sample.clone())
                .collect(),
            without_calls: individuals
                .iter()
                .zip(&all.sums.typed_records)
                .filter(|(_, loci)| **loci == 0)
                .map(|(individual, _)| individual.sample.clone())
                .collect(),
        }
    }

    fn warnings(&self, all: &Collected, findings: &Findings) -> Vec<Warning> {
        let notes = self
            .sheet
            .notes
            .iter()
            .chain(&self.matched.notes)
            .chain(&self.compared.notes);
        let mut warnings: Vec<_> = notes.map(warning).collect();
        for (source, remarks) in self.sources.iter().zip(&all.remarks) {
            let file = source.reader.path().display().to_string();
            let mut remarks = remarks.clone();
            remarks.merge(source.reader.remarks());
            let told = source.reader.warnings().iter().cloned();
            let told = told.chain(remarks.messages());
            warnings.extend(told.map(|text| warning(&Note::new("calls", file.clone(), text))));
        }
        warnings.extend(of_findings(findings));
        warnings
    }
}

/// A faulty sheet's problems together with the samples that the calls lack, so that a person mends
/// all of them in one go. The first file of calls speaks for all; where it cannot be read, the
/// sheet's own problems are told alone.
fn told_with_calls(error: Error, plan: &MeasurePlan) -> Error {
    let Error::Sheet { path, mut problems } = error else {
        return error;
    };
    let reader = plan
        .calls
        .first()
        .and_then(|calls| ingest::open_with_map(calls, plan.locus_map.as_deref()).ok());
    if let Some(reader) = reader.filter(|_| !plan.allow_absent) {
        let header = &reader.header().samples;
        let in_calls: HashSet<&str> = header.iter().map(String::as_str).collect();
        let listed = listed_samples(&path);
        let names = || listed.iter().map(|(row, sample)| (*row, sample.as_str()));
        let absent = names().filter(|(_, name)| !in_calls.contains(name));
        problems.extend(told_absent(absent, header, names().map(|(_, name)| name)));
        problems.sort_by_key(|problem| problem.row);
    }
    Error::Sheet { path, problems }
}

/// Opens every file of calls and matches it with the sheet; all must hold the same samples in use.
fn open_calls(plan: &MeasurePlan, sheet: &Sheet) -> Result<(Vec<Source>, Matched)> {
    let mut sources = Vec::new();
    let mut first: Option<Matched> = None;
    for path in &plan.calls {
        let reader = ingest::open_with_map(path, plan.locus_map.as_deref())?;
        let matched = match_samples(&reader.header().samples, &sheet.rows, plan.allow_absent)
            .map_err(|problems| Error::Sheet {
                path: plan.sheet.clone(),
                problems,
            })?;
        let selection = Selection {
            slot_of_column: matched.slot_of_column.clone(),
            slots: matched.strata.individuals.len(),
        };
        if let Some(first) = &first {
            if first.strata != matched.strata {
                return Err(Error::Calls {
                    path: path.clone(),
                    place: crate::error::Place::Header,
                    problem: format!(
                        "its samples are not those of {}: absent there {}, here {}",
                        plan.calls[0].display(),
                        first.absent.len(),
                        matched.absent.len()
                    ),
                    cure: "give files that hold the same individuals, one a part of the genome"
                        .to_owned(),
                });
            }
        } else {
            first = Some(matched);
        }
        sources.push(Source { reader, selection });
    }
    match first {
        Some(matched) => Ok((sources, matched)),
        None => Err(Error::Usage(
            "no file of genotype calls was given".to_owned(),
        )),
    }
}

fn loci(all: &Collected) -> Loci {
    let set_aside = Verdict::ALL.iter().filter(|&&v| v != Verdict::Kept);
    let tally = &all.tally;
    let genotypes = [
        ("diploid", tally.diploid),
        ("missing", tally.missing),
        ("partly_missing", tally.partly_missing),
        ("haploid", tally.haploid),
        ("other_ploidy", tally.other_ploidy),
        ("spanning_deletion", tally.spanning_deletion),
        ("unspecified_allele", tally.unspecified_allele),
    ];
    Loci {
        read: all.verdicts.values().sum(),
        kept: all.sums.kept,
        polymorphic: all.sums.polymorphic,
        set_aside: set_aside
            .map(|v| {
                (
                    v.name().to_owned(),
                    all.verdicts.get(v).copied().unwrap_or(0),
                )
            })
            .chain(told(&all.masked.records))
            .collect::<BTreeMap<_, _>>(),
        genotypes: genotypes
            .map(|(name, n)| (name.to_owned(), n))
            .into_iter()
            .chain(told(&all.masked.genotypes))
            .collect(),
        panel: all.sums.panel.loci().len() as u64,
    }
}

/// Calls from which nothing can be said are a failure: an empty report would pass for a result.
fn nothing_kept(plan: &MeasurePlan, all: &Collected) -> Error {
    let records: u64 = all.verdicts.values().sum();
    let reasons: Vec<String> = all
        .verdicts
        .iter()
        .map(|(verdict, n)| format!("{} {n}", verdict.name()))
        .chain(told(&all.masked.records).map(|(name, n)| format!("{name} {n}")))
        .collect();
    let problem = match records {
        0 => "there is no record".to_owned(),
        n => format!(
            "none of the {n} records has a diploid genotype of an individual in use ({})",
            reasons.join(", ")
        ),
    };
    Error::Calls {
        path: plan.calls[0].clone(),
        place: crate::error::Place::End,
        problem,
        cure: "give calls with a GT field for the samples of the sheet".to_owned(),
    }
}
