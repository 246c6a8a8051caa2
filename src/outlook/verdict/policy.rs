//! The policy file: limits, and what is known of populations beside the report.

use std::cmp::Ordering;
use std::collections::BTreeMap;
use std::path::Path;

use toml::de::DeTable;

use crate::error::{Error, Problem, Result};
use crate::ingest::settings::{
    ABOVE_ZERO, AT_LEAST_ZERO, FINITE, RATIO, Value, Walker, find, walk,
};
use crate::model::nearest;

/// The policy used when none is given, and a start for one's own.
pub const DEFAULT_POLICY: &str = include_str!("default_policy.toml");

/// Effective size over census size when nothing better is known (Frankham 1995; guidance for CBD
/// headline indicator A.4).
pub const DEFAULT_RATIO: f64 = 0.1;

/// The effective size of CBD headline indicator A.4, to be above.
pub const INDICATOR_SIZE: f64 = 500.0;

/// What a programme holds its populations to.
#[derive(Debug, Clone, PartialEq)]
pub struct Policy {
    /// Effective size over census size where a population has no ratio of its own.
    pub ratio: f64,
    /// The rules, in the order of the file.
    pub rules: Vec<Rule>,
    /// What is known of populations beside the report, by name.
    pub populations: BTreeMap<String, Known>,
}

/// What is known of a population beside the report.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Known {
    /// 1-based line of its table.
    pub row: u64,
    /// Its species.
    pub species: Option<String>,
    /// Census size, in individuals.
    pub census: Option<f64>,
    /// Effective size from elsewhere.
    pub effective_size: Option<f64>,
    /// Effective size over census size.
    pub ratio: Option<f64>,
}

/// One rule.
#[derive(Debug, Clone, PartialEq)]
pub struct Rule {
    /// 1-based line where it starts.
    pub row: u64,
    /// Its name, for a person.
    pub name: String,
    /// What it looks at.
    pub measure: Measure,
    /// What that must be.
    pub limit: Limit,
    /// The populations it holds for; all when empty.
    pub populations: Vec<String>,
    /// Method of effective size; the one to quote when absent.
    pub method: Option<String>,
    /// Whether the interval decides or the value.
    pub by: By,
    /// Whether a breach counts for the exit code.
    pub binding: bool,
    /// Where the limit was published.
    pub source: Option<String>,
}

/// What a rule looks at.
#[derive(Debug, Clone, PartialEq)]
pub enum Measure {
    /// Ne, in individuals.
    EffectiveSize,
    /// 1/(2Ne): the rate of inbreeding, and of the loss of heterozygosity, per generation.
    InbreedingPerGeneration,
    /// Expected heterozygosity of the latest visit as a share of the baseline's.
    HeterozygosityKept,
    /// Baseline alleles called lost.
    AllelesProbablyLost,
    /// The same as a share of the alleles of the baseline.
    ShareProbablyLost,
    /// Ne over census size.
    ShareOfCensus,
    /// FIS of the latest visit.
    InbreedingCoefficient,
    /// Mean over species of the share of populations with Ne above this.
    PopulationsAbove(f64),
    /// A field of the report, by scope and names with dots.
    Field(String),
}

/// Names of measures in a policy file.
const MEASURES: [&str; 8] = [
    "effective_size",
    "inbreeding_per_generation",
    "heterozygosity_kept",
    "alleles_probably_lost",
    "share_probably_lost",
    "share_of_census",
    "inbreeding_coefficient",
    "populations_above",
];

impl Measure {
    /// Its name in a policy file; that of a field is its path.
    pub fn name(&self) -> &str {
        match self {
            Measure::EffectiveSize => MEASURES[0],
            Measure::InbreedingPerGeneration => MEASURES[1],
            Measure::HeterozygosityKept => MEASURES[2],
            Measure::AllelesProbablyLost => MEASURES[3],
            Measure::ShareProbablyLost => MEASURES[4],
            Measure::ShareOfCensus => MEASURES[5],
            Measure::InbreedingCoefficient => MEASURES[6],
            Measure::PopulationsAbove(_) => MEASURES[7],
            Measure::Field(path) => path,
        }
    }
}

/// A side of a limit.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Side {
    /// Strictly above.
    Above,
    /// At the limit or above.
    AtLeast,
    /// Strictly below.
    Below,
    /// At the limit or below.
    AtMost,
}

impl Side {
    /// Its name in a policy file.
    pub fn name(self) -> &'static str {
        match self {
            Side::Above => "above",
            Side::AtLeast => "at_least",
            Side::Below => "below",
            Side::AtMost => "at_most",
        }
    }

    /// Whether a value that compares so with the limit is on this side.
    pub fn holds(self, order: Ordering) -> bool {
        match self {
            Side::Above => order == Ordering::Greater,
            Side::AtLeast => order != Ordering::Less,
            Side::Below => order == Ordering::Less,
            Side::AtMost => order != Ordering::Greater,
        }
    }
}

