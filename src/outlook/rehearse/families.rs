//! Family sizes: who becomes a parent how often, and what effective size that makes.
//!
//! A wanted variance of family size Vk is turned into the chance that two gametes come from the
//! same parent, 1/Ne with Ne = (4N - 2)/(Vk + 2) (Crow & Denniston 1988), which the schemes here
//! meet exactly, whatever the number of offspring.

use super::dice::Dice;

/// How the parents of one sex (or all hermaphrodites) share the next generation.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Scheme {
    /// Every gamete comes from any parent.
    Chance,
    /// Parents have weights from a symmetric Dirichlet distribution of this shape, so that two
    /// gametes share a parent with probability (shape + 1)/(N shape + 1).
    Weighted(f64),
    /// Families are made equal; then each gamete is drawn anew from any parent unless it is kept,
    /// so that both of a pair are kept with this probability.
    Equalised(f64),
}

impl Scheme {
    /// The scheme of `parents` parents for a variance of family size at a mean of two; `None` is
    /// chance alone, which is a variance of 2(1 - 1/N).
    pub fn for_variance(variance: Option<f64>, parents: u32) -> Self {
        let n = f64::from(parents);
        let (Some(variance), true) = (variance, parents > 1) else {
            return Scheme::Chance;
        };
        let by_chance = 2.0 * (1.0 - 1.0 / n);
        if variance <= by_chance {
            Scheme::Equalised(1.0 - variance / by_chance)
        } else {
            let effective = (4.0 * n - 2.0) / (variance + 2.0);
            Scheme::Weighted(((effective - 1.0) / (n - effective)).max(1e-6))
        }
    }

    /// Chance that two of `gametes` gametes, drawn without replacement, are of the same parent.
    pub fn same_parent(self, parents: u32, gametes: u32) -> f64 {
        let n = f64::from(parents);
        match self {
            Scheme::Chance => 1.0 / n,
            Scheme::Weighted(shape) => (shape + 1.0) / (n * shape + 1.0),
            Scheme::Equalised(both_kept) => {
                let (each, more) = (gametes / parents, gametes % parents);
                let pairs = |k: u32| f64::from(k) * (f64::from(k) - 1.0);
                let same =
                    f64::from(more) * pairs(each + 1) + f64::from(parents - more) * pairs(each);
                let equal = if gametes > 1 {
                    same / pairs(gametes)
                } else {
                    0.0
                };
                both_kept * equal + (1.0 - both_kept) / n
            }
        }
    }
}

/// The parents of one sex (or all hermaphrodites) of one population in one generation.
#[derive(Debug, Clone)]
pub struct Brood {
    parents: u32,
    scheme: Scheme,
    /// Running sums of the weights, where they differ.
    cumulative: Vec<f64>,
}

impl Brood {
    /// Draws the weights of `parents` parents, at least one.
    pub fn new(scheme: Scheme, parents: u32, dice: &mut Dice) -> Self {
        let mut cumulative = Vec::new();
        if let Scheme::Weighted(shape) = scheme {
            let mut sum = 0.0;
            for weight in dice.dirichlet(&vec![shape; parents as usize]) {
                sum += weight;
                cumulative.push(sum);
            }
        }
        Brood {
            parents,
            scheme,
            cumulative,
        }
    }

    /// The parent of one gamete among as many as one likes (before families are made equal).
    pub fn one(&self, dice: &mut Dice) -> u32 {
        if self.cumulative.is_empty() {
            return dice.below(self.parents);
        }
        let point = dice.uniform();
        let parent = self.cumulative.partition_point(|&sum| sum <= point) as u32;
        parent.min(self.parents - 1)
    }

