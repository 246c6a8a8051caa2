//! The screening report from what was found.

mod odd;
mod pairs;
mod samples;

use std::collections::BTreeMap;

use crate::locus::runs::Run;
use crate::merge::screen::{ScreenScheme, ScreenSums};
use crate::model::{ScreenPlan, Strata};
use crate::report::screen_wire as wire;
use crate::screen::{
    FamilyEffect, Found, Grouped, Kinship, MatchRule, Matching, PairFound, PairKind,
    ScreenGenotypes, Telling, full_sib_families, groups_of, identity,
};

/// What the sheet says of a slot.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct SheetWord {
    /// Row of the sheet.
    pub row: u64,
    /// Whether it says yes under `use`.
    pub used: bool,
    /// Slot of the sample that this one is declared to repeat, where that has calls.
    pub repeats: Option<usize>,
    /// Its name.
    pub repeats_name: Option<String>,
}

/// Everything found, before it is put into words.
pub struct Screened<'a> {
    /// What was asked for.
    pub plan: &'a ScreenPlan,
    /// Samples by slot, replicates included.
    pub strata: &'a Strata,
    /// What the sheet says, by slot.
    pub words: &'a [SheetWord],
    /// How slots hang together.
    pub scheme: &'a ScreenScheme,
    /// Sums over loci.
    pub sums: &'a ScreenSums,
    /// Kept genotypes.
    pub genotypes: &'a ScreenGenotypes,
    /// The rule of matching.
    pub rule: &'a MatchRule,
    /// Pairs.
    pub found: &'a Found,
    /// Runs of homozygosity by slot; the reason where there are none.
    pub runs: Result<&'a [Vec<Run>], String>,
    /// Base pairs in reach of runs.
    pub covered: u64,
    stratum_of: Vec<usize>,
    grouped: Grouped,
    /// Whether a slot is a second sample of an individual of its stratum.
    spare: Vec<bool>,
    families: Vec<Vec<usize>>,
}

/// The parts of the report that come from findings.
pub struct Parts {
    /// Strata.
    pub strata: Vec<wire::ScreenedStratum>,
    /// Samples.
    pub samples: Vec<wire::ScreenedSample>,
    /// Groups.
    pub same_individual: Vec<wire::SameIndividual>,
    /// Chains.
    pub chains: Vec<wire::MatchingPair>,
    /// Declared replicates.
    pub replicates: Vec<wire::ReplicateCheck>,
    /// Error and dropout.
    pub genotyping: Vec<wire::GenotypingQuality>,
    /// Relatives.
    pub relatives: wire::Relatives,
    /// Families.
    pub families: wire::Families,
    /// Odd heterozygotes.
    pub odd_heterozygotes: wire::OddLoci<wire::OddHeterozygoteLocus>,
    /// Missing together.
    pub missing_together: BTreeMap<String, wire::OddLoci<wire::MissingTogetherLocus>>,
}

impl<'a> Screened<'a> {
    /// Groups samples and finds families.
    #[allow(clippy::too_many_arguments)] // one field each, named at the call by their variables
    pub fn new(
        plan: &'a ScreenPlan,
        strata: &'a Strata,
        words: &'a [SheetWord],
        scheme: &'a ScreenScheme,
        sums: &'a ScreenSums,
        genotypes: &'a ScreenGenotypes,
        rule: &'a MatchRule,
        found: &'a Found,
        runs: Result<&'a [Vec<Run>], String>,
        covered: u64,
    ) -> Self {
        let stratum_of: Vec<usize> = strata.individuals.iter().map(|i| i.stratum).collect();
        let mut screened = Screened {
            plan,
            strata,
            words,
            scheme,
            sums,
            genotypes,
            rule,
            found,
            runs,
            covered,
            grouped: groups_of(&found.pairs),
            spare: Vec::new(),
            families: Vec::new(),
            stratum_of,
        };
        screened.spare = screened.spare_samples();
        screened.families = full_sib_families(
            genotypes,
            &found.pairs,
            &screened.stratum_of,
            &screened.spare,
        );
        screened
    }

