//! Management as a forecast takes it: sizes by generation, and what comes in from elsewhere.

use std::path::Path;

use toml::de::DeTable;

use super::Start;
use crate::error::{Error, Problem, Result};
use crate::ingest::settings::{
    ABOVE_ZERO, AT_LEAST_ONE, AT_LEAST_TWO, AT_LEAST_ZERO, RATIO, Value, Walker, find, walk,
};
use crate::model::{nearest, spell_out};
use crate::ne::demographic::{constant_population, sex_ratio};

/// Effective size over census size where a scenario gives a census and no ratio (Frankham 1995).
const DEFAULT_RATIO: f64 = 0.1;

/// One way to manage a population.
#[derive(Debug, Clone, PartialEq)]
pub struct Scenario {
    /// 1-based line where it starts; 0 for the built-in status quo.
    pub row: u64,
    /// Its name.
    pub name: String,
    /// The populations it is for; all when empty.
    pub populations: Vec<String>,
    /// Effective sizes.
    pub size: Size,
    /// Factor by which the size grows each generation, with the size that it never passes.
    pub growth: Option<(f64, f64)>,
    /// Individuals that come in each generation and breed.
    pub migrants: Option<Arrival>,
    /// Individuals released once, at this generation.
    pub release: Option<(Arrival, u32)>,
}

/// Effective sizes by generation.
#[derive(Debug, Clone, PartialEq)]
pub enum Size {
    /// As estimated, times a factor.
    Estimated(f64),
    /// Given by generation from the next one on; the last one stays.
    Given(Vec<f64>),
}

/// Individuals from another stratum.
#[derive(Debug, Clone, PartialEq)]
pub struct Arrival {
    /// How many.
    pub individuals: f64,
    /// The stratum they come from.
    pub from: String,
}

impl Scenario {
    /// Everything stays as it is.
    pub fn status_quo() -> Self {
        Scenario {
            row: 0,
            name: "status quo".to_string(),
            populations: Vec::new(),
            size: Size::Estimated(1.0),
            growth: None,
            migrants: None,
            release: None,
        }
    }

    /// Whether anybody comes in.
    pub fn is_open(&self) -> bool {
        self.migrants.is_some() || self.release.is_some()
    }

    /// Whether the scenario is for a population.
    pub fn is_for(&self, population: &str) -> bool {
        self.populations.is_empty() || self.populations.iter().any(|p| p == population)
    }

    /// Drift rates of generations 1.. when the rate believed now is `now`.
    pub fn rates(&self, now: f64, generations: usize) -> Vec<f64> {
        let size = |g: usize| {
            let base = match &self.size {
                Size::Estimated(factor) => 0.5 / now * factor,
                Size::Given(sizes) => sizes.get(g).or(sizes.last()).copied().unwrap_or(1.0),
            };
            match self.growth {
                Some((factor, most)) => {
                    // A population already beyond its limit stays where it is.
                    (base * factor.powi(g.min(10_000) as i32)).min(most.max(base))
                }
                None => base,
            }
        };
        (0..generations)
            .map(|g| (0.5 / size(g)).clamp(0.0, 0.5))
            .collect()
    }
}

/// Reads and checks a scenario file; the status quo comes first, whatever it says.
///
/// # Errors
/// [`Error::Io`] when it cannot be read, [`Error::Sheet`] with every problem found.
pub fn read_scenarios(path: &Path, starts: &[Start]) -> Result<(Vec<Scenario>, Vec<u8>)> {
    let bytes = std::fs::read(path).map_err(|e| Error::io(path, "read", e))?;
    match parse_scenarios(&bytes, starts) {
        Ok(scenarios) => Ok((scenarios, bytes)),
        Err(problems) => Err(Error::Sheet {
            path: path.to_path_buf(),
            problems,
        }),
    }
}

const KEYS: [&str; 19] = [
    "name",
    "population",
    "populations",
    "effective_size",
    "census",
    "ratio",
    "sizes",
    "times",
    "breeders",
    "family_size_variance",
    "equal_families",
    "males",
    "females",
    "growth",
    "most",
    "migrants",
    "release",
    "generation",
    "from",
];

/// Scenarios from the bytes of their file, or every problem in the order of the file.
pub fn parse_scenarios(
    bytes: &[u8],
    starts: &[Start],
) -> std::result::Result<Vec<Scenario>, Vec<Problem>> {
    walk(bytes, |walker, top| {
        walker.refuse_unknown(top, &["scenario"], "");
        let mut scenarios = vec![Scenario::status_quo()];
        let tables = walker.tables(top, "scenario");
        if tables.is_empty() {
            walker.complain_of_all("there is no scenario", "add a table [[scenario]]");
        }
        for (value, table) in tables {
            let read = scenario(walker, value, table);
            check(walker, value, &read, starts);
            if scenarios.iter().any(|s| s.name == read.name) {
                let what = format!("two scenarios are called '{}'", read.name);
                walker.complain(value, what, "give each a name of its own");
            }
            scenarios.push(read);
        }
        scenarios
    })
}

