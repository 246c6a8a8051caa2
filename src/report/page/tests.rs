//! Pages of reports plain and odd.

use super::sample::{comparison, empty, size, stratum, two_populations};
use super::*;
use crate::report::wire::{Kind, Loss, Warning};

fn html(report: Report) -> String {
    Page::of(report, &Companions::default(), false)
        .html()
        .unwrap()
}

/// Every name of the report with a prefix that a page must not believe.
fn renamed(prefix: &str) -> Report {
    let text = serde_json::to_string(&two_populations()).unwrap();
    let quoted = serde_json::to_string(prefix).unwrap();
    let inner = &quoted[1..quoted.len() - 1];
    let mut text = text;
    for name in [
        "Aldermere",
        "Birkholm",
        "elk ",
        "chr1",
        "chr2",
        "chr3",
        "X1",
    ] {
        text = text.replace(&format!("\"{name}"), &format!("\"{inner}{name}"));
    }
    serde_json::from_str(&text).unwrap()
}

/// Start tags of an HTML or SVG text, with their attributes, in order.
fn tags(html: &str) -> Vec<&str> {
    html.split('<')
        .skip(1)
        .filter(|t| t.starts_with(|c: char| c.is_ascii_alphabetic()))
        .map(|t| t.split('>').next().unwrap())
        .collect()
}

/// Every element that is opened is closed, in the right order.
fn is_balanced(html: &str) {
    let void = ["meta", "link", "br", "input"];
    let mut open: Vec<String> = Vec::new();
    for part in html.split('<').skip(1) {
        let tag = part.split('>').next().unwrap();
        let name: String = tag
            .trim_start_matches('/')
            .chars()
            .take_while(|c| c.is_ascii_alphanumeric())
            .collect();
        if tag.starts_with('!') || name.is_empty() || void.contains(&name.as_str()) {
            continue;
        }
        match (tag.starts_with('/'), tag.ends_with('/')) {
            (true, _) => assert_eq!(open.pop().as_deref(), Some(name.as_str()), "{tag}"),
            (false, false) => open.push(name),
            (false, true) => {}
        }
    }
    assert!(open.is_empty(), "{open:?}");
}

/// The page without its script, whose text holds comparisons.
fn markup(html: &str) -> String {
    let (before, after) = html.split_once("<script>").unwrap();
    format!("{before}{}", after.split_once("</script>").unwrap().1)
}

#[test]
fn a_whole_report_makes_a_whole_page() {
    let page = Page::of(two_populations(), &Companions::default(), false);
    let names: Vec<_> = page.figures.iter().map(|f| f.name).collect();
    assert_eq!(
        names,
        [
            "diversity",
            "effective-size",
            "allele-fates",
            "carriers",
            "differentiation",
            "change-in-time",
            "outliers",
            "genotyping"
        ]
    );
    let html = page.html().unwrap();
    is_balanced(&markup(&html));
    for words in [
        "has lost 11 % (6 to 16) of its expected heterozygosity",
        "Franklin (1980)",
        "Frankham et al. (2014)",
        "14 probably lost",
        "9 uncertain",
        "8 missed",
        "The methods agree on a few dozen.",
        "p = 0.40",
        "Never move, cull or breed animals on one number.",
        "plan II was assumed",
        "elk 12",
    ] {
        assert!(html.contains(words), "{words}");
    }
}

#[test]
fn the_same_report_makes_the_same_bytes() {
    assert_eq!(html(two_populations()), html(two_populations()));
}

#[test]
fn nothing_in_a_page_asks_for_anything_outside() {
    let html = html(two_populations());
    for tag in tags(&markup(&html)) {
        // Names of attributes stand outside of quotes.
        let outside: String = tag.split('"').step_by(2).collect();
        for attribute in [" src=", " srcset=", " action=", " style=", " on"] {
            assert!(!outside.contains(attribute), "{tag}");
        }
        if let Some((_, link)) = tag.split_once("href=") {
            assert!(
                link.starts_with("\"#") || link.starts_with("\"data:"),
                "{tag}"
            );
        }
    }
    assert!(html.contains("default-src &#x27;none&#x27;") || html.contains("default-src 'none'"));
    assert!(!STYLE.contains("url(") && !STYLE.contains("@import"));
}

