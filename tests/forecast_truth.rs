//! Forecasts held against simulated populations that went on living: how often the band holds the
//! truth. `cargo test --release --test forecast_truth -- --ignored --nocapture` runs the whole study.

mod common;

use std::path::Path;

use serde_json::Value;

use common::run;

/// Visits at generations 0, 5 and 12; the report knows the first two, the forecast is for the third.
const SCENARIO: &str = r#"
start_year = 2000
settling_generations = 3
[[chromosome]]
name = "c"
length_bp = 50_000_000
copies = 20
[[loci]]
count = LOCI
frequencies = { beta = [0.4, 0.4] }
[[population]]
name = "Alder"
size = ADULTS
[[visit]]
generation = 0
individuals = SAMPLES
[[visit]]
generation = 5
individuals = SAMPLES
[[visit]]
generation = 12
individuals = 2
"#;

/// What a replicate showed.
struct Seen {
    /// The band of expected heterozygosity holds the truth.
    inside: bool,
    /// Median over truth.
    ratio: f64,
}

fn replicate(folder: &Path, adults: u32, samples: u32, loci: u32, seed: u64) -> Seen {
    let scenario = SCENARIO
        .replace("LOCI", &loci.to_string())
        .replace("ADULTS", &adults.to_string())
        .replace("SAMPLES", &samples.to_string());
    let path = folder.join("scenario.toml");
    std::fs::write(&path, scenario).expect("a scratch file");
    let out = folder.join("out");
    let text = |p: &Path| p.to_string_lossy().into_owned();
    let seed = seed.to_string();
    let arguments = [
        "rehearse",
        &text(&path),
        "-o",
        &text(&out),
        "--seed",
        &seed,
        "--quiet",
    ];
    let made = run(arguments);
    assert_eq!(made.code, Some(0), "{}", made.stderr);
    let sheet = std::fs::read_to_string(out.join("samples.tsv")).expect("a sheet");
    let known: Vec<&str> = sheet
        .lines()
        .filter(|line| !line.contains("2012"))
        .collect();
    std::fs::write(folder.join("known.tsv"), known.join("\n") + "\n").expect("a scratch file");
    let report = folder.join("report.json");
    let report_name = text(&report);
    let options = ["--generation-years", "1", "--quiet", "-o", &report_name];
    let measured = common::measure_run(
        &out.join("calls.vcf.gz"),
        &folder.join("known.tsv"),
        &options,
    );
    assert_eq!(measured.code, Some(0), "{}", measured.stderr);
    let forecast = run([
        "forecast",
        &report_name,
        "--generations",
        "7",
        "--draws",
        "300",
        "--quiet",
    ])
    .json();
    let steps = &forecast["populations"][0]["scenarios"][0]["steps"];
    let report: Value = serde_json::from_slice(&std::fs::read(&report).unwrap()).unwrap();
    let truth: Value =
        serde_json::from_slice(&std::fs::read(out.join("truth.json")).unwrap()).unwrap();
    let all = truth["strata"].as_array().unwrap();
    let last = all
        .iter()
        .find(|s| s["generation"] == 12)
        .expect("the last visit");
    // The report's mean is over the loci that vary among the individuals it knows.
    let scale = f64::from(loci) / report["loci"]["polymorphic"].as_f64().unwrap();
    let truth = scale * last["expected_heterozygosity"].as_f64().unwrap();
    let band = &steps.as_array().unwrap().last().unwrap()["expected_heterozygosity"];
    let limit = |i: usize| band["central_95"][i].as_f64().unwrap();
    Seen {
        inside: limit(0) <= truth && truth <= limit(1),
        ratio: band["median"].as_f64().unwrap() / truth,
    }
}

fn study(adults: u32, samples: u32, loci: u32, replicates: u64) -> (f64, f64) {
    let folder = tempfile::tempdir().expect("a scratch folder");
    let seen: Vec<Seen> = (0..replicates)
        .map(|i| replicate(folder.path(), adults, samples, loci, 100 + i))
        .collect();
    let inside = seen.iter().filter(|s| s.inside).count() as f64 / replicates as f64;
    let ratio = seen.iter().map(|s| s.ratio).sum::<f64>() / replicates as f64;
    println!(
        "{adults} adults, {samples} samples, {loci} loci: {inside:.2} inside, median/truth {ratio:.3}"
    );
    (inside, ratio)
}

// The truth is the simulated population itself: nine of ten bands of 95 % at least must hold it in a
// short study of 12 (fewer than 9 has a chance below 1 in 5000), and the medians must not be off.
#[test]
fn bands_hold_the_truth() {
    let (inside, ratio) = study(40, 30, 400, 12);
    assert!(inside >= 0.75, "{inside}");
    assert!((ratio - 1.0).abs() < 0.08, "{ratio}");
}

#[test]
#[ignore = "a study of minutes"]
fn bands_hold_the_truth_over_a_grid() {
    for (adults, samples, loci) in [
        (20, 20, 300),
        (40, 30, 400),
        (100, 40, 1000),
        (200, 40, 3000),
        (40, 30, 4000),
    ] {
        let (inside, ratio) = study(adults, samples, loci, 100);
        assert!(inside >= 0.9, "{inside}");
        assert!((ratio - 1.0).abs() < 0.03, "{ratio}");
    }
}
