//! Drift as a matrix: the Wright-Fisher diffusion, and the exact chain, on the same few nodes.
//!
//! A function of an allele frequency is held by its values at 0, at the Gauss-Jacobi nodes of the
//! weight x(1-x), and at 1. Drift over an interval carries the chance of the later samples back to
//! the earlier frequency, and that is one small matrix for all loci. Between the ends the
//! eigenfunctions of the diffusion are x(1-x) times the Jacobi polynomials P_k^(1,1)(2x-1), with
//! eigenvalues (k+1)(k+2)/2 (Kimura 1955, PNAS 41:144-150).
//!
//! Where the diffusion is not good enough the same nodes hold the exact chain: one generation of
//! binomial sampling of 2N copies maps polynomials to polynomials of the same degree, so it, too,
//! is a matrix on the nodes, whatever 2N is.
//!
//! Scaled time of t generations is T = -t ln(1 - u), u = 1/(2Ne), which gives the loss of
//! heterozygosity of the discrete population exactly.

use super::jacobi::{Rule, drift_polynomials};
use super::matrix::Matrix;
use super::wright_fisher::binomial_probabilities;

/// The fewest interior nodes: 64 reach 12 digits for samples up to 200 gene copies; 66 with the two
/// ends fill whole blocks of the matrix product.
const FEWEST_NODES: usize = 66;
/// The most interior nodes: enough for 5000 gene copies a sample; beyond, very short intervals lose digits.
const MOST_NODES: usize = 322;
/// Scaled time from which the series of [`Grid::lost`] has converged with the fewest nodes: its last
/// term is damped by exp(-2211 T), 3e-12 here.
pub const SHORTEST_SERIES: f64 = 0.012;
/// Number of neighbouring population sizes through which the exact chain is interpolated.
const SUPPORT: usize = 6;

/// Nodes on which functions of an allele frequency live.
#[derive(Debug, Clone)]
pub struct Grid {
    /// Nodes, ascending, 0 and 1 among them.
    pub nodes: Vec<f64>,
    /// Quadrature weight of each interior node under x(1-x).
    weights: Vec<f64>,
    /// Orthonormal polynomials at the interior nodes.
    polynomials: Vec<Vec<f64>>,
}

impl Grid {
    /// A grid of `order` interior nodes.
    pub fn new(order: usize) -> Self {
        let rule = Rule::jacobi(order, 1.0, 1.0);
        let polynomials = drift_polynomials(order, &rule.nodes);
        let mut nodes = Vec::with_capacity(order + 2);
        nodes.push(0.0);
        nodes.extend(rule.nodes);
        nodes.push(1.0);
        Grid {
            nodes,
            weights: rule.weights,
            polynomials,
        }
    }

    /// The number of interior nodes for samples of at most `gene_copies`: the binomial likelihood
    /// of n copies has width sqrt(x(1-x)/n), and M nodes resolve it to about exp(-M^2/(2n)).
    pub fn order_for(gene_copies: u32) -> usize {
        let needed = (20.0 * f64::from(gene_copies)).sqrt() as usize;
        // The next number that, with the two ends, fills blocks of four.
        (needed.clamp(FEWEST_NODES, MOST_NODES) + 1) / 4 * 4 + 2
    }

    fn order(&self) -> usize {
        self.weights.len()
    }

    /// For each damping factor list (one factor per polynomial) the matrix whose row y holds
    /// y(1-y) sum_k phi_k(y) damping_k phi_k(x_i) w_i / (x_i(1-x_i)).
    fn interior(&self, points: &[f64], damping: &[f64]) -> Matrix {
        let order = self.order();
        let at_points = drift_polynomials(order, points);
        let left = Matrix::from_fn(points.len(), order, |y, k| {
            let p = points[y];
            if p <= 0.0 || p >= 1.0 {
                0.0
            } else {
                p * (1.0 - p) * at_points[y][k] * damping[k]
            }
        });
        let right = Matrix::from_fn(order, order, |k, i| {
            let x = self.nodes[i + 1];
            self.polynomials[i][k] * self.weights[i] / (x * (1.0 - x))
        });
        left.times(&right)
    }

    /// Adds the two end columns: `interior` acts on the function less the straight line through its
    /// ends; `line` is 1 where that line itself is carried along unchanged, 0 for derivatives.
    fn with_ends(&self, points: &[f64], interior: &Matrix, line: f64) -> Matrix {
        let order = self.order();
        let mut out = Matrix::zeros(points.len(), order + 2);
        for (y, &point) in points.iter().enumerate() {
            let source = interior.row(y);
            let row = out.row_mut(y);
            let (mut low, mut high) = (line * (1.0 - point), line * point);
            for (i, &s) in source.iter().enumerate() {
                low -= s * (1.0 - self.nodes[i + 1]);
                high -= s * self.nodes[i + 1];
            }
            row[0] = low;
            row[1..=order].copy_from_slice(source);
            row[order + 1] = high;
        }
        out
    }

