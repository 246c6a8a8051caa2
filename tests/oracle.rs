//! Slow and plain versions of the statistics of a locus, straight from their definitions, against
//! the fast ones on random genotypes; and laws that hold whatever the genotypes are.

use std::collections::BTreeMap;

use genewane::locus::Counts;
use genewane::locus::change::temporal_terms;
use genewane::locus::diversity::{expected_heterozygosity, observed_heterozygosity};
use genewane::locus::fstatistics::{Components, hudson, nei, weir_cockerham};
use genewane::locus::hardy_weinberg::{
    Direction, HardyWeinbergCache, Method, genotype_counts, test_many_alleles, test_two_alleles,
};
use genewane::locus::richness::{Rarefaction, private_richness, richness};
use proptest::collection::vec;
use proptest::prelude::*;

/// Alleles listed at every locus here.
const ALLELES: usize = 4;

type Genotype = [u16; 2];

#[track_caller]
fn close(value: f64, expected: f64) {
    assert!(
        (value - expected).abs() <= 1e-11 * expected.abs().max(1.0),
        "{value} is not {expected}"
    );
}

/// Genotypes of up to `most` individuals, of which some may share a few alleles only.
fn sample(most: usize) -> impl Strategy<Value = Vec<Genotype>> {
    (1..=ALLELES as u16).prop_flat_map(move |alleles| vec([0..alleles, 0..alleles], 1..=most))
}

fn counts(genotypes: &[Genotype]) -> Counts {
    Counts::of(ALLELES, genotypes.iter().copied().map(Some))
}

fn gene_copies(genotypes: &[Genotype]) -> Vec<u16> {
    genotypes.iter().flatten().copied().collect()
}

/// Calls `visit` with every way to choose `size` of `items`.
fn subsets(items: &[u16], size: usize, chosen: &mut Vec<u16>, visit: &mut impl FnMut(&[u16])) {
    if size == 0 {
        return visit(chosen);
    }
    for (i, &item) in items.iter().enumerate() {
        chosen.push(item);
        subsets(&items[i + 1..], size - 1, chosen, visit);
        chosen.pop();
    }
}

/// How often each table of genotypes comes up when labelled gene copies are paired off in every way.
fn pairings(copies: &[u16], table: &mut Vec<Genotype>, found: &mut BTreeMap<Vec<Genotype>, u64>) {
    let Some((&first, rest)) = copies.split_first() else {
        let mut sorted = table.clone();
        sorted.sort_unstable();
        *found.entry(sorted).or_default() += 1;
        return;
    };
    for i in 0..rest.len() {
        let partner = rest[i];
        let others: Vec<u16> = rest
            .iter()
            .enumerate()
            .filter(|&(j, _)| j != i)
            .map(|(_, &copy)| copy)
            .collect();
        table.push([first.min(partner), first.max(partner)]);
        pairings(&others, table, found);
        table.pop();
    }
}

/// Components of variance by a nested analysis of variance of 0/1 indicators: populations,
/// individuals within them, gene copies within individuals (Weir & Cockerham 1984).
fn nested_analysis(samples: &[Vec<Genotype>]) -> Components {
    let r = samples.len() as f64;
    let n: f64 = samples.iter().map(|s| s.len() as f64).sum();
    let squares: f64 = samples.iter().map(|s| (s.len() * s.len()) as f64).sum();
    let mut sum = Components::default();
    for allele in 0..ALLELES as u16 {
        let has = |copy: u16| f64::from(u8::from(copy == allele));
        let mean =
            |copies: &[u16]| copies.iter().map(|&c| has(c)).sum::<f64>() / copies.len() as f64;
        let all: Vec<u16> = samples.iter().flat_map(|s| gene_copies(s)).collect();
        let grand = mean(&all);
        let (mut between, mut individuals, mut within) = (0.0, 0.0, 0.0);
        for genotypes in samples {
            let own = mean(&gene_copies(genotypes));
            between += 2.0 * genotypes.len() as f64 * (own - grand).powi(2);
            for genotype in genotypes {
                let average = mean(genotype);
                individuals += 2.0 * (average - own).powi(2);
                within += genotype
                    .iter()
                    .map(|&c| (has(c) - average).powi(2))
                    .sum::<f64>();
            }
        }
        let msp = between / (r - 1.0);
        let msi = individuals / (n - r);
        let msg = within / n;
        let corrected = (n - squares / n) / (r - 1.0);
        sum += Components {
            a: (msp - msi) / (2.0 * corrected),
            b: (msi - msg) / 2.0,
            c: msg,
        };
    }
    sum
}

