//! `genewane verdict` from outside: answers, exit codes, the indicator, and what is refused.

mod common;

use std::sync::LazyLock;

use serde_json::Value;

use common::{Case, Run, close, find, run};

/// The report of the demonstration data, made once.
static REPORT: LazyLock<Value> = LazyLock::new(|| common::demo_report("4"));

impl Case {
    fn judge(&self, policy: &str, options: &[&str]) -> Run {
        self.write("policy.toml", policy);
        let (report, policy) = (self.path("report.json"), self.path("policy.toml"));
        let mut arguments = vec!["verdict".into(), report.into_os_string()];
        arguments.extend(["--policy".into(), policy.into_os_string()]);
        arguments.extend(options.iter().map(Into::into));
        run(arguments)
    }

    fn document(&self, policy: &str, options: &[&str]) -> Value {
        let got = self.judge(policy, options);
        assert!(matches!(got.code, Some(0 | 3)), "{}", got.stderr);
        let document: Value = serde_json::from_slice(&got.stdout).expect("a JSON document");
        is_valid(&document);
        document
    }
}

/// Holds a document against the schema that the program prints, by a validator written elsewhere.
fn is_valid(document: &Value) {
    let schema = run(["schema", "verdict"]).json();
    let validator = jsonschema::draft202012::new(&schema).expect("a sound schema");
    if let Err(error) = validator.validate(document) {
        panic!("{error} at {}", error.instance_path());
    }
}

fn rule(text: &str) -> String {
    format!("[[rule]]\n{text}\n")
}

/// The headline size of a population in the report, by the likelihood of all visits.
fn size(population: &str) -> (f64, f64, f64) {
    let all = REPORT["effective_size"].as_array().unwrap();
    let one = all
        .iter()
        .find(|e| e["population"] == population && e["method"] == "temporal_likelihood")
        .expect("the likelihood's entry");
    let end = |i: usize| one["interval"][i].as_f64().unwrap();
    (one["estimate"].as_f64().unwrap(), end(0), end(1))
}

#[test]
fn a_limit_outside_and_inside_the_interval() {
    let case = Case::with_report(&REPORT);
    let (value, low, high) = size("Tarn Osk");
    for (limit, answer, code) in [
        (low - 1.0, "met", 0),
        (value, "cannot_tell", 0),
        (high + 1.0, "breached", 3),
    ] {
        let text =
            format!("measure = \"effective_size\"\nabove = {limit}\npopulations = \"Tarn Osk\"");
        let got = case.judge(&rule(&text), &[]);
        assert_eq!(got.code, Some(code), "{}", got.stderr);
        let document: Value = serde_json::from_slice(&got.stdout).unwrap();
        is_valid(&document);
        assert_eq!(document["answer"], answer);
        let place = &document["rules"][0]["places"][0];
        close("value", place["value"].as_f64().unwrap(), value, 1e-9);
        assert_eq!(place["where"], "Tarn Osk");
        assert!(got.stderr.contains("Tarn Osk"), "{}", got.stderr);
    }
}

#[test]
fn uncertain_counts_as_asked() {
    let case = Case::with_report(&REPORT);
    let (value, ..) = size("Tarn Osk");
    let text = format!("measure = \"effective_size\"\nabove = {value}\npopulations = \"Tarn Osk\"");
    for (how, code) in [("tell", 0), ("met", 0), ("breached", 3)] {
        let got = case.judge(&rule(&text), &["--on-uncertain", how, "--quiet"]);
        assert_eq!(got.code, Some(code), "{how}: {}", got.stderr);
    }
}

#[test]
fn a_rule_that_does_not_bind_is_told_and_not_counted() {
    let case = Case::with_report(&REPORT);
    let text =
        "measure = \"effective_size\"\nabove = 1e6\nbinding = false\npopulations = \"Tarn Osk\"";
    let got = case.judge(&rule(text), &[]);
    assert_eq!(got.code, Some(0), "{}", got.stderr);
    let document: Value = serde_json::from_slice(&got.stdout).unwrap();
    assert_eq!(document["rules"][0]["answer"], "breached");
    assert_eq!(document["answer"], "met");
    assert!(got.stderr.contains("(BREACHED)"), "{}", got.stderr);
}

