//! Draws of the future and their bands.

use super::spectrum::{Sums, drift};
use super::{DriftRate, Horizon, Scenario, Start};
use crate::model::stable_hash;
use crate::outlook::rehearse::{Dice, Purpose};

/// Most rows of a projection: longer ones are thinned, the first and the last kept.
const MOST_ROWS: usize = 41;
/// Generations up to which the time to a limit is sought.
const FARTHEST: usize = 2000;

/// Median and central ranges over the draws.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Band {
    /// Half of the draws lie below.
    pub median: f64,
    /// A quarter lies below, a quarter above.
    pub central_50: [f64; 2],
    /// One in forty lies below, one in forty above.
    pub central_95: [f64; 2],
}

/// What is expected at one generation.
#[derive(Debug, Clone, PartialEq)]
pub struct Row {
    /// Generations from the latest visit.
    pub generation: usize,
    /// Expected heterozygosity.
    pub expected_heterozygosity: Option<Band>,
    /// Observed heterozygosity, if mating stays as it is.
    pub observed_heterozygosity: Option<Band>,
    /// Expected heterozygosity as a share of the baseline's.
    pub kept_since_baseline: Option<Band>,
    /// Allelic richness.
    pub allelic_richness: Option<Band>,
    /// Alleles of today that are left.
    pub alleles_left: Option<Band>,
    /// Inbreeding accrued since the latest visit.
    pub inbreeding: Band,
}

/// When a share of the baseline's heterozygosity is no longer kept.
#[derive(Debug, Clone, PartialEq)]
pub struct LimitTime {
    /// Share of draws in which it is not kept any more at the end of the horizon.
    pub crossed: f64,
    /// Share of draws in which it is not kept today.
    pub crossed_now: f64,
    /// Median generations until then, over all draws; `None` beyond 2000.
    pub median: Option<f64>,
    /// Central 95 % of the draws; an end is `None` beyond 2000 generations.
    pub central_95: [Option<f64>; 2],
}

/// The future of one population under one scenario.
#[derive(Debug, Clone, PartialEq)]
pub struct Projection {
    /// Rows from today to the horizon.
    pub rows: Vec<Row>,
    /// Time to the limit.
    pub limit: LimitTime,
    /// Effective size of the first generation, over the draws: lower 2.5 %, median, upper 2.5 %.
    pub first_size: [f64; 3],
}

/// Values of one draw at one generation.
#[derive(Clone, Copy)]
struct Point {
    heterozygosity: f64,
    richness: f64,
    alleles: f64,
    inbreeding: f64,
}

/// What a draw starts with.
struct Today {
    expected: Option<f64>,
    outbred: Option<f64>,
    richness: Option<f64>,
    kept: Option<f64>,
}

/// Projects a population; `None` where the scenario rests on an effective size that nobody knows.
///
/// The draws of a population are the same under every scenario, so that scenarios differ by what
/// they do and not by chance.
pub fn project(start: &Start, scenario: &Scenario, horizon: &Horizon) -> Option<Projection> {
    let believed = rate_of(start, scenario)?;
    let unit = stable_hash(start.population.as_bytes());
    let shown = shown(horizon.generations);
    let mut points: Vec<Vec<Point>> = Vec::new();
    let mut todays = Vec::new();
    let mut limits = Vec::new();
    let mut first_sizes = Vec::new();
    for draw in 0..horizon.draws {
        let mut dice = Dice::new(horizon.seed, Purpose::Forecast, unit, draw as u64);
        // Evenly spread over what is believed, so that few draws cover it well.
        let now = believed.quantile((draw as f64 + 0.5) / horizon.draws as f64);
        let rates = scenario.rates(now, horizon.generations.max(1));
        let today = today(start, &mut dice);
        first_sizes.push(0.5 / rates[0]);
        let path = match scenario.is_open() {
            true => open_path(start, scenario, &rates),
            false => closed_path(start, &rates, &mut dice),
        };
        let kept = today.kept.unwrap_or(1.0);
        limits.push(until(start, scenario, now, horizon.keep / kept));
        points.push(shown.iter().map(|&g| path[g]).collect());
        todays.push(today);
    }
    let rows = shown
        .iter()
        .enumerate()
        .map(|(i, &generation)| row(generation, i, &points, &todays))
        .collect();
    let sizes = sorted(first_sizes);
    Some(Projection {
        rows,
        limit: limit_time(limits, horizon.generations as f64),
        first_size: [0.025, 0.5, 0.975].map(|q| at(&sizes, q)),
    })
}

/// What is believed of the rate now. A scenario that gives every size needs none.
pub(super) fn rate_of(start: &Start, scenario: &Scenario) -> Option<DriftRate> {
    match scenario.size {
        super::Size::Given(_) => Some(DriftRate::certain(0.01)),
        super::Size::Estimated(_) => start.rate,
    }
}

