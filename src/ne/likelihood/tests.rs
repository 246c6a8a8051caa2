//! The likelihood against the coalescent, against brute force, and against its own definition.

use super::engine::{Ask, Engine};
use super::*;
use crate::ne::coalescent::{dirichlet_multinomial, oracle};

fn panel_of(gaps: &[f64], rows: &[(&[u32], &[u32])]) -> CountPanel {
    let mut panel = CountPanel::new(gaps.to_vec());
    for (copies, totals) in rows {
        panel.push(copies, totals, 1.0);
    }
    panel
}

/// P(all counts) with scaled times given directly: u = 1 - exp(-T/t) makes T the scaled time.
fn joint(copies: &[u32], totals: &[u32], times: &[f64], a: f64) -> f64 {
    let panel = panel_of(&vec![1.0; times.len()], &[(copies, totals)]);
    let mut engine = Engine::new(&panel, BetaPrior { a, b: a }, 0.0).unwrap();
    engine.rate_of_gap = (0..times.len()).collect();
    let rates: Vec<f64> = times.iter().map(|t| -(-t).exp_m1()).collect();
    let baseline = [u64::from(copies[0]), u64::from(totals[0] - copies[0])];
    engine.evaluate(&rates, Ask::Value).log_likelihood.exp()
        * dirichlet_multinomial(&baseline, &[a, a])
}

/// Backward recursion of the coalescent, confirmed by a forward Wright-Fisher calculation.
#[test]
fn equals_the_published_recursion() {
    for (got, want) in [
        (joint(&[3, 2], &[4, 4], &[0.5], 1.0), 0.027821948383754416),
        (joint(&[3, 2], &[4, 4], &[0.02], 1.0), 0.04649845446872249),
        (joint(&[3, 2], &[4, 4], &[2.0], 1.0), 0.006186767508363921),
        (joint(&[7, 2], &[10, 8], &[0.1], 1.0), 0.005195625992524409),
        (
            joint(&[3, 2, 1], &[4, 4, 4], &[0.5, 0.25], 1.0),
            0.005173185847494209,
        ),
        (
            joint(&[5, 4, 6, 3], &[10, 6, 6, 4], &[0.2, 0.1, 0.3], 1.0),
            0.00036460161717369614,
        ),
        (
            joint(&[5, 4, 6, 3], &[10, 6, 6, 4], &[0.2, 0.1, 0.3], 0.5),
            0.00024190294035539674,
        ),
    ] {
        assert!((got / want - 1.0).abs() < 1e-9, "{got} is not {want}");
    }
}

/// The coalescent oracle at real sample sizes, short and long times, and singular priors.
#[test]
fn equals_the_coalescent_at_real_sample_sizes() {
    for (copies, totals, times, a) in [
        (&[30, 41][..], &[60, 100][..], &[0.005][..], 1.0),
        (&[30, 41], &[60, 100], &[0.3], 1.0),
        (&[1, 3], &[50, 60], &[0.02], 0.2),
        (&[10, 0, 2], &[40, 30, 36], &[0.05, 0.1], 0.3),
        (&[10, 7], &[100, 100], &[0.01], 1.0),
        (&[0, 2], &[20, 30], &[0.1], 0.15),
    ] {
        let samples: Vec<Vec<u64>> = copies
            .iter()
            .zip(totals)
            .map(|(&x, &n): (&u32, &u32)| vec![u64::from(x), u64::from(n - x)])
            .collect();
        let want = oracle::likelihood(&samples, times, &[a, a]);
        let got = joint(copies, totals, times, a);
        assert!(
            (got / want - 1.0).abs() < 1e-8,
            "{copies:?} {times:?}: {got} is not {want}"
        );
    }
}

#[test]
fn a_visit_without_typed_copies_says_nothing() {
    let with = joint(&[3, 0, 1], &[4, 0, 4], &[0.5, 0.25], 1.0);
    let without = joint(&[3, 1], &[4, 4], &[0.75], 1.0);
    assert!((with / without - 1.0).abs() < 1e-11);
}

/// Three visits, unequal and missing counts, repeated rows.
fn small_panel() -> CountPanel {
    panel_of(
        &[2.0, 3.5],
        &[
            (&[10, 14, 9], &[40, 36, 40]),
            (&[20, 11, 13], &[40, 40, 38]),
            (&[5, 0, 9], &[38, 0, 40]),
            (&[33, 30, 39], &[40, 40, 40]),
            (&[10, 14, 9], &[40, 36, 40]),
            (&[18, 27, 0], &[40, 40, 0]),
        ],
    )
}

