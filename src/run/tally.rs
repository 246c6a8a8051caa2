//! `genewane tally`, and tallies as the input of `measure`.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use super::available_threads;
use super::measure::{Inputs, Origin, calls_file, nothing_kept, remarks_of};
use super::pipeline::{Collected, LocusTable, collect};
use super::progress::Progress;
use crate::error::{Error, Result};
use crate::ingest::sheet::Sheet;
use crate::merge::{LocusView, Scheme, Sums};
use crate::model::{
    CallTally, Locus, MaskTally, Matched, MeasurePlan, Strata, Verdict, match_samples,
};
use crate::report::tally::{
    TALLY_FORMAT, TALLY_VERSION, TallyHeader, TallyRows, faulty, is_tally, read_tally, strata_of,
};

/// What a tally keeps beside its sums.
type Beside = (BTreeMap<Verdict, u64>, CallTally, MaskTally);

/// Counts one shard of the calls and writes its tally; returns records read and loci kept.
pub fn tally(plan: &MeasurePlan) -> Result<(u64, u64)> {
    let mut inputs = Inputs::open(plan)?;
    let path = plan
        .output
        .as_deref()
        .ok_or_else(|| Error::Usage("a tally needs a file: give -o FILE".to_owned()))?;
    let scheme = inputs.scheme(plan);
    let mut rows = TallyRows::create(path, &inputs.matched.strata)?;
    let failed = |e| Error::io(path, "write", e);
    let row = |locus: &Locus, view: &LocusView, out: &mut Vec<u8>| TallyRows::row(locus, view, out);
    let table = LocusTable {
        out: &mut rows,
        row: &row,
        failed: &failed,
    };
    let threads = plan.threads.unwrap_or_else(available_threads);
    let Origin::Calls(sources) = &mut inputs.origin else {
        return Err(Error::Usage(
            "these are tallies already: give them to 'genewane measure'".to_owned(),
        ));
    };
    let progress = Progress::new(&plan.calls, plan.quiet);
    let all = collect(sources, &scheme, &plan.masks, threads, Some(table), &|n| {
        progress.at(n)
    })?;
    drop(progress);
    if all.sums.kept == 0 {
        return Err(nothing_kept(plan, &all));
    }
    let mut remarks = Vec::new();
    let mut files = Vec::new();
    for (source, of_records) in sources.iter().zip(&all.remarks) {
        remarks.extend(remarks_of(source, of_records));
        files.push(calls_file(source));
    }
    let header = TallyHeader {
        format: TALLY_FORMAT.to_owned(),
        format_version: TALLY_VERSION,
        version: env!("CARGO_PKG_VERSION").to_owned(),
        inputs: files,
        samples_in_calls: sources[0].reader.header().samples.clone(),
        strata: strata_of(&inputs.matched.strata),
        comparisons: comparisons_of(&scheme, &inputs.matched.strata),
        settings: settings_of(plan, &scheme),
        contigs: rows.contigs().clone(),
        remarks,
        state_sha256: String::new(),
    };
    let told = (all.verdicts.values().sum(), all.sums.kept);
    let beside: Beside = (all.verdicts, all.tally, all.masked);
    let broken = |e: String| Error::io(path, "write", std::io::Error::other(e));
    let beside = postcard::to_stdvec(&beside).map_err(|e| broken(e.to_string()))?;
    let mut state = (beside.len() as u64).to_le_bytes().to_vec();
    state.extend_from_slice(&beside);
    state.extend_from_slice(&all.sums.store().map_err(broken)?);
    rows.finish(path, header, &state)?;
    Ok(told)
}

/// Tallies that were read, not yet added up.
pub struct Tallies {
    parts: Vec<(PathBuf, TallyHeader, Vec<u8>)>,
}

