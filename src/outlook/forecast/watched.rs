//! Alleles that somebody watches: the chance that each is lost, still there or fixed, by generation.

use super::chance::{beta, binomial};
use super::project::rate_of;
use super::{Horizon, Scenario, Start, Watched};
use crate::model::stable_hash;
use crate::ne::jacobi::Rule;
use crate::ne::wright_fisher::{CUT, binomial_band, fixation_chance};
use crate::outlook::passage::{MOST_EXACT_COPIES, lost_from_many};
use crate::outlook::rehearse::{Dice, Purpose};

/// Effective sizes over which the chances are averaged.
const SLICES: usize = 9;
/// Nodes over the posterior of the frequency today.
const NODES: usize = 128;
/// Simulated paths an effective size, where neither the chain nor the diffusion serves; with nine
/// sizes the Monte Carlo error of a chance stays below 0.004.
const PATHS: usize = 2000;

/// Chances at one generation; they add up to 1.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Fate {
    /// Generations from the latest visit.
    pub generation: usize,
    /// No copy is left.
    pub lost: f64,
    /// Some copies are left, others are of another allele.
    pub still_there: f64,
    /// Every copy is of this allele.
    pub fixed: f64,
}

/// How chances were computed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Way {
    /// By the exact chain (at most 2000 gene copies).
    Chain,
    /// By the diffusion.
    Diffusion,
    /// By simulated paths: selection or newcomers in more than 2000 gene copies.
    Paths,
}

/// What may become of an allele.
#[derive(Debug, Clone, PartialEq)]
pub struct Chances {
    /// By generation: those asked for.
    pub fates: Vec<Fate>,
    /// Every way that some effective size needed.
    pub ways: Vec<Way>,
    /// Chance to be fixed in the end (Kimura 1962), at the last size; `None` when newcomers go on
    /// coming, since nothing is fixed or lost for ever then.
    pub fixed_in_the_end: Option<f64>,
}

/// One effective size's path, and what moves frequencies along it.
struct Course<'a> {
    rates: Vec<f64>,
    scenario: &'a Scenario,
    selection: f64,
    source_frequency: f64,
}

impl Course<'_> {
    /// Gene copies of generation g (1-based).
    fn copies(&self, g: usize) -> u32 {
        (1.0 / self.rates[g - 1]).round().clamp(1.0, 4e9) as u32
    }

    /// Frequency among the parents' gametes of generation g: newcomers, then selection.
    fn parents(&self, p: f64, g: usize) -> f64 {
        let size = 0.5 / self.rates[g - 1];
        let mut p = p;
        if let Some(arrival) = &self.scenario.migrants {
            let share = arrival.individuals / (size + arrival.individuals);
            p += share * (self.source_frequency - p);
        }
        if let Some((arrival, when)) = &self.scenario.release
            && *when as usize == g
        {
            let share = arrival.individuals / (size + arrival.individuals);
            p += share * (self.source_frequency - p);
        }
        let s = self.selection;
        (p * (1.0 + s + s * p) / (1.0 + 2.0 * s * p)).clamp(0.0, 1.0)
    }

    fn is_plain(&self) -> bool {
        self.selection == 0.0 && !self.scenario.is_open()
    }
}

