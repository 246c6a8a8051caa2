//! Variances of an estimate by leaving out: blocks of loci, or individuals.

/// Variance of an estimate by leaving out one block at a time.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct BlockJackknife {
    /// The estimate less its estimated bias.
    pub bias_corrected: f64,
    /// Variance of the estimate.
    pub variance: f64,
    /// Number of blocks with anything in them.
    pub blocks: usize,
}

/// Weighted block jackknife (Busing, Meijer & van der Leeden 1999, Stat Comput 9:3-8).
///
/// `deletes[j]` is the estimate without block j and `weights[j]` what block j holds (loci, or
/// independent alleles). A block that holds nothing is no block. `None` for fewer than two blocks,
/// for lists of different length, and when a value is not finite or a weight below 0.
pub fn block_jackknife(estimate: f64, deletes: &[f64], weights: &[f64]) -> Option<BlockJackknife> {
    let usable = |value: &f64| value.is_finite();
    if deletes.len() != weights.len()
        || !estimate.is_finite()
        || !deletes.iter().all(usable)
        || !weights
            .iter()
            .all(|weight| weight.is_finite() && *weight >= 0.0)
    {
        return None;
    }
    let filled = || {
        deletes
            .iter()
            .copied()
            .zip(weights.iter().copied())
            .filter(|&(_, weight)| weight > 0.0)
    };
    let blocks = filled().count();
    if blocks < 2 {
        return None;
    }
    let number = blocks as f64;
    let all: f64 = weights.iter().sum();
    let mut bias_corrected = number * estimate;
    for (without, weight) in filled() {
        bias_corrected -= (1.0 - weight / all) * without;
    }
    let mut variance = 0.0;
    for (without, weight) in filled() {
        let share = all / weight;
        let pseudo = share * estimate - (share - 1.0) * without;
        variance += (pseudo - bias_corrected) * (pseudo - bias_corrected) / (share - 1.0);
    }
    Some(BlockJackknife {
        bias_corrected,
        variance: variance / number,
        blocks,
    })
}

/// Variance of an estimate by leaving out one individual at a time, around the full estimate:
/// (S-1)/S sum (theta_(-i) - theta)^2. `None` for fewer than two individuals or a value that is not
/// finite.
pub fn individual_variance(estimate: f64, deletes: &[f64]) -> Option<f64> {
    let individuals = deletes.len() as f64;
    let sum: f64 = deletes
        .iter()
        .map(|without| (without - estimate) * (without - estimate))
        .sum();
    (deletes.len() > 1 && sum.is_finite()).then(|| (individuals - 1.0) / individuals * sum)
}

/// The same around the mean of the estimates left over (Jones, Ovenden & Wang 2016, Heredity
/// 117:217-223), never above [`individual_variance`].
pub fn individual_variance_centred(deletes: &[f64]) -> Option<f64> {
    individual_variance(deletes.iter().sum::<f64>() / deletes.len() as f64, deletes)
}

/// The variance of a drift rate u = 1/(2Ne), from both jackknives.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct DriftVariance {
    /// All parts together.
    pub variance: f64,
    /// Degrees of freedom (Satterthwaite 1946).
    pub degrees: f64,
}

