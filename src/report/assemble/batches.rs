//! Genotyping batches: whether they go with the visits, and whether call rate or heterozygosity goes with
//! them.

use std::collections::{BTreeMap, BTreeSet};

use statrs::distribution::{ContinuousCDF, FisherSnedecor};

use super::Findings;
use crate::model::{Comparison, ComparisonKind, Note, Strata};

/// Chance below which a difference between batches is told: two tests a report, so that a sound one
/// raises an alarm once in fifty.
const ALARM: f64 = 0.01;

/// A quantity of an individual, by slot.
type Value<'a> = &'a dyn Fn(usize) -> Option<f64>;

/// How the batches of two strata lie to each other.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Between {
    /// No batch holds individuals of both.
    Confounded,
    /// Some batch does.
    Shared,
    /// Of some individual the batch is not known.
    Unknown,
}

/// How the batches of a comparison lie.
pub fn between(strata: &Strata, comparison: &Comparison) -> Between {
    let of = |s: usize| {
        let individuals = &strata.individuals[strata.strata[s].slots.clone()];
        let batches = individuals.iter().map(|i| i.batch.as_deref());
        batches.collect::<Option<BTreeSet<&str>>>()
    };
    match (of(comparison.from), of(comparison.to)) {
        (Some(a), Some(b)) if a.is_disjoint(&b) => Between::Confounded,
        (Some(_), Some(_)) => Between::Shared,
        _ => Between::Unknown,
    }
}

/// What is to be said of batches: visits that share none, and batches that differ within strata.
pub fn notes(findings: &Findings) -> Vec<Note> {
    let mut notes = confounded(findings);
    let sums = findings.sums;
    let share = |part: u64, of: u64| (of > 0).then(|| part as f64 / of as f64);
    let quantities: [(&str, Value); 2] = [
        ("call rate", &|slot| {
            share(sums.typed_records[slot], sums.kept)
        }),
        ("heterozygosity", &|slot| {
            share(sums.heterozygous[slot], sums.typed_polymorphic[slot])
        }),
    ];
    for (quantity, value) in quantities {
        notes.extend(difference(findings.strata, quantity, value));
    }
    notes
}

/// Visits of one population that share no batch with the one they are held against.
fn confounded(findings: &Findings) -> Vec<Note> {
    let apart: Vec<&str> = findings
        .comparisons
        .iter()
        .filter(|c| c.kind == ComparisonKind::SinceBaseline)
        .filter(|c| between(findings.strata, c) == Between::Confounded)
        .map(|c| findings.strata.strata[c.to].name.as_str())
        .collect();
    let text = "no genotyping batch holds both this visit and its baseline, so a change of diversity, of \
                frequencies or of single loci may be one of genotyping: genotype some baseline samples \
                again beside the new ones";
    match apart.is_empty() {
        true => Vec::new(),
        false => vec![Note::new("batch_goes_with_visit", apart.join(", "), text)],
    }
}

/// Analysis of variance of a quantity of individuals between the batches of one stratum, over all
/// strata with several (Fisher 1925): F = (SSB/dfB)/(SSW/dfW), each sum of squares taken within strata.
fn difference(strata: &Strata, quantity: &str, value: Value) -> Option<Note> {
    let (mut between, mut within) = (0.0, 0.0);
    let (mut groups, mut individuals) = (0usize, 0usize);
    let mut of_batch: BTreeMap<&str, Vec<f64>> = BTreeMap::new();
    for stratum in &strata.strata {
        let mut here: BTreeMap<&str, Vec<f64>> = BTreeMap::new();
        for slot in stratum.slots.clone() {
            if let (Some(batch), Some(v)) = (&strata.individuals[slot].batch, value(slot)) {
                here.entry(batch).or_default().push(v);
            }
        }
        if here.len() < 2 {
            continue;
        }
        let all: Vec<f64> = here.values().flatten().copied().collect();
        let centre = mean(&all);
        groups += here.len() - 1;
        individuals += all.len() - here.len();
        for (batch, values) in here {
            let own = mean(&values);
            between += values.len() as f64 * (own - centre).powi(2);
            within += values.iter().map(|v| (v - own).powi(2)).sum::<f64>();
            of_batch.entry(batch).or_default().extend(values);
        }
    }
    if groups == 0 || individuals == 0 {
        return None;
    }
    let (df1, df2) = (groups as f64, individuals as f64);
    let f = match within > 0.0 {
        true => (between / df1) / (within / df2),
        false if between > 0.0 => f64::INFINITY,
        false => return None,
    };
    let p = match f.is_finite() {
        true => FisherSnedecor::new(df1, df2).ok()?.sf(f),
        false => 0.0,
    };
    (p < ALARM).then(|| {
        let means: Vec<String> = of_batch
            .iter()
            .map(|(batch, values)| format!("{batch:?} {:.3}", mean(values)))
            .collect();
        let text = format!(
            "{quantity} of individuals goes with their genotyping batch within strata (analysis of \
             variance: F {f:.1} on {df1} and {df2} degrees of freedom, p {}): means {}; differences \
             between visits may be of this kind",
            if p < 1e-4 { "below 0.0001".to_owned() } else { format!("{p:.4}") },
            means.join(", ")
        );
        Note::new("batches_differ", "batch", text)
    })
}

fn mean(values: &[f64]) -> f64 {
    values.iter().sum::<f64>() / values.len() as f64
}
