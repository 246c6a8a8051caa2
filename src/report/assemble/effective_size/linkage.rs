//! Effective size from linkage between loci in one sample.

use super::{FEWEST_INDIVIDUALS, Subject, entry};
use crate::locus::Counts;
use crate::merge::gram::{ContigPairs, FrequencyCutoff, GramStratum};
use crate::model::Stratum;
use crate::ne::estimate::{Absence, quantile};
use crate::ne::linkage::{
    LinkageEstimate, LinkagePairs, LinkagePanel, Mating, adjust_for_overlap, chromosome_ratio,
    map_length_ratio,
};
use crate::report::assemble::Findings;
use crate::report::wire;

/// More contigs than this are taken for scaffolds: few animals and plants have so many chromosomes.
const MOST_CHROMOSOMES: usize = 100;

/// For each stratum: three frequency cutoffs under random mating, and the strictest under lifetime
/// monogamy and, with a life history, adjusted for overlapping generations.
pub fn entries(findings: &Findings) -> Vec<wire::EffectiveSize> {
    let all = findings.strata.strata.iter().zip(&findings.sums.strata);
    all.flat_map(|(stratum, sums)| match &sums.linkage {
        Ok(gram) if stratum.individuals() >= FEWEST_INDIVIDUALS => {
            of_stratum(findings, stratum, gram.clone())
        }
        Ok(_) => vec![absent(findings, stratum, "fewer than 5 individuals")],
        Err(why) => vec![absent(findings, stratum, &why.to_string())],
    })
    .collect()
}

fn of_stratum(
    findings: &Findings,
    stratum: &Stratum,
    mut gram: GramStratum,
) -> Vec<wire::EffectiveSize> {
    let mut entries = Vec::new();
    for cutoff in FrequencyCutoff::ALL {
        let sums = gram.pairs(cutoff);
        let pairs = pairs(findings, stratum, sums.contigs());
        let strictest = cutoff == FrequencyCutoff::FivePercent;
        let variance = panel(findings, stratum, cutoff).individual_variance(pairs);
        let matings: &[Mating] = if strictest {
            &[Mating::Random, Mating::LifetimeMonogamy]
        } else {
            &[Mating::Random]
        };
        for &mating in matings {
            let made = Made {
                findings,
                stratum,
                sums: &sums,
                pairs,
                cutoff,
                mating,
                variance,
            };
            entries.extend(made.entries());
        }
    }
    entries
}

/// Loci on different contigs, where contigs are chromosomes; all pairs where there is one contig, or
/// where there are so many more contigs than chromosomes that they must be pieces of these.
fn pairs(findings: &Findings, stratum: &Stratum, contigs: usize) -> LinkagePairs {
    let chromosomes = findings
        .programme
        .get(&stratum.population, |p| p.chromosomes);
    let pieces = chromosomes.is_some_and(|n| contigs > 2 * n as usize);
    match contigs < 2 || pieces {
        true => LinkagePairs::All,
        false => LinkagePairs::BetweenContigs,
    }
}

/// The genotypes of the panel in one stratum, for leaving out individuals.
fn panel(findings: &Findings, stratum: &Stratum, cutoff: FrequencyCutoff) -> LinkagePanel {
    let mut panel = LinkagePanel::new(stratum.individuals(), cutoff);
    let mut counts = Counts::default();
    for locus in findings.sums.panel.loci() {
        counts.recount(&locus.genotypes, stratum.slots.clone());
        panel.push(
            locus.contig_hash,
            &locus.genotypes,
            stratum.slots.clone(),
            &counts,
        );
    }
    panel
}

/// The expected ratio of an estimate from all pairs of loci to the truth.
struct Correction {
    ratio: f64,
    known: String,
}

/// What one estimate is made from.
struct Made<'a> {
    findings: &'a Findings<'a>,
    stratum: &'a Stratum,
    sums: &'a ContigPairs,
    pairs: LinkagePairs,
    cutoff: FrequencyCutoff,
    mating: Mating,
    variance: Option<f64>,
}

