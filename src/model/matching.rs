//! Samples of the sheet to columns of the calls.

use std::collections::{HashMap, HashSet};

use super::{Note, Problem, Replicate, SheetRow, Strata, plain_letters, spell_out, strata_of};

/// The slot of a column of the calls that is not used.
pub const UNUSED_COLUMN: u32 = u32::MAX;

/// How sheet and calls fit together.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Matched {
    /// The strata of the samples that have calls; slots refer to these.
    pub strata: Strata,
    /// Slot by column of the calls, [`UNUSED_COLUMN`] where the column is not used.
    pub slot_of_column: Vec<u32>,
    /// Samples of the sheet that the calls lack, in the order of the sheet; replicates not among them.
    pub absent: Vec<String>,
    /// Samples of the calls that the sheet does not list, in the order of the calls.
    pub not_listed: Vec<String>,
    /// Replicates, which are in no stratum.
    pub replicates: Vec<Replicate>,
    /// What a person should know of the strata and the fit.
    pub notes: Vec<Note>,
}

/// Matches the samples of the calls with the rows of the sheet by name.
///
/// With `allow_absent`, samples without calls are dropped, and strata that lose all of theirs with
/// them; the comparisons must then be chosen from the strata returned here.
///
/// # Errors
/// A sample of the sheet that the calls lack (each with its row) unless allowed; a sample that the
/// calls have twice; no sample in common at all.
pub fn match_samples(
    header_samples: &[String],
    rows: &[SheetRow],
    allow_absent: bool,
) -> Result<Matched, Vec<Problem>> {
    let in_calls: HashSet<&str> = header_samples.iter().map(String::as_str).collect();
    let mut problems = told_twice(header_samples);
    let (present, absent): (Vec<&SheetRow>, Vec<&SheetRow>) = rows
        .iter()
        .filter(|row| row.used)
        .partition(|row| in_calls.contains(row.sample.as_str()));
    let absent: Vec<&SheetRow> = absent
        .into_iter()
        .filter(|row| row.replicate_of.is_none())
        .collect();
    if !present.iter().any(|row| row.replicate_of.is_none()) {
        problems.push(nothing_in_common(header_samples, rows));
    } else if !allow_absent {
        let absent = absent.iter().map(|row| (row.row, row.sample.as_str()));
        let listed = rows.iter().map(|row| row.sample.as_str());
        problems.extend(told_absent(absent, header_samples, listed));
    }
    if !problems.is_empty() {
        return Err(problems);
    }
    let kept: Vec<SheetRow> = present.into_iter().cloned().collect();
    let stratified = strata_of(&kept);
    let slots: HashMap<&str, u32> = (0u32..)
        .zip(&stratified.strata.individuals)
        .map(|(slot, individual)| (individual.sample.as_str(), slot))
        .collect();
    let slot_of_column = header_samples
        .iter()
        .map(|sample| slots.get(sample.as_str()).copied().unwrap_or(UNUSED_COLUMN))
        .collect();
    let listed: HashSet<&str> = rows.iter().map(|row| row.sample.as_str()).collect();
    let mut matched = Matched {
        slot_of_column,
        absent: absent.iter().map(|row| row.sample.clone()).collect(),
        not_listed: header_samples
            .iter()
            .filter(|sample| !listed.contains(sample.as_str()))
            .cloned()
            .collect(),
        replicates: stratified.replicates,
        notes: stratified.notes,
        strata: stratified.strata,
    };
    note_fit(&mut matched, &strata_of(rows).strata);
    note_not_used(&mut matched, rows);
    Ok(matched)
}

fn told_twice(header_samples: &[String]) -> Vec<Problem> {
    let mut seen = HashMap::with_capacity(header_samples.len());
    let mut problems = Vec::new();
    for (column, sample) in header_samples.iter().enumerate() {
        if let Some(first) = seen.insert(sample, column) {
            problems.push(Problem::of_all(
                format!(
                    "the calls have sample '{sample}' twice, as their samples {} and {}",
                    first + 1,
                    column + 1
                ),
                "rename one of them in the calls, and list it as replicate_of the other if it is one",
            ));
        }
    }
    problems
}

fn note_not_used(matched: &mut Matched, rows: &[SheetRow]) {
    let names = || rows.iter().filter(|row| !row.used);
    if names().next().is_some() {
        let text = format!(
            "{} row(s) say no under 'use' and are left out: {}.",
            names().count(),
            spell_out(names().map(|row| row.sample.as_str()))
        );
        matched
            .notes
            .push(Note::new("rows_not_used", "sheet", text));
    }
}

fn nothing_in_common(header_samples: &[String], rows: &[SheetRow]) -> Problem {
    if header_samples.is_empty() {
        return Problem::of_all(
            "the calls have no sample at all",
            "give calls with genotypes: a file of sites alone cannot be measured",
        );
    }
    if !rows.is_empty() && rows.iter().all(|row| !row.used) {
        return Problem::of_all(
            "every row says no under 'use'",
            "write yes in the rows that shall take part",
        );
    }
    Problem::of_all(
        "no sample of the sheet is in the calls",
        format!(
            "write the same names in both: the sheet has {}, the calls have {}",
            spell_out(rows.iter().take(3).map(|row| row.sample.as_str())),
            spell_out(header_samples.iter().take(3).map(String::as_str)),
        ),
    )
}