    /// Values of a function at `points` from its values on the grid, after scaled time `time` of
    /// drift (0 interpolates).
    pub fn carry(&self, points: &[f64], time: f64) -> Matrix {
        let damping: Vec<f64> = eigenvalues(self.order())
            .map(|l| (-l * time).exp())
            .collect();
        self.with_ends(points, &self.interior(points, &damping), 1.0)
    }

    /// Drift over `generations` at drift rate `u` = 1/(2Ne) in [0, 1), with its first and second
    /// derivative with respect to u, by the diffusion.
    pub fn diffuse(&self, points: &[f64], generations: f64, u: f64) -> Drift {
        let time = -generations * (-u).ln_1p();
        let speed = generations / (1.0 - u);
        let acceleration = speed / (1.0 - u);
        let damping = |f: &dyn Fn(f64) -> f64| -> Vec<f64> {
            eigenvalues(self.order())
                .map(|l| f(l) * (-l * time).exp())
                .collect()
        };
        let part = |factors: Vec<f64>, line| {
            self.with_ends(points, &self.interior(points, &factors), line)
        };
        Drift::new(
            part(damping(&|_| 1.0), 1.0),
            part(damping(&|l| -l * speed), 0.0),
            part(damping(&|l| l * l * speed * speed - l * acceleration), 0.0),
        )
    }

    /// One generation of binomial sampling of `copies` gene copies, exactly, as values at `points`.
    fn generation(&self, points: &[f64], copies: u32) -> Matrix {
        let lattice: Vec<f64> = (0..=copies)
            .map(|k| f64::from(k) / f64::from(copies))
            .collect();
        let sampling = Matrix {
            rows: points.len(),
            columns: lattice.len(),
            data: points
                .iter()
                .flat_map(|&p| binomial_probabilities(copies, p))
                .collect(),
        };
        sampling.times(&self.carry(&lattice, 0.0))
    }

    /// Drift over `generations` of a whole number of gene copies, 2N = `copies`, exactly: values at
    /// `points`. Fractions of a generation mix the two neighbouring numbers of generations.
    pub fn exact(&self, points: &[f64], generations: f64, copies: u32) -> Matrix {
        let whole = generations.floor();
        let fraction = generations - whole;
        let step = self.generation(&self.nodes, copies);
        let mut lower = if whole >= 1.0 {
            self.generation(points, copies)
                .times(&power(&step, whole as u32 - 1))
        } else {
            self.carry(points, 0.0)
        };
        if fraction > 0.0 {
            let upper = if whole >= 1.0 {
                lower.times(&step)
            } else {
                self.generation(points, copies)
            };
            for (l, u) in lower.data.iter_mut().zip(&upper.data) {
                *l = (1.0 - fraction) * *l + fraction * u;
            }
        }
        lower
    }

    /// Chance, by the diffusion, that an allele of each frequency of `points` is lost within scaled
    /// time `time` (Kimura 1955). The series needs `time` of at least [`SHORTEST_SERIES`].
    pub fn lost(&self, points: &[f64], time: f64) -> Vec<f64> {
        let order = self.order();
        // Integral of (1-x) phi_k over (0, 1), exact by a plain Gauss rule.
        let plain = Rule::jacobi(order, 0.0, 0.0);
        let mut coefficients = vec![0.0; order];
        for (values, (x, w)) in drift_polynomials(order, &plain.nodes)
            .iter()
            .zip(plain.nodes.iter().zip(&plain.weights))
        {
            for (c, v) in coefficients.iter_mut().zip(values) {
                *c += w * (1.0 - x) * v;
            }
        }
        for (c, l) in coefficients.iter_mut().zip(eigenvalues(order)) {
            *c *= (-l * time).exp();
        }
        drift_polynomials(order, points)
            .iter()
            .zip(points)
            .map(|(values, &p)| {
                let sum: f64 = values.iter().zip(&coefficients).map(|(v, c)| v * c).sum();
                ((1.0 - p) * (1.0 - p * sum)).clamp(0.0, 1.0)
            })
            .collect()
    }