fn today(start: &Start, dice: &mut Dice) -> Today {
    // One normal number a value, drawn whether or not it is needed, so that streams stay in step.
    let mut value = |estimate: Option<[f64; 2]>, low: f64| {
        let z = dice.normal();
        estimate.map(|[value, error]| (value + error * z).max(low))
    };
    Today {
        expected: value(start.expected_heterozygosity, 0.0),
        outbred: value(start.inbreeding_coefficient, -1.0).map(|f| 1.0 - f.min(1.0)),
        richness: value(start.allelic_richness, 1.0),
        kept: value(start.kept_since_baseline, 1e-3),
    }
}

/// Drift of a draw of loci.
fn closed_path(start: &Start, rates: &[f64], dice: &mut Dice) -> Vec<Point> {
    let mut frequencies = start.spectrum.draw(dice);
    let first = Sums::of(&frequencies, start.gene_copies);
    let share = |now: f64, then: f64| if then > 0.0 { now / then } else { 0.0 };
    let mut outbred = 1.0;
    let mut path = vec![Point {
        heterozygosity: 1.0,
        richness: 1.0,
        alleles: 1.0,
        inbreeding: 0.0,
    }];
    for &rate in rates {
        drift(&mut frequencies, rate, dice);
        outbred *= 1.0 - rate;
        let sums = Sums::of(&frequencies, start.gene_copies);
        path.push(Point {
            heterozygosity: share(sums.heterozygosity, first.heterozygosity),
            richness: share(sums.richness, first.richness),
            alleles: share(sums.alleles, first.alleles),
            inbreeding: 1.0 - outbred,
        });
    }
    path
}

/// Expected heterozygosity when individuals come in: each of two different parental copies is a
/// resident's or a newcomer's. The source stays as it is. Alleles are not followed: a report does
/// not say which ones the source shares.
fn open_path(start: &Start, scenario: &Scenario, rates: &[f64]) -> Vec<Point> {
    let mut now = Open::new(start, scenario);
    let first = now.within;
    let mut path = vec![now.point(first)];
    for (g, &rate) in rates.iter().enumerate() {
        now.step(scenario, g as u32 + 1, rate);
        path.push(now.point(first));
    }
    path
}

/// Identity within the population and with its sources.
struct Open {
    within: f64,
    /// Copies identical by descent since today.
    inbreeding: f64,
    migrants: Option<Pair>,
    release: Option<Pair>,
}

/// Heterozygosity of a source, and between it and the population.
struct Pair {
    within: f64,
    between: f64,
}

impl Open {
    fn new(start: &Start, scenario: &Scenario) -> Self {
        let pair = |from: &str| {
            start.source(from).map(|source| Pair {
                within: source.within,
                between: source.between,
            })
        };
        Open {
            within: start.expected_heterozygosity.map_or(0.0, |h| h[0]),
            inbreeding: 0.0,
            migrants: scenario.migrants.as_ref().and_then(|a| pair(&a.from)),
            release: scenario.release.as_ref().and_then(|(a, _)| pair(&a.from)),
        }
    }

    fn step(&mut self, scenario: &Scenario, generation: u32, rate: f64) {
        let size = 0.5 / rate;
        let mut parts = [0.0; 2];
        if let Some(arrival) = &scenario.migrants {
            parts[0] = arrival.individuals / (size + arrival.individuals);
        }
        if let Some((arrival, when)) = &scenario.release
            && *when == generation
        {
            parts[1] = arrival.individuals / (size + arrival.individuals);
        }
        // First one source, then the other; only the last step adds a generation of drift.
        self.mix(parts[0], true);
        self.mix(parts[1], false);
        self.within *= 1.0 - rate;
        self.inbreeding = rate + (1.0 - rate) * self.inbreeding;
    }

    fn mix(&mut self, share: f64, of_migrants: bool) {
        let source = if of_migrants {
            &mut self.migrants
        } else {
            &mut self.release
        };
        let Some(pair) = source.as_mut().filter(|_| share > 0.0) else {
            return;
        };
        let stay = 1.0 - share;
        self.within = stay * stay * self.within
            + 2.0 * share * stay * pair.between
            + share * share * pair.within;
        pair.between = stay * pair.between + share * pair.within;
        self.inbreeding *= stay * stay;
    }

    fn point(&self, first: f64) -> Point {
        Point {
            heterozygosity: if first > 0.0 {
                self.within / first
            } else {
                0.0
            },
            richness: f64::NAN,
            alleles: f64::NAN,
            inbreeding: self.inbreeding,
        }
    }
}