impl Tallies {
    /// Reads the tallies among the files: all of them or none.
    ///
    /// # Errors
    /// When only some are tallies, one cannot be read, or two hold the same stretch of the genome.
    pub fn read(plan: &MeasurePlan) -> Result<Option<Tallies>> {
        let is: Vec<bool> = plan.calls.iter().map(|path| is_tally(path)).collect();
        if !is.contains(&true) {
            return Ok(None);
        }
        if let Some(i) = is.iter().position(|is| !is) {
            return Err(Error::Usage(format!(
                "{} is no tally, but others are: give tallies alone, or calls alone",
                plan.calls[i].display()
            )));
        }
        if !plan.masks.is_empty() || plan.locus_map.is_some() || plan.loci_output.is_some() {
            return Err(Error::Usage(
                "tallies are masked and placed when they are made, and hold their table by locus: give \
                 masks and --locus-map to 'genewane tally', and read the tally itself for --loci"
                    .to_owned(),
            ));
        }
        let mut parts = Vec::new();
        for path in &plan.calls {
            let (header, state) = read_tally(path)?;
            parts.push((path.clone(), header, state));
        }
        let tallies = Tallies { parts };
        tallies.apart()?;
        Ok(Some(tallies))
    }

    /// No two shards may hold the same loci.
    fn apart(&self) -> Result<()> {
        for (i, (path, header, _)) in self.parts.iter().enumerate() {
            for (other, before, _) in &self.parts[..i] {
                let both = header.contigs.iter().find(|(contig, [first, last])| {
                    let there = before.contigs.get(*contig);
                    there.is_some_and(|[from, to]| first <= to && from <= last)
                });
                if let Some((contig, [first, last])) = both {
                    return Err(faulty(
                        path,
                        &format!(
                            "its loci on {contig} ({first} to {last}) lie among those of {}",
                            other.display()
                        ),
                        "give every part of the genome once",
                    ));
                }
            }
        }
        Ok(())
    }

    /// The samples of the calls matched with the sheet.
    pub fn matched(&self, plan: &MeasurePlan, sheet: &Sheet) -> Result<Matched> {
        let (path, first, _) = &self.parts[0];
        for (other, header, _) in &self.parts[1..] {
            if header.samples_in_calls != first.samples_in_calls {
                return Err(faulty(
                    other,
                    &format!(
                        "the samples of its calls are not those of {}",
                        path.display()
                    ),
                    "give shards of one set of calls",
                ));
            }
        }
        match_samples(&first.samples_in_calls, &sheet.rows, plan.allow_absent).map_err(|problems| {
            Error::Sheet {
                path: plan.sheet.clone(),
                problems,
            }
        })
    }

    /// Samples in the calls.
    pub fn samples_in_calls(&self) -> usize {
        self.parts[0].1.samples_in_calls.len()
    }

    /// Headers, in the order of the files.
    pub fn headers(&self) -> impl Iterator<Item = (&Path, &TallyHeader)> {
        self.parts
            .iter()
            .map(|(path, header, _)| (path.as_path(), header))
    }

    /// Settings that were in force when the first was made.
    pub fn settings(&self) -> &BTreeMap<String, String> {
        &self.parts[0].1.settings
    }

    /// Adds all up.
    ///
    /// # Errors
    /// When one was made for other strata, comparisons or settings, which the error names.
    pub fn collect(
        &self,
        plan: &MeasurePlan,
        scheme: &Arc<Scheme>,
        strata: &Strata,
    ) -> Result<Collected> {
        let mut all = Collected {
            sums: Sums::new(Arc::clone(scheme)),
            verdicts: BTreeMap::new(),
            tally: CallTally::default(),
            masked: MaskTally::default(),
            remarks: Vec::new(),
        };
        let mut wanted = settings_of(plan, scheme);
        // Masks are those of the tallies, which must agree among themselves.
        wanted.extend(
            self.settings()
                .iter()
                .filter(|(name, _)| !FROM_PLAN.contains(&name.as_str()))
                .map(|(name, value)| (name.clone(), value.clone())),
        );
        for (path, header, state) in &self.parts {
            check(path, header, strata, scheme, &wanted)?;
            let broken = |e: String| faulty(path, &format!("its sums cannot be read: {e}"), AGAIN);
            let (beside, sums) = parts_of(state).ok_or_else(|| broken("cut short".to_owned()))?;
            let (verdicts, tally, masked): Beside =
                postcard::from_bytes(beside).map_err(|e| broken(e.to_string()))?;
            let sums = Sums::restore(Arc::clone(scheme), sums).map_err(broken)?;
            all.sums.merge(sums);
            // Two that are within bounds can be added up; that the outcome is so as well lets the next come.
            let too_large = || broken("they are too large to be added up".to_owned());
            if !all.sums.is_bounded() || !can_be_added(&verdicts, &tally, &masked) {
                return Err(too_large());
            }
            all.tally.merge(&tally);
            all.masked.merge(&masked);
            for (verdict, n) in verdicts {
                *all.verdicts.entry(verdict).or_default() += n;
            }
            if !can_be_added(&all.verdicts, &all.tally, &all.masked) {
                return Err(too_large());
            }
        }
        all.sums.flush();
        Ok(all)
    }
}

