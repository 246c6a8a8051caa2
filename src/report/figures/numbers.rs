//! Numbers as people read them: few digits, a unit nearby, a thin space between thousands.

use crate::report::wire::{EffectiveSize, Estimate};

/// Between thousands: narrow, and no line breaks there.
const THOUSANDS: char = '\u{202f}';
/// The minus of running text.
const MINUS: char = '\u{2212}';

/// A count, with a thin space between thousands from 10 000 on.
pub fn count(n: u64) -> String {
    grouped(&n.to_string())
}

fn grouped(digits: &str) -> String {
    let whole = digits.split('.').next().unwrap_or(digits);
    if whole.len() < 5 || !whole.bytes().all(|b| b.is_ascii_digit()) {
        return digits.to_owned();
    }
    let mut out = String::with_capacity(digits.len() + 8);
    for (i, digit) in whole.chars().enumerate() {
        if i > 0 && (whole.len() - i).is_multiple_of(3) {
            out.push(THOUSANDS);
        }
        out.push(digit);
    }
    out + &digits[whole.len()..]
}

/// A number with a fixed count of decimals and a typographic minus; no minus before a zero.
pub fn decimals(x: f64, places: usize) -> String {
    // Beyond this a number of decimals says nothing and a line of digits breaks the page.
    if x.abs() >= 1e9 {
        return scientific(x);
    }
    let text = format!("{:.places$}", x.abs());
    let is_zero = text.bytes().all(|b| b == b'0' || b == b'.');
    let text = grouped(&text);
    if x < 0.0 && !is_zero {
        format!("{MINUS}{text}")
    } else {
        text
    }
}

fn scientific(x: f64) -> String {
    format!("{x:.2e}").replace('-', &MINUS.to_string())
}

/// Percent from a share: whole numbers from 2 % on, one decimal below. Without the sign.
pub fn percent(share: f64) -> String {
    let value = 100.0 * share;
    decimals(value, usize::from(value.abs() < 1.95))
}

/// A level or rate that was chosen, in percent with all its digits. Without the sign.
pub fn level(share: f64) -> String {
    plain((1e6 * share).round() / 1e4)
}

/// Percents of a value and its interval with the same decimals: `11 % (6 to 16)`.
pub fn percent_with_interval(value: f64, interval: Option<[f64; 2]>) -> String {
    let smallest = interval
        .iter()
        .flatten()
        .chain([&value])
        .map(|x| (100.0 * x).abs())
        .fold(f64::INFINITY, f64::min);
    let spread = interval.map_or(f64::INFINITY, |[low, high]| 100.0 * (high - low));
    let places = usize::from(smallest < 1.95 || spread < 4.0);
    let text = |share: f64| decimals(100.0 * share, places);
    match interval {
        Some([low, high]) => format!("{} % ({} to {})", text(value), text(low), text(high)),
        None => format!("{} %", text(value)),
    }
}

/// An effective or census size: three digits at most.
pub fn size(n: f64) -> String {
    let places = usize::from(n.abs() < 9.95);
    if n.abs() < 1000.0 {
        return decimals(n, places);
    }
    let step = 10f64.powi(n.abs().log10().floor() as i32 - 2);
    decimals((n / step).round() * step, 0)
}

/// `0.312 (0.290 to 0.334)`, or the reason why there is no value.
pub fn estimate(e: &Estimate, places: usize) -> String {
    match (e.estimate, e.interval) {
        (Some(x), Some([low, high])) => format!(
            "{} ({} to {})",
            decimals(x, places),
            decimals(low, places),
            decimals(high, places)
        ),
        (Some(x), None) => format!("{} (no interval)", decimals(x, places)),
        (None, _) => format!("none: {}", reason(e.absent_because.as_deref())),
    }
}

