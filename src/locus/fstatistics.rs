//! Differentiation of samples at one locus, and the ratios that finish sums over loci.

use std::borrow::Borrow;
use std::ops::AddAssign;

use super::Counts;

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

/// Numerator and denominator of a ratio that is summed over loci before it is divided.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct RatioTerms {
    /// What is added above.
    pub numerator: f64,
    /// What is added below.
    pub denominator: f64,
}

impl RatioTerms {
    /// The ratio; `None` when the denominator is not above 0.
    pub fn ratio(&self) -> Option<f64> {
        ratio(self.numerator, self.denominator)
    }
}

impl AddAssign for RatioTerms {
    fn add_assign(&mut self, other: RatioTerms) {
        self.numerator += other.numerator;
        self.denominator += other.denominator;
    }
}

/// FST of Hudson, Slatkin & Maddison (1992, Genetics 132:583-589) with unbiased gene diversities,
/// any number of alleles: Hb - (H1+H2)/2 over Hb. With two alleles it is the form of Bhatia et al.
/// (2013, Genome Res 23:1514-1521). `None` when one sample has nobody typed.
pub fn hudson(first: &Counts, second: &Counts) -> Option<RatioTerms> {
    if first.typed == 0 || second.typed == 0 {
        return None;
    }
    let (n1, n2) = (
        u64::from(first.gene_copies()),
        u64::from(second.gene_copies()),
    );
    let alike: u64 = first
        .copies
        .iter()
        .zip(&second.copies)
        .map(|(&a, &b)| u64::from(a) * u64::from(b))
        .sum();
    let between = (n1 * n2 - alike) as f64 / (n1 * n2) as f64;
    let diversity1 = first.differing_pairs() as f64 / (n1 * (n1 - 1)) as f64;
    let diversity2 = second.differing_pairs() as f64 / (n2 * (n2 - 1)) as f64;
    let numerator = between - 0.5 * (diversity1 + diversity2);
    Some(RatioTerms {
        numerator,
        denominator: between,
    })
}

/// Heterozygosities of Nei & Chesser (1983, Ann Hum Genet 47:253-259): of one locus, or means over
/// loci, from which the ratios below are taken.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct NeiDiversity {
    /// Number of samples (s).
    pub samples: u32,
    /// Observed heterozygosity, mean over samples (Ho).
    pub observed: f64,
    /// Gene diversity within samples (Hs).
    pub within: f64,
    /// Gene diversity of the whole (Ht).
    pub total: f64,
}

impl NeiDiversity {
    /// From the number of samples, their harmonic mean size (above 1), their mean observed
    /// heterozygosity, the mean over samples of sum p^2, and the sum of squared mean frequencies.
    fn of(samples: u32, size: f64, observed: f64, squares: f64, squared_means: f64) -> Self {
        let s = f64::from(samples);
        let sampled = 0.5 * observed / size;
        let within = size / (size - 1.0) * (1.0 - squares - sampled);
        let total = 1.0 - squared_means + within / (size * s) - sampled / s;
        NeiDiversity {
            samples,
            observed,
            within,
            total,
        }
    }

    /// GST = (Ht - Hs)/Ht (Nei 1973); `None` without diversity.
    pub fn gst(&self) -> Option<f64> {
        ratio(self.total - self.within, self.total)
    }

    /// GST' = Dst'/Ht' with Dst' = s(Ht - Hs)/(s-1) and Ht' = Hs + Dst' (Nei 1987); `None` without
    /// diversity.
    pub fn gst_prime(&self) -> Option<f64> {
        let between = self.between();
        ratio(between, self.within + between)
    }

    /// Jost's D = s/(s-1) (Ht - Hs)/(1 - Hs) (Jost 2008, Mol Ecol 17:4015-4026); `None` when every
    /// copy within samples differs.
    pub fn jost_d(&self) -> Option<f64> {
        ratio(self.between(), 1.0 - self.within)
    }

    /// Hedrick's standardised GST = GST (s - 1 + Hs)/((s-1)(1 - Hs)) (Hedrick 2005, Evolution
    /// 59:1633-1638); `None` without diversity or when every copy within samples differs.
    pub fn gst_hedrick(&self) -> Option<f64> {
        let others = f64::from(self.samples) - 1.0;
        let greatest = ratio(others * (1.0 - self.within), others + self.within)?;
        ratio(self.gst()?, greatest)
    }

    /// G''ST = s(Ht - Hs)/((s Ht - Hs)(1 - Hs)) (Meirmans & Hedrick 2011, Mol Ecol Resour 11:5-18);
    /// `None` without diversity or when every copy within samples differs.
    pub fn gst_double_prime(&self) -> Option<f64> {
        let samples = f64::from(self.samples);
        let below = (samples * self.total - self.within) * (1.0 - self.within);
        ratio(samples * (self.total - self.within), below)
    }

