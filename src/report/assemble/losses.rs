//! Lost or missed, and loci beyond drift: what the estimated effective size explains.

use super::Findings;
use super::batches::{self, Between};
use super::effective_size::Fits;
use crate::merge::fates::{FateKey, Fates, MissingAllele};
use crate::model::{Comparison, ComparisonKind};
use crate::ne::estimate::{Absence, quantile};
use crate::ne::likelihood::RateWeight;
use crate::ne::testing::benjamini_hochberg;
use crate::outlook::losses::{
    BaselineCount, CallLimits, Chances, LossCall, LossTable, LossTally, Pool, Side, Watch,
};
use crate::outlook::outliers::OutlierTest;
use crate::report::wire;

/// Loci named in the list of outliers.
const MOST_OUTLIERS: usize = 100;

/// What the effective size of a population makes of one of its comparisons in time.
pub struct Explained<'a> {
    fits: &'a Fits,
    comparison: &'a Comparison,
    fates: &'a Fates,
    generations: f64,
}

impl<'a> Explained<'a> {
    /// `None` where no effective size or no time is known.
    pub fn of(findings: &'a Findings, index: usize) -> Option<Self> {
        let comparison = &findings.comparisons[index];
        let population = &findings.strata.strata[comparison.from].population;
        let fits = findings
            .fits
            .iter()
            .find(|f| f.visits.population == *population)?;
        let generations = comparison.generations.filter(|&t| t > 0.0)?;
        let known =
            comparison.kind != ComparisonKind::BetweenPopulations && !fits.weights.is_empty();
        let fates = &findings.sums.pairs[index].fates;
        known.then_some(Explained {
            fits,
            comparison,
            fates,
            generations,
        })
    }

    fn table(&self, weights: &[RateWeight]) -> LossTable {
        let most = self
            .fates
            .by_key()
            .map(|(key, _)| key.later_typed)
            .max()
            .unwrap_or(0);
        let counts: Vec<BaselineCount> = self
            .fates
            .by_key()
            .map(|(key, fate)| BaselineCount {
                copies: key.baseline_copies,
                typed: key.baseline_typed,
                alleles: fate.seen + fate.not_seen,
            })
            .collect();
        // The parents of a baseline sample were as few as their successors, as far as anyone knows.
        LossTable::new(
            self.fits.prior,
            &counts,
            Pool::Finite,
            weights,
            self.generations,
            most,
        )
    }

    /// The fates of all alleles of the first visit.
    pub fn alleles(&self, level: f64) -> wire::AlleleFates {
        let mut table = self.table(&self.fits.weights);
        let limits = CallLimits::default();
        let mut tally = LossTally::default();
        for (key, fate) in self.fates.by_key() {
            let chances = table.chances(watch(&key));
            for _ in 0..fate.not_seen {
                tally.add(&limits, chances.lost_if_not_seen);
            }
        }
        let (expected, deviation) = self.expected();
        let half = quantile(level, f64::INFINITY) * deviation;
        let interval = [(expected - half).max(0.0), expected + half];
        wire::AlleleFates {
            baseline: self.fates.alleles(),
            not_seen_again: self.fates.not_seen(),
            expected_not_seen_again: Some(expected),
            expected_interval: Some(interval),
            faster_than_explained: Some(self.fates.not_seen() as f64 > interval[1]),
            probably_lost: Some(tally.lost),
            expected_share_wrong: tally.share_wrong(),
            absent_because: None,
        }
    }

