//! The terms of a locus with two alleles, whole and with one individual of each genotype class left
//! out, side by side: the same formulas in the same order as in [`terms`](super::terms), without
//! branches, so that the processor works on several at once. The results are equal bit for bit.

use super::richness::Rarefaction;
use super::terms::{PairTermLanes, PrivateTerms, StratumTermLanes};

/// Whole, and without a homozygote of the first allele, a heterozygote, a homozygote of the second.
const VARIANTS: usize = 4;
/// For the two strata of a pair, the variant of each in every lane: both whole, one of the first left
/// out, one of the second left out.
const FIRST: [usize; 8] = [0, 1, 2, 3, 0, 0, 0, 0];
const SECOND: [usize; 8] = [0, 0, 0, 0, 1, 2, 3, 0];

/// One stratum at one locus with two alleles, whole and without one individual of each class. A variant
/// whose class is empty repeats the whole.
#[derive(Debug, Clone, Copy, Default)]
pub struct StratumLanes {
    typed: [f64; VARIANTS],
    heterozygotes: [f64; VARIANTS],
    /// Gene copies of either allele.
    copies: [[f64; VARIANTS]; 2],
    observed: [f64; VARIANTS],
    expected: [f64; VARIANTS],
    richness: [f64; VARIANTS],
    /// Chances of [`Rarefaction::absences`], where they exist.
    absent: [[f64; VARIANTS]; 2],
    /// 1 where they do.
    rarefied: [f64; VARIANTS],
}

impl StratumLanes {
    /// Takes the numbers of homozygotes of the first allele, of heterozygotes, and of homozygotes of
    /// the second.
    pub fn refill(&mut self, classes: [u32; 3], rarefaction: &mut Rarefaction) {
        for v in 0..VARIANTS {
            let [mut n0, mut n1, mut n2] = classes;
            match v {
                1 => n0 = n0.saturating_sub(1),
                2 => n1 = n1.saturating_sub(1),
                3 => n2 = n2.saturating_sub(1),
                _ => {}
            }
            let copies = [2 * n0 + n1, n1 + 2 * n2];
            self.typed[v] = f64::from(n0 + n1 + n2);
            self.heterozygotes[v] = f64::from(n1);
            self.copies[0][v] = f64::from(copies[0]);
            self.copies[1][v] = f64::from(copies[1]);
            let absent = rarefaction.absences(n0 + n1 + n2, copies);
            let (mut richness, chances) = (0.0, absent.unwrap_or_default());
            for (chance, copies) in chances.into_iter().zip(copies) {
                richness += if copies > 0 { 1.0 - chance } else { 0.0 };
            }
            self.richness[v] = if absent.is_some() { richness } else { 0.0 };
            self.rarefied[v] = f64::from(u8::from(absent.is_some()));
            self.absent[0][v] = chances[0];
            self.absent[1][v] = chances[1];
        }
        for v in 0..VARIANTS {
            let (typed, all) = (self.typed[v], 2.0 * self.typed[v]);
            let alike =
                self.copies[0][v] * self.copies[0][v] + self.copies[1][v] * self.copies[1][v];
            self.observed[v] = self.heterozygotes[v] / typed;
            self.expected[v] = (all * all - alike) / (all * (all - 1.0));
        }
    }

    /// Terms of the stratum: lanes 0 to 3 are the variants, the others repeat the first.
    pub fn terms(&self) -> StratumTermLanes {
        let mut terms = StratumTermLanes::default();
        for (lane, &v) in FIRST.iter().enumerate() {
            let some = self.typed[v] > 0.0;
            let keep = |value: f64| if some { value } else { 0.0 };
            let [c0, c1] = [self.copies[0][v], self.copies[1][v]];
            let both = c0 > 0.0 && c1 > 0.0;
            let all = 2.0 * self.typed[v];
            let excess = self.heterozygotes[v] * (all - 1.0) / (c0 * c1) - 1.0;
            terms.sites[lane] = keep(1.0);
            terms.loci[lane] = keep(1.0);
            terms.polymorphic[lane] = if both { 1.0 } else { 0.0 };
            terms.observed_heterozygosity[lane] = keep(self.observed[v]);
            terms.expected_heterozygosity[lane] = keep(self.expected[v]);
            terms.richness[lane] = keep(self.richness[v]);
            terms.richness_loci[lane] = keep(self.rarefied[v]);
            terms.excess[lane] = if both { excess + excess } else { 0.0 };
            terms.excess_alleles[lane] = if both { 2.0 } else { 0.0 };
        }
        terms
    }

