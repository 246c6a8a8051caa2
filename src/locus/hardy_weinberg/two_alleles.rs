//! Two alleles: the distribution of heterozygotes by recursion from its mode.

use super::TIE;

/// Exact test of one locus with two alleles.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TwoAlleleTest {
    /// Two-sided p: chance of the tables that are at most as likely as the observed one.
    pub p: f64,
    /// The same with the observed table and its ties counted by half (Graffelman & Moreno 2013,
    /// Stat Appl Genet Mol Biol 12:433-448).
    pub mid_p: f64,
    /// One-sided p for a deficit: chance of at most as many heterozygotes.
    pub deficit: f64,
    /// One-sided p for an excess: chance of at least as many heterozygotes.
    pub excess: f64,
}

/// Allele counts of a locus of two alleles, which fix all possible numbers of heterozygotes.
#[derive(Debug, Clone, Copy)]
pub(super) struct Margins {
    minor: u64,
    major: u64,
}

impl Margins {
    /// Of `typed` individuals with `copies` copies of either allele; `None` when nobody is typed or
    /// there are more copies than two an individual.
    pub(super) fn of(typed: u32, copies: u32) -> Option<Margins> {
        let (all, copies) = (2 * u64::from(typed), u64::from(copies));
        let other = all.checked_sub(copies)?;
        (typed > 0).then(|| Margins {
            minor: copies.min(other),
            major: copies.max(other),
        })
    }

    /// Copies of the rarer allele: the most heterozygotes there can be.
    pub(super) fn minor(&self) -> u64 {
        self.minor
    }

    /// Product of the two allele counts.
    pub(super) fn product(&self) -> u64 {
        self.minor * self.major
    }

    /// Whether this many heterozygotes are possible.
    pub(super) fn allows(&self, heterozygotes: u64) -> bool {
        heterozygotes <= self.minor && (self.minor - heterozygotes).is_multiple_of(2)
    }

    /// A possible number of heterozygotes close to the most likely one. Weights relative to it
    /// neither overflow nor lose the bulk of the distribution.
    fn centre(&self) -> u64 {
        let near = self.product() / (self.minor + self.major);
        near + (near + self.minor) % 2
    }

    /// P(h+2)/P(h) (Wigginton, Cutler & Abecasis 2005, Am J Hum Genet 76:887-893).
    fn step(&self, h: u64) -> f64 {
        ((self.minor - h) * (self.major - h)) as f64 / ((h + 2) * (h + 1)) as f64
    }

    /// Calls `visit` with every possible number of heterozygotes and its weight, that of the centre
    /// being 1: from the centre down, then from above the centre up.
    pub(super) fn visit(&self, mut visit: impl FnMut(u64, f64)) {
        let centre = self.centre();
        let (mut h, mut weight) = (centre, 1.0);
        visit(h, weight);
        while h >= 2 {
            h -= 2;
            weight /= self.step(h);
            visit(h, weight);
        }
        (h, weight) = (centre, 1.0);
        while h + 2 <= self.minor {
            weight *= self.step(h);
            h += 2;
            visit(h, weight);
        }
    }

    /// Weight of one possible number of heterozygotes, that of the centre being 1.
    fn weight(&self, heterozygotes: u64) -> f64 {
        let (mut h, mut weight) = (self.centre(), 1.0);
        while h < heterozygotes {
            weight *= self.step(h);
            h += 2;
        }
        while h > heterozygotes {
            h -= 2;
            weight /= self.step(h);
        }
        weight
    }
}

