//! The loci of lowest p, as many as are listed.

use std::collections::BTreeMap;

use crate::model::Locus;

/// Heterozygotes of a locus in the strata where it varies.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct OddHeterozygotes {
    /// Combined score: above 0 too many, below 0 too few.
    pub score: f64,
    /// Typed individuals.
    pub individuals: u64,
    /// Heterozygous ones.
    pub heterozygotes: u64,
    /// Expected ones, without bias within each stratum (Nei 1978).
    pub expected: f64,
}

/// The group in which genotypes of a locus are missing together.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub struct MissingTogether {
    /// Number of the group.
    pub group: usize,
    /// Missing genotypes there.
    pub missing: u64,
    /// Samples there.
    pub group_size: u64,
    /// Missing genotypes elsewhere.
    pub missing_elsewhere: u64,
    /// Samples elsewhere.
    pub elsewhere: u64,
}

/// The `most` loci of lowest p; ties go by place, so that no order of offering matters.
#[derive(Debug, Clone, PartialEq)]
pub struct Ranked<T> {
    most: usize,
    found: BTreeMap<Rank, T>,
}

/// Where a locus stands: p first. Positive doubles are in the order of their bits.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord)]
pub struct Rank {
    bits: u64,
    /// Contig name.
    pub contig: String,
    /// 1-based position.
    pub position: u64,
    /// Identifier as written, empty when absent.
    pub id: String,
    record: u64,
}

impl Rank {
    /// The p.
    pub fn p(&self) -> f64 {
        f64::from_bits(self.bits)
    }
}

impl<T> Ranked<T> {
    /// Nothing yet.
    pub fn new(most: usize) -> Self {
        Ranked {
            most,
            found: BTreeMap::new(),
        }
    }

    /// Whether a locus of this `p` may enter.
    pub fn takes(&self, p: f64) -> bool {
        let last = self.found.last_key_value();
        self.found.len() < self.most || last.is_some_and(|(last, _)| p.to_bits() <= last.bits)
    }

    /// Offers a locus with `p` from 0 to 1.
    pub fn offer(&mut self, p: f64, locus: &Locus, value: T) {
        let rank = Rank {
            bits: p.to_bits(),
            contig: locus.contig.clone(),
            position: locus.position,
            id: locus.id.clone(),
            record: locus.record,
        };
        self.found.insert(rank, value);
        self.trim();
    }

    /// Adds another list.
    pub fn merge(&mut self, other: Self) {
        self.found.extend(other.found);
        self.trim();
    }

    /// From the lowest p up.
    pub fn iter(&self) -> impl Iterator<Item = (&Rank, &T)> {
        self.found.iter()
    }

    fn trim(&mut self) {
        while self.found.len() > self.most {
            self.found.pop_last();
        }
    }
}