    /// The parents of all gametes that make the breeding offspring, in random order.
    pub fn all(&self, gametes: u32, dice: &mut Dice) -> Vec<u32> {
        let Scheme::Equalised(both_kept) = self.scheme else {
            return (0..gametes).map(|_| self.one(dice)).collect();
        };
        let redrawn = 1.0 - both_kept.sqrt();
        let mut order: Vec<u32> = (0..self.parents).collect();
        dice.shuffle(&mut order);
        let mut list: Vec<u32> = order
            .iter()
            .copied()
            .cycle()
            .take(gametes as usize)
            .collect();
        for parent in &mut list {
            if dice.chance(redrawn) {
                *parent = dice.below(self.parents);
            }
        }
        dice.shuffle(&mut list);
        list
    }
}

/// Chance that two different gametes come from the same parent, from the gametes each parent gave;
/// its inverse is the effective size (Crow & Denniston 1988). `None` with fewer than two gametes.
pub fn realised_same_parent(family_sizes: &[u32]) -> Option<f64> {
    let total: f64 = family_sizes.iter().map(|&k| f64::from(k)).sum();
    let same: f64 = family_sizes
        .iter()
        .map(|&k| f64::from(k) * (f64::from(k) - 1.0))
        .sum();
    (total > 1.0).then(|| same / (total * (total - 1.0)))
}

#[cfg(test)]
mod tests {
    use super::super::dice::Purpose;
    use super::*;

    /// METHODS 7 checks [7.1] and [7.2]: exact enumeration of pairs of gametes; formula of Crow &
    /// Denniston (1988) and Crow & Morton (1955).
    #[test]
    fn realised_size_of_listed_families() {
        let p = realised_same_parent(&[0, 1, 2, 2, 3, 4, 0, 5, 1, 2]).unwrap();
        assert!((1.0 / p - 8.636363636363637).abs() < 1e-9);
        let p = realised_same_parent(&[0, 1, 0, 3, 1, 2, 6, 0, 4, 1]).unwrap();
        assert!((1.0 / p - 6.12).abs() < 1e-9);
        assert_eq!(realised_same_parent(&[1]), None);
    }

    /// METHODS 7 check [7.3]: algebra of (4N - 2)/(Vk + 2) for N = 10.
    #[test]
    fn schemes_give_the_effective_size_of_their_variance() {
        for (variance, want) in [
            (0.0, 19.0),
            (1.8, 10.0),
            (2.0, 9.5),
            (0.9, 38.0 / 2.9),
            (6.0, 4.75),
        ] {
            let p = Scheme::for_variance(Some(variance), 10).same_parent(10, 20);
            assert!(
                (1.0 / p - want).abs() < 1e-9,
                "Vk {variance}: {} for {want}",
                1.0 / p
            );
        }
        assert_eq!(Scheme::for_variance(None, 10).same_parent(10, 20), 0.1);
    }

    /// Drawn families against the probability they were made for (Monte Carlo, 5 standard errors).
    #[test]
    fn drawn_families_agree_with_their_scheme() {
        for variance in [0.0, 0.7, 2.0, 8.0] {
            for gametes in [40, 50] {
                let scheme = Scheme::for_variance(Some(variance), 20);
                let runs = 20_000;
                let (mut sum, mut squares) = (0.0, 0.0);
                for run in 0..runs {
                    let mut dice = Dice::new(1, Purpose::Pedigree, gametes, run);
                    let brood = Brood::new(scheme, 20, &mut dice);
                    let mut sizes = vec![0; 20];
                    for parent in brood.all(gametes as u32, &mut dice) {
                        sizes[parent as usize] += 1;
                    }
                    let p = realised_same_parent(&sizes).unwrap();
                    sum += p;
                    squares += p * p;
                }
                let mean = sum / runs as f64;
                let error = ((squares / runs as f64 - mean * mean).max(0.0) / runs as f64).sqrt();
                let want = scheme.same_parent(20, gametes as u32);
                assert!(
                    (mean - want).abs() <= 5.0 * error + 1e-12,
                    "Vk {variance}: {mean} {want}"
                );
            }
        }
    }
}
