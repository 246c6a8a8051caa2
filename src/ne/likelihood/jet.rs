//! Values of many columns with their first and second slopes along every drift rate.

use crate::ne::matrix::Matrix;

/// A column whose scaled likelihood falls below this no longer pulls at the estimate: such a change
/// is not drift at this size, and rounding would be all that is left of it.
const FLOOR: f64 = 1e-13;

/// A value per locus with slopes along every drift rate: matrices of one row a column of counts.
#[derive(Clone)]
pub(super) struct Jet {
    pub value: Matrix,
    first: Vec<Option<Matrix>>,
    second: Vec<Option<Matrix>>,
}

/// Place of the pair (p, q), p <= q, in a list of all pairs of `rates` drift rates.
pub(super) fn pair(rates: usize, p: usize, q: usize) -> usize {
    let (p, q) = (p.min(q), p.max(q));
    p * rates - p * (p + 1) / 2 + q
}

/// Number of pairs.
pub(super) fn pairs(rates: usize) -> usize {
    rates * (rates + 1) / 2
}

impl Jet {
    pub(super) fn constant(value: Matrix, rates: usize) -> Self {
        Jet {
            value,
            first: vec![None; rates],
            second: vec![None; pairs(rates)],
        }
    }

    fn matrices(&mut self) -> impl Iterator<Item = &mut Matrix> {
        std::iter::once(&mut self.value)
            .chain(self.first.iter_mut().flatten())
            .chain(self.second.iter_mut().flatten())
    }

    /// Multiplies each row by a likelihood, element by element.
    pub(super) fn weigh<'a>(&mut self, likelihood: impl Fn(usize) -> &'a [f64]) {
        for matrix in self.matrices() {
            for i in 0..matrix.rows {
                for (v, l) in matrix.row_mut(i).iter_mut().zip(likelihood(i)) {
                    *v *= l;
                }
            }
        }
    }

    /// Applies a drift matrix that depends on rate `p`; product rule for the slopes.
    pub(super) fn drift(&self, [m, m1, m2]: &[Matrix; 3], p: usize, slopes: bool) -> Jet {
        let rates = self.first.len();
        let mut out = Jet::constant(self.value.times(m), rates);
        if !slopes {
            return out;
        }
        let add = |target: &mut Option<Matrix>, left: &Matrix, right: &Matrix| match target {
            Some(t) => left.add_product(right, t),
            None => *target = Some(left.times(right)),
        };
        for q in 0..rates {
            if let Some(f) = &self.first[q] {
                add(&mut out.first[q], f, m);
            }
            for r in q..rates {
                let target = &mut out.second[pair(rates, q, r)];
                if let Some(s) = &self.second[pair(rates, q, r)] {
                    add(target, s, m);
                }
                if let (true, Some(f)) = (q == p, &self.first[r]) {
                    add(target, f, m1);
                }
                if let (true, Some(f)) = (r == p, &self.first[q]) {
                    add(target, f, m1);
                }
            }
        }
        add(&mut out.first[p], &self.value, m1);
        add(&mut out.second[pair(rates, p, p)], &self.value, m2);
        out
    }

    /// Product, element by element, with the product rule for the slopes.
    pub(super) fn times(&self, other: &Jet) -> Jet {
        let rates = self.first.len();
        let product = |a: &Option<Matrix>, b: &Matrix, out: &mut Option<Matrix>| {
            if let Some(a) = a {
                let out = out.get_or_insert_with(|| Matrix::zeros(b.rows, b.columns));
                for ((o, a), b) in out.data.iter_mut().zip(&a.data).zip(&b.data) {
                    *o += a * b;
                }
            }
        };
        let mut value = self.value.clone();
        for (v, o) in value.data.iter_mut().zip(&other.value.data) {
            *v *= o;
        }
        let mut out = Jet::constant(value, rates);
        for p in 0..rates {
            product(&self.first[p], &other.value, &mut out.first[p]);
            product(&other.first[p], &self.value, &mut out.first[p]);
            for q in p..rates {
                let k = pair(rates, p, q);
                product(&self.second[k], &other.value, &mut out.second[k]);
                product(&other.second[k], &self.value, &mut out.second[k]);
                for (a, b) in [(p, q), (q, p)] {
                    if let Some(b) = &other.first[b] {
                        product(&self.first[a], b, &mut out.second[k]);
                    }
                }
            }
        }
        out
    }

    fn first_row(&self, p: usize, i: usize) -> Option<&[f64]> {
        self.first[p].as_ref().map(|m| m.row(i))
    }

    fn second_row(&self, p: usize, q: usize, i: usize) -> Option<&[f64]> {
        self.second[pair(self.first.len(), p, q)]
            .as_ref()
            .map(|m| m.row(i))
    }
}

/// Integrals of one row of a jet.
pub(super) struct Sums {
    value: f64,
    first: Vec<f64>,
    second: Vec<f64>,
}

impl Sums {
    pub(super) fn of(jet: &Jet, row: usize, weights: &[f64], slopes: bool) -> Self {
        let dot =
            |r: Option<&[f64]>| r.map_or(0.0, |r| r.iter().zip(weights).map(|(a, b)| a * b).sum());
        let value = dot(Some(jet.value.row(row)));
        let rates = if slopes { jet.first.len() } else { 0 };
        let first = (0..rates).map(|p| dot(jet.first_row(p, row))).collect();
        let second = (0..rates)
            .flat_map(|p| (p..rates).map(move |q| (p, q)))
            .map(|(p, q)| dot(jet.second_row(p, q, row)))
            .collect();
        Sums {
            value,
            first,
            second,
        }
    }

    /// Logarithm of the value.
    pub(super) fn log_value(&self) -> f64 {
        (self.value + FLOOR).ln()
    }

    /// Slopes and curvatures of the logarithm.
    pub(super) fn log_slopes(&self, rates: usize) -> Vec<f64> {
        let scale = 1.0 / (self.value + FLOOR);
        let mut out: Vec<f64> = self.first.iter().map(|f| f * scale).collect();
        for p in 0..rates {
            for q in p..rates {
                out.push(self.second[pair(rates, p, q)] * scale - out[p] * out[q]);
            }
        }
        out
    }
}
