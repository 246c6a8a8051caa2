//! Chance: one stream a purpose, unit and generation, so that no thread can change a draw.
//!
//! Everything is built from raw words of ChaCha8 here, so that a later version of a library of
//! distributions cannot change what a seed gives.

use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::{Rng, SeedableRng};

/// What a stream is for. The numbers are part of what a seed means: never reuse one.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Purpose {
    /// Places of the loci.
    Places = 1,
    /// Family sizes, parents, migrants.
    Pedigree = 2,
    /// Who is sampled.
    Sampling = 3,
    /// Alleles and first frequencies of a unit.
    Frequencies = 4,
    /// First gene copies of a unit.
    Founders = 5,
    /// Gametes that make adults.
    Meiosis = 6,
    /// Gametes that make sampled juveniles.
    Juveniles = 7,
    /// Quality of each sample.
    SampleQuality = 8,
    /// Genotyping of a unit.
    Genotyping = 9,
    /// Texts of the alleles of a unit.
    AlleleTexts = 10,
    /// Draws of a forecast.
    Forecast = 11,
}

/// A stream of chance.
#[derive(Debug, Clone)]
pub struct Dice(ChaCha8Rng);

impl Dice {
    /// The stream of a seed for a purpose, a unit of the genome and a generation: the four numbers
    /// are the key, so different streams never overlap.
    pub fn new(seed: u64, purpose: Purpose, unit: u64, generation: u64) -> Self {
        let mut key = [0u8; 32];
        for (part, number) in key
            .chunks_exact_mut(8)
            .zip([seed, purpose as u64, unit, generation])
        {
            part.copy_from_slice(&number.to_le_bytes());
        }
        Dice(ChaCha8Rng::from_seed(key))
    }

    /// 64 fair coins.
    pub fn word(&mut self) -> u64 {
        self.0.next_u64()
    }

    /// A number in [0, 1).
    pub fn uniform(&mut self) -> f64 {
        (self.word() >> 11) as f64 * (1.0 / (1u64 << 53) as f64)
    }

    /// A number in (0, 1].
    pub fn uniform_above_zero(&mut self) -> f64 {
        1.0 - self.uniform()
    }

    /// Whether an event of this probability happens.
    pub fn chance(&mut self, probability: f64) -> bool {
        probability > 0.0 && self.uniform() < probability
    }

    /// One of 0..n; n is at least 1. Multiply and shift; the bias is below n / 2^64.
    pub fn below(&mut self, n: u32) -> u32 {
        ((u128::from(self.word()) * u128::from(n)) >> 64) as u32
    }

    /// Exponential waiting time of mean 1.
    pub fn waiting_time(&mut self) -> f64 {
        -self.uniform_above_zero().ln()
    }

    /// Standard normal (Marsaglia & Bray 1964, polar method).
    pub fn normal(&mut self) -> f64 {
        loop {
            let (x, y) = (2.0 * self.uniform() - 1.0, 2.0 * self.uniform() - 1.0);
            let s = x * x + y * y;
            if s > 0.0 && s < 1.0 {
                return x * (-2.0 * s.ln() / s).sqrt();
            }
        }
    }

    /// Gamma of this shape and scale 1 (Marsaglia & Tsang 2000).
    pub fn gamma(&mut self, shape: f64) -> f64 {
        if shape < 1.0 {
            return self.gamma(shape + 1.0) * self.uniform_above_zero().powf(1.0 / shape);
        }
        let d = shape - 1.0 / 3.0;
        let c = 1.0 / (9.0 * d).sqrt();
        loop {
            let x = self.normal();
            let v = (1.0 + c * x).powi(3);
            if v > 0.0 && self.uniform_above_zero().ln() < 0.5 * x * x + d - d * v + d * v.ln() {
                return d * v;
            }
        }
    }

    /// A factor of mean 1 and this coefficient of variation (gamma); 1 where that is 0.
    pub fn factor(&mut self, variation: f64) -> f64 {
        if variation > 0.0 {
            let square = variation * variation;
            self.gamma(1.0 / square) * square
        } else {
            1.0
        }
    }

    /// Dirichlet weights with these shapes. Where all vanish (tiny shapes), one takes everything.
    pub fn dirichlet(&mut self, shapes: &[f64]) -> Vec<f64> {
        let mut weights: Vec<f64> = shapes.iter().map(|&a| self.gamma(a)).collect();
        let sum: f64 = weights.iter().sum();
        if sum > 0.0 {
            weights.iter_mut().for_each(|w| *w /= sum);
        } else {
            let total: f64 = shapes.iter().sum();
            let mut left = self.uniform() * total;
            let mut chosen = shapes.len() - 1;
            for (i, &a) in shapes.iter().enumerate() {
                if left < a {
                    chosen = i;
                    break;
                }
                left -= a;
            }
            weights.iter_mut().for_each(|w| *w = 0.0);
            weights[chosen] = 1.0;
        }
        weights
    }

