//! Decimal numbers compared without rounding: 5000 animals at a ratio of 0.1 are 500, not a little
//! more or less.

use std::cmp::Ordering;

/// `digits` / 10^`places`.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Decimal {
    digits: i128,
    places: u32,
}

impl Decimal {
    /// The shortest decimal number that a double stands for, which is the one that was written.
    /// `None` for what is not finite or has too many digits.
    pub fn of(value: f64) -> Option<Self> {
        if !value.is_finite() {
            return None;
        }
        let text = format!("{value}");
        let (whole, part) = text.split_once('.').unwrap_or((&text, ""));
        let digits = format!("{whole}{part}").parse().ok()?;
        Some(Decimal {
            digits,
            places: part.len() as u32,
        })
    }

    /// The product; `None` where it has too many digits.
    pub fn times(self, other: Decimal) -> Option<Decimal> {
        Some(Decimal {
            digits: self.digits.checked_mul(other.digits)?,
            places: self.places + other.places,
        })
    }

    /// How the two compare; `None` where the common form has too many digits.
    pub fn compare(self, other: Decimal) -> Option<Ordering> {
        let places = self.places.max(other.places);
        let spread = |d: Decimal| {
            let tens = 10i128.checked_pow(places - d.places)?;
            d.digits.checked_mul(tens)
        };
        Some(spread(self)?.cmp(&spread(other)?))
    }
}

/// How `factor` x `other` compares with `limit`: exactly where the digits fit, else in doubles.
pub fn compare_product(factor: f64, other: f64, limit: f64) -> Ordering {
    let exact = || {
        let product = Decimal::of(factor)?.times(Decimal::of(other)?)?;
        product.compare(Decimal::of(limit)?)
    };
    exact().unwrap_or_else(|| (factor * other).total_cmp(&limit))
}

#[cfg(test)]
mod tests {
    use super::*;

    // Arithmetic; check 11.4 of the methods (convention of the CBD indicator: above 500, so
    // more than 5000 counted at 0.1). In doubles, 3 x 0.1 is above 0.3.
    #[test]
    fn products_are_exact() {
        assert_eq!(compare_product(5000.0, 0.1, 500.0), Ordering::Equal);
        assert_eq!(compare_product(5001.0, 0.1, 500.0), Ordering::Greater);
        assert_eq!(compare_product(6200.0, 0.1, 500.0), Ordering::Greater);
        assert_eq!(compare_product(3.0, 0.1, 0.3), Ordering::Equal);
        assert_eq!(compare_product(4999.9, 0.1, 500.0), Ordering::Less);
        assert_eq!(compare_product(-2.5, 2.0, -5.0), Ordering::Equal);
    }

    #[test]
    fn numbers_beyond_the_digits_fall_back() {
        assert_eq!(compare_product(1e300, 1e-5, 1.0), Ordering::Greater);
        assert_eq!(Decimal::of(f64::NAN), None);
    }
}