/// Slopes and curvatures against differences of the log-likelihood itself, one rate and two.
#[test]
fn slopes_are_differences() {
    for kernel in [Kernel::Diffusion, Kernel::Chain] {
        for map in [vec![0, 0], vec![0, 1]] {
            let mut engine =
                Engine::new(&small_panel(), BetaPrior { a: 0.6, b: 0.9 }, 0.05).unwrap();
            engine.rate_of_gap = map;
            engine.kernel = kernel;
            let at: Vec<f64> = [0.02, 0.013][..engine.rates()].to_vec();
            let h = 1e-4;
            let value = |steps: &[f64]| {
                let u: Vec<f64> = at.iter().zip(steps).map(|(u, s)| u + s * h).collect();
                engine.evaluate(&u, Ask::Value).log_likelihood
            };
            let (score, information) =
                super::fit::totals(&engine, &engine.evaluate(&at, Ask::Slopes));
            let unit = |p: usize, s: f64| {
                let mut v = vec![0.0; at.len()];
                v[p] += s;
                v
            };
            for p in 0..at.len() {
                let slope = (value(&unit(p, 1.0)) - value(&unit(p, -1.0))) / (2.0 * h);
                assert!(
                    (slope - score[p]).abs() < 1e-3 * (1.0 + slope.abs()),
                    "{slope} {score:?}"
                );
                for q in 0..at.len() {
                    let sum = |a: f64, b: f64| {
                        let v: Vec<f64> = unit(p, a)
                            .iter()
                            .zip(unit(q, b))
                            .map(|(x, y)| x + y)
                            .collect();
                        value(&v)
                    };
                    let curvature = (sum(1.0, 1.0) - sum(1.0, -1.0) - sum(-1.0, 1.0)
                        + sum(-1.0, -1.0))
                        / (4.0 * h * h);
                    let got = -information.row(p)[q];
                    assert!(
                        (curvature - got).abs() < 2e-3 * (1.0 + curvature.abs()),
                        "{kernel:?} {p} {q}: {curvature} {got}"
                    );
                }
            }
        }
    }
}

/// The slopes after a deletion are those of a panel whose counts lack that individual.
#[test]
fn deletions_are_those_of_the_smaller_panel() {
    let panel = small_panel();
    for map in [vec![0, 0], vec![0, 1]] {
        let mut engine = Engine::new(&panel, BetaPrior { a: 0.6, b: 0.9 }, 0.05).unwrap();
        engine.rate_of_gap = map.clone();
        let at: Vec<f64> = [0.02, 0.013][..engine.rates()].to_vec();
        let mut deletions = Vec::new();
        let all = engine.evaluate_deletions(&at, &mut |_, d| deletions.extend_from_slice(d));
        for c in 0..engine.columns.len() {
            for v in 0..3 {
                for g in 0..3 {
                    let counts = engine.columns.column(c).to_vec();
                    let base = &deletions[((c * 3 + v) * 3 + g) * all.stride..][..all.stride];
                    let Some(less) = super::engine::without(counts[v], g as u32) else {
                        assert!(base.iter().all(|&d| d == 0.0));
                        continue;
                    };
                    let mut smaller = CountPanel::new(panel.gaps.clone());
                    let mut changed = counts.clone();
                    changed[v] = less;
                    let (x, n): (Vec<u32>, Vec<u32>) = changed.into_iter().unzip();
                    smaller.push(&x, &n, 1.0);
                    let mut other =
                        Engine::new(&smaller, BetaPrior { a: 0.6, b: 0.9 }, 0.0).unwrap();
                    other.rate_of_gap = map.clone();
                    let slopes = other.evaluate(&at, Ask::Slopes).slopes;
                    let own = &all.slopes[c * all.stride..][..all.stride];
                    for k in 0..all.stride {
                        let want = slopes[k] - own[k];
                        assert!(
                            (base[k] - want).abs() < 1e-7 * (1.0 + slopes[k].abs()),
                            "{c} {v} {g} {k}: {} {want}",
                            base[k]
                        );
                    }
                }
            }
        }
    }
}

/// A fit is where a fine grid of the likelihood has its top.
#[test]
fn fits_stand_on_the_top() {
    let panel = small_panel();
    let fit = fit_constant(&panel, BetaPrior::FLAT, 0.05).unwrap();
    let grid: Vec<f64> = (1..400).map(|i| i as f64 * 2.5e-4).collect();
    let logs = profile(&panel, BetaPrior::FLAT, 0.05, fit.kernel, &grid).unwrap();
    let top = grid[(0..grid.len())
        .max_by(|&i, &j| logs[i].total_cmp(&logs[j]))
        .unwrap()];
    assert!(
        (fit.rates[0] - top).abs() < 2.5e-4,
        "{} {top}",
        fit.rates[0]
    );
    assert_eq!(fit.rows, 6);
    let two = fit_by_interval(&panel, BetaPrior::FLAT, 0.05).unwrap();
    assert!(two.log_likelihood >= fit.log_likelihood);
    for (u, s) in two.rates.iter().zip(&two.score) {
        assert!(s.abs() < 1e-2 || (*u == 0.0 && *s < 0.0), "{two:?}");
    }
    let test = size_change(&fit, &two, 1.0).unwrap();
    assert_eq!(test.degrees_of_freedom, 1);
    assert!(test.p > 0.0 && test.p <= 1.0);
}

