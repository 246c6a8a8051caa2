//! What `screen` will do: every choice made, each default with its reason.

use std::path::PathBuf;

use super::Masks;

/// Loci of two alleles whose genotypes are kept for pairs. Pairs gain nothing beyond; 2000 samples
/// take 25 MB.
pub const DEFAULT_SCREEN_LOCI: usize = 50_000;
/// Loci of more alleles that are kept: they are compared one by one, and repeats are few.
pub const SCREEN_REPEATS: usize = 200;
/// Least share of records typed for a sample to be used: below, what is typed is seldom right.
pub const DEFAULT_MIN_SAMPLE_CALL_RATE: f64 = 0.5;
/// Pairs listed by name; all are counted anyway.
pub const DEFAULT_LIST_PAIRS: usize = 1000;
/// Loci listed for each kind of oddity; all are counted anyway.
pub const DEFAULT_LIST_LOCI: usize = 200;

/// What counts as a run of homozygosity.
///
/// By default 30 typed loci over 1 Mb with at most one heterozygous and five missing ones inside, and
/// no gap above 500 kb: 30 loci of heterozygosity 0.3 are homozygous by chance in 1 of 44 000 places,
/// a wider gap may hide what nothing tells of.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct RunRule {
    /// Fewest typed loci.
    pub fewest_loci: u32,
    /// Least length in base pairs, first to last homozygous locus.
    pub shortest: u64,
    /// Heterozygous loci that a run may hold, for genotyping errors.
    pub most_heterozygous: u32,
    /// Missing loci that a run may hold.
    pub most_missing: u32,
    /// Largest distance between neighbouring loci in base pairs; a wider gap ends a run.
    pub widest_gap: u64,
}

impl Default for RunRule {
    fn default() -> Self {
        RunRule {
            fewest_loci: 30,
            shortest: 1_000_000,
            most_heterozygous: 1,
            most_missing: 5,
            widest_gap: 500_000,
        }
    }
}

/// Everything `screen` needs to know, checked in itself; files are not yet opened.
#[derive(Debug, Clone, PartialEq)]
pub struct ScreenPlan {
    /// Files of genotype calls, at least one; `-` is standard input.
    pub calls: Vec<PathBuf>,
    /// The sample sheet.
    pub sheet: PathBuf,
    /// What is masked while reading.
    pub masks: Masks,
    /// Where the loci of a tidy genotype table are.
    pub locus_map: Option<PathBuf>,
    /// Where the report goes; standard output when absent.
    pub output: Option<PathBuf>,
    /// Where the sheet with `use` and `why` goes, if anywhere.
    pub clean_sheet: Option<PathBuf>,
    /// Whether samples of the sheet may lack calls.
    pub allow_absent: bool,
    /// Loci of two alleles whose genotypes are kept.
    pub most_loci: usize,
    /// Loci that both samples of a match must be typed at; 0 leaves it to what the panel can tell.
    pub fewest_shared: u32,
    /// Share of the shared loci that may differ in one individual; found from the panel when absent.
    pub most_mismatching: Option<f64>,
    /// Least share of records typed for a sample to be used.
    pub min_sample_call_rate: f64,
    /// Share of false findings accepted among loci called odd.
    pub false_discovery_rate: f64,
    /// Most pairs listed.
    pub list_pairs: usize,
    /// Most loci listed for each oddity.
    pub list_loci: usize,
    /// What counts as a run of homozygosity.
    pub runs: RunRule,
    /// Threads; all cores when absent.
    pub threads: Option<usize>,
    /// Whether notes stay off standard error.
    pub quiet: bool,
}

impl ScreenPlan {
    /// The plan with every default.
    pub fn new(calls: Vec<PathBuf>, sheet: PathBuf) -> Self {
        ScreenPlan {
            calls,
            sheet,
            locus_map: None,
            masks: Masks::default(),
            output: None,
            clean_sheet: None,
            allow_absent: false,
            most_loci: DEFAULT_SCREEN_LOCI,
            fewest_shared: 0,
            most_mismatching: None,
            min_sample_call_rate: DEFAULT_MIN_SAMPLE_CALL_RATE,
            false_discovery_rate: super::DEFAULT_FALSE_DISCOVERY_RATE,
            list_pairs: DEFAULT_LIST_PAIRS,
            list_loci: DEFAULT_LIST_LOCI,
            runs: RunRule::default(),
            threads: None,
            quiet: false,
        }
    }
}
