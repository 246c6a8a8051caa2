//! `genewane forecast` from outside: numbers against closed forms, bands, scenarios, refusals.

mod common;

use std::sync::LazyLock;

use serde_json::Value;

use common::{Case, Run, close, find, fixture, run};

/// The report of the demonstration data, made once.
static REPORT: LazyLock<Value> = LazyLock::new(|| common::demo_report("2"));

impl Case {
    /// Runs on the report; options that name a file of this case start with `@`.
    fn run(&self, options: &[&str]) -> Run {
        let mut arguments = vec!["forecast".into(), self.path("report.json").into_os_string()];
        arguments.extend(options.iter().map(|o| match o.strip_prefix('@') {
            Some(name) => self.path(name).into_os_string(),
            None => o.into(),
        }));
        run(arguments)
    }

    fn document(&self, options: &[&str]) -> Value {
        let document = self.run(options).json();
        let schema = run(["schema", "forecast"]).json();
        let validator = jsonschema::draft202012::new(&schema).expect("a sound schema");
        if let Err(error) = validator.validate(&document) {
            panic!("{error} at {}", error.instance_path());
        }
        document
    }

    #[track_caller]
    fn refused(&self, code: i32, options: &[&str], parts: &[&str]) {
        let got = self.run(options);
        assert_eq!(got.code, Some(code), "{}", got.stderr);
        assert!(
            got.stdout.is_empty() && !got.stderr.contains("panicked"),
            "{}",
            got.stderr
        );
        for part in parts {
            assert!(got.stderr.contains(part), "no {part:?} in:\n{}", got.stderr);
        }
    }
}

fn scenario<'a>(document: &'a Value, population: &str, name: &str) -> &'a Value {
    let population = find(&document["populations"], "population", population);
    find(&population["scenarios"], "scenario", name)
}

fn last(scenario: &Value) -> &Value {
    scenario["steps"].as_array().unwrap().last().unwrap()
}

fn median(step: &Value, field: &str) -> f64 {
    step[field]["median"]
        .as_f64()
        .unwrap_or_else(|| panic!("{field}: {step}"))
}

// Wright (1931): (1 - 1/(2Ne))^t of today's heterozygosity, by hand with Ne = 50 and t = 10; and
// 1 - that for inbreeding: 0.9043820750, 0.0956179250.
#[test]
fn a_given_size_gives_the_closed_form() {
    let case = Case::with_report(&REPORT);
    case.write(
        "s.toml",
        "[[scenario]]\nname = \"fifty\"\neffective_size = 50\n",
    );
    let document = case.document(&["--scenarios", "@s.toml", "--generations", "10", "--quiet"]);
    for population in ["Quillmere", "Tarn Osk"] {
        let stratum = common::stratum(&REPORT, &format!("{population}@2020"));
        let now = common::estimate(stratum, "expected_heterozygosity");
        let steps = scenario(&document, population, "fifty");
        let end = last(steps);
        assert_eq!(
            (&end["generation"], &end["year"]),
            (&10.into(), &2040.0.into())
        );
        close(
            "He",
            median(end, "expected_heterozygosity"),
            now * 0.9043820750088044,
            0.02 * now,
        );
        close("F", median(end, "inbreeding"), 0.0956179249911956, 1e-12);
        close(
            "today",
            median(&steps["steps"][0], "expected_heterozygosity"),
            now,
            0.01 * now,
        );
        let band = &end["expected_heterozygosity"];
        let of = |range: &str, i: usize| band[range][i].as_f64().unwrap();
        assert!(
            of("central_95", 0) < of("central_50", 0) && of("central_50", 0) < of("central_50", 1)
        );
        assert!(of("central_50", 1) < of("central_95", 1));
        // Alleles only go.
        let left: Vec<f64> = steps["steps"]
            .as_array()
            .unwrap()
            .iter()
            .map(|s| median(s, "alleles_left"))
            .collect();
        assert!(left.windows(2).all(|w| w[1] <= w[0]), "{left:?}");
        assert_eq!(
            left[0],
            find(&document["populations"], "population", population)["alleles"]
                .as_f64()
                .unwrap()
        );
    }
    assert_eq!(document["cautions"], REPORT["cautions"]);
}

