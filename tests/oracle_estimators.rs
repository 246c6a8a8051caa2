//! Slow and plain versions of what estimators do with sums, against the fast ones: rejections,
//! jackknives, and the correction of temporal change by weighing every outcome.

use genewane::locus::hardy_weinberg::Direction;
use genewane::merge::histogram::PValueHistogram;
use genewane::model::SamplingPlan;
use genewane::ne::interval::{block_jackknife, individual_variance, individual_variance_centred};
use genewane::ne::temporal::{TemporalSample, corrected_fs};
use genewane::ne::testing::benjamini_hochberg;
use proptest::collection::vec;
use proptest::prelude::*;

#[track_caller]
fn close(value: f64, expected: f64) {
    assert!(
        (value - expected).abs() <= 1e-11 * expected.abs().max(1.0),
        "{value} is not {expected}"
    );
}

proptest! {
    /// q by its definition, and the histogram between exact rejections at q and at q/1.004.
    #[test]
    fn false_discovery_rate(exponents in vec(0.0f64..14.0, 1..60), repeated in 0usize..4) {
        let mut p: Vec<f64> = exponents.iter().map(|e| 10f64.powf(-e)).collect();
        p.extend(vec![p[0]; repeated]);
        let m = p.len() as f64;
        let rank = |limit: f64| p.iter().filter(|&&other| other <= limit).count() as f64;
        let adjusted = benjamini_hochberg(&p.iter().copied().map(Some).collect::<Vec<_>>());
        let mut histogram = PValueHistogram::default();
        for (&one, q) in p.iter().zip(&adjusted) {
            let candidates = p.iter().filter(|&&other| other >= one).map(|&k| m * k / rank(k));
            close(q.unwrap(), candidates.fold(1.0, f64::min));
            histogram.add(one, Direction::Deficit);
        }
        for rate in [0.01, 0.05, 0.2] {
            let exact = |rate: f64| adjusted.iter().filter(|q| q.unwrap() <= rate).count() as u64;
            let binned = histogram.rejections(rate).rejected();
            prop_assert!(binned <= exact(rate * (1.0 + 1e-12)));
            prop_assert!(binned >= exact(rate / 1.004));
        }
    }

    /// The jackknife of a mean is the variance of the mean, over equal blocks and over individuals.
    #[test]
    fn jackknife_of_a_mean(values in vec(-5.0f64..5.0, 3..20)) {
        let n = values.len() as f64;
        let mean = values.iter().sum::<f64>() / n;
        let variance = values.iter().map(|v| (v - mean).powi(2)).sum::<f64>() / (n - 1.0) / n;
        let deletes: Vec<f64> = values.iter().map(|v| (n * mean - v) / (n - 1.0)).collect();
        let blocks = block_jackknife(mean, &deletes, &vec![7.0; values.len()]).unwrap();
        close(blocks.variance, variance);
        close(blocks.bias_corrected, mean);
        close(individual_variance(mean, &deletes).unwrap(), variance);
        close(individual_variance_centred(&deletes).unwrap(), variance);
    }

    /// Two samples of a Wright-Fisher population, every outcome weighed: the corrected ratio of
    /// expectations is 1 - (1 - 1/(2N))^t in both plans.
    #[test]
    fn temporal_correction_over_all_outcomes(
        census in 2usize..6, first in 1usize..5, later in 1usize..5, generations in 1u32..5,
        p in 0.05f64..0.95, reproduced_first in any::<bool>(),
    ) {
        prop_assume!(first <= census);
        let (plan, all) = (if reproduced_first { SamplingPlan::One } else { SamplingPlan::Two }, 2 * census);
        let founders = binomial(all, p);
        let (mut above, mut below) = (0.0, 0.0);
        let mut add = |weight: f64, x: &[f64], y: &[f64]| {
            for (i, chance_x) in x.iter().enumerate() {
                for (j, chance_y) in y.iter().enumerate() {
                    let (x, y) = (i as f64 / (2 * first) as f64, j as f64 / (2 * later) as f64);
                    let z = (x + y) / 2.0;
                    above += weight * chance_x * chance_y * 2.0 * (x - y).powi(2);
                    below += weight * chance_x * chance_y * 2.0 * z * (1.0 - z);
                }
            }
        };
        for (copies, &weight) in founders.iter().enumerate() {
            let mut population = vec![0.0; all + 1];
            population[copies] = 1.0;
            for _ in 1..generations {
                population = next_generation(&population);
            }
            let mut y = vec![0.0; 2 * later + 1];
            for (i, chance) in population.iter().enumerate() {
                for (j, of) in binomial(2 * later, i as f64 / all as f64).iter().enumerate() {
                    y[j] += chance * of;
                }
            }
            match plan {
                // Taken from among the founders themselves.
                SamplingPlan::One => add(weight, &hypergeometric(all, copies, 2 * first), &y),
                // Taken beside the founders, from the same source.
                SamplingPlan::Two => add(weight, &binomial(2 * first, p), &y),
            }
        }
        let sample = TemporalSample {
            first: first as f64,
            later: later as f64,
            generations: f64::from(generations),
            plan,
            census: Some(census as f64),
        };
        let expected = 1.0 - (1.0 - 0.5 / census as f64).powi(generations as i32);
        close(corrected_fs(above / below, &sample).unwrap(), expected);
    }
}

fn choose(n: usize, k: usize) -> f64 {
    (0..k).map(|i| (n - i) as f64 / (i + 1) as f64).product()
}

fn binomial(n: usize, p: f64) -> Vec<f64> {
    (0..=n)
        .map(|k| choose(n, k) * p.powi(k as i32) * (1.0 - p).powi((n - k) as i32))
        .collect()
}

fn hypergeometric(all: usize, marked: usize, drawn: usize) -> Vec<f64> {
    let ways = |k: usize| {
        if k > marked || drawn - k > all - marked {
            return 0.0;
        }
        choose(marked, k) * choose(all - marked, drawn - k) / choose(all, drawn)
    };
    (0..=drawn).map(ways).collect()
}

fn next_generation(population: &[f64]) -> Vec<f64> {
    let all = population.len() - 1;
    let mut next = vec![0.0; all + 1];
    for (i, chance) in population.iter().enumerate() {
        for (k, of) in binomial(all, i as f64 / all as f64).iter().enumerate() {
            next[k] += chance * of;
        }
    }
    next
}