/// Counts that differ less than sampling alone makes them: no drift, and the signed rate says so.
#[test]
fn no_drift_is_unbounded() {
    let panel = panel_of(
        &[3.0],
        &[
            (&[20, 20], &[40, 40]),
            (&[11, 11], &[40, 40]),
            (&[30, 30], &[40, 40]),
        ],
    );
    let fit = fit_constant(&panel, BetaPrior::FLAT, 0.05).unwrap();
    assert_eq!(fit.rates, [0.0]);
    assert!(fit.signed_rates[0] < 0.0 && fit.score[0] < 0.0);
}

#[test]
fn absence_has_a_reason() {
    let flat = BetaPrior::FLAT;
    assert_eq!(
        fit_constant(&CountPanel::new(vec![]), flat, 0.05),
        Err(NoFit::TooFewVisits)
    );
    assert_eq!(
        fit_constant(&CountPanel::new(vec![0.0]), flat, 0.05),
        Err(NoFit::NoTimeBetween)
    );
    assert_eq!(
        fit_constant(&CountPanel::new(vec![1.0]), flat, 0.05),
        Err(NoFit::NoLoci)
    );
    let rare = panel_of(&[1.0], &[(&[1, 5], &[40, 40]), (&[9, 0], &[40, 0])]);
    assert_eq!(fit_constant(&rare, flat, 0.05), Err(NoFit::NoLoci));
}

/// One Newton step a deletion against fitting anew without the individual, over 25 + 25 individuals.
#[test]
fn newton_steps_are_refits_to_a_hundredth_of_the_standard_error() {
    let mut random = rand::SeedableRng::seed_from_u64(5);
    let panel = super::calibration::simulate(60, 400, &[0, 3, 6], 25, 0.05, &mut random);
    let prior = BetaPrior { a: 0.8, b: 0.9 };
    let full = two_way(&panel, prior, 0.05, 0.95).unwrap();
    let counts = panel.counts();
    let used: Vec<bool> = (0..counts.len()).map(|i| counts.usable(i, 0.05)).collect();
    let kept = panel.keep_rows(&used);
    let mut variance = 0.0;
    for i in 0..75 {
        // The choice of loci stays that of the full sample.
        let fit = fit_constant(&kept.without(i).counts(), prior, 0.0).unwrap();
        variance += 24.0 / 25.0 * (fit.signed_rates[0] - full.fit.signed_rates[0]).powi(2);
    }
    let ratio = (full.intervals[0].variance_individuals / variance).sqrt();
    assert!((ratio - 1.0).abs() < 0.01, "{ratio}");
    let mut by_block = Vec::new();
    for block in 0..50 {
        let rows: Vec<bool> = (0..counts.len())
            .map(|i| used[i] && i * 50 / 400 != block)
            .collect();
        let size = used.iter().zip(&rows).filter(|(u, r)| **u && !**r).count() as f64;
        if size > 0.0 {
            let fit = fit_constant(&panel.keep_rows(&rows).counts(), prior, 0.05).unwrap();
            by_block.push((size, fit.signed_rates[0]));
        }
    }
    // The weighted delete-one-block jackknife, written out once more.
    let n: f64 = by_block.iter().map(|b| b.0).sum();
    let (g, theta) = (by_block.len() as f64, full.fit.signed_rates[0]);
    let centre = g * theta - by_block.iter().map(|(m, d)| (1.0 - m / n) * d).sum::<f64>();
    let variance: f64 = by_block
        .iter()
        .map(|(m, d)| {
            let h = n / m;
            (h * theta - (h - 1.0) * d - centre).powi(2) / (h - 1.0) / g
        })
        .sum();
    let ratio = (full.intervals[0].variance_loci / variance).sqrt();
    assert!((ratio - 1.0).abs() < 0.02, "{ratio}");
}

/// Weights add up, centre on the estimate, and are as wide as its standard error.
#[test]
fn weights_are_as_wide_as_the_interval() {
    let mut random = rand::SeedableRng::seed_from_u64(6);
    let panel = super::calibration::simulate(60, 400, &[0, 4], 40, 0.0, &mut random);
    let result = two_way(&panel, BetaPrior::FLAT, 0.05, 0.95).unwrap();
    let weights = rate_weights(&panel, BetaPrior::FLAT, 0.05, &result, 41).unwrap();
    let moment = |k: i32| -> f64 {
        weights
            .iter()
            .map(|w| w.weight * (w.rate - result.intervals[0].rate).powi(k))
            .sum()
    };
    assert!((moment(0) - 1.0).abs() < 1e-12);
    let error = result.intervals[0].standard_error();
    assert!(moment(1).abs() < 0.3 * error, "{} {error}", moment(1));
    let width = moment(2).sqrt() / error;
    assert!((0.8..1.25).contains(&width), "{width}");
    let by = two_way_by_interval(&panel, BetaPrior::FLAT, 0.05, 0.95).unwrap();
    assert!((by.intervals[0].low - result.intervals[0].low).abs() < 1e-6);
    assert_eq!(size_change(&result.fit, &by.fit, result.inflation), None);
}