    /// Expected number of alleles not seen again and its standard deviation: over drift and sampling
    /// at each effective size, widened by what linked loci and shared individuals add, and over the
    /// effective sizes.
    fn expected(&self) -> (f64, f64) {
        let mut by_rate = Vec::new();
        for rate in &thinned(&self.fits.weights) {
            let mut table = self.table(&[RateWeight {
                rate: rate.rate,
                weight: 1.0,
            }]);
            let (mut mean, mut variance) = (0.0, 0.0);
            for (key, fate) in self.fates.by_key() {
                let Chances { not_seen, .. } = table.chances(watch(&key));
                let n = (fate.seen + fate.not_seen) as f64;
                mean += n * not_seen;
                variance += n * not_seen * (1.0 - not_seen);
            }
            by_rate.push((rate.weight, mean, variance * self.fits.inflation()));
        }
        let mean: f64 = by_rate.iter().map(|(w, m, _)| w * m).sum();
        let variance: f64 = by_rate
            .iter()
            .map(|(w, m, v)| w * (v + (m - mean).powi(2)))
            .sum();
        (mean, variance.sqrt())
    }

    /// The alleles not seen again that are kept by name.
    fn losses(&self, findings: &Findings) -> Vec<wire::Loss> {
        let mut table = self.table(&self.fits.weights);
        let population = &findings.strata.strata[self.comparison.from].population;
        let one = |missing: &MissingAllele| {
            let chances = table.chances(Watch {
                side: Side::Counted,
                baseline_copies: missing.baseline_copies,
                baseline_typed: missing.baseline_typed,
                later_typed: missing.later_typed,
            });
            let call = CallLimits::default().call(chances.lost_if_not_seen);
            loss(missing, population, chances.lost_if_not_seen, Some(call))
        };
        self.fates.missing().map(one).collect()
    }

    /// Biallelic loci of the panel whose change drift does not explain.
    pub fn outliers(&self, findings: &Findings) -> wire::Outliers {
        let [from, to] =
            [self.comparison.from, self.comparison.to].map(|s| &findings.strata.strata[s]);
        let most = 2 * to.individuals() as u32;
        let mut test =
            OutlierTest::new(self.fits.prior, &self.fits.weights, self.generations, most);
        let mut loci = Vec::new();
        for locus in findings
            .sums
            .panel
            .loci()
            .filter(|l| l.genotypes.is_biallelic())
        {
            let [first, later] =
                [from, to].map(|s| count(&locus.genotypes.dosages()[s.slots.clone()]));
            let varies = first.0 + later.0 > 0 && first.0 + later.0 < first.1 + later.1;
            if let Some(p) = test.p(first, later).filter(|_| varies) {
                loci.push((locus, first, later, p));
            }
        }
        let q = benjamini_hochberg(&loci.iter().map(|l| Some(l.3)).collect::<Vec<_>>());
        let mut found: Vec<wire::OutlierLocus> = loci
            .iter()
            .zip(q)
            .filter_map(|(&(locus, first, later, p), q)| {
                Some(wire::OutlierLocus {
                    contig: locus.contig.clone(),
                    position: locus.position,
                    frequency_from: f64::from(first.0) / f64::from(first.1),
                    frequency_to: f64::from(later.0) / f64::from(later.1),
                    p,
                    q: q?,
                })
            })
            .filter(|l| l.q <= findings.false_discovery_rate)
            .collect();
        let order = |l: &wire::OutlierLocus| (l.contig.clone(), l.position);
        found.sort_by(|a, b| a.p.total_cmp(&b.p).then_with(|| order(a).cmp(&order(b))));
        wire::Outliers {
            tested: loci.len() as u64,
            false_discovery_rate: findings.false_discovery_rate,
            found: found.len() as u64,
            other_causes: match found.is_empty() {
                true => Vec::new(),
                false => other_causes(findings, self.comparison),
            },
            list: found.into_iter().take(MOST_OUTLIERS).collect(),
        }
    }
}

/// What else than selection moves single loci, in order of what to look at first.
fn other_causes(findings: &Findings, comparison: &Comparison) -> Vec<String> {
    let batches = match batches::between(findings.strata, comparison) {
        Between::Confounded => {
            "genotyping batch: the two visits share no batch, so loci called differently in one of \
             them look like change; genotype some old samples again beside the new"
        }
        Between::Shared => {
            "genotyping batch: loci called differently in one batch; compare their frequencies within \
             the batches that hold both visits"
        }
        Between::Unknown => {
            "genotyping batch: loci called differently at one visit; the sheet names no batches"
        }
    };
    [
        batches,
        "linked loci: neighbours in the list may share one cause",
        "sex linkage: loci of a sex chromosome among autosomes, with another sex ratio in the sample",
        "immigrants or released animals with other frequencies",
    ]
    .map(str::to_owned)
    .to_vec()
}

