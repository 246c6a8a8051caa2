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
    fn an_empty_block_is_no_block() {
        let two = block_jackknife(1.0, &[1.2, 0.7], &[3.0, 2.0]).unwrap();
        let padded = block_jackknife(1.0, &[1.2, 1.0, 0.7], &[3.0, 0.0, 2.0]).unwrap();
        assert_eq!(two, padded);
    }
}