// Soule, Gilpin, Conway & Foose (1986) as arithmetic: 90 % over 100 years of two-year generations, 50
// of them: 1/(2(1 - 0.9^(1/50))) = 237.5305; twice the rate, half the time.
#[test]
fn the_size_needed_is_the_closed_form() {
    let document = Case::with_report(&REPORT).document(&["--years", "100", "--quiet"]);
    let population = find(&document["populations"], "population", "Quillmere");
    let needed = find(&population["sizes_needed"], "share_of", "today");
    assert_eq!(
        (&needed["generations"], &needed["years"]),
        (&50.0.into(), &100.0.into())
    );
    let expected = 1.0 / (2.0 * (1.0 - 0.9f64.powf(1.0 / 50.0)));
    close(
        "size",
        needed["effective_size"].as_f64().unwrap(),
        expected,
        1e-9,
    );
    // Tarn Osk has less than 90 % of its baseline left: no size keeps that.
    let osk = find(&document["populations"], "population", "Tarn Osk");
    assert!(osk["kept_since_baseline"].as_f64().unwrap() < 0.9);
    let gone = find(&osk["sizes_needed"], "share_of", "baseline");
    assert!(gone["effective_size"].is_null() && gone["absent_because"].is_string());
    let limit = &scenario(&document, "Tarn Osk", "status quo")["limit"];
    assert!(
        limit["chance_crossed_today"].as_f64().unwrap() > 0.9,
        "{limit}"
    );
}

#[test]
fn the_same_bytes_for_any_threads_and_other_ones_for_another_seed() {
    let case = Case::with_report(&REPORT);
    case.write("s.toml", "[[scenario]]\nname = \"double\"\ntimes = 2\n");
    let of = |threads: &str, seed: &str| {
        let got = case.run(&[
            "--scenarios",
            "@s.toml",
            "--threads",
            threads,
            "--seed",
            seed,
            "--draws",
            "50",
            "--quiet",
        ]);
        assert_eq!(got.code, Some(0), "{}", got.stderr);
        got.stdout
    };
    let one = of("1", "7");
    assert_eq!(one, of("2", "7"));
    assert_ne!(one, of("1", "8"));
    let document: Value = serde_json::from_slice(&one).unwrap();
    for population in ["Quillmere", "Tarn Osk"] {
        let kept = |name: &str| {
            median(
                last(scenario(&document, population, name)),
                "expected_heterozygosity",
            )
        };
        assert!(kept("double") > kept("status quo"));
    }
}

#[test]
fn newcomers_from_the_other_lake() {
    let case = Case::with_report(&REPORT);
    let text = "[[scenario]]\nname = \"founders\"\npopulations = \"Tarn Osk\"\nrelease = 20\n\
        generation = 2\nfrom = \"Quillmere@2020\"\n\
        [[scenario]]\nname = \"trickle\"\npopulations = [\"Tarn Osk\"]\nmigrants = 2\nfrom = \"Quillmere@2020\"\n";
    case.write("s.toml", text);
    case.write(
        "w.csv",
        "contig,position,allele,copies,gene_copies,source_frequency\nx,1,1,3,60,0.4\n",
    );
    let document = case.document(&[
        "--scenarios",
        "@s.toml",
        "--watch",
        "@w.csv",
        "--generations",
        "8",
        "--quiet",
    ]);
    let kept = |name: &str| {
        median(
            last(scenario(&document, "Tarn Osk", name)),
            "expected_heterozygosity",
        )
    };
    assert!(kept("founders") > kept("status quo") && kept("trickle") > kept("status quo"));
    let open = scenario(&document, "Tarn Osk", "founders");
    assert!(last(open)["alleles_left"].is_null() && !open["notes"].as_array().unwrap().is_empty());
    let lost = |name: &str| {
        let all = scenario(&document, "Tarn Osk", name)["watched"][0]["steps"]
            .as_array()
            .unwrap();
        all.last().unwrap()["lost"].as_f64().unwrap()
    };
    assert!(lost("trickle") < lost("status quo"));
    // Quillmere is in neither scenario.
    let quillmere = find(&document["populations"], "population", "Quillmere");
    assert_eq!(quillmere["scenarios"].as_array().unwrap().len(), 1);
}

