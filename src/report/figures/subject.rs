//! The report by population: which visit is the baseline, which the latest, which size is quoted.

use crate::report::wire::{Comparison, EffectiveSize, EffectiveSizeSummary, Kind, Report, Stratum};

/// Methods that explain a change between two visits, the one to quote first.
const TEMPORAL: [&str; 4] = [
    "temporal_likelihood",
    "temporal_fs",
    "temporal_fc",
    "temporal_fk",
];
/// Methods that need one visit alone, the one to quote first.
const OF_ONE_VISIT: [&str; 3] = ["linkage", "heterozygote_excess", "demographic"];

/// One population of a report.
#[derive(Debug, Clone)]
pub struct Subject<'a> {
    /// Its name.
    pub population: &'a str,
    /// Its visits by year.
    pub strata: Vec<&'a Stratum>,
    /// The latest visit against the baseline.
    pub since_baseline: Option<&'a Comparison>,
    /// All comparisons of its visits.
    pub in_time: Vec<&'a Comparison>,
    /// The effective size to quote for the time since the baseline; of one visit where there is none.
    pub size: Option<&'a EffectiveSize>,
    /// All effective sizes, in the order of the report.
    pub sizes: Vec<&'a EffectiveSize>,
    /// The statement on effective size.
    pub summary: Option<&'a EffectiveSizeSummary>,
}

/// The populations of a report in the order of its strata.
pub fn subjects(report: &Report) -> Vec<Subject<'_>> {
    let mut names: Vec<&str> = Vec::new();
    for stratum in &report.strata {
        if !names.contains(&stratum.population.as_str()) {
            names.push(&stratum.population);
        }
    }
    names
        .into_iter()
        .map(|name| subject(report, name))
        .collect()
}

fn subject<'a>(report: &'a Report, population: &'a str) -> Subject<'a> {
    let mut strata: Vec<&Stratum> = report
        .strata
        .iter()
        .filter(|s| s.population == population)
        .collect();
    strata.sort_by(|a, b| a.year.total_cmp(&b.year));
    let order = |name: &str| strata.iter().position(|s| s.stratum == name);
    let in_time: Vec<&Comparison> = report
        .comparisons
        .iter()
        .filter(|c| c.kind != Kind::BetweenPopulations && order(&c.to).is_some())
        .collect();
    let since_baseline = in_time
        .iter()
        .filter(|c| c.kind == Kind::SinceBaseline)
        .max_by_key(|c| order(&c.to))
        .copied();
    let sizes: Vec<&EffectiveSize> = report
        .effective_size
        .iter()
        .filter(|e| e.population == population)
        .collect();
    Subject {
        population,
        since_baseline,
        in_time,
        size: size_to_quote(&sizes, since_baseline, strata.last().copied()),
        sizes,
        summary: report
            .effective_size_summary
            .iter()
            .find(|s| s.population == population),
        strata,
    }
}

/// Headline entries first; of these one with a value or a bound, by the order of methods above.
fn size_to_quote<'a>(
    sizes: &[&'a EffectiveSize],
    since_baseline: Option<&Comparison>,
    latest: Option<&Stratum>,
) -> Option<&'a EffectiveSize> {
    let temporal = since_baseline.and_then(|c| {
        let fits = |e: &EffectiveSize| e.from.as_deref() == Some(c.from.as_str()) && e.to == c.to;
        best(sizes, &TEMPORAL, fits)
    });
    temporal.or_else(|| {
        best(sizes, &OF_ONE_VISIT, |e| {
            latest.is_none_or(|s| s.stratum == e.to)
        })
    })
}

fn best<'a>(
    sizes: &[&'a EffectiveSize],
    methods: &[&str],
    fits: impl Fn(&EffectiveSize) -> bool,
) -> Option<&'a EffectiveSize> {
    let rank = |e: &EffectiveSize| {
        let method = methods.iter().position(|&m| m == e.method)?;
        let says_something = e.estimate.is_some() || e.unbounded;
        Some((!says_something, !e.headline, method))
    };
    let candidates = sizes.iter().filter(|e| fits(e));
    candidates
        .filter_map(|&e| Some((rank(e)?, e)))
        .min_by_key(|(rank, _)| *rank)
        .map(|(_, e)| e)
}

impl<'a> Subject<'a> {
    /// The stratum of this name.
    pub fn stratum(&self, name: &str) -> Option<&'a Stratum> {
        self.strata.iter().find(|s| s.stratum == name).copied()
    }

    /// The two strata of the comparison since the baseline.
    pub fn baseline_and_latest(&self) -> Option<(&'a Stratum, &'a Stratum)> {
        let c = self.since_baseline?;
        Some((self.stratum(&c.from)?, self.stratum(&c.to)?))
    }

    /// The loss that drift at the quoted size makes, where that size spans the time since the
    /// baseline.
    pub fn drift(&self) -> Option<Drift<'a>> {
        let size = self.size?;
        let comparison = self.since_baseline?;
        let spans =
            size.from.as_deref() == Some(comparison.from.as_str()) && size.to == comparison.to;
        let generations = comparison.generations.filter(|&t| t > 0.0)?;
        let says_something = size.estimate.is_some() || size.unbounded;
        (spans && says_something).then_some(Drift { size, generations })
    }
}

/// Drift at an effective size: each generation keeps 1 - 1/(2Ne) of the expected heterozygosity
/// (Wright 1931).
#[derive(Debug, Clone, Copy)]
pub struct Drift<'a> {
    /// The size with its interval.
    pub size: &'a EffectiveSize,
    /// Generations from the baseline to the latest visit.
    pub generations: f64,
}

impl Drift<'_> {
    /// Share of heterozygosity kept after `t` generations at the estimate.
    pub fn kept(&self, t: f64) -> f64 {
        kept(self.size.estimate, t)
    }

    /// The same at the lower and upper limit of the size; `None` without a lower limit.
    pub fn kept_interval(&self, t: f64) -> Option<[f64; 2]> {
        let (low, high) = self.size.interval?;
        Some([kept(Some(low?), t), kept(high, t)])
    }
}

/// No size stands for one without bound.
fn kept(size: Option<f64>, t: f64) -> f64 {
    let rate = size.map_or(0.0, |n| 0.5 / n);
    (1.0 - rate.clamp(0.0, 1.0)).powf(t)
}
