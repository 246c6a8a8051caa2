//! A report held against a policy.

mod document;
mod facts;
mod fields;
mod text;

use std::collections::BTreeMap;

pub use document::{
    Answer, Indicator, Limit, OnUncertain, Place, Population, Rule, Species, VERDICT_FORMAT,
    VERDICT_VERSION, Verdict,
};
pub use text::{limit, text_table, value};

use super::wire::{Provenance, Report};
use crate::error::Problem;
use crate::model::{nearest, spell_out};
use crate::outlook::verdict as judging;
use facts::Facts;

/// What the verdict names as the source of the indicator.
const INDICATOR_SOURCE: &str = "CBD Kunming-Montreal Global Biodiversity Framework, headline \
     indicator A.4 (decision 15/5 and its metadata); Hoban et al. (2020, 2023)";

/// Everything of a policy that does not fit the report: unknown fields, populations and methods,
/// with the nearest that would.
pub fn problems(report: &Report, policy: &judging::Policy) -> Vec<Problem> {
    let mut problems = Vec::new();
    let known = report.populations();
    for rule in &policy.rules {
        if let judging::Measure::Field(path) = &rule.measure
            && fields::scope_of(path).is_none()
        {
            problems.push(unknown_field(rule.row, path));
        }
        for name in &rule.populations {
            let listed = known.contains(&name.as_str()) || policy.populations.contains_key(name);
            if !listed {
                let all = known.iter().copied();
                let cure = match nearest(name, all.clone()) {
                    Some(near) => format!("did you mean '{near}'?"),
                    None => format!("the report has {}", spell_out(all)),
                };
                let what = format!("rule '{}' names the population '{name}'", rule.name);
                problems.push(Problem::at(rule.row, what, cure));
            }
        }
    }
    problems
}

fn unknown_field(row: u64, path: &str) -> Problem {
    let cure = match nearest(path, fields::paths()) {
        Some(near) => format!("did you mean '{near}'?"),
        None => {
            let last = path.rsplit('.').next().unwrap_or_default();
            let by_end = fields::paths().find(|p| p.ends_with(&format!(".{last}")));
            let near = by_end.map(|near| format!("did you mean '{near}'?"));
            near.unwrap_or_else(|| {
                "write a scope (latest, baseline, since_baseline, last_interval, \
                 between_populations, samples, loci), a dot, and a field of the report"
                    .to_string()
            })
        }
    };
    Problem::at(row, format!("the report has no field '{path}'"), cure)
}

/// Judges a report. The policy must be free of [`problems`].
pub fn verdict(
    report: &Report,
    policy: &judging::Policy,
    with_indicator: bool,
    on_uncertain: OnUncertain,
    provenance: Provenance,
) -> Verdict {
    let facts = Facts { report, policy };
    let rules: Vec<Rule> = policy
        .rules
        .iter()
        .map(|rule| answered(&facts, rule))
        .collect();
    let binding = || rules.iter().filter(|rule| rule.binding);
    let count = |answer| binding().filter(|rule| rule.answer == answer).count() as u64;
    let counts = BTreeMap::from([
        ("met".to_owned(), count(Answer::Met)),
        ("breached".to_owned(), count(Answer::Breached)),
        ("cannot_tell".to_owned(), count(Answer::CannotTell)),
    ]);
    Verdict {
        format: VERDICT_FORMAT.to_owned(),
        format_version: VERDICT_VERSION,
        provenance,
        answer: binding()
            .map(|rule| rule.answer)
            .max()
            .unwrap_or(Answer::Met),
        counts,
        on_uncertain,
        indicator: with_indicator.then(|| indicator(&facts)),
        notes: notes(&facts),
        rules,
        cautions: super::CAUTIONS
            .iter()
            .map(|&text| text.to_owned())
            .collect(),
    }
}

impl Verdict {
    /// Whether the exit code says breach.
    pub fn is_breach(&self) -> bool {
        self.answer == Answer::Breached
            || (self.on_uncertain == OnUncertain::Breached && self.counts["cannot_tell"] > 0)
    }
}

fn answered(facts: &Facts, rule: &judging::Rule) -> Rule {
    let places: Vec<Place> = facts
        .of(rule)
        .into_iter()
        .map(|found| place(rule, found))
        .collect();
    let worst = places.iter().map(|p| p.answer).max();
    Rule {
        rule: rule.name.clone(),
        measure: rule.measure.name().to_owned(),
        limit: match rule.limit {
            judging::Limit::Number(side, number) => Limit {
                side: side.name().to_owned(),
                number: Some(number),
                flag: None,
            },
            judging::Limit::Is(flag) => Limit {
                side: "is".to_owned(),
                number: None,
                flag: Some(flag),
            },
        },
        by: match rule.by {
            judging::By::Interval => "interval".to_owned(),
            judging::By::Value => "value".to_owned(),
        },
        binding: rule.binding,
        source: rule.source.clone(),
        answer: worst.unwrap_or(Answer::CannotTell),
        places,
    }
}

fn place(rule: &judging::Rule, found: facts::Found) -> Place {
    let (answer, reason) = judging::judge(rule.limit, rule.by, &found.fact);
    let (interval, unbounded) = match &found.fact {
        judging::Fact::Estimate { value, interval } => (*interval, value.is_none()),
        _ => (None, false),
    };
    Place {
        place: found.place,
        answer: match answer {
            judging::Answer::Met => Answer::Met,
            judging::Answer::CannotTell => Answer::CannotTell,
            judging::Answer::Breached => Answer::Breached,
        },
        value: found.fact.value(),
        interval,
        unbounded,
        from: found.from,
        reason,
    }
}

fn indicator(facts: &Facts) -> Indicator {
    let members = facts.members();
    let plain: Vec<judging::Member> = members.iter().map(|m| m.member.clone()).collect();
    let counted = judging::indicator(judging::INDICATOR_SIZE, &plain);
    let species = counted.species.iter().map(|s| Species {
        species: s.species.clone(),
        share: s.share,
        range: s.range,
        above: s.above,
        assessed: s.assessed,
        total: s.total,
        populations: members
            .iter()
            .filter(|m| m.member.species == s.species)
            .map(|m| m.wire(counted.size))
            .collect(),
    });
    Indicator {
        size: counted.size,
        mean: counted.mean,
        range: counted.range,
        species_assessed: counted.species_assessed,
        species_total: counted.species.len() as u64,
        species: species.collect(),
        source: INDICATOR_SOURCE.to_owned(),
    }
}

/// Where the methods of a population contradict each other, a reader must know.
fn notes(facts: &Facts) -> Vec<String> {
    facts
        .report
        .effective_size_summary
        .iter()
        .filter(|summary| summary.agree == Some(false))
        .map(|s| format!("{}: the methods disagree: {}", s.population, s.text))
        .collect()
}
