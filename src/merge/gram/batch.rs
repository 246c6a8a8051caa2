//! Batches of loci: rounding to integers and the matrix product.

use ndarray::linalg::general_mat_mul;
use ndarray::{Array2, ArrayView2, ArrayViewMut1, Axis, Slice};

use super::{BinSums, ContigSums, LocusRows, squared_length};

/// Rows of a batch. A million loci of 100 individuals took 1.4 to 2.1 s of one core with 128 rows and
/// 0.7 to 1.2 s with 256 and with 512 (complete data; shared two-core machine, three runs each).
pub(super) const BATCH_ROWS: usize = 256;
/// Vectors are rounded to multiples of 2^-22, so that a batch fills 52 of the 53 bits of f64.
pub(super) const VECTOR_BITS: i32 = 22;
/// Weights b and h are rounded to multiples of 2^-43.
pub(super) const WEIGHT_BITS: i32 = 43;
/// Terms of p and q are rounded to multiples of 2^-60.
pub(super) const TERM_BITS: i32 = 60;

/// Rows that wait for their matrix product, by set of cutoffs, all of one contig.
#[derive(Debug, Clone, Default)]
pub(super) struct Workbench {
    individuals: usize,
    contig: Option<u64>,
    batches: [Option<Box<Batch>>; 8],
    product: Array2<f64>,
    absent: Vec<usize>,
}

impl Workbench {
    pub(super) fn new(individuals: usize) -> Self {
        Workbench {
            individuals,
            contig: None,
            batches: Default::default(),
            product: Array2::zeros((individuals, individuals)),
            absent: Vec::new(),
        }
    }

    /// The contig of the waiting rows.
    pub(super) fn contig(&self) -> Option<u64> {
        self.contig
    }

    /// Says of which contig the next rows are. Nothing may wait.
    pub(super) fn set_contig(&mut self, contig: u64) {
        self.contig = Some(contig);
    }

    /// Adds a locus; full batches go into `sums` at once.
    pub(super) fn add(&mut self, mask: u8, locus: &LocusRows<'_>, sums: &mut BinSums) {
        let batch = self.batches[mask as usize]
            .get_or_insert_with(|| Box::new(Batch::new(self.individuals)));
        let own = batch.add_vectors(locus, sums, &mut self.product);
        sums.add_locus(locus.counts.typed as usize, locus.weight(), own);
        if locus.counts.typed as usize != self.individuals {
            self.absent.clear();
            self.absent.extend(locus.absent());
            sums.missing_mut(self.individuals).add(locus, &self.absent);
        }
    }

    /// Empties every batch into the sums of the contig.
    pub(super) fn flush(&mut self, sums: &mut ContigSums) {
        for (mask, batch) in self.batches.iter_mut().enumerate() {
            if let Some(batch) = batch.as_mut().filter(|batch| batch.waits()) {
                let bin = sums.bin_mut(mask as u8, self.individuals);
                batch.flush_vectors(bin, &mut self.product);
            }
        }
    }
}

/// Waiting rows of one set of cutoffs.
#[derive(Debug, Clone)]
struct Batch {
    /// rows x individuals, integers.
    vectors: Array2<f64>,
    vector_rows: usize,
}

impl Batch {
    fn new(individuals: usize) -> Self {
        Batch {
            vectors: Array2::zeros((BATCH_ROWS, individuals)),
            vector_rows: 0,
        }
    }

    fn waits(&self) -> bool {
        self.vector_rows > 0
    }