    /// Terms of a pair: lane 0 is whole, lanes 1 to 3 leave out one of `self`, 4 to 6 one of `later`.
    pub fn pair_terms(&self, later: &StratumLanes) -> PairTermLanes {
        let mut terms = PairTermLanes::default();
        for lane in 0..8 {
            self.within_pair(later, lane, &mut terms);
            self.variance(later, lane, &mut terms);
            self.gene_diversity(later, lane, &mut terms);
            self.change(later, lane, &mut terms);
        }
        terms
    }

    fn within_pair(&self, later: &StratumLanes, lane: usize, terms: &mut PairTermLanes) {
        let (v, w) = (FIRST[lane], SECOND[lane]);
        let some = self.typed[v] > 0.0 && later.typed[w] > 0.0;
        let keep = |value: f64| if some { value } else { 0.0 };
        let rarefied = self.rarefied[v] * later.rarefied[w];
        terms.loci[lane] = keep(1.0);
        terms.observed_from[lane] = keep(self.observed[v]);
        terms.observed_to[lane] = keep(later.observed[w]);
        terms.expected_from[lane] = keep(self.expected[v]);
        terms.expected_to[lane] = keep(later.expected[w]);
        terms.richness_from[lane] = keep(rarefied * self.richness[v]);
        terms.richness_to[lane] = keep(rarefied * later.richness[w]);
        terms.richness_loci[lane] = keep(rarefied);
        let (all1, all2) = (2.0 * self.typed[v], 2.0 * later.typed[w]);
        let alike = self.copies[0][v] * later.copies[0][w] + self.copies[1][v] * later.copies[1][w];
        let between = (all1 * all2 - alike) / (all1 * all2);
        terms.hudson_numerator[lane] = keep(between - 0.5 * (self.expected[v] + later.expected[w]));
        terms.hudson_denominator[lane] = keep(between);
    }

    /// Weir & Cockerham (1984) for two samples and two alleles, one of which stands for both.
    fn variance(&self, later: &StratumLanes, lane: usize, terms: &mut PairTermLanes) {
        let (v, w) = (FIRST[lane], SECOND[lane]);
        let (n1, n2) = (self.typed[v], later.typed[w]);
        let some = n1 > 0.0 && n2 > 0.0 && n1 + n2 > 2.0;
        let (sum, squares) = (n1 + n2, n1 * n1 + n2 * n2);
        let mean = sum / 2.0;
        let lift = mean * sum / (sum * sum - squares);
        let inverse = 1.0 / (mean - 1.0);
        let (all1, all2, all) = (2.0 * n1, 2.0 * n2, 2.0 * (n1 + n2));
        let spread = 2.0 * all1 * all2 / (all * all);
        let (c1, c2) = (self.copies[1][v], later.copies[1][w]);
        let distance = c1 / all1 - c2 / all2;
        let variance = spread * distance * distance;
        let p = (c1 + c2) / all;
        let h = 2.0 * (self.heterozygotes[v] + later.heterozygotes[w]) / all;
        let within = p * (1.0 - p) - 0.5 * variance;
        let a = 2.0 * (lift * (variance - inverse * (within - 0.25 * h)));
        let b = 2.0 * (inverse * (mean * within - 0.25 * (2.0 * mean - 1.0) * h));
        let c = 2.0 * (0.5 * h);
        terms.wc_between[lane] = if some { a } else { 0.0 };
        terms.wc_total[lane] = if some { a + b + c } else { 0.0 };
        terms.wc_loci[lane] = if some { 1.0 } else { 0.0 };
    }

