//! `genewane design` from outside: tables against published values, simulated power, refusals.

mod common;

use serde_json::Value;

use common::{close, find, measure_run, run};

fn document(options: &str) -> Value {
    let arguments = ["design"].into_iter().chain(options.split_whitespace());
    let document = run(arguments.chain(["--quiet"])).json();
    let schema = run(["schema", "design"]).json();
    let validator = jsonschema::draft202012::new(&schema).expect("a sound schema");
    if let Err(error) = validator.validate(&document) {
        panic!("{error} at {}", error.instance_path());
    }
    document
}

// Nei & Tajima (1981), Waples (1989) as arithmetic, chi-square quantiles of another library: n' = 100,
// S = 50 and 50, t = 5, Ne = 50: E F 0.07, CV 0.1979899, 33.642 to 73.468; n' = 1000, t = 10, Ne = 500:
// 0.03, 0.1341641, 390.21 to 663.59. Microsatellites: 25 loci of 5 alleles are n' = 100 as well.
#[test]
fn temporal_precision() {
    let rows = document("--individuals 50 --loci 100 --generations 5 --effective-size 50");
    let first = find(&rows["precision"], "method", "temporal");
    close(
        "CV",
        first["least_cv"].as_f64().unwrap(),
        0.1979898987322333,
        1e-9,
    );
    close("F", first["expected_signal"].as_f64().unwrap(), 0.07, 1e-12);
    close(
        "low",
        first["narrowest_interval"][0].as_f64().unwrap(),
        33.6420544585605,
        1e-6,
    );
    close(
        "high",
        first["narrowest_interval"][1].as_f64().unwrap(),
        73.46778081480771,
        1e-6,
    );
    let many =
        document("--individuals 50 --loci 25 --alleles 5 --generations 5 --effective-size 50");
    assert_eq!(
        find(&many["precision"], "method", "temporal")["least_cv"],
        first["least_cv"]
    );
    let far = document("--individuals 50 --loci 1000 --generations 10 --effective-size 500");
    let far = find(&far["precision"], "method", "temporal");
    close(
        "CV",
        far["least_cv"].as_f64().unwrap(),
        0.1341640786499874,
        1e-9,
    );
    close(
        "high",
        far["narrowest_interval"][1].as_f64().unwrap(),
        663.5888954150729,
        1e-6,
    );
    assert!(document("")["precision"].as_array().unwrap().len() > 20);
}

// Brown & Marshall (1995): 30 outbreeding individuals, or 59 gametes, for p = 0.05; the formula for
// the rest. Missed: (1 - 0.05)^60 = 0.0460698.
#[test]
fn alleles_that_are_seen() {
    let got = document("--allele-frequency 0.5,0.1,0.05,0.02,0.01 --individuals 30");
    let wanted = [(0.5, 3), (0.1, 15), (0.05, 30), (0.02, 75), (0.01, 150)];
    for (row, (p, n)) in got["allele_detection"]
        .as_array()
        .unwrap()
        .iter()
        .zip(wanted)
    {
        assert_eq!(
            (&row["frequency"], &row["individuals"]),
            (&p.into(), &n.into())
        );
    }
    let row = &got["allele_detection"][2];
    assert_eq!(row["individuals_if_inbred"], 59);
    close(
        "missed",
        row["missed"][0]["probability"].as_f64().unwrap(),
        0.046069798986951946,
        1e-9,
    );
}

// Algebra: S = 50, t = 10, Ne = 500, CV 0.25 takes 288 independent alleles.
#[test]
fn what_a_precision_takes() {
    let got =
        document("--individuals 50 --loci 288 --generations 10 --effective-size 500 --cv 0.25");
    let row = &got["needed_for_cv"][0];
    assert_eq!(
        (&row["loci_needed"], &row["individuals_needed"]),
        (&288.into(), &50.into())
    );
    let few =
        document("--individuals 50 --loci 20 --generations 10 --effective-size 500 --cv 0.25");
    assert!(few["needed_for_cv"][0]["individuals_needed"].is_null());
}

