//! The sample columns of a line of text.
#![expect(clippy::indexing_slicing, reason = "places were found in the same row")]

use memchr::{memchr, memchr_iter, memchr2};

use super::call::{Call, Flaw, Places, Row, UNUSED};

/// What is needed to read the genotypes of a record.
#[derive(Debug, Clone, Copy)]
pub(super) struct GenotypeRule {
    /// Which value of a sample column is GT, from 0.
    pub key: usize,
    /// Alleles the record lists, the reference included.
    pub alleles: u32,
    /// Whether a phasing sign may stand before the first allele (VCF 4.4 and later).
    pub prefix: bool,
}

/// Why a row cannot be used.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum RowFlaw {
    /// There are so many sample columns, which is not the number of the header.
    Columns(usize),
    /// The genotype of this column is at fault; its value begins at the byte given.
    Genotype {
        column: usize,
        at: usize,
        flaw: Flaw,
    },
}

/// Number of columns in a line or a part of it.
pub(super) fn count_columns(samples: &[u8]) -> usize {
    memchr_iter(b'\t', samples).count() + 1
}

/// Reads all columns; those in use go to `row`.
pub(super) fn scan_row(
    samples: &[u8],
    slots: &[u32],
    rule: GenotypeRule,
    row: &mut Row,
) -> Result<(), RowFlaw> {
    let wrong_count = || RowFlaw::Columns(count_columns(samples));
    let mut at = 0;
    for (column, &slot) in slots.iter().enumerate() {
        let (call, next) = match one_digit_pair(samples, at, rule) {
            Some(pair) => (pair, at + 3),
            None => any_genotype(samples, at, rule).map_err(|(at, flaw)| {
                // A column too few or too many is the better explanation.
                if count_columns(samples) == slots.len() {
                    RowFlaw::Genotype { column, at, flaw }
                } else {
                    wrong_count()
                }
            })?,
        };
        if slot != UNUSED {
            row.put(slot as usize, call);
        }
        let last = column + 1 == slots.len();
        let tab = match samples.get(next) {
            Some(b'\t') => Some(next),
            Some(_) => find_tab(samples, next),
            None => None,
        };
        match (tab, last) {
            (Some(tab), false) => at = tab + 1,
            (None, true) => {}
            _ => return Err(wrong_count()),
        }
    }
    Ok(())
}

/// Where the next tab stands, from `at` on.
///
/// Columns are short, most often: two words are looked at here before the vector search is called,
/// which takes longer to begin.
#[inline]
fn find_tab(samples: &[u8], at: usize) -> Option<usize> {
    const ONES: u64 = 0x0101_0101_0101_0101;
    const TABS: u64 = ONES * b'\t' as u64;
    let mut at = at;
    for _ in 0..2 {
        let Some(bytes) = samples.get(at..).and_then(|s| s.first_chunk::<8>()) else {
            break;
        };
        // A byte that was a tab is zero now, and the lowest zero byte is the lowest bit marked
        // (Warren 2013, Hacker's Delight, section 6-1).
        let word = u64::from_le_bytes(*bytes) ^ TABS;
        let marked = word.wrapping_sub(ONES) & !word & (ONES << 7);
        if marked != 0 {
            return Some(at + (marked.trailing_zeros() / 8) as usize);
        }
        at += 8;
    }
    memchr(b'\t', &samples[at..]).map(|i| at + i)
}

/// `d/d` or `d|d` with one-digit alleles that are listed, GT being the first key: the common case.
#[inline]
fn one_digit_pair(samples: &[u8], at: usize, rule: GenotypeRule) -> Option<Call> {
    let &[a, sign, b] = samples.get(at..)?.first_chunk::<3>()?;
    let ends = matches!(samples.get(at + 3), None | Some(b'\t' | b':'));
    let (a, b) = (
        u32::from(a.wrapping_sub(b'0')),
        u32::from(b.wrapping_sub(b'0')),
    );
    let listed = a.max(b) < rule.alleles.min(10);
    (rule.key == 0 && ends && listed && matches!(sign, b'/' | b'|'))
        .then_some(Call::Diploid(a as u16, b as u16))
}

/// Any genotype the standard allows, of the column that begins at `at`; with where its value ends.
/// A flaw comes with where the value begins.
fn any_genotype(
    samples: &[u8],
    at: usize,
    rule: GenotypeRule,
) -> Result<(Call, usize), (usize, Flaw)> {
    let mut start = at;
    for _ in 0..rule.key {
        match memchr2(b':', b'\t', &samples[start..]) {
            Some(i) if samples[start + i] == b':' => start += i + 1,
            // Values at the end of a column may be left out: GT is one of them.
            Some(i) => return Ok((Call::Missing, start + i)),
            None => return Ok((Call::Missing, samples.len())),
        }
    }
    read_genotype(&samples[start..], rule)
        .map(|(call, length)| (call, start + length))
        .map_err(|flaw| (start, flaw))
}

/// Reads a genotype that ends at a colon, a tab, or the end; with its length.
pub(super) fn read_genotype(value: &[u8], rule: GenotypeRule) -> Result<(Call, usize), Flaw> {
    let mut places = Places::default();
    let mut at = usize::from(rule.prefix && matches!(value.first(), Some(b'/' | b'|')));
    loop {
        match value.get(at) {
            Some(b'.') => {
                places.absent();
                at += 1;
            }
            Some(b'0'..=b'9') => {
                let mut allele: u32 = 0;
                while let Some(digit @ b'0'..=b'9') = value.get(at) {
                    allele = allele
                        .saturating_mul(10)
                        .saturating_add(u32::from(digit - b'0'));
                    at += 1;
                }
                if allele >= rule.alleles {
                    return Err(Flaw::Beyond(allele));
                }
                places.allele(allele as u16);
            }
            _ => return Err(Flaw::Malformed),
        }
        match value.get(at) {
            Some(b'/' | b'|') => at += 1,
            None | Some(b':' | b'\t') => return Ok((places.call(), at)),
            _ => return Err(Flaw::Malformed),
        }
    }
}

