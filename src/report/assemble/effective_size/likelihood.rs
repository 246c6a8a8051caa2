//! Effective size by the likelihood of all visits of a population.

use std::collections::BTreeMap;

use super::{FEWEST_INDIVIDUALS, Subject};
use crate::merge::Blocking;
use crate::merge::panel::PanelLocus;
use crate::model::{ComparisonKind, MISSING_DOSAGE, SamplingPlan};
use crate::ne::estimate::{Absence, Estimate};
use crate::ne::likelihood::{
    BetaPrior, DosagePanel, NoFit, RateWeight, SizeChange, TwoWay, rate_weights, size_change,
    two_way, two_way_by_interval,
};
use crate::ne::prior::fit_prior;
use crate::report::assemble::Findings;
use crate::report::wire;

/// Smallest minor allele frequency at the baseline of the loci used: chosen at the baseline and by
/// nothing later, so that the choice does no harm.
const BASELINE_FREQUENCY: f64 = 0.01;

/// The visits of one population from its baseline on.
#[derive(Debug, Clone, PartialEq)]
pub struct Visits {
    /// Population name.
    pub population: String,
    /// Strata, the baseline first.
    pub strata: Vec<usize>,
    /// Generations between one and the next.
    pub gaps: Vec<f64>,
}

/// Fits of one population.
#[derive(Debug, Clone)]
pub struct Fits {
    /// Its visits.
    pub visits: Visits,
    /// One size for all intervals.
    pub constant: Result<TwoWay, NoFit>,
    /// One size an interval, with three visits and more.
    pub by_interval: Option<Result<TwoWay, NoFit>>,
    /// Whether the second fits better.
    pub change: Option<SizeChange>,
    /// Spectrum of allele frequencies at the baseline, the same for either allele of a locus.
    pub prior: BetaPrior,
    /// Constant sizes and how probable each is; empty where there is no fit.
    pub weights: Vec<RateWeight>,
    /// Loci of the panel that the fits rest on.
    pub loci: u64,
}

impl Fits {
    /// How much wider the honest interval is than the curvature's, as variances; at least 1.
    pub fn inflation(&self) -> f64 {
        self.constant
            .as_ref()
            .map_or(1.0, |fit| fit.inflation.max(1.0))
    }
}

/// Effective sizes that chances are averaged over: with 15, no chance of a loss in the demo moved by
/// more than 0.0012.
const WEIGHTED_RATES: usize = 9;

/// Fits every population with at least two visits that lie a known number of generations apart.
pub fn fits(findings: &Findings) -> Vec<Fits> {
    visits(findings)
        .into_iter()
        .map(|visits| fit(findings, visits))
        .collect()
}

/// One entry for the whole time, and one an interval where there are several.
pub fn entries(findings: &Findings) -> Vec<wire::EffectiveSize> {
    let mut entries = Vec::new();
    for fits in &findings.fits {
        let last = fits.visits.strata.len() - 1;
        entries.push(one(
            findings,
            fits,
            "temporal_likelihood",
            &fits.constant,
            0,
            (0, last),
        ));
        if let Some(by_interval) = &fits.by_interval {
            let method = "temporal_likelihood_by_interval";
            for i in 0..last {
                entries.push(one(findings, fits, method, by_interval, i, (i, i + 1)));
            }
        }
    }
    entries
}

fn visits(findings: &Findings) -> Vec<Visits> {
    let mut since: BTreeMap<&str, Vec<(f64, usize, usize)>> = BTreeMap::new();
    for comparison in findings.comparisons {
        if let (ComparisonKind::SinceBaseline, Some(t)) = (comparison.kind, comparison.generations)
            && t > 0.0
        {
            let population = &findings.strata.strata[comparison.from].population;
            since
                .entry(population)
                .or_default()
                .push((t, comparison.to, comparison.from));
        }
    }
    let all = since.into_iter().map(|(population, mut later)| {
        later.sort_by(|a, b| a.0.total_cmp(&b.0));
        // Two visits at the same time leave no drift between them: the first of them stays.
        later.dedup_by(|b, a| b.0 <= a.0);
        let times = later.iter().map(|v| v.0);
        let before = std::iter::once(0.0).chain(times.clone());
        Visits {
            population: population.to_owned(),
            gaps: times.zip(before).map(|(t, before)| t - before).collect(),
            strata: std::iter::once(later[0].2)
                .chain(later.iter().map(|v| v.1))
                .collect(),
        }
    });
    let enough = |s: &usize| findings.strata.strata[*s].individuals() >= FEWEST_INDIVIDUALS;
    all.filter(|visits| visits.strata.iter().all(enough))
        .collect()
}

fn fit(findings: &Findings, visits: Visits) -> Fits {
    let (panel, first_rows) = dosages(findings, &visits);
    let counts = panel.counts();
    let prior = baseline_prior(&counts_of_first(&counts));
    let level = findings.level;
    let constant = two_way(&panel, prior, BASELINE_FREQUENCY, level);
    let several = visits.gaps.len() > 1;
    let by_interval =
        several.then(|| two_way_by_interval(&panel, prior, BASELINE_FREQUENCY, level));
    let change = match (&constant, &by_interval) {
        (Ok(one), Some(Ok(each))) => size_change(&one.fit, &each.fit, one.inflation),
        _ => None,
    };
    let weights = constant
        .as_ref()
        .ok()
        .and_then(|fit| rate_weights(&panel, prior, BASELINE_FREQUENCY, fit, WEIGHTED_RATES).ok());
    let usable = |i: usize| counts.usable(i, BASELINE_FREQUENCY);
    let ends = first_rows
        .get(1..)
        .unwrap_or_default()
        .iter()
        .copied()
        .chain([counts.len()]);
    let of_locus = first_rows
        .iter()
        .zip(ends)
        .filter(|&(&start, end)| (start..end).any(usable));
    Fits {
        loci: of_locus.count() as u64,
        weights: weights.unwrap_or_default(),
        prior,
        visits,
        constant,
        by_interval,
        change,
    }
}