/// One problem for each sample without calls (row and name), with the name it may have there:
/// `listed` are all names of the sheet.
pub fn told_absent<'a>(
    absent: impl IntoIterator<Item = (u64, &'a str)>,
    header: &[String],
    listed: impl IntoIterator<Item = &'a str>,
) -> Vec<Problem> {
    let listed: HashSet<&str> = listed.into_iter().collect();
    let by_letters: HashMap<Vec<char>, &str> = header
        .iter()
        .filter(|sample| !listed.contains(sample.as_str()))
        .map(|sample| (plain_letters(sample), sample.as_str()))
        .collect();
    absent
        .into_iter()
        .map(|(row, sample)| {
            let cure = match by_letters.get(&plain_letters(sample)) {
                Some(near) => format!("the calls have '{near}': write the same name in both"),
                None => "correct the name, or allow it with --allow-absent".to_string(),
            };
            Problem::at(row, format!("sample '{sample}' has no calls"), cure)
        })
        .collect()
}

fn note_fit(matched: &mut Matched, of_sheet: &Strata) {
    let mut note = |code, names: &[String], text: &str| {
        if !names.is_empty() {
            let names_text = spell_out(names.iter().map(String::as_str));
            let text = format!("{} {text}: {names_text}.", names.len());
            matched.notes.push(Note::new(code, "calls", text));
        }
    };
    note(
        "samples_not_listed",
        &matched.not_listed,
        "sample(s) of the calls are not in the sheet and are not used",
    );
    note(
        "samples_absent",
        &matched.absent,
        "sample(s) of the sheet have no calls and are left out",
    );
    for stratum in &of_sheet.strata {
        if !matched
            .strata
            .strata
            .iter()
            .any(|kept| kept.name == stratum.name)
        {
            matched.notes.push(Note::new(
                "stratum_absent",
                &stratum.name,
                "None of its samples has calls: it is left out.",
            ));
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::strata::tests::row;
    use super::*;
    use proptest::prelude::*;

    fn names(list: &[&str]) -> Vec<String> {
        list.iter().map(|name| name.to_string()).collect()
    }

    fn sheet() -> Vec<SheetRow> {
        let mut rows = vec![
            row("b1", "Birch", "2003", 2003.0),
            row("a1", "Alder", "2003", 2003.0),
            row("a2", "Alder", "2019", 2019.0),
            row("a2-again", "Alder", "2019", 2019.0),
        ];
        rows[3].replicate_of = Some("a2".to_string());
        for (i, row) in rows.iter_mut().enumerate() {
            row.row = i as u64 + 2;
        }
        rows
    }

    #[test]
    fn columns_get_the_slots_of_their_samples() {
        let header = names(&["a2", "zz", "b1", "a2-again", "a1"]);
        let matched = match_samples(&header, &sheet(), false).unwrap();
        // Slots: Alder@2003 a1, Alder@2019 a2, Birch@2003 b1.
        assert_eq!(
            matched.slot_of_column,
            [1, UNUSED_COLUMN, 2, UNUSED_COLUMN, 0]
        );
        assert_eq!(matched.not_listed, ["zz"]);
        let codes: Vec<&str> = matched.notes.iter().map(|note| note.code).collect();
        assert_eq!(codes, ["samples_not_listed"]);
    }

    #[test]
    fn samples_without_calls_are_all_told_with_row_and_likely_name() {
        let header = names(&["a2", "B-1"]);
        let problems = match_samples(&header, &sheet(), false).unwrap_err();
        let told: Vec<_> = problems.iter().map(|p| (p.row, p.what.as_str())).collect();
        assert_eq!(
            told,
            [
                (Some(2), "sample 'b1' has no calls"),
                (Some(3), "sample 'a1' has no calls")
            ]
        );
        assert!(problems[0].cure.contains("'B-1'"), "{problems:?}");
    }

    #[test]
    fn allowed_absences_drop_samples_and_empty_strata() {
        let matched = match_samples(&names(&["a2", "b1"]), &sheet(), true).unwrap();
        assert_eq!(matched.absent, ["a1"]);
        let strata: Vec<&str> = matched
            .strata
            .strata
            .iter()
            .map(|s| s.name.as_str())
            .collect();
        assert_eq!(strata, ["Alder@2019", "Birch@2003"]);
        assert_eq!(matched.slot_of_column, [0, 1]);
        let codes: Vec<&str> = matched.notes.iter().map(|note| note.code).collect();
        assert_eq!(codes, ["samples_absent", "stratum_absent"]);
    }

    #[test]
    fn nothing_in_common_and_names_twice_are_refused_even_when_absences_are_allowed() {
        let problems = match_samples(&names(&["x", "x"]), &sheet(), true).unwrap_err();
        assert!(
            problems[0].what.contains("twice, as their samples 1 and 2"),
            "{problems:?}"
        );
        assert!(
            problems[1].cure.contains("'b1', 'a1', 'a2'"),
            "{problems:?}"
        );
        let problems = match_samples(&[], &sheet(), true).unwrap_err();
        assert!(problems[0].what.contains("no sample at all"));
    }

    proptest! {
        /// Whatever the order of columns, each slot has exactly one column, that of its sample.
        #[test]
        fn slots_follow_names(header in Just(names(&["a1", "a2", "b1", "c", "a2-again"])).prop_shuffle()) {
            let matched = match_samples(&header, &sheet(), false).unwrap();
            for (slot, individual) in matched.strata.individuals.iter().enumerate() {
                let columns: Vec<&String> = header.iter().zip(&matched.slot_of_column)
                    .filter(|(_, s)| **s as usize == slot).map(|(name, _)| name).collect();
                prop_assert_eq!(columns, vec![&individual.sample]);
            }
        }
    }
}
