//! Pairs: one individual, replicates, relatives, families.

use super::Screened;
use crate::locus::individuals::{Closeness, PairCounts};
use crate::report::screen_wire as wire;
use crate::screen::{
    FamilyEffect, KINSHIP_LOCI, Kinship, OutcomeTable, PairFound, PairKind, SizeBySample,
    exact_binomial, sib_like,
};

const LEVEL: f64 = 0.95;
/// Standard normal value of a 95 % interval.
const QUANTILE: f64 = 1.959_963_984_540_054;

impl Screened<'_> {
    fn pair(&self, first: usize, second: usize, all: &PairCounts) -> wire::MatchingPair {
        let (s, t) = (self.stratum_of[first], self.stratum_of[second]);
        wire::MatchingPair {
            samples: [self.name(first), self.name(second)],
            shared_loci: u64::from(all.shared),
            mismatches: u64::from(all.mismatching),
            dropout_like: u64::from(all.explained_by_dropout()),
            nothing_in_common: u64::from(all.nothing_in_common),
            most_mismatches: self.rule.limit(s, t, all.shared),
        }
    }

    fn compared(&self, first: usize, second: usize) -> wire::MatchingPair {
        let (_, all) = self.matching().compare(first, second);
        self.pair(first, second, &all)
    }

    pub(super) fn same_individual(&self) -> Vec<wire::SameIndividual> {
        let all = self.grouped.groups.iter();
        all.map(|group| wire::SameIndividual {
            samples: group.iter().map(|&slot| self.name(slot)).collect(),
            strata: group.iter().map(|&slot| self.stratum_name(slot)).collect(),
            kind: pairs_of(group)
                .map(|(a, b)| self.kind(a, b))
                .max()
                .map_or("", |(_, name)| name)
                .to_owned(),
            pairs: pairs_of(group).map(|(a, b)| self.compared(a, b)).collect(),
        })
        .collect()
    }

    fn kind(&self, a: usize, b: usize) -> (u8, &'static str) {
        let original = |slot: usize| self.words[slot].repeats.unwrap_or(slot);
        let stratum = |slot: usize| &self.strata.strata[self.stratum_of[slot]];
        if original(a) == original(b) {
            (0, "declared_replicates")
        } else if self.stratum_of[a] == self.stratum_of[b] {
            (1, "within_visit")
        } else if stratum(a).population == stratum(b).population {
            (2, "between_visits")
        } else {
            (3, "between_populations")
        }
    }

    pub(super) fn chains(&self) -> Vec<wire::MatchingPair> {
        let all = self.grouped.chains.iter().take(self.plan.list_pairs);
        all.map(|&(a, b)| self.compared(a, b)).collect()
    }

    fn declared(&self) -> impl Iterator<Item = (usize, usize)> {
        let words = self.words.iter().enumerate();
        words.filter_map(|(slot, word)| Some((slot, word.repeats?)))
    }

    pub(super) fn replicates(&self) -> Vec<wire::ReplicateCheck> {
        self.declared()
            .map(|(slot, of)| {
                let pair = self.compared(slot, of);
                let within = |limit: u32| pair.mismatches <= u64::from(limit);
                let matches = pair.most_mismatches.map(within);
                wire::ReplicateCheck { pair, matches }
            })
            .collect()
    }

    pub(super) fn genotyping(&self) -> Vec<wire::GenotypingQuality> {
        let matches = |&(a, b): &(usize, usize)| {
            let (_, all) = self.matching().compare(a, b);
            let limit = self
                .rule
                .limit(self.stratum_of[a], self.stratum_of[b], all.shared);
            limit.is_none_or(|limit| all.mismatching <= limit)
        };
        let declared: Vec<(usize, usize)> = self.declared().filter(matches).collect();
        let groups = self.grouped.groups.iter();
        let found: Vec<(usize, usize)> = groups
            .flat_map(|group| pairs_of(group).collect::<Vec<_>>())
            .filter(|&(a, b)| self.kind(a, b).0 == 1)
            .collect();
        [
            ("declared_replicates", declared),
            ("found_within_visits", found),
        ]
        .into_iter()
        .filter(|(_, pairs)| !pairs.is_empty())
        .map(|(from, pairs)| self.quality(from, &pairs))
        .collect()
    }

    fn quality(&self, from: &str, pairs: &[(usize, usize)]) -> wire::GenotypingQuality {
        let mut all = PairCounts::default();
        for &(a, b) in pairs {
            all.merge(&self.matching().compare(a, b).1);
        }
        let mut table = OutcomeTable::default();
        for (l, locus) in self.sums.panel.loci().iter().enumerate() {
            for &(a, b) in pairs {
                let of = &self.genotypes.strata[self.stratum_of[a]];
                if let Some(p) = of.biallelic[l] {
                    table.add(p, locus.dosage(a), locus.dosage(b));
                }
            }
        }
        let (one, both) = table.one_and_both_heterozygous();
        let rates = table.rates();
        let rate = |r: crate::screen::RateEstimate| wire::Rate {
            estimate: r.value,
            interval: r.interval,
        };
        wire::GenotypingQuality {
            from: from.to_owned(),
            pairs: pairs.len() as u64,
            mismatches: share(u64::from(all.mismatching), u64::from(all.shared)),
            heterozygote_lost: share(one, one + 2 * both),
            error_rate: rates.map(|r| rate(r.error)),
            dropout_rate: rates.map(|r| rate(r.dropout)),
        }
    }

    pub(super) fn relatives(&self, kinships: &[Option<Kinship>]) -> wire::Relatives {
        let loci = self.genotypes.places.len();
        let few = loci < KINSHIP_LOCI;
        let names = ["same", "first", "second", "third", "unrelated", "unknown"];
        let related = self.related();
        let listed = related.iter().zip(kinships);
        let pairs: Vec<wire::RelatedPair> = listed
            .filter_map(|(pair, kinship)| Some(self.related_pair(pair, kinship.as_ref()?)))
            .collect();
        let matching = self
            .found
            .pairs
            .iter()
            .filter(|p| p.kind == PairKind::Match);
        wire::Relatives {
            absent_because: few.then(|| {
                format!("{loci} loci of two alleles; kinship needs {KINSHIP_LOCI} or more")
            }),
            matching: matching.count() as u64,
            untold: self.found.untold,
            by_class: match few {
                true => Default::default(),
                false => names
                    .iter()
                    .zip(self.found.by_closeness)
                    .map(|(name, n)| ((*name).to_owned(), n))
                    .collect(),
            },
            not_listed: (related.len() - pairs.len()) as u64,
            pairs,
        }
    }

    fn related_pair(&self, pair: &PairFound, kinship: &Kinship) -> wire::RelatedPair {
        let (a, b) = (pair.first, pair.second);
        let together = self.stratum_of[a] == self.stratum_of[b];
        let first = kinship.class == Closeness::First && together;
        let likely = first
            .then(|| sib_like(self.genotypes, self.stratum_of[a], pair))
            .flatten();
        let half = kinship.standard_error.map(|error| QUANTILE * error);
        wire::RelatedPair {
            samples: [self.name(a), self.name(b)],
            kinship: kinship.value,
            standard_error: kinship.standard_error,
            interval: half.map(|half| [kinship.value - half, kinship.value + half]),
            class: match kinship.class {
                Closeness::Same => "same",
                Closeness::First => "first",
                Closeness::Second => "second",
                Closeness::Third => "third",
                Closeness::Unrelated => "unrelated",
            }
            .to_owned(),
            shared_loci: u64::from(pair.biallelic.shared),
            opposite_homozygotes: u64::from(pair.biallelic.nothing_in_common),
            likely: likely.map(|sibs| {
                if sibs {
                    "full_sibs"
                } else {
                    "parent_offspring"
                }
                .to_owned()
            }),
        }
    }

    pub(super) fn families(&self, effects: &[FamilyEffect]) -> wire::Families {
        let loci = self.genotypes.places.len();
        let family = |slots: &Vec<usize>| wire::Family {
            stratum: self.stratum_name(slots[0]),
            samples: slots.iter().map(|&slot| self.name(slot)).collect(),
        };
        let strata = self.families_by_stratum();
        let effect = strata
            .iter()
            .zip(effects)
            .map(|((s, _, _), effect)| wire::FamilySizes {
                stratum: self.strata.strata[*s].name.clone(),
                whole: size(&effect.whole),
                one_each: size(&effect.one_each),
            });
        wire::Families {
            absent_because: (loci < KINSHIP_LOCI).then(|| {
                format!("{loci} loci of two alleles; families need {KINSHIP_LOCI} or more")
            }),
            families: self.families.iter().map(family).collect(),
            effect: effect.collect(),
        }
    }
}

fn size(of: &SizeBySample) -> wire::FamilySize {
    wire::FamilySize {
        individuals: of.individuals as u64,
        loci: of.loci,
        estimate: of.size,
        unbounded: of.size.is_none() && of.absent.is_none(),
        interval: of.interval.map(|interval| [interval.low, interval.high]),
        absent_because: of.absent.clone(),
    }
}

fn share(cases: u64, of: u64) -> wire::Share {
    wire::Share {
        cases,
        of,
        share: (of > 0).then(|| cases as f64 / of as f64),
        interval: exact_binomial(cases, of, LEVEL),
    }
}

/// Every pair of a list, in its order.
fn pairs_of(group: &[usize]) -> impl Iterator<Item = (usize, usize)> {
    let each = group.iter().enumerate();
    each.flat_map(move |(i, &a)| group[i + 1..].iter().map(move |&b| (a, b)))
}
