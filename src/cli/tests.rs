//! Command lines right and wrong on purpose.

use clap::error::ErrorKind;

use super::*;
use crate::model::SamplingPlan;

fn parse(line: &str) -> Result<Work, clap::Error> {
    parse_from(std::iter::once("genewane").chain(line.split_whitespace()))
}

fn measure(line: &str) -> MeasurePlan {
    match parse(line) {
        Ok(Work::Measure(plan)) => *plan,
        other => panic!("{other:?}"),
    }
}

#[test]
fn the_table_of_flags_is_consistent() {
    command().debug_assert();
}

#[test]
fn the_shortest_line_has_every_default() {
    let plan = measure("measure calls.bcf --samples samples.tsv");
    assert_eq!(
        plan,
        MeasurePlan::new(vec!["calls.bcf".into()], "samples.tsv".into())
    );
}

#[test]
fn every_flag_reaches_the_plan() {
    let plan = measure(
        "measure a.vcf b.vcf --samples s.tsv -o r.json --loci l.tsv.gz --programme p.toml \
         --baseline 1995 --generation-years 4.5 --census 120 --sampling-plan 1 --min-call-rate 0.8 \
         --gene-copies 20 --chromosomes 29 --allow-absent --list-losses 0 --threads 3 --quiet --stamp",
    );
    let expected = MeasurePlan {
        calls: vec!["a.vcf".into(), "b.vcf".into()],
        sheet: "s.tsv".into(),
        programme: Some("p.toml".into()),
        output: Some("r.json".into()),
        loci_output: Some("l.tsv.gz".into()),
        flags: crate::model::PopulationSettings {
            baseline: Some("1995".into()),
            generation_years: Some(4.5),
            census: Some(120.0),
            plan: Some(SamplingPlan::One),
            chromosomes: Some(29),
            ..Default::default()
        },
        allow_absent: true,
        min_call_rate: 0.8,
        gene_copies: Some(20),
        list_losses: 0,
        threads: Some(3),
        quiet: true,
        stamp: true,
        ..MeasurePlan::new(Vec::new(), PathBuf::new())
    };
    assert_eq!(plan, expected);
}

#[test]
fn standard_streams_are_dashes() {
    let plan = measure("measure - --samples s.tsv -o -");
    assert_eq!((plan.calls, plan.output), (vec![PathBuf::from("-")], None));
}

#[test]
fn wrong_usage_exits_2_and_says_why() {
    let cases = [
        ("measure", "Usage"),
        ("measure calls.vcf", "--samples"),
        ("measure --samples s.tsv", "CALLS"),
        (
            "measure a --samples s --min-call-rate 80",
            "write 0.8 for 80 %",
        ),
        ("measure a --samples s --gene-copies 7", "take 6"),
        ("measure a --samples s --gene-copies 0", "even"),
        ("measure a --samples s --generation-years 0", "above 0"),
        ("measure a --samples s --generation-years nan", "above 0"),
        ("measure a --samples s --census 1", "2 or more"),
        (
            "measure a --samples s --sampling-plan 3",
            "possible values: 1, 2",
        ),
        ("measure a --samples s --threads 0", "threads"),
        (
            "measure a --samples s --loci l.csv",
            ".tsv, .tsv.gz or .parquet",
        ),
        (
            "measure a --samples s -o l.tsv --loci l.tsv",
            "give two names",
        ),
        ("measure a --samples s -o s", "both read and written"),
        ("measure a a --samples s", "given twice"),
        ("measure a --sample s", "--samples"),
        ("mesure a", "'measure'"),
        ("rehearse demo.toml", "--output"),
        ("screen calls.vcf", "--samples"),
        ("screen a a --samples s", "given twice"),
        (
            "screen a --samples s --write-sheet s",
            "both read and written",
        ),
        (
            "screen a --samples s -o t --write-sheet t",
            "give two names",
        ),
        ("screen a --samples s --most-mismatching 5", "a share"),
    ];
    for (line, word) in cases {
        let error = parse(line).unwrap_err();
        assert_eq!(error.exit_code(), 2, "{line}");
        let text = error.to_string();
        assert!(text.contains(word), "{line}: {text}");
    }
}