    /// Strata with families: the distinct individuals of each, and its families.
    pub fn families_by_stratum(&self) -> Vec<(usize, Vec<usize>, Vec<Vec<usize>>)> {
        let strata = 0..self.strata.strata.len();
        strata
            .filter_map(|s| {
                let families: Vec<Vec<usize>> = self
                    .families
                    .iter()
                    .filter(|f| self.stratum_of[f[0]] == s)
                    .cloned()
                    .collect();
                let slots = self.scheme.strata[s].clone();
                let distinct = slots.filter(|&slot| !self.spare[slot]).collect();
                (!families.is_empty()).then_some((s, distinct, families))
            })
            .collect()
    }

    /// Pairs to be listed as related, the closest first.
    pub fn related(&self) -> Vec<&'a PairFound> {
        let mut related: Vec<&PairFound> = self
            .found
            .pairs
            .iter()
            .filter(|pair| pair.kind != PairKind::Match)
            .collect();
        let kinship = |pair: &PairFound| pair.biallelic.kinship_between().unwrap_or(f64::MIN);
        related.sort_by(|a, b| {
            let ties = (a.first, a.second).cmp(&(b.first, b.second));
            kinship(b).total_cmp(&kinship(a)).then(ties)
        });
        related
    }

    /// Puts everything into words; `kinships` are of the first pairs of [`Screened::related`], and
    /// `effects` of [`Screened::families_by_stratum`].
    pub fn parts(&self, kinships: &[Option<Kinship>], effects: &[FamilyEffect]) -> Parts {
        Parts {
            strata: self.strata(),
            samples: self.samples(),
            same_individual: self.same_individual(),
            chains: self.chains(),
            replicates: self.replicates(),
            genotyping: self.genotyping(),
            relatives: self.relatives(kinships),
            families: self.families(effects),
            odd_heterozygotes: self.odd_heterozygotes(),
            missing_together: self.missing_together(),
        }
    }

    fn name(&self, slot: usize) -> String {
        self.strata.individuals[slot].sample.clone()
    }

    fn stratum_name(&self, slot: usize) -> String {
        self.strata.strata[self.stratum_of[slot]].name.clone()
    }

    fn matching(&self) -> Matching<'_> {
        Matching {
            genotypes: self.genotypes,
            rule: self.rule,
            stratum_of: &self.stratum_of,
            kinship: false,
        }
    }

    /// Of the samples of one individual in one stratum, all but the one of most genotypes; and
    /// declared replicates.
    fn spare_samples(&self) -> Vec<bool> {
        let mut spare: Vec<bool> = self
            .words
            .iter()
            .map(|w| w.repeats_name.is_some())
            .collect();
        for group in &self.grouped.groups {
            for &slot in group {
                let better = |&other: &usize| {
                    let typed = |s: usize| self.sums.samples[s].typed;
                    other != slot
                        && self.stratum_of[other] == self.stratum_of[slot]
                        && self.words[other].repeats_name.is_none()
                        && (typed(other), std::cmp::Reverse(other))
                            > (typed(slot), std::cmp::Reverse(slot))
                };
                spare[slot] |= group.iter().any(better);
            }
        }
        spare
    }

    fn strata(&self) -> Vec<wire::ScreenedStratum> {
        let all = self.strata.strata.iter().enumerate();
        all.map(|(s, stratum)| {
            let slots = self.scheme.strata[s].clone();
            let individuals = slots.clone().filter(|&slot| !self.spare[slot]).count() as u64;
            let found = identity(self.genotypes, s, individuals);
            let tells = |telling| match telling {
                Telling::Sibs => "full_sibs",
                Telling::MostSibs => "most_full_sibs",
                Telling::Unrelated => "unrelated_only",
                Telling::Nobody => "nobody",
            };
            wire::ScreenedStratum {
                stratum: stratum.name.clone(),
                samples: slots.len() as u64,
                individuals,
                loci: found.map_or(0, |i| i.loci as u64),
                log10_probability_of_identity: found.map(|i| i.unrelated),
                log10_probability_of_identity_sibs: found.map(|i| i.sibs),
                expected_chance_matches: found.map(|i| i.chance_matches),
                tells: found.map(|i| tells(i.telling).to_owned()),
                full_sibs_differ: self.rule.sibs_differ(s),
                fewest_telling_loci: self.rule.fewest_telling(s),
                most_mismatches: self.rule.limit(s, s, self.genotypes.loci() as u32),
            }
        })
        .collect()
    }
}