    /// Drift over `generations` at drift rate `u` by the exact chain of 2N = 1/u gene copies, with
    /// derivatives with respect to u.
    ///
    /// One generation is exact at whole 2N and a polynomial in u, so between them it is interpolated
    /// in u through the nearest `SUPPORT` whole sizes. Fractions of a generation mix the two
    /// neighbouring numbers of generations. `u` must be above 0 and at most 1.
    pub fn chain(&self, points: &[f64], generations: f64, u: f64) -> Drift {
        let first = ((1.0 / u).round() as u32)
            .saturating_sub(SUPPORT as u32 / 2 - 1)
            .max(1);
        let sizes: Vec<u32> = (first..first + SUPPORT as u32).collect();
        let at: Vec<f64> = sizes.iter().map(|&m| 1.0 / f64::from(m)).collect();
        let weights = lagrange(&at, u);
        let blend = |points: &[f64]| {
            let parts: Vec<Matrix> = sizes.iter().map(|&m| self.generation(points, m)).collect();
            Jet::from_fn(|order| {
                let mut sum = Matrix::zeros(points.len(), self.nodes.len());
                for (part, weight) in parts.iter().zip(&weights) {
                    for (s, p) in sum.data.iter_mut().zip(&part.data) {
                        *s += weight[order] * p;
                    }
                }
                sum
            })
        };
        let rest = Jet::from_fn(|order| match order {
            0 => self.carry(points, 0.0),
            _ => Matrix::zeros(points.len(), self.nodes.len()),
        });
        let whole = generations.floor();
        let fraction = generations - whole;
        let step = blend(&self.nodes);
        let mut power = step.power(whole as u32);
        // The generation nearest the earlier visit is taken at the asked points, the others on the grid.
        let entry = blend(points);
        let mut upper = entry.times(&power);
        let lower = if whole >= 1.0 {
            power = step.power(whole as u32 - 1);
            entry.times(&power)
        } else {
            rest
        };
        upper.mix(fraction, &lower);
        let [value, first, second] = upper.0;
        Drift::new(value, first, second)
    }
}

fn power(matrix: &Matrix, exponent: u32) -> Matrix {
    let mut out = Matrix::identity(matrix.rows);
    let mut square = matrix.clone();
    let mut left = exponent;
    while left > 0 {
        if left & 1 == 1 {
            out = out.times(&square);
        }
        left >>= 1;
        if left > 0 {
            square = square.times(&square);
        }
    }
    out
}

fn eigenvalues(order: usize) -> impl Iterator<Item = f64> {
    (0..order).map(|k| (k + 1) as f64 * (k + 2) as f64 / 2.0)
}

/// Weights of the values at `at` for the value, first and second derivative at `u` of the
/// polynomial through them.
fn lagrange(at: &[f64], u: f64) -> Vec<[f64; 3]> {
    (0..at.len())
        .map(|i| {
            let mut jet = [1.0, 0.0, 0.0];
            for (j, &a) in at.iter().enumerate() {
                if i != j {
                    let scale = 1.0 / (at[i] - a);
                    let f = (u - a) * scale;
                    jet = [
                        jet[0] * f,
                        jet[1] * f + jet[0] * scale,
                        jet[2] * f + 2.0 * jet[1] * scale,
                    ];
                }
            }
            jet
        })
        .collect()
}

/// A matrix with its first and second derivative.
struct Jet([Matrix; 3]);

impl Jet {
    fn from_fn(f: impl Fn(usize) -> Matrix) -> Self {
        Jet([f(0), f(1), f(2)])
    }

    fn times(&self, right: &Jet) -> Jet {
        let ([a, a1, a2], [b, b1, b2]) = (&self.0, &right.0);
        let mut first = a1.times(b);
        a.add_product(b1, &mut first);
        let mut second = a1.times(b1);
        for v in &mut second.data {
            *v *= 2.0;
        }
        a2.add_product(b, &mut second);
        a.add_product(b2, &mut second);
        Jet([a.times(b), first, second])
    }

    fn power(&self, exponent: u32) -> Jet {
        let size = self.0[0].rows;
        let mut out = Jet([
            Matrix::identity(size),
            Matrix::zeros(size, size),
            Matrix::zeros(size, size),
        ]);
        let mut square = Jet(self.0.clone());
        let mut left = exponent;
        while left > 0 {
            if left & 1 == 1 {
                out = out.times(&square);
            }
            left >>= 1;
            if left > 0 {
                square = square.times(&square);
            }
        }
        out
    }

    /// `fraction` of this and the rest of `other`.
    fn mix(&mut self, fraction: f64, other: &Jet) {
        for (own, other) in self.0.iter_mut().zip(&other.0) {
            for (o, v) in own.data.iter_mut().zip(&other.data) {
                *o = fraction * *o + (1.0 - fraction) * v;
            }
        }
    }
}

/// Drift over one interval: functions of the later frequency become functions of the earlier one.
#[derive(Debug, Clone)]
pub struct Drift {
    /// Rows: earlier points; columns: later nodes. The value and two derivatives with respect to u.
    pub forward: [Matrix; 3],
    /// The transposes.
    pub backward: [Matrix; 3],
}

impl Drift {
    fn new(value: Matrix, first: Matrix, second: Matrix) -> Self {
        let forward = [value, first, second];
        let backward = [0, 1, 2].map(|i: usize| forward[i].transposed());
        Drift { forward, backward }
    }
}