#[test]
fn help_and_version_exit_0() {
    let version = parse("--version").unwrap_err();
    assert_eq!(
        (version.exit_code(), version.kind()),
        (0, ErrorKind::DisplayVersion)
    );
    assert_eq!(
        version.to_string(),
        format!("genewane {}\n", env!("CARGO_PKG_VERSION"))
    );
    for line in ["help", "help measure", "help formats"] {
        assert!(matches!(parse(line), Ok(Work::Words(_))), "{line}");
    }
    assert_eq!(parse("help mesure").unwrap_err().exit_code(), 2);
    for line in ["--help", "measure --help", "rehearse -h"] {
        let help = parse(line).unwrap_err();
        assert_eq!(help.exit_code(), 0, "{line}");
        assert!(
            help.to_string().contains("Usage: genewane"),
            "{line}: {help}"
        );
    }
    assert_eq!(parse("").unwrap_err().exit_code(), 2);
}

#[test]
fn other_commands_become_work() {
    assert_eq!(parse("schema").unwrap(), Work::Schema { name: None });
    assert_eq!(
        parse("schema report").unwrap(),
        Work::Schema {
            name: Some("report".into())
        }
    );
    let plan = RehearsePlan {
        scenario: "demo.toml".into(),
        output: "out".into(),
        seed: Some(7),
        threads: None,
        quiet: false,
    };
    assert_eq!(
        parse("rehearse demo.toml -o out --seed 7").unwrap(),
        Work::Rehearse(plan)
    );
}

/// House rules of the flags: every one is explained, none is a single letter but -o, -h and -V, and
/// every command that computes shows an example.
#[test]
fn every_flag_is_explained_and_every_command_shows_an_example() {
    let mut root = command();
    root.build();
    for command in root.get_subcommands().filter(|c| c.get_name() != "help") {
        let name = command.get_name();
        let examples = command
            .get_after_long_help()
            .map(ToString::to_string)
            .unwrap_or_default();
        assert!(
            examples.contains(&format!("genewane {name} ")),
            "{name}: no example"
        );
        for flag in command.get_arguments() {
            let help = flag.get_help().map(ToString::to_string).unwrap_or_default();
            assert!(!help.is_empty(), "{name}: {} has no help", flag.get_id());
            let short = flag.get_short();
            assert!(
                matches!(short, None | Some('o' | 'h' | 'V')),
                "{name}: -{short:?}"
            );
        }
    }
}

/// Every example in the help is a line that the program accepts.
#[test]
fn examples_of_the_help_are_accepted() {
    let mut seen = 0;
    for command in command().get_subcommands() {
        let text = command
            .get_after_long_help()
            .map(ToString::to_string)
            .unwrap_or_default();
        let text = text.replace("\\\n", " ");
        for line in text.lines().filter_map(|line| line.split_once("genewane ")) {
            let line = line.1.split('>').next().unwrap_or_default();
            assert!(parse(line).is_ok(), "{line}: {:?}", parse(line));
            seen += 1;
        }
    }
    assert!(seen >= 5, "{seen}");
}

/// The defaults that the help states are those of the plan.
#[test]
fn stated_defaults_are_the_defaults_of_the_plan() {
    use crate::model::{
        DEFAULT_LIST_LOSSES, DEFAULT_MIN_CALL_RATE, DEFAULT_SAMPLING_PLAN, SamplingPlan,
    };
    let help = parse("measure --help").unwrap_err().to_string();
    let plan = match DEFAULT_SAMPLING_PLAN {
        SamplingPlan::One => "1",
        SamplingPlan::Two => "2",
    };
    for stated in [
        format!("in the report [default: {DEFAULT_LIST_LOSSES}]"),
        format!("to count [default: {DEFAULT_MIN_CALL_RATE}, every typed locus]"),
        format!("were taken [default: {plan}]"),
    ] {
        assert!(help.contains(&stated), "{stated}\n{help}");
    }
}

#[test]
fn a_page_says_where_it_goes_and_what_stays_off() {
    assert_eq!(
        parse("page r.json -o p.html --figures figures --without-samples").unwrap(),
        Work::Page(PagePlan {
            report: "r.json".into(),
            documents: Vec::new(),
            output: Some("p.html".into()),
            figures: Some("figures".into()),
            without_samples: true,
        })
    );
}
