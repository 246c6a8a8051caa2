//! What may be left in the years ahead: a fan a population and scenario.

use super::drawing::{Anchor, Drawing};
use super::scale::{Scale, extent};
use super::table::{Cell, Table};
use super::{Figure, PANEL_WIDTH, Panel, numbers, specification};
use crate::report::forecast::{Band, Forecast, Population, Scenario, Step};

const LEFT: f64 = 46.0;
const RIGHT: f64 = PANEL_WIDTH - 14.0;
/// The lowest and the highest pixel of the values.
const FRAME: [f64; 2] = [190.0, 62.0];
const HEIGHT: f64 = 272.0;
/// Panels drawn of one figure; the table has every scenario.
const MOST_PANELS: usize = 48;

/// One population under one scenario.
#[derive(Clone, Copy)]
pub struct Future<'a> {
    /// The population.
    pub population: &'a Population,
    /// The scenario.
    pub scenario: &'a Scenario,
    /// Share of heterozygosity that limits are about.
    pub keep: f64,
    /// Number of the file among several forecasts, where the name of the scenario comes again.
    pub again: Option<usize>,
}

impl Future<'_> {
    /// Name of the scenario, with the number of its file where the name comes again.
    pub fn scenario_name(&self) -> String {
        match self.again {
            None => self.scenario.scenario.clone(),
            Some(file) => format!("{} (forecast {file})", self.scenario.scenario),
        }
    }

    /// What the share of heterozygosity is a share of.
    pub fn share_of(&self) -> &'static str {
        match self.population.kept_since_baseline {
            Some(_) => "the baseline",
            None => "today",
        }
    }

    /// Share of expected heterozygosity left: of the baseline's, or of today's where there is none.
    pub fn kept(&self, step: &Step) -> Option<Band> {
        if self.population.kept_since_baseline.is_some() {
            return step.kept_since_baseline;
        }
        let today = self.scenario.steps.first()?.expected_heterozygosity?.median;
        let share = |x: f64| x / today;
        let band = step.expected_heterozygosity.filter(|_| today > 0.0)?;
        Some(Band {
            median: share(band.median),
            central_50: band.central_50.map(share),
            central_95: band.central_95.map(share),
        })
    }
}

/// Every population under every scenario of all forecasts; what is told twice is kept once.
pub fn futures(forecasts: &[Forecast]) -> Vec<Future<'_>> {
    let mut futures: Vec<Future> = Vec::new();
    for (i, forecast) in forecasts.iter().enumerate() {
        for population in &forecast.populations {
            for scenario in &population.scenarios {
                let same = |f: &&Future| {
                    f.population.population == population.population
                        && f.scenario.scenario == scenario.scenario
                };
                let mut earlier = futures.iter().filter(same).peekable();
                let comes_again = earlier.peek().is_some();
                if earlier.any(|f| f.scenario == scenario) {
                    continue;
                }
                futures.push(Future {
                    population,
                    scenario,
                    keep: forecast.keep,
                    again: comes_again.then_some(i + 1),
                });
            }
        }
    }
    futures
}

/// Fans of heterozygosity and of alleles.
pub fn figures(futures: &[Future]) -> Vec<Figure> {
    [heterozygosity(futures), alleles(futures)]
        .into_iter()
        .flatten()
        .collect()
}

fn heterozygosity(futures: &[Future]) -> Option<Figure> {
    let fans: Vec<Fan> = futures
        .iter()
        .map(|f| Fan::of(f, &|step| f.kept(step), Some(f.keep)))
        .filter(|fan| !fan.points.is_empty())
        .collect();
    let table = heterozygosity_table(futures);
    Some(Figure {
        name: "forecast-heterozygosity",
        title: "Heterozygosity that may be left".to_owned(),
        caption: format!(
            "Share of expected heterozygosity left, by scenario: of the baseline's, or of today's where \
             there is no baseline. {BANDS} Dashed: the share that the programme wants to keep. All \
             panels share the vertical scale, which does not start at zero.",
        ),
        panels: panels(&fans, "Share of expected heterozygosity left")?,
        specification: specification::fans(&table, "kept", "Share of expected heterozygosity left"),
        table,
    })
}

fn alleles(futures: &[Future]) -> Option<Figure> {
    let share = |f: &Future, step: &Step| {
        let all = f.population.alleles as f64;
        let band = step.alleles_left.filter(|_| all > 0.0)?;
        Some(Band {
            median: band.median / all,
            central_50: band.central_50.map(|x| x / all),
            central_95: band.central_95.map(|x| x / all),
        })
    };
    let fans: Vec<Fan> = futures
        .iter()
        .map(|f| Fan::of(f, &|step| share(f, step), None))
        .filter(|fan| !fan.points.is_empty())
        .collect();
    let table = alleles_table(futures);
    Some(Figure {
        name: "forecast-alleles",
        title: "Alleles that may be left".to_owned(),
        caption: format!(
            "Share of the alleles of today's sample that are left, by scenario, where nobody comes in. \
             {BANDS} All panels share the vertical scale, which does not start at zero."
        ),
        panels: panels(&fans, "Share of today's alleles left")?,
        specification: specification::fans(&table, "left", "Alleles left"),
        table,
    })
}