/// What a measure must be.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Limit {
    /// On a side of a number.
    Number(Side, f64),
    /// True or false.
    Is(bool),
}

/// What decides.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum By {
    /// The interval: met or breached only where all of it is on one side.
    Interval,
    /// The value alone.
    Value,
}

const METHODS: [&str; 7] = [
    "temporal_likelihood",
    "temporal_fs",
    "temporal_fc",
    "temporal_fk",
    "linkage",
    "demographic",
    "heterozygote_excess",
];

/// Reads and checks a policy file.
///
/// # Errors
/// [`Error::Io`] when it cannot be read, [`Error::Sheet`] with every problem found.
pub fn read_policy(path: &Path) -> Result<(Policy, Vec<u8>)> {
    let bytes = std::fs::read(path).map_err(|e| Error::io(path, "read", e))?;
    match parse_policy(&bytes) {
        Ok(policy) => Ok((policy, bytes)),
        Err(problems) => Err(Error::Sheet {
            path: path.to_path_buf(),
            problems,
        }),
    }
}

/// A policy from the bytes of its file, or every problem in the order of the file.
pub fn parse_policy(bytes: &[u8]) -> std::result::Result<Policy, Vec<Problem>> {
    walk(bytes, |walker, top| {
        walker.refuse_unknown(top, &["ratio", "rule", "population"], "");
        let mut rules = Vec::new();
        for (value, table) in walker.tables(top, "rule") {
            rules.extend(rule(walker, value, table));
        }
        let populations = populations(walker, top);
        if rules.is_empty() && populations.is_empty() {
            walker.complain_of_all(
                "there is no rule",
                "add a table [[rule]]; 'genewane verdict --write-policy' prints a start",
            );
        }
        Policy {
            ratio: walker.number(top, "ratio", RATIO).unwrap_or(DEFAULT_RATIO),
            rules,
            populations,
        }
    })
}

fn populations(walker: &mut Walker, top: &DeTable) -> BTreeMap<String, Known> {
    let mut populations = BTreeMap::new();
    let Some(table) = find(top, "population").and_then(|v| walker.table(v, "population.\"Name\""))
    else {
        return populations;
    };
    for (name, value) in table.iter() {
        let name = name.get_ref().trim().to_string();
        let Some(table) = walker.table(value, &format!("population.\"{name}\"")) else {
            continue;
        };
        let keys = ["species", "census", "effective_size", "ratio"];
        walker.refuse_unknown(table, &keys, &format!(" of population '{name}'"));
        let known = Known {
            row: walker.row(value),
            species: walker.text(table, "species"),
            census: walker.number(table, "census", AT_LEAST_ZERO),
            effective_size: walker.number(table, "effective_size", ABOVE_ZERO),
            ratio: walker.number(table, "ratio", RATIO),
        };
        if let (Some(size), Some(census)) = (known.effective_size, known.census)
            && size > 2.0 * census
        {
            walker.complain(
                value,
                format!("an effective size of {size} is above twice the census of {census}"),
                "equal families bring Ne to twice the census at most: mend one of the two",
            );
        }
        populations.insert(name, known);
    }
    populations
}

const RULE_KEYS: [&str; 14] = [
    "name",
    "measure",
    "field",
    "size",
    "above",
    "at_least",
    "below",
    "at_most",
    "is",
    "populations",
    "method",
    "by",
    "binding",
    "source",
];

fn rule(walker: &mut Walker, value: &Value, table: &DeTable) -> Option<Rule> {
    let name = walker.text(table, "name");
    let whose = name
        .as_ref()
        .map_or(" of a rule".into(), |n| format!(" of rule '{n}'"));
    walker.refuse_unknown(table, &RULE_KEYS, &whose);
    let measure = measure(walker, value, table, &whose);
    let limit = limit(walker, value, table, &whose);
    let by = choice(walker, table, "by", &["interval", "value"]);
    let method = choice(walker, table, "method", &METHODS);
    let measure = measure?;
    let of_size = matches!(
        measure,
        Measure::EffectiveSize | Measure::InbreedingPerGeneration | Measure::ShareOfCensus
    );
    if method.is_some() && !of_size {
        walker.complain(
            value,
            format!("method{whose} says nothing: its measure is no effective size"),
            "take the key out",
        );
    }
    Some(Rule {
        row: walker.row(value),
        name: name.unwrap_or_else(|| measure.name().replace('_', " ")),
        limit: limit?,
        populations: walker.texts(table, "populations"),
        method,
        by: match by.as_deref() {
            Some("value") => By::Value,
            _ => By::Interval,
        },
        binding: walker.flag(table, "binding").unwrap_or(true),
        source: walker.text(table, "source"),
        measure,
    })
}

