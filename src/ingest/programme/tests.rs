//! Programme files right and wrong on purpose.

use proptest::prelude::*;

use super::*;

fn problems(text: &str) -> Vec<String> {
    let problems = parse_programme(text.as_bytes()).unwrap_err();
    problems
        .iter()
        .map(|p| format!("{}: {} ({})", p.row.unwrap_or(0), p.what, p.cure))
        .collect()
}

#[test]
fn every_key_is_read_and_populations_overrule() {
    let text = r#"
        baseline = 1995
        generation_years = 4.5
        census = 800
        sampling_plan = "I"
        chromosomes = 29
        map_length_cm = 2900
        breeding_males = 40
        breeding_females = 60
        family_sizes = [0, 2, 3, 1]
        [life_history]
        age_at_maturity = 3
        adult_life_span = 6
        fecundity_cv = 0.4
        [population."Alder Brook"]
        census = 120
        baseline = "founding"
        sampling_plan = 2
        life_history = { age_at_maturity = 2, adult_life_span = 5 }
    "#;
    let programme = parse_programme(text.as_bytes()).unwrap();
    let expected = PopulationSettings {
        baseline: Some("1995".into()),
        generation_years: Some(4.5),
        census: Some(800.0),
        plan: Some(SamplingPlan::One),
        chromosomes: Some(29),
        map_length_cm: Some(2900.0),
        life_history: Some(LifeHistory {
            maturity: 3.0,
            adult_life_span: 6.0,
            fecundity_cv: Some(0.4),
        }),
        breeders: Some((40.0, 60.0)),
        family_sizes: vec![0, 2, 3, 1],
    };
    assert_eq!(programme.all, expected);
    let alder = programme.settings("Alder Brook");
    assert_eq!(
        (alder.census, alder.plan),
        (Some(120.0), Some(SamplingPlan::Two))
    );
    assert_eq!(alder.baseline.as_deref(), Some("founding"));
    assert_eq!(alder.life_history.unwrap().maturity, 2.0);
    assert_eq!(alder.generation_years, Some(4.5));
}

#[test]
fn an_empty_file_says_nothing() {
    assert_eq!(parse_programme(b"").unwrap(), Programme::default());
    assert_eq!(
        parse_programme("\u{feff}# nothing yet\r\n".as_bytes())
            .unwrap()
            .all
            .census,
        None
    );
}

#[test]
fn all_problems_are_told_at_once_with_lines_and_cures() {
    let text = "generation_year = 4\n\
                census = 1\n\
                sampling_plan = 3\n\
                chromosomes = 29.5\n\
                breeding_males = 10\n\
                family_sizes = [1, -2]\n\
                baseline = true\n\
                [life_history]\n\
                age_at_maturity = \"3\"\n\
                longevity = 9\n\
                [population.\"Al@der\"]\n\
                censis = 40\n\
                generation_years = inf\n\
                [population.Birch]\n\
                life_history = 1\n";
    let told = problems(text);
    let expected = [
        "1: unknown key 'generation_year' (did you mean 'generation_years'?)",
        "2: census is not a number of 2 or more",
        "3: sampling_plan is neither 1 nor 2",
        "4: chromosomes is not a whole number",
        "5: breeders of one sex only",
        "6: family_sizes is not a list",
        "7: baseline is no label or year",
        "8: life_history has no adult_life_span",
        "9: age_at_maturity is not a number above 0",
        "10: unknown key 'longevity' of life_history (the keys are age_at_maturity",
        "11: population 'Al@der' holds '@'",
        "12: unknown key 'censis' of population 'Al@der' (did you mean 'census'?)",
        "13: generation_years is not a number above 0",
        "15: life_history is not a table",
    ];
    assert_eq!(told.len(), expected.len(), "{told:#?}");
    for (told, expected) in told.iter().zip(expected) {
        assert!(told.starts_with(expected), "{told}\n{expected}");
    }
}

#[test]
fn broken_syntax_is_told_with_its_lines() {
    let told = problems("census = 40\nbaseline = founding\nx = [1,\n");
    assert!(told[0].starts_with("2: this is not TOML"), "{told:?}");
    assert!(told.len() >= 2, "{told:?}");
    assert!(problems("census = 40\ncensus = 50\n")[0].starts_with("2:"));
    assert!(parse_programme(b"a = 1\nb = \"\xFF\"").unwrap_err()[0].row == Some(2));
}

#[test]
fn files_have_digest_and_size() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("programme.toml");
    std::fs::write(&path, "census = 40\n").unwrap();
    let file = read_programme(&path).unwrap();
    assert_eq!((file.bytes, file.digest.len()), (12, 64));
    std::fs::write(&path, "census = many\n").unwrap();
    assert_eq!(read_programme(&path).unwrap_err().exit_code(), 2);
}

proptest! {
    /// Any text gives a programme or problems, never a panic.
    #[test]
    fn any_text_is_read_or_refused(
        pieces in proptest::collection::vec(
            prop_oneof![
                Just("census"), Just(" = "), Just("40"), Just("\n"), Just("["), Just("]"), Just("\""),
                Just("population"), Just("."), Just("life_history"), Just("{"), Just("}"), Just(","),
                Just("-9e999"), Just("99999999999999999999"), Just("0x"), Just("nan"), Just("é"),
            ],
            0..40,
        )
    ) {
        if let Err(problems) = parse_programme(pieces.concat().as_bytes()) {
            prop_assert!(!problems.is_empty());
        }
    }
}
