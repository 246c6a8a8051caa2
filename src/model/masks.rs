//! What is masked while reading: records that are left out, genotypes that are taken as missing.

use std::borrow::Cow;
use std::collections::BTreeMap;
use std::path::PathBuf;

use serde::{Deserialize, Serialize};

use super::regions::Region;

/// Masks; the default masks nothing.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Masks {
    /// Genotypes of lower quality (GQ) are missing.
    pub below_gq: Option<u32>,
    /// Genotypes of lower depth (DP) are missing.
    pub below_dp: Option<u32>,
    /// Genotypes of higher depth are missing.
    pub above_dp: Option<u32>,
    /// Heterozygotes whose rarer called allele has a smaller share of the reads (AD) of both are missing.
    pub least_balance: Option<f64>,
    /// Records are kept when every one of their filters is listed; none keeps all.
    pub filters: Option<Vec<String>>,
    /// Whether records with an allele other than a single base are left out.
    pub snv_only: bool,
    /// Whether records of more than two alleles are left out.
    pub biallelic_only: bool,
    /// Contigs that are kept; none keeps all.
    pub contigs: Option<Vec<String>>,
    /// Contigs that are left out.
    pub without_contigs: Vec<String>,
    /// Regions that the run is about; none, and no BED file, is everything.
    pub regions: Vec<Region>,
    /// More of them, in a BED file.
    pub regions_bed: Option<PathBuf>,
}

/// Records left out and genotypes masked, by reason.
#[derive(Debug, Clone, Default, PartialEq, Eq, Serialize, Deserialize)]
pub struct MaskTally {
    /// Records.
    pub records: BTreeMap<Cow<'static, str>, u64>,
    /// Genotypes; they are among those that were read as diploid.
    pub genotypes: BTreeMap<Cow<'static, str>, u64>,
}

impl Masks {
    /// Whether nothing is masked.
    pub fn is_empty(&self) -> bool {
        *self == Masks::default()
    }

    /// Whether single genotypes are looked at.
    pub fn of_genotypes(&self) -> bool {
        self.below_gq.is_some()
            || self.below_dp.is_some()
            || self.above_dp.is_some()
            || self.least_balance.is_some()
    }

    /// The masks in force, for provenance.
    pub fn settings(&self) -> Vec<(&'static str, String)> {
        let number = |n: Option<u32>| n.map(|n| n.to_string());
        let list = |l: &Vec<String>| l.join(",");
        let yes = |b: bool| b.then(|| "yes".to_owned());
        let bed = self.regions_bed.as_ref().map(|p| p.display().to_string());
        let without = (!self.without_contigs.is_empty()).then(|| list(&self.without_contigs));
        [
            ("mask_below_gq", number(self.below_gq)),
            ("mask_below_dp", number(self.below_dp)),
            ("mask_above_dp", number(self.above_dp)),
            (
                "mask_below_balance",
                self.least_balance.map(|x| x.to_string()),
            ),
            ("filters", self.filters.as_ref().map(list)),
            ("snv_only", yes(self.snv_only)),
            ("biallelic_only", yes(self.biallelic_only)),
            ("contigs", self.contigs.as_ref().map(list)),
            ("without_contigs", without),
            (
                "regions",
                (!self.regions.is_empty()).then(|| regions(&self.regions)),
            ),
            ("regions_bed", bed),
        ]
        .into_iter()
        .filter_map(|(name, value)| Some((name, value?)))
        .collect()
    }
}

fn regions(list: &[Region]) -> String {
    let one = |r: &Region| match (r.from, r.to) {
        (0, u64::MAX) => r.contig.clone(),
        (from, u64::MAX) => format!("{}:{from}-", r.contig),
        (from, to) => format!("{}:{from}-{to}", r.contig),
    };
    list.iter().map(one).collect::<Vec<_>>().join(",")
}

impl MaskTally {
    /// Adds another tally; commutative and associative, with the default as identity.
    pub fn merge(&mut self, other: &MaskTally) {
        for (own, their) in [
            (&mut self.records, &other.records),
            (&mut self.genotypes, &other.genotypes),
        ] {
            for (reason, n) in their {
                *own.entry(reason.clone()).or_default() += n;
            }
        }
    }
}
