//! Many tests at once.

/// Adjusted p values q of Benjamini & Hochberg (1995, J R Stat Soc B 57:289-300), in the order of
/// `p`: q at rank i is the least of m p_(k)/k over k >= i, at most 1. A missing p is no test, and
/// equal p share one q. The tests with q at or below a rate are those rejected at that false
/// discovery rate.
pub fn benjamini_hochberg(p: &[Option<f64>]) -> Vec<Option<f64>> {
    let mut order: Vec<(f64, usize)> = p
        .iter()
        .enumerate()
        .filter_map(|(i, p)| Some(((*p)?, i)))
        .collect();
    order.sort_unstable_by(|a, b| a.0.total_cmp(&b.0));
    let tests = order.len() as f64;
    let mut adjusted = vec![None; p.len()];
    let mut least = 1.0f64;
    for (rank, &(p, i)) in order.iter().enumerate().rev() {
        least = least.min(tests * p / (rank + 1) as f64);
        adjusted[i] = Some(least);
    }
    adjusted
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn no_test_has_no_q() {
        assert_eq!(benjamini_hochberg(&[]), []);
        assert_eq!(benjamini_hochberg(&[None, None]), [None, None]);
        assert_eq!(benjamini_hochberg(&[None, Some(0.3)]), [None, Some(0.3)]);
    }
}