/// Share of the genotypes that are heterozygous, and frequency of each allele.
fn shares(genotypes: &[Genotype]) -> (f64, Vec<f64>) {
    let n = genotypes.len() as f64;
    let heterozygous = genotypes.iter().filter(|[a, b]| a != b).count() as f64 / n;
    let frequency = |allele| {
        gene_copies(genotypes)
            .iter()
            .filter(|&&copy| usize::from(copy) == allele)
            .count() as f64
            / (2.0 * n)
    };
    (heterozygous, (0..ALLELES).map(frequency).collect())
}

proptest! {
    /// Observed heterozygosity is a count; expected heterozygosity is the share of pairs of distinct
    /// gene copies that differ.
    #[test]
    fn heterozygosity(genotypes in sample(12)) {
        let counts = counts(&genotypes);
        let (mut pairs, mut differ) = (0, 0);
        subsets(&gene_copies(&genotypes), 2, &mut vec![], &mut |pair| {
            pairs += 1;
            differ += u32::from(pair[0] != pair[1]);
        });
        let expected = expected_heterozygosity(&counts).unwrap();
        close(expected, f64::from(differ) / f64::from(pairs));
        close(observed_heterozygosity(&counts).unwrap(), shares(&genotypes).0);
        prop_assert!((0.0..=1.0).contains(&expected));
        close(richness(&counts, &mut Rarefaction::new(2)).unwrap(), 1.0 + expected);
    }

    /// Rarefied richness is the mean number of alleles over all subsets of gene copies; private
    /// richness that of alleles in no subset of the other sample.
    #[test]
    fn richness_over_all_subsets(first in sample(5), second in sample(5), g in 1usize..=5) {
        let samples = [counts(&first), counts(&second)];
        let mut table = Rarefaction::new(g as u32);
        if 2 * first.len().min(second.len()) < g {
            prop_assert_eq!(private_richness(0, &samples, &mut table), None);
            return Ok(());
        }
        let drawn = |genotypes: &[Genotype]| {
            let mut sets = BTreeMap::new();
            subsets(&gene_copies(genotypes), g, &mut vec![], &mut |chosen| {
                let mut alleles = chosen.to_vec();
                alleles.sort_unstable();
                alleles.dedup();
                *sets.entry(alleles).or_insert(0u32) += 1;
            });
            sets
        };
        let (own, other) = (drawn(&first), drawn(&second));
        let (mut all, mut alone, mut ways_own, mut ways) = (0.0, 0.0, 0.0, 0.0);
        for (alleles, &times) in &own {
            all += f64::from(times) * alleles.len() as f64;
            ways_own += f64::from(times);
            for (theirs, &theirs_times) in &other {
                let both = f64::from(times) * f64::from(theirs_times);
                alone += both * alleles.iter().filter(|a| !theirs.contains(a)).count() as f64;
                ways += both;
            }
        }
        close(richness(&samples[0], &mut table).unwrap(), all / ways_own);
        close(private_richness(0, &samples, &mut table).unwrap(), alone / ways);
    }

    /// More gene copies never show fewer alleles, and all of them show all.
    #[test]
    fn richness_rises(genotypes in sample(40)) {
        let counts = counts(&genotypes);
        let mut before = 0.0;
        for g in 1..=counts.gene_copies() {
            let now = richness(&counts, &mut Rarefaction::new(g)).unwrap();
            prop_assert!(now >= before - 1e-12);
            before = now;
        }
        close(before, counts.alleles_seen() as f64);
    }

    /// Closed form and nested analysis of variance.
    #[test]
    fn variance_components(samples in vec(sample(8), 2..5)) {
        let counted: Vec<Counts> = samples.iter().map(|s| counts(s)).collect();
        let fast = weir_cockerham(&counted);
        if samples.iter().all(|s| s.len() == 1) {
            prop_assert_eq!(fast, None);
            return Ok(());
        }
        let (fast, slow) = (fast.unwrap(), nested_analysis(&samples));
        close(fast.a, slow.a);
        close(fast.b, slow.b);
        close(fast.c, slow.c);
        let mut padded = counted.clone();
        padded.insert(1, Counts::empty(ALLELES));
        let padded = weir_cockerham(&padded).unwrap();
        close(padded.a, slow.a);
        close(padded.b, slow.b);
    }

    /// Hudson: pairs of copies between samples that differ, less the mean of those within.
    #[test]
    fn differences_between_and_within(first in sample(8), second in sample(8)) {
        let share = |left: &[u16], right: &[u16], same: bool| {
            let mut pairs = (0.0, 0.0);
            for (i, a) in left.iter().enumerate() {
                for (j, b) in right.iter().enumerate() {
                    if !(same && i == j) {
                        pairs.0 += f64::from(u8::from(a != b));
                        pairs.1 += 1.0;
                    }
                }
            }
            pairs.0 / pairs.1
        };
        let (a, b) = (gene_copies(&first), gene_copies(&second));
        let between = share(&a, &b, false);
        let within = (share(&a, &a, true) + share(&b, &b, true)) / 2.0;
        let terms = hudson(&counts(&first), &counts(&second)).unwrap();
        close(terms.numerator, between - within);
        close(terms.denominator, between);
        // Two alleles: the form of Bhatia et al. (2013).
        if [&a, &b].iter().all(|copies| copies.iter().all(|&copy| copy < 2)) {
            let (p, q) = (shares(&first).1[0], shares(&second).1[0]);
            let own = |p: f64, n: usize| p * (1.0 - p) / (n as f64 - 1.0);
            close(terms.numerator, (p - q).powi(2) - own(p, a.len()) - own(q, b.len()));
            close(terms.denominator, p * (1.0 - q) + q * (1.0 - p));
        }
    }

    /// Nei & Chesser, allele by allele from frequencies.
    #[test]
    fn diversity_within_and_over(samples in vec(sample(8), 2..5)) {
        let s = samples.len() as f64;
        let size = s / samples.iter().map(|g| 1.0 / g.len() as f64).sum::<f64>();
        let counted: Vec<Counts> = samples.iter().map(|g| counts(g)).collect();
        let fast = nei(&counted);
        if samples.iter().all(|g| g.len() == 1) {
            prop_assert_eq!(fast, None);
            return Ok(());
        }
        let fast = fast.unwrap();
        let parts: Vec<_> = samples.iter().map(|g| shares(g)).collect();
        let observed = parts.iter().map(|part| part.0).sum::<f64>() / s;
        let mean = |f: &dyn Fn(f64) -> f64, i: usize| {
            parts.iter().map(|part| f(part.1[i])).sum::<f64>() / s
        };
        let squares: f64 = (0..ALLELES).map(|i| mean(&|p| p * p, i)).sum();
        let squared: f64 = (0..ALLELES).map(|i| mean(&|p| p, i).powi(2)).sum();
        let within = size / (size - 1.0) * (1.0 - squares - observed / (2.0 * size));
        let total = 1.0 - squared + within / (size * s) - observed / (2.0 * size * s);
        close(fast.observed, observed);
        close(fast.within, within);
        close(fast.total, total);
        let mut padded = counted.clone();
        padded.push(Counts::empty(ALLELES));
        let padded = nei(&padded).unwrap();
        close(padded.within, within);
        close(padded.total, total);
    }

    /// Hardy-Weinberg tests of any number of alleles, by pairing labelled gene copies in every way.
    #[test]
    fn hardy_weinberg_over_all_pairings(genotypes in sample(5)) {
        let counts = counts(&genotypes);
        let mut found = BTreeMap::new();
        pairings(&gene_copies(&genotypes), &mut vec![], &mut found);
        let all: u64 = found.values().sum();
        let mut own: Vec<Genotype> =
            genotypes.iter().map(|&[a, b]| [a.min(b), a.max(b)]).collect();
        own.sort_unstable();
        let observed = found[&own];
        let share = |times: u64| times as f64 / all as f64;
        let sum = |keep: &dyn Fn(u64) -> bool| found.values().copied().filter(|&t| keep(t)).sum();
        let p = share(sum(&|times| times <= observed));
        let mid_p = p - 0.5 * share(sum(&|times| times == observed));
        let heterozygotes = |table: &[Genotype]| table.iter().filter(|[a, b]| a != b).count() as u32;
        let expected: u64 =
            found.iter().map(|(table, times)| u64::from(heterozygotes(table)) * times).sum();
        let direction = if u64::from(counts.heterozygotes) * all < expected {
            Direction::Deficit
        } else {
            Direction::Excess
        };

        let table = genotype_counts(genotypes.iter().copied());
        let many = test_many_alleles(&table, 100_000, 0, 0).unwrap();
        close(many.p, p);
        close(many.mid_p, mid_p);
        close(many.probability, share(observed));
        prop_assert_eq!(many.method, Method::Enumeration { tables: found.len() as u64 });
        prop_assert_eq!(many.direction, direction);
        if counts.alleles_seen() == 2 {
            let copies = counts.copies.iter().copied().find(|&copies| copies > 0).unwrap();
            let test = test_two_alleles(counts.typed, copies, counts.heterozygotes).unwrap();
            let tail = |keep: &dyn Fn(u32) -> bool| {
                let chosen = found.iter().filter(|(table, _)| keep(heterozygotes(table)));
                share(chosen.map(|(_, times)| times).sum())
            };
            close(test.p, p);
            close(test.mid_p, mid_p);
            close(test.deficit, tail(&|h| h <= counts.heterozygotes));
            close(test.excess, tail(&|h| h >= counts.heterozygotes));
            let looked_up = HardyWeinbergCache::default().mid_p(&counts).unwrap();
            close(looked_up.mid_p, mid_p);
            prop_assert_eq!(looked_up.direction, direction);
        }
    }

    /// Temporal terms from frequencies; with two alleles Fk = Fs = Fc/(1 - Fc/4).
    #[test]
    fn change_over_time(first in sample(12), later in sample(12)) {
        let (x, y) = (shares(&first).1, shares(&later).1);
        let (mut k, mut fc, mut fk, mut above, mut below) = (0.0, 0.0, 0.0, 0.0, 0.0);
        for (x, y) in x.iter().zip(&y).filter(|(x, y)| *x + *y > 0.0) {
            let z = (x + y) / 2.0;
            k += 1.0;
            fc += (x - y).powi(2) / (z - x * y);
            fk += (x - y).powi(2) / z;
            above += (x - y).powi(2);
            below += z * (1.0 - z);
        }
        let terms = temporal_terms(&counts(&first), &counts(&later));
        if k < 2.0 {
            prop_assert_eq!(terms, None);
            return Ok(());
        }
        let terms = terms.unwrap();
        prop_assert_eq!(f64::from(terms.alleles), k);
        close(terms.fc, fc / k);
        close(terms.fk, fk / (k - 1.0));
        close(terms.fs_numerator, above);
        close(terms.fs_denominator, below);
        if terms.alleles == 2 {
            close(terms.fk, terms.fc / (1.0 - terms.fc / 4.0));
            close(terms.fk, above / below);
        }
    }

    /// Alleles are names: no statistic changes when they are renamed, which includes a swap of
    /// reference and alternate.
    #[test]
    fn renamed_alleles(samples in vec(sample(8), 3), shift in 1u16..4) {
        let before: Vec<Counts> = samples.iter().map(|s| counts(s)).collect();
        let rename = |[a, b]: Genotype| [(b + shift) % 4, (a + shift) % 4];
        let after: Vec<Counts> = samples
            .iter()
            .map(|s| counts(&s.iter().map(|&g| rename(g)).collect::<Vec<_>>()))
            .collect();
        let all = |counts: &[Counts]| {
            let mut values = vec![];
            let mut table = Rarefaction::new(2);
            let components = weir_cockerham(counts).map(|c| vec![c.a, c.b, c.c]);
            values.extend(components.unwrap_or_default());
            values.extend(nei(counts).map(|n| vec![n.within, n.total]).unwrap_or_default());
            values.extend(hudson(&counts[0], &counts[1]).map(|h| h.numerator));
            values.extend(temporal_terms(&counts[0], &counts[1]).map(|t| t.fc));
            values.extend(private_richness(1, counts, &mut table));
            values.extend(HardyWeinbergCache::default().mid_p(&counts[0]).map(|m| m.mid_p));
            values.extend(expected_heterozygosity(&counts[2]));
            values
        };
        let (before, after) = (all(&before), all(&after));
        prop_assert_eq!(before.len(), after.len());
        before.into_iter().zip(after).for_each(|(one, two)| close(one, two));
    }

    /// A locus listed with two alleles takes the short way; listed with more, the long one.
    #[test]
    fn two_listed_alleles_or_more(samples in vec(vec([0u16..2, 0u16..2], 1..8), 2..4)) {
        let listed = |alleles: usize| -> Vec<Counts> {
            samples.iter().map(|s| Counts::of(alleles, s.iter().copied().map(Some))).collect()
        };
        let (two, four) = (weir_cockerham(&listed(2)), weir_cockerham(&listed(4)));
        let change = |l: &[Counts]| temporal_terms(&l[0], &l[1]).map(|t| [t.fc, t.fk, t.fs_numerator, t.fs_denominator]);
        let (short, long) = (change(&listed(2)), change(&listed(4)));
        prop_assert_eq!(short.is_some(), long.is_some());
        for (one, other) in short.into_iter().flatten().zip(long.into_iter().flatten()) {
            close(one, other);
        }
        prop_assert_eq!(two.is_some(), four.is_some());
        if let (Some(two), Some(four)) = (two, four) {
            close(two.a, four.a);
            close(two.b, four.b);
            close(two.c, four.c);
        }
    }
}
