//! Draws that a forecast needs by the million.

use crate::outlook::rehearse::Dice;

/// From so many expected successes on, a binomial draw is a rounded normal with its skewness.
const MANY: f64 = 30.0;

/// A binomial number: by adding up chances from 0 where few are expected; else from a normal number
/// z, as np + sd z + (1 - 2p)(z^2 - 1)/6 rounded (Cornish & Fisher 1938), whose first three moments
/// are those of the binomial.
pub fn binomial(dice: &mut Dice, n: u32, p: f64) -> u32 {
    if p <= 0.0 || n == 0 {
        return 0;
    }
    if p >= 1.0 {
        return n;
    }
    if p > 0.5 {
        return n - binomial(dice, n, 1.0 - p);
    }
    let trials = f64::from(n);
    let mean = trials * p;
    if mean >= MANY {
        let z = dice.normal();
        let sd = (mean * (1.0 - p)).sqrt();
        let value = mean + sd * z + (1.0 - 2.0 * p) * (z * z - 1.0) / 6.0;
        return value.round().clamp(0.0, trials) as u32;
    }
    let mut chance = (trials * (-p).ln_1p()).exp();
    let odds = p / (1.0 - p);
    let mut left = dice.uniform();
    let mut k = 0;
    while left >= chance && k < n {
        left -= chance;
        chance *= odds * (trials - f64::from(k)) / (f64::from(k) + 1.0);
        k += 1;
        // Rounding may leave a crumb that no chance covers.
        if chance < 1e-18 && f64::from(k) > mean {
            break;
        }
    }
    k
}

/// A frequency that is Beta(a, b).
pub fn beta(dice: &mut Dice, a: f64, b: f64) -> f64 {
    let (x, y) = (dice.gamma(a), dice.gamma(b));
    if x + y > 0.0 {
        x / (x + y)
    } else {
        f64::from(u8::from(dice.chance(a / (a + b))))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::outlook::rehearse::Purpose;

    // Moments of the binomial: np, np(1-p), and (1-p)^n of zeros; four Monte Carlo errors allowed.
    #[test]
    fn binomial_moments() {
        let mut dice = Dice::new(7, Purpose::Forecast, 1, 1);
        for (n, p) in [
            (20, 0.1),
            (100, 0.02),
            (400, 0.3),
            (1000, 0.9),
            (50_000, 0.2),
        ] {
            let draws: Vec<f64> = (0..20_000)
                .map(|_| binomial(&mut dice, n, p).into())
                .collect();
            let mean = draws.iter().sum::<f64>() / 2e4;
            let variance = draws.iter().map(|x| (x - mean).powi(2)).sum::<f64>() / 2e4;
            let (m, v) = (f64::from(n) * p, f64::from(n) * p * (1.0 - p));
            assert!((mean - m).abs() < 4.0 * (v / 2e4).sqrt(), "{n} {p}: {mean}");
            assert!(
                (variance / v - 1.0).abs() < 4.0 * (2.0f64 / 2e4).sqrt() + 2e-3,
                "{n} {p}: {variance}"
            );
            let zeros = draws.iter().filter(|&&x| x == 0.0).count() as f64 / 2e4;
            let none = (1.0 - p).powi(n as i32);
            assert!(
                (zeros - none).abs() < 4.0 * (none / 2e4).sqrt() + 1e-9,
                "{n} {p}: {zeros}"
            );
        }
    }
}
