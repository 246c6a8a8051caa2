//! Gauss-Jacobi quadrature on (0, 1) and the orthonormal polynomials behind it.

use statrs::function::gamma::ln_gamma;

/// Logarithm of the beta function of two positive numbers.
pub fn ln_beta(a: f64, b: f64) -> f64 {
    ln_gamma(a) + ln_gamma(b) - ln_gamma(a + b)
}

/// Coefficients of the recurrence of the polynomials that are orthonormal on (0, 1) under the
/// weight x^(left) (1-x)^(right), with the weight's integral.
#[derive(Debug, Clone)]
struct Recurrence {
    /// Diagonal of the Jacobi matrix, `order` entries.
    diagonal: Vec<f64>,
    /// Off-diagonal, `order` entries; entry k couples k and k + 1.
    off_diagonal: Vec<f64>,
    /// 1/sqrt(integral of the weight), divided by that integral when the weight is a density.
    first: f64,
}

impl Recurrence {
    /// Source: Szego (1975) Orthogonal Polynomials, equation 4.5.1, moved from (-1, 1) to (0, 1).
    fn new(order: usize, left: f64, right: f64, as_density: bool) -> Self {
        let sum = left + right;
        let diagonal = (0..order)
            .map(|n| {
                let s = 2.0 * n as f64 + sum;
                let centre = if n == 0 {
                    (left - right) / (sum + 2.0)
                } else {
                    (left * left - right * right) / (s * (s + 2.0))
                };
                0.5 * (1.0 + centre)
            })
            .collect();
        let off_diagonal = (1..=order)
            .map(|n| {
                let k = n as f64;
                let s = 2.0 * k + sum;
                let square = if n == 1 {
                    4.0 * (1.0 + left) * (1.0 + right) / ((2.0 + sum).powi(2) * (3.0 + sum))
                } else {
                    4.0 * k * (k + left) * (k + right) * (k + sum) / (s * s * (s + 1.0) * (s - 1.0))
                };
                0.5 * square.sqrt()
            })
            .collect();
        let mass = if as_density {
            1.0
        } else {
            ln_beta(left + 1.0, right + 1.0).exp()
        };
        Recurrence {
            diagonal,
            off_diagonal,
            first: 1.0 / mass.sqrt(),
        }
    }

    /// Polynomials 0 to `order - 1` at `x`.
    fn values(&self, x: f64) -> Vec<f64> {
        let mut p = Vec::with_capacity(self.diagonal.len());
        let (mut before, mut now) = (0.0, self.first);
        for k in 0..self.diagonal.len() {
            p.push(now);
            let back = if k == 0 {
                0.0
            } else {
                self.off_diagonal[k - 1]
            };
            let next = ((x - self.diagonal[k]) * now - back * before) / self.off_diagonal[k];
            (before, now) = (now, next);
        }
        p
    }

    /// Polynomial number `order` and its derivative at `x`, up to a common factor.
    fn last(&self, x: f64) -> (f64, f64) {
        let (mut before, mut now) = (0.0, self.first);
        let (mut slope_before, mut slope) = (0.0, 0.0);
        for k in 0..self.diagonal.len() {
            let back = if k == 0 {
                0.0
            } else {
                self.off_diagonal[k - 1]
            };
            let scale = self.off_diagonal[k];
            let next = ((x - self.diagonal[k]) * now - back * before) / scale;
            let next_slope = (now + (x - self.diagonal[k]) * slope - back * slope_before) / scale;
            (before, now) = (now, next);
            (slope_before, slope) = (slope, next_slope);
        }
        (now, slope)
    }
}

/// Nodes and weights of a Gauss rule on (0, 1).
#[derive(Debug, Clone, PartialEq)]
pub struct Rule {
    /// Nodes, ascending.
    pub nodes: Vec<f64>,
    /// Weights, by node.
    pub weights: Vec<f64>,
}

impl Rule {
    /// The rule of `order` nodes for the weight x^left (1-x)^right, both above -1: exact for
    /// polynomials of degree up to 2 `order` - 1.
    pub fn jacobi(order: usize, left: f64, right: f64) -> Self {
        Rule::build(&Recurrence::new(order, left, right, false))
    }

    /// The rule of `order` nodes for the density of Beta(a, b); its weights add up to 1.
    pub fn beta(order: usize, a: f64, b: f64) -> Self {
        Rule::build(&Recurrence::new(order, a - 1.0, b - 1.0, true))
    }

    /// Nodes are eigenvalues of the Jacobi matrix (Golub & Welsch 1969), polished by two Newton
    /// steps; weights are the Christoffel numbers 1/sum of p_k(x)^2, accurate in relative terms.
    fn build(recurrence: &Recurrence) -> Self {
        let order = recurrence.diagonal.len();
        let mut nodes = eigenvalues(
            recurrence.diagonal.clone(),
            &recurrence.off_diagonal[..order - 1],
        );
        for x in &mut nodes {
            for _ in 0..2 {
                let (value, slope) = recurrence.last(*x);
                let step = value / slope;
                let moved = *x - step;
                if step.is_finite() && moved > 0.0 && moved < 1.0 {
                    *x = moved;
                }
            }
        }
        let weights = nodes
            .iter()
            .map(|&x| 1.0 / recurrence.values(x).iter().map(|p| p * p).sum::<f64>())
            .collect();
        Rule { nodes, weights }
    }
}

