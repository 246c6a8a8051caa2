//! Dense matrices and their product: small square operators against many rows, one row a locus.
//!
//! The fast products of the linear-algebra crates are reached through `unsafe`, which this crate
//! forbids. The one below keeps sixteen sums in registers, packs the right factor once per column
//! block and always adds in the same order, so the result does not depend on the processor.

/// A matrix in row-major order.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Matrix {
    /// Number of rows.
    pub rows: usize,
    /// Number of columns.
    pub columns: usize,
    /// `rows * columns` elements, row after row.
    pub data: Vec<f64>,
}

impl Matrix {
    /// A matrix of zeros.
    pub fn zeros(rows: usize, columns: usize) -> Self {
        Matrix {
            rows,
            columns,
            data: vec![0.0; rows * columns],
        }
    }

    /// A matrix from a function of row and column.
    pub fn from_fn(rows: usize, columns: usize, f: impl Fn(usize, usize) -> f64) -> Self {
        let mut m = Matrix::zeros(rows, columns);
        for i in 0..rows {
            for (j, v) in m.row_mut(i).iter_mut().enumerate() {
                *v = f(i, j);
            }
        }
        m
    }

    /// The identity of a given size.
    pub fn identity(size: usize) -> Self {
        Matrix::from_fn(size, size, |i, j| f64::from(i == j))
    }

    /// Row `i`.
    pub fn row(&self, i: usize) -> &[f64] {
        &self.data[i * self.columns..(i + 1) * self.columns]
    }

    /// Row `i`, to write.
    pub fn row_mut(&mut self, i: usize) -> &mut [f64] {
        &mut self.data[i * self.columns..(i + 1) * self.columns]
    }

    /// The transpose.
    pub fn transposed(&self) -> Self {
        Matrix::from_fn(self.columns, self.rows, |i, j| {
            self.data[j * self.columns + i]
        })
    }

    /// The product `self * right`; the inner sizes must agree.
    pub fn times(&self, right: &Matrix) -> Matrix {
        let mut out = Matrix::zeros(self.rows, right.columns);
        self.add_product(right, &mut out);
        out
    }

    /// Adds `self * right` to `out`; the sizes must agree.
    pub fn add_product(&self, right: &Matrix, out: &mut Matrix) {
        assert_eq!(self.columns, right.rows);
        assert_eq!((out.rows, out.columns), (self.rows, right.columns));
        let inner = self.columns;
        if inner == 0 || right.columns == 0 {
            return;
        }
        let mut packed: Vec<[f64; 4]> = vec![[0.0; 4]; inner];
        for start in (0..right.columns).step_by(4) {
            let width = (right.columns - start).min(4);
            for (k, p) in packed.iter_mut().enumerate() {
                *p = [0.0; 4];
                p[..width].copy_from_slice(&right.row(k)[start..start + width]);
            }
            let mut i = 0;
            while i + 4 <= self.rows {
                let rows = [
                    self.row(i),
                    self.row(i + 1),
                    self.row(i + 2),
                    self.row(i + 3),
                ];
                let sums = four_rows(rows, &packed);
                for (r, sum) in sums.iter().enumerate() {
                    add(&mut out.row_mut(i + r)[start..start + width], sum);
                }
                i += 4;
            }
            for i in i..self.rows {
                let row = self.row(i);
                let sums = four_rows([row; 4], &packed);
                add(&mut out.row_mut(i)[start..start + width], &sums[0]);
            }
        }
    }
}

fn add(out: &mut [f64], sum: &[f64; 4]) {
    for (o, s) in out.iter_mut().zip(sum) {
        *o += s;
    }
}

/// Four rows against four packed columns: the sixteen sums stay in registers.
fn four_rows([a, b, c, d]: [&[f64]; 4], packed: &[[f64; 4]]) -> [[f64; 4]; 4] {
    let mut sums = [[0.0f64; 4]; 4];
    for ((((p, &a), &b), &c), &d) in packed.iter().zip(a).zip(b).zip(c).zip(d) {
        for j in 0..4 {
            sums[0][j] += a * p[j];
            sums[1][j] += b * p[j];
            sums[2][j] += c * p[j];
            sums[3][j] += d * p[j];
        }
    }
    sums
}