fn scenario(walker: &mut Walker, value: &Value, table: &DeTable) -> Scenario {
    walker.refuse_unknown(table, &KEYS, " of a scenario");
    let name = walker.text(table, "name");
    if find(table, "name").is_none() {
        walker.complain(value, "a scenario without a name", "add name = \"...\"");
    }
    let mut populations = walker.texts(table, "populations");
    populations.extend(walker.texts(table, "population"));
    let growth = walker.number(table, "growth", ABOVE_ZERO);
    let most = walker.number(table, "most", AT_LEAST_ONE);
    if most.is_some() && growth.is_none() {
        walker.complain(value, "most without growth", "add growth, or take most out");
    }
    let from = walker.text(table, "from");
    let migrants = walker.number(table, "migrants", ABOVE_ZERO);
    let release = walker.number(table, "release", AT_LEAST_ONE);
    let generation = walker.whole(table, "generation", 1, 10_000).unwrap_or(1) as u32;
    if (migrants.is_some() || release.is_some()) != from.is_some() {
        walker.complain(
            value,
            "migrants or a release need the stratum they come from, and from needs one of them",
            "write from = \"population@visit\" beside migrants or release",
        );
    }
    if release.is_none() && find(table, "generation").is_some() {
        walker.complain(
            value,
            "generation says when a release is, and there is none",
            "add release = 10, or take generation out",
        );
    }
    let arrival = |individuals: f64| {
        Some(Arrival {
            individuals,
            from: from.clone()?,
        })
    };
    Scenario {
        row: walker.row(value),
        name: name.unwrap_or_default(),
        populations,
        size: size(walker, value, table),
        growth: growth.map(|g| (g, most.unwrap_or(f64::MAX))),
        migrants: migrants.and_then(arrival),
        release: release.and_then(arrival).map(|a| (a, generation)),
    }
}

/// The sizes: by one of several ways to say them, as estimated when none is said.
fn size(walker: &mut Walker, value: &Value, table: &DeTable) -> Size {
    const WAYS: [&str; 5] = ["effective_size", "sizes", "times", "breeders", "males"];
    let given = |key: &str| find(table, key).is_some();
    let census = walker.number(table, "census", AT_LEAST_ONE);
    let ratio = walker.number(table, "ratio", RATIO);
    let ways = WAYS.iter().filter(|way| given(way)).count();
    if ways + usize::from(given("census") && !given("effective_size")) > 1 {
        walker.complain(
            value,
            "the size is given in more than one way",
            "give one of effective_size, census (with ratio), sizes, times, breeders, or males and \
             females",
        );
    }
    if ratio.is_some() && (census.is_none() || given("effective_size")) {
        walker.complain(
            value,
            "ratio turns a census into an effective size",
            "give census and ratio, or effective_size alone",
        );
    }
    let of_families = given("family_size_variance") || given("equal_families");
    if of_families != given("breeders") {
        walker.complain(
            value,
            "breeders go with family_size_variance or equal_families",
            "give the number of breeding adults, and either the variance of their offspring or \
             equal_families = true",
        );
    }
    if given("males") != given("females") {
        walker.complain(value, "breeders of one sex only", "give males and females");
    }
    if let Some(effective) = walker.number(table, "effective_size", AT_LEAST_ONE) {
        if let Some(census) = census
            && effective > 2.0 * census
        {
            walker.complain(
                value,
                format!("an effective size of {effective} is above twice the census of {census}"),
                "equal families bring Ne to twice the census at most: mend one of the two",
            );
        }
        return Size::Given(vec![effective]);
    }
    if let Some(sizes) = walker.numbers(table, "sizes", AT_LEAST_ONE) {
        return Size::Given(sizes);
    }
    if let Some(times) = walker.number(table, "times", ABOVE_ZERO) {
        return Size::Estimated(times);
    }
    let males = walker.number(table, "males", ABOVE_ZERO);
    let females = walker.number(table, "females", ABOVE_ZERO);
    let by_sexes = males.zip(females).and_then(|(m, f)| sex_ratio(m, f));
    let of = |ne: f64| Size::Given(vec![ne.max(1.0)]);
    by_sexes
        .or_else(|| by_families(walker, value, table))
        .or_else(|| Some(census? * ratio.unwrap_or(DEFAULT_RATIO)))
        .map_or(Size::Estimated(1.0), of)
}

