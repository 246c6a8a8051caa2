//! Who was sampled where and when, and which samples are compared.

use std::cmp::Ordering;
use std::collections::BTreeMap;
use std::ops::Range;

use super::{Note, plain_letters, spell_out};

/// One row of the sample sheet, checked.
#[derive(Debug, Clone, PartialEq)]
pub struct SheetRow {
    /// 1-based row (line) of the file.
    pub row: u64,
    /// Sample name as in the calls.
    pub sample: String,
    /// Population name.
    pub population: String,
    /// Calendar year of sampling (may be fractional).
    pub year: f64,
    /// Visit label; the year as written when the sheet has no such column.
    pub visit: String,
    /// Sex, where given.
    pub sex: Option<Sex>,
    /// Generation, where given.
    pub generation: Option<f64>,
    /// Name of the sample of which this is a replicate.
    pub replicate_of: Option<String>,
    /// Genotyping batch, where given.
    pub batch: Option<String>,
    /// Whether the row takes part: false where the sheet's column `use` says no.
    pub used: bool,
}

/// Sex of a sampled individual.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Sex {
    /// Female.
    Female,
    /// Male.
    Male,
}

/// One sampled individual in use. Its place in [`Strata::individuals`] is its slot.
#[derive(Debug, Clone, PartialEq)]
pub struct Individual {
    /// Sample name as in the calls.
    pub sample: String,
    /// Index of its stratum.
    pub stratum: usize,
    /// Sex, where given.
    pub sex: Option<Sex>,
    /// Genotyping batch, where given.
    pub batch: Option<String>,
}

/// One population at one visit.
#[derive(Debug, Clone, PartialEq)]
pub struct Stratum {
    /// `population@visit`.
    pub name: String,
    /// Population name.
    pub population: String,
    /// Visit label.
    pub visit: String,
    /// Mean sampling year of its individuals.
    pub year: f64,
    /// Mean generation of its individuals, where every one has one.
    pub generation: Option<f64>,
    /// Slots of its individuals.
    pub slots: Range<usize>,
}

impl Stratum {
    /// Number of individuals.
    pub fn individuals(&self) -> usize {
        self.slots.len()
    }
}

/// All strata, ordered by population, then year, generation and visit; individuals in slot order, those of one
/// stratum side by side in the order of the sheet.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Strata {
    /// The strata.
    pub strata: Vec<Stratum>,
    /// The individuals by slot.
    pub individuals: Vec<Individual>,
}

/// What a comparison of two strata is for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum ComparisonKind {
    /// A later visit against the baseline of the same population.
    SinceBaseline,
    /// A visit against the one before, where that is not the baseline.
    BetweenVisits,
    /// Two populations at the same visit.
    BetweenPopulations,
}

/// An ordered pair of strata to compare: the earlier first.
#[derive(Debug, Clone, PartialEq)]
pub struct Comparison {
    /// Index of the earlier (or first) stratum.
    pub from: usize,
    /// Index of the later (or second) stratum.
    pub to: usize,
    /// Its kind.
    pub kind: ComparisonKind,
    /// Generations between the two, where the visits differ and the generation length is known.
    pub generations: Option<f64>,
}

/// A second genotyping of a sampled individual: in no stratum, so that nobody counts twice.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Replicate {
    /// Sample name as in the calls.
    pub sample: String,
    /// Name of the sample that is used.
    pub of: String,
    /// 1-based row (line) of the sheet.
    pub row: u64,
}

/// The strata of a sheet, and what was left out of them.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Stratified {
    /// The strata.
    pub strata: Strata,
    /// Replicates, in the order of the sheet.
    pub replicates: Vec<Replicate>,
    /// What a person should know of the strata.
    pub notes: Vec<Note>,
}

