//! Samples and loci looked at for themselves: who was genotyped twice, who is related, how far the
//! calls can be trusted. From the sums of [`crate::merge::screen`] to findings; no file, no thread.

mod families;
mod genotypes;
mod groups;
mod identity;
mod matching;
mod rates;
mod related;

pub use families::{
    FAMILY_LOCI, FamilyEffect, SizeBySample, family_effect, full_sib_families, sib_like,
};
pub use genotypes::{ScreenGenotypes, StratumFrequencies};
pub use groups::{Grouped, groups_of};
pub use identity::{Identity, Telling, identity};
pub use matching::{Found, MatchRule, Matching, PairFound, PairKind};
pub use rates::{GenotypingRates, OutcomeTable, RateEstimate, exact_binomial};
pub use related::{KINSHIP_LOCI, Kinship, kinship_interval};