/// How every fan is to be read.
const BANDS: &str = "The line is the median of the simulated futures, the dark band holds the middle half, \
     the light band the middle 95 %; they count chance from generation to generation and what is not \
     known of the effective size and of the frequencies, and presume the scenario.";

/// What one panel shows.
struct Fan<'a> {
    future: &'a Future<'a>,
    /// Years, or generations where nobody knows the years.
    in_years: bool,
    points: Vec<(f64, Band)>,
    limit: Option<f64>,
}

impl<'a> Fan<'a> {
    fn of(
        future: &'a Future<'a>,
        pick: &dyn Fn(&Step) -> Option<Band>,
        limit: Option<f64>,
    ) -> Self {
        let in_years = future.scenario.steps.iter().all(|s| s.year.is_some());
        let when = |s: &Step| match s.year.filter(|_| in_years) {
            Some(year) => year,
            None => s.generation as f64,
        };
        let points = future.scenario.steps.iter();
        Fan {
            future,
            in_years,
            points: points.filter_map(|s| Some((when(s), pick(s)?))).collect(),
            limit,
        }
    }
}

fn panels(fans: &[Fan], what: &str) -> Option<Vec<Panel>> {
    if fans.is_empty() {
        return None;
    }
    let values = fans.iter().flat_map(|fan| {
        let bands = fan.points.iter().flat_map(|(_, b)| b.central_95);
        bands.chain(fan.limit)
    });
    let [low, high] = extent(values, 0.04, [0.0, 1.0]);
    let y = Scale::linear([low.max(0.0), high], FRAME);
    Some(
        fans.iter()
            .take(MOST_PANELS)
            .map(|fan| panel(fan, &y, what))
            .collect(),
    )
}

fn panel(fan: &Fan, y: &Scale, what: &str) -> Panel {
    let future = fan.future;
    let population = future.population.population.as_str();
    let scenario = future.scenario_name();
    let mut d = Drawing::new();
    d.name("name", (8.0, 17.0), Anchor::Start, (population, 304.0));
    d.name("", (8.0, 34.0), Anchor::Start, (&scenario, 304.0));
    d.text("small", (8.0, 52.0), Anchor::Start, what);
    let ends = extent(fan.points.iter().map(|p| p.0), 0.0, [0.0, 1.0]);
    let x = Scale::linear(ends, [LEFT, RIGHT]);
    frame(&mut d, y, &x, fan.in_years);
    let area = |range: &dyn Fn(&Band) -> [f64; 2]| {
        let there = fan.points.iter().map(|(t, b)| (*t, range(b)[0]));
        let back = fan.points.iter().rev().map(|(t, b)| (*t, range(b)[1]));
        let points = there.chain(back).map(|(t, v)| (x.at(t), y.at(v)));
        points.collect::<Vec<_>>()
    };
    d.polyline("deep band", area(&|b| b.central_95), true);
    d.polyline("deep band", area(&|b| b.central_50), true);
    let line = fan.points.iter().map(|(t, b)| (x.at(*t), y.at(b.median)));
    d.polyline("deep line", line, false);
    if let Some(limit) = fan.limit {
        d.line("limit dashed", (LEFT, y.at(limit)), (RIGHT, y.at(limit)));
    }
    legend(&mut d, fan.limit.map(numbers::percent));
    Panel {
        title: format!("{population}, {scenario}"),
        description: description(fan),
        width: PANEL_WIDTH,
        height: HEIGHT,
        body: d.into_body(),
    }
}

fn frame(d: &mut Drawing, y: &Scale, x: &Scale, in_years: bool) {
    for tick in y.ticks(6) {
        let at = y.at(tick);
        d.line("grid", (LEFT, at), (RIGHT, at));
        let label = numbers::decimals(tick, y.places(6));
        d.text("tick", (LEFT - 5.0, at + 4.0), Anchor::End, &label);
    }
    d.line("axis", (LEFT, FRAME[0]), (RIGHT, FRAME[0]));
    for tick in x.ticks(5) {
        let at = x.at(tick);
        d.line("axis", (at, FRAME[0]), (at, FRAME[0] + 4.0));
        let label = numbers::decimals(tick, x.places(5)).replace('\u{202f}', "");
        d.text("tick", (at, FRAME[0] + 16.0), Anchor::Middle, &label);
    }
    let words = match in_years {
        true => "Year",
        false => "Generations from the latest visit",
    };
    let middle = (LEFT + RIGHT) / 2.0;
    d.text("small", (middle, FRAME[0] + 33.0), Anchor::Middle, words);
}

