//! The engine against theory: exact Wright-Fisher matrices, published formulas, values enumerated
//! elsewhere. Every tolerance is a number of standard errors over independent runs, because loci
//! of one run share a pedigree.

mod drift;
mod linkage;
mod survey;

use super::scenario::Scenario;
use super::simulation::{Simulation, simulate};

/// A scenario from the lines of its file.
fn scenario(text: &str) -> Scenario {
    let scenario: Scenario = toml::from_str(text).unwrap();
    assert_eq!(super::problems(&scenario), []);
    scenario
}

/// One chromosome of unlinked loci.
fn unlinked(loci: &str) -> String {
    format!("chromosome = [{{ name = \"c\", length_bp = 100_000_000, unlinked = true }}]\n{loci}\n")
}

fn run(scenario: &Scenario, seed: u64) -> Simulation {
    simulate(scenario, seed).unwrap()
}

/// Mean and its standard error.
struct Mean {
    mean: f64,
    error: f64,
}

impl Mean {
    fn of(values: &[f64]) -> Self {
        let n = values.len() as f64;
        let mean = values.iter().sum::<f64>() / n;
        let variance = values.iter().map(|v| (v - mean).powi(2)).sum::<f64>() / (n - 1.0);
        Mean {
            mean,
            error: (variance / n).sqrt(),
        }
    }

    /// Asserts that a value is within `errors` standard errors, and that these are below a share
    /// of it, so that the check has teeth.
    fn agrees(&self, want: f64, errors: f64, sharpness: f64, what: &str) {
        let Mean { mean, error } = self;
        assert!(
            (mean - want).abs() <= errors * error,
            "{what}: {mean} +- {error}, not {want}"
        );
        assert!(
            *error <= sharpness * want.abs(),
            "{what}: error {error} is too large for {want}"
        );
    }
}

/// Frequency of the second allele among all adults of a stratum at every locus.
fn true_frequencies(simulation: &Simulation, stratum: usize) -> Vec<f64> {
    let of = |copies: &Vec<u32>| f64::from(copies[1]) / f64::from(copies.iter().sum::<u32>());
    simulation
        .truth
        .loci
        .iter()
        .map(|l| of(&l.copies[stratum]))
        .collect()
}