/// The spectrum at the baseline, the same whichever allele is called the reference: every row
/// counts once by its allele and once by the rest.
pub fn baseline_prior(counts: &[(u32, u32)]) -> BetaPrior {
    let both = counts.iter().flat_map(|&(x, n)| [(x, n), (n - x, n)]);
    match fit_prior(both) {
        // Symmetric by construction; the mean irons out what the search left.
        Some(fitted) => {
            let shape = (fitted.prior.a * fitted.prior.b).sqrt();
            BetaPrior { a: shape, b: shape }
        }
        None => BetaPrior::FLAT,
    }
}

fn counts_of_first(panel: &crate::ne::likelihood::CountPanel) -> Vec<(u32, u32)> {
    (0..panel.len()).map(|i| panel.first(i)).collect()
}

/// The genotypes of the panel at these visits, a row an allele for multi-allelic loci, and the first
/// row of each locus.
fn dosages(findings: &Findings, visits: &Visits) -> (DosagePanel, Vec<usize>) {
    let strata = visits.strata.iter().map(|&s| &findings.strata.strata[s]);
    let sizes = strata.clone().map(|s| s.individuals()).collect();
    let slots: Vec<usize> = strata.flat_map(|s| s.slots.clone()).collect();
    let blocking = findings
        .sums
        .pairs
        .iter()
        .zip(findings.comparisons)
        .find_map(|(sums, c)| (c.from == visits.strata[0]).then(|| sums.change.blocking()));
    let mut panel = DosagePanel::new(visits.gaps.clone(), sizes);
    let mut first_rows = Vec::new();
    for locus in findings.sums.panel.loci() {
        let block = blocking
            .as_ref()
            .and_then(|b: &Blocking| b.block(locus.contig_hash, locus.position));
        // Without a block the locus was typed in one of the two visits only: it bears on nothing.
        if let Some(block) = block {
            first_rows.push(panel.len());
            push_rows(&mut panel, locus, &slots, block);
        }
    }
    (panel, first_rows)
}

fn push_rows(panel: &mut DosagePanel, locus: &PanelLocus, slots: &[usize], block: u32) {
    let alleles = locus.genotypes.allele_count().max(2) as u16;
    let copies = |allele: u16| {
        let dosage = move |&slot: &usize| match locus.genotypes.pair(slot) {
            Some([a, b]) => u8::from(a == allele) + u8::from(b == allele),
            None => MISSING_DOSAGE,
        };
        slots.iter().map(dosage).collect::<Vec<u8>>()
    };
    let seen = |row: &Vec<u8>| row.iter().any(|&d| d == 1 || d == 2);
    let rows: Vec<Vec<u8>> = (0..alleles).map(copies).filter(seen).collect();
    match rows.as_slice() {
        [] | [_] => {}
        [_, second] => panel.push(second, 1.0, block),
        many => {
            let k = many.len() as f64;
            many.iter()
                .for_each(|row| panel.push(row, (k - 1.0) / k, block));
        }
    }
}

fn one(
    findings: &Findings,
    fits: &Fits,
    method: &'static str,
    outcome: &Result<TwoWay, NoFit>,
    rate: usize,
    (first, last): (usize, usize),
) -> wire::EffectiveSize {
    let stratum = |v: usize| &findings.strata.strata[fits.visits.strata[v]];
    let (from, to) = (stratum(first), stratum(last));
    let plan = findings.programme.get(&from.population, |p| p.plan);
    let mut notes = Vec::new();
    let estimate = match outcome {
        Ok(found) => {
            let interval = &found.intervals[rate];
            if interval.rate <= 0.0 {
                notes.push(
                    "the counts differ no more than sampling alone makes them: no upper bound"
                        .to_owned(),
                );
            }
            Estimate {
                value: Ok(interval.rate),
                variance_loci: Some(interval.variance_loci),
                variance_individuals: Some(interval.variance - interval.variance_loci),
                degrees: Some(interval.degrees_of_freedom),
                loci: fits.loci,
                blocks: found.blocks as u64,
            }
        }
        Err(why) => {
            notes.push(why.to_string());
            Estimate::absent(Absence::NoLoci)
        }
    };
    if plan == Some(SamplingPlan::One) {
        notes.push(
            "the likelihood presumes sampling plan II; under the stated plan I prefer temporal_fs"
                .to_owned(),
        );
    }
    let visits = (first..=last).map(|v| stratum(v).individuals() as f64);
    let subject = Subject {
        population: from.population.clone(),
        method,
        from: Some(from.name.clone()),
        to: to.name.clone(),
        refers_to: format!(
            "harmonic mean over the generations from {} to the one before {}",
            from.visit, to.visit
        ),
        generations: Some(fits.visits.gaps[first..last].iter().sum()),
        plan: Some(SamplingPlan::Two),
        individuals: Some((last - first + 1) as f64 / visits.map(|n| 1.0 / n).sum::<f64>()),
        census: findings.programme.get(&from.population, |p| p.census),
        headline: plan != Some(SamplingPlan::One),
        notes,
        ..Subject::default()
    };
    findings.size(subject, &estimate)
}
