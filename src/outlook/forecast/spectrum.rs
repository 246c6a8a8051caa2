//! Loci as a forecast draws them: alleles by copies, each with the posterior of its frequency.

use super::chance::{beta, binomial};
use crate::ne::likelihood::BetaPrior;
use crate::ne::prior::fit_prior;
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
        let varying = classes.iter().filter(|[k, n, _]| *k > 0 && k < n);
        let counts = varying.flat_map(|&[k, n, alleles]| {
            std::iter::repeat_n((small(n), small(k)), alleles as usize)
        });
        let prior = fit_prior(counts).map_or(BetaPrior { a: 1.0, b: 1.0 }, |fitted| fitted.prior);
        let mut sum = 0;
        let classes = classes
            .iter()
            .filter(|[k, n, alleles]| *k > 0 && k <= n && *alleles > 0)
            .map(|&[k, n, alleles]| {
                sum += alleles;
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
