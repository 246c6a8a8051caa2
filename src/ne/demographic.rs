//! Effective size from what was counted: family sizes, breeding males and females, census sizes, age
//! structure.
//!
//! The formulas are for random union of gametes; separate sexes add about half an individual, which
//! is neglected. Equal families give twice the census, so Ne above N is no error.

/// Mean and variance of the offspring per parent, parents without offspring included.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FamilySizes {
    /// Parents, with and without offspring.
    pub parents: f64,
    /// Mean offspring per parent.
    pub mean: f64,
    /// Variance of offspring per parent, divided by the number of parents (not by one less: only
    /// then is Ne exactly the inverse of the chance that two gametes have the same parent).
    pub variance: f64,
}

impl FamilySizes {
    /// From the offspring counted per parent; `None` without parents.
    pub fn of(offspring: &[u32]) -> Option<Self> {
        if offspring.is_empty() {
            return None;
        }
        let parents = offspring.len() as f64;
        let mean = offspring.iter().map(|&k| f64::from(k)).sum::<f64>() / parents;
        let squares = offspring.iter().map(|&k| (f64::from(k) - mean).powi(2));
        Some(FamilySizes {
            parents,
            mean,
            variance: squares.sum::<f64>() / parents,
        })
    }

    /// Ne = (N k - 1)/(k - 1 + V/k) for N parents of mean k and variance V (Crow & Morton 1955;
    /// Crow & Denniston 1988). `None` with fewer than two offspring in all, or when no two of them
    /// share a parent: nothing bounds Ne then.
    pub fn effective_size(&self) -> Option<f64> {
        let offspring = self.parents * self.mean;
        let shared = self.mean - 1.0 + self.variance / self.mean;
        (offspring > 1.0 && shared > 0.0).then(|| (offspring - 1.0) / shared)
    }

    /// The variance that families of the same relative spread would have in a population of constant
    /// size, where the mean is 2: 2 [1 + (2/k)(V/k - 1)] (Crow & Morton 1955). `None` without
    /// offspring.
    pub fn variance_at_mean_two(&self) -> Option<f64> {
        (self.mean > 0.0).then(|| 2.0 * (1.0 + 2.0 / self.mean * (self.variance / self.mean - 1.0)))
    }
}

/// Ne = (4N - 2)/(V + 2) of N parents in a population of constant size, V the variance of offspring
/// per parent about the mean of 2 (Wright 1938 as in Crow & Denniston 1988). `None` unless N is above
/// 1/2 and V is not negative.
pub fn constant_population(parents: f64, variance: f64) -> Option<f64> {
    (parents > 0.5 && variance >= 0.0).then(|| (4.0 * parents - 2.0) / (variance + 2.0))
}

/// Ne = 4 Nm Nf/(Nm + Nf) of breeding males and females (Wright 1931). `None` unless both are
/// positive. Where family sizes are known by sex, use the effective size of each sex.
pub fn sex_ratio(males: f64, females: f64) -> Option<f64> {
    (males > 0.0 && females > 0.0).then(|| 4.0 * males * females / (males + females))
}

/// Harmonic mean of the sizes of successive generations (Wright 1931); `None` without generations or
/// with a size that is not positive.
pub fn harmonic_mean(sizes: &[f64]) -> Option<f64> {
    (!sizes.is_empty() && sizes.iter().all(|&n| n > 0.0))
        .then(|| sizes.len() as f64 / sizes.iter().map(|n| 1.0 / n).sum::<f64>())
}

/// Share of heterozygosity kept over successive generations: the product of 1 - 1/(2N). `None` with a
/// size below 1/2.
pub fn heterozygosity_kept(sizes: &[f64]) -> Option<f64> {
    sizes
        .iter()
        .all(|&n| n >= 0.5)
        .then(|| sizes.iter().map(|n| 1.0 - 1.0 / (2.0 * n)).product())
}

/// The constant size that would keep the same share of heterozygosity: the exact form of the
/// harmonic mean. `None` without generations or with a size of 1/2 or less.
pub fn constant_equivalent(sizes: &[f64]) -> Option<f64> {
    if sizes.is_empty() || sizes.iter().any(|&n| n <= 0.5) {
        return None;
    }
    // ln(1 - 1/(2N)) summed, so that long series of large sizes lose no digits.
    let logarithm: f64 = sizes.iter().map(|n| (-1.0 / (2.0 * n)).ln_1p()).sum();
    Some(-1.0 / (2.0 * (logarithm / sizes.len() as f64).exp_m1()))
}

