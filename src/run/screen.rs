//! Looking at the samples themselves: calls and a sheet in, a screening report and a cleaned sheet out.

mod inputs;

use std::io::Write as _;
use std::sync::Arc;
use std::sync::atomic::{AtomicUsize, Ordering};
use std::thread;

use super::{available_threads, input_file, told};
use inputs::{open_calls, scheme, verdicts, words};

use super::pipeline::{Collected, Gather, RowMaker, Source, collect_into};
use super::progress::Progress;
use crate::error::{Error, Place, Result};
use crate::files::WholeFile;
use crate::ingest::sheet::annotate::annotated;
use crate::ingest::sheet::{Sheet, read_sheet};
use crate::locus::individuals::row_blocks;
use crate::locus::runs::{Run, covered, runs_of_homozygosity};
use crate::merge::screen::{ScreenScheme, ScreenSums};
use crate::model::{Locus, Matched, Note, ScreenPlan, Strata, Verdict};
use crate::report::screen_wire::{
    SCREEN_FORMAT, SCREEN_FORMAT_VERSION, ScreenReport, ScreenedLoci,
};
use crate::report::screening::{Screened, SheetWord};
use crate::report::warnings::warning;
use crate::report::wire::{Provenance, Warning};
use crate::report::{CAUTIONS, Output, screen_methods};
use crate::screen::{
    FAMILY_LOCI, Found, KINSHIP_LOCI, MatchRule, Matching, ScreenGenotypes, family_effect,
    kinship_interval,
};

/// Pieces of work for each thread, so that none waits long for the last.
const PIECES: usize = 16;

impl Gather for ScreenSums {
    fn take(&mut self, locus: &Locus, _: Option<RowMaker>, _: &mut Vec<u8>) {
        self.add(locus);
    }

    fn merge(&mut self, other: Self) {
        ScreenSums::merge(self, other);
    }
}

/// Runs `screen` and writes its outputs; returns the report for the summary.
pub fn screen(plan: &ScreenPlan, arguments: Vec<String>) -> Result<ScreenReport> {
    let sheet = read_sheet(&plan.sheet)?;
    let (mut sources, matched) = open_calls(plan, &sheet)?;
    let output = Output::create(plan.output.as_deref())?;
    let clean = plan
        .clean_sheet
        .as_deref()
        .map(WholeFile::create)
        .transpose()?;
    let words = words(&sheet.rows, &matched.strata);
    let scheme = Arc::new(scheme(plan, &matched.strata, &words));
    let threads = plan.threads.unwrap_or_else(available_threads);
    let empty = || ScreenSums::new(Arc::clone(&scheme));
    let progress = Progress::new(&plan.calls, plan.quiet);
    let all = collect_into(&mut sources, &empty, &plan.masks, threads, None, &|n| {
        progress.at(n)
    })?;
    drop(progress);
    if all.sums.kept == 0 {
        return Err(nothing_kept(plan));
    }
    let inputs = Inputs {
        plan,
        sheet: &sheet,
        sources: &sources,
        matched: &matched,
    };
    let report = inputs.report(arguments, &all, &scheme, &words, threads);
    if let (Some(mut file), Some(path)) = (clean, &plan.clean_sheet) {
        let text = annotated(&plan.sheet, &verdicts(&sheet.rows, &words, &report))?;
        file.write_all(text.as_bytes())
            .map_err(|e| Error::io(path, "write", e))?;
        file.finish()?;
    }
    output.json(&report)?;
    Ok(report)
}

/// What was read before the findings.
struct Inputs<'a> {
    plan: &'a ScreenPlan,
    sheet: &'a Sheet,
    sources: &'a [Source],
    matched: &'a Matched,
}

