//! Loci that are not what they seem.

use std::collections::BTreeMap;

use super::Screened;
use crate::locus::signs::unseen_allele_frequency;
use crate::merge::histogram::{PValueHistogram, Rejections};
use crate::report::screen_wire as wire;

impl Screened<'_> {
    pub(super) fn odd_heterozygotes(&self) -> wire::OddLoci<wire::OddHeterozygoteLocus> {
        let rejections = self.rejections(&self.sums.heterozygotes);
        let listed = self.sums.odd_heterozygotes.iter();
        let loci = listed
            .take(rejections.rejected() as usize)
            .map(|(rank, odd)| {
                let excess = odd.score > 0.0;
                let (observed, all) = (odd.heterozygotes as f64, odd.individuals as f64);
                wire::OddHeterozygoteLocus {
                    contig: rank.contig.clone(),
                    position: rank.position,
                    id: rank.id.clone(),
                    p: rank.p(),
                    direction: if excess { "excess" } else { "deficit" }.to_owned(),
                    individuals: odd.individuals,
                    heterozygotes: odd.heterozygotes,
                    expected: odd.expected,
                    unseen_allele_frequency: (!excess)
                        .then(|| unseen_allele_frequency(observed, odd.expected, all))
                        .flatten(),
                    duplicated_like: excess && 2 * odd.heterozygotes > odd.individuals,
                }
            });
        let directions = [
            ("excess", rejections.excess),
            ("deficit", rejections.deficit),
        ];
        self.odd(rejections, &directions, loci.collect())
    }

    pub(super) fn missing_together(
        &self,
    ) -> BTreeMap<String, wire::OddLoci<wire::MissingTogetherLocus>> {
        let all = self.scheme.groupings.iter().enumerate();
        all.map(|(which, grouping)| {
            let rejections = self.rejections(&self.sums.missing[which]);
            let listed = self.sums.missing_together[which].iter();
            let loci = listed
                .take(rejections.rejected() as usize)
                .map(|(rank, found)| wire::MissingTogetherLocus {
                    contig: rank.contig.clone(),
                    position: rank.position,
                    id: rank.id.clone(),
                    p: rank.p(),
                    group: grouping.names[found.group].clone(),
                    missing: found.missing,
                    samples: found.group_size,
                    missing_elsewhere: found.missing_elsewhere,
                    samples_elsewhere: found.elsewhere,
                });
            let directions = [("missing_together", rejections.rejected())];
            let odd = self.odd(rejections, &directions, loci.collect());
            (grouping.by.to_owned(), odd)
        })
        .collect()
    }

    fn rejections(&self, histogram: &PValueHistogram) -> Rejections {
        histogram.rejections(self.plan.false_discovery_rate)
    }

    fn odd<T>(
        &self,
        rejections: Rejections,
        directions: &[(&str, u64)],
        loci: Vec<T>,
    ) -> wire::OddLoci<T> {
        wire::OddLoci {
            tested: rejections.tested,
            rejected: directions
                .iter()
                .map(|(name, n)| ((*name).to_owned(), *n))
                .collect(),
            false_discovery_rate: self.plan.false_discovery_rate,
            loci,
        }
    }
}
