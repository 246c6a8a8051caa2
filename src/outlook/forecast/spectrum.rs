//! Loci as a forecast draws them: alleles by copies, each with the posterior of its frequency.

use super::chance::{beta, binomial};
use crate::ne::likelihood::BetaPrior;
use crate::ne::prior::fit_prior_to_classes;
use crate::outlook::rehearse::Dice;

/// Alleles in a draw: as many as a genome has stretches that drift on their own, or fewer where the
/// report has fewer; more would make the bands of means narrower than linked loci are.
const MOST_ALLELES: usize = 1000;

/// Alleles of a latest sample by the copies in which they are seen.
#[derive(Debug, Clone, PartialEq)]
pub struct Spectrum {
    /// Copies, gene copies typed, and alleles up to and with this class.
    classes: Vec<(u32, u32, u64)>,
    /// Prior of an allele's frequency.
    pub prior: BetaPrior,
}

impl Spectrum {
    /// From `[copies, gene copies typed, alleles]`. The prior is fitted to the alleles that vary; a
    /// flat one serves where none does.
    pub fn new(classes: &[[u64; 3]]) -> Self {
        let small = |n: u64| u32::try_from(n).unwrap_or(u32::MAX);
        let counted = classes
            .iter()
            .map(|&[k, n, alleles]| (small(k), small(n), alleles));
        let prior = fit_prior_to_classes(counted)
            .map_or(BetaPrior { a: 1.0, b: 1.0 }, |fitted| fitted.prior);
        let mut sum = 0u64;
        let classes = classes
            .iter()
            .filter(|[k, n, alleles]| *k > 0 && k <= n && *alleles > 0)
            .map(|&[k, n, alleles]| {
                sum = sum.saturating_add(alleles);
                (small(k), small(n), sum)
            })
            .collect();
        Spectrum { classes, prior }
    }

    /// Alleles.
    pub fn alleles(&self) -> u64 {
        self.classes.last().map_or(0, |class| class.2)
    }

    /// Frequencies of a draw of alleles; an allele alone in its sample is fixed.
    pub fn draw(&self, dice: &mut Dice) -> Vec<f64> {
        let alleles = self.alleles();
        let count = (alleles as usize).min(MOST_ALLELES);
        (0..count)
            .map(|_| {
                let at = (dice.uniform() * alleles as f64) as u64;
                let class = self.classes.partition_point(|class| class.2 <= at);
                let (k, n, _) = self.classes[class.min(self.classes.len() - 1)];
                match k == n {
                    true => 1.0,
                    false => beta(
                        dice,
                        self.prior.a + f64::from(k),
                        self.prior.b + f64::from(n - k),
                    ),
                }
            })
            .collect()
    }
}

/// Sums over the alleles of a draw.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Sums {
    /// Of p(1 - p), which over the alleles of a locus is its expected heterozygosity.
    pub heterozygosity: f64,
    /// Of the chance to be among `gene_copies` drawn: richness.
    pub richness: f64,
    /// Alleles that are there.
    pub alleles: f64,
}

impl Sums {
    /// The sums of these frequencies.
    pub fn of(frequencies: &[f64], gene_copies: u32) -> Self {
        let mut sums = Sums::default();
        for &p in frequencies.iter().filter(|&&p| p > 0.0) {
            sums.heterozygosity += p * (1.0 - p);
            sums.richness += 1.0 - (1.0 - p).powi(gene_copies as i32);
            sums.alleles += 1.0;
        }
        sums
    }
}

/// One generation of drift at rate u: 1/u gene copies, rounded to a whole number of at least 1.
pub fn drift(frequencies: &mut [f64], rate: f64, dice: &mut Dice) {
    let copies = (1.0 / rate).round().clamp(1.0, 4e9) as u32;
    for p in frequencies.iter_mut().filter(|p| **p > 0.0 && **p < 1.0) {
        *p = f64::from(binomial(dice, copies, *p)) / f64::from(copies);
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::outlook::rehearse::Purpose;

    // A spectrum drawn from Beta(0.3, 0.3) and read back: its shapes, and by the law of total
    // expectation the mean of p(1-p) over posteriors, 0.3^2/(0.6 x 1.6) of all loci.
    #[test]
    fn the_prior_is_that_of_the_alleles_and_draws_are_unbiased() {
        let mut dice = Dice::new(3, Purpose::Forecast, 9, 9);
        let mut classes = std::collections::BTreeMap::new();
        let (mut heterozygosity, mut seen) = (0.0, 0.0);
        for _ in 0..20_000 {
            let p = beta(&mut dice, 0.3, 0.3);
            let k = u64::from(binomial(&mut dice, 40, p));
            if k > 0 && k < 40 {
                *classes.entry([k, 40]).or_insert(0u64) += 1;
                heterozygosity += p * (1.0 - p);
                seen += 1.0;
            }
        }
        let classes: Vec<[u64; 3]> = classes.into_iter().map(|([k, n], m)| [k, n, m]).collect();
        let spectrum = Spectrum::new(&classes);
        assert!(
            (spectrum.prior.a - 0.3).abs() < 0.03,
            "{:?}",
            spectrum.prior
        );
        assert!(
            (spectrum.prior.b - 0.3).abs() < 0.03,
            "{:?}",
            spectrum.prior
        );
        let drawn: Vec<f64> = (0..40).flat_map(|_| spectrum.draw(&mut dice)).collect();
        let mean = Sums::of(&drawn, 2).heterozygosity / drawn.len() as f64;
        let want = heterozygosity / seen;
        assert!((mean / want - 1.0).abs() < 0.02, "{mean} is not {want}");
    }

    #[test]
    fn absurd_classes_neither_hang_nor_panic() {
        let absurd = [
            [1, 2, u64::MAX],
            [5, 3, 7],
            [0, 9, 4],
            [u64::MAX, u64::MAX, 1],
            [4, 9, u64::MAX],
        ];
        let mut dice = Dice::new(3, Purpose::Forecast, 9, 9);
        let drawn = Spectrum::new(&absurd).draw(&mut dice);
        assert!(drawn.iter().all(|p| (0.0..=1.0).contains(p)) && !drawn.is_empty());
        assert!(Spectrum::new(&[]).draw(&mut dice).is_empty());
    }
}
