//! Differentiation of samples at one locus, and the ratios that finish sums over loci.

mod gene_diversity;
mod variance_components;

pub use gene_diversity::{NeiDiversity, nei, nei_pair};
pub use variance_components::{Components, weir_cockerham, weir_cockerham_pair};

use std::ops::AddAssign;

use super::Counts;

/// Numerator and denominator of a ratio that is summed over loci before it is divided.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct RatioTerms {
    /// What is added above.
    pub numerator: f64,
    /// What is added below.
    pub denominator: f64,
}

impl RatioTerms {
    /// The ratio; `None` when the denominator is not above 0.
    pub fn ratio(&self) -> Option<f64> {
        ratio(self.numerator, self.denominator)
    }
}

impl AddAssign for RatioTerms {
    fn add_assign(&mut self, other: RatioTerms) {
        self.numerator += other.numerator;
        self.denominator += other.denominator;
    }
}

/// FST of Hudson, Slatkin & Maddison (1992, Genetics 132:583-589) with unbiased gene diversities,
/// any number of alleles: Hb - (H1+H2)/2 over Hb. With two alleles it is the form of Bhatia et al.
/// (2013, Genome Res 23:1514-1521). `None` when one sample has nobody typed.
pub fn hudson(first: &Counts, second: &Counts) -> Option<RatioTerms> {
    if first.typed == 0 || second.typed == 0 {
        return None;
    }
    let (n1, n2) = (
        u64::from(first.gene_copies()),
        u64::from(second.gene_copies()),
    );
    let alike: u64 = first
        .copies
        .iter()
        .zip(&second.copies)
        .map(|(&a, &b)| u64::from(a) * u64::from(b))
        .sum();
    let between = (n1 * n2 - alike) as f64 / (n1 * n2) as f64;
    let diversity1 = first.differing_pairs() as f64 / (n1 * (n1 - 1)) as f64;
    let diversity2 = second.differing_pairs() as f64 / (n2 * (n2 - 1)) as f64;
    let numerator = between - 0.5 * (diversity1 + diversity2);
    Some(RatioTerms {
        numerator,
        denominator: between,
    })
}

/// A ratio; `None` when the denominator is not above 0.
fn ratio(numerator: f64, denominator: f64) -> Option<f64> {
    (denominator > 0.0).then(|| numerator / denominator)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_cannot_be_compared_is_absent() {
        let none = Counts::empty(2);
        let one = Counts::of(2, [Some([0, 1])]);
        let two = Counts::of(2, [Some([0, 1]), Some([1, 1])]);
        assert_eq!(weir_cockerham(&[&none, &two]), None);
        assert_eq!(weir_cockerham(&[&one, &one]), None);
        assert_eq!(weir_cockerham(&[&none, &two, &none]), None);
        assert_eq!(weir_cockerham::<Counts>(&[]), None);
        assert_eq!(hudson(&none, &two), None);
        assert_eq!(nei(&[&none, &two]), None);
        assert_eq!(nei(&[&one, &one]), None);
    }

    #[test]
    fn a_fixed_locus_has_no_ratio() {
        for (n1, n2) in (2..120).zip([3, 7, 49, 50, 98].into_iter().cycle()) {
            for allele in [0, 1] {
                for alleles in [2, 3] {
                    let fixed = [n1, n2].map(|n| Counts::of(alleles, vec![Some([allele; 2]); n]));
                    let components = weir_cockerham(&fixed).unwrap();
                    assert_eq!(components, Components::default());
                    assert_eq!(components.theta(), None);
                    assert_eq!(hudson(&fixed[0], &fixed[1]).unwrap().ratio(), None);
                    assert_eq!(nei(&fixed).unwrap().gst_hedrick(), None);
                    let [first, second] = &fixed;
                    let three = nei(&[first, second, first]).unwrap();
                    assert_eq!((three.within, three.gst()), (0.0, None));
                }
            }
        }
    }
}