// Exact enumeration (matrix of 2N = 100, flat prior replaced by the spectrum's, so only the order is
// told here): the chances add up to 1, and a scarce allele of the report is found as it is written.
#[test]
fn watched_alleles_of_the_report() {
    let case = Case::with_report(&REPORT);
    let scarce = &REPORT["at_risk"][0];
    let cell = |name: &str| scarce[name].to_string().replace('"', "");
    let row = format!(
        "{},{},{},{}",
        cell("contig"),
        cell("position"),
        cell("allele"),
        cell("population")
    );
    case.write(
        "w.csv",
        &format!("contig,position,allele,population\n{row}\n"),
    );
    let document = case.document(&["--watch", "@w.csv", "--years", "40", "--quiet"]);
    let watched = &scenario(&document, &cell("population"), "status quo")["watched"][0];
    assert_eq!(watched["copies"], scarce["copies"]);
    let mut before = 0.0;
    for step in watched["steps"].as_array().unwrap() {
        let of = |name: &str| step[name].as_f64().unwrap();
        close(
            "sum",
            of("lost") + of("still_there") + of("fixed"),
            1.0,
            1e-9,
        );
        assert!(of("lost") >= before);
        before = of("lost");
    }
    assert!(before > 0.2, "{before}");
}

/// Copies of the first alternate allele, and gene copies typed, among samples of the demo: counted in
/// the text of the calls.
fn counted_in_the_text(place: (&str, &str), samples: &[String]) -> (u64, u64) {
    use std::io::Read;
    let packed = std::fs::read(fixture("demo/calls.vcf.gz")).unwrap();
    let mut text = String::new();
    flate2::read::MultiGzDecoder::new(&packed[..])
        .read_to_string(&mut text)
        .unwrap();
    let mut names = Vec::new();
    for line in text.lines() {
        let cells: Vec<&str> = line.split('\t').collect();
        if line.starts_with("#CHROM") {
            names = cells.iter().map(|&c| c.to_owned()).collect();
        }
        if (cells[0], cells.get(1).copied().unwrap_or_default()) != place {
            continue;
        }
        let calls = cells.iter().zip(&names).skip(9);
        let calls = calls.filter(|(_, name)| samples.contains(name));
        let calls = calls.map(|(call, _)| call.split(':').next().unwrap());
        let alleles: Vec<&str> = calls
            .filter(|call| !call.contains('.'))
            .flat_map(|call| call.split(['/', '|']))
            .collect();
        let ones = alleles.iter().filter(|&&a| a == "1").count();
        return (ones as u64, alleles.len() as u64);
    }
    panic!("no record at {place:?}");
}

#[test]
fn a_tally_has_the_copies_of_any_watched_allele() {
    let case = Case::with_report(&REPORT);
    let tally = case.path("demo.parquet");
    let mut arguments = vec![
        "tally".into(),
        fixture("demo/calls.vcf.gz").into_os_string(),
    ];
    arguments.extend([
        "--samples".into(),
        fixture("demo/samples.tsv").into_os_string(),
    ]);
    arguments.extend(["-o".into(), tally.into_os_string(), "--quiet".into()]);
    assert_eq!(run(arguments).code, Some(0));

    let sheet = std::fs::read_to_string(fixture("demo/samples.tsv")).unwrap();
    let mut rows = sheet
        .lines()
        .map(|line| line.split('\t').collect::<Vec<_>>());
    let header = rows.next().unwrap();
    let column = |name: &str| header.iter().position(|&h| h == name).unwrap();
    let latest: Vec<String> = rows
        .filter(|row| row[column("population")] == "Quillmere" && row[column("year")] == "2020")
        .map(|row| row[column("sample")].to_owned())
        .collect();
    assert_eq!(latest.len(), 30);

    // The first locus of the calls whose alternate allele is common there: no report lists it.
    let packed = std::fs::read(fixture("demo/calls.vcf.gz")).unwrap();
    let mut text = String::new();
    std::io::Read::read_to_string(
        &mut flate2::read::MultiGzDecoder::new(&packed[..]),
        &mut text,
    )
    .unwrap();
    let (contig, position, allele, counts) = text
        .lines()
        .filter(|line| !line.starts_with('#'))
        .map(|line| line.split('\t').take(5).collect::<Vec<_>>())
        .filter(|cells| !cells[4].contains(','))
        .map(|cells| {
            let counts = counted_in_the_text((cells[0], cells[1]), &latest);
            (
                cells[0].to_owned(),
                cells[1].to_owned(),
                cells[4].to_owned(),
                counts,
            )
        })
        .find(|(.., (ones, all))| 3 * ones > *all && 3 * ones < 2 * all)
        .unwrap();
    let list =
        format!("contig,position,allele,population\n{contig},{position},{allele},Quillmere\n");
    case.write("w.csv", &list);
    case.refused(2, &["--watch", "@w.csv"], &["row 2", "--tally"]);
    let options = [
        "--watch",
        "@w.csv",
        "--tally",
        "@demo.parquet",
        "--years",
        "40",
        "--quiet",
    ];
    let document = case.document(&options);
    let watched = &scenario(&document, "Quillmere", "status quo")["watched"][0];
    assert_eq!(watched["copies"], counts.0);
    assert_eq!(watched["gene_copies"], counts.1);
    let inputs = document["provenance"]["inputs"].as_array().unwrap();
    assert!(inputs.iter().any(|input| input["role"] == "tally"));

    case.refused(
        1,
        &["--watch", "@w.csv", "--tally", "@report.json"],
        &["report.json", "genewane tally"],
    );
    let mut arguments = vec![
        "forecast".into(),
        case.path("demo.parquet").into_os_string(),
    ];
    arguments.push("--quiet".into());
    let got = run(arguments);
    assert_eq!(got.code, Some(1));
    assert!(got.stderr.contains("this is a tally"), "{}", got.stderr);
}