fn measure(walker: &mut Walker, value: &Value, table: &DeTable, whose: &str) -> Option<Measure> {
    let size = walker.number(table, "size", ABOVE_ZERO);
    let field = walker.text(table, "field");
    let name = choice(walker, table, "measure", &MEASURES);
    if size.is_some() && name.as_deref() != Some("populations_above") {
        walker.complain(
            value,
            format!("size{whose} goes with measure = \"populations_above\" only"),
            "give the limit as above, at_least, below or at_most",
        );
    }
    if find(table, "measure").is_some() == find(table, "field").is_some() {
        walker.complain(
            value,
            format!("the rule needs either a measure or a field{whose}"),
            "write measure = \"effective_size\", or field = \"latest.allelic_richness\"",
        );
        return None;
    }
    if let Some(path) = field {
        return Some(Measure::Field(path));
    }
    Some(match name?.as_str() {
        "effective_size" => Measure::EffectiveSize,
        "inbreeding_per_generation" => Measure::InbreedingPerGeneration,
        "heterozygosity_kept" => Measure::HeterozygosityKept,
        "alleles_probably_lost" => Measure::AllelesProbablyLost,
        "share_probably_lost" => Measure::ShareProbablyLost,
        "share_of_census" => Measure::ShareOfCensus,
        "inbreeding_coefficient" => Measure::InbreedingCoefficient,
        _ => Measure::PopulationsAbove(size.unwrap_or(INDICATOR_SIZE)),
    })
}

fn limit(walker: &mut Walker, value: &Value, table: &DeTable, whose: &str) -> Option<Limit> {
    let sides = [Side::Above, Side::AtLeast, Side::Below, Side::AtMost];
    let given = sides
        .iter()
        .filter(|side| find(table, side.name()).is_some())
        .count()
        + usize::from(find(table, "is").is_some());
    if given != 1 {
        let what = if given == 0 {
            "no limit"
        } else {
            "more than one limit"
        };
        walker.complain(
            value,
            format!("{what}{whose}"),
            "give one of above, at_least, below, at_most, is; a range is two rules",
        );
        return None;
    }
    let number = sides.into_iter().find_map(|side| {
        Some(Limit::Number(
            side,
            walker.number(table, side.name(), FINITE)?,
        ))
    });
    number.or_else(|| walker.flag(table, "is").map(Limit::Is))
}

/// One of a few words.
fn choice(walker: &mut Walker, table: &DeTable, key: &str, words: &[&str]) -> Option<String> {
    let text = walker.text(table, key)?;
    if words.contains(&text.as_str()) {
        return Some(text);
    }
    let cure = match nearest(&text, words.iter().copied()) {
        Some(near) => format!("did you mean \"{near}\"?"),
        None => format!("write one of {}", words.join(", ")),
    };
    if let Some(value) = find(table, key) {
        walker.complain(value, format!("{key} \"{text}\" is unknown"), &cure);
    }
    None
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_default_policy_is_sound_and_names_its_sources() {
        let policy = parse_policy(DEFAULT_POLICY.as_bytes()).unwrap();
        assert_eq!(policy.ratio, 0.1);
        assert_eq!(policy.rules.len(), 8);
        assert!(policy.rules.iter().all(|rule| rule.source.is_some()));
        assert_eq!(policy.rules[1].limit, Limit::Number(Side::Above, 500.0));
    }

    #[test]
    fn problems_are_all_told_with_their_lines() {
        let text = "ratoi = 0.1\n\
            [[rule]]\nmeasure = \"efective_size\"\nabove = 50\n\
            [[rule]]\nmeasure = \"effective_size\"\nabove = 50\nat_most = 90\n\
            [[rule]]\nabove = 50\n\
            [[rule]]\nfield = \"latest.call_rate\"\nabove = \"high\"\n\
            [population.\"Alder\"]\ncensus = 10\neffective_size = 21\n";
        let problems = parse_policy(text.as_bytes()).unwrap_err();
        let told: Vec<(Option<u64>, &str, &str)> = problems
            .iter()
            .map(|p| (p.row, p.what.as_str(), p.cure.as_str()))
            .collect();
        for (row, what, cure) in [
            (1, "unknown key 'ratoi'", "'ratio'"),
            (3, "\"efective_size\" is unknown", "\"effective_size\""),
            (5, "more than one limit", "two rules"),
            (9, "either a measure or a field", "effective_size"),
            (13, "above is not a number", "without quotes"),
            (14, "above twice the census of 10", "twice the census"),
        ] {
            assert!(
                told.iter()
                    .any(|(r, w, c)| *r == Some(row) && w.contains(what) && c.contains(cure)),
                "{row} {what}: {told:#?}"
            );
        }
        assert_eq!(problems.len(), 6, "{told:#?}");
        assert!(parse_policy(b"").unwrap_err()[0].what.contains("no rule"));
        assert!(
            parse_policy(b"[[rule]\n").unwrap_err()[0]
                .what
                .contains("not TOML")
        );
    }
}
