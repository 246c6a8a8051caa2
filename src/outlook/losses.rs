//! Lost, or only missed: alleles of the baseline that the latest sample does not show.
//!
//! P(lost | not seen) = P(lost by now | baseline count) / P(not seen now | baseline count), with the
//! baseline frequency uncertain (the fitted prior, updated by the baseline count) and the effective
//! size uncertain (a list of weighted drift rates). "Lost" means absent from all 2N copies of the
//! population, so small populations use the exact Wright-Fisher chain (see `passage`).

use std::collections::HashMap;

pub use super::passage::{BaselineCount, Pool};
use super::passage::{Passage, dot};
use crate::ne::likelihood::{BetaPrior, RateWeight};

/// Below this chance of not being seen, drift at this size does not explain the absence, and a
/// ratio of two such chances means nothing.
const UNEXPLAINED: f64 = 1e-10;

/// Which allele is meant: the prior was fitted to the copies of one of the two.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Side {
    /// The allele whose copies the prior was fitted to.
    Counted,
    /// The other one, or all others together.
    Other,
}

/// Chances of one allele, given its baseline count.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Chances {
    /// That the later sample does not show it.
    pub not_seen: f64,
    /// That it is gone from the population.
    pub lost: f64,
    /// That it is gone, given that the sample does not show it; `None` where drift does not explain
    /// the absence at all.
    pub lost_if_not_seen: Option<f64>,
}

/// A baseline count and a later sample size: what the chances depend on.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub struct Watch {
    /// Which allele.
    pub side: Side,
    /// Its copies in the baseline sample; above 0 for an allele that can be lost.
    pub baseline_copies: u32,
    /// Gene copies typed in the baseline sample.
    pub baseline_typed: u32,
    /// Gene copies typed in the later sample.
    pub later_typed: u32,
}

/// Chances of any number of alleles between one baseline and one later visit. Alleles of equal
/// counts are computed once.
#[derive(Debug, Clone)]
pub struct LossTable {
    sides: [Passage; 2],
    lost: [Vec<f64>; 2],
    not_seen: HashMap<(Side, u32), Vec<f64>>,
    known: HashMap<Watch, Chances>,
    most_later: u32,
}

impl LossTable {
    /// Prepares a table: the fitted prior, weighted drift rates (which add up to 1), generations
    /// since the baseline (more than 0), and the most gene copies typed later at any locus. `counts` are the
    /// baseline counts of all alleles that the prior was fitted to; none leave it as it is.
    pub fn new(
        prior: BetaPrior,
        counts: &[BaselineCount],
        pool: Pool,
        rates: &[RateWeight],
        generations: f64,
        most_later: u32,
    ) -> Self {
        let counted = Passage::new(prior, counts, pool, rates, generations, most_later);
        // A symmetric prior makes both sides alike; the work is the same for either.
        let other = match prior == prior.exchanged() {
            true => counted.clone(),
            false => {
                let mirrored: Vec<BaselineCount> = counts
                    .iter()
                    .map(|c| BaselineCount {
                        copies: c.typed.saturating_sub(c.copies),
                        ..*c
                    })
                    .collect();
                Passage::new(
                    prior.exchanged(),
                    &mirrored,
                    pool,
                    rates,
                    generations,
                    most_later,
                )
            }
        };
        let lost = [
            counted.lost(rates, generations),
            other.lost(rates, generations),
        ];
        let sides = [counted, other];
        LossTable {
            sides,
            lost,
            not_seen: HashMap::new(),
            known: HashMap::new(),
            most_later,
        }
    }

    /// The chances of one allele.
    pub fn chances(&mut self, mut watch: Watch) -> Chances {
        watch.later_typed = watch.later_typed.min(self.most_later);
        if let Some(known) = self.known.get(&watch) {
            return *known;
        }
        let side = watch.side as usize;
        let passage = &self.sides[side];
        let absent = self
            .not_seen
            .entry((watch.side, watch.later_typed))
            .or_insert_with(|| {
                let n = f64::from(watch.later_typed);
                let function: Vec<f64> = passage.nodes.iter().map(|x| (1.0 - x).powf(n)).collect();
                passage.back(&function)
            });
        let posterior = passage.posterior(watch.baseline_copies, watch.baseline_typed);
        let not_seen = dot(&posterior, absent).clamp(0.0, 1.0);
        let lost = dot(&posterior, &self.lost[side]).min(not_seen);
        let lost_if_not_seen = (not_seen > UNEXPLAINED).then(|| (lost / not_seen).min(1.0));
        let chances = Chances {
            not_seen,
            lost,
            lost_if_not_seen,
        };
        self.known.insert(watch, chances);
        chances
    }