impl Inputs<'_> {
    fn report(
        &self,
        arguments: Vec<String>,
        all: &Collected<ScreenSums>,
        scheme: &ScreenScheme,
        words: &[SheetWord],
        threads: usize,
    ) -> ScreenReport {
        let (plan, strata) = (self.plan, &self.matched.strata);
        let genotypes = ScreenGenotypes::of(&all.sums.panel, scheme);
        let slots = strata.individuals.len();
        let rule = MatchRule::of(&genotypes, slots, plan.fewest_shared, plan.most_mismatching);
        let found = pairs(&genotypes, &rule, strata, threads);
        let reach = covered(&genotypes.places, &plan.runs);
        let absent = no_runs(plan, &genotypes, reach);
        let runs = match &absent {
            None => runs(all, &genotypes, plan, slots, threads),
            Some(_) => Vec::new(),
        };
        let screened = Screened::new(
            plan,
            strata,
            words,
            scheme,
            &all.sums,
            &genotypes,
            &rule,
            &found,
            absent.clone().map_or(Ok(&runs[..]), Err),
            reach,
        );
        let related = screened.related();
        let listed = &related[..related.len().min(plan.list_pairs)];
        let kinships = in_order(listed.len(), threads, |i| {
            kinship_interval(&genotypes, listed[i].first, listed[i].second)
        });
        let families = screened.families_by_stratum();
        let rows = match families.is_empty() {
            true => Vec::new(),
            false => family_rows(all, slots),
        };
        let effects = in_order(families.len(), threads, |i| {
            let (_, distinct, families) = &families[i];
            family_effect(&rows, distinct, families)
        });
        let parts = screened.parts(&kinships, &effects);
        ScreenReport {
            format: SCREEN_FORMAT.to_owned(),
            format_version: SCREEN_FORMAT_VERSION,
            provenance: self.provenance(arguments),
            loci: loci(all, &genotypes, reach, absent),
            strata: parts.strata,
            samples: parts.samples,
            absent: self.matched.absent.clone(),
            not_listed: self.matched.not_listed.clone(),
            same_individual: parts.same_individual,
            chains: parts.chains,
            replicates: parts.replicates,
            genotyping: parts.genotyping,
            relatives: parts.relatives,
            families: parts.families,
            odd_heterozygotes: parts.odd_heterozygotes,
            missing_together: parts.missing_together,
            warnings: self.warnings(all),
            cautions: CAUTIONS.iter().map(|&text| text.to_owned()).collect(),
        }
    }

    fn provenance(&self, arguments: Vec<String>) -> Provenance {
        let plan = self.plan;
        let calls = self.sources.iter().map(|source| {
            let digest = source.reader.digest();
            let format = source.reader.format();
            let path = source.reader.path();
            input_file("calls", path, &format, digest.bytes, digest.sha256)
        });
        let sheet = input_file(
            "samples",
            &plan.sheet,
            "table",
            self.sheet.bytes,
            self.sheet.digest.clone(),
        );
        let mismatching = plan.most_mismatching;
        let settings = [
            ("most_loci", plan.most_loci.to_string()),
            ("fewest_shared", plan.fewest_shared.to_string()),
            (
                "most_mismatching",
                mismatching.map_or("from the panel".to_owned(), |x| x.to_string()),
            ),
            (
                "min_sample_call_rate",
                plan.min_sample_call_rate.to_string(),
            ),
            (
                "false_discovery_rate",
                plan.false_discovery_rate.to_string(),
            ),
            ("list_pairs", plan.list_pairs.to_string()),
            ("list_loci", plan.list_loci.to_string()),
            ("run_fewest_loci", plan.runs.fewest_loci.to_string()),
            ("run_shortest_bp", plan.runs.shortest.to_string()),
            (
                "run_most_heterozygous",
                plan.runs.most_heterozygous.to_string(),
            ),
            ("run_most_missing", plan.runs.most_missing.to_string()),
            ("run_widest_gap_bp", plan.runs.widest_gap.to_string()),
        ];
        Provenance {
            program: env!("CARGO_PKG_NAME").to_owned(),
            version: env!("CARGO_PKG_VERSION").to_owned(),
            arguments,
            inputs: calls.chain([sheet]).collect(),
            settings: settings
                .into_iter()
                .chain(plan.masks.settings())
                .map(|(name, value)| (name.to_owned(), value))
                .collect(),
            methods: screen_methods(),
            stamp: None,
        }
    }

    fn warnings(&self, all: &Collected<ScreenSums>) -> Vec<Warning> {
        let notes = self.sheet.notes.iter().chain(&self.matched.notes);
        let mut warnings: Vec<Warning> = notes.map(warning).collect();
        for (source, remarks) in self.sources.iter().zip(&all.remarks) {
            let file = source.reader.path().display().to_string();
            let mut remarks = remarks.clone();
            remarks.merge(source.reader.remarks());
            let told = source.reader.warnings().iter().cloned();
            let told = told.chain(remarks.messages());
            warnings.extend(told.map(|text| warning(&Note::new("calls", file.clone(), text))));
        }
        warnings
    }
}