    /// FIS = 1 - Ho/Hs; `None` without diversity within samples.
    pub fn inbreeding(&self) -> Option<f64> {
        Some(1.0 - ratio(self.observed, self.within)?)
    }

    /// Dst', the diversity between samples.
    fn between(&self) -> f64 {
        let samples = f64::from(self.samples);
        samples * (self.total - self.within) / (samples - 1.0)
    }
}

/// Heterozygosities within and over samples, unweighted. Samples without a typed individual drop
/// out. `None` for fewer than two samples left, or when each has one individual only.
///
/// All samples list the same alleles. Take means of all three over loci with the same number of
/// samples, then the ratios.
pub fn nei<C: Borrow<Counts>>(samples: &[C]) -> Option<NeiDiversity> {
    if let [first, second] = samples {
        return nei_pair(first.borrow(), second.borrow());
    }
    let typed = || samples.iter().map(|s| s.borrow()).filter(|s| s.typed > 0);
    let (mut number, mut reciprocals, mut observed, mut squares) = (0u32, 0.0, 0.0, 0.0);
    for sample in typed() {
        let all = u64::from(sample.gene_copies());
        number += 1;
        reciprocals += 1.0 / f64::from(sample.typed);
        observed += f64::from(sample.heterozygotes) / f64::from(sample.typed);
        squares += 1.0 - sample.differing_pairs() as f64 / (all * all) as f64;
    }
    let s = f64::from(number);
    // The harmonic mean size s/reciprocals must be above 1.
    if number < 2 || reciprocals >= s {
        return None;
    }
    let size = s / reciprocals;
    let observed = observed / s;
    let mut squared_means = 0.0;
    for allele in 0..samples[0].borrow().copies.len() {
        let sum: f64 = typed()
            .map(|s| f64::from(s.copies[allele]) / f64::from(s.gene_copies()))
            .sum();
        squared_means += sum * sum;
    }
    Some(NeiDiversity::of(
        number,
        size,
        observed,
        squares / s,
        squared_means / (s * s),
    ))
}

/// [`nei`] of two samples, which is what comparisons ask for by the million.
pub fn nei_pair(first: &Counts, second: &Counts) -> Option<NeiDiversity> {
    let (n1, n2) = (f64::from(first.typed), f64::from(second.typed));
    if first.typed == 0 || second.typed == 0 || first.typed + second.typed == 2 {
        return None;
    }
    let size = 2.0 * n1 * n2 / (n1 + n2);
    let (all1, all2) = (2.0 * n1, 2.0 * n2);
    let observed = f64::from(first.heterozygotes) / all1 + f64::from(second.heterozygotes) / all2;
    let (mut squares, mut squared_sums) = (0.0, 0.0);
    for (&copies1, &copies2) in first.copies.iter().zip(&second.copies) {
        // Divided, not multiplied by a reciprocal: a fixed allele has exactly 1.
        let (p1, p2) = (f64::from(copies1) / all1, f64::from(copies2) / all2);
        squares += p1 * p1 + p2 * p2;
        squared_sums += (p1 + p2) * (p1 + p2);
    }
    Some(NeiDiversity::of(
        2,
        size,
        observed,
        0.5 * squares,
        0.25 * squared_sums,
    ))
}

fn ratio(numerator: f64, denominator: f64) -> Option<f64> {
    (denominator > 0.0).then(|| numerator / denominator)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_cannot_be_compared_is_absent() {
        let none = Counts::empty(2);
        let one = Counts::of(2, [Some([0, 1])]);
        let two = Counts::of(2, [Some([0, 1]), Some([1, 1])]);
        assert_eq!(weir_cockerham(&[&none, &two]), None);
        assert_eq!(weir_cockerham(&[&one, &one]), None);
        assert_eq!(weir_cockerham(&[&none, &two, &none]), None);
        assert_eq!(weir_cockerham::<Counts>(&[]), None);
        assert_eq!(hudson(&none, &two), None);
        assert_eq!(nei(&[&none, &two]), None);
        assert_eq!(nei(&[&one, &one]), None);
    }

    #[test]
    fn a_fixed_locus_has_no_ratio() {
        for (n1, n2) in (2..120).zip([3, 7, 49, 50, 98].into_iter().cycle()) {
            for allele in [0, 1] {
                for alleles in [2, 3] {
                    let fixed = [n1, n2].map(|n| Counts::of(alleles, vec![Some([allele; 2]); n]));
                    let components = weir_cockerham(&fixed).unwrap();
                    assert_eq!(components, Components::default());
                    assert_eq!(components.theta(), None);
                    assert_eq!(hudson(&fixed[0], &fixed[1]).unwrap().ratio(), None);
                    assert_eq!(nei(&fixed).unwrap().gst_hedrick(), None);
                    let [first, second] = &fixed;
                    let three = nei(&[first, second, first]).unwrap();
                    assert_eq!((three.within, three.gst()), (0.0, None));
                }
            }
        }
    }
}