    /// Nei & Chesser (1983) for two samples.
    fn gene_diversity(&self, later: &StratumLanes, lane: usize, terms: &mut PairTermLanes) {
        let (v, w) = (FIRST[lane], SECOND[lane]);
        let (n1, n2) = (self.typed[v], later.typed[w]);
        let some = n1 > 0.0 && n2 > 0.0 && n1 + n2 > 2.0;
        let (all1, all2) = (2.0 * n1, 2.0 * n2);
        let size = 2.0 * n1 * n2 / (n1 + n2);
        let observed = self.heterozygotes[v] / all1 + later.heterozygotes[w] / all2;
        let (mut squares, mut squared_sums) = (0.0, 0.0);
        for allele in 0..2 {
            let p1 = self.copies[allele][v] / all1;
            let p2 = later.copies[allele][w] / all2;
            squares += p1 * p1 + p2 * p2;
            squared_sums += (p1 + p2) * (p1 + p2);
        }
        let sampled = 0.5 * observed / size;
        let within = size / (size - 1.0) * (1.0 - 0.5 * squares - sampled);
        let total = 1.0 - 0.25 * squared_sums + within / (size * 2.0) - sampled / 2.0;
        terms.nei_observed[lane] = if some { observed } else { 0.0 };
        terms.nei_within[lane] = if some { within } else { 0.0 };
        terms.nei_total[lane] = if some { total } else { 0.0 };
        terms.nei_loci[lane] = if some { 1.0 } else { 0.0 };
    }

    /// The standardised changes Fc, Fk and Fs of two alleles.
    fn change(&self, later: &StratumLanes, lane: usize, terms: &mut PairTermLanes) {
        let (v, w) = (FIRST[lane], SECOND[lane]);
        let (n1, n2) = (self.typed[v], later.typed[w]);
        let x = self.copies[1][v] / (2.0 * n1);
        let y = later.copies[1][w] / (2.0 * n2);
        let z = 0.5 * (x + y);
        let spread = z * (1.0 - z);
        let square = (x - y) * (x - y);
        // Without spread both samples are fixed for the same allele.
        let some = n1 > 0.0 && n2 > 0.0 && spread > 0.0;
        let keep = |value: f64| if some { value } else { 0.0 };
        terms.fc[lane] = keep(square / (z - x * y));
        terms.fk[lane] = keep(square / spread);
        terms.fs_numerator[lane] = keep(2.0 * square);
        terms.fs_denominator[lane] = keep(2.0 * spread);
        terms.independent_alleles[lane] = keep(1.0);
        terms.inverse_size_from[lane] = keep(1.0 / n1);
        terms.inverse_size_to[lane] = keep(1.0 / n2);
        terms.temporal_loci[lane] = keep(1.0);
    }