    /// Chance that a locus is fixed for the one allele that the later sample shows: that all others
    /// together, which is one allele to drift, are lost. `remaining` describes the allele still seen.
    pub fn fixed(&mut self, remaining: Watch) -> Option<f64> {
        let side = match remaining.side {
            Side::Counted => Side::Other,
            Side::Other => Side::Counted,
        };
        let others = remaining
            .baseline_typed
            .saturating_sub(remaining.baseline_copies);
        self.chances(Watch {
            side,
            baseline_copies: others,
            ..remaining
        })
        .lost_if_not_seen
    }
}

/// What an allele not seen again is called.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum LossCall {
    /// Probably gone from the population.
    Lost,
    /// Probably still there.
    Missed,
    /// Neither can be said.
    Uncertain,
}

/// Limits of the calls, on P(lost | not seen).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CallLimits {
    /// From here up: lost.
    pub lost: f64,
    /// From here down: missed.
    pub missed: f64,
}

impl Default for CallLimits {
    fn default() -> Self {
        CallLimits {
            lost: 0.95,
            missed: 0.5,
        }
    }
}

impl CallLimits {
    /// The call for a chance of being lost; uncertain where there is none.
    pub fn call(&self, lost_if_not_seen: Option<f64>) -> LossCall {
        match lost_if_not_seen {
            Some(p) if p >= self.lost => LossCall::Lost,
            Some(p) if p <= self.missed => LossCall::Missed,
            _ => LossCall::Uncertain,
        }
    }
}

/// A sum over alleles of the baseline.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Expected {
    /// Alleles of the baseline counted.
    pub alleles: u64,
    /// Expected number of them that the later sample does not show.
    pub not_seen: f64,
    /// Variance of that number if alleles were independent; shared pedigree makes it larger.
    pub variance: f64,
}

impl Expected {
    /// Adds one allele of the baseline, seen again or not.
    pub fn add(&mut self, chances: &Chances) {
        self.alleles += 1;
        self.not_seen += chances.not_seen;
        self.variance += chances.not_seen * (1.0 - chances.not_seen);
    }
}

/// Calls of the alleles not seen again.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct LossTally {
    /// Alleles called lost.
    pub lost: u64,
    /// Alleles called missed.
    pub missed: u64,
    /// Alleles of neither call.
    pub uncertain: u64,
    /// Expected number really lost among all of them, those without a chance left out.
    pub expected_lost: f64,
    /// Expected number of calls "lost" that are wrong.
    pub expected_wrong: f64,
}

impl LossTally {
    /// Adds one allele not seen again.
    pub fn add(&mut self, limits: &CallLimits, lost_if_not_seen: Option<f64>) {
        self.expected_lost += lost_if_not_seen.unwrap_or(0.0);
        match limits.call(lost_if_not_seen) {
            LossCall::Lost => {
                self.lost += 1;
                self.expected_wrong += 1.0 - lost_if_not_seen.unwrap_or(0.0);
            }
            LossCall::Missed => self.missed += 1,
            LossCall::Uncertain => self.uncertain += 1,
        }
    }

    /// Expected share of the calls "lost" that are wrong; `None` where nothing is called lost.
    pub fn share_wrong(&self) -> Option<f64> {
        (self.lost > 0).then(|| self.expected_wrong / self.lost as f64)
    }
}

#[cfg(test)]
mod tests {
    use rand::{RngExt, SeedableRng};
    use rand_chacha::ChaCha8Rng;

    use super::*;
    use crate::ne::prior::fit_prior;

    fn certain(two_ne: f64) -> Vec<RateWeight> {
        RateWeight::certain(Some(two_ne / 2.0))
    }

    fn watch(x: u32, n: u32, later: u32) -> Watch {
        Watch {
            side: Side::Counted,
            baseline_copies: x,
            baseline_typed: n,
            later_typed: later,
        }
    }

