//! Comparisons of invented sheets.

use super::*;
use crate::model::strata::tests::row;
use crate::model::{SheetRow, strata_of};
use ComparisonKind::{BetweenPopulations, BetweenVisits, SinceBaseline};
use proptest::prelude::*;

fn sheet(places: &[(&str, &str, f64)]) -> Vec<SheetRow> {
    places
        .iter()
        .map(|(p, visit, year)| row(&format!("{p}{visit}"), p, visit, *year))
        .collect()
}

fn programme(settings: PopulationSettings) -> Programme {
    Programme {
        all: settings,
        ..Default::default()
    }
}

fn every_four_years() -> PopulationSettings {
    PopulationSettings {
        generation_years: Some(4.0),
        ..Default::default()
    }
}

fn told(rows: &[SheetRow], settings: PopulationSettings) -> (Vec<String>, Vec<&'static str>) {
    let strata = strata_of(rows).strata;
    let compared = comparisons(&strata, &programme(settings)).unwrap();
    let pairs = compared.comparisons.iter().map(|c| {
        let t = c.generations.map_or("-".to_string(), |t| t.to_string());
        let [from, to] = [c.from, c.to].map(|i| &strata.strata[i].name);
        format!("{:?} {from} {to} {t}", c.kind)
    });
    (
        pairs.collect(),
        compared.notes.iter().map(|note| note.code).collect(),
    )
}

const THREE_VISITS: [(&str, &str, f64); 3] = [
    ("Alder", "2003", 2003.0),
    ("Alder", "2011", 2011.0),
    ("Alder", "2021", 2021.0),
];

#[test]
fn the_earliest_visit_is_the_baseline_by_default() {
    let (pairs, notes) = told(&sheet(&THREE_VISITS), every_four_years());
    assert_eq!(
        pairs,
        [
            "SinceBaseline Alder@2003 Alder@2011 2",
            "SinceBaseline Alder@2003 Alder@2021 4.5",
            "BetweenVisits Alder@2011 Alder@2021 2.5",
        ]
    );
    assert!(notes.is_empty());
}

#[test]
fn visits_before_the_baseline_are_compared_from_visit_to_visit() {
    let settings = PopulationSettings {
        baseline: Some("2011".to_string()),
        ..every_four_years()
    };
    let (pairs, notes) = told(&sheet(&THREE_VISITS), settings);
    assert_eq!(
        pairs,
        [
            "SinceBaseline Alder@2011 Alder@2021 2.5",
            "BetweenVisits Alder@2003 Alder@2011 2"
        ]
    );
    assert_eq!(notes, ["visits_before_baseline"]);
}

#[test]
fn a_baseline_is_a_label_or_a_year() {
    let rows = sheet(&[("Alder", "Founding", 2003.25), ("Alder", "latest", 2021.5)]);
    for written in ["Founding", "founding", "2003", "2003.25", " 2003 "] {
        let settings = PopulationSettings {
            baseline: Some(written.to_string()),
            ..every_four_years()
        };
        let (pairs, _) = told(&rows, settings);
        assert!(
            pairs[0].contains("@Founding Alder@latest"),
            "{written}: {pairs:?}"
        );
    }
}

#[test]
fn an_unknown_or_ambiguous_baseline_lists_the_visits_of_each_population() {
    let mut rows = sheet(&THREE_VISITS);
    rows.extend(sheet(&[
        ("Birch", "spring", 2003.2),
        ("Birch", "autumn", 2003.8),
    ]));
    rows.extend(sheet(&[("Cedar", "2019", 2019.0)]));
    let strata = strata_of(&rows).strata;
    let of = |baseline: &str| {
        let settings = PopulationSettings {
            baseline: Some(baseline.to_string()),
            ..every_four_years()
        };
        comparisons(&strata, &programme(settings)).unwrap_err()
    };
    let problems = of("1999");
    assert_eq!(
        problems.len(),
        2,
        "a single visit needs no baseline: {problems:?}"
    );
    assert!(
        problems[0].cure.contains("'2003', '2011', '2021'"),
        "{problems:?}"
    );
    let problems = of("2003");
    assert_eq!(problems.len(), 1);
    assert!(
        problems[0].what.contains("more than one visit"),
        "{problems:?}"
    );
}

#[test]
fn generations_of_the_sheet_win_over_years() {
    let mut rows = sheet(&THREE_VISITS);
    rows[0].generation = Some(1.0);
    rows[2].generation = Some(4.0);
    let (pairs, _) = told(&rows, every_four_years());
    assert_eq!(
        pairs,
        [
            "SinceBaseline Alder@2003 Alder@2011 2",
            "SinceBaseline Alder@2003 Alder@2021 3",
            "BetweenVisits Alder@2011 Alder@2021 2.5",
        ]
    );
}

#[test]
fn generations_must_not_fall_while_years_rise() {
    let mut rows = sheet(&THREE_VISITS);
    rows[0].generation = Some(3.0);
    rows[2].generation = Some(1.0);
    let problems = comparisons(&strata_of(&rows).strata, &Programme::default()).unwrap_err();
    assert!(problems[0].what.contains("is generation 3"), "{problems:?}");
}

