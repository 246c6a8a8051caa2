//! Allelic richness and private alleles at equal sample sizes, by rarefaction of gene copies.

use std::borrow::Borrow;

use super::Counts;

/// Probabilities kept in all rows together: 32 MB of them. Beyond, all rows are dropped and begun
/// anew; a row depends on nothing but its own sample size, so no result changes.
const ROW_BUDGET: usize = 4_000_000;

/// Below this the chance to miss an allele is taken as none: far under the last digit of 1 - Q, and
/// it keeps a row at about 46 N/g entries instead of N.
const NEGLIGIBLE: f64 = 1e-20;

/// Chances that g gene copies miss an allele, for one fixed g and any sample size:
/// Q(N, k) = C(N-k, g)/C(N, g) for k copies among N (Hurlbert 1971, Ecology 52:577-586).
///
/// Rows are made when first asked for. One table serves all strata and loci of a thread.
#[derive(Debug, Clone)]
pub struct Rarefaction {
    gene_copies: u32,
    /// By number of typed individuals; entry k is Q(2n, k), 0 beyond the last.
    rows: Vec<Option<Box<[f64]>>>,
    kept: usize,
    budget: usize,
    products: Vec<f64>,
}

impl Rarefaction {
    /// A table for samples of `gene_copies` gene copies (g).
    pub fn new(gene_copies: u32) -> Self {
        Rarefaction {
            gene_copies,
            rows: Vec::new(),
            kept: 0,
            budget: ROW_BUDGET,
            products: vec![],
        }
    }

    /// The g of this table.
    pub fn gene_copies(&self) -> u32 {
        self.gene_copies
    }

    /// Makes the rows of all samples; `None` if one of them has fewer than g gene copies.
    ///
    /// Rows are dropped before the first is made, never between, so those of one call are all there.
    fn prepare<C: Borrow<Counts>>(&mut self, samples: &[C]) -> Option<()> {
        self.drop_beyond_budget();
        for sample in samples {
            let typed = sample.borrow().typed as usize;
            if sample.borrow().gene_copies() < self.gene_copies {
                return None;
            }
            self.prepare_row(typed);
        }
        Some(())
    }

    /// Q of an allele of `copies` copies in a prepared sample.
    /// For each allele of a locus with two, the chance that the fixed number of gene copies, drawn from
    /// `typed` individuals with these copies, holds none of it; `None` when fewer are typed.
    pub fn absences(&mut self, typed: u32, copies: [u32; 2]) -> Option<[f64; 2]> {
        if 2 * typed < self.gene_copies {
            return None;
        }
        self.drop_beyond_budget();
        self.prepare_row(typed as usize);
        Some(copies.map(|c| self.absent(typed, c)))
    }

    fn drop_beyond_budget(&mut self) {
        if self.kept > self.budget {
            self.rows.clear();
            self.kept = 0;
        }
    }

    fn prepare_row(&mut self, typed: usize) {
        if self.rows.len() <= typed {
            self.rows.resize(typed + 1, None);
        }
        if self.rows[typed].is_none() {
            let row = row(2 * typed, self.gene_copies as usize);
            self.kept += row.len();
            self.rows[typed] = Some(row);
        }
    }

    fn absent(&self, typed: u32, copies: u32) -> f64 {
        self.rows[typed as usize]
            .as_deref()
            .and_then(|row| row.get(copies as usize).copied())
            .unwrap_or(0.0)
    }
}

/// Q(N, k) for k = 0.. until negligible, by Q(N, k+1) = Q(N, k) (N-k-g)/(N-k).
fn row(all: usize, drawn: usize) -> Box<[f64]> {
    let mut row = Vec::new();
    let mut absent = 1.0;
    for copies in 0..=all {
        if absent < NEGLIGIBLE {
            break;
        }
        row.push(absent);
        let left = all - copies;
        if left <= drawn {
            break;
        }
        absent *= (left - drawn) as f64 / left as f64;
    }
    row.into_boxed_slice()
}

/// Chance that g gene copies drawn from this sample miss the allele (Kalinowski 2004, Conserv Genet
/// 5:539-543). `None` when fewer than g copies are typed.
pub fn absence(counts: &Counts, allele: usize, table: &mut Rarefaction) -> Option<f64> {
    table.prepare(&[counts])?;
    Some(table.absent(counts.typed, counts.copies[allele]))
}