/// `38 (24 to 71)`, `no upper limit, at least 120`, or the reason why there is no value.
pub fn effective_size(e: &EffectiveSize) -> String {
    match (e.estimate, e.interval) {
        (Some(n), Some((low, high))) => format!("{} ({})", size(n), size_range(low, high)),
        (Some(n), None) => format!("{} (no interval)", size(n)),
        (None, Some((Some(low), _))) if e.unbounded => {
            format!("no upper limit, at least {}", size(low))
        }
        (None, _) if e.unbounded => "no upper limit".to_owned(),
        (None, _) => format!("none: {}", reason(e.absent_because.as_deref())),
    }
}

/// `24 to 71`, `24 to no upper limit`.
pub fn size_range(low: Option<f64>, high: Option<f64>) -> String {
    let low = low.map_or_else(|| "no lower limit".to_owned(), size);
    let high = high.map_or_else(|| "no upper limit".to_owned(), size);
    format!("{low} to {high}")
}

/// The reason as given, or that none was given.
pub fn reason(given: Option<&str>) -> &str {
    given.unwrap_or("no reason was recorded")
}

/// A number for copying into a spreadsheet: six digits, ASCII minus, no spaces.
pub fn plain(x: f64) -> String {
    if x == 0.0 {
        return "0".to_owned();
    }
    let magnitude = x.abs().log10().floor();
    if !(-5.0..9.0).contains(&magnitude) {
        return format!("{x:.5e}");
    }
    let places = (5.0 - magnitude).max(0.0) as usize;
    let text = format!("{x:.places$}");
    match text.contains('.') {
        true => text.trim_end_matches('0').trim_end_matches('.').to_owned(),
        false => text,
    }
}

/// A year as a label: whole years without decimals.
pub fn year(x: f64) -> String {
    if x.abs() >= 1e6 {
        return plain(x);
    }
    let text = format!("{x:.1}");
    text.strip_suffix(".0").unwrap_or(&text).to_owned()
}

/// A chance for a sentence: two digits, `less than 0.001` below.
pub fn chance(p: f64) -> String {
    if p < 0.001 {
        "less than 0.001".to_owned()
    } else if p < 0.1 {
        decimals(p, 3)
    } else {
        decimals(p, 2)
    }
}

/// `1 visit`, `3 visits`.
pub fn counted(n: u64, one: &str, many: &str) -> String {
    format!("{} {}", count(n), if n == 1 { one } else { many })
}

#[cfg(test)]
mod tests {
    use super::*;

    // Expected texts written by hand from the rules above.
    #[test]
    fn numbers_read_well() {
        assert_eq!(count(9999), "9999");
        assert_eq!(count(1_234_567), "1\u{202f}234\u{202f}567");
        assert_eq!(decimals(-0.0004, 2), "0.00");
        assert_eq!(decimals(-0.25, 2), "\u{2212}0.25");
        assert_eq!(percent(0.114), "11");
        assert_eq!(percent(0.0042), "0.4");
        assert_eq!(
            percent_with_interval(0.11, Some([0.06, 0.16])),
            "11 % (6 to 16)"
        );
        assert_eq!(
            percent_with_interval(0.02, Some([-0.01, 0.05])),
            "2.0 % (\u{2212}1.0 to 5.0)"
        );
        assert_eq!(size(8.44), "8.4");
        assert_eq!(size(38.4), "38");
        assert_eq!(size(12_345.0), "12\u{202f}300");
        assert_eq!(plain(0.123_456_789), "0.123457");
        assert_eq!(plain(-1500.0), "-1500");
        assert_eq!(plain(2.5e-9), "2.50000e-9");
        assert_eq!(year(2004.0), "2004");
        assert_eq!(year(2004.46), "2004.5");
        assert_eq!(chance(0.0001), "less than 0.001");
        assert_eq!(counted(1, "visit", "visits"), "1 visit");
    }

    #[test]
    fn extreme_numbers_stay_short() {
        for x in [f64::MAX, f64::MIN, 1e300, -1e12, 1e-300, f64::MIN_POSITIVE] {
            for text in [plain(x), decimals(x, 3), size(x), year(x), percent(x)] {
                assert!(text.chars().count() < 20, "{x}: {text}");
            }
        }
    }
}