#[test]
fn what_lacks_a_length_or_a_distance_has_no_generations_and_a_note() {
    let (pairs, notes) = told(&sheet(&THREE_VISITS), PopulationSettings::default());
    assert!(pairs.iter().all(|pair| pair.ends_with(" -")), "{pairs:?}");
    assert_eq!(notes, ["generation_length_missing"]);
    let rows = sheet(&[("Alder", "adults", 2003.0), ("Alder", "young", 2003.0)]);
    let (pairs, notes) = told(&rows, every_four_years());
    assert_eq!(pairs, ["SinceBaseline Alder@adults Alder@young -"]);
    assert_eq!(notes, ["same_time"]);
    let rows = sheet(&[("Alder", "2003", 2003.0), ("Alder", "2004", 2004.0)]);
    assert_eq!(
        told(&rows, every_four_years()).1,
        ["less_than_a_generation"]
    );
}

#[test]
fn populations_are_compared_at_visits_of_one_label() {
    let rows = sheet(&[
        ("Alder", "2003", 2003.0),
        ("Birch", "2003", 2003.0),
        ("Birch", "2010", 2010.0),
        ("Cedar", "2003", 2003.0),
    ]);
    let (pairs, _) = told(&rows, every_four_years());
    assert_eq!(
        pairs,
        [
            "SinceBaseline Birch@2003 Birch@2010 1.75",
            "BetweenPopulations Alder@2003 Birch@2003 -",
            "BetweenPopulations Alder@2003 Cedar@2003 -",
            "BetweenPopulations Birch@2003 Cedar@2003 -",
        ]
    );
    let (_, notes) = told(
        &sheet(&[("Alder", "1", 2003.0), ("Birch", "2", 2004.0)]),
        every_four_years(),
    );
    assert_eq!(notes, ["no_common_visit"]);
}

#[test]
fn plan_one_needs_a_census_and_the_census_is_held_against_the_sample() {
    let rows = sheet(&THREE_VISITS);
    let strata = strata_of(&rows).strata;
    let one = PopulationSettings {
        plan: Some(SamplingPlan::One),
        ..every_four_years()
    };
    let problems = comparisons(&strata, &programme(one.clone())).unwrap_err();
    assert!(problems[0].what.contains("needs a census"), "{problems:?}");
    assert!(
        told(
            &rows,
            PopulationSettings {
                census: Some(9.0),
                ..one
            }
        )
        .1
        .is_empty()
    );
    for (census, code) in [(0.5, "census_below_sample"), (4.0, "sample_large_share")] {
        let settings = PopulationSettings {
            census: Some(census),
            ..every_four_years()
        };
        assert_eq!(told(&rows, settings).1, [code]);
    }
}

#[test]
fn settings_of_a_population_that_was_not_sampled_are_noted() {
    let mut programme = programme(every_four_years());
    programme
        .by_population
        .insert("Aldre".to_string(), PopulationSettings::default());
    let compared = comparisons(&strata_of(&sheet(&THREE_VISITS)).strata, &programme).unwrap();
    assert_eq!(compared.notes[0].code, "population_not_sampled");
    assert!(
        compared.notes[0].text.contains("Is 'Alder' meant?"),
        "{:?}",
        compared.notes
    );
}

proptest! {
    /// Each later visit is met once since the baseline; with those between visits every two
    /// neighbours are met; no comparison crosses populations in time or stays within one.
    #[test]
    fn every_visit_is_compared(
        visits in proptest::collection::btree_set((0..3u8, 2000..2010i32), 1..15),
        shift in any::<prop::sample::Index>(),
    ) {
        let rows: Vec<SheetRow> = visits.iter().map(|(p, year)| {
            row(&format!("{p}-{year}"), &format!("P{p}"), &year.to_string(), f64::from(*year))
        }).collect();
        let strata = strata_of(&rows).strata;
        let mut programme = programme(every_four_years());
        let chosen = &strata.strata[shift.index(strata.strata.len())];
        programme.by_population.insert(chosen.population.clone(), PopulationSettings {
            baseline: Some(chosen.visit.clone()), ..Default::default()
        });
        let compared = comparisons(&strata, &programme).unwrap();
        for (index, stratum) in strata.strata.iter().enumerate() {
            let baseline = compared.baselines[&stratum.population];
            let since: Vec<_> = compared.comparisons.iter()
                .filter(|c| c.kind == SinceBaseline && c.to == index).collect();
            prop_assert_eq!(since.len(), usize::from(index > baseline));
            let next = index + 1;
            if strata.strata.get(next).is_some_and(|s| s.population == stratum.population) {
                let met = compared.comparisons.iter().filter(|c| (c.from, c.to) == (index, next));
                prop_assert_eq!(met.count(), 1);
            }
        }
        for c in &compared.comparisons {
            let [from, to] = [c.from, c.to].map(|i| &strata.strata[i]);
            prop_assert!(c.from < c.to);
            prop_assert_eq!(c.kind == BetweenPopulations, from.population != to.population);
            prop_assert_eq!(c.kind == BetweenPopulations, c.generations.is_none());
            prop_assert!(c.kind != BetweenVisits || compared.baselines[&from.population] != c.from);
        }
    }
}