fn legend(d: &mut Drawing, limit: Option<String>) {
    let y = FRAME[0] + 53.0;
    d.line("deep line", (8.0, y - 4.0), (24.0, y - 4.0));
    d.text("small", (29.0, y), Anchor::Start, "median");
    d.rectangle("deep band", (80.0, y - 10.0), (16.0, 11.0));
    d.rectangle("deep band", (80.0, y - 10.0), (16.0, 11.0));
    d.text("small", (101.0, y), Anchor::Start, "middle half");
    d.rectangle("deep band", (176.0, y - 10.0), (16.0, 11.0));
    d.text("small", (197.0, y), Anchor::Start, "middle 95 %");
    if let Some(limit) = limit {
        d.line("limit dashed", (8.0, y + 13.0), (24.0, y + 13.0));
        let words = format!("{limit} % to keep");
        d.text("small", (29.0, y + 17.0), Anchor::Start, &words);
    }
}

fn description(fan: &Fan) -> String {
    let said = |(t, b): &(f64, Band)| {
        let when = match fan.in_years {
            true => numbers::year(*t),
            false => format!("generation {t}"),
        };
        let share = numbers::percent_with_interval(b.median, Some(b.central_95));
        format!("{when}: {share}")
    };
    let ends = [fan.points.first(), fan.points.last()];
    let ends: Vec<String> = ends.into_iter().flatten().map(said).collect();
    ends.join("; ")
}

/// The five numbers of a band, or five empty cells.
fn band_cells(band: Option<Band>) -> [Cell; 5] {
    match band {
        None => [const { Cell::Missing }; 5],
        Some(b) => {
            let [[l95, h95], [l50, h50]] = [b.central_95, b.central_50];
            [b.median, l50, h50, l95, h95].map(|x| Cell::maybe(Some(x)))
        }
    }
}

fn heterozygosity_table(futures: &[Future]) -> Table {
    let mut table = Table::new(
        "Heterozygosity, richness and inbreeding ahead. Empty cells: not followed in this scenario.",
        &[
            ("population", "Population"),
            ("scenario", "Scenario"),
            ("generation", "Generations ahead"),
            ("year", "Year"),
            ("kept", "Share of expected heterozygosity left"),
            ("kept_low_50", "middle half from"),
            ("kept_high_50", "to"),
            ("kept_low_95", "middle 95 % from"),
            ("kept_high_95", "to"),
            ("expected", "Expected heterozygosity"),
            ("expected_low_95", "middle 95 % from"),
            ("expected_high_95", "to"),
            ("observed", "Observed heterozygosity"),
            ("observed_low_95", "middle 95 % from"),
            ("observed_high_95", "to"),
            ("richness", "Allelic richness"),
            ("richness_low_95", "middle 95 % from"),
            ("richness_high_95", "to"),
            ("inbreeding", "Inbreeding accrued"),
            ("inbreeding_low_95", "middle 95 % from"),
            ("inbreeding_high_95", "to"),
        ],
    );
    let three = |band: Option<Band>| {
        let [median, _, _, low, high] = band_cells(band);
        [median, low, high]
    };
    for (f, step) in steps(futures) {
        let mut row = place(f, step);
        row.extend(band_cells(f.kept(step)));
        for band in [
            step.expected_heterozygosity,
            step.observed_heterozygosity,
            step.allelic_richness,
            Some(step.inbreeding),
        ] {
            row.extend(three(band));
        }
        table.rows.push(row);
    }
    table
}

fn alleles_table(futures: &[Future]) -> Table {
    let mut table = Table::new(
        "Alleles of today's sample that are left ahead. Empty cells: not followed in this scenario.",
        &[
            ("population", "Population"),
            ("scenario", "Scenario"),
            ("generation", "Generations ahead"),
            ("year", "Year"),
            ("today", "Alleles today"),
            ("left", "Alleles left"),
            ("left_low_50", "middle half from"),
            ("left_high_50", "to"),
            ("left_low_95", "middle 95 % from"),
            ("left_high_95", "to"),
        ],
    );
    for (f, step) in steps(futures) {
        let mut row = place(f, step);
        row.push(Cell::from(f.population.alleles));
        row.extend(band_cells(step.alleles_left));
        table.rows.push(row);
    }
    table
}

fn steps<'a>(futures: &'a [Future<'a>]) -> impl Iterator<Item = (&'a Future<'a>, &'a Step)> {
    let of_one = |f: &'a Future<'a>| f.scenario.steps.iter().map(move |s| (f, s));
    futures.iter().flat_map(of_one)
}

fn place(f: &Future, step: &Step) -> Vec<Cell> {
    vec![
        Cell::from(f.population.population.as_str()),
        Cell::from(f.scenario_name()),
        Cell::from(step.generation),
        Cell::maybe(step.year),
    ]
}