#[test]
fn names_are_words_whatever_they_hold() {
    let plain = plain_without_titles();
    for prefix in [
        "<script>alert(1)</script>",
        "\"><img src=x onerror=alert(1)>",
        "</style></script></title>",
        "a & b 'c' \"d\" {{ 7*7 }} {% raw %} ",
        "🦫\u{200d}\u{1f468} ",
        "אבג \u{202e}ابج ",
        "nul\u{0}bell\u{7}escape\u{1b} ",
        "]]> <!-- ",
    ] {
        let report = renamed(prefix);
        let html = html(report.clone());
        is_balanced(&markup(&html));
        let tags = tags(&markup(&html))
            .into_iter()
            .filter(|t| !t.starts_with("bdi") && !t.starts_with("title") && *t != "g")
            .count();
        // The same elements as with plain names, but for cut names, which have titles of their own.
        assert_eq!(tags, plain, "{prefix}");
        assert!(!html.contains("<script>alert"), "{prefix}");
        assert!(!html.contains("<img"), "{prefix}");
        assert_eq!(html.contains("{{ 7*7 }}"), prefix.contains("{{"));
        assert!(!html.contains(['\u{0}', '\u{7}', '\u{1b}']), "{prefix}");
        for figure in Page::of(report, &Companions::default(), false).figures {
            let svg = figure.file();
            is_balanced(&svg);
            assert!(
                !svg.contains("<script") && !svg.contains("<img"),
                "{prefix}"
            );
            assert!(!svg.contains(is_forbidden), "{prefix}");
        }
    }
    assert!(plain > 500);
}

fn plain_without_titles() -> usize {
    tags(&markup(&html(two_populations())))
        .into_iter()
        .filter(|t| !t.starts_with("bdi") && !t.starts_with("title") && *t != "g")
        .count()
}

#[test]
fn an_empty_report_makes_a_page_that_says_so() {
    let html = html(empty());
    is_balanced(&markup(&html));
    assert!(html.contains("The report holds no sample, so there is no answer."));
    assert!(html.contains("No warning for this report"));
    assert!(!html.contains("<svg"));
}

#[test]
fn one_stratum_makes_a_page() {
    let mut report = empty();
    report.strata = vec![stratum("Cragfoot", "2024", 2024.0, 12, 0.2)];
    let page = Page::of(report, &Companions::default(), false);
    let html = page.html().unwrap();
    is_balanced(&markup(&html));
    assert!(html.contains("Genetic monitoring of Cragfoot"));
    assert!(html.contains("There is only one sample, so nothing to compare."));
    assert!(!html.contains("id=\"overview\""));
}

/// 12 strata, or as many as asked, each population at two visits, with long lists.
fn large(populations: usize, losses: u64) -> Report {
    let mut report = empty();
    for p in 0..populations {
        let name = format!("Population of a rather long name number {p}");
        let [first, latest] = ["2004", "2024"].map(|visit| format!("{name}@{visit}"));
        report.strata.push(stratum(&name, "2004", 2004.0, 30, 0.3));
        report.strata.push(stratum(&name, "2024", 2024.0, 30, 0.28));
        report
            .comparisons
            .push(comparison(&first, &latest, Kind::SinceBaseline));
        for method in ["temporal_fs", "temporal_fc", "temporal_fk"] {
            let bounds = (Some(20.0), Some(90.0));
            report
                .effective_size
                .push(size(method, Some(&first), &latest, 40.0, bounds));
        }
        for other in 0..p {
            for visit in ["2004", "2024"] {
                let to = format!("Population of a rather long name number {other}@{visit}");
                let from = format!("{name}@{visit}");
                report
                    .comparisons
                    .push(comparison(&to, &from, Kind::BetweenPopulations));
            }
        }
        let row = two_populations().losses[0].clone();
        report.losses.extend((0..losses).map(|i| Loss {
            population: name.clone(),
            position: i,
            ..row.clone()
        }));
    }
    report
}