/// Sorts the rows of a sheet into strata. The order of rows changes nothing but the order of the
/// individuals within a stratum.
pub fn strata_of(rows: &[SheetRow]) -> Stratified {
    let mut groups: BTreeMap<(&str, &str), Vec<&SheetRow>> = BTreeMap::new();
    let mut replicates = Vec::new();
    for row in rows.iter().filter(|row| row.used) {
        match &row.replicate_of {
            Some(of) => replicates.push(Replicate {
                sample: row.sample.clone(),
                of: of.clone(),
                row: row.row,
            }),
            None => groups
                .entry((&row.population, &row.visit))
                .or_default()
                .push(row),
        }
    }
    let mut notes = Vec::new();
    let mut built: Vec<(Stratum, Vec<&SheetRow>)> = groups
        .into_iter()
        .map(|((population, visit), rows)| (stratum(population, visit, &rows, &mut notes), rows))
        .collect();
    built.sort_by(|(a, _), (b, _)| in_time(a, b));
    let mut strata = Strata::default();
    for (index, (mut stratum, rows)) in built.into_iter().enumerate() {
        let start = strata.individuals.len();
        strata.individuals.extend(rows.iter().map(|row| Individual {
            sample: row.sample.clone(),
            stratum: index,
            sex: row.sex,
            batch: row.batch.clone(),
        }));
        stratum.slots = start..strata.individuals.len();
        strata.strata.push(stratum);
    }
    note_like_names(&strata, &mut notes);
    Stratified {
        strata,
        replicates,
        notes,
    }
}

/// Order of strata: population, mean year, generation (none first), visit label.
fn in_time(a: &Stratum, b: &Stratum) -> Ordering {
    let generation = |s: &Stratum| s.generation.unwrap_or(f64::NEG_INFINITY);
    a.population
        .cmp(&b.population)
        .then(a.year.total_cmp(&b.year))
        .then(generation(a).total_cmp(&generation(b)))
        .then_with(|| a.visit.cmp(&b.visit))
}

fn stratum(population: &str, visit: &str, rows: &[&SheetRow], notes: &mut Vec<Note>) -> Stratum {
    let name = format!("{population}@{visit}");
    let generations: Vec<f64> = rows.iter().filter_map(|row| row.generation).collect();
    let complete = generations.len() == rows.len();
    if !complete && !generations.is_empty() {
        notes.push(Note::new(
            "generation_incomplete",
            &name,
            format!(
                "{} of {} individuals have a generation; none is used for this stratum.",
                generations.len(),
                rows.len()
            ),
        ));
    }
    Stratum {
        population: population.to_string(),
        visit: visit.to_string(),
        year: mean(rows.iter().map(|row| row.year).collect()),
        generation: complete.then(|| mean(generations)),
        slots: 0..0,
        name,
    }
}

/// Mean that does not depend on the order of the values, and is exact when all are equal. The list
/// must not be empty.
fn mean(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    let (first, last) = (values[0], values[values.len() - 1]);
    if first == last {
        first
    } else {
        values.iter().sum::<f64>() / values.len() as f64
    }
}

/// Population names that differ only in case, blanks or marks are most likely one population.
fn note_like_names(strata: &Strata, notes: &mut Vec<Note>) {
    let mut alike: BTreeMap<Vec<char>, Vec<&str>> = BTreeMap::new();
    for stratum in &strata.strata {
        let names = alike.entry(plain_letters(&stratum.population)).or_default();
        if names.last() != Some(&stratum.population.as_str()) {
            names.push(&stratum.population);
        }
    }
    for (letters, mut names) in alike {
        names.dedup();
        if names.len() > 1 && !letters.is_empty() {
            notes.push(Note::new(
                "population_names_alike",
                "sheet",
                format!(
                    "{} count as different populations; write one name if they are the same.",
                    spell_out(names)
                ),
            ));
        }
    }
}

#[cfg(test)]
pub(super) mod tests {
    use proptest::prelude::*;

    use super::*;

    /// A row of an invented sheet.
    pub(in super::super) fn row(
        sample: &str,
        population: &str,
        visit: &str,
        year: f64,
    ) -> SheetRow {
        SheetRow {
            row: 2,
            sample: sample.into(),
            population: population.into(),
            year,
            visit: visit.into(),
            sex: None,
            generation: None,
            replicate_of: None,
            batch: None,
            used: true,
        }
    }

    fn names(strata: &Strata) -> Vec<&str> {
        strata.strata.iter().map(|s| s.name.as_str()).collect()
    }