/// Chances of an allele seen in `counts` = copies of gene copies typed, at the generations asked for
/// (ascending, at most the horizon's). `None` where nobody knows the effective size, or where
/// newcomers come and their frequency is not given.
pub fn chances(
    start: &Start,
    scenario: &Scenario,
    watched: &Watched,
    counts: (u32, u32),
    generations: &[usize],
    horizon: &Horizon,
) -> Option<Chances> {
    if scenario.is_open() && watched.source_frequency.is_none() {
        return None;
    }
    let slices = rate_of(start, scenario)?.slices(SLICES);
    let (k, n) = (f64::from(counts.0), f64::from(counts.1));
    let prior = start.spectrum.prior;
    let (a, b) = (prior.a + k, prior.b + (n - k).max(0.0));
    let rule = Rule::beta(NODES, a, b);
    let weight = 1.0 / slices.len() as f64;
    let last = generations.last().copied().unwrap_or(0);
    let mut sums = vec![[0.0; 2]; generations.len()];
    let (mut ways, mut in_the_end) = (Vec::new(), 0.0);
    for (i, &now) in slices.iter().enumerate() {
        let course = Course {
            rates: scenario.rates(now, last.max(1)),
            scenario,
            selection: watched.selection,
            source_frequency: watched.source_frequency.unwrap_or(0.0),
        };
        let small = (1..=last).all(|g| course.copies(g) <= MOST_EXACT_COPIES);
        let (way, part) = if small {
            (Way::Chain, by_chain(&course, &rule, generations))
        } else if course.is_plain() {
            (Way::Diffusion, by_diffusion(&course, &rule, generations))
        } else {
            let unit = stable_hash(format!("{}:{}", watched.contig, watched.position).as_bytes());
            let mut dice = Dice::new(horizon.seed, Purpose::Forecast, unit, i as u64);
            (
                Way::Paths,
                by_paths(&course, (a, b), generations, &mut dice),
            )
        };
        ways.push(way);
        for (sum, ends) in sums.iter_mut().zip(part) {
            sum[0] += weight * ends[0];
            sum[1] += weight * ends[1];
        }
        let size = 0.5 / course.rates.last().copied().unwrap_or(now);
        let fixed = rule.nodes.iter().zip(&rule.weights);
        let total: f64 = rule.weights.iter().sum();
        in_the_end += weight / total
            * fixed
                .map(|(&p, w)| w * fixation_chance(size, watched.selection, p))
                .sum::<f64>();
    }
    ways.sort();
    ways.dedup();
    let fates = generations
        .iter()
        .zip(sums)
        .map(|(&generation, [lost, fixed])| Fate {
            generation,
            lost,
            still_there: (1.0 - lost - fixed).max(0.0),
            fixed,
        });
    Some(Chances {
        fates: fates.collect(),
        ways,
        fixed_in_the_end: (!scenario.is_open()).then_some(in_the_end),
    })
}

/// Chances of loss and fixation by the exact chain of changing numbers of gene copies. The first
/// generation draws its copies from the frequency today.
fn by_chain(course: &Course, rule: &Rule, generations: &[usize]) -> Vec<[f64; 2]> {
    let total: f64 = rule.weights.iter().sum();
    // Before the first generation, masses stand at the nodes.
    let mut places = rule.nodes.clone();
    let mut masses: Vec<f64> = rule.weights.iter().map(|w| w / total).collect();
    let mut out = Vec::new();
    let mut rows: Vec<(usize, Vec<f64>)> = Vec::new();
    let mut rows_are_for = None;
    let mut generation = 0;
    for &wanted in generations {
        while generation < wanted {
            generation += 1;
            let copies = course.copies(generation);
            // The same sizes before and after, and no release: the rows of the last step serve.
            let released =
                matches!(&course.scenario.release, Some((_, g)) if *g as usize == generation);
            let key = (generation > 1 && !released).then_some((places.len(), copies));
            if key.is_none() || key != rows_are_for {
                rows = places
                    .iter()
                    .map(|&p| binomial_band(copies, course.parents(p, generation), CUT))
                    .collect();
                rows_are_for = key;
            }
            let mut next = vec![0.0; copies as usize + 1];
            for ((start, row), &mass) in rows.iter().zip(&masses).filter(|(_, m)| **m > 0.0) {
                for (to, p) in next[*start..].iter_mut().zip(row) {
                    *to += mass * p;
                }
            }
            masses = next;
            if places.len() != masses.len() || generation == 1 {
                places = (0..=copies)
                    .map(|k| f64::from(k) / f64::from(copies))
                    .collect();
            }
        }
        out.push(match generation {
            0 => [0.0, 0.0],
            _ => [masses[0], masses[masses.len() - 1]],
        });
    }
    out
}

