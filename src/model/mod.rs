//! Types with units that every part speaks. Imports nothing of ours.

mod comparisons;
mod locus;
mod masks;
mod matching;
mod notes;
mod plan;
mod programme;
mod regions;
mod screen_plan;
mod strata;

pub use comparisons::{Compared, comparisons};
pub use locus::{
    CallTally, Genotypes, Locus, MAX_ALLELES, MISSING_ALLELE, MISSING_DOSAGE, Verdict,
};
pub use masks::{MaskTally, Masks};
pub use matching::{Matched, UNUSED_COLUMN, match_samples, told_absent};
pub use notes::{Note, Problem, nearest, plain_letters, spell_out};
pub use plan::{
    DEFAULT_FALSE_DISCOVERY_RATE, DEFAULT_LEVEL, DEFAULT_LIST_LOSSES, DEFAULT_MIN_CALL_RATE,
    DEFAULT_SAMPLING_PLAN, MeasurePlan, default_gene_copies,
};
pub use programme::{LifeHistory, PopulationSettings, Programme, SamplingPlan};
pub use regions::{Region, Regions};
pub use screen_plan::{
    DEFAULT_LIST_LOCI, DEFAULT_LIST_PAIRS, DEFAULT_MIN_SAMPLE_CALL_RATE, DEFAULT_SCREEN_LOCI,
    RunRule, SCREEN_REPEATS, ScreenPlan,
};
pub use strata::{
    Comparison, ComparisonKind, Individual, Replicate, Sex, SheetRow, Strata, Stratified, Stratum,
    strata_of,
};

/// Bytes as hexadecimal digits, two a byte.
pub fn hexadecimal(bytes: &[u8]) -> String {
    bytes.iter().map(|byte| format!("{byte:02x}")).collect()
}

/// A hash that is the same on every machine and in every version: FNV-1a with a final mix.
///
/// Used to spread loci and contigs over a bounded number of groups without regard to their order.
pub fn stable_hash(bytes: &[u8]) -> u64 {
    let mut h: u64 = 0xcbf2_9ce4_8422_2325;
    for &b in bytes {
        h = (h ^ u64::from(b)).wrapping_mul(0x0000_0100_0000_01b3);
    }
    h ^= h >> 33;
    h = h.wrapping_mul(0xff51_afd7_ed55_8ccd);
    h ^= h >> 33;
    h
}