#[test]
fn sixty_strata_make_a_page() {
    let html = html(large(30, 40));
    is_balanced(&markup(&html));
    assert!(html.len() < 6_000_000, "{}", html.len());
}

/// Of a report on 12 strata and 20 000 loci, whose list of lost alleles is full.
#[test]
fn a_page_of_twelve_strata_is_small_and_quick() {
    let report = large(6, 1000);
    let start = std::time::Instant::now();
    let html = html(report);
    let took = start.elapsed();
    assert!(html.len() < 3_000_000, "{}", html.len());
    // Ten times what it takes alone: other work runs beside the tests.
    assert!(took.as_secs_f64() < 2.0, "{took:?}");
    assert!(html.contains("more rows are in the report"));
}

#[test]
fn numbers_out_of_all_bounds_break_no_page() {
    let mut report = two_populations();
    for (i, s) in report.strata.iter_mut().enumerate() {
        let odd = [f64::MAX, -f64::MAX, 1e-320, 0.0][i];
        s.year = odd;
        s.expected_heterozygosity.estimate = Some(odd);
        s.allelic_richness.interval = Some([odd, -odd]);
        s.call_rate = odd;
        s.hardy_weinberg.deficit = u64::MAX;
        s.hardy_weinberg.tested = 0;
    }
    for c in &mut report.comparisons {
        c.generations = Some(1e300);
        c.fst_weir_cockerham.estimate = Some(-1e300);
        if let Some(a) = &mut c.alleles {
            a.not_seen_again = u64::MAX;
            a.probably_lost = Some(u64::MAX);
        }
    }
    for e in &mut report.effective_size {
        e.estimate = Some(0.0);
        e.interval = Some((Some(-5.0), Some(1e308)));
    }
    for c in &mut report.carriers {
        c.would_vanish = 1e300;
    }
    let html = markup(&html(report));
    is_balanced(&html);
    for bad in ["NaN", "\"inf", "-inf"] {
        assert!(!html.contains(bad), "{bad}");
    }
}

#[test]
fn without_samples_no_name_is_on_the_page_or_in_a_figure() {
    let mut report = two_populations();
    report.warnings.push(Warning {
        code: "not_listed".to_owned(),
        place: "calls".to_owned(),
        text: "not in the sheet: 'X1', 'X2'".to_owned(),
    });
    let page = Page::of(report, &Companions::default(), true);
    let html = page.html().unwrap();
    assert!(html.contains("Sample names were left out of this page."));
    let figures = page.figures.iter();
    let all = figures.fold(html, |all, f| {
        all + &f.file() + &f.specification.to_string()
    });
    for name in ["elk", "X1", "X2", "A7b"] {
        assert!(!all.contains(name), "{name}");
    }
    assert!(all.contains("carrier 1"));
}

#[test]
fn figures_are_written_as_drawings_and_specifications() {
    let folder = tempfile::tempdir().unwrap();
    let figures = folder.path().join("figures");
    let page = Page::of(two_populations(), &Companions::default(), false);
    page.write_figures(&figures).unwrap();
    let svg = std::fs::read_to_string(figures.join("diversity.svg")).unwrap();
    is_balanced(&svg);
    assert!(svg.contains("prefers-color-scheme"));
    let text = std::fs::read_to_string(figures.join("allele-fates.vl.json")).unwrap();
    let specification: serde_json::Value = serde_json::from_str(&text).unwrap();
    let values = specification["data"]["values"].as_array().unwrap();
    let lost = values
        .iter()
        .find(|v| v["fate"] == "probably lost")
        .unwrap();
    assert_eq!(lost["alleles"], 14);
    assert_eq!(std::fs::read_dir(figures).unwrap().count(), 16);
}
