//! A small version of the study in `tests/calibration/`: intervals hold the true effective size about as
//! often as they say, and intervals over loci alone do not.

use std::sync::Arc;

use genewane::merge::{Scheme, Sums};
use genewane::model::{Locus, Programme, SamplingPlan, comparisons};
use genewane::ne::estimate::{drift_estimate, quantile};
use genewane::ne::temporal::{TemporalSample, drift_rate_fs};
use genewane::outlook::rehearse::{Scenario, simulate};
use genewane::report::assemble::{Findings, effective_size};
use rayon::prelude::*;

const ADULTS: u32 = 50;
const SAMPLE: f64 = 25.0;
const GENERATIONS: f64 = 2.0;
const RUNS: u64 = 60;

/// Whether an interval held the truth: of Fs, of Fs over loci alone, of the likelihood, of linkage.
type Held = [bool; 4];

fn run(seed: u64) -> Held {
    let scenario: Scenario = toml::from_str(&format!(
        "settling_generations = 5\n\
         chromosome = [{{ name = \"u\", length_bp = 50_000_000, unlinked = true, copies = 40 }}]\n\
         loci = [{{ count = 1500, frequencies = {{ beta = [1.0, 1.0] }} }}]\n\
         population = [{{ name = \"p\", size = {ADULTS} }}]\n\
         visit = [{{ generation = 0, individuals = {SAMPLE} }}, \
         {{ generation = {GENERATIONS}, individuals = {SAMPLE} }}]\n"
    ))
    .expect("a scenario");
    let simulation = simulate(&scenario, seed).expect("a simulation");
    let strata = simulation.model_strata();
    let mut programme = Programme::default();
    programme.all.plan = Some(SamplingPlan::Two);
    let compared = comparisons(&strata, &programme).expect("two visits");
    let pairs = &compared.comparisons;
    let mut sums = Sums::new(Arc::new(Scheme::new(&strata, pairs, 0.0, 20, 0)));
    let mut locus = Locus::default();
    for i in 0..simulation.loci.len() {
        simulation.fill_locus(i, &mut locus);
        sums.add(&locus);
    }
    sums.flush();
    // Separate sexes in equal numbers: half an individual above the adults (Wright 1931).
    let truth = 0.5 / (f64::from(ADULTS) + 0.5);
    let sample = TemporalSample {
        first: SAMPLE,
        later: SAMPLE,
        generations: GENERATIONS,
        plan: SamplingPlan::Two,
        census: None,
    };
    let fs = drift_estimate(
        &sums.pairs[0].change,
        |t| drift_rate_fs(t.fs_numerator / t.fs_denominator, &sample),
        |t| t.temporal_loci,
        GENERATIONS,
        1.0 / SAMPLE,
    );
    let rate = fs.value.expect("a rate");
    let loci = fs.variance_loci.expect("a variance over loci");
    let half = quantile(0.95, fs.blocks as f64 - 1.0) * loci.sqrt();
    let findings = Findings {
        strata: &strata,
        comparisons: pairs,
        sums: &sums,
        programme: &programme,
        level: 0.95,
        false_discovery_rate: 0.05,
        fits: Vec::new(),
    }
    .fitted();
    let sizes = effective_size(&findings);
    let holds = |method: &str| {
        sizes
            .iter()
            .filter(|e| e.method == method && (e.headline || e.generations.is_some()))
            .filter_map(|e| e.drift_rate.interval)
            .next_back()
            .is_some_and(|[low, high]| low <= truth && truth <= high)
    };
    [
        holds("temporal_fs"),
        (rate - truth).abs() <= half,
        holds("temporal_likelihood"),
        holds("linkage"),
    ]
}

#[test]
fn intervals_hold_the_truth_as_often_as_they_say() {
    let all: Vec<Held> = (1..=RUNS).into_par_iter().map(run).collect();
    let share = |which: usize| all.iter().filter(|h| h[which]).count() as f64 / RUNS as f64;
    let [fs, loci_alone, likelihood, linkage] = std::array::from_fn(share);
    // 0.95 less three binomial standard errors of 60 runs is 0.866. What is to be told apart: intervals over
    // loci alone, which held the truth in about half of such runs.
    for (name, coverage) in [("Fs", fs), ("likelihood", likelihood), ("linkage", linkage)] {
        assert!(coverage >= 0.866, "{name}: {coverage}");
    }
    assert!(loci_alone < 0.8, "loci alone: {loci_alone}");
}