impl Made<'_> {
    fn entries(&self) -> Vec<wire::EffectiveSize> {
        let mut estimate =
            match LinkageEstimate::of(self.sums, self.pairs, self.cutoff, self.mating) {
                Ok(estimate) => estimate,
                Err(why) => return vec![absent(self.findings, self.stratum, &why.to_string())],
            };
        estimate.individual_variance = self.variance;
        let correction = self.correction();
        if let Some(correction) = &correction {
            estimate.ratio = correction.ratio;
        }
        let corrected = correction.is_some();
        let headline = self.cutoff == FrequencyCutoff::FivePercent
            && self.mating == Mating::Random
            && (corrected || self.pairs == LinkagePairs::BetweenContigs);
        let life = self
            .findings
            .programme
            .get(&self.stratum.population, |p| p.life_history);
        let mut entries = vec![self.entry(&estimate, 1.0, headline && life.is_none(), &correction)];
        // The adjustment is proportional: what it makes of an estimate of 1 is its factor.
        let factor = life
            .and_then(|life| adjust_for_overlap(1.0, &life))
            .map(|a| a.effective_size);
        if let Some(factor) = factor.filter(|_| headline) {
            entries.push(self.entry(&estimate, factor, true, &correction));
        }
        entries
    }

    /// What all pairs of loci are divided by, where the genome is known.
    fn correction(&self) -> Option<Correction> {
        let settings = self.findings.programme.settings(&self.stratum.population);
        let by_chromosomes = || {
            let n = settings.chromosomes?;
            Some(Correction {
                ratio: chromosome_ratio(n)?,
                known: format!("{n} chromosomes"),
            })
        };
        let by_map = || {
            let cm = settings.map_length_cm?;
            Some(Correction {
                ratio: map_length_ratio(cm)?,
                known: format!("a map of {cm} cM"),
            })
        };
        (self.pairs == LinkagePairs::All)
            .then(|| by_chromosomes().or_else(by_map))
            .flatten()
    }

    fn entry(
        &self,
        estimate: &LinkageEstimate,
        factor: f64,
        headline: bool,
        correction: &Option<Correction>,
    ) -> wire::EffectiveSize {
        let level = self.findings.level;
        let normal = quantile(level, f64::INFINITY);
        let interval = estimate.drift_interval(normal);
        let drift_rate = wire::Estimate {
            estimate: Some(estimate.drift_rate() / factor),
            standard_error: interval.map(|(low, high)| (high - low) / (2.0 * normal * factor)),
            interval: interval.map(|(low, high)| [low / factor, high / factor]),
            level,
            loci: estimate.loci,
            gene_copies: None,
            interval_counts: interval.map(|_| wire::IntervalCounts::Individuals),
            absent_because: None,
        };
        let subject = Subject {
            individuals: Some(estimate.individuals),
            headline,
            variant: Some(self.variant(factor)),
            notes: self.notes(estimate, correction),
            ..subject(self.findings, self.stratum)
        };
        entry(subject, drift_rate)
    }

    fn variant(&self, factor: f64) -> String {
        let alleles = match self.cutoff {
            FrequencyCutoff::FivePercent => "alleles of frequency 0.05 and above",
            FrequencyCutoff::TwoPercent => "alleles of frequency 0.02 and above",
            FrequencyCutoff::NoSingletons => "alleles seen more than once",
        };
        let mating = match self.mating {
            Mating::Random => "random mating",
            Mating::LifetimeMonogamy => "lifetime monogamy",
        };
        let pairs = match self.pairs {
            LinkagePairs::BetweenContigs => "loci on different contigs",
            LinkagePairs::All => "all pairs of loci",
        };
        let overlap = if factor == 1.0 {
            ""
        } else {
            ", adjusted for overlapping generations"
        };
        format!("{alleles}, {mating}, {pairs}{overlap}")
    }

    fn notes(&self, estimate: &LinkageEstimate, correction: &Option<Correction>) -> Vec<String> {
        let mut notes = Vec::new();
        match (self.pairs, correction) {
            (LinkagePairs::All, None) => notes.push(
                "pairs of loci on one chromosome are in, so the estimate is too low; state the number \
                 of chromosomes or the length of the genetic map to correct it"
                    .to_owned(),
            ),
            (LinkagePairs::All, Some(Correction { ratio, known })) => notes.push(format!(
                "pairs of loci on one chromosome are in; divided by {ratio:.3}, the expected ratio for \
                 {known} (Waples, Larson & Waples 2016)"
            )),
            (LinkagePairs::BetweenContigs, _) if self.sums.contigs() > MOST_CHROMOSOMES => notes
                .push(format!(
                    "{} contigs are more than a genome has chromosomes: pairs on one chromosome but \
                     different scaffolds are in, which makes the estimate too low",
                    self.sums.contigs()
                )),
            _ => {}
        }
        if estimate.excess <= 0.0 {
            notes.push("no more linkage than sampling alone makes: no upper bound".to_owned());
        }
        if estimate.individual_variance.is_none() {
            notes.push("no interval: an individual cannot be left out".to_owned());
        }
        notes
    }
}

fn subject(findings: &Findings, stratum: &Stratum) -> Subject {
    Subject {
        population: stratum.population.clone(),
        method: "linkage",
        to: stratum.name.clone(),
        refers_to: format!("parents of the individuals sampled at {}", stratum.visit),
        census: findings.programme.get(&stratum.population, |p| p.census),
        ..Subject::default()
    }
}

fn absent(findings: &Findings, stratum: &Stratum, why: &str) -> wire::EffectiveSize {
    let mut made = findings.size(
        subject(findings, stratum),
        &crate::ne::estimate::Estimate::absent(Absence::NoLoci),
    );
    made.absent_because = Some(why.to_owned());
    made
}