/// Reads a row of nothing but one-digit diploid genotypes of two alleles (`0/1`, `1|1`, `./.`) into
/// dosages by column, 3 where missing; false when any column is anything else, and `dosages` then
/// means nothing.
///
/// Four bytes a column and no branch, so that the compiler makes vector code of it.
pub(super) fn packed_row(samples: &[u8], columns: usize, dosages: &mut Vec<u8>) -> bool {
    if samples.len() + 1 != 4 * columns {
        return false;
    }
    let (cells, tail) = samples.as_chunks::<4>();
    let &[a, sign, b] = tail else { return false };
    dosages.clear();
    dosages.resize(columns, 0);
    let mut good = true;
    for (out, cell) in dosages.iter_mut().zip(cells) {
        let (dosage, fine) = packed_cell(u32::from_le_bytes(*cell));
        *out = dosage as u8;
        good &= fine;
    }
    let (dosage, fine) = packed_cell(u32::from_le_bytes([a, sign, b, b'\t']));
    dosages[columns - 1] = dosage as u8;
    good & fine
}

#[inline(always)]
fn packed_cell(word: u32) -> (u32, bool) {
    const ABSENT: u32 = u32::from_le_bytes([b'.', 0, b'.', 0]);
    const ALLELES: u32 = 0x00ff_00ff;
    let alleles = word & ALLELES;
    let digits = alleles ^ u32::from_le_bytes([b'0', 0, b'0', 0]);
    let called = digits & !0x0001_0001 == 0;
    let absent = alleles == ABSENT;
    let sign = (word >> 8) & 0xff;
    let framed =
        (word >> 24 == u32::from(b'\t')) & ((sign == u32::from(b'/')) | (sign == u32::from(b'|')));
    let dosage = if called {
        (digits & 1) + (digits >> 16)
    } else {
        3
    };
    (dosage, framed & (called | absent))
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]
        #[test]
        fn the_next_tab(bytes in proptest::collection::vec(prop_oneof![Just(b'\t'), 8u8..11, any::<u8>()], 1..40), at in 0usize..40) {
            let at = at.min(bytes.len());
            let plain = bytes[at..].iter().position(|&b| b == b'\t').map(|i| at + i);
            prop_assert_eq!(find_tab(&bytes, at), plain);
        }

        /// The vector way and the plain way, on rows that differ from the common ones in few bytes.
        #[test]
        fn packed_rows_are_plain_rows(
            cells in proptest::collection::vec(prop_oneof![
                8 => prop::sample::select(vec!["0/0", "0/1", "1|0", "1|1", "./.", ".|."]),
                1 => prop::sample::select(vec!["./1", "2/0", "0/", "0-1", "00", "0/1:", "1", "0/0/1"]),
            ], 1..40),
        ) {
            let row = cells.join("\t");
            let mut dosages = Vec::new();
            let packed = packed_row(row.as_bytes(), cells.len(), &mut dosages);
            let plain: Option<Vec<u8>> = cells.iter().map(|cell| match *cell {
                "0/0" => Some(0),
                "0/1" | "1|0" => Some(1),
                "1|1" => Some(2),
                "./." | ".|." => Some(3),
                _ => None,
            }).collect();
            prop_assert_eq!(packed, plain.is_some());
            if let Some(plain) = plain {
                prop_assert_eq!(dosages, plain);
            }
        }
    }

    #[test]
    fn genotypes_of_the_standard() {
        let rule = |prefix| GenotypeRule {
            key: 0,
            alleles: 12,
            prefix,
        };
        let read = |text: &str| read_genotype(text.as_bytes(), rule(false));
        // VCF 4.3, section 1.6.2.
        assert_eq!(read("0/1"), Ok((Call::Diploid(0, 1), 3)));
        assert_eq!(read("10|11:7"), Ok((Call::Diploid(10, 11), 5)));
        assert_eq!(read("1"), Ok((Call::Haploid, 1)));
        assert_eq!(read("0/0/1"), Ok((Call::Other, 5)));
        assert_eq!(read("./."), Ok((Call::Missing, 3)));
        assert_eq!(read(".\t0/0"), Ok((Call::Missing, 1)));
        assert_eq!(read("./1"), Ok((Call::Partly, 3)));
        assert_eq!(read("./1/."), Ok((Call::Other, 5)));
        assert_eq!(read("12/0"), Err(Flaw::Beyond(12)));
        for bad in [
            "", "/", "0/", "/1", "0//1", "0/|1", "a", "0/1 ", "0,1", "0.000", "-1/0", "+1",
        ] {
            assert_eq!(read(bad), Err(Flaw::Malformed), "{bad}");
        }
        // VCF 4.4, section 1.6.2.
        assert_eq!(
            read_genotype(b"/0|1", rule(true)),
            Ok((Call::Diploid(0, 1), 4))
        );
        assert_eq!(read_genotype(b"|1", rule(true)), Ok((Call::Haploid, 2)));
        assert_eq!(read_genotype(b"//1", rule(true)), Err(Flaw::Malformed));
    }
}
