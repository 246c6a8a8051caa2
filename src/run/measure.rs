//! The main job: genotype calls and a sample sheet in, one report out.

use std::collections::BTreeMap;
use std::sync::Arc;

use super::pipeline::{Collected, LocusTable, Source, collect};
use super::progress::Progress;
mod calls;

pub(super) use calls::{calls_file, remarks_of};
use calls::{open_calls, told_of_calls, told_with_calls};

use super::tally::Tallies;
use super::{available_threads, input_file, told};
use crate::error::{Error, Result};
use crate::ingest::programme::read_programme;
use crate::ingest::sheet::{Sheet, read_sheet};
use crate::merge::{LocusView, Scheme};
use crate::model::{
    Compared, Locus, Matched, MeasurePlan, Note, Programme, Verdict, comparisons,
    default_gene_copies,
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
pub(super) struct Inputs {
    sheet: Sheet,
    programme: Programme,
    programme_file: Option<InputFile>,
    pub(super) origin: Origin,
    pub(super) matched: Matched,
    compared: Compared,
    samples_in_calls: usize,
}

/// Where the counts come from.
pub(super) enum Origin {
    /// Files of calls, open.
    Calls(Vec<Source>),
    /// Tallies of such files.
    Tallies(Tallies),
}

impl Inputs {
    pub(super) fn open(plan: &MeasurePlan) -> Result<Inputs> {
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
        let (origin, matched, samples_in_calls) = match Tallies::read(plan)? {
            Some(tallies) => {
                let matched = tallies.matched(plan, &sheet)?;
                let samples = tallies.samples_in_calls();
                (Origin::Tallies(tallies), matched, samples)
            }
            None => {
                let (sources, matched) = open_calls(plan, &sheet)?;
                let samples = sources[0].reader.header().samples.len();
                (Origin::Calls(sources), matched, samples)
            }
        };
        let compared =
            comparisons(&matched.strata, &programme).map_err(|problems| Error::Sheet {
                path: plan.sheet.clone(),
                problems,
            })?;
        Ok(Inputs {
            sheet,
            programme,
            programme_file,
            origin,
            matched,
            compared,
            samples_in_calls,
        })
    }

    /// What is to be counted.
    pub(super) fn scheme(&self, plan: &MeasurePlan) -> Arc<Scheme> {
        let strata = &self.matched.strata;
        let gene_copies = plan
            .gene_copies
            .or_else(|| default_gene_copies(strata))
            .unwrap_or(2);
        Arc::new(Scheme::new(
            strata,
            &self.compared.comparisons,
            plan.min_call_rate,
            gene_copies,
            plan.list_losses,
        ))
    }

    fn measure(
        mut self,
        plan: &MeasurePlan,
        arguments: Vec<String>,
    ) -> Result<(Report, Option<TableFile>)> {
        let scheme = self.scheme(plan);
        let sources = match &mut self.origin {
            Origin::Calls(sources) => sources,
            Origin::Tallies(tallies) => {
                let collected = tallies.collect(plan, &scheme, &self.matched.strata)?;
                return Ok((self.report(plan, arguments, &collected), None));
            }
        };
        let (strata, pairs) = (&self.matched.strata, &self.compared.comparisons);
        let rows = Table::new(strata, pairs);
        let mut file = plan
            .loci_output
            .as_deref()
            .map(|path| TableFile::create(path, &rows.columns()))
            .transpose()?;
        let failed = |e| Error::io(plan.loci_output.clone().unwrap_or_default(), "write", e);
        let row = |locus: &Locus, view: &LocusView, out: &mut Vec<u8>| rows.row(locus, view, out);
        let table = file.as_mut().map(|out| LocusTable {
            out,
            row: &row,
            failed: &failed,
        });
        let threads = plan.threads.unwrap_or_else(available_threads);
        let progress = Progress::new(&plan.calls, plan.quiet);
        let collected = collect(sources, &scheme, &plan.masks, threads, table, &|n| {
            progress.at(n)
        })?;
        drop(progress);
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
        let calls: Vec<InputFile> = match &self.origin {
            Origin::Calls(sources) => sources.iter().map(calls_file).collect(),
            Origin::Tallies(tallies) => tallies
                .headers()
                .flat_map(|(_, header)| header.inputs.iter().cloned())
                .collect(),
        };
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
                .into_iter()
                .chain([sheet])
                .chain(self.programme_file.clone())
                .collect(),
            settings: match &self.origin {
                Origin::Calls(_) => BTreeMap::new(),
                Origin::Tallies(tallies) => tallies.settings().clone(),
            }
            .into_iter()
            .chain(
                settings
                    .into_iter()
                    .chain(plan.masks.settings())
                    .map(|(name, value)| (name.to_owned(), value)),
            )
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
        match &self.origin {
            Origin::Calls(sources) => {
                for (source, remarks) in sources.iter().zip(&all.remarks) {
                    let file = source.reader.path().display().to_string();
                    warnings.extend(told_of_calls(source, remarks, &file));
                }
            }
            Origin::Tallies(tallies) => {
                for (_, header) in tallies.headers() {
                    let names: Vec<&str> = header.inputs.iter().map(|i| i.name.as_str()).collect();
                    let file = names.join(", ");
                    let told = header.remarks.iter();
                    warnings.extend(
                        told.map(|text| warning(&Note::new("calls", file.clone(), text.clone()))),
                    );
                }
            }
        }
        warnings.extend(of_findings(findings));
        warnings
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
pub(super) fn nothing_kept(plan: &MeasurePlan, all: &Collected) -> Error {
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