/// Generations until the expected share falls below a limit; `None` beyond [`FARTHEST`].
fn until(start: &Start, scenario: &Scenario, now: f64, limit: f64) -> Option<f64> {
    if limit >= 1.0 {
        return Some(0.0);
    }
    let rates = scenario.rates(now, FARTHEST);
    if scenario.is_open() {
        let path = open_path(start, scenario, &rates);
        return path
            .iter()
            .position(|p| p.heterozygosity < limit)
            .map(|g| g as f64);
    }
    let mut left = 1.0;
    for (g, rate) in rates.iter().enumerate() {
        let next = left * (1.0 - rate);
        if next < limit {
            // Within the generation heterozygosity falls at an even pace.
            let part: f64 = (limit / left).ln() / (-rate).ln_1p();
            return Some(g as f64 + part);
        }
        left = next;
    }
    None
}

fn limit_time(limits: Vec<Option<f64>>, generations: f64) -> LimitTime {
    let draws = limits.len().max(1) as f64;
    let share = |holds: &dyn Fn(f64) -> bool| {
        limits.iter().filter(|t| t.is_some_and(holds)).count() as f64 / draws
    };
    let (crossed, crossed_now) = (share(&|t| t <= generations), share(&|t| t <= 0.0));
    let times = sorted(limits.iter().map(|t| t.unwrap_or(f64::INFINITY)).collect());
    let finite = |q: f64| Some(at(&times, q)).filter(|t| t.is_finite());
    LimitTime {
        crossed,
        crossed_now,
        median: finite(0.5),
        central_95: [finite(0.025), finite(0.975)],
    }
}

/// Generations shown: all, or evenly thinned.
fn shown(generations: usize) -> Vec<usize> {
    let last = MOST_ROWS - 1;
    match generations <= last {
        true => (0..=generations).collect(),
        false => (0..=last)
            .map(|i| (i * generations + last / 2) / last)
            .collect(),
    }
}

fn row(generation: usize, i: usize, points: &[Vec<Point>], todays: &[Today]) -> Row {
    let over = |value: &dyn Fn(&Point, &Today) -> Option<f64>| {
        let values: Option<Vec<f64>> = points
            .iter()
            .zip(todays)
            .map(|(path, today)| value(&path[i], today).filter(|v| v.is_finite()))
            .collect();
        values.and_then(band)
    };
    Row {
        generation,
        expected_heterozygosity: over(&|p, t| Some(p.heterozygosity * t.expected?)),
        observed_heterozygosity: over(&|p, t| Some(p.heterozygosity * t.expected? * t.outbred?)),
        kept_since_baseline: over(&|p, t| Some(p.heterozygosity * t.kept?)),
        allelic_richness: over(&|p, t| Some(p.richness * t.richness?)),
        alleles_left: over(&|p, _| Some(p.alleles)),
        inbreeding: over(&|p, _| Some(p.inbreeding)).unwrap_or(Band {
            median: 0.0,
            central_50: [0.0; 2],
            central_95: [0.0; 2],
        }),
    }
}

/// Median and central ranges; `None` of nothing.
pub fn band(values: Vec<f64>) -> Option<Band> {
    if values.is_empty() {
        return None;
    }
    let values = sorted(values);
    Some(Band {
        median: at(&values, 0.5),
        central_50: [0.25, 0.75].map(|q| at(&values, q)),
        central_95: [0.025, 0.975].map(|q| at(&values, q)),
    })
}

fn sorted(mut values: Vec<f64>) -> Vec<f64> {
    values.sort_by(f64::total_cmp);
    values
}

/// The value below which a share of sorted values lies, between neighbours in proportion.
fn at(values: &[f64], share: f64) -> f64 {
    let place = share * (values.len() - 1) as f64;
    let (low, part) = (place.floor() as usize, place.fract());
    match values.get(low + 1) {
        Some(&next) if part > 0.0 && next != values[low] => {
            values[low] + part * (next - values[low])
        }
        _ => values[low],
    }
}

#[cfg(test)]
mod tests {
    use super::super::{Size, SourceStratum, Spectrum};
    use super::*;

    fn start() -> Start {
        Start {
            population: "Alder".into(),
            stratum: "Alder@2020".into(),
            year: 2020.0,
            generation_years: Some(4.0),
            rate: Some(DriftRate::certain(0.01)),
            expected_heterozygosity: Some([0.6, 0.0]),
            inbreeding_coefficient: Some([0.0, 0.0]),
            allelic_richness: Some([3.0, 0.0]),
            gene_copies: 20,
            kept_since_baseline: Some([1.0, 0.0]),
            spectrum: Spectrum::new(&[[5, 40, 300], [20, 40, 400], [35, 40, 300]]),
            alleles: 1000,
            sources: vec![SourceStratum {
                stratum: "Birch@2020".into(),
                within: 0.5,
                between: 0.7,
            }],
        }
    }