#[test]
fn measures_are_the_numbers_of_the_report() {
    let case = Case::with_report(&REPORT);
    let policy = [
        "measure = \"heterozygosity_kept\"\nat_least = 0.5",
        "measure = \"inbreeding_per_generation\"\nat_most = 0.5",
        "measure = \"inbreeding_coefficient\"\nat_most = 0.9",
        "measure = \"alleles_probably_lost\"\nat_most = 100000",
        "measure = \"share_probably_lost\"\nat_most = 1",
        "field = \"latest.allelic_richness\"\nat_least = 1",
        "field = \"since_baseline.alleles.not_seen_again\"\nat_most = 100000",
        "field = \"between_populations.fst_hudson\"\nbelow = 1",
        "field = \"loci.polymorphic\"\nat_least = 1",
        "measure = \"share_of_census\"\nat_least = 0.0001",
    ];
    let mut text: String = policy.map(rule).concat();
    text.push_str("[population.\"Tarn Osk\"]\ncensus = 80\n");
    let document = case.document(&text, &[]);
    let of = |rule: usize, place: &str| {
        find(&document["rules"][rule]["places"], "where", place)["value"]
            .as_f64()
            .unwrap()
    };
    let place = "Tarn Osk";
    let since = common::comparison(&REPORT, "Tarn Osk@2004", "Tarn Osk@2020").unwrap();
    let latest = common::stratum(&REPORT, "Tarn Osk@2020");
    let (ne, ..) = size(place);
    let kept = common::estimate(&since["change"], "expected_heterozygosity_kept");
    let lost = since["alleles"]["probably_lost"].as_f64().unwrap();
    let baseline = since["alleles"]["baseline"].as_f64().unwrap();
    for (rule, expected) in [
        (0, kept),
        (1, 0.5 / ne),
        (2, common::estimate(latest, "inbreeding_coefficient")),
        (3, lost),
        (4, lost / baseline),
        (5, common::estimate(latest, "allelic_richness")),
        (6, since["alleles"]["not_seen_again"].as_f64().unwrap()),
        (9, ne / 80.0),
    ] {
        close(&format!("rule {rule}"), of(rule, place), expected, 1e-9);
    }
    let whole = of(8, "report");
    assert_eq!(whole, REPORT["loci"]["polymorphic"].as_f64().unwrap());
    let pairs = document["rules"][7]["places"].as_array().unwrap();
    assert!(!pairs.is_empty());
}

// Arithmetic by the definition of CBD headline indicator A.4: three species whose populations have
// 620, 480, 510, 90; none, 300, 5000; 499.9, 500.0, 500.1. Strictly above 500: 2/4, 1/2, 1/3, mean 4/9.
#[test]
fn the_indicator_by_its_definition() {
    let sizes = [
        (
            "Marsh vole",
            vec![Some(620.0), Some(480.0), Some(510.0), Some(90.0)],
        ),
        ("Ridge hare", vec![None, Some(300.0), Some(5000.0)]),
        ("Tarn char", vec![Some(499.9), Some(500.0), Some(500.1)]),
    ];
    let mut policy =
        rule("measure = \"populations_above\"\nsize = 500\nat_least = 0.4\nby = \"value\"");
    for (species, all) in &sizes {
        for (i, size) in all.iter().enumerate() {
            policy.push_str(&format!(
                "[population.\"{species} {i}\"]\nspecies = \"{species}\"\n"
            ));
            if let Some(size) = size {
                policy.push_str(&format!("effective_size = {size:?}\n"));
            }
        }
    }
    let document = Case::with_report(&REPORT).document(&policy, &["--indicator"]);
    let indicator = &document["indicator"];
    close(
        "mean",
        indicator["mean"].as_f64().unwrap(),
        4.0 / 9.0,
        1e-12,
    );
    for (species, counts) in [
        ("Marsh vole", (2, 4, 4)),
        ("Ridge hare", (1, 2, 3)),
        ("Tarn char", (1, 3, 3)),
    ] {
        let s = find(&indicator["species"], "species", species);
        let got = (&s["above"], &s["assessed"], &s["total"]);
        assert_eq!(
            got,
            (&counts.0.into(), &counts.1.into(), &counts.2.into()),
            "{species}"
        );
    }
    assert_eq!(document["rules"][0]["answer"], "met");
    close(
        "rule",
        document["rules"][0]["places"][0]["value"].as_f64().unwrap(),
        4.0 / 9.0,
        1e-12,
    );
}

