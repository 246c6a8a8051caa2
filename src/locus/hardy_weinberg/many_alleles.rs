//! Any number of alleles: every table where they are few, shuffled gene copies where they are many
//! (Guo & Thompson 1992, Biometrics 48:361-372). No alleles are pooled.

use rand::SeedableRng;
use rand::seq::SliceRandom;
use rand_chacha::ChaCha8Rng;

use super::{Direction, TIE};

/// Tables after which enumeration gives way to shuffling: about 10 ms of work.
pub const TABLE_BUDGET: u64 = 1_000_000;

/// Shuffles of the gene copies: a p of 0.05 gets a standard error of 0.002.
pub const SHUFFLES: u32 = 10_000;

/// How a p was found.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Method {
    /// Every table with these allele counts was visited.
    Enumeration {
        /// Number of tables.
        tables: u64,
    },
    /// Gene copies were shuffled and paired off.
    MonteCarlo {
        /// Number of shuffles.
        shuffles: u32,
        /// Standard error of p.
        standard_error: f64,
    },
}

/// Exact test of one locus with any number of alleles.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ManyAlleleTest {
    /// Chance of the tables that are at most as likely as the observed one.
    pub p: f64,
    /// The same with the observed table and its ties counted by half.
    pub mid_p: f64,
    /// Chance of the observed table given the allele counts.
    pub probability: f64,
    /// Which way the heterozygotes depart.
    pub direction: Direction,
    /// How `p` was found.
    pub method: Method,
}

/// Counts genotypes for [`test_many_alleles`], in the order of their allele codes.
pub fn genotype_counts(genotypes: impl IntoIterator<Item = [u16; 2]>) -> Vec<([u16; 2], u32)> {
    let mut sorted: Vec<[u16; 2]> = genotypes
        .into_iter()
        .map(|[a, b]| [a.min(b), a.max(b)])
        .collect();
    sorted.sort_unstable();
    sorted
        .chunk_by(|a, b| a == b)
        .map(|alike| (alike[0], alike.len() as u32))
        .collect()
}

/// Tests genotypes given as pairs of allele codes and how often each was seen; a pair may come more
/// than once and in either order.
///
/// Visits all tables if there are at most `table_budget`, otherwise shuffles `shuffles` times from
/// `seed`, which must be at least once. Equal input gives equal output on any machine. One allele
/// alone has p = 1. `None` when nobody is typed or no shuffle is granted where one is needed.
pub fn test_many_alleles(
    genotypes: &[([u16; 2], u32)],
    table_budget: u64,
    shuffles: u32,
    seed: u64,
) -> Option<ManyAlleleTest> {
    let observed = Observed::of(genotypes)?;
    let (method, p, mid_p) = match Enumeration::run(&observed, table_budget) {
        Some(found) => {
            let p = found.rarer + found.tied;
            let mid_p = found.rarer + 0.5 * found.tied;
            (
                Method::Enumeration {
                    tables: found.tables,
                },
                p,
                mid_p,
            )
        }
        None => observed.shuffle(shuffles, seed)?,
    };
    Some(ManyAlleleTest {
        p: p.min(1.0),
        mid_p: mid_p.min(1.0),
        probability: observed.ln_probability.exp(),
        direction: observed.direction(),
        method,
    })
}

/// The observed table, alleles numbered from the rarest to the commonest.
struct Observed {
    typed: u32,
    heterozygotes: u32,
    copies: Vec<u32>,
    /// ln m! for m up to 2n.
    ln_factorial: Vec<f64>,
    /// ln of n! prod n_i!/(2n)!, the part of the probability that all tables share.
    ln_constant: f64,
    ln_probability: f64,
}

impl Observed {
    fn of(genotypes: &[([u16; 2], u32)]) -> Option<Observed> {
        let mut codes: Vec<u16> = genotypes.iter().flat_map(|&(pair, _)| pair).collect();
        codes.sort_unstable();
        codes.dedup();
        let place = |code: u16| codes.partition_point(|&known| known < code);
        let mut copies = vec![0u32; codes.len()];
        let mut table = std::collections::BTreeMap::new();
        let (mut typed, mut heterozygotes) = (0, 0);
        for &([a, b], count) in genotypes {
            typed += count;
            heterozygotes += if a == b { 0 } else { count };
            copies[place(a)] += count;
            copies[place(b)] += count;
            *table.entry([a.min(b), a.max(b)]).or_insert(0u32) += count;
        }
        if typed == 0 {
            return None;
        }
        copies.retain(|&copies| copies > 0);
        copies.sort_unstable();
        let mut ln_factorial = vec![0.0; 2 * typed as usize + 1];
        for m in 2..ln_factorial.len() {
            ln_factorial[m] = ln_factorial[m - 1] + (m as f64).ln();
        }
        let ln = |m: u32| ln_factorial[m as usize];
        let ln_constant = ln(typed) - ln(2 * typed) + copies.iter().map(|&c| ln(c)).sum::<f64>();
        let ln_table = f64::from(heterozygotes) * std::f64::consts::LN_2
            - table.values().map(|&count| ln(count)).sum::<f64>();
        let ln_probability = ln_constant + ln_table;
        Some(Observed {
            typed,
            heterozygotes,
            copies,
            ln_factorial,
            ln_constant,
            ln_probability,
        })
    }