    #[test]
    fn strata_stand_in_order_of_population_year_and_visit() {
        let rows = [
            row("b1", "Birch", "late", 2019.0),
            row("a3", "Alder", "late", 2020.0),
            row("a1", "Alder", "zero", 2003.0),
            row("a2", "Alder", "late", 2018.0),
            row("a4", "Alder", "zero", 2003.0),
        ];
        let strata = strata_of(&rows).strata;
        assert_eq!(names(&strata), ["Alder@zero", "Alder@late", "Birch@late"]);
        assert_eq!(strata.strata[1].year, 2019.0);
        let samples: Vec<&str> = strata
            .individuals
            .iter()
            .map(|i| i.sample.as_str())
            .collect();
        assert_eq!(samples, ["a1", "a4", "a3", "a2", "b1"]);
        assert_eq!(strata.strata[1].slots, 2..4);
        assert_eq!(strata.individuals[3].stratum, 1);
    }

    #[test]
    fn replicates_stay_out_and_are_listed() {
        let mut copy = row("a1b", "Alder", "2003", 2003.0);
        copy.replicate_of = Some("a1".into());
        let stratified = strata_of(&[row("a1", "Alder", "2003", 2003.0), copy]);
        assert_eq!(stratified.strata.individuals.len(), 1);
        assert_eq!(stratified.replicates[0].of, "a1");
    }

    #[test]
    fn generations_need_every_individual_and_order_strata_of_one_year() {
        let mut young = row("a1", "Alder", "fry", 2003.0);
        young.generation = Some(1.0);
        let mut old = row("a2", "Alder", "spawners", 2003.0);
        old.generation = Some(0.0);
        let rows = [young, old];
        assert_eq!(
            names(&strata_of(&rows).strata),
            ["Alder@spawners", "Alder@fry"]
        );
        let mut more = rows.to_vec();
        more.push(row("a3", "Alder", "fry", 2003.0));
        let stratified = strata_of(&more);
        assert_eq!(stratified.strata.strata[0].generation, None);
        assert_eq!(stratified.notes[0].code, "generation_incomplete");
    }

    #[test]
    fn names_that_differ_in_case_alone_are_noted() {
        let notes = strata_of(&[
            row("a1", "Alder Beck", "1", 1.0),
            row("a2", "alder-beck", "1", 1.0),
        ])
        .notes;
        assert_eq!(notes[0].code, "population_names_alike");
    }

    prop_compose! {
        fn some_row()(
            population in 0..3u8, visit in 0..3u8, year in 1990..2020i32, tenth in 0..10i32,
            generation in proptest::option::of(0..4u8), replicate in 0..6u8,
        ) -> SheetRow {
            let mut row = row("", &format!("P{population}"), &format!("V{visit}"),
                f64::from(year) + f64::from(tenth) / 10.0);
            row.generation = generation.map(f64::from);
            row.replicate_of = (replicate == 0).then(|| "x".to_string());
            row
        }
    }

    proptest! {
        /// The order of rows changes no stratum, and no individual is lost or counted twice.
        #[test]
        fn order_of_rows_changes_no_stratum(
            (rows, shuffled) in proptest::collection::vec(some_row(), 1..40).prop_map(|mut rows| {
                for (i, row) in rows.iter_mut().enumerate() {
                    row.sample = format!("s{i}");
                }
                rows
            }).prop_flat_map(|rows| (Just(rows.clone()), Just(rows).prop_shuffle()))
        ) {
            let (a, b) = (strata_of(&rows), strata_of(&shuffled));
            prop_assert_eq!(&a.strata.strata, &b.strata.strata);
            let sorted = |s: &Stratified| {
                let mut all: Vec<(usize, String)> =
                    s.strata.individuals.iter().map(|i| (i.stratum, i.sample.clone())).collect();
                all.sort();
                all
            };
            prop_assert_eq!(sorted(&a), sorted(&b));
            prop_assert_eq!(a.strata.individuals.len() + a.replicates.len(), rows.len());
            for (index, stratum) in a.strata.strata.iter().enumerate() {
                prop_assert!(!stratum.slots.is_empty());
                for slot in stratum.slots.clone() {
                    prop_assert_eq!(a.strata.individuals[slot].stratum, index);
                }
            }
        }
    }
}
