//! From values to pixels, and where ticks stand.

/// How values are spread over the pixels.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Spread {
    Linear,
    Logarithmic,
}

/// A map from an interval of values to an interval of pixels.
#[derive(Debug, Clone, Copy)]
pub struct Scale {
    spread: Spread,
    values: [f64; 2],
    pixels: [f64; 2],
}

impl Scale {
    /// Even steps of value are even steps of pixels.
    pub fn linear(values: [f64; 2], pixels: [f64; 2]) -> Self {
        Scale {
            spread: Spread::Linear,
            values: spread_out(values),
            pixels,
        }
    }

    /// Even factors of value are even steps of pixels. Values are above 0.
    pub fn logarithmic(values: [f64; 2], pixels: [f64; 2]) -> Self {
        let [low, high] = values.map(|x| x.max(f64::MIN_POSITIVE));
        Scale {
            spread: Spread::Logarithmic,
            values: if high > low {
                [low, high]
            } else {
                [low / 10.0, low * 10.0]
            },
            pixels,
        }
    }

    /// The pixel of a value; values beyond the scale stand at its edge.
    pub fn at(&self, value: f64) -> f64 {
        let [low, high] = self.values;
        let share = match self.spread {
            Spread::Linear => (value - low) / (high - low),
            Spread::Logarithmic => (value.max(f64::MIN_POSITIVE) / low).ln() / (high / low).ln(),
        };
        let share = if share.is_finite() {
            share.clamp(0.0, 1.0)
        } else {
            0.0
        };
        self.pixels[0] + share * (self.pixels[1] - self.pixels[0])
    }

    /// Round values on the scale: at most about `most` on a linear one, powers of ten on the other.
    pub fn ticks(&self, most: usize) -> Vec<f64> {
        let [low, high] = self.values;
        match self.spread {
            Spread::Linear => {
                let step = round_step((high - low) / most.max(1) as f64);
                let first = (low / step - 1e-9).ceil();
                (0..=2 * most.max(1))
                    .map(|i| (first + i as f64) * step)
                    .take_while(|&x| x <= high + 1e-9 * step)
                    .collect()
            }
            Spread::Logarithmic => {
                let [first, last] = [low.log10().ceil() as i32, high.log10().floor() as i32];
                (first..=last).map(|power| 10f64.powi(power)).collect()
            }
        }
    }

    /// Decimals that tell the linear ticks apart.
    pub fn places(&self, most: usize) -> usize {
        let step = round_step((self.values[1] - self.values[0]) / most.max(1) as f64);
        (-step.log10().floor()).clamp(0.0, 6.0) as usize
    }
}

/// Some room around equal or reversed limits, so that a scale has an extent.
fn spread_out([low, high]: [f64; 2]) -> [f64; 2] {
    if high > low {
        [low, high]
    } else {
        let room = (0.1 * low.abs()).max(0.01);
        [low - room, low + room]
    }
}

/// The least of 1, 2, 2.5, 5 times a power of ten that is not below `step`.
fn round_step(step: f64) -> f64 {
    if !step.is_finite() || step <= 0.0 {
        return 1.0;
    }
    let power = 10f64.powf(step.log10().floor());
    let factors = [1.0, 2.0, 5.0, 10.0];
    let factor = factors
        .into_iter()
        .find(|f| f * power >= step * (1.0 - 1e-9));
    factor.unwrap_or(10.0) * power
}

/// The least interval that holds all values, with a margin; `fallback` when there is none.
pub fn extent(values: impl IntoIterator<Item = f64>, margin: f64, fallback: [f64; 2]) -> [f64; 2] {
    let mut limits: Option<[f64; 2]> = None;
    for x in values.into_iter().filter(|x| x.is_finite()) {
        limits = Some(limits.map_or([x, x], |[low, high]| [low.min(x), high.max(x)]));
    }
    limits.map_or(fallback, |[low, high]| {
        let room = margin * (high - low);
        [low - room, high + room]
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    // By hand: steps of 0.2 from 0 to 1; powers of ten from 10 to 1000.
    #[test]
    fn ticks_are_round() {
        let close = |a: Vec<f64>, b: &[f64]| {
            assert_eq!(a.len(), b.len(), "{a:?}");
            assert!(a.iter().zip(b).all(|(x, y)| (x - y).abs() < 1e-9), "{a:?}");
        };
        close(
            Scale::linear([0.0, 1.0], [0.0, 1.0]).ticks(5),
            &[0.0, 0.2, 0.4, 0.6, 0.8, 1.0],
        );
        close(
            Scale::linear([0.23, 0.31], [0.0, 1.0]).ticks(4),
            &[0.24, 0.26, 0.28, 0.30],
        );
        close(
            Scale::logarithmic([5.0, 2000.0], [0.0, 1.0]).ticks(9),
            &[10.0, 100.0, 1000.0],
        );
    }

    #[test]
    fn a_scale_maps_its_ends_and_middle() {
        let linear = Scale::linear([10.0, 20.0], [0.0, 100.0]);
        assert_eq!(
            [10.0, 15.0, 20.0, 99.0].map(|x| linear.at(x)),
            [0.0, 50.0, 100.0, 100.0]
        );
        let log = Scale::logarithmic([1.0, 100.0], [0.0, 100.0]);
        assert!((log.at(10.0) - 50.0).abs() < 1e-9);
    }

    #[test]
    fn odd_limits_still_make_a_scale() {
        for values in [
            [0.0, 0.0],
            [3.0, 1.0],
            [1e300, 1e300],
            [-1e-300, 0.0],
            [f64::NAN, 1.0],
        ] {
            for scale in [
                Scale::linear(values, [0.0, 10.0]),
                Scale::logarithmic(values, [0.0, 10.0]),
            ] {
                assert!((0.0..=10.0).contains(&scale.at(values[0])));
                assert!(scale.ticks(5).len() < 700);
            }
        }
    }
}