/// The same by the diffusion, at the constant rate that loses as much heterozygosity.
fn by_diffusion(course: &Course, rule: &Rule, generations: &[usize]) -> Vec<[f64; 2]> {
    let total: f64 = rule.weights.iter().sum();
    let both: Vec<f64> = rule
        .nodes
        .iter()
        .copied()
        .chain(rule.nodes.iter().map(|p| 1.0 - p))
        .collect();
    generations
        .iter()
        .map(|&t| {
            if t == 0 {
                return [0.0, 0.0];
            }
            let logs: f64 = course.rates[..t].iter().map(|u| (-u).ln_1p()).sum();
            let rate = -(logs / t as f64).exp_m1();
            let gone = lost_from_many(&both, rate, t as f64);
            let mean = |values: &[f64]| {
                values
                    .iter()
                    .zip(&rule.weights)
                    .map(|(v, w)| v * w)
                    .sum::<f64>()
                    / total
            };
            [
                mean(&gone[..rule.nodes.len()]),
                mean(&gone[rule.nodes.len()..]),
            ]
        })
        .collect()
}

/// The same by simulated paths.
fn by_paths(
    course: &Course,
    (a, b): (f64, f64),
    generations: &[usize],
    dice: &mut Dice,
) -> Vec<[f64; 2]> {
    let mut counts = vec![[0u32; 2]; generations.len()];
    for _ in 0..PATHS {
        let mut p = beta(dice, a, b);
        let mut generation = 0;
        for (count, &wanted) in counts.iter_mut().zip(generations) {
            while generation < wanted {
                generation += 1;
                let copies = course.copies(generation);
                let parents = course.parents(p, generation);
                p = f64::from(binomial(dice, copies, parents)) / f64::from(copies);
            }
            count[0] += u32::from(generation > 0 && p == 0.0);
            count[1] += u32::from(generation > 0 && p == 1.0);
        }
    }
    let share = |n: u32| f64::from(n) / PATHS as f64;
    counts
        .into_iter()
        .map(|[lost, fixed]| [share(lost), share(fixed)])
        .collect()
}

#[cfg(test)]
mod tests {
    use super::super::{Arrival, DriftRate, Size, Spectrum};
    use super::*;
    use crate::ne::likelihood::BetaPrior;

    fn start(rate: f64) -> Start {
        let mut spectrum = Spectrum::new(&[]);
        spectrum.prior = BetaPrior { a: 1.0, b: 1.0 };
        Start {
            population: "Alder".into(),
            stratum: "Alder@2020".into(),
            year: 2020.0,
            generation_years: None,
            rate: Some(DriftRate::certain(rate)),
            expected_heterozygosity: None,
            inbreeding_coefficient: None,
            allelic_richness: None,
            gene_copies: 2,
            kept_since_baseline: None,
            spectrum,
            alleles: 0,
            sources: Vec::new(),
        }
    }

    const HORIZON: Horizon = Horizon {
        generations: 50,
        draws: 1,
        seed: 5,
        keep: 0.9,
    };

    fn watched(selection: f64) -> Watched {
        Watched {
            row: 2,
            contig: "reed_1".into(),
            position: 7,
            allele: "1".into(),
            population: None,
            selection,
            counts: None,
            source_frequency: None,
        }
    }

    fn lost(rate: f64, counts: (u32, u32), selection: f64, generations: &[usize]) -> Chances {
        let quo = Scenario::status_quo();
        chances(
            &start(rate),
            &quo,
            &watched(selection),
            counts,
            generations,
            &HORIZON,
        )
        .unwrap()
    }

    // Exact enumeration (matrix): 2 of 40 copies seen, flat prior, 2N = 100, ten generations: lost
    // with chance 0.3389764493; the diffusion is near 0.2945, so the chain must be in use.
    #[test]
    fn loss_from_a_count_is_that_of_the_exact_chain() {
        let got = lost(0.01, (2, 40), 0.0, &[0, 10]);
        assert!(
            (got.fates[1].lost - 0.33897644932819176).abs() < 1e-7,
            "{got:?}"
        );
        assert_eq!(got.fates[0].lost, 0.0);
        assert_eq!(got.ways, [Way::Chain]);
        let sum = got.fates[1].lost + got.fates[1].still_there + got.fates[1].fixed;
        assert!((sum - 1.0).abs() < 1e-12);
        // Exact enumeration at 2N = 1600, t = 160: 0.2990190959.
        let large = lost(1.0 / 1600.0, (2, 40), 0.0, &[160]);
        assert!(
            (large.fates[0].lost - 0.2990190959).abs() < 1e-5,
            "{large:?}"
        );
    }