// Arithmetic: 0.1 x 5000 = 500 is not above 500; 0.1 x 5001 and 0.1 x 6200 are.
#[test]
fn a_census_at_its_ratio_is_compared_without_rounding() {
    let mut policy = String::from("ratio = 0.1\n");
    policy.push_str(&rule(
        "measure = \"effective_size\"\nabove = 500\npopulations = [\"A\", \"B\", \"C\"]",
    ));
    for (name, census) in [("A", 5000), ("B", 5001), ("C", 6200)] {
        policy.push_str(&format!(
            "[population.{name}]\nspecies = \"Wren\"\ncensus = {census}\n"
        ));
    }
    policy.push_str("[population.D]\nspecies = \"Wren\"\ncensus = 4000\nratio = 0.2\n");
    let document = Case::with_report(&REPORT).document(&policy, &["--indicator"]);
    let places = &document["rules"][0]["places"];
    for (name, answer) in [("A", "breached"), ("B", "met"), ("C", "met")] {
        assert_eq!(find(places, "where", name)["answer"], answer, "{name}");
    }
    let wren = find(&document["indicator"]["species"], "species", "Wren");
    assert_eq!((&wren["above"], &wren["assessed"]), (&3.into(), &4.into()));
    let d = find(&wren["populations"], "population", "D");
    close(
        "at its own ratio",
        d["effective_size"].as_f64().unwrap(),
        800.0,
        1e-9,
    );
    close(
        "at the common ratio",
        d["by_common_ratio"].as_f64().unwrap(),
        400.0,
        1e-9,
    );
}

#[test]
fn the_built_in_policy_prints_and_judges() {
    let printed = run(["verdict", "--write-policy"]);
    assert_eq!(printed.code, Some(0), "{}", printed.stderr);
    let policy = String::from_utf8(printed.stdout).unwrap();
    assert!(policy.contains("Franklin (1980)") && policy.contains("A.4"));
    let case = Case::with_report(&REPORT);
    let own = case.document(&policy, &[]);
    let report = case.path("report.json");
    let built_in = run(["verdict".as_ref(), report.as_os_str(), "--quiet".as_ref()]);
    // Tarn Osk is known to be far below 50: its scenario has 25 animals.
    assert_eq!(built_in.code, Some(3), "{}", built_in.stderr);
    let built_in: Value = serde_json::from_slice(&built_in.stdout).unwrap();
    assert_eq!(built_in["rules"], own["rules"]);
    assert_eq!(own["answer"], "breached");
    assert_eq!(own["cautions"], REPORT["cautions"]);
}

#[test]
fn a_policy_with_problems_is_told_whole() {
    let case = Case::with_report(&REPORT);
    let policy = "[[rule]]\nfield = \"latest.alelic_richness\"\nat_least = 2\n\
        [[rule]]\nfield = \"since_baseline.expected_heterozygosity_kept\"\nat_least = 0.9\n\
        [[rule]]\nmeasure = \"effective_size\"\nabove = 5\npopulations = \"Tarn Oks\"\n";
    let got = case.judge(policy, &["-o", &case.path("v.json").to_string_lossy()]);
    assert_eq!(got.code, Some(2), "{}", got.stderr);
    for part in [
        "row 1",
        "'latest.allelic_richness'",
        "row 4",
        "'since_baseline.change.expected_heterozygosity_kept'",
        "row 7",
        "'Tarn Osk'",
    ] {
        assert!(got.stderr.contains(part), "no {part} in\n{}", got.stderr);
    }
    assert!(!case.path("v.json").exists());
}

#[test]
fn a_report_that_cannot_be_trusted_is_refused() {
    let case = Case::with_report(&REPORT);
    let policy = rule("measure = \"effective_size\"\nabove = 5");
    let sound = REPORT.to_string();
    for (text, part) in [
        (sound[..sound.len() / 2].to_string(), "cure"),
        ("[]".to_string(), "cure"),
        (
            sound.replacen("genewane-report", "some-report", 1),
            "format",
        ),
        (
            sound.replacen("\"format_version\":1", "\"format_version\":7", 1),
            "7",
        ),
        (sound.replacen("{", "{\"extra\":1,", 1), "extra"),
    ] {
        case.write("report.json", &text);
        let got = case.judge(&policy, &[]);
        assert_eq!(got.code, Some(1), "{part}: {}", got.stderr);
        assert!(
            got.stderr.contains(part) && !got.stderr.contains("panicked"),
            "{}",
            got.stderr
        );
        assert!(got.stdout.is_empty());
    }
    let absent = run(["verdict", "no-such-report.json"]);
    assert_eq!(absent.code, Some(1), "{}", absent.stderr);
}

#[test]
fn a_report_from_standard_input() {
    let bytes = REPORT.to_string().into_bytes();
    let got = common::run_with_stdin(["verdict", "-", "--quiet"], bytes);
    assert_eq!(got.code, Some(3), "{}", got.stderr);
    assert!(got.stderr.contains("breached"));
}
