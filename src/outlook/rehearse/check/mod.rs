//! Everything wrong with a scenario, all at once, each with its key and its cure.

mod genome;
mod populations;
mod visits;

use std::path::Path;

use super::scenario::{Field, Genotyping, Scenario};
use crate::error::{Error, Problem, Result};

/// Longest contig that a `.tbi` index reaches.
const LONGEST_CONTIG: u64 = (1 << 29) - 1;
/// Most adults of all populations together, and most generations: beyond, a slip of the pen.
const MOST_ADULTS: u64 = 20_000_000;
const MOST_GENERATIONS: u32 = 100_000;

/// Reads and checks a scenario file.
///
/// # Errors
///
/// [`Error::Io`] where it cannot be read, [`Error::Sheet`] with every problem found.
pub fn read_scenario(path: &Path) -> Result<Scenario> {
    let text = std::fs::read_to_string(path).map_err(|e| Error::io(path, "read", e))?;
    let scenario: Scenario = toml::from_str(&text).map_err(|e| {
        let row = e
            .span()
            .map(|s| text[..s.start.min(text.len())].matches('\n').count() as u64 + 1);
        let cure = "docs/scenario.md lists all keys and the kinds of their values".into();
        let problems = vec![Problem {
            row,
            what: e.message().trim().to_string(),
            cure,
        }];
        Error::Sheet {
            path: path.into(),
            problems,
        }
    })?;
    let problems = problems(&scenario);
    if problems.is_empty() {
        Ok(scenario)
    } else {
        Err(Error::Sheet {
            path: path.into(),
            problems,
        })
    }
}

/// Every problem of a scenario; none makes it fit to run.
pub fn problems(scenario: &Scenario) -> Vec<Problem> {
    let mut found = Found::default();
    found.clock(scenario);
    found.chromosomes(scenario);
    for (i, set) in scenario.loci.iter().enumerate() {
        found.loci(scenario, set, &format!("loci[{}]", i + 1));
    }
    found.need(
        !scenario.loci.is_empty(),
        "no `loci`",
        "add a [[loci]] table",
    );
    found.populations(scenario);
    found.movement(scenario);
    found.genotyping(&scenario.genotyping);
    // Sizes by generation need the above to make sense.
    if found.0.is_empty() {
        found.sizes(scenario);
        found.visits(scenario);
    }
    found.0
}

#[derive(Default)]
struct Found(Vec<Problem>);

/// Whether a number lies in a range; no for NaN.
fn inside(value: f64, low: f64, high: f64) -> bool {
    value >= low && value <= high
}

impl Found {
    fn need(&mut self, fine: bool, what: impl Into<String>, cure: impl Into<String>) {
        if !fine {
            self.0.push(Problem {
                row: None,
                what: what.into(),
                cure: cure.into(),
            });
        }
    }

    fn range(&mut self, key: &str, value: f64, low: f64, high: f64) {
        let cure = format!("give a number from {low} to {high}");
        self.need(
            inside(value, low, high),
            format!("`{key}` is {value}"),
            cure,
        );
    }

    fn clock(&mut self, s: &Scenario) {
        self.range("start_year", s.start_year, -1e6, 1e6);
        self.range("generation_years", s.generation_years, 1e-3, 1e4);
        self.range(
            "settling_generations",
            f64::from(s.settling_generations),
            0.0,
            10_000.0,
        );
        self.need(!s.visit.is_empty(), "no `visit`", "add a [[visit]] table");
        self.need(
            !s.population.is_empty(),
            "no `population`",
            "add a [[population]] table",
        );
    }

    fn genotyping(&mut self, g: &Genotyping) {
        self.range("genotyping.miscall_rate", g.miscall_rate, 0.0, 1.0);
        self.range("genotyping.dropout_rate", g.dropout_rate, 0.0, 1.0);
        self.range("genotyping.missing_rate", g.missing_rate, 0.0, 0.99);
        self.range(
            "genotyping.missing_spread_loci",
            g.missing_spread_loci,
            0.0,
            10.0,
        );
        self.range(
            "genotyping.missing_spread_samples",
            g.missing_spread_samples,
            0.0,
            10.0,
        );
        self.range(
            "genotyping.depth_spread_loci",
            g.depth_spread_loci,
            0.0,
            10.0,
        );
        self.range(
            "genotyping.depth_spread_samples",
            g.depth_spread_samples,
            0.0,
            10.0,
        );
        self.range("genotyping.read_error_rate", g.read_error_rate, 0.0, 0.5);
        if let Some(depth) = g.depth {
            self.range("genotyping.depth", depth, 0.01, 10_000.0);
        }
        self.need(
            g.depth.is_some() || g.fields.is_empty(),
            "`genotyping.fields` without `genotyping.depth`",
            "give the mean depth",
        );
        for field in [Field::AD, Field::DP, Field::GQ, Field::PL] {
            let times = g.fields.iter().filter(|&&f| f == field).count();
            self.need(
                times < 2,
                format!("`genotyping.fields` has {field:?} twice"),
                "name it once",
            );
        }
    }
}

#[cfg(test)]
mod tests;
