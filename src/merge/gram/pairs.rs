//! From the integer sums to the linkage sums of every pair of contigs.

use std::collections::BTreeMap;

use super::missing::{Typed, TypedPairs};
use super::{
    BinSums, ContigSums, LocusWeights, MissingSums, TERM_BITS, TypedTally, VECTOR_BITS,
    WEIGHT_BITS, power_of_two,
};

/// Sums over the pairs of loci of two contigs, or over the pairs of different loci within one.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct PairSums {
    /// Squared correlations of dosages.
    pub squared_correlation: f64,
    /// Their expectation from sampling individuals alone.
    pub expected_by_sampling: f64,
    /// What the squared correlations would sum to if the population's were 1: the share that the
    /// missing genotypes leave.
    pub attenuation: f64,
    /// Individuals typed at both loci.
    pub typed_at_both: f64,
    /// Weights of the pairs: (K1 - 1)(K2 - 1) for K1 and K2 kept alleles, hence the number of pairs
    /// where all loci have two.
    pub weight: f64,
}

impl PairSums {
    /// Adds the sums of other pairs.
    pub fn add(&mut self, other: &PairSums) {
        self.squared_correlation += other.squared_correlation;
        self.expected_by_sampling += other.expected_by_sampling;
        self.attenuation += other.attenuation;
        self.typed_at_both += other.typed_at_both;
        self.weight += other.weight;
    }

    /// Takes the sums of pairs out that are in.
    pub fn subtract(&mut self, other: &PairSums) {
        self.squared_correlation -= other.squared_correlation;
        self.expected_by_sampling -= other.expected_by_sampling;
        self.attenuation -= other.attenuation;
        self.typed_at_both -= other.typed_at_both;
        self.weight -= other.weight;
    }
}

/// The linkage sums of one stratum and cutoff, for every pair of contigs and within each contig.
#[derive(Debug, Clone, PartialEq)]
pub struct ContigPairs {
    /// Individuals of the stratum.
    pub individuals: usize,
    /// Whether contigs outnumbered the groups, so that each group may hold several.
    pub grouped: bool,
    /// Loci that pass the cutoff, by contig (or group of contigs).
    pub loci: Vec<u64>,
    /// Weights of those loci (kept alleles less one), by contig.
    pub weights: Vec<f64>,
    pairs: Vec<PairSums>,
}

impl ContigPairs {
    pub(super) fn of(
        individuals: usize,
        grouped: bool,
        contigs: &BTreeMap<u64, ContigSums>,
        cutoff: u8,
    ) -> Self {
        let finished: Vec<Finished> = contigs
            .values()
            .map(|sums| Finished::of(individuals, sums, cutoff))
            .filter(|f| f.loci > 0)
            .collect();
        let mut pairs = Vec::with_capacity(finished.len() * (finished.len() + 1) / 2);
        for (j, second) in finished.iter().enumerate() {
            pairs.extend(finished[..j].iter().map(|first| first.with(second)));
            pairs.push(second.within());
        }
        ContigPairs {
            individuals,
            grouped,
            loci: finished.iter().map(|f| f.loci).collect(),
            weights: finished.iter().map(|f| f.weight).collect(),
            pairs,
        }
    }

    /// Number of contigs (or groups) with loci.
    pub fn contigs(&self) -> usize {
        self.loci.len()
    }

    /// The sums of two different contigs, or within one when `c` is `d`; indices as in
    /// [`ContigPairs::loci`].
    pub fn pair(&self, c: usize, d: usize) -> &PairSums {
        let (c, d) = (c.min(d), c.max(d));
        &self.pairs[d * (d + 1) / 2 + c]
    }

    /// The sums over all pairs of different contigs.
    pub fn between(&self) -> PairSums {
        let mut sums = PairSums::default();
        for d in 0..self.contigs() {
            (0..d).for_each(|c| sums.add(self.pair(c, d)));
        }
        sums
    }

    /// The sums over all pairs of different loci.
    pub fn all(&self) -> PairSums {
        let mut sums = self.between();
        (0..self.contigs()).for_each(|c| sums.add(self.pair(c, c)));
        sums
    }
}

/// The sums of one contig and cutoff as floats.
struct Finished {
    size: usize,
    loci: u64,
    weight: f64,
    gram: Vec<f64>,
    b: Weighted,
    h: Weighted,
    p: Vec<f64>,
    q: Vec<f64>,
    typed: Vec<f64>,
    own: PairSums,
}

/// A matrix that is one constant plus, where genotypes are missing, a matrix.
struct Weighted {
    constant: f64,
    cells: Option<Vec<f64>>,
}

