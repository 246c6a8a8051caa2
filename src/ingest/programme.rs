//! The programme file: what a monitoring programme knows of its populations beside the genotypes.
//!
//! TOML. Keys at the top hold for every population; those of a table `[population."Name"]` hold for
//! that one and win.
//!
//! ```toml
//! baseline = 1995                  # visit label or year; the earliest visit when absent
//! generation_years = 4.5           # mean age of parents, in years
//! census = 800                     # individuals at the baseline
//! sampling_plan = 2                # 1 or 2, also "I" or "II"
//! chromosomes = 29                 # haploid number
//! map_length_cm = 2900             # genetic map, where chromosomes are not counted
//! breeding_males = 40              # per generation, with breeding_females
//! breeding_females = 60
//! family_sizes = [0, 2, 3, 1]      # offspring counted for each parent, zeros included
//!
//! [life_history]
//! age_at_maturity = 3              # years
//! adult_life_span = 6              # years; oldest breeding age - age at maturity + 1
//! fecundity_cv = 0.4               # optional
//!
//! [population."Alder Brook"]
//! census = 120
//! ```
//!
//! The document is walked by hand rather than derived, because a derived reader stops at the first
//! problem, and a person mending a file wants all of them with their lines.

use std::path::{Path, PathBuf};

use sha2::{Digest, Sha256};
use toml::de::{DeTable, DeValue};

use super::settings::{
    ABOVE_ZERO, AT_LEAST_TWO, AT_LEAST_ZERO, Value, Walker, find, integer, number, walk,
};
use crate::error::{Error, Result};
use crate::model::{
    LifeHistory, PopulationSettings, Problem, Programme, SamplingPlan, hexadecimal,
};

/// Keys of a population's settings, at the top and in its table.
const SETTINGS: [&str; 10] = [
    "baseline",
    "generation_years",
    "census",
    "sampling_plan",
    "chromosomes",
    "map_length_cm",
    "breeding_males",
    "breeding_females",
    "family_sizes",
    "life_history",
];

/// Keys of the table `life_history`.
const LIFE_HISTORY: [&str; 3] = ["age_at_maturity", "adult_life_span", "fecundity_cv"];

/// Most chromosomes accepted. The largest haploid number known, of a fern, is 720.
const MOST_CHROMOSOMES: i64 = 1000;

/// A programme file without problems.
#[derive(Debug, Clone, PartialEq)]
pub struct ProgrammeFile {
    /// The file as the user named it.
    pub path: PathBuf,
    /// What it says.
    pub programme: Programme,
    /// SHA-256 of the bytes of the file, in lower-case hexadecimal.
    pub digest: String,
    /// Size of the file in bytes.
    pub bytes: u64,
}

/// Reads and checks a programme file.
///
/// # Errors
/// [`Error::Io`] when the file cannot be read, [`Error::Sheet`] with every problem found, in the
/// order of the file.
pub fn read_programme(path: &Path) -> Result<ProgrammeFile> {
    let bytes = std::fs::read(path).map_err(|e| Error::io(path, "read", e))?;
    let programme = parse_programme(&bytes).map_err(|problems| Error::Sheet {
        path: path.to_path_buf(),
        problems,
    })?;
    let digest = hexadecimal(&Sha256::digest(&bytes));
    Ok(ProgrammeFile {
        path: path.to_path_buf(),
        programme,
        digest,
        bytes: bytes.len() as u64,
    })
}

/// The programme given as the bytes of its file, or every problem in the order of the file.
pub fn parse_programme(bytes: &[u8]) -> std::result::Result<Programme, Vec<Problem>> {
    walk(bytes, |walker, top| walker.programme(top))
}

