use super::*;

const SOUND: &str = r#"
[[chromosome]]
name = "c1"
length_bp = 1_000_000

[[loci]]
count = 10

[[population]]
name = "Wick"
size = 20

[[visit]]
generation = 0
individuals = 10
"#;

fn read(text: &str) -> Result<Scenario> {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("scenario.toml");
    std::fs::write(&path, text).unwrap();
    read_scenario(&path)
}

fn told(text: &str) -> Vec<Problem> {
    match read(text) {
        Err(error @ Error::Sheet { .. }) => {
            assert_eq!(error.exit_code(), 2);
            match error {
                Error::Sheet { problems, .. } => problems,
                _ => unreachable!(),
            }
        }
        other => panic!("{other:?}"),
    }
}

#[test]
fn a_short_scenario_has_defaults() {
    let scenario = read(SOUND).unwrap();
    assert_eq!(scenario.seed, 1);
    assert_eq!(scenario.settling_generations, 1);
    assert_eq!(scenario.genotyping, Genotyping::default());
    // The defaults written out are the same scenario.
    let again: Scenario = toml::from_str(&toml::to_string(&scenario).unwrap()).unwrap();
    assert_eq!(again, scenario);
}

#[test]
fn an_unknown_key_is_found_at_its_row() {
    let problems = told(&SOUND.replace("size = 20", "size = 20\nsise = 3"));
    assert_eq!(problems[0].row, Some(12));
    assert!(problems[0].what.contains("sise"), "{problems:?}");
    let problems = told(&SOUND.replace("size = 20", "size = -20"));
    assert_eq!(problems[0].row, Some(11));
    assert!(matches!(
        read_scenario(Path::new("no/such.toml")),
        Err(Error::Io { .. })
    ));
}

/// Every problem is told at once, with its key.
#[test]
fn all_problems_are_told_at_once() {
    let text = SOUND
        .replace(
            "length_bp = 1_000_000",
            "length_bp = 1_000_000\nunlinked = true\nmap_length_cm = nan",
        )
        .replace(
            "count = 10",
            "count = 10\nfrequencies = { list = [0.5, 0.4] }",
        )
        .replace("size = 20", "size = 20\nsizes = [5]\nfemale_share = 1.0");
    let whats: Vec<String> = told(&text).into_iter().map(|p| p.what).collect();
    for key in [
        "map_length_cm",
        "unlinked",
        "frequencies",
        "sizes",
        "female_share",
    ] {
        assert!(
            whats.iter().any(|w| w.contains(key)),
            "{key} not in {whats:?}"
        );
    }
}

/// One wrong thing a row, and a word that its problem must hold.
#[test]
fn each_wrong_number_is_refused() {
    for (sound, wrong, word) in [
        ("name = \"c1\"", "name = \"c 1\"", "chromosome[1].name"),
        ("length_bp = 1_000_000", "length_bp = 10", "length_bp"),
        (
            "length_bp = 1_000_000",
            "length_bp = 600_000_000",
            "length_bp",
        ),
        (
            "length_bp = 1_000_000",
            "length_bp = 1_000_000\ncopies = 0",
            "copies",
        ),
        ("count = 10", "count = 0", "count"),
        ("count = 10", "count = 999_000", "bases"),
        ("count = 10", "count = 10\nalleles = 65", "alleles"),
        (
            "count = 10",
            "count = 10\nalleles = 3\nfrequencies = { beta = [1.0, 1.0] }",
            "beta",
        ),
        (
            "count = 10",
            "count = 10\nfrequencies = { minor = [0.4, 0.6] }",
            "minor",
        ),
        ("count = 10", "count = 10\nchromosomes = [\"c9\"]", "c9"),
        ("size = 20", "size = 1", "size"),
        ("size = 20", "", "`sizes`"),
        (
            "size = 20",
            "size = 20\nfamily_variance = 40",
            "family_variance",
        ),
        (
            "size = 20",
            "size = 20\nfamily_variance = -0.1",
            "family_variance",
        ),
        ("size = 20", "size = 20\nstarts_at = 1", "starts"),
        ("name = \"Wick\"", "name = \"@\"", "population[1].name"),
        ("individuals = 10", "individuals = 0", "individuals"),
        (
            "individuals = 10",
            "individuals = 21\nplan = \"I\"",
            "samples 21 of 20",
        ),
        (
            "individuals = 10",
            "individuals = 10\nreplicates = 11",
            "replicates",
        ),
        (
            "individuals = 10",
            "individuals = 10\nrecaptured = 1",
            "recaptured",
        ),
        (
            "individuals = 10",
            "individuals = 10\nfull_sib_families = 4",
            "siblings",
        ),
        (
            "individuals = 10",
            "individuals = 10\npopulations = [\"Wack\"]",
            "Wack",
        ),
        (
            "individuals = 10",
            "individuals = 10\nlabel = \"a@b\"",
            "label",
        ),
        ("generation = 0", "generation = 200_000", "generation"),
        (
            "individuals = 10",
            "individuals = 10\n[[visit]]\ngeneration = 0\nindividuals = 3",
            "twice",
        ),
        (
            "individuals = 10",
            "individuals = 10\n[genotyping]\nfields = [\"GQ\"]",
            "depth",
        ),
        (
            "individuals = 10",
            "individuals = 10\n[genotyping]\nmissing_rate = 1.0",
            "missing_rate",
        ),
        (
            "individuals = 10",
            "individuals = 10\n[[migration]]\nfrom = \"Wick\"\nto = \"Wock\"\nrate = 0.1",
            "Wock",
        ),
        (
            "individuals = 10",
            "individuals = 10\n[[release]]\nfrom = \"Wick\"\nto = \"Wick\"\ngeneration = 0\nnumber = 1",
            "itself",
        ),
    ] {
        let problems = told(&SOUND.replace(sound, wrong));
        assert!(
            problems
                .iter()
                .any(|p| p.what.contains(word) && !p.cure.is_empty()),
            "{wrong}: {problems:?}"
        );
    }
}

/// Numbers at the edge of what is allowed run without a panic.
#[test]
fn the_smallest_populations_run() {
    for mating in ["random", "pairs", "selfing"] {
        for settling in [0, 3] {
            let text = format!(
                "mating = \"{mating}\"\nsettling_generations = {settling}\n{}",
                SOUND
                    .replace(
                        "size = 20",
                        "size = 2\nfamily_variance = 3.9\nfemale_share = 0.001"
                    )
                    .replace(
                        "individuals = 10",
                        "individuals = 1\n[[visit]]\ngeneration = 9\nindividuals = 3"
                    )
                    .replace(
                        "length_bp = 1_000_000",
                        "length_bp = 1000\nmap_length_cm = 0"
                    )
            );
            let scenario = read(&text).unwrap();
            let simulation = super::super::simulate(&scenario, 3).unwrap();
            assert_eq!((simulation.loci.len(), simulation.samples.len()), (10, 4));
        }
    }
}