impl Finished {
    fn of(size: usize, sums: &ContigSums, cutoff: u8) -> Self {
        let cells = size * (size + 1) / 2;
        let bins: Vec<&BinSums> = sums
            .bins
            .iter()
            .filter(|(mask, _)| *mask & cutoff != 0)
            .map(|(_, bin)| bin)
            .collect();
        let missing: Vec<&MissingSums> = bins
            .iter()
            .filter_map(|bin| bin.missing.as_deref())
            .collect();
        let mut tally = vec![TypedTally::default(); size + 1];
        for (n, sum) in tally.iter_mut().enumerate() {
            for bin in &bins {
                sum.loci += bin.by_typed[n].loci;
                sum.weight += bin.by_typed[n].weight;
                sum.squared_weight += bin.by_typed[n].squared_weight;
            }
        }
        let complete = LocusWeights::of(size as u32, tally[size].weight);
        let matrix = |part: &dyn Fn(&MissingSums) -> &TypedPairs, constant| Weighted {
            constant,
            cells: (!missing.is_empty()).then(|| {
                to_floats(cells, WEIGHT_BITS, |sums| {
                    missing.iter().for_each(|m| part(m).add_to(sums));
                })
            }),
        };
        let vector = |part: &dyn Fn(&MissingSums) -> &Typed, constant: f64| -> Vec<f64> {
            (0..size)
                .map(|i| {
                    let sum: i128 = missing.iter().map(|m| part(m).of(i)).sum();
                    sum as f64 * power_of_two(-TERM_BITS) + constant
                })
                .collect()
        };
        let weight = tally.iter().map(|t| t.weight).sum::<u64>() as f64;
        let mut gram = to_floats(cells, 2 * VECTOR_BITS, |sums| {
            bins.iter().for_each(|bin| bin.vectors.add_to(sums));
        });
        // Squared lengths of the vectors sum to the trace, and to the weight but for the rounding:
        // dividing by their mean takes nearly all of the rounding error away.
        let mean_square = gram[..size].iter().sum::<f64>() / weight;
        if weight > 0.0 {
            gram.iter_mut().for_each(|cell| *cell /= mean_square);
        }
        let own: i128 = bins.iter().map(|bin| bin.own).sum();
        let own = own as f64 * power_of_two(-4 * VECTOR_BITS) / (mean_square * mean_square);
        Finished {
            size,
            loci: tally.iter().map(|t| t.loci).sum(),
            weight,
            gram,
            b: matrix(&|m| &m.b, complete.b),
            h: matrix(&|m| &m.h, complete.h),
            p: vector(&|m| &m.p, complete.a),
            q: vector(&|m| &m.q, complete.b),
            typed: (0..size)
                .map(|i| {
                    let sum: i128 = missing.iter().map(|m| m.typed.of(i)).sum();
                    (sum + i128::from(tally[size].weight)) as f64
                })
                .collect(),
            own: own_sums(&tally, own),
        }
    }

    /// The sums over all ordered pairs of a locus here and a locus there.
    fn with(&self, other: &Finished) -> PairSums {
        let n = self.size;
        PairSums {
            squared_correlation: inner(n, &self.gram, &other.gram),
            expected_by_sampling: dot(&self.p, &other.p)
                - dot(&self.p, &other.q)
                - dot(&self.q, &other.p)
                + self.b.inner(&other.b, n),
            attenuation: self.h.inner(&other.h, n),
            typed_at_both: dot(&self.typed, &other.typed),
            weight: self.weight * other.weight,
        }
    }

    /// The sums over unordered pairs of different loci of this contig.
    fn within(&self) -> PairSums {
        let mut sums = self.with(self);
        sums.subtract(&self.own);
        PairSums {
            squared_correlation: sums.squared_correlation / 2.0,
            expected_by_sampling: sums.expected_by_sampling / 2.0,
            attenuation: sums.attenuation / 2.0,
            typed_at_both: sums.typed_at_both / 2.0,
            weight: sums.weight / 2.0,
        }
    }
}

impl Weighted {
    fn inner(&self, other: &Weighted, n: usize) -> f64 {
        let both = self.constant * other.constant * (n * n) as f64;
        let ours = self
            .cells
            .as_ref()
            .map_or(0.0, |c| other.constant * total(n, c));
        let theirs = other
            .cells
            .as_ref()
            .map_or(0.0, |c| self.constant * total(n, c));
        let cells = match (&self.cells, &other.cells) {
            (Some(x), Some(y)) => inner(n, x, y),
            _ => 0.0,
        };
        both + ours + theirs + cells
    }
}

/// What the pairs of each locus with itself add to the sums over all ordered pairs.
fn own_sums(tally: &[TypedTally], squared_correlation: f64) -> PairSums {
    let mut own = PairSums {
        squared_correlation,
        ..PairSums::default()
    };
    for (n, cell) in tally.iter().enumerate().filter(|(_, cell)| cell.loci > 0) {
        let weights = LocusWeights::of(n as u32, 1);
        let (n, squared_weight) = (n as f64, cell.squared_weight as f64);
        own.expected_by_sampling += squared_weight
            * (n * weights.a * (weights.a - 2.0 * weights.b) + (n * weights.b).powi(2));
        own.attenuation += squared_weight * (n * weights.h).powi(2);
        own.typed_at_both += squared_weight * n;
        own.weight += squared_weight;
    }
    own
}

/// Integer sums in the layout of [`Triangle`](super::Triangle) and units of 2^-bits, rounded once.
fn to_floats(cells: usize, bits: i32, add: impl FnOnce(&mut [i128])) -> Vec<f64> {
    let mut sums = vec![0i128; cells];
    add(&mut sums);
    let unit = power_of_two(-bits);
    sums.into_iter().map(|sum| sum as f64 * unit).collect()
}

/// Sum of elementwise products of two symmetric matrices in the layout of [`Triangle`].
fn inner(n: usize, x: &[f64], y: &[f64]) -> f64 {
    dot(&x[..n], &y[..n]) + 2.0 * dot(&x[n..], &y[n..])
}

/// Sum of all cells of a symmetric matrix.
fn total(n: usize, x: &[f64]) -> f64 {
    x[..n].iter().sum::<f64>() + 2.0 * x[n..].iter().sum::<f64>()
}

/// Sum of products in eight lanes, whose order is fixed.
fn dot(x: &[f64], y: &[f64]) -> f64 {
    let mut lanes = [0.0; 8];
    let (xs, ys) = (x.chunks_exact(8), y.chunks_exact(8));
    let rest: f64 = xs
        .remainder()
        .iter()
        .zip(ys.remainder())
        .map(|(a, b)| a * b)
        .sum();
    for (a, b) in xs.zip(ys) {
        for lane in 0..8 {
            lanes[lane] += a[lane] * b[lane];
        }
    }
    lanes.iter().sum::<f64>() + rest
}