    // So many copies typed that the frequency is known: 2N = 100, p = 0.05 (exact enumeration).
    #[test]
    fn loss_of_a_known_frequency() {
        let got = lost(0.01, (5_000_000, 100_000_000), 0.0, &[1, 5, 10, 20, 50]);
        let wanted = [
            0.0059205292,
            0.2009352230,
            0.4094480901,
            0.6168292712,
            0.8081723996,
        ];
        for (fate, want) in got.fates.iter().zip(wanted) {
            assert!((fate.lost - want).abs() < 2e-5, "{fate:?} is not {want}");
        }
        // Neutral: in the end fixed with the chance of its frequency.
        assert!((got.fixed_in_the_end.unwrap() - 0.05).abs() < 1e-6);
    }

    // Kimura (1962), N = Ne = 50, s = 0.01, p = 0.1: 0.2096410822; s = -0.01: 0.0346534378.
    #[test]
    fn selection_moves_the_end() {
        for (s, want) in [(0.01, 0.2096410822), (-0.01, 0.0346534378)] {
            let got = lost(0.01, (10_000_000, 100_000_000), s, &[3000]);
            assert!(
                (got.fixed_in_the_end.unwrap() - want).abs() < 1e-5,
                "{got:?}"
            );
            // The exact chain at its end: 0.2087239879 and 0.0342824892.
            let exact = if s > 0.0 { 0.2087239879 } else { 0.0342824892 };
            assert!((got.fates[0].fixed - exact).abs() < 1e-5, "{got:?}");
        }
    }

    #[test]
    fn the_three_ways_agree_where_they_meet() {
        let generations = [5, 20, 60];
        let chain = lost(1.0 / 2000.0, (2, 60), 0.0, &generations);
        let diffusion = lost(1.0 / 2001.0, (2, 60), 0.0, &generations);
        let paths = lost(1.0 / 2001.0, (2, 60), 1e-9, &generations);
        assert_eq!(
            (chain.ways[0], diffusion.ways[0], paths.ways[0]),
            (Way::Chain, Way::Diffusion, Way::Paths)
        );
        for i in 0..3 {
            assert!(
                (chain.fates[i].lost - diffusion.fates[i].lost).abs() < 0.005,
                "{chain:?} {diffusion:?}"
            );
            // One size here, so 2000 paths: four Monte Carlo errors.
            let error = 4.0 * (chain.fates[i].lost / 2000.0).sqrt() + 1e-3;
            assert!(
                (chain.fates[i].lost - paths.fates[i].lost).abs() < error,
                "{chain:?} {paths:?}"
            );
        }
    }

    #[test]
    fn newcomers_need_a_frequency_and_bring_an_allele_back() {
        let mut scenario = Scenario::status_quo();
        scenario.migrants = Some(Arrival {
            individuals: 2.0,
            from: "Birch@2020".into(),
        });
        let mut allele = watched(0.0);
        let ask =
            |allele: &Watched| chances(&start(0.01), &scenario, allele, (2, 40), &[50], &HORIZON);
        assert_eq!(ask(&allele), None);
        allele.source_frequency = Some(0.5);
        let open = ask(&allele).unwrap();
        assert_eq!(open.fixed_in_the_end, None);
        assert!(open.fates[0].lost < 0.2 * lost(0.01, (2, 40), 0.0, &[50]).fates[0].lost);
    }

    #[test]
    fn a_bottleneck_costs_more_than_its_harmonic_size() {
        let mut scenario = Scenario::status_quo();
        scenario.size = Size::Given(vec![5.0, 50.0]);
        let got = chances(
            &start(0.01),
            &scenario,
            &watched(0.0),
            (2, 40),
            &[1, 2],
            &HORIZON,
        )
        .unwrap();
        let steady = lost(0.01, (2, 40), 0.0, &[1, 2]);
        assert!(got.fates[0].lost > 3.0 * steady.fates[0].lost);
        assert!(got.fates[1].lost >= got.fates[0].lost);
    }
}