/// Exact test of `heterozygotes` among `typed` individuals with `copies` copies of either allele
/// (Levene 1949; Haldane 1954, J Genet 52:631-635). A fixed locus has p = 1.
///
/// `None` when nobody is typed or no such sample exists. Takes time in proportion to the copies of
/// the rarer allele and allocates nothing.
pub fn test_two_alleles(typed: u32, copies: u32, heterozygotes: u32) -> Option<TwoAlleleTest> {
    let margins = Margins::of(typed, copies)?;
    let heterozygotes = u64::from(heterozygotes);
    if !margins.allows(heterozygotes) {
        return None;
    }
    let observed = margins.weight(heterozygotes);
    let (tied_from, tied_to) = (observed * (1.0 - TIE), observed * (1.0 + TIE));
    let (mut all, mut rarer, mut tied) = (0.0, 0.0, 0.0);
    let (mut fewer, mut more) = (0.0, 0.0);
    margins.visit(|h, weight| {
        all += weight;
        if weight < tied_from {
            rarer += weight;
        } else if weight <= tied_to {
            tied += weight;
        }
        if h < heterozygotes {
            fewer += weight;
        } else if h > heterozygotes {
            more += weight;
        }
    });
    let share = |weight: f64| (weight / all).min(1.0);
    Some(TwoAlleleTest {
        p: share(rarer + tied),
        mid_p: share(rarer + 0.5 * tied),
        deficit: share(fewer + observed),
        excess: share(more + observed),
    })
}

/// Chances of all possible numbers of heterozygotes, from the fewest (0 or 1) in steps of 2 up to
/// the copies of the rarer allele. `None` when nobody is typed or there are too many copies.
pub fn heterozygote_distribution(typed: u32, copies: u32) -> Option<Vec<f64>> {
    let margins = Margins::of(typed, copies)?;
    let mut weights = vec![0.0; margins.minor() as usize / 2 + 1];
    let mut all = 0.0;
    margins.visit(|h, weight| {
        weights[h as usize / 2] = weight;
        all += weight;
    });
    weights.iter_mut().for_each(|weight| *weight /= all);
    Some(weights)
}

/// Chi-square (1 degree of freedom) of the three genotype counts against p^2, 2pq, q^2, each
/// distance shortened by `continuity` (0 or 0.5). For comparison with published tables only: it is
/// poor for rare alleles. `None` when fewer than two alleles are seen.
pub fn chi_square(genotypes: [u32; 3], continuity: f64) -> Option<f64> {
    let [first, both, second] = genotypes.map(f64::from);
    let typed = first + both + second;
    let p = (2.0 * first + both) / (2.0 * typed);
    if typed == 0.0 || p == 0.0 || p == 1.0 {
        return None;
    }
    let expected = [p * p, 2.0 * p * (1.0 - p), (1.0 - p) * (1.0 - p)].map(|share| share * typed);
    let term = |(observed, expected): (f64, f64)| {
        let distance = (observed - expected).abs() - continuity;
        distance * distance / expected
    };
    Some(
        [first, both, second]
            .into_iter()
            .zip(expected)
            .map(term)
            .sum(),
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn impossible_samples_are_absent() {
        assert_eq!(test_two_alleles(0, 0, 0), None);
        assert_eq!(test_two_alleles(5, 11, 1), None);
        assert_eq!(test_two_alleles(5, 4, 3), None);
        assert_eq!(test_two_alleles(5, 4, 6), None);
        assert_eq!(heterozygote_distribution(0, 0), None);
    }

    #[test]
    fn a_fixed_locus_fits() {
        let fixed = test_two_alleles(7, 14, 0).unwrap();
        assert_eq!(
            (fixed.p, fixed.mid_p, fixed.deficit, fixed.excess),
            (1.0, 0.5, 1.0, 1.0)
        );
    }

    #[test]
    fn the_centre_is_always_possible() {
        for typed in 1..40 {
            for copies in 0..=2 * typed {
                let margins = Margins::of(typed, copies).unwrap();
                assert!(margins.allows(margins.centre()), "{typed} {copies}");
            }
        }
    }

    #[test]
    fn very_large_samples_stay_finite() {
        let test = test_two_alleles(400_000, 400_000, 0).unwrap();
        assert_eq!(test.excess, 1.0);
        assert!(test.p < 1e-300 && test.p >= 0.0);
    }
}
