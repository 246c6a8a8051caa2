//! Leaves sample names out of a report before it becomes a page.

use std::collections::{BTreeMap, BTreeSet};

use crate::report::wire::Report;

/// What stands in the place of quoted names.
const LEFT_OUT: &str = "(names left out)";

/// The report without sample names. Carriers become numbered, so that one who carries two alleles
/// is still seen to; lists of samples keep their length; quotes in warnings go, except those of
/// populations, visits and strata.
pub fn without_samples(mut report: Report) -> Report {
    let mut numbers: BTreeMap<String, usize> = BTreeMap::new();
    let first = report.carriers.iter_mut().map(|c| &mut c.sample);
    let listed = report.at_risk.iter_mut().flat_map(|a| &mut a.carriers);
    let paired = report.carrier_pairs.iter_mut();
    let paired = paired.flat_map(|pair| [&mut pair.female, &mut pair.male]);
    for carrier in first.chain(listed).chain(paired) {
        let next = numbers.len() + 1;
        let number = *numbers.entry(std::mem::take(carrier)).or_insert(next);
        *carrier = format!("carrier {number}");
    }
    let samples = &mut report.samples;
    let mut names: BTreeSet<String> = numbers.into_keys().collect();
    for list in [
        &mut samples.not_listed,
        &mut samples.absent,
        &mut samples.replicates,
        &mut samples.without_calls,
    ] {
        names.extend(list.iter_mut().map(std::mem::take));
    }
    let places: BTreeSet<&str> = report
        .strata
        .iter()
        .flat_map(|s| [&s.population, &s.visit, &s.stratum])
        .map(String::as_str)
        .collect();
    for warning in &mut report.warnings {
        warning.text = without_quotes(&warning.text, &places);
        if names.contains(&warning.place) && !places.contains(warning.place.as_str()) {
            warning.place = LEFT_OUT.to_owned();
        }
        // A name without quotes, where it stands as a word of its own.
        for name in names
            .iter()
            .filter(|n| n.len() > 2 && !places.contains(n.as_str()))
        {
            warning.text = without_word(&warning.text, name);
        }
    }
    report
}

/// Everything from the first quote that opens to the last that closes goes, unless it is one known
/// place: names may hold quotes themselves, so single quotes cannot be told apart.
fn without_quotes(text: &str, places: &BTreeSet<&str>) -> String {
    let opens = text.char_indices().find(|&(i, c)| {
        let before = text[..i].chars().next_back();
        c == '\'' && before.is_none_or(|b| !b.is_alphanumeric())
    });
    let Some((start, _)) = opens else {
        return text.to_owned();
    };
    let end = match text.rfind('\'') {
        Some(end) if end > start => end,
        _ => text.len() - 1,
    };
    if places.contains(&text[start + 1..end]) {
        return text.to_owned();
    }
    format!("{}{LEFT_OUT}{}", &text[..start], &text[end + 1..])
}

fn without_word(text: &str, name: &str) -> String {
    let mut out = String::new();
    let mut rest = text;
    while let Some(at) = rest.find(name) {
        let after = &rest[at + name.len()..];
        let joins = |c: Option<char>| c.is_some_and(|c| c.is_alphanumeric() || c == '_');
        let whole = !joins(rest[..at].chars().next_back()) && !joins(after.chars().next());
        out.push_str(&rest[..at]);
        out.push_str(if whole { LEFT_OUT } else { name });
        rest = after;
    }
    out + rest
}

#[cfg(test)]
mod tests {
    use super::super::sample::{estimate, two_populations};
    use super::*;
    use crate::report::wire::Warning;

    #[test]
    fn no_sample_name_stays() {
        let mut report = two_populations();
        report.samples.not_listed = vec!["O'Malley 7".to_owned(), "tag-12".to_owned()];
        report.warnings.push(Warning {
            code: "not_listed".to_owned(),
            place: "calls".to_owned(),
            text: "2 samples are not in the sheet: 'O'Malley 7', 'tag-12'; add rows".to_owned(),
        });
        report.warnings.push(Warning {
            code: "twin".to_owned(),
            place: "tag-12".to_owned(),
            text: "tag-12 looks like another".to_owned(),
        });
        report.warnings.push(Warning {
            code: "plan".to_owned(),
            place: "Aldermere".to_owned(),
            text: "the plan of 'Aldermere' was not stated".to_owned(),
        });
        let carrier = report.at_risk[0].carriers[0].clone();
        let before = report.samples.not_listed.len();
        let clean = without_samples(report);
        let text = serde_json::to_string(&clean).unwrap();
        for name in ["O'Malley", "tag-12", carrier.as_str()] {
            assert!(!text.contains(name), "{name}");
        }
        assert_eq!(clean.samples.not_listed.len(), before);
        assert!(text.contains("the plan of 'Aldermere' was not stated"));
        assert!(text.contains("carrier 1"));
        assert_eq!(estimate(0.1, [0.0, 0.2]).level, 0.95);
    }
}
