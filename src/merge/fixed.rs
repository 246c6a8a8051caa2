//! Terms as integers: why the same loci give the same bytes in any order.
//!
//! A term of one locus is rounded once, to a multiple of 2^-40, and from then on only integers are
//! added. Integer addition is associative and commutative, so batches, threads and shards cannot
//! change a digit. The rounding error of a sum over L loci is at most L x 2^-41, typically its
//! square root: below 1e-9 for a hundred million loci.

use crate::locus::Lane;

/// Bits behind the binary point of a term.
pub const FRACTION_BITS: u32 = 40;
/// Largest magnitude of a term; larger ones are held at this bound (no statistic of a locus with at
/// most [`crate::model::MAX_ALLELES`] alleles reaches it).
pub const LARGEST_TERM: f64 = 16384.0;
/// Loci after which `i64` batch sums are moved into `i128` totals: 2^(40 + 14 + 1 + 8) stays inside i64.
pub const BATCH_LOCI: u32 = 128;

/// A number whose last bit is 1.
const UNITS: f64 = (3u64 << 51) as f64;

/// The nearest multiple of 2^-40, as an integer count of them.
pub fn to_fixed(term: f64) -> i64 {
    debug_assert!(!term.is_nan());
    // Added to a number below 2^50, 3 x 2^51 leaves bits of the size of 1 only: the processor's own
    // rounding to even, without a call.
    if term.abs() < 1024.0 {
        let scaled = term * (1u64 << FRACTION_BITS) as f64 + UNITS;
        return scaled.to_bits().wrapping_sub(UNITS.to_bits()) as i64;
    }
    let scaled = term.clamp(-LARGEST_TERM, LARGEST_TERM) * (1u64 << FRACTION_BITS) as f64;
    scaled.round_ties_even() as i64
}

/// [`to_fixed`] of several terms at once.
pub fn lane_to_fixed(lane: &Lane) -> [i64; 8] {
    // No early end, so that the processor compares and converts several at a time.
    let small = lane
        .iter()
        .fold(true, |small, v| small & (v.abs() < 1024.0));
    if small {
        let scale = (1u64 << FRACTION_BITS) as f64;
        lane.map(|v| (v * scale + UNITS).to_bits().wrapping_sub(UNITS.to_bits()) as i64)
    } else {
        lane.map(to_fixed)
    }
}

/// The value of a sum of fixed-point terms.
pub fn from_fixed(sum: i128) -> f64 {
    sum as f64 / (1u64 << FRACTION_BITS) as f64
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn values_survive_to_the_last_bit_of_the_scale() {
        for value in [0.0, 1.0, -0.25, 1.0 / 3.0, 8191.25, -3e-12] {
            assert!((from_fixed(i128::from(to_fixed(value))) - value).abs() <= 0.5f64.powi(41));
        }
    }

    #[test]
    fn rounding_is_to_the_nearest_and_from_the_middle_to_even() {
        let unit = 0.5f64.powi(40);
        let tenths = (-50_000..50_000).map(|i| f64::from(i) * 0.1 * unit);
        let wide = (0..20_000).map(|i| f64::from(i) * 0.123_456_789 - 1100.0);
        let halves = (-40..40).map(|i| f64::from(i) * 0.5 * unit);
        for value in tenths.chain(wide).chain(halves) {
            let plain = (value / unit).round_ties_even() as i64;
            assert_eq!(to_fixed(value), plain, "{value}");
            assert_eq!(
                lane_to_fixed(&[0.5, value, 0.0, value, 1.0, 0.0, 0.0, 0.0])[1],
                plain
            );
        }
    }

    #[test]
    fn a_full_batch_of_the_largest_terms_fits() {
        let largest = i128::from(to_fixed(f64::INFINITY)) * i128::from(BATCH_LOCI) * 2;
        assert!(largest <= i128::from(i64::MAX));
    }
}