const AGAIN: &str = "make the tally again";

/// Settings in which shards differ by their nature.
const OF_THE_SHARD: [&str; 4] = ["contigs", "without_contigs", "regions", "regions_bed"];

/// Settings that `measure` can name as well.
const FROM_PLAN: [&str; 3] = ["gene_copies", "list_losses", "min_call_rate"];

/// Whether what is counted beside the sums is so little that as much again can be added.
fn can_be_added(verdicts: &BTreeMap<Verdict, u64>, calls: &CallTally, masked: &MaskTally) -> bool {
    let calls = calls.numbers();
    let masked = masked.records.values().chain(masked.genotypes.values());
    let mut numbers = verdicts.values().chain(&calls).chain(masked);
    let sum = numbers.try_fold(0u64, |sum, &n| sum.checked_add(n));
    sum.is_some_and(|sum| sum <= u64::MAX / 4)
}

fn parts_of(state: &[u8]) -> Option<(&[u8], &[u8])> {
    let (length, rest) = state.split_first_chunk::<8>()?;
    let length = usize::try_from(u64::from_le_bytes(*length)).ok()?;
    rest.split_at_checked(length)
}

/// Holds the header of a tally against what is to be measured.
fn check(
    path: &Path,
    header: &TallyHeader,
    strata: &Strata,
    scheme: &Scheme,
    wanted: &BTreeMap<String, String>,
) -> Result<()> {
    let cure = "make every tally and the report with the same sheet, programme and options";
    let here = strata_of(strata);
    if header.strata != here {
        let differs = header.strata.iter().zip(&here).find(|(a, b)| a != b);
        let problem = match differs {
            Some((tallied, listed)) if tallied.stratum == listed.stratum => format!(
                "its samples of {} are not those of the sheet: {} tallied, {} listed",
                tallied.stratum,
                tallied.samples.len(),
                listed.samples.len()
            ),
            Some((tallied, listed)) => format!(
                "it has the stratum {} where the sheet has {}",
                tallied.stratum, listed.stratum
            ),
            None => format!(
                "it has {} strata, the sheet has {}",
                header.strata.len(),
                here.len()
            ),
        };
        return Err(faulty(path, &problem, cure));
    }
    if header.comparisons != comparisons_of(scheme, strata) {
        return Err(faulty(
            path,
            "it was made for other comparisons of visits: the baseline differs",
            cure,
        ));
    }
    for (name, value) in wanted {
        let tallied = header.settings.get(name).map_or("not set", String::as_str);
        if tallied != value {
            return Err(faulty(
                path,
                &format!("it was made with {name} {tallied}, and {name} is {value} here"),
                cure,
            ));
        }
    }
    match header
        .settings
        .keys()
        .find(|name| !wanted.contains_key(*name))
    {
        Some(name) => Err(faulty(
            path,
            &format!("it was made with {name}, and others were not"),
            cure,
        )),
        None => Ok(()),
    }
}

fn comparisons_of(scheme: &Scheme, strata: &Strata) -> Vec<String> {
    let name = |s: usize| &strata.strata[s].name;
    scheme
        .pairs
        .iter()
        .map(|p| format!("{} > {}", name(p.from), name(p.to)))
        .collect()
}

fn settings_of(plan: &MeasurePlan, scheme: &Scheme) -> BTreeMap<String, String> {
    let own = [
        ("gene_copies", scheme.gene_copies.to_string()),
        ("list_losses", plan.list_losses.to_string()),
        ("min_call_rate", plan.min_call_rate.to_string()),
    ];
    own.into_iter()
        .chain(plan.masks.settings())
        .filter(|(name, _)| !OF_THE_SHARD.contains(name))
        .map(|(name, value)| (name.to_owned(), value))
        .collect()
}