    /// Number of successes in n trials.
    pub fn binomial(&mut self, n: u32, probability: f64) -> u32 {
        (0..n).map(|_| u32::from(self.chance(probability))).sum()
    }

    /// Poisson number of this mean, by waiting times: the cost grows with the mean.
    pub fn poisson(&mut self, mean: f64) -> u32 {
        let mut count = 0;
        let mut time = self.waiting_time();
        while time < mean {
            count += 1;
            time += self.waiting_time();
        }
        count
    }

    /// Shuffles in place (Fisher & Yates 1938).
    pub fn shuffle<T>(&mut self, items: &mut [T]) {
        for i in (1..items.len()).rev() {
            let j = self.below(i as u32 + 1) as usize;
            items.swap(i, j);
        }
    }

    /// `count` different numbers of 0..n in random order; all of them where count exceeds n.
    pub fn choose(&mut self, n: u32, count: u32) -> Vec<u32> {
        let mut all: Vec<u32> = (0..n).collect();
        let count = count.min(n);
        for i in 0..count {
            let j = i + self.below(n - i);
            all.swap(i as usize, j as usize);
        }
        all.truncate(count as usize);
        all
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn moments(mut draw: impl FnMut() -> f64) -> (f64, f64) {
        let n = 200_000;
        let values: Vec<f64> = (0..n).map(|_| draw()).collect();
        let mean = values.iter().sum::<f64>() / n as f64;
        let variance = values.iter().map(|v| (v - mean).powi(2)).sum::<f64>() / n as f64;
        (mean, variance)
    }

    fn close(got: f64, want: f64, tolerance: f64) {
        assert!(
            (got - want).abs() < tolerance,
            "{got} is not {want} within {tolerance}"
        );
    }

    /// Textbook moments of each distribution; tolerances are 5 standard errors or more.
    #[test]
    fn distributions_have_their_moments() {
        let mut dice = Dice::new(3, Purpose::Places, 0, 0);
        let (m, v) = moments(|| dice.uniform());
        close(m, 0.5, 0.004);
        close(v, 1.0 / 12.0, 0.001);
        let (m, v) = moments(|| dice.normal());
        close(m, 0.0, 0.012);
        close(v, 1.0, 0.02);
        for shape in [0.3, 1.0, 4.5] {
            let (m, v) = moments(|| dice.gamma(shape));
            close(m, shape, 0.012 * shape.sqrt());
            close(v, shape, 0.05 * (shape + shape * shape).sqrt());
        }
        let (m, v) = moments(|| f64::from(dice.poisson(3.5)));
        close(m, 3.5, 0.025);
        close(v, 3.5, 0.07);
        let (a, b) = (0.4, 1.2);
        let (m, v) = moments(|| dice.dirichlet(&[a, b])[0]);
        close(m, a / (a + b), 0.004);
        close(v, a * b / ((a + b) * (a + b) * (a + b + 1.0)), 0.002);
        let (m, v) = moments(|| f64::from(dice.below(7)));
        close(m, 3.0, 0.025);
        close(v, 4.0, 0.03);
        let (m, v) = moments(|| dice.factor(0.5));
        close(m, 1.0, 0.006);
        close(v, 0.25, 0.008);
    }

    #[test]
    fn chosen_numbers_differ_and_streams_differ() {
        let mut dice = Dice::new(1, Purpose::Sampling, 0, 4);
        let mut chosen = dice.choose(30, 12);
        chosen.sort_unstable();
        chosen.dedup();
        assert_eq!(chosen.len(), 12);
        assert_eq!(dice.choose(3, 9).len(), 3);
        let mut same = Dice::new(1, Purpose::Sampling, 0, 4);
        let mut other = Dice::new(1, Purpose::Sampling, 4, 0);
        assert_ne!(same.word(), other.word());
    }

    #[test]
    fn tiny_shapes_give_one_allele_everything() {
        let mut dice = Dice::new(1, Purpose::Places, 0, 0);
        let first = (0..2000)
            .filter(|_| dice.dirichlet(&[1e-9, 3e-9])[0] > 0.5)
            .count();
        assert!((400..600).contains(&first), "{first} of 2000, 500 expected");
    }
}
