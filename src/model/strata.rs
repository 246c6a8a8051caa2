//! Who was sampled where and when, and which samples are compared.

use std::ops::Range;

/// One row of the sample sheet, checked.
#[derive(Debug, Clone, PartialEq)]
pub struct SheetRow {
    /// 1-based row (line) of the file.
    pub row: u64,
    /// Sample name as in the calls.
    pub sample: String,
    /// Population name.
    pub population: String,
    /// Calendar year of sampling (may be fractional).
    pub year: f64,
    /// Visit label; the year as written when the sheet has no such column.
    pub visit: String,
    /// Sex, where given.
    pub sex: Option<Sex>,
    /// Generation, where given.
    pub generation: Option<f64>,
    /// Name of the sample of which this is a replicate.
    pub replicate_of: Option<String>,
    /// Genotyping batch, where given.
    pub batch: Option<String>,
}

/// Sex of a sampled individual.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Sex {
    /// Female.
    Female,
    /// Male.
    Male,
}

/// One sampled individual in use. Its place in [`Strata::individuals`] is its slot.
#[derive(Debug, Clone, PartialEq)]
pub struct Individual {
    /// Sample name as in the calls.
    pub sample: String,
    /// Index of its stratum.
    pub stratum: usize,
    /// Sex, where given.
    pub sex: Option<Sex>,
    /// Genotyping batch, where given.
    pub batch: Option<String>,
}

/// One population at one visit.
#[derive(Debug, Clone, PartialEq)]
pub struct Stratum {
    /// `population@visit`.
    pub name: String,
    /// Population name.
    pub population: String,
    /// Visit label.
    pub visit: String,
    /// Mean sampling year of its individuals.
    pub year: f64,
    /// Mean generation of its individuals, where every one has one.
    pub generation: Option<f64>,
    /// Slots of its individuals.
    pub slots: Range<usize>,
}

impl Stratum {
    /// Number of individuals.
    pub fn individuals(&self) -> usize {
        self.slots.len()
    }
}

/// All strata, ordered by population then year then visit; individuals in slot order, those of one
/// stratum side by side in the order of the sheet.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Strata {
    /// The strata.
    pub strata: Vec<Stratum>,
    /// The individuals by slot.
    pub individuals: Vec<Individual>,
}

/// What a comparison of two strata is for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum ComparisonKind {
    /// A later visit against the baseline of the same population.
    SinceBaseline,
    /// A visit against the one before, where that is not the baseline.
    BetweenVisits,
    /// Two populations at the same visit.
    BetweenPopulations,
}

/// An ordered pair of strata to compare: the earlier first.
#[derive(Debug, Clone, PartialEq)]
pub struct Comparison {
    /// Index of the earlier (or first) stratum.
    pub from: usize,
    /// Index of the later (or second) stratum.
    pub to: usize,
    /// Its kind.
    pub kind: ComparisonKind,
    /// Generations between the two, where the visits differ and the generation length is known.
    pub generations: Option<f64>,
}