    fn close(got: f64, want: f64, absolute: f64) {
        assert!((got - want).abs() < absolute, "{got} is not {want}");
    }

    /// Exact matrix with beta-binomial founders, 2 of 40 at the baseline, 40 later, T = 0.1; and the
    /// coalescent with an infinite population.
    #[test]
    fn equals_the_exact_matrix_and_the_coalescent() {
        let flat = BetaPrior::FLAT;
        let small = LossTable::new(flat, &[], Pool::Endless, &certain(100.0), 10.0, 40)
            .chances(watch(2, 40, 40));
        close(small.not_seen, 0.42569865986454314, 1e-9);
        close(small.lost, 0.33897644932819176, 1e-9);
        close(small.lost_if_not_seen.unwrap(), 0.796282632029083, 1e-9);
        let large = LossTable::new(flat, &[], Pool::Endless, &certain(1600.0), 160.0, 40)
            .chances(watch(2, 40, 40));
        close(large.not_seen, 0.4183233834803522, 1e-8);
        close(large.lost, 0.2990190959198393, 1e-8);
        let huge = LossTable::new(flat, &[], Pool::Endless, &certain(1e6), 1e5, 40)
            .chances(watch(2, 40, 40));
        close(huge.not_seen, 0.4178473961765248, 1e-6);
        close(huge.lost, 0.2944996008361613, 5e-5);
        close(huge.lost_if_not_seen.unwrap(), 0.7048018092991689, 1e-4);
    }

    /// 2N copies drawn from the baseline frequency, then generation by generation, then a sample.
    #[test]
    fn equals_the_chain_for_other_priors_and_fractions_of_a_generation() {
        use crate::ne::wright_fisher::{Chain, founder_copies};
        let prior = BetaPrior { a: 0.2, b: 0.8 };
        for (copies, t, x, n, later) in [
            (60u32, 3.0, 1, 50, 80),
            (300, 6.0, 4, 44, 30),
            (9, 1.0, 2, 20, 40),
        ] {
            let chain = Chain::neutral(copies);
            let mut f = founder_copies(copies, 0.2 + f64::from(x), 0.8 + f64::from(n - x));
            for _ in 1..t as u32 {
                f = chain.forward(&f);
            }
            let unseen: f64 = f
                .iter()
                .enumerate()
                .map(|(k, p)| p * (1.0 - k as f64 / f64::from(copies)).powi(later as i32))
                .sum();
            let mut table = LossTable::new(
                prior,
                &[],
                Pool::Endless,
                &certain(f64::from(copies)),
                t,
                later,
            );
            let got = table.chances(watch(x, n, later));
            close(got.not_seen, unseen, 1e-9);
            close(got.lost, f[0], 1e-9);
        }
        let at = |t| {
            LossTable::new(prior, &[], Pool::Endless, &certain(60.0), t, 80)
                .chances(watch(1, 50, 80))
        };
        let (two, three, between) = (at(2.0), at(3.0), at(2.25));
        close(between.lost, 0.75 * two.lost + 0.25 * three.lost, 1e-12);
        close(
            between.not_seen,
            0.75 * two.not_seen + 0.25 * three.not_seen,
            1e-12,
        );
        assert_eq!(at(0.5).lost, 0.5 * at(1.0).lost);
    }

    #[test]
    fn sides_mirror_each_other_and_fixed_is_the_rest_lost() {
        let prior = BetaPrior { a: 0.3, b: 2.0 };
        let mut table = LossTable::new(prior, &[], Pool::Endless, &certain(80.0), 5.0, 60);
        let mut mirrored = LossTable::new(
            prior.exchanged(),
            &[],
            Pool::Endless,
            &certain(80.0),
            5.0,
            60,
        );
        let other = Watch {
            side: Side::Other,
            ..watch(3, 40, 60)
        };
        close(
            table.chances(other).lost,
            mirrored.chances(watch(3, 40, 60)).lost,
            1e-14,
        );
        let fixed = table.fixed(watch(37, 40, 60));
        assert_eq!(fixed, table.chances(other).lost_if_not_seen);
    }