/// Every second rate with the weight of the one beside it: the number of alleles expected to be
/// missing is smooth in the rate, and each rate costs a passage of its own.
fn thinned(weights: &[RateWeight]) -> Vec<RateWeight> {
    let pair = |pair: &[RateWeight]| {
        let weight: f64 = pair.iter().map(|w| w.weight).sum();
        let rate: f64 = pair.iter().map(|w| w.weight * w.rate).sum();
        RateWeight {
            rate: if weight > 0.0 {
                rate / weight
            } else {
                pair[0].rate
            },
            weight,
        }
    };
    weights.chunks(2).map(pair).collect()
}

/// Fates without an effective size to explain them.
pub fn unexplained(fates: &Fates, generations: Option<f64>) -> wire::AlleleFates {
    let why = match generations {
        None => Absence::GenerationsUnknown.text(),
        Some(_) => "no temporal likelihood of the effective size to explain them",
    };
    wire::AlleleFates {
        baseline: fates.alleles(),
        not_seen_again: fates.not_seen(),
        expected_not_seen_again: None,
        expected_interval: None,
        faster_than_explained: None,
        probably_lost: None,
        expected_share_wrong: None,
        absent_because: Some(why.to_owned()),
    }
}

/// Baseline alleles that the latest visit of each population does not show.
pub fn losses(findings: &Findings) -> Vec<wire::Loss> {
    let latest = &findings.sums.scheme().latest;
    let mut losses = Vec::new();
    for (i, comparison) in findings.comparisons.iter().enumerate() {
        let since = comparison.kind == ComparisonKind::SinceBaseline;
        if !since || !latest.contains(&comparison.to) {
            continue;
        }
        match Explained::of(findings, i) {
            Some(explained) => losses.extend(explained.losses(findings)),
            None => {
                let population = &findings.strata.strata[comparison.from].population;
                let missing = findings.sums.pairs[i].fates.missing();
                losses.extend(missing.map(|m| loss(m, population, None, None)));
            }
        }
    }
    losses
}

fn loss(
    missing: &MissingAllele,
    population: &str,
    probability_lost: Option<f64>,
    call: Option<LossCall>,
) -> wire::Loss {
    let place = format!("{}:{}", missing.contig, missing.position);
    wire::Loss {
        locus: if missing.id.is_empty() {
            place
        } else {
            missing.id.clone()
        },
        contig: missing.contig.clone(),
        position: missing.position,
        allele: String::from_utf8_lossy(&missing.allele).into_owned(),
        population: population.to_owned(),
        baseline_count: missing.baseline_copies.into(),
        baseline_copies: missing.baseline_typed.into(),
        latest_count: 0,
        latest_copies: missing.later_typed.into(),
        probability_lost,
        call: call.map(|call| match call {
            LossCall::Lost => wire::LossCall::Lost,
            LossCall::Missed => wire::LossCall::Missed,
            LossCall::Uncertain => wire::LossCall::Uncertain,
        }),
    }
}

fn watch(key: &FateKey) -> Watch {
    Watch {
        // The prior is symmetric: it was fitted to both sides of every locus.
        side: Side::Counted,
        baseline_copies: key.baseline_copies,
        baseline_typed: key.baseline_typed,
        later_typed: key.later_typed,
    }
}

/// Copies of allele 1 and gene copies typed.
fn count(dosages: &[u8]) -> (u32, u32) {
    let typed = dosages.iter().filter(|&&d| d <= 2);
    (
        typed.clone().map(|&d| u32::from(d)).sum(),
        2 * typed.count() as u32,
    )
}