    fn direction(&self) -> Direction {
        let all = 2 * u64::from(self.typed);
        let squares: u64 = self
            .copies
            .iter()
            .map(|&c| u64::from(c) * u64::from(c))
            .sum();
        Direction::of(self.heterozygotes, self.typed, (all * all - squares) / 2)
    }

    /// Shuffles the gene copies and pairs them off: (method, p, mid-p), where the observed table
    /// counts as one of its own ties.
    fn shuffle(&self, shuffles: u32, seed: u64) -> Option<(Method, f64, f64)> {
        if shuffles == 0 {
            return None;
        }
        let alleles = self.copies.len();
        let mut random = ChaCha8Rng::seed_from_u64(seed);
        let mut gene_copies: Vec<usize> = Vec::with_capacity(2 * self.typed as usize);
        for (allele, &copies) in self.copies.iter().enumerate() {
            gene_copies.extend(std::iter::repeat_n(allele, copies as usize));
        }
        let ln: Vec<f64> = (1..=self.typed).map(|m| f64::from(m).ln()).collect();
        let observed = self.ln_probability - self.ln_constant;
        let mut table = vec![0u32; alleles * alleles];
        let (mut rarer, mut tied) = (0u32, 0u32);
        for _ in 0..shuffles {
            gene_copies.shuffle(&mut random);
            table.fill(0);
            let (mut heterozygotes, mut ln_table) = (0u32, 0.0);
            for pair in gene_copies.chunks_exact(2) {
                let (a, b) = (pair[0].min(pair[1]), pair[0].max(pair[1]));
                let count = &mut table[a * alleles + b];
                ln_table -= ln[*count as usize];
                *count += 1;
                heterozygotes += u32::from(a != b);
            }
            ln_table += f64::from(heterozygotes) * std::f64::consts::LN_2;
            // The difference of logarithms is the relative difference of the probabilities.
            if ln_table < observed - TIE {
                rarer += 1;
            } else if ln_table <= observed + TIE {
                tied += 1;
            }
        }
        let draws = f64::from(shuffles);
        let p = f64::from(rarer + tied + 1) / (draws + 1.0);
        let mid_p = (f64::from(rarer) + 0.5 * f64::from(tied + 1)) / (draws + 1.0);
        let standard_error = (p * (1.0 - p) / draws).sqrt();
        Some((
            Method::MonteCarlo {
                shuffles,
                standard_error,
            },
            p,
            mid_p,
        ))
    }
}

/// Walks through all tables with the observed allele counts.
struct Enumeration<'a> {
    observed: &'a Observed,
    /// Copies of each allele not yet in a genotype.
    left: Vec<u32>,
    budget: u64,
    tables: u64,
    tied_from: f64,
    tied_to: f64,
    rarer: f64,
    tied: f64,
}

/// More tables than were granted.
struct TooMany;