/// The first `order` polynomials that are orthonormal on (0, 1) under the weight x(1-x), at `x`.
pub fn drift_polynomials(order: usize, points: &[f64]) -> Vec<Vec<f64>> {
    let recurrence = Recurrence::new(order, 1.0, 1.0, false);
    points.iter().map(|&x| recurrence.values(x)).collect()
}

/// Eigenvalues, ascending, of a symmetric tridiagonal matrix by the implicit QL method.
fn eigenvalues(mut d: Vec<f64>, off: &[f64]) -> Vec<f64> {
    let n = d.len();
    let mut e = off.to_vec();
    e.push(0.0);
    for l in 0..n {
        // Convergence is cubic; the bound only keeps a broken input from looping.
        for _ in 0..200 {
            let mut m = l;
            while m + 1 < n && e[m].abs() > f64::EPSILON * (d[m].abs() + d[m + 1].abs()) {
                m += 1;
            }
            if m == l {
                break;
            }
            let mut g = (d[l + 1] - d[l]) / (2.0 * e[l]);
            let mut r = g.hypot(1.0);
            g = d[m] - d[l] + e[l] / (g + r.copysign(g));
            let (mut s, mut c, mut p) = (1.0, 1.0, 0.0);
            let mut split = false;
            for i in (l..m).rev() {
                let f = s * e[i];
                let b = c * e[i];
                r = f.hypot(g);
                e[i + 1] = r;
                if r == 0.0 {
                    d[i + 1] -= p;
                    e[m] = 0.0;
                    split = true;
                    break;
                }
                s = f / r;
                c = g / r;
                g = d[i + 1] - p;
                r = (d[i] - g) * s + 2.0 * c * b;
                p = s * r;
                d[i + 1] = g + p;
                g = c * r - b;
            }
            if !split {
                d[l] -= p;
                e[l] = g;
                e[m] = 0.0;
            }
        }
    }
    d.sort_by(f64::total_cmp);
    d
}

#[cfg(test)]
mod tests {
    use super::*;

    fn close(got: f64, want: f64, relative: f64) {
        assert!(
            (got - want).abs() <= relative * want.abs(),
            "{got} is not {want}"
        );
    }

    /// Values of a general-purpose numerical library (scipy 1.17 `roots_jacobi`, moved to (0, 1)).
    #[test]
    fn nodes_and_weights_equal_a_numerical_library() {
        let known = [
            (
                64,
                1.0,
                1.0,
                [
                    (0, 0.0008553487210165023, 1.227369109211792e-06),
                    (1, 0.002865467380066933, 7.380463563210538e-06),
                    (32, 0.5119907103337815, 0.00599075845779939),
                    (63, 0.9991446512789834, 1.227369109211792e-06),
                ],
            ),
            (
                66,
                1.0,
                1.0,
                [
                    (0, 0.0008054229833074356, 1.088342875930327e-06),
                    (1, 0.002698318992146453, 6.546005240865507e-06),
                    (33, 0.5116354357703753, 0.005813517747381247),
                    (65, 0.9991945770166926, 1.088342875930327e-06),
                ],
            ),
            (
                30,
                -0.8,
                1.5,
                [
                    (0, 0.000230642473870446, 1.427975537356208),
                    (1, 0.004619834168538839, 0.5118273634071442),
                    (15, 0.4963904268374082, 0.03188651157636891),
                    (29, 0.9947041679913111, 3.00268150039383e-06),
                ],
            ),
        ];
        for (order, left, right, rows) in known {
            let rule = Rule::jacobi(order, left, right);
            for (i, node, weight) in rows {
                close(rule.nodes[i], node, 1e-11);
                close(rule.weights[i], weight, 1e-10);
            }
        }
    }

    /// Moments of Beta(a, b) are known: E x = a/(a+b), E x^2 = a(a+1)/((a+b)(a+b+1)).
    #[test]
    fn beta_rules_integrate_moments_exactly() {
        for (a, b) in [
            (1.0, 1.0),
            (0.2, 0.8),
            (0.05, 3.0),
            (12.0, 0.5),
            (40.0, 60.0),
        ] {
            let rule = Rule::beta(68, a, b);
            let moment = |k: i32| {
                rule.nodes
                    .iter()
                    .zip(&rule.weights)
                    .map(|(x, w)| w * x.powi(k))
                    .sum::<f64>()
            };
            close(moment(0), 1.0, 1e-12);
            close(moment(1), a / (a + b), 1e-11);
            close(moment(2), a * (a + 1.0) / ((a + b) * (a + b + 1.0)), 1e-11);
        }
    }

    #[test]
    fn polynomials_are_orthonormal() {
        let rule = Rule::jacobi(40, 1.0, 1.0);
        let p = drift_polynomials(40, &rule.nodes);
        for i in 0..40 {
            for j in 0..40 {
                let dot: f64 = p
                    .iter()
                    .zip(&rule.weights)
                    .map(|(v, w)| w * v[i] * v[j])
                    .sum();
                assert!((dot - f64::from(i == j)).abs() < 1e-11, "{i} {j} {dot}");
            }
        }
    }
}
