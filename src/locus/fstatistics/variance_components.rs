//! Components of variance between samples, individuals and gene copies.

use std::borrow::Borrow;
use std::ops::AddAssign;

use super::ratio;
use crate::locus::Counts;

/// Variance components of Weir & Cockerham (1984, Evolution 38:1358-1370), summed over alleles;
/// sums over loci are added the same way and divided once.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Components {
    /// Between samples.
    pub a: f64,
    /// Between individuals within samples.
    pub b: f64,
    /// Between gene copies within individuals.
    pub c: f64,
}

impl Components {
    /// theta (FST) = a/(a+b+c); `None` without variation.
    pub fn theta(&self) -> Option<f64> {
        ratio(self.a, self.a + self.b + self.c)
    }

    /// F (FIT) = (a+b)/(a+b+c); `None` without variation.
    pub fn total_inbreeding(&self) -> Option<f64> {
        ratio(self.a + self.b, self.a + self.b + self.c)
    }

    /// f (FIS) = b/(b+c); `None` without variation within samples.
    pub fn inbreeding_within(&self) -> Option<f64> {
        ratio(self.b, self.b + self.c)
    }
}

impl AddAssign for Components {
    fn add_assign(&mut self, other: Components) {
        self.a += other.a;
        self.b += other.b;
        self.c += other.c;
    }
}

/// Sample sizes of one locus as Weir & Cockerham combine them, divided once for all alleles.
struct Sizes {
    /// Mean number of individuals.
    mean: f64,
    /// 1/(mean - 1).
    inverse: f64,
    /// Mean over corrected mean, nbar/n_c.
    lift: f64,
    /// (r - 1)/r of r samples.
    shrink: f64,
}

impl Sizes {
    /// Of `samples` samples with `sum` individuals and `squares` the sum of squared sizes; `None`
    /// for fewer than two samples or a mean of one individual.
    fn of(samples: u32, sum: u64, squares: u64) -> Option<Sizes> {
        if samples < 2 || sum <= u64::from(samples) {
            return None;
        }
        let (samples, sum, squares) = (f64::from(samples), sum as f64, squares as f64);
        let mean = sum / samples;
        let lift = mean * sum * (samples - 1.0) / (sum * sum - squares);
        let inverse = 1.0 / (mean - 1.0);
        Some(Sizes {
            mean,
            inverse,
            lift,
            shrink: (samples - 1.0) / samples,
        })
    }

    /// Components of one allele: `p` its mean frequency, `variance` of frequencies between samples
    /// (s^2), `h` the share of individuals heterozygous for it.
    fn components(&self, p: f64, variance: f64, h: f64) -> Components {
        let within = p * (1.0 - p) - self.shrink * variance;
        Components {
            a: self.lift * (variance - self.inverse * (within - 0.25 * h)),
            b: self.inverse * (self.mean * within - 0.25 * (2.0 * self.mean - 1.0) * h),
            c: 0.5 * h,
        }
    }
}

/// Components of variance between any number of samples. Samples without a typed individual drop
/// out. `None` for fewer than two samples left or at most one individual a sample on average.
///
/// All samples list the same alleles; both alleles of a biallelic locus are counted.
pub fn weir_cockerham<C: Borrow<Counts>>(samples: &[C]) -> Option<Components> {
    if let [first, second] = samples {
        return weir_cockerham_pair(first.borrow(), second.borrow());
    }
    let (mut number, mut sum, mut squares) = (0, 0, 0);
    for n in samples
        .iter()
        .map(|s| u64::from(s.borrow().typed))
        .filter(|&n| n > 0)
    {
        number += 1;
        sum += n;
        squares += n * n;
    }
    let sizes = Sizes::of(number, sum, squares)?;
    let total = sum as f64;
    let (skipped, times) = alleles_to_visit(samples[0].borrow());
    let mut components = Components::default();
    for allele in skipped..samples[0].borrow().copies.len() {
        let (mut copies, mut heterozygous) = (0, 0);
        for sample in samples.iter().map(|s| s.borrow()) {
            copies += u64::from(sample.copies[allele]);
            heterozygous += u64::from(sample.heterozygous[allele]);
        }
        let mean = copies as f64 / (2.0 * total);
        let mut variance = 0.0;
        for sample in samples.iter().map(|s| s.borrow()).filter(|s| s.typed > 0) {
            let n = f64::from(sample.typed);
            let distance = f64::from(sample.copies[allele]) / (2.0 * n) - mean;
            variance += n * distance * distance;
        }
        variance /= f64::from(number - 1) * sizes.mean;
        components += sizes.components(mean, variance, heterozygous as f64 / total);
    }
    Some(scaled(components, times))
}

/// [`weir_cockerham`] of two samples, which is what comparisons ask for by the million.
pub fn weir_cockerham_pair(first: &Counts, second: &Counts) -> Option<Components> {
    let (n1, n2) = (u64::from(first.typed), u64::from(second.typed));
    if n1 == 0 || n2 == 0 {
        return None;
    }
    let sizes = Sizes::of(2, n1 + n2, n1 * n1 + n2 * n2)?;
    let (n1, n2) = (n1 as f64, n2 as f64);
    let (all1, all2, all) = (2.0 * n1, 2.0 * n2, 2.0 * (n1 + n2));
    // sum n_i (p_i - p)^2 of two samples is n1 n2/(n1 + n2) times their squared distance, here
    // over the mean size (n1 + n2)/2.
    let spread = 2.0 * all1 * all2 / (all * all);
    let (skipped, times) = alleles_to_visit(first);
    let mut components = Components::default();
    for allele in skipped..first.copies.len() {
        let (c1, c2) = (
            f64::from(first.copies[allele]),
            f64::from(second.copies[allele]),
        );
        let heterozygous =
            f64::from(first.heterozygous[allele]) + f64::from(second.heterozygous[allele]);
        // Divided, not multiplied by a reciprocal: a fixed allele has exactly 1.
        let distance = c1 / all1 - c2 / all2;
        let variance = spread * distance * distance;
        components += sizes.components((c1 + c2) / all, variance, 2.0 * heterozygous / all);
    }
    Some(scaled(components, times))
}

/// The first allele to visit and the factor for the sum: the two alleles of a biallelic locus have
/// equal components, so one is worked out and doubled.
fn alleles_to_visit(counts: &Counts) -> (usize, f64) {
    if counts.copies.len() == 2 {
        (1, 2.0)
    } else {
        (0, 1.0)
    }
}

fn scaled(Components { a, b, c }: Components, times: f64) -> Components {
    Components {
        a: times * a,
        b: times * b,
        c: times * c,
    }
}