    /// Private richness of the stratum at `members[which]` beside the others, whole (`left_out` absent)
    /// or with one individual of a member's class left out: (member, class).
    pub fn private_terms(
        which: usize,
        members: &[&StratumLanes],
        left_out: Option<(usize, usize)>,
    ) -> PrivateTerms {
        let variant = |k: usize| match left_out {
            Some((member, class)) if member == k => class + 1,
            _ => 0,
        };
        if (0..members.len()).any(|k| members[k].rarefied[variant(k)] == 0.0) {
            return PrivateTerms::default();
        }
        let own = members[which];
        let mut private_richness = 0.0;
        for allele in 0..2 {
            if own.copies[allele][variant(which)] == 0.0 {
                continue;
            }
            let mut chance = 1.0 - own.absent[allele][variant(which)];
            for (k, other) in members.iter().enumerate().filter(|(k, _)| *k != which) {
                chance *= other.absent[allele][variant(k)];
            }
            private_richness += chance;
        }
        PrivateTerms {
            private_richness,
            loci: 1.0,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::locus::{Counts, Lane, Terms, pair_terms, private_terms, stratum_terms};

    const GENOTYPES: [[u16; 2]; 3] = [[0, 0], [0, 1], [1, 1]];

    fn counts(classes: [u32; 3]) -> Counts {
        let calls = classes.iter().zip(GENOTYPES);
        Counts::of(2, calls.flat_map(|(&n, g)| vec![Some(g); n as usize]))
    }

    /// The counts of variant `v`, or nothing where the class is empty.
    fn variant(classes: [u32; 3], v: usize) -> Option<Counts> {
        let mut counts = counts(classes);
        if v > 0 {
            (classes[v - 1] > 0).then(|| counts.remove(GENOTYPES[v - 1]))?;
        }
        Some(counts)
    }

    fn lanes(classes: [u32; 3], table: &mut Rarefaction) -> StratumLanes {
        let mut lanes = StratumLanes::default();
        lanes.refill(classes, table);
        lanes
    }

    fn all_classes(most: u32) -> Vec<[u32; 3]> {
        let each = |n: u32| (0..=n).flat_map(move |a| (0..=n - a).map(move |b| [a, b, n - a - b]));
        (0..=most).flat_map(each).collect()
    }

    fn assert_same<T: Terms>(columns: &[&Lane], lane: usize, expected: &T, what: &str) {
        let mut values = vec![0.0; T::LEN];
        expected.write(&mut values);
        let found: Vec<f64> = columns.iter().map(|c| c[lane]).collect();
        let bits = |v: &[f64]| v.iter().map(|x| (x + 0.0).to_bits()).collect::<Vec<_>>();
        assert_eq!(
            bits(&found),
            bits(&values),
            "{what}, lane {lane}: {found:?} {values:?}"
        );
    }

    #[test]
    fn every_small_pair_equals_the_plain_terms_bit_for_bit() {
        let table = &mut Rarefaction::new(4);
        for a in all_classes(5) {
            let first = lanes(a, table);
            for v in 0..4 {
                if let Some(counts) = variant(a, v) {
                    let terms = stratum_terms(&counts, table);
                    assert_same(&first.terms().columns(), v, &terms, "stratum");
                }
            }
            for b in all_classes(5) {
                let second = lanes(b, table);
                let found = first.pair_terms(&second);
                for lane in 0..7 {
                    if let (Some(x), Some(y)) = (variant(a, FIRST[lane]), variant(b, SECOND[lane]))
                    {
                        let terms = pair_terms(&x, &y, table);
                        assert_same(&found.columns(), lane, &terms, &format!("{a:?} {b:?}"));
                    }
                }
            }
        }
    }

    #[test]
    fn larger_samples_equal_the_plain_terms_bit_for_bit() {
        let table = &mut Rarefaction::new(20);
        let mut state = 7u64;
        let mut below = |n: u64| {
            state = state
                .wrapping_mul(6364136223846793005)
                .wrapping_add(1442695040888963407);
            ((state >> 33) % n) as u32
        };
        for _ in 0..2000 {
            let a = [below(90), below(60), below(20)];
            let b = [below(300), below(5), below(3)];
            let (first, second) = (lanes(a, table), lanes(b, table));
            let found = first.pair_terms(&second);
            for lane in 0..7 {
                if let (Some(x), Some(y)) = (variant(a, FIRST[lane]), variant(b, SECOND[lane])) {
                    let terms = pair_terms(&x, &y, table);
                    assert_same(&found.columns(), lane, &terms, &format!("{a:?} {b:?}"));
                }
            }
        }
    }

    #[test]
    fn private_richness_equals_the_plain_one() {
        let table = &mut Rarefaction::new(4);
        for a in all_classes(3) {
            for b in all_classes(3) {
                let c = [1, 1, 2];
                let members = [a, b, c].map(|x| lanes(x, table));
                let members: Vec<&StratumLanes> = members.iter().collect();
                for which in 0..3 {
                    for (member, class) in (0..3).flat_map(|m| (0..3).map(move |c| (m, c))) {
                        let mut plain = [counts(a), counts(b), counts(c)];
                        let whole = private_terms(which, &[0, 1, 2], &plain, table);
                        assert_eq!(StratumLanes::private_terms(which, &members, None), whole);
                        let Some(left) = variant([a, b, c][member], class + 1) else {
                            continue;
                        };
                        plain[member] = left;
                        let expected = private_terms(which, &[0, 1, 2], &plain, table);
                        let found =
                            StratumLanes::private_terms(which, &members, Some((member, class)));
                        assert_eq!(found, expected);
                    }
                }
            }
        }
    }
}
