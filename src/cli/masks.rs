//! Flags of what is masked while reading.

use std::path::PathBuf;

use clap::Args;

use super::common;
use crate::model::{Masks, Region};

/// Masks.
#[derive(Debug, Clone, Args)]
#[command(next_help_heading = "Masks")]
pub(super) struct MaskFlags {
    /// Take genotypes of lower quality (GQ) as missing
    ///
    /// A genotype without the field is kept; each that is masked is counted.
    #[arg(long, value_name = "N")]
    mask_below_gq: Option<u32>,
    /// Take genotypes of lower depth (DP) as missing
    #[arg(long, value_name = "N")]
    mask_below_dp: Option<u32>,
    /// Take genotypes of higher depth (DP) as missing
    #[arg(long, value_name = "N")]
    mask_above_dp: Option<u32>,
    /// Take heterozygotes as missing whose rarer allele has a smaller share of the reads (AD)
    #[arg(long, value_name = "X", value_parser = common::share)]
    mask_below_balance: Option<f64>,
    /// Keep records of which every filter is listed, as in PASS,. (a dot is "not filtered")
    #[arg(long, value_name = "LIST", value_delimiter = ',')]
    filters: Vec<String>,
    /// Leave out records with an allele other than a single base
    #[arg(long)]
    snv_only: bool,
    /// Leave out records of more than two alleles
    #[arg(long)]
    biallelic_only: bool,
    /// Keep these contigs alone
    #[arg(long, value_name = "LIST", value_delimiter = ',')]
    contigs: Vec<String>,
    /// Leave out these contigs, such as sex chromosomes
    #[arg(long, value_name = "LIST", value_delimiter = ',')]
    without_contigs: Vec<String>,
    /// Read the records at these places alone: CONTIG, CONTIG:FROM-TO, CONTIG:FROM-; several with commas
    ///
    /// By the position of a record (POS), from 1, ends included. With an index (.csi or .tbi) beside BGZF
    /// calls only their blocks are read; otherwise all is read, which is told. Records elsewhere are as if
    /// they were not in the file.
    #[arg(long, value_name = "REGION", value_delimiter = ',', value_parser = Region::parse)]
    region: Vec<Region>,
    /// The same, from a BED file (positions from 0, ends not included)
    #[arg(long, value_name = "FILE")]
    regions_bed: Option<PathBuf>,
}

impl MaskFlags {
    /// What was typed, as what is meant.
    pub fn masks(self) -> Masks {
        let some = |list: Vec<String>| (!list.is_empty()).then_some(list);
        Masks {
            below_gq: self.mask_below_gq,
            below_dp: self.mask_below_dp,
            above_dp: self.mask_above_dp,
            least_balance: self.mask_below_balance,
            filters: some(self.filters),
            snv_only: self.snv_only,
            biallelic_only: self.biallelic_only,
            contigs: some(self.contigs),
            without_contigs: self.without_contigs,
            regions: self.region,
            regions_bed: self.regions_bed,
        }
    }
}
