//! The exact Wright-Fisher chain of a whole number of gene copies.

/// Probabilities of 0..=n successes in n draws at success chance `p`, without underflow at the mode:
/// by the ratio of neighbours outwards from the mode, then scaled to add up to 1.
pub fn binomial_probabilities(n: u32, p: f64) -> Vec<f64> {
    let size = n as usize + 1;
    let mut out = vec![0.0; size];
    if p <= 0.0 {
        out[0] = 1.0;
        return out;
    }
    if p >= 1.0 {
        out[size - 1] = 1.0;
        return out;
    }
    let mode = (((f64::from(n) + 1.0) * p) as usize).min(size - 1);
    let odds = p / (1.0 - p);
    out[mode] = 1.0;
    for k in mode + 1..size {
        out[k] = out[k - 1] * odds * (size - k) as f64 / k as f64;
    }
    for k in (0..mode).rev() {
        out[k] = out[k + 1] / odds * (k + 1) as f64 / (size - 1 - k) as f64;
    }
    let sum: f64 = out.iter().sum();
    for v in &mut out {
        *v /= sum;
    }
    out
}