/// Ne = 4 N1 G/(V + 2) with overlapping generations: N1 newborns (or recruits) a year, G the
/// generation length in years, V the variance of lifetime offspring (Hill 1972, 1979). `None` unless
/// N1 and G are positive and V is not negative.
pub fn overlapping_generations(newborns: f64, generation: f64, variance: f64) -> Option<f64> {
    (newborns > 0.0 && generation > 0.0 && variance >= 0.0)
        .then(|| 4.0 * newborns * generation / (variance + 2.0))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn near(got: f64, want: f64) {
        assert!(
            (got - want).abs() <= 1e-9 * want.abs(),
            "{got}, expected {want}"
        );
    }

    /// The chance that two gametes drawn without replacement come from one parent, by listing pairs.
    fn inverse_chance_of_one_parent(offspring: &[u32]) -> f64 {
        let total: u32 = offspring.iter().sum();
        let one_parent: u32 = offspring.iter().map(|k| k * k.saturating_sub(1)).sum();
        f64::from(total * (total - 1)) / f64::from(one_parent)
    }

    /// Invented families; Ne by exact enumeration of pairs of gametes.
    #[test]
    fn family_sizes() {
        let families = [0, 1, 2, 2, 3, 4, 0, 5, 1, 2];
        let sizes = FamilySizes::of(&families).unwrap();
        assert_eq!(sizes.mean, 2.0);
        near(sizes.variance, 2.4);
        near(sizes.effective_size().unwrap(), 8.636363636363637);
        near(
            sizes.effective_size().unwrap(),
            inverse_chance_of_one_parent(&families),
        );
        near(
            constant_population(10.0, sizes.variance).unwrap(),
            8.636363636363637,
        );

        let families = [0, 1, 0, 3, 1, 2, 6, 0, 4, 1];
        let sizes = FamilySizes::of(&families).unwrap();
        near(sizes.mean, 1.8);
        near(sizes.variance, 3.56);
        near(sizes.effective_size().unwrap(), 6.12);
        near(
            sizes.effective_size().unwrap(),
            inverse_chance_of_one_parent(&families),
        );
        let rescaled = sizes.variance_at_mean_two().unwrap();
        near(rescaled, 4.172839506172839);
        near(constant_population(10.0, rescaled).unwrap(), 6.156);
    }

    /// Algebra of (4N - 2)/(V + 2): equal, binomial and Poisson families.
    #[test]
    fn equal_families_double_the_census() {
        near(constant_population(10.0, 0.0).unwrap(), 19.0);
        near(constant_population(10.0, 1.8).unwrap(), 10.0);
        near(constant_population(10.0, 2.0).unwrap(), 9.5);
    }

    /// Arithmetic of Wright (1931).
    #[test]
    fn breeding_sexes() {
        for (males, females, size) in [
            (2.0, 200.0, 7.920792079207921),
            (1.0, 99.0, 3.96),
            (5.0, 45.0, 18.0),
            (25.0, 25.0, 50.0),
            (10.0, 40.0, 32.0),
        ] {
            near(sex_ratio(males, females).unwrap(), size);
        }
    }

    /// Arithmetic of the product of 1 - 1/(2N) and of the harmonic mean.
    #[test]
    fn fluctuating_size() {
        let sizes = [100.0, 10.0, 100.0];
        near(harmonic_mean(&sizes).unwrap(), 25.0);
        near(heterozygosity_kept(&sizes).unwrap(), 0.9405237499999999);
        near(constant_equivalent(&sizes).unwrap(), 24.71333822180186);
        near(constant_equivalent(&[80.0; 7]).unwrap(), 80.0);
    }

    /// Arithmetic of Hill (1972).
    #[test]
    fn overlap() {
        near(overlapping_generations(50.0, 4.0, 6.0).unwrap(), 100.0);
    }

    #[test]
    fn what_cannot_be_is_absent() {
        assert_eq!(FamilySizes::of(&[]), None);
        assert_eq!(FamilySizes::of(&[0, 0]).unwrap().effective_size(), None);
        assert_eq!(
            FamilySizes::of(&[0, 0]).unwrap().variance_at_mean_two(),
            None
        );
        // Each offspring has its own parent.
        assert_eq!(FamilySizes::of(&[1, 1, 1]).unwrap().effective_size(), None);
        assert_eq!(sex_ratio(0.0, 10.0), None);
        assert_eq!(harmonic_mean(&[]), None);
        assert_eq!(harmonic_mean(&[5.0, 0.0]), None);
        assert_eq!(constant_equivalent(&[0.5]), None);
        assert_eq!(heterozygosity_kept(&[]), Some(1.0));
        assert_eq!(overlapping_generations(0.0, 4.0, 6.0), None);
        assert_eq!(constant_population(f64::NAN, 1.0), None);
    }
}
