//! What `measure` will do: every choice made, each default with its reason.

use std::path::PathBuf;

use super::{Masks, PopulationSettings, SamplingPlan, Strata};

/// Level of every interval. The level that management plans and the literature report.
pub const DEFAULT_LEVEL: f64 = 0.95;

/// Share of false findings accepted among loci called out of line (Benjamini & Hochberg 1995).
/// One in twenty: those loci are looked at by a person, and a missed one is not looked at.
pub const DEFAULT_FALSE_DISCOVERY_RATE: f64 = 0.05;

/// Least share of individuals typed for a locus to count. 0, so that every typed locus counts:
/// estimators weigh each locus by its own sample, and a silent filter would move results.
pub const DEFAULT_MIN_CALL_RATE: f64 = 0.0;

/// Lost alleles listed by name. A report stays a few hundred kilobytes; all are counted anyway.
pub const DEFAULT_LIST_LOSSES: usize = 1000;

/// Sampling plan where none is given: most monitoring samples the young, or removes what it samples.
/// It is stated in the report, and plan I cannot be assumed because it needs a census size.
pub const DEFAULT_SAMPLING_PLAN: SamplingPlan = SamplingPlan::Two;

/// Fewest individuals of a stratum that the default number of rarefied gene copies heeds: one tiny
/// stratum must not bring the richness of all others down to nothing.
const SMALLEST_STRATUM: usize = 5;

/// Everything `measure` needs to know, checked in itself; files are not yet opened.
#[derive(Debug, Clone, PartialEq)]
pub struct MeasurePlan {
    /// Files of genotype calls, at least one; `-` is standard input.
    pub calls: Vec<PathBuf>,
    /// The sample sheet.
    pub sheet: PathBuf,
    /// What is masked while reading.
    pub masks: Masks,
    /// Where the loci of a tidy genotype table are.
    pub locus_map: Option<PathBuf>,
    /// The programme file.
    pub programme: Option<PathBuf>,
    /// Where the report goes; standard output when absent.
    pub output: Option<PathBuf>,
    /// Where the table by locus goes, if anywhere.
    pub loci_output: Option<PathBuf>,
    /// Settings given as flags, which win over the programme file.
    pub flags: PopulationSettings,
    /// Whether samples of the sheet may lack calls.
    pub allow_absent: bool,
    /// Least share of the individuals in use that are typed for a locus to count, 0 to 1.
    pub min_call_rate: f64,
    /// Gene copies to which allelic richness is rarefied, even and at least 2; by
    /// [`default_gene_copies`] when absent.
    pub gene_copies: Option<u32>,
    /// Level of intervals, between 0 and 1.
    pub level: f64,
    /// Share of false findings accepted among outlying loci, between 0 and 1.
    pub false_discovery_rate: f64,
    /// Most lost alleles listed by name.
    pub list_losses: usize,
    /// Threads; all cores when absent.
    pub threads: Option<usize>,
    /// Whether progress and notes stay off standard error.
    pub quiet: bool,
    /// Whether the report carries the time of the run, which makes each run's bytes differ.
    pub stamp: bool,
}

impl MeasurePlan {
    /// The plan with every default.
    pub fn new(calls: Vec<PathBuf>, sheet: PathBuf) -> Self {
        MeasurePlan {
            calls,
            sheet,
            locus_map: None,
            masks: Masks::default(),
            programme: None,
            output: None,
            loci_output: None,
            flags: PopulationSettings::default(),
            allow_absent: false,
            min_call_rate: DEFAULT_MIN_CALL_RATE,
            gene_copies: None,
            level: DEFAULT_LEVEL,
            false_discovery_rate: DEFAULT_FALSE_DISCOVERY_RATE,
            list_losses: DEFAULT_LIST_LOSSES,
            threads: None,
            quiet: false,
            stamp: false,
        }
    }
}

/// The largest even number of gene copies not above 80 % of those of the smallest stratum that has
/// at least 5 individuals (of the smallest of all if none has), never below 2.
///
/// The fifth left aside is for missing genotypes: a locus counts only where every stratum has that
/// many copies typed. `None` when there is no stratum.
pub fn default_gene_copies(strata: &Strata) -> Option<u32> {
    let sizes = || strata.strata.iter().map(|stratum| stratum.individuals());
    let smallest = sizes()
        .filter(|&n| n >= SMALLEST_STRATUM)
        .min()
        .or_else(|| sizes().min())?;
    // 80 % of 2n gene copies, in whole pairs: 2 * floor(4n / 5).
    Some((2 * (4 * smallest / 5)).max(2) as u32)
}

#[cfg(test)]
mod tests {
    use super::super::Stratum;
    use super::*;

    fn strata(sizes: &[usize]) -> Strata {
        let mut start = 0;
        let strata = sizes.iter().map(|&size| {
            start += size;
            Stratum {
                name: String::new(),
                population: String::new(),
                visit: String::new(),
                year: 2003.0,
                generation: None,
                slots: start - size..start,
            }
        });
        Strata {
            strata: strata.collect(),
            individuals: Vec::new(),
        }
    }

    // By hand: 30 individuals have 60 copies, 80 % are 48; 7 have 14, 80 % are 11.2, so 10; 5 have
    // 10, 80 % are 8; of 4 and 3 the smaller has 6, 80 % are 4.8, so 4; 1 has 2, never below 2.
    #[test]
    fn gene_copies_by_default() {
        let cases: [(&[usize], Option<u32>); 6] = [
            (&[30, 40], Some(48)),
            (&[30, 7, 4], Some(10)),
            (&[5], Some(8)),
            (&[4, 3], Some(4)),
            (&[1], Some(2)),
            (&[], None),
        ];
        for (sizes, expected) in cases {
            assert_eq!(default_gene_copies(&strata(sizes)), expected, "{sizes:?}");
        }
    }
}