/// Puts together the variance of a drift rate: over loci, what the sampled individuals have in common
/// over loci, and the pedigree that all loci share.
///
/// `rate`: the estimate of u. `generations`: t, between the samples. `sampling`: the squared change that
/// sampling alone makes, 1/(2 S0) + 1/(2 St) with the individuals typed at a locus. `loci`: variance over
/// blocks of loci and its degrees of freedom; `samples`: the same of the delete-one variance of each sample.
///
/// Each locus gives a squared change d^2 of mean D + s (drift and sampling). With L loci on their own,
/// `V_loci = 2 (D + s)^2/L`. Leaving out an individual of a sample moves d by its dosage, and the delete-one
/// variance of such a square is `4 (D + s) s/L` over both samples, although the sampling of each locus on its
/// own is in V_loci already: a statistic without first-order term is counted twice by the jackknife
/// (Efron & Stein 1981, Ann Stat 9:586-596). So `2 q V_loci`, q = s/(D + s), is taken off, and what is left is
/// what individuals have in common at many loci.
///
/// Neither jackknife sees the pedigree: chance disequilibrium of unlinked loci, of expected squared
/// correlation 1/(3 Ne) (Hill 1981, Genet Res 38:209-216) that halves each generation, makes all loci drift
/// together. Over t generations the drift of two loci has the squared correlation
/// `S(t)/(3 Ne t^2)`, S(t) = 3 t - 4 + 2^(2-t) (the sum of 2^-|g-h| over pairs of generations), and squares
/// with that correlation share `2 u^2` of it: `4 u^3 S(t)/(3 t^2)`.
///
/// The study in `tests/calibration/` has the coverage of what follows.
pub fn drift_variance(
    rate: f64,
    generations: f64,
    sampling: f64,
    loci: (f64, f64),
    samples: &[(f64, f64)],
) -> DriftVariance {
    let drift = 1.0 - (1.0 - rate.clamp(0.0, 0.5)).powf(generations);
    let share = match sampling > 0.0 {
        true => sampling / (sampling + drift),
        false => 0.0,
    };
    let individuals: f64 = samples.iter().map(|(v, _)| v).sum();
    let in_common = (individuals - 2.0 * share * loci.0).max(0.0);
    let kept = match individuals > 0.0 {
        true => in_common / individuals,
        false => 0.0,
    };
    let pairs = 3.0 * generations - 4.0 + (2.0 - generations).exp2();
    let pedigree = 4.0 * rate.max(0.0).powi(3) * pairs / (3.0 * generations * generations);
    let parts: Vec<(f64, f64)> = std::iter::once(loci)
        .chain(samples.iter().map(|&(v, degrees)| (v * kept, degrees)))
        .collect();
    let (mut variance, mut spread) = (pedigree, 0.0);
    for (v, degrees) in parts {
        variance += v;
        spread += v * v / degrees.max(1.0);
    }
    DriftVariance {
        variance,
        degrees: match spread > 0.0 {
            true => variance * variance / spread,
            false => f64::INFINITY,
        },
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn too_little_to_leave_out_is_absent() {
        assert_eq!(block_jackknife(1.0, &[1.0], &[4.0]), None);
        assert_eq!(block_jackknife(1.0, &[1.0, 0.9], &[4.0, 0.0]), None);
        assert_eq!(block_jackknife(1.0, &[1.0, f64::NAN], &[4.0, 1.0]), None);
        assert_eq!(block_jackknife(1.0, &[1.0, 0.9], &[4.0]), None);
        assert_eq!(individual_variance(1.0, &[1.0]), None);
        assert_eq!(individual_variance_centred(&[]), None);
    }

    #[test]
    fn pure_sampling_of_single_loci_is_counted_once() {
        // Without drift the delete-one variance is twice that over loci: only the latter stays.
        let none = drift_variance(0.0, 3.0, 0.02, (5.0, 20.0), &[(4.0, 49.0), (6.0, 49.0)]);
        assert_eq!((none.variance, none.degrees), (5.0, 20.0));
        // Individuals that add less than that cannot make the variance smaller.
        let less = drift_variance(0.0, 3.0, 0.02, (5.0, 20.0), &[(1.0, 49.0)]);
        assert_eq!(less.variance, 5.0);
    }

    #[test]
    fn the_pedigree_is_shared_by_all_loci() {
        // One generation: r2 of 1/(3 Ne) alone, 2 u^2/(3 Ne) = 4 u^3/3.
        let one = drift_variance(0.01, 1.0, 0.0, (0.0, 20.0), &[]);
        assert!((one.variance - 4e-6 / 3.0).abs() < 1e-18);
        // Two: pairs 1 + 1 + 2/2 = 3, over 3 t^2 = 12: u^3.
        let two = drift_variance(0.01, 2.0, 0.0, (0.0, 20.0), &[]);
        assert!((two.variance - 1e-6).abs() < 1e-18);
        // Many: 2 u^2/(Ne t) = 4 u^3/t but for the first generations.
        let many = drift_variance(0.01, 1000.0, 0.0, (0.0, 20.0), &[]);
        assert!((many.variance * 1000.0 / 4e-6 - 1.0).abs() < 0.002);
    }

    #[test]
    fn an_empty_block_is_no_block() {
        let two = block_jackknife(1.0, &[1.2, 0.7], &[3.0, 2.0]).unwrap();
        let padded = block_jackknife(1.0, &[1.2, 1.0, 0.7], &[3.0, 0.0, 2.0]).unwrap();
        assert_eq!(two, padded);
    }
}