    #[test]
    fn without_drift_nothing_is_lost() {
        let mut table = LossTable::new(
            BetaPrior::FLAT,
            &[],
            Pool::Endless,
            &RateWeight::certain(None),
            5.0,
            60,
        );
        let chances = table.chances(watch(1, 40, 60));
        assert_eq!(chances.lost, 0.0);
        // Beta(2, 40): E (1-p)^60 = B(2, 100)/B(2, 40) = (40 * 41)/(100 * 101).
        close(chances.not_seen, 40.0 * 41.0 / (100.0 * 101.0), 1e-9);
        assert_eq!(table.chances(watch(40, 40, 60)).lost_if_not_seen, None);
    }

    #[test]
    fn calls_and_their_tally() {
        let limits = CallLimits::default();
        let mut tally = LossTally::default();
        for p in [Some(0.97), Some(0.99), Some(0.7), Some(0.2), None] {
            tally.add(&limits, p);
        }
        assert_eq!((tally.lost, tally.uncertain, tally.missed), (2, 2, 1));
        close(tally.share_wrong().unwrap(), 0.02, 1e-12);
        close(tally.expected_lost, 2.86, 1e-12);
        assert_eq!(LossTally::default().share_wrong(), None);
    }

    fn binomial(n: u32, p: f64, random: &mut ChaCha8Rng) -> u32 {
        if p <= 0.0 {
            return 0;
        }
        (0..n).map(|_| u32::from(random.random::<f64>() < p)).sum()
    }

    /// Frequencies drawn from Beta(a, b) by the ratio of two gamma variates (Johnk's way for shapes
    /// of at most 1).
    fn beta(a: f64, b: f64, random: &mut ChaCha8Rng) -> f64 {
        loop {
            let x = random.random::<f64>().powf(1.0 / a);
            let y = random.random::<f64>().powf(1.0 / b);
            if x + y > 0.0 && x + y <= 1.0 {
                return x / (x + y);
            }
        }
    }

    /// Simulated populations: what is said of alleles not seen against what became of them. The
    /// designs, and the gap of at most 0.006 between said and true, are those of a simulation made
    /// apart from this program (15 000 to 38 000 loci a design).
    #[test]
    fn said_is_true_in_simulated_populations() {
        for (copies, t, n0, later, a, b, truth) in [
            (100u32, 5u32, 50u32, 50u32, 1.0, 1.0, 0.661),
            (100, 5, 50, 50, 0.2, 0.8, 0.799),
            (200, 10, 60, 40, 0.1, 1.0, 0.711),
            (50, 4, 40, 40, 0.3, 0.3, 0.861),
        ] {
            let mut random = ChaCha8Rng::seed_from_u64(11);
            let mut loci = Vec::new();
            while loci.len() < 12_000 {
                let p = beta(a, b, &mut random);
                let x0 = binomial(n0, p, &mut random);
                if x0 == 0 || x0 == n0 {
                    continue;
                }
                let mut now = binomial(copies, p, &mut random);
                for _ in 1..t {
                    now = binomial(copies, f64::from(now) / f64::from(copies), &mut random);
                }
                let seen = binomial(later, f64::from(now) / f64::from(copies), &mut random);
                loci.push((x0, now, seen));
            }
            let prior = fit_prior(loci.iter().map(|&(x, ..)| (x, n0)))
                .unwrap()
                .prior;
            let mut table = LossTable::new(
                prior,
                &[],
                Pool::Endless,
                &certain(f64::from(copies)),
                f64::from(t),
                later,
            );
            let (mut said, mut lost, mut unseen, mut expected): (f64, f64, f64, _) =
                (0.0, 0.0, 0.0, Expected::default());
            for &(x0, now, seen) in &loci {
                let chances = table.chances(watch(x0, n0, later));
                expected.add(&chances);
                if seen == 0 {
                    unseen += 1.0;
                    said += chances.lost_if_not_seen.unwrap();
                    lost += f64::from(now == 0);
                }
            }
            let error = (truth * (1.0 - truth) / unseen).sqrt();
            close(said / unseen, lost / unseen, 3.0 * error + 0.003);
            close(said / unseen, truth, 3.0 * error + 0.012);
            close(expected.not_seen, unseen, 4.0 * expected.variance.sqrt());
        }
    }
}
