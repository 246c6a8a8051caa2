//! Fields of a report by a path of names: which there are, from the schema; and their values.

use std::collections::BTreeMap;
use std::sync::LazyLock;

use serde_json::Value;

use crate::outlook::verdict::Fact;
use crate::report::wire::{Comparison, Loci, Samples, Stratum};

/// What the first name of a path stands for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Scope {
    /// The latest stratum of each population.
    Latest,
    /// The baseline stratum of each population.
    Baseline,
    /// The latest visit of each population against its baseline.
    SinceBaseline,
    /// The latest visit of each population against the one before.
    LastInterval,
    /// Each pair of populations at their latest common visits.
    BetweenPopulations,
    /// Which samples were used.
    Samples,
    /// Which records were used.
    Loci,
}

const SCOPES: [(&str, Scope); 7] = [
    ("latest", Scope::Latest),
    ("baseline", Scope::Baseline),
    ("since_baseline", Scope::SinceBaseline),
    ("last_interval", Scope::LastInterval),
    ("between_populations", Scope::BetweenPopulations),
    ("samples", Scope::Samples),
    ("loci", Scope::Loci),
];

/// Every path there is, with its scope and the names below it.
static PATHS: LazyLock<BTreeMap<String, (Scope, String)>> = LazyLock::new(|| {
    let schema = |value: schemars::Schema| fields(&value.to_value());
    let stratum = schema(schemars::schema_for!(Stratum));
    let comparison = schema(schemars::schema_for!(Comparison));
    let samples = schema(schemars::schema_for!(Samples));
    let loci = schema(schemars::schema_for!(Loci));
    let mut paths = BTreeMap::new();
    for (name, scope) in SCOPES {
        let below = match scope {
            Scope::Latest | Scope::Baseline => &stratum,
            Scope::Samples => &samples,
            Scope::Loci => &loci,
            _ => &comparison,
        };
        for field in below {
            paths.insert(format!("{name}.{field}"), (scope, field.clone()));
        }
    }
    paths
});

/// All paths, in alphabetical order.
pub fn paths() -> impl Iterator<Item = &'static str> {
    PATHS.keys().map(String::as_str)
}

/// Scope and names of a path.
pub fn scope_of(path: &str) -> Option<(Scope, &'static str)> {
    PATHS
        .get(path)
        .map(|(scope, below)| (*scope, below.as_str()))
}

/// Paths of the numbers, estimates and flags of an object, from its schema.
fn fields(root: &Value) -> Vec<String> {
    let mut out = Vec::new();
    collect(root, root, "", &mut out);
    out
}

fn collect(root: &Value, schema: &Value, prefix: &str, out: &mut Vec<String>) {
    let Some(properties) = schema["properties"].as_object() else {
        return;
    };
    for (name, property) in properties {
        let path = format!("{prefix}{name}");
        let (target, referred) = resolve(root, property);
        if referred.is_some_and(|name| name == "Estimate") || is_value(target) {
            out.push(path);
        } else if target["properties"].is_object() {
            collect(root, target, &format!("{path}."), out);
        }
    }
}

/// A schema behind its reference or its "or null", with the name it is referred by.
fn resolve<'a>(root: &'a Value, schema: &'a Value) -> (&'a Value, Option<&'a str>) {
    if let Some(choices) = schema["anyOf"].as_array()
        && let Some(choice) = choices.iter().find(|c| c["type"] != "null")
    {
        return resolve(root, choice);
    }
    match schema["$ref"].as_str().and_then(|r| r.rsplit('/').next()) {
        Some(name) => (&root["$defs"][name], Some(name)),
        None => (schema, None),
    }
}

fn is_value(schema: &Value) -> bool {
    let kinds = ["number", "integer", "boolean"];
    match &schema["type"] {
        Value::String(kind) => kinds.contains(&kind.as_str()),
        Value::Array(all) => all.iter().any(|kind| kinds.iter().any(|k| kind == k)),
        _ => false,
    }
}

/// The value below an object of the report.
pub fn fact(object: &impl serde::Serialize, below: &str) -> Fact {
    let Ok(root) = serde_json::to_value(object) else {
        return Fact::Absent("the object cannot be read".to_string());
    };
    let mut value = &root;
    for name in below.split('.') {
        value = &value[name];
    }
    match value {
        Value::Number(number) => number
            .as_f64()
            .map_or_else(|| Fact::Absent("no number".to_string()), Fact::Exact),
        Value::Bool(flag) => Fact::Flag(*flag),
        Value::Object(_) => estimate(value),
        _ => {
            let parent = below
                .rsplit_once('.')
                .map(|(parent, _)| parent.split('.').fold(&root, |value, name| &value[name]));
            let why = parent.and_then(|parent| parent["absent_because"].as_str());
            let why = why.unwrap_or("the report has no value here");
            Fact::Absent(why.to_string())
        }
    }
}

fn estimate(value: &Value) -> Fact {
    let Some(number) = value["estimate"].as_f64() else {
        let why = value["absent_because"].as_str().unwrap_or("no estimate");
        return Fact::Absent(why.to_string());
    };
    let interval = value["interval"]
        .as_array()
        .filter(|pair| pair.len() == 2)
        .map(|pair| [pair[0].as_f64(), pair[1].as_f64()]);
    Fact::Estimate {
        value: Some(number),
        interval,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn paths_reach_numbers_estimates_and_flags_and_nothing_else() {
        let all: Vec<&str> = paths().collect();
        for path in [
            "latest.allelic_richness",
            "latest.call_rate",
            "latest.hardy_weinberg.deficit",
            "latest.per_site.expected_heterozygosity",
            "baseline.individuals",
            "since_baseline.change.expected_heterozygosity_kept",
            "since_baseline.alleles.not_seen_again",
            "since_baseline.alleles.faster_than_explained",
            "since_baseline.outlier_loci.found",
            "since_baseline.fc",
            "between_populations.fst_hudson",
            "samples.used",
            "loci.polymorphic",
        ] {
            assert!(all.contains(&path), "{path} is missing from {all:?}");
        }
        for path in [
            "latest.stratum",
            "samples.not_listed",
            "since_baseline.outlier_loci.list",
        ] {
            assert!(!all.contains(&path), "{path}");
        }
        let (scope, below) = scope_of("since_baseline.change.allelic_richness").unwrap();
        assert_eq!(
            (scope, below),
            (Scope::SinceBaseline, "change.allelic_richness")
        );
    }
}
