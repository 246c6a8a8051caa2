//! `genewane page` from outside: a report with its forecasts and verdicts on one page.

mod common;

use serde_json::Value;

use common::{Case, Run, run};

impl Case {
    /// The report of the demonstration data, a forecast and a verdict of it.
    fn with_documents() -> Self {
        let case = Case::with_report(&common::demo_report("2"));
        case.write(
            "scenarios.toml",
            "[[scenario]]\nname = \"<b>larger & 'safer'</b>\"\neffective_size = 200\n",
        );
        let forecast = ["--scenarios", "scenarios.toml", "--years", "40", "--quiet"];
        case.made("forecast", "forecast.json", &forecast);
        case.made("verdict", "verdict.json", &["--quiet"]);
        case
    }

    fn read(&self, name: &str) -> Value {
        let text = std::fs::read_to_string(self.path(name)).expect("a document");
        serde_json::from_str(&text).expect("JSON")
    }

    fn made(&self, command: &str, output: &str, options: &[&str]) {
        let mut arguments = vec![command.into(), self.path("report.json").into_os_string()];
        arguments.extend(["-o".into(), self.path(output).into_os_string()]);
        for option in options {
            arguments.push(match option.contains('.') {
                true => self.path(option).into_os_string(),
                false => option.into(),
            });
        }
        let got = run(arguments);
        assert!(matches!(got.code, Some(0 | 3)), "{}", got.stderr);
    }

    fn page(&self, documents: &[&str]) -> Run {
        let mut arguments = vec!["page".into()];
        arguments.extend(documents.iter().map(|d| self.path(d).into_os_string()));
        run(arguments)
    }
}

#[test]
fn forecasts_and_verdicts_stand_on_the_page_of_their_report() {
    let case = Case::with_documents();
    let bare = String::from_utf8(case.page(&["report.json"]).stdout).unwrap();
    assert!(!bare.contains("id=\"forecast\"") && !bare.contains("id=\"verdict\""));
    let got = case.page(&["report.json", "verdict.json", "forecast.json"]);
    assert_eq!(got.code, Some(0), "{}", got.stderr);
    let html = String::from_utf8(got.stdout).unwrap();

    // A fan a population and scenario, and every step of the document in the table behind it.
    let forecast = case.read("forecast.json");
    let populations = forecast["populations"].as_array().unwrap();
    let scenarios: usize = populations
        .iter()
        .map(|p| p["scenarios"].as_array().unwrap().len())
        .sum();
    assert_eq!(scenarios, 4);
    let figure = between(&html, "id=\"figure-forecast-heterozygosity\"", "</figure>");
    assert_eq!(figure.matches("<svg").count(), scenarios);
    let steps: usize = populations
        .iter()
        .flat_map(|p| p["scenarios"].as_array().unwrap())
        .map(|s| s["steps"].as_array().unwrap().len())
        .sum();
    assert_eq!(figure.matches("<tr>").count(), steps + 1);
    // The name of a scenario is words, whatever it holds.
    assert!(!html.contains("<b>larger") && html.contains("&lt;b&gt;larger &amp;"));

    // Each rule and place of the verdict is a row; the sum is told as the document has it.
    let verdict = case.read("verdict.json");
    let places: usize = verdict["rules"]
        .as_array()
        .unwrap()
        .iter()
        .map(|r| r["places"].as_array().unwrap().len())
        .sum();
    let section = between(&html, "<section id=\"verdict\"", "</section>");
    assert_eq!(section.matches("<tr>").count(), places + 1);
    let breached = verdict["counts"]["breached"].as_u64().unwrap();
    assert!(
        section.contains(&format!("broken somewhere {breached},")),
        "{section}"
    );

    // The order in which documents are named changes nothing; a forecast given twice is drawn once.
    let other = case.page(&[
        "report.json",
        "forecast.json",
        "verdict.json",
        "forecast.json",
    ]);
    let again = String::from_utf8(other.stdout).unwrap();
    assert_eq!(
        again.matches("<svg class=\"figure\"").count(),
        html.matches("<svg class=\"figure\"").count()
    );
}

fn between<'a>(html: &'a str, from: &str, to: &str) -> &'a str {
    let start = html.find(from).unwrap_or_else(|| panic!("no {from}"));
    let rest = &html[start..];
    &rest[..rest.find(to).unwrap()]
}

#[test]
fn what_does_not_belong_to_the_report_is_refused_and_nothing_is_written() {
    let case = Case::with_documents();
    let refused = |documents: &[&str], words: &str| {
        let got = case.page(documents);
        assert_eq!(got.code, Some(1), "{}", got.stderr);
        assert!(got.stderr.contains(words), "{}", got.stderr);
        assert!(got.stderr.contains(documents[1]), "{}", got.stderr);
        assert!(got.stdout.is_empty());
    };
    // The same numbers in other bytes are another file: the digest says so.
    let pretty = serde_json::to_string_pretty(&case.read("report.json")).unwrap();
    case.write("other.json", &pretty);
    refused(&["other.json", "forecast.json"], "another report");
    refused(&["report.json", "report.json"], "'genewane-report'");
    let old = std::fs::read_to_string(case.path("verdict.json")).unwrap();
    case.write(
        "old.json",
        &old.replacen("\"format_version\": 1", "\"format_version\": 7", 1),
    );
    refused(&["report.json", "old.json"], "format_version: 7");
    case.write("half.json", &old[..old.len() / 2]);
    refused(&["report.json", "half.json"], "no forecast and no verdict");
}