impl<'a> Enumeration<'a> {
    fn run(observed: &'a Observed, budget: u64) -> Option<Enumeration<'a>> {
        let probability = observed.ln_probability.exp();
        let mut walk = Enumeration {
            observed,
            left: observed.copies.clone(),
            budget,
            tables: 0,
            tied_from: probability * (1.0 - TIE),
            tied_to: probability * (1.0 + TIE),
            rarer: 0.0,
            tied: 0.0,
        };
        if walk.left.len() < 2 {
            walk.left.insert(0, 0);
        }
        walk.homozygotes(0, observed.ln_constant).ok()?;
        Some(walk)
    }

    fn ln(&self, m: u32) -> f64 {
        self.observed.ln_factorial[m as usize]
    }

    /// Gives allele `i` every possible number of homozygotes, the alleles before it being used up.
    fn homozygotes(&mut self, i: usize, ln_weight: f64) -> Result<(), TooMany> {
        if i + 2 == self.left.len() {
            return self.last_two(ln_weight);
        }
        let own = self.left[i];
        let others: u32 = self.left[i + 1..].iter().sum();
        // What is left over must find partners among the other alleles.
        for homozygotes in own.saturating_sub(others).div_ceil(2)..=own / 2 {
            self.left[i] = own - 2 * homozygotes;
            self.heterozygotes(i, i + 1, others, ln_weight - self.ln(homozygotes))?;
        }
        self.left[i] = own;
        Ok(())
    }

    /// Gives alleles `i` and `j` every possible number of heterozygotes; `others` copies are left
    /// of `j` and the alleles after it.
    fn heterozygotes(
        &mut self,
        i: usize,
        j: usize,
        others: u32,
        ln_weight: f64,
    ) -> Result<(), TooMany> {
        let own = self.left[i];
        if own == 0 {
            return self.homozygotes(i + 1, ln_weight);
        }
        let partners = self.left[j];
        let others = others - partners;
        for both in own.saturating_sub(others)..=own.min(partners) {
            self.left[i] = own - both;
            self.left[j] = partners - both;
            let ln_weight = ln_weight + f64::from(both) * std::f64::consts::LN_2 - self.ln(both);
            self.heterozygotes(i, j + 1, others, ln_weight)?;
        }
        self.left[i] = own;
        self.left[j] = partners;
        Ok(())
    }

    /// Two alleles left: one free number, walked from near its mode both ways by the recursion of
    /// two alleles, so that a table costs a division and no logarithm.
    fn last_two(&mut self, ln_weight: f64) -> Result<(), TooMany> {
        let (a, b) = match self.left[..] {
            [.., a, b] => (a.min(b), a.max(b)),
            _ => (0, 0),
        };
        let tables = u64::from(a / 2) + 1;
        if self.tables + tables > self.budget {
            return Err(TooMany);
        }
        self.tables += tables;
        let near = (u64::from(a) * u64::from(b) / u64::from((a + b).max(1))) as u32;
        let centre = near + (near + a) % 2;
        let at_centre = (ln_weight + f64::from(centre) * std::f64::consts::LN_2
            - self.ln(centre)
            - self.ln((a - centre) / 2)
            - self.ln((b - centre) / 2))
        .exp();
        let step = |h: u32| {
            (u64::from(a - h) * u64::from(b - h)) as f64
                / (u64::from(h + 2) * u64::from(h + 1)) as f64
        };
        let (mut rarer, mut tied) = (0.0, 0.0);
        let mut count = |probability: f64| {
            if probability < self.tied_from {
                rarer += probability;
            } else if probability <= self.tied_to {
                tied += probability;
            }
        };
        count(at_centre);
        let (mut h, mut probability) = (centre, at_centre);
        while h >= 2 {
            h -= 2;
            probability /= step(h);
            count(probability);
        }
        (h, probability) = (centre, at_centre);
        while h + 2 <= a {
            probability *= step(h);
            h += 2;
            count(probability);
        }
        self.rarer += rarer;
        self.tied += tied;
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nobody_typed_is_absent_and_one_allele_fits() {
        assert_eq!(test_many_alleles(&[], 10, 10, 1), None);
        assert_eq!(test_many_alleles(&[([0, 1], 0)], 10, 10, 1), None);
        let fixed = test_many_alleles(&[([3, 3], 9)], 10, 10, 1).unwrap();
        assert_eq!(fixed.method, Method::Enumeration { tables: 1 });
        assert!((fixed.p - 1.0).abs() < 1e-9 && (fixed.mid_p - 0.5).abs() < 1e-9);
    }

    #[test]
    fn order_of_genotypes_and_alleles_is_of_no_account() {
        let one = [([0, 1], 3), ([1, 2], 4), ([2, 2], 2), ([0, 0], 1)];
        let two = [
            ([2, 2], 1),
            ([1, 0], 1),
            ([0, 0], 2),
            ([0, 1], 3),
            ([2, 1], 3),
        ];
        let tests = [one.as_slice(), two.as_slice()]
            .map(|genotypes| test_many_alleles(genotypes, TABLE_BUDGET, SHUFFLES, 1).unwrap());
        assert_eq!(tests[0], tests[1]);
    }

    #[test]
    fn equal_seeds_give_equal_answers() {
        let genotypes = [([0, 1], 3), ([1, 2], 4), ([2, 2], 2), ([0, 0], 1)];
        let run = |seed| test_many_alleles(&genotypes, 0, 500, seed).unwrap();
        assert_eq!(run(7), run(7));
        assert_ne!(run(7), run(8));
        assert_eq!(test_many_alleles(&genotypes, 0, 0, 7), None);
    }
}
