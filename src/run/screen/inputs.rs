//! Sheet and calls to slots, and findings back to rows of the sheet.

use std::collections::HashMap;
use std::sync::Arc;

use crate::error::{Error, Place, Result};
use crate::ingest::sheet::Sheet;
use crate::ingest::sheet::annotate::RowVerdict;
use crate::ingest::{self, Selection};
use crate::merge::screen::{Grouping, ScreenScheme};
use crate::model::{Matched, SCREEN_REPEATS, ScreenPlan, SheetRow, Strata, match_samples};
use crate::report::screen_wire::ScreenReport;
use crate::report::screening::SheetWord;
use crate::run::pipeline::Source;

/// The rows of the sheet as samples of their own: replicates too, behind all others, whatever the
/// sheet says of their use.
fn all_samples(rows: &[SheetRow]) -> Vec<SheetRow> {
    let mut all: Vec<SheetRow> = rows.to_vec();
    all.sort_by_key(|row| row.replicate_of.is_some());
    for row in &mut all {
        row.used = true;
        row.replicate_of = None;
    }
    all
}

pub(super) fn open_calls(plan: &ScreenPlan, sheet: &Sheet) -> Result<(Vec<Source>, Matched)> {
    let rows = all_samples(&sheet.rows);
    let mut sources = Vec::new();
    let mut first: Option<Matched> = None;
    let regions = ingest::regions_of(&plan.masks)?.map(Arc::new);
    for path in &plan.calls {
        let mut reader = ingest::open_with_map(path, plan.locus_map.as_deref())?;
        if let Some(regions) = &regions {
            reader.restrict(Arc::clone(regions))?;
        }
        let matched = match_samples(&reader.header().samples, &rows, plan.allow_absent);
        let matched = matched.map_err(|problems| Error::Sheet {
            path: plan.sheet.clone(),
            problems,
        })?;
        let selection = Selection {
            slot_of_column: matched.slot_of_column.clone(),
            slots: matched.strata.individuals.len(),
        };
        let first = first.get_or_insert(matched.clone());
        if first.strata != matched.strata {
            return Err(Error::Calls {
                path: path.clone(),
                place: Place::Header,
                problem: format!("its samples are not those of {}", plan.calls[0].display()),
                cure: "give files that hold the same individuals, one a part of the genome".into(),
            });
        }
        sources.push(Source { reader, selection });
    }
    let none = || Error::Usage("no file of genotype calls was given".to_owned());
    first.map(|matched| (sources, matched)).ok_or_else(none)
}

/// What the sheet says of each slot.
pub(super) fn words(rows: &[SheetRow], strata: &Strata) -> Vec<SheetWord> {
    let by_name: HashMap<&str, &SheetRow> = rows.iter().map(|r| (r.sample.as_str(), r)).collect();
    let slot_of: HashMap<&str, usize> = strata
        .individuals
        .iter()
        .enumerate()
        .map(|(slot, individual)| (individual.sample.as_str(), slot))
        .collect();
    let word = |name: &str| {
        let row = by_name.get(name)?;
        let original = row.replicate_of.clone();
        Some(SheetWord {
            row: row.row,
            used: row.used,
            repeats: original.as_deref().and_then(|of| slot_of.get(of).copied()),
            repeats_name: original,
        })
    };
    let individuals = strata.individuals.iter();
    individuals
        .filter_map(|individual| word(&individual.sample))
        .collect()
}

pub(super) fn scheme(plan: &ScreenPlan, strata: &Strata, words: &[SheetWord]) -> ScreenScheme {
    let ranges = strata.strata.iter().map(|s| s.slots.clone());
    let counted = strata.strata.iter().map(|s| {
        let originals = s
            .slots
            .clone()
            .filter(|&slot| words[slot].repeats_name.is_none());
        s.slots.start..s.slots.start + originals.count()
    });
    let visits = strata
        .individuals
        .iter()
        .map(|i| Some(strata.strata[i.stratum].visit.clone()));
    let batches = strata.individuals.iter().map(|i| i.batch.clone());
    let groupings = [
        grouping("visit", visits.collect()),
        grouping("batch", batches.collect()),
    ];
    ScreenScheme {
        counted: counted.collect(),
        strata: ranges.collect(),
        groupings: groupings.into_iter().flatten().collect(),
        most_loci: plan.most_loci,
        most_repeats: SCREEN_REPEATS,
        most_listed: plan.list_loci,
    }
}

/// Groups by label; none when there are not two of them.
fn grouping(by: &'static str, labels: Vec<Option<String>>) -> Option<Grouping> {
    let mut names: Vec<String> = labels.iter().flatten().cloned().collect();
    names.sort();
    names.dedup();
    let number = |label: &Option<String>| {
        let label = label.as_ref()?;
        names.binary_search(label).ok()
    };
    let of_slot = labels.iter().map(number).collect();
    (names.len() > 1).then_some(Grouping { by, names, of_slot })
}

/// What the cleaned sheet says, by row.
pub(super) fn verdicts(
    rows: &[SheetRow],
    words: &[SheetWord],
    report: &ScreenReport,
) -> HashMap<u64, RowVerdict> {
    let samples = words.iter().zip(&report.samples);
    // What a person has written against a row stays as it is.
    let mut verdicts: HashMap<u64, RowVerdict> = samples
        .filter(|(word, _)| word.used)
        .map(|(word, sample)| {
            let verdict = RowVerdict {
                used: sample.used,
                why: sample.why.join("; "),
            };
            (word.row, verdict)
        })
        .collect();
    for row in rows
        .iter()
        .filter(|row| row.used && report.absent.contains(&row.sample))
    {
        let why = "not in the calls".to_owned();
        verdicts.insert(row.row, RowVerdict { used: false, why });
    }
    verdicts
}