/// Rarefied allelic richness A(g): expected number of alleles among g gene copies (El Mousadik &
/// Petit 1996, Theor Appl Genet 92:832-839). `None` when fewer than g copies are typed.
pub fn richness(counts: &Counts, table: &mut Rarefaction) -> Option<f64> {
    table.prepare(&[counts])?;
    let row = table.rows[counts.typed as usize].as_deref()?;
    let mut alleles = 0.0;
    for &copies in counts.copies.iter().filter(|&&copies| copies > 0) {
        alleles += 1.0 - row.get(copies as usize).copied().unwrap_or(0.0);
    }
    Some(alleles)
}

/// Rarefied private richness of sample `j`: expected number of alleles among g of its gene copies
/// that are in none of g copies of each other sample (Kalinowski 2004). It depends on the set.
///
/// All samples list the same alleles. `None` when one of them has fewer than g copies typed.
pub fn private_richness<C: Borrow<Counts>>(
    j: usize,
    samples: &[C],
    table: &mut Rarefaction,
) -> Option<f64> {
    table.prepare(samples)?;
    let own = samples[j].borrow();
    let mut alleles = 0.0;
    for (allele, &copies) in own
        .copies
        .iter()
        .enumerate()
        .filter(|&(_, &copies)| copies > 0)
    {
        let mut chance = 1.0 - table.absent(own.typed, copies);
        for (k, other) in samples.iter().enumerate() {
            if k != j {
                let other = other.borrow();
                chance *= table.absent(other.typed, other.copies[allele]);
            }
        }
        alleles += chance;
    }
    Some(alleles)
}

/// [`private_richness`] of every sample at once, added to `sums` in their order; `None`, with
/// nothing added, when one sample has fewer than g copies typed. Linear in the number of samples.
pub fn add_private_richness<C: Borrow<Counts>>(
    samples: &[C],
    table: &mut Rarefaction,
    sums: &mut [f64],
) -> Option<()> {
    table.prepare(samples)?;
    let alleles = samples
        .first()
        .map_or(0, |first| first.borrow().copies.len());
    let mut before = std::mem::take(&mut table.products);
    for allele in 0..alleles {
        before.clear();
        let mut product = 1.0;
        for sample in samples {
            before.push(product);
            let sample = sample.borrow();
            product *= table.absent(sample.typed, sample.copies[allele]);
        }
        let mut after = 1.0;
        for (j, sample) in samples.iter().enumerate().rev() {
            let sample = sample.borrow();
            let absent = table.absent(sample.typed, sample.copies[allele]);
            sums[j] += (1.0 - absent) * before[j] * after;
            after *= absent;
        }
    }
    table.products = before;
    Some(())
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
    fn too_few_copies_are_absent() {
        let mut table = Rarefaction::new(6);
        assert_eq!(richness(&sample(&[3, 1]), &mut table), None);
        assert_eq!(
            private_richness(0, &[sample(&[3, 3]), sample(&[2, 2])], &mut table),
            None
        );
        assert_eq!(richness(&sample(&[4, 2]), &mut table), Some(2.0));
    }

    #[test]
    fn a_full_table_changes_nothing() {
        let mut small = Rarefaction {
            budget: 3,
            ..Rarefaction::new(4)
        };
        let mut large = Rarefaction::new(4);
        for copies in [[5, 3, 2], [4, 4, 0], [9, 2, 1], [5, 3, 2], [11, 1, 8]] {
            let pair = [sample(&copies), sample(&[4, 3, 3])];
            assert_eq!(
                richness(&pair[0], &mut small),
                richness(&pair[0], &mut large)
            );
            assert_eq!(
                private_richness(1, &pair, &mut small),
                private_richness(1, &pair, &mut large)
            );
            assert!(small.kept <= 3 + 2 * 20);
        }
    }

    #[test]
    fn all_at_once_is_one_by_one() {
        let set = [
            sample(&[3, 4, 3, 0]),
            sample(&[0, 2, 4, 0]),
            sample(&[5, 3, 0, 4]),
        ];
        let mut table = Rarefaction::new(6);
        let mut sums = [0.0; 3];
        add_private_richness(&set, &mut table, &mut sums).unwrap();
        for (j, sum) in sums.iter().enumerate() {
            let one = private_richness(j, &set, &mut table).unwrap();
            assert!((sum - one).abs() < 1e-15, "{sum} {one}");
        }
    }
}
