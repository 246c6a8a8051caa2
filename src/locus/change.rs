//! Change of allele frequencies at one locus between two samples of one population.

use super::Counts;

/// What one locus adds to the temporal estimators; x and y are the frequencies of an allele in the
/// first and the later sample, z = (x+y)/2, and K the number of alleles with z > 0.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TemporalTerms {
    /// K, at least 2. The weight of the locus in means of `fc` and `fk` and of sample sizes is K-1.
    pub alleles: u32,
    /// Individuals typed in the first sample.
    pub first: u32,
    /// Individuals typed in the later sample.
    pub later: u32,
    /// Fc = 1/K sum (x-y)^2/(z - xy) (Nei & Tajima 1981, Genetics 98:625-640).
    pub fc: f64,
    /// Fk = 1/(K-1) sum (x-y)^2/z (Pollak 1983, Genetics 104:531-548).
    pub fk: f64,
    /// Sum of (x-y)^2, the numerator of Fs (Jorde & Ryman 2007, Genetics 177:927-935).
    pub fs_numerator: f64,
    /// Sum of z(1-z), the denominator of Fs.
    pub fs_denominator: f64,
}

impl TemporalTerms {
    /// Independent alleles: K-1.
    pub fn weight(&self) -> u32 {
        self.alleles - 1
    }
}

/// The terms of one locus. `None` when one sample has nobody typed or both show one and the same
/// allele only. Both samples list the same alleles.
pub fn temporal_terms(first: &Counts, later: &Counts) -> Option<TemporalTerms> {
    if first.typed == 0 || later.typed == 0 {
        return None;
    }
    // Divided by, not multiplied as a reciprocal: a fixed allele has exactly 1.
    let (all_first, all_later) = (
        f64::from(first.gene_copies()),
        f64::from(later.gene_copies()),
    );
    if let (&[_, first_copies], &[_, later_copies]) = (&first.copies[..], &later.copies[..]) {
        let frequencies = [
            f64::from(first_copies) / all_first,
            f64::from(later_copies) / all_later,
        ];
        return two_alleles([first.typed, later.typed], frequencies);
    }
    let mut alleles = 0;
    let (mut fc, mut fk, mut squares, mut spread) = (0.0, 0.0, 0.0, 0.0);
    for (&copies_first, &copies_later) in first.copies.iter().zip(&later.copies) {
        if copies_first == 0 && copies_later == 0 {
            continue;
        }
        if copies_first == first.gene_copies() && copies_later == later.gene_copies() {
            return None;
        }
        let (x, y) = (
            f64::from(copies_first) / all_first,
            f64::from(copies_later) / all_later,
        );
        let z = 0.5 * (x + y);
        let square = (x - y) * (x - y);
        alleles += 1;
        fc += square / (z - x * y);
        fk += square / z;
        squares += square;
        spread += z * (1.0 - z);
    }
    Some(TemporalTerms {
        alleles,
        first: first.typed,
        later: later.typed,
        fc: fc / f64::from(alleles),
        fk: fk / f64::from(alleles - 1),
        fs_numerator: squares,
        fs_denominator: spread,
    })
}

/// The terms of two alleles: (x-y)^2, z - xy and z(1-z) are the same for both, so each sum is one
/// term or twice one.
fn two_alleles([first, later]: [u32; 2], [x, y]: [f64; 2]) -> Option<TemporalTerms> {
    let z = 0.5 * (x + y);
    let spread = z * (1.0 - z);
    let square = (x - y) * (x - y);
    // Without spread both samples are fixed for the same allele.
    (spread > 0.0).then(|| TemporalTerms {
        alleles: 2,
        first,
        later,
        fc: square / (z - x * y),
        fk: square / spread,
        fs_numerator: 2.0 * square,
        fs_denominator: 2.0 * spread,
    })
}

/// Fa = 1/K sum (x-y)^2/(x(1-x)), measured on the first sample (Krimbas & Tsakas 1971, Evolution
/// 25:454-460). `None` when one sample has nobody typed, or an allele of the later sample is not in
/// the first, or the first has one allele only.
pub fn krimbas_tsakas(first: &Counts, later: &Counts) -> Option<f64> {
    if first.typed == 0 || later.typed == 0 {
        return None;
    }
    let mut alleles = 0;
    let mut sum = 0.0;
    for (&copies_first, &copies_later) in first.copies.iter().zip(&later.copies) {
        if copies_first == 0 && copies_later == 0 {
            continue;
        }
        if copies_first == 0 || copies_first == first.gene_copies() {
            return None;
        }
        let x = f64::from(copies_first) / f64::from(first.gene_copies());
        let y = f64::from(copies_later) / f64::from(later.gene_copies());
        alleles += 1;
        sum += (x - y) * (x - y) / (x * (1.0 - x));
    }
    (alleles > 0).then(|| sum / f64::from(alleles))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn sample(copies: &[u32]) -> Counts {
        let typed = copies.iter().sum::<u32>() / 2;
        Counts {
            typed,
            copies: copies.to_vec(),
            ..Counts::empty(copies.len())
        }
    }

    #[test]
    fn without_change_to_see_there_are_no_terms() {
        for n in 1..100 {
            let (fixed, other) = (Counts::of(2, vec![Some([1, 1]); n]), sample(&[0, 98]));
            assert_eq!(temporal_terms(&fixed, &other), None);
            let (fixed, other) = (Counts::of(3, vec![Some([1, 1]); n]), sample(&[0, 98, 0]));
            assert_eq!(temporal_terms(&fixed, &other), None);
        }
        let fixed = sample(&[8, 0]);
        assert_eq!(temporal_terms(&fixed, &sample(&[6, 0])), None);
        assert_eq!(temporal_terms(&fixed, &Counts::empty(2)), None);
        assert_eq!(krimbas_tsakas(&fixed, &sample(&[4, 2])), None);
    }

    #[test]
    fn a_complete_switch_is_the_largest_change() {
        let terms = temporal_terms(&sample(&[8, 0]), &sample(&[0, 6])).unwrap();
        // x = 1, y = 0, z = 1/2 for both alleles: Fc = 1/(1/2) = 2, Fk = 2 + 2 = 4, Fs = 2/(1/2).
        assert_eq!((terms.alleles, terms.fc, terms.fk), (2, 2.0, 4.0));
        assert_eq!((terms.fs_numerator, terms.fs_denominator), (2.0, 0.5));
    }
}