/// Ne = (4N - 2)/(V + 2): equal families have V = 0, so Ne = 2N - 1.
fn by_families(walker: &mut Walker, value: &Value, table: &DeTable) -> Option<f64> {
    let breeders = walker.number(table, "breeders", AT_LEAST_TWO)?;
    let variance = walker.number(table, "family_size_variance", AT_LEAST_ZERO);
    match (walker.flag(table, "equal_families"), variance) {
        (Some(true), None) => constant_population(breeders, 0.0),
        (None | Some(false), Some(variance)) => constant_population(breeders, variance),
        (Some(true), Some(_)) => {
            walker.complain(
                value,
                "equal families have no variance of family size",
                "give either family_size_variance or equal_families = true",
            );
            None
        }
        _ => None,
    }
}

/// Whether the report has what a scenario names.
fn check(walker: &mut Walker, value: &Value, scenario: &Scenario, starts: &[Start]) {
    let names = || starts.iter().map(|s| s.population.as_str());
    for name in &scenario.populations {
        if !names().any(|known| known == name) {
            let cure = match nearest(name, names()) {
                Some(near) => format!("did you mean '{near}'?"),
                None => format!("the report has {}", spell_out(names())),
            };
            walker.complain(
                value,
                format!("no population '{name}' in the report"),
                &cure,
            );
        }
    }
    let arrivals = scenario
        .migrants
        .iter()
        .chain(scenario.release.iter().map(|(a, _)| a));
    for arrival in arrivals {
        for start in starts.iter().filter(|s| scenario.is_for(&s.population)) {
            if start.source(&arrival.from).is_some() {
                continue;
            }
            let sources = || start.sources.iter().map(|s| s.stratum.as_str());
            let cure = match nearest(&arrival.from, sources()) {
                Some(near) => format!("did you mean '{near}'?"),
                None if start.sources.is_empty() => {
                    "the report compares it with no other population: name the populations that \
                     the scenario is for"
                        .to_string()
                }
                None => format!("the report compares it with {}", spell_out(sources())),
            };
            let what = format!(
                "'{}' is no stratum that the report compares with {}",
                arrival.from, start.stratum
            );
            walker.complain(value, what, &cure);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn parse(text: &str) -> std::result::Result<Vec<Scenario>, Vec<Problem>> {
        parse_scenarios(text.as_bytes(), &[])
    }

    fn size_of(keys: &str) -> f64 {
        let scenarios = parse(&format!("[[scenario]]\nname = \"x\"\n{keys}\n")).unwrap();
        match &scenarios[1].size {
            Size::Given(sizes) => sizes[0],
            other => panic!("{other:?}"),
        }
    }

    // Wright (1931), Crow & Denniston (1988): 4 x 10 x 40/50 = 32; (40 - 2)/(2.4 + 2) = 8.636364;
    // equal families 2N - 1 = 19. Census by ratio: arithmetic.
    #[test]
    fn sizes_by_each_way() {
        assert!((size_of("males = 10\nfemales = 40") - 32.0).abs() < 1e-12);
        let close = size_of("breeders = 10\nfamily_size_variance = 2.4") - 8.636363636363637;
        assert!(close.abs() < 1e-9);
        assert!((size_of("breeders = 10\nequal_families = true") - 19.0).abs() < 1e-12);
        assert!((size_of("census = 800") - 80.0).abs() < 1e-9);
        assert!((size_of("census = 800\nratio = 0.25") - 200.0).abs() < 1e-9);
    }

    #[test]
    fn paths_of_rates() {
        let mut scenario = Scenario::status_quo();
        assert_eq!(scenario.rates(0.01, 2), [0.01, 0.01]);
        scenario.growth = Some((2.0, 150.0));
        assert_eq!(scenario.rates(0.01, 3), [0.01, 0.005, 0.5 / 150.0]);
        scenario.size = Size::Given(vec![10.0, 100.0]);
        scenario.growth = None;
        assert_eq!(scenario.rates(0.3, 3), [0.05, 0.005, 0.005]);
    }

    #[test]
    fn problems_are_all_told() {
        let problems = parse(
            "[[scenario]]\nname = \"a\"\neffective_size = 50\ncensus = 20\n\
             [[scenario]]\nname = \"b\"\neffective_size = 50\nsizes = [3]\n\
             [[scenario]]\nname = \"c\"\nmales = 3\n\
             [[scenario]]\nname = \"d\"\nmigrants = -1\n\
             [[scenario]]\neffective_siz = 50\n\
             [[scenario]]\nname = \"a\"\nsizes = [3, \"x\"]\n",
        )
        .unwrap_err();
        let text: Vec<String> = problems
            .iter()
            .map(|p| format!("{:?} {} {}", p.row, p.what, p.cure))
            .collect();
        for part in [
            "Some(1) an effective size of 50 is above twice the census of 20",
            "Some(5) the size is given in more than one way",
            "Some(9) breeders of one sex only",
            "migrants is not a number above 0",
            "unknown key 'effective_siz'",
            "without a name",
            "two scenarios are called 'a'",
            "sizes is not a list of numbers",
        ] {
            assert!(text.iter().any(|t| t.contains(part)), "{part}: {text:#?}");
        }
    }
}
