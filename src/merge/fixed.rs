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

    /// Ten million loci of 50 individuals: expected heterozygosities are whole numbers of
    /// 2/(100 x 99), so their sum is known exactly.
    #[test]
    fn ten_million_loci_add_up_within_the_stated_error() {
        const LOCI: u64 = 10_000_000;
        let (mut sum, mut exact) = (0i128, 0u64);
        let mut state = 1u64;
        for _ in 0..LOCI {
            state = state
                .wrapping_mul(6_364_136_223_846_793_005)
                .wrapping_add(1);
            let copies = 1 + (state >> 33) % 99;
            let pairs_that_differ = copies * (100 - copies);
            sum += i128::from(to_fixed(2.0 * pairs_that_differ as f64 / 9900.0));
            exact += pairs_that_differ;
        }
        // In whole units of 2^-40 / 4950, so that the comparison itself rounds nothing.
        let difference = sum * 4950 - (i128::from(exact) << FRACTION_BITS);
        let most = i128::from(LOCI) * 4950 / 2;
        assert!(difference.abs() <= most, "{difference} of at most {most}");
        // Errors of rounding cancel for the most part.
        assert!(
            difference.abs() <= most / 100,
            "{difference} of at most {most}"
        );
    }
}
