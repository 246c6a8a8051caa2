//! Kinship of a pair with its interval.

use super::genotypes::ScreenGenotypes;
use crate::locus::individuals::{Closeness, PairCounts};
use crate::ne::interval::block_jackknife;

/// Fewest loci of two alleles for kinship: first degree needs several hundred, second thousands
/// (Manichaikul et al. 2010).
pub const KINSHIP_LOCI: usize = 500;
/// Fewest blocks behind an interval.
const FEWEST_BLOCKS: usize = 10;

/// The robust kinship of a pair.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Kinship {
    /// The coefficient.
    pub value: f64,
    /// Its class.
    pub class: Closeness,
    /// Standard error by leaving out blocks of neighbouring loci.
    pub standard_error: Option<f64>,
}

/// Kinship of two slots (between-family form of Manichaikul et al. 2010) with the standard error of a
/// block jackknife; none when one of them has no heterozygous locus.
pub fn kinship_interval(
    genotypes: &ScreenGenotypes,
    first: usize,
    second: usize,
) -> Option<Kinship> {
    let parts: Vec<PairCounts> = genotypes
        .blocks
        .iter()
        .map(|block| block.compare(first, second))
        .filter(|counts| counts.shared > 0)
        .collect();
    let mut all = PairCounts::default();
    parts.iter().for_each(|part| all.merge(part));
    let value = all.kinship_between()?;
    let without = |part: &PairCounts| without(&all, part).kinship_between();
    let deletes: Option<Vec<f64>> = parts.iter().map(without).collect();
    let weights: Vec<f64> = parts.iter().map(|part| f64::from(part.shared)).collect();
    let standard_error = deletes
        .filter(|deletes| deletes.len() >= FEWEST_BLOCKS)
        .and_then(|deletes| block_jackknife(value, &deletes, &weights))
        .map(|jackknife| jackknife.variance.sqrt());
    Some(Kinship {
        value,
        class: Closeness::of(value),
        standard_error,
    })
}

fn without(all: &PairCounts, part: &PairCounts) -> PairCounts {
    PairCounts {
        shared: all.shared - part.shared,
        heterozygous_first: all.heterozygous_first - part.heterozygous_first,
        heterozygous_second: all.heterozygous_second - part.heterozygous_second,
        both_heterozygous: all.both_heterozygous - part.both_heterozygous,
        nothing_in_common: all.nothing_in_common - part.nothing_in_common,
        mismatching: all.mismatching - part.mismatching,
    }
}