/// What a programme holds, on top of what every settings file has.
impl Walker<'_> {
    fn programme(&mut self, top: &DeTable) -> Programme {
        self.refuse_unknown(top, &[&SETTINGS[..], &["population"]].concat(), "");
        let mut programme = Programme {
            all: self.settings(top),
            ..Programme::default()
        };
        let Some(populations) = find(top, "population") else {
            return programme;
        };
        let Some(tables) = self.table(populations, "population") else {
            return programme;
        };
        for (name, table) in tables.iter() {
            let name = name.get_ref().as_ref();
            if name.contains('@') {
                self.complain(
                    table,
                    format!("population '{name}' holds '@'"),
                    "write its name as in the sample sheet, without the visit",
                );
            }
            if let Some(table) = self.table(table, &format!("population.\"{name}\"")) {
                self.refuse_unknown(table, &SETTINGS, &format!(" of population '{name}'"));
                let settings = self.settings(table);
                programme
                    .by_population
                    .insert(name.trim().to_string(), settings);
            }
        }
        programme
    }

    fn settings(&mut self, table: &DeTable) -> PopulationSettings {
        PopulationSettings {
            baseline: find(table, "baseline").and_then(|value| self.label(value, "baseline")),
            generation_years: self.number(table, "generation_years", ABOVE_ZERO),
            census: self.number(table, "census", AT_LEAST_TWO),
            plan: find(table, "sampling_plan").and_then(|value| self.plan(value)),
            chromosomes: find(table, "chromosomes").and_then(|value| self.chromosomes(value)),
            map_length_cm: self.number(table, "map_length_cm", ABOVE_ZERO),
            life_history: find(table, "life_history").and_then(|value| self.life_history(value)),
            breeders: self.breeders(table),
            family_sizes: find(table, "family_sizes")
                .map_or_else(Vec::new, |value| self.family_sizes(value)),
        }
    }

    /// A label or a year.
    fn label(&mut self, value: &Value, name: &str) -> Option<String> {
        let text = match value.get_ref() {
            DeValue::String(text) => text.trim().to_string(),
            DeValue::Integer(_) | DeValue::Float(_) => number(value)?.to_string(),
            _ => String::new(),
        };
        if text.is_empty() {
            self.complain(
                value,
                format!("{name} is no label or year"),
                "write \"label\" or 1995",
            );
            return None;
        }
        Some(text)
    }

    fn plan(&mut self, value: &Value) -> Option<SamplingPlan> {
        let text = match value.get_ref() {
            DeValue::String(text) => text.trim().to_string(),
            DeValue::Integer(digits) => digits.as_str().to_string(),
            _ => String::new(),
        };
        match text.as_str() {
            "1" | "I" => Some(SamplingPlan::One),
            "2" | "II" => Some(SamplingPlan::Two),
            _ => {
                self.complain(
                    value,
                    "sampling_plan is neither 1 nor 2".to_string(),
                    "write 1 if sampled individuals may still breed (or have bred), 2 if they were \
                     removed before breeding",
                );
                None
            }
        }
    }

    fn chromosomes(&mut self, value: &Value) -> Option<u32> {
        let count = integer(value).filter(|count| (1..=MOST_CHROMOSOMES).contains(count));
        if count.is_none() {
            self.complain(
                value,
                format!("chromosomes is not a whole number from 1 to {MOST_CHROMOSOMES}"),
                "write the haploid number: 29 for 2n = 58",
            );
        }
        count.map(|count| count as u32)
    }

    fn life_history(&mut self, value: &Value) -> Option<LifeHistory> {
        let table = self.table(value, "life_history")?;
        self.refuse_unknown(table, &LIFE_HISTORY, " of life_history");
        for name in &LIFE_HISTORY[..2] {
            if find(table, name).is_none() {
                self.complain(
                    value,
                    format!("life_history has no {name}"),
                    "give age_at_maturity and adult_life_span, both in years",
                );
            }
        }
        let maturity = self.number(table, "age_at_maturity", ABOVE_ZERO);
        let adult_life_span = self.number(table, "adult_life_span", ABOVE_ZERO);
        let fecundity_cv = self.number(table, "fecundity_cv", AT_LEAST_ZERO);
        Some(LifeHistory {
            maturity: maturity?,
            adult_life_span: adult_life_span?,
            fecundity_cv,
        })
    }

    fn breeders(&mut self, table: &DeTable) -> Option<(f64, f64)> {
        let names = ["breeding_males", "breeding_females"];
        let [males, females] = names.map(|name| self.number(table, name, ABOVE_ZERO));
        match names.map(|name| find(table, name)) {
            [Some(_), Some(_)] => males.zip(females),
            [None, None] => None,
            [male, female] => {
                let lone = male.or(female)?;
                self.complain(
                    lone,
                    "breeders of one sex only".to_string(),
                    "give breeding_males and breeding_females side by side",
                );
                None
            }
        }
    }

    fn family_sizes(&mut self, value: &Value) -> Vec<u32> {
        let sizes: Option<Vec<u32>> = match value.get_ref() {
            DeValue::Array(items) => items
                .iter()
                .map(|item| u32::try_from(integer(item)?).ok())
                .collect(),
            _ => None,
        };
        match sizes {
            Some(sizes) if sizes.len() >= 2 => sizes,
            _ => {
                self.complain(
                    value,
                    "family_sizes is not a list of whole numbers for at least two parents",
                    "write the offspring of each parent, zeros included: [0, 2, 3, 1]",
                );
                Vec::new()
            }
        }
    }
}

#[cfg(test)]
mod tests;