/// Does numbered pieces of work on several threads; results come in the order of their numbers.
fn in_order<T: Send>(pieces: usize, threads: usize, work: impl Fn(usize) -> T + Sync) -> Vec<T> {
    let next = AtomicUsize::new(0);
    let worker = || {
        let mut done = Vec::new();
        loop {
            let piece = next.fetch_add(1, Ordering::Relaxed);
            if piece >= pieces {
                return done;
            }
            done.push((piece, work(piece)));
        }
    };
    let mut all: Vec<(usize, T)> = thread::scope(|scope| {
        let handles: Vec<_> = (0..threads.max(1)).map(|_| scope.spawn(worker)).collect();
        let joined = handles.into_iter().map(|handle| {
            handle
                .join()
                .unwrap_or_else(|panic| std::panic::resume_unwind(panic))
        });
        joined.flatten().collect()
    });
    all.sort_by_key(|(piece, _)| *piece);
    all.into_iter().map(|(_, result)| result).collect()
}

fn pairs(genotypes: &ScreenGenotypes, rule: &MatchRule, strata: &Strata, threads: usize) -> Found {
    let stratum_of: Vec<usize> = strata.individuals.iter().map(|i| i.stratum).collect();
    let matching = Matching {
        genotypes,
        rule,
        stratum_of: &stratum_of,
        kinship: genotypes.places.len() >= KINSHIP_LOCI,
    };
    let blocks = row_blocks(stratum_of.len(), threads.max(1) * PIECES);
    let parts = in_order(blocks.len(), threads, |i| matching.rows(blocks[i].clone()));
    let mut found = Found::default();
    parts.into_iter().for_each(|part| found.merge(part));
    found
}

/// Why runs cannot be sought, if they cannot.
fn no_runs(plan: &ScreenPlan, genotypes: &ScreenGenotypes, reach: u64) -> Option<String> {
    let rule = &plan.runs;
    let loci = genotypes.places.len() as f64;
    // A run of the least length must hold the fewest loci on average.
    let dense = loci * rule.shortest as f64 >= f64::from(rule.fewest_loci) * reach as f64;
    (reach < rule.shortest || !dense).then(|| {
        format!(
            "{loci} loci of two alleles with {reach} base pairs in their reach are too sparse for runs of {} loci in {} base pairs",
            rule.fewest_loci, rule.shortest
        )
    })
}

fn runs(
    all: &Collected<ScreenSums>,
    genotypes: &ScreenGenotypes,
    plan: &ScreenPlan,
    slots: usize,
    threads: usize,
) -> Vec<Vec<Run>> {
    let loci = all.sums.panel.loci();
    in_order(slots, threads, |slot| {
        let states: Vec<u8> = loci.iter().map(|locus| locus.dosage(slot)).collect();
        runs_of_homozygosity(&genotypes.places, &states, &plan.runs)
    })
}

/// Genotypes of evenly chosen loci behind effective sizes.
fn family_rows(all: &Collected<ScreenSums>, slots: usize) -> Vec<(u64, Vec<u8>)> {
    let loci = all.sums.panel.loci();
    let step = loci.len().div_ceil(FAMILY_LOCI).max(1);
    let row = |locus: &&crate::merge::screen::KeptLocus| {
        let mut dosages = vec![0; slots];
        locus.unpack(&mut dosages);
        (locus.contig_hash, dosages)
    };
    loci.iter().step_by(step).map(row).collect()
}

fn loci(
    all: &Collected<ScreenSums>,
    genotypes: &ScreenGenotypes,
    reach: u64,
    absent: Option<String>,
) -> ScreenedLoci {
    let set_aside = Verdict::ALL.iter().filter(|&&v| v != Verdict::Kept);
    let count = |v: &Verdict| all.verdicts.get(v).copied().unwrap_or(0);
    ScreenedLoci {
        read: all.verdicts.values().sum(),
        kept: all.sums.kept,
        varying: all.sums.varying,
        set_aside: set_aside
            .map(|v| (v.name().to_owned(), count(v)))
            .chain(told(&all.masked.records))
            .collect(),
        masked_genotypes: told(&all.masked.genotypes).collect(),
        compared_biallelic: genotypes.places.len() as u64,
        compared_multiallelic: genotypes.repeats.len() as u64,
        covered_bp: reach,
        runs_absent_because: absent,
    }
}

fn nothing_kept(plan: &ScreenPlan) -> Error {
    Error::Calls {
        path: plan.calls[0].clone(),
        place: Place::End,
        problem: "no record has a diploid genotype of a sample of the sheet".to_owned(),
        cure: "give calls with a GT field for the samples of the sheet".to_owned(),
    }
}