/// A small population is seen to be small, a large one is not called so; more of everything is more
/// power; the same seed gives the same bytes for any threads; the cheapest sufficient one comes first.
#[test]
fn simulated_power() {
    let options = "--individuals 10,40 --loci 30,300 --generations 4 --effective-size 20 \
        --size-limit 100 --stable-size 400 --simulate 10 --cost-per-sample 30 --cost-per-locus 1";
    let got = document(options);
    let of = |declared: &str, individuals: u64, loci: u64| {
        let all = got["power"].as_array().unwrap().iter();
        all.filter(|p| p["declared"] == declared)
            .find(|p| p["design"]["individuals"] == individuals && p["design"]["loci"] == loci)
            .unwrap_or_else(|| panic!("{declared}"))
    };
    let temporal = "size_below_limit_by_temporal_fs";
    let power = |individuals, loci| of(temporal, individuals, loci)["power"].as_f64().unwrap();
    assert!(power(40, 300) >= 0.9, "{}", power(40, 300));
    assert!(power(40, 300) >= power(10, 30));
    // The whole 95 % interval lies below the true size in one of forty cases, not in one of four.
    assert!(of(temporal, 40, 300)["false_alarms"].as_f64().unwrap() <= 0.25);
    assert!(
        of("heterozygosity_lower", 40, 300)["power"]
            .as_f64()
            .unwrap()
            > 0.5
    );
    let choice = find(&got["smallest_with_power"], "declared", temporal);
    assert!(choice["power"].as_f64().unwrap() >= 0.8);
    // 2 visits of 10 individuals at 30 and 30 loci at 1.
    assert_eq!(of(temporal, 10, 30)["design"]["cost"], 630.0);
    let costs: Vec<f64> = got["power"]
        .as_array()
        .unwrap()
        .iter()
        .filter(|p| p["declared"] == temporal)
        .map(|p| p["design"]["cost"].as_f64().unwrap())
        .collect();
    assert!(costs.windows(2).all(|w| w[0] <= w[1]), "{costs:?}");
    // Nearly every call of a lost allele is right, by its stated chance of 0.95.
    let lost = of("allele_called_lost", 40, 300);
    assert!(lost["power"].as_f64().unwrap() >= 0.9, "{lost}");
    assert!(lost["false_alarms"].as_f64().unwrap() <= 0.5, "{lost}");
    let again = document(&format!("{options} --threads 1"));
    assert_eq!(got["power"], again["power"]);
}

#[test]
fn bad_options_are_told() {
    for (options, part) in [
        ("--individuals 0", "individuals"),
        ("--effective-size 1", "2 to a million"),
        ("--allele-frequency 5", "0.9 for 90 %"),
        (
            "--simulate 5 --effective-size 50000",
            "too large to simulate",
        ),
        ("--loci many", "loci"),
    ] {
        let got = run(["design"].into_iter().chain(options.split_whitespace()));
        assert_eq!(got.code, Some(2), "{options}: {}", got.stderr);
        assert!(got.stderr.contains(part), "{options}: {}", got.stderr);
        assert!(got.stdout.is_empty());
    }
}

/// The power of a design is the share of fresh populations, simulated and measured by the commands, of
/// which the thing is declared.
#[test]
fn power_agrees_with_populations_simulated_afresh() {
    let got = document(
        "--individuals 15 --loci 80 --generations 4 --effective-size 30.5 --size-limit 90 \
         --stable-size 400 --chromosomes 10 --simulate 80 --seed 1",
    );
    let folder = tempfile::tempdir().expect("a scratch folder");
    let scenario = folder.path().join("fresh.toml");
    // The same population in a scenario of its own; chromosomes of one Morgan.
    std::fs::write(
        &scenario,
        "generation_years = 1\nsettling_generations = 3\n\
         chromosome = [{ name = \"f\", length_bp = 50_000_000, map_length_cm = 100, copies = 10 }]\n\
         loci = [{ count = 80, frequencies = { minor = [0.05, 0.5] } }]\n\
         population = [{ name = \"Fen\", size = 30 }]\n\
         visit = [{ generation = 0, individuals = 15 }, { generation = 4, individuals = 15 }]\n",
    )
    .expect("a scratch file");
    let runs = 60;
    let (mut size, mut diversity) = (0, 0);
    for seed in 0..runs {
        let out = folder.path().join(format!("run{seed}"));
        let made = run([
            "rehearse".as_ref(),
            scenario.as_os_str(),
            "-o".as_ref(),
            out.as_os_str(),
            "--seed".as_ref(),
            format!("{}", 90_000 + seed).as_ref(),
        ]);
        assert_eq!(made.code, Some(0), "{}", made.stderr);
        let report = measure_run(
            &out.join("calls.vcf.gz"),
            &out.join("samples.tsv"),
            &["--generation-years", "1", "--sampling-plan", "II"],
        )
        .json();
        let sizes = report["effective_size"].as_array().unwrap();
        let fs = sizes.iter().find(|e| e["method"] == "temporal_fs").unwrap();
        size += i32::from(fs["interval"][1].as_f64().is_some_and(|high| high < 90.0));
        let change = &report["comparisons"][0]["change"]["expected_heterozygosity"];
        diversity += i32::from(change["interval"][1].as_f64().unwrap() < 0.0);
    }
    for (declared, count) in [
        ("size_below_limit_by_temporal_fs", size),
        ("heterozygosity_lower", diversity),
    ] {
        let power = find(&got["power"], "declared", declared)["power"]
            .as_f64()
            .unwrap();
        let share = f64::from(count) / f64::from(runs);
        // Three standard errors of the difference of two binomial shares.
        let p = 0.5 * (power + share);
        let error = (p * (1.0 - p) * (1.0 / 80.0 + 1.0 / 60.0)).sqrt().max(0.01);
        assert!(
            (power - share).abs() <= 3.0 * error,
            "{declared}: {power} {share}"
        );
        assert!(
            power > 0.1 && power < 1.0,
            "{declared}: no test of anything at {power}"
        );
    }
}