    /// Adds the rows of a locus. Returns its squared correlation with itself, which sums over all
    /// pairs contain and pairs of different loci must not: the sum over pairs of rows of the
    /// squared product, in units of 2^(-4 [`VECTOR_BITS`]).
    fn add_vectors(
        &mut self,
        locus: &LocusRows<'_>,
        sums: &mut BinSums,
        product: &mut Array2<f64>,
    ) -> i128 {
        if let [allele] = locus.alleles {
            let row = self.next_vector_row(sums, product);
            let length = fill_row(locus, *allele, self.vectors.row_mut(row));
            return i128::from(length) * i128::from(length);
        }
        let mut own = 0;
        let mut rows: Vec<Vec<i64>> = Vec::with_capacity(locus.alleles.len());
        for &allele in locus.alleles {
            let row = self.next_vector_row(sums, product);
            let length = fill_row(locus, allele, self.vectors.row_mut(row));
            own += i128::from(length) * i128::from(length);
            let filled: Vec<i64> = self.vectors.row(row).iter().map(|&v| v as i64).collect();
            for earlier in &rows {
                let r: i64 = earlier.iter().zip(&filled).map(|(x, y)| x * y).sum();
                own += 2 * i128::from(r) * i128::from(r);
            }
            rows.push(filled);
        }
        own
    }

    fn next_vector_row(&mut self, sums: &mut BinSums, product: &mut Array2<f64>) -> usize {
        if self.vector_rows == BATCH_ROWS {
            self.flush_vectors(sums, product);
        }
        self.vector_rows += 1;
        self.vector_rows - 1
    }

    fn flush_vectors(&mut self, sums: &mut BinSums, product: &mut Array2<f64>) {
        if self.vector_rows > 0 {
            let rows = first_rows(&self.vectors, self.vector_rows);
            general_mat_mul(1.0, &rows.t(), &rows, 0.0, product);
            sums.add_vectors(product.view(), self.vector_rows as u64);
            self.vector_rows = 0;
        }
    }
}

/// What a locus of n typed individuals adds to the sums that know only who was typed, times its
/// weight: a = 1/(n-1), b = a/n, h = a (1 - 2/n).
pub(super) struct LocusWeights {
    pub(super) a: f64,
    pub(super) b: f64,
    pub(super) h: f64,
}

impl LocusWeights {
    pub(super) fn of(typed: u32, weight: u64) -> Self {
        let n = f64::from(typed);
        let a = weight as f64 / (n - 1.0);
        LocusWeights {
            a,
            b: a / n,
            h: a * (1.0 - 2.0 / n),
        }
    }
}

/// Writes the rounded vector of an allele and returns its exact squared length, in units of
/// 2^(-2 [`VECTOR_BITS`]).
fn fill_row(locus: &LocusRows<'_>, allele: u16, mut row: ArrayViewMut1<'_, f64>) -> i64 {
    let n = f64::from(locus.counts.typed);
    let copies = f64::from(locus.counts.copies[allele as usize]);
    let length = (n * squared_length(locus.counts, allele) as f64).sqrt();
    let scale = power_of_two(VECTOR_BITS) * locus.row_weight().sqrt();
    let rounded = |x: f64| ((n * x - copies) / length * scale).round();
    // By dosage of the allele; the last is a missing genotype.
    let values = [rounded(0.0), rounded(1.0), rounded(2.0), 0.0];
    if locus.genotypes.is_biallelic() {
        let dosages = &locus.genotypes.dosages()[locus.slots.clone()];
        // Allele 0 has dosage 2 - x: the opposite sign, the same products.
        let values = if allele == 0 {
            [values[2], values[1], values[0], 0.0]
        } else {
            values
        };
        for (cell, &dosage) in row.iter_mut().zip(dosages) {
            *cell = values[usize::from(dosage & 3)];
        }
    } else {
        for (cell, slot) in row.iter_mut().zip(locus.slots.clone()) {
            *cell = match locus.genotypes.pair(slot) {
                Some(pair) => values[pair.iter().filter(|&&code| code == allele).count()],
                None => 0.0,
            };
        }
    }
    row.iter().map(|&v| (v as i64) * (v as i64)).sum()
}

fn first_rows(matrix: &Array2<f64>, rows: usize) -> ArrayView2<'_, f64> {
    matrix.slice_axis(Axis(0), Slice::from(..rows))
}

/// 2^bits, exactly, for exponents of normal numbers.
pub(super) fn power_of_two(bits: i32) -> f64 {
    f64::from_bits(((1023 + bits) as u64) << 52)
}

/// A finished matrix product.
pub(super) type Product<'a> = ArrayView2<'a, f64>;