/// Solves `matrix * x = right` by elimination with row exchange; `None` when singular.
pub fn solve(matrix: Matrix, right: Vec<f64>) -> Option<Vec<f64>> {
    let right = Matrix {
        rows: right.len(),
        columns: 1,
        data: right,
    };
    Some(solve_columns(matrix, right)?.data)
}

/// Solves `matrix * x = right` for all columns of `right` together; `None` when singular or where
/// the sizes do not agree.
pub fn solve_columns(mut matrix: Matrix, mut right: Matrix) -> Option<Matrix> {
    let (n, width) = (matrix.rows, right.columns);
    if matrix.columns != n || right.rows != n {
        return None;
    }
    for k in 0..n {
        let size = |i: usize| matrix.data[i * n + k].abs();
        let pivot = (k..n).max_by(|&i, &j| size(i).total_cmp(&size(j)))?;
        if !(size(pivot) > 0.0 && size(pivot).is_finite()) {
            return None;
        }
        swap_rows(&mut matrix, k, pivot);
        swap_rows(&mut right, k, pivot);
        let (above, below) = matrix.data.split_at_mut((k + 1) * n);
        let (right_above, right_below) = right.data.split_at_mut((k + 1) * width);
        let (row, right_row) = (&above[k * n..], &right_above[k * width..]);
        for (other, right_other) in below
            .chunks_exact_mut(n)
            .zip(right_below.chunks_exact_mut(width))
        {
            let factor = other[k] / row[k];
            if factor != 0.0 {
                subtract(&mut other[k..], &row[k..], factor);
                subtract(right_other, right_row, factor);
            }
        }
    }
    for k in (0..n).rev() {
        let (above, below) = right.data.split_at_mut((k + 1) * width);
        let row = &mut above[k * width..];
        for (factor, solved) in matrix.row(k)[k + 1..].iter().zip(below.chunks_exact(width)) {
            if *factor != 0.0 {
                subtract(row, solved, *factor);
            }
        }
        for v in row {
            *v /= matrix.row(k)[k];
        }
    }
    Some(right)
}

fn swap_rows(matrix: &mut Matrix, i: usize, j: usize) {
    if i != j {
        for k in 0..matrix.columns {
            matrix
                .data
                .swap(i * matrix.columns + k, j * matrix.columns + k);
        }
    }
}

fn subtract(from: &mut [f64], row: &[f64], factor: f64) {
    for (f, r) in from.iter_mut().zip(row) {
        *f -= factor * r;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Plain triple loop beside the fast product.
    fn plain(a: &Matrix, b: &Matrix) -> Matrix {
        Matrix::from_fn(a.rows, b.columns, |i, j| {
            (0..a.columns).map(|k| a.row(i)[k] * b.row(k)[j]).sum()
        })
    }

    #[test]
    fn product_equals_the_plain_one_for_every_remainder() {
        for rows in 1..7 {
            for columns in 1..7 {
                let a = Matrix::from_fn(rows, 5, |i, j| (i * 7 + j * 3) as f64 - 9.5);
                let b = Matrix::from_fn(5, columns, |i, j| 1.0 / (1 + i + 2 * j) as f64);
                let (fast, slow) = (a.times(&b), plain(&a, &b));
                for (x, y) in fast.data.iter().zip(&slow.data) {
                    assert!((x - y).abs() < 1e-12, "{x} {y}");
                }
            }
        }
    }

    #[test]
    fn solve_undoes_a_product() {
        let a = Matrix::from_fn(
            4,
            4,
            |i, j| if i == j { 0.0 } else { (1 + i * i + j) as f64 },
        );
        let x = [1.0, -2.0, 0.5, 3.0];
        let right = (0..4)
            .map(|i| a.row(i).iter().zip(&x).map(|(m, v)| m * v).sum())
            .collect();
        let solved = solve(a, right).expect("regular");
        for (s, v) in solved.iter().zip(&x) {
            assert!((s - v).abs() < 1e-12);
        }
        assert_eq!(solve(Matrix::zeros(2, 2), vec![1.0, 1.0]), None);
    }
}
