//! Single fields of the sheet to values, each with its complaint and cure.
#![expect(clippy::indexing_slicing, reason = "the month was checked first")]

use crate::model::Sex;

/// A field that cannot be used: what is wrong, and what to do.
pub(super) type Complaint = (String, &'static str);

/// Earliest and latest year accepted. Wide enough for ancient remains and simulations; what is
/// beyond is a slip of the pen or a serial day number of a spreadsheet.
const YEARS: std::ops::RangeInclusive<f64> = -100_000.0..=9_999.0;

/// A calendar year, possibly fractional.
pub(super) fn year(text: &str) -> Result<f64, Complaint> {
    match text.parse::<f64>() {
        Ok(year) if YEARS.contains(&year) => Ok(year),
        Ok(_) => Err((
            format!("year '{text}' is no calendar year"),
            "write four digits, such as 2019; day numbers of a spreadsheet must become years first",
        )),
        Err(_) => {
            let cure = if text.parse_with_decimal_comma() {
                "write the decimal mark as a dot"
            } else if text.contains(['-', '/']) || text.matches('.').count() > 1 {
                "write the year alone, or give dates as 2019-05-03 in a column named 'date'"
            } else {
                "write the calendar year in digits, such as 2019"
            };
            Err((format!("year '{text}' is not a number"), cure))
        }
    }
}

trait DecimalComma {
    fn parse_with_decimal_comma(&self) -> bool;
}

impl DecimalComma for str {
    fn parse_with_decimal_comma(&self) -> bool {
        self.contains(',') && self.replacen(',', ".", 1).parse::<f64>().is_ok()
    }
}

/// A day of the Gregorian calendar as a calendar year and as a fractional year.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Day {
    /// The calendar year.
    pub calendar_year: i32,
    /// The year plus the share of it that has passed at the start of the day.
    pub year: f64,
}

/// A date written as in ISO 8601, `2019-05-03`.
pub(super) fn date(text: &str) -> Result<Day, Complaint> {
    let complaint = || {
        (
            format!("date '{text}' is no day of the calendar"),
            "write it as 2019-05-03; if only the year is known, use a column 'year'",
        )
    };
    let parts: Vec<&str> = text.split('-').collect();
    let [year, month, day] = parts[..] else {
        return Err(complaint());
    };
    let digits = |part: &str, count: usize| {
        (part.len() == count && part.bytes().all(|b| b.is_ascii_digit()))
            .then(|| part.parse::<i32>().ok())
            .flatten()
    };
    let (Some(year), Some(month), Some(day)) = (digits(year, 4), digits(month, 2), digits(day, 2))
    else {
        return Err(complaint());
    };
    let leap = i32::from(year % 4 == 0 && (year % 100 != 0 || year % 400 == 0));
    let lengths = [31, 28 + leap, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31];
    if !(1..=12).contains(&month) || !(1..=lengths[month as usize - 1]).contains(&day) {
        return Err(complaint());
    }
    let passed = lengths[..month as usize - 1].iter().sum::<i32>() + day - 1;
    let fraction = f64::from(passed) / f64::from(365 + leap);
    Ok(Day {
        calendar_year: year,
        year: f64::from(year) + fraction,
    })
}

/// A sex; `None` when it is not known.
pub(super) fn sex(text: &str) -> Result<Option<Sex>, Complaint> {
    match text.to_lowercase().as_str() {
        "f" | "female" => Ok(Some(Sex::Female)),
        "m" | "male" => Ok(Some(Sex::Male)),
        "" | "u" | "unknown" => Ok(None),
        _ => Err((
            format!("sex '{text}' is not known"),
            "write F or M, or leave it blank",
        )),
    }
}

/// Whether a row takes part.
pub(super) fn used(text: &str) -> Result<bool, Complaint> {
    match text.to_lowercase().as_str() {
        "yes" | "y" | "true" | "1" => Ok(true),
        "no" | "n" | "false" | "0" => Ok(false),
        _ => Err((
            format!("use '{text}' is neither yes nor no"),
            "write yes or no, or leave it blank for yes",
        )),
    }
}

/// A generation, counted from any origin: 0 or more.
pub(super) fn generation(text: &str) -> Result<f64, Complaint> {
    match text.parse::<f64>() {
        Ok(generation) if generation.is_finite() && generation >= 0.0 => Ok(generation),
        _ => Err((
            format!("generation '{text}' is not a number of 0 or more"),
            "write 0 for the founders, 1 for their offspring and so on, or leave it blank",
        )),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn years_are_numbers_and_the_cure_fits_the_slip() {
        assert_eq!(year("2019"), Ok(2019.0));
        assert_eq!(year("-350.5"), Ok(-350.5));
        let cases = [
            ("2019,5", "dot"),
            ("2019-05-03", "'date'"),
            ("3.5.2019", "'date'"),
            ("now", "digits"),
        ];
        for (text, word) in cases {
            assert!(year(text).unwrap_err().1.contains(word), "{text}");
        }
        for text in ["NaN", "inf", "43588"] {
            assert!(year(text).is_err(), "{text}");
        }
    }

    // Day numbers within the year: any almanac. 3 May is day 123 of a common year, 124 of a leap year.
    #[test]
    fn dates_become_fractional_years() {
        let day = date("2019-05-03").unwrap();
        assert_eq!(day.calendar_year, 2019);
        assert_eq!(day.year, 2019.0 + 122.0 / 365.0);
        assert_eq!(date("2020-05-03").unwrap().year, 2020.0 + 123.0 / 366.0);
        assert_eq!(date("2000-02-29").unwrap().year, 2000.0 + 59.0 / 366.0);
        assert_eq!(date("2019-01-01").unwrap().year, 2019.0);
    }

    #[test]
    fn days_that_do_not_exist_are_refused() {
        for text in [
            "2019-02-29",
            "1900-02-29",
            "2019-13-01",
            "2019-00-10",
            "2019-4-1",
            "03.05.2019",
            "2019",
        ] {
            assert!(date(text).is_err(), "{text}");
        }
    }

    #[test]
    fn sexes_and_generations() {
        assert_eq!(sex("Female"), Ok(Some(Sex::Female)));
        assert_eq!(sex("m"), Ok(Some(Sex::Male)));
        assert_eq!(sex("Unknown"), Ok(None));
        assert!(sex("1").is_err());
        assert_eq!(generation("2.5"), Ok(2.5));
        for text in ["F1", "-1", "nan"] {
            assert!(generation(text).is_err(), "{text}");
        }
    }
}
