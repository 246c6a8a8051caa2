//! What is counted, once it is known who was sampled where: shared by all workers and shards.

use std::ops::Range;

use crate::model::{Comparison, ComparisonKind, Strata};

/// Memory that windows of one worker may take, in bytes; their number follows from it.
const WINDOW_MEMORY: usize = 16 << 20;
/// Windows beyond which an interval gains nothing: blocks are made of the longest windows of which
/// there are at least 20.
const MOST_WINDOWS: usize = 1024;

/// The strata, the pairs to compare and the thresholds of one run.
#[derive(Debug, Clone, PartialEq)]
pub struct Scheme {
    /// Slots of each stratum.
    pub strata: Vec<Range<usize>>,
    /// Pairs of strata, in the order of the comparisons.
    pub pairs: Vec<Pair>,
    /// The latest stratum of each population.
    pub latest: Vec<usize>,
    /// Strata that share a visit, where there are at least two.
    pub visits: Vec<Vec<usize>>,
    /// Smallest share of individuals typed for a locus to count in a stratum.
    pub min_call_rate: f64,
    /// Gene copies that richness is rarefied to.
    pub gene_copies: u32,
    /// Most alleles kept by name in each list.
    pub most_listed: usize,
}

/// Two strata to compare.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Pair {
    /// The first (earlier) stratum.
    pub from: usize,
    /// The second (later) stratum.
    pub to: usize,
    /// Whether both are visits of one population, so that alleles have a fate.
    pub in_time: bool,
}

impl Scheme {
    /// The scheme of strata and comparisons.
    pub fn new(
        strata: &Strata,
        comparisons: &[Comparison],
        min_call_rate: f64,
        gene_copies: u32,
        most_listed: usize,
    ) -> Self {
        let all = &strata.strata;
        let mut visits: Vec<Vec<usize>> = Vec::new();
        for (i, stratum) in all.iter().enumerate() {
            let same = |v: &&mut Vec<usize>| all[v[0]].visit == stratum.visit;
            match visits.iter_mut().find(same) {
                Some(visit) => visit.push(i),
                None => visits.push(vec![i]),
            }
        }
        visits.retain(|v| v.len() > 1);
        // Strata come by population, then year: the last of each run is the latest.
        let next_differs = |i: &usize| {
            all.get(i + 1)
                .is_none_or(|n| n.population != all[*i].population)
        };
        Scheme {
            strata: all.iter().map(|s| s.slots.clone()).collect(),
            pairs: comparisons
                .iter()
                .map(|c| Pair {
                    from: c.from,
                    to: c.to,
                    in_time: c.kind != ComparisonKind::BetweenPopulations,
                })
                .collect(),
            latest: (0..all.len()).filter(next_differs).collect(),
            visits,
            min_call_rate,
            gene_copies,
            most_listed,
        }
    }

    /// Number of individuals in use.
    pub fn slots(&self) -> usize {
        self.strata.last().map_or(0, |s| s.end)
    }

    /// Windows that each sum may keep, so that all of them together stay in bounded memory.
    pub fn most_windows(&self) -> usize {
        let sums = 12 * self.strata.len() + 28 * self.pairs.len() + 1;
        (WINDOW_MEMORY / (16 * sums)).clamp(64, MOST_WINDOWS)
    }

    /// Whether a locus with `typed` individuals counts in stratum `s`.
    pub fn counts_in(&self, s: usize, typed: u32) -> bool {
        typed > 0 && f64::from(typed) >= self.min_call_rate * self.strata[s].len() as f64
    }
}