#[test]
fn bad_input_is_told_with_its_place() {
    let case = Case::with_report(&REPORT);
    case.write(
        "s.toml",
        "[[scenario]]\nname = \"x\"\neffective_size = 90\ncensus = 40\n",
    );
    case.refused(
        2,
        &["--scenarios", "@s.toml"],
        &["row 1", "90", "twice the census"],
    );
    case.write(
        "s.toml",
        "[[scenario]]\nname = \"x\"\npopulations = \"Tarn Oks\"\ntimes = 2\n",
    );
    case.refused(
        2,
        &["--scenarios", "@s.toml"],
        &["'Tarn Oks'", "'Tarn Osk'"],
    );
    case.write("s.toml", "[[scenario]]\nname = \"x\"\nmigrants = 2\nfrom = \"Quilmere@2020\"\npopulations = \"Tarn Osk\"\n");
    case.refused(
        2,
        &["--scenarios", "@s.toml"],
        &["'Quilmere@2020'", "'Quillmere@2020'"],
    );
    case.write("w.csv", "contig,position,allele\nnowhere,3,1\n");
    case.refused(
        2,
        &["--watch", "@w.csv"],
        &["row 2", "nowhere:3", "copies and gene_copies"],
    );
    let lost = &REPORT["losses"][0];
    let cell = |name: &str| lost[name].to_string().replace('"', "");
    let row = format!(
        "{},{},{},{}",
        cell("contig"),
        cell("position"),
        cell("allele"),
        cell("population")
    );
    case.write(
        "w.csv",
        &format!("contig,position,allele,population\n{row}\n"),
    );
    case.refused(
        2,
        &["--watch", "@w.csv"],
        &["row 2", "not seen at the latest visit"],
    );
    case.refused(2, &["--years", "-5"], &["years"]);
    case.refused(2, &["--years", "1e9"], &["too many"]);
    case.refused(2, &["--keep", "1"], &["0.9 for 90 %"]);
    case.refused(2, &["--scenarios", "@report.json"], &["not TOML"]);
    case.write(
        "report.json",
        "{\"format\":\"genewane-verdict\",\"format_version\":1}",
    );
    case.refused(1, &[], &["genewane-report", "cure"]);
}

#[test]
fn without_a_generation_length_there_are_no_years() {
    let case = Case::with_report(&REPORT);
    // The sheet without its generations.
    let sheet = std::fs::read_to_string(fixture("demo/samples.tsv")).unwrap();
    case.write("samples.tsv", &sheet.replacen("generation", "cohort", 1));
    let calls = fixture("demo/calls.vcf.gz");
    let report = common::measure(&calls, &case.path("samples.tsv"), &["--quiet"]);
    case.write("report.json", &report.to_string());
    case.refused(
        2,
        &["--years", "50"],
        &["--generation-years", "--generations"],
    );
    let document = case.document(&["--quiet", "--draws", "30"]);
    let population = &document["populations"][0];
    assert_eq!(
        (&population["generations"], &population["generation_years"]),
        (&20.into(), &Value::Null)
    );
}