    const HORIZON: Horizon = Horizon {
        generations: 10,
        draws: 200,
        seed: 1,
        keep: 0.9,
    };

    // Wright (1931): 0.6 (1 - 1/100)^10 = 0.542629245; F = 1 - 0.99^10 = 0.095617925. The median over
    // the draws of a mean over a thousand alleles lies within a hundredth of the expectation.
    #[test]
    fn heterozygosity_falls_as_expected() {
        let got = project(&start(), &Scenario::status_quo(), &HORIZON).unwrap();
        let last = got.rows.last().unwrap();
        let he = last.expected_heterozygosity.unwrap();
        assert!((he.median - 0.5426292450).abs() < 0.006, "{he:?}");
        assert!(he.central_95[0] < he.central_50[0] && he.central_50[1] < he.central_95[1]);
        assert!((last.inbreeding.median - 0.0956179249911955).abs() < 1e-12);
        let first = got.rows[0].expected_heterozygosity.unwrap();
        assert_eq!((first.median, first.central_95), (0.6, [0.6, 0.6]));
        assert_eq!(got.rows.len(), 11);
        // ln 0.9 / ln 0.99 = 10.4833 generations.
        assert!((got.limit.median.unwrap() - 10.483309).abs() < 1e-4);
        assert_eq!(got.limit.crossed, 0.0);
    }

    // Exact chain, 2N = 100: an allele of 5 % is lost within 10 generations with chance 0.40945.
    #[test]
    fn rare_alleles_vanish_as_in_the_exact_chain() {
        let mut start = start();
        // So many copies typed that the posterior is the frequency itself.
        start.spectrum = Spectrum::new(&[[50_000, 1_000_000, 1000]]);
        let got = project(&start, &Scenario::status_quo(), &HORIZON).unwrap();
        let left = got.rows.last().unwrap().alleles_left.unwrap();
        assert!((left.median - (1.0 - 0.40944809)).abs() < 0.005, "{left:?}");
    }

    #[test]
    fn the_same_seed_gives_the_same_and_a_larger_size_keeps_more() {
        let once = project(&start(), &Scenario::status_quo(), &HORIZON).unwrap();
        assert_eq!(
            once,
            project(&start(), &Scenario::status_quo(), &HORIZON).unwrap()
        );
        let mut larger = Scenario::status_quo();
        larger.size = Size::Given(vec![500.0]);
        let larger = project(&start(), &larger, &HORIZON).unwrap();
        let he = |p: &Projection| p.rows[10].expected_heterozygosity.unwrap().median;
        assert!(he(&larger) > he(&once));
        assert!((larger.first_size[1] - 500.0).abs() < 1e-9);
    }

    // By hand, one generation: Ne = 50, 50 newcomers make half of the parents:
    // 0.99 (0.25 x 0.6 + 0.5 x 0.7 + 0.25 x 0.5) = 0.61875.
    #[test]
    fn a_release_brings_heterozygosity_in() {
        let mut scenario = Scenario::status_quo();
        let arrival = super::super::Arrival {
            individuals: 50.0,
            from: "Birch@2020".into(),
        };
        scenario.release = Some((arrival.clone(), 1));
        let got = project(&start(), &scenario, &HORIZON).unwrap();
        let he = got.rows[1].expected_heterozygosity.unwrap().median;
        assert!((he - 0.61875).abs() < 1e-12, "{he}");
        assert_eq!(got.rows[1].alleles_left, None);
        assert!((got.rows[1].inbreeding.median - 0.01).abs() < 1e-12);
        // Migrants for ever: heterozygosity settles where H = (1-u)(s^2 H + 2ms Hs + m^2 Hs), the
        // difference between the two being gone: by hand with m = 1/2, Hs = 0.5: 0.495 x 0.75 / 0.7525.
        scenario.release = None;
        scenario.migrants = Some(arrival);
        let far = Horizon {
            generations: 400,
            ..HORIZON
        };
        let got = project(&start(), &scenario, &far).unwrap();
        let he = got
            .rows
            .last()
            .unwrap()
            .expected_heterozygosity
            .unwrap()
            .median;
        assert!(
            (he - 0.99 * 0.375 / (1.0 - 0.99 * 0.25)).abs() < 1e-9,
            "{he}"
        );
        assert_eq!(got.rows.last().unwrap().generation, 400);
    }

    #[test]
    fn nobody_knows_the_size() {
        let mut start = start();
        start.rate = None;
        assert!(project(&start, &Scenario::status_quo(), &HORIZON).is_none());
        let mut given = Scenario::status_quo();
        given.size = Size::Given(vec![50.0]);
        assert!(project(&start, &given, &HORIZON).is_some());
    }
}
