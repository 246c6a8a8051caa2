//! Everything wrong with a scenario, all at once, each with its key and its cure.

use std::collections::BTreeSet;
use std::path::Path;

use super::genome::{CONTIG_MARGIN, carriers, contigs};
use super::population::{adults, females, released};
use super::sampling::{slug, visited};
use super::scenario::{Field, Frequencies, Genotyping, LocusSet, Mating, Plan, Population, Scenario, Visit};
use crate::error::{Error, Problem, Result};

/// Longest contig that a `.tbi` index reaches.
const LONGEST_CONTIG: u64 = (1 << 29) - 1;
/// Most adults of all populations together, and most generations: beyond, a slip of the pen.
const MOST_ADULTS: u64 = 20_000_000;
const MOST_GENERATIONS: u32 = 100_000;

/// Reads and checks a scenario file.
///
/// # Errors
///
/// [`Error::Io`] where it cannot be read, [`Error::Sheet`] with every problem found.
pub fn read_scenario(path: &Path) -> Result<Scenario> {
    let text = std::fs::read_to_string(path).map_err(|e| Error::io(path, "read", e))?;
    let scenario: Scenario = toml::from_str(&text).map_err(|e| {
        let row = e.span().map(|s| text[..s.start.min(text.len())].matches('\n').count() as u64 + 1);
        let cure = "see the reference of scenario keys for names and kinds of values".into();
        let problems = vec![Problem { row, what: e.message().trim().to_string(), cure }];
        Error::Sheet { path: path.into(), problems }
    })?;
    let problems = problems(&scenario);
    if problems.is_empty() { Ok(scenario) } else { Err(Error::Sheet { path: path.into(), problems }) }
}

/// Every problem of a scenario; none makes it fit to run.
pub fn problems(scenario: &Scenario) -> Vec<Problem> {
    let mut found = Found::default();
    found.clock(scenario);
    found.chromosomes(scenario);
    for (i, set) in scenario.loci.iter().enumerate() {
        found.loci(scenario, set, &format!("loci[{}]", i + 1));
    }
    found.need(!scenario.loci.is_empty(), "no `loci`", "add a [[loci]] table");
    found.populations(scenario);
    found.movement(scenario);
    found.genotyping(&scenario.genotyping);
    // Sizes by generation need the above to make sense.
    if found.0.is_empty() {
        found.sizes(scenario);
        found.visits(scenario);
    }
    found.0
}

#[derive(Default)]
struct Found(Vec<Problem>);

/// Whether a number lies in a range; no for NaN.
fn inside(value: f64, low: f64, high: f64) -> bool {
    value >= low && value <= high
}

impl Found {
    fn need(&mut self, fine: bool, what: impl Into<String>, cure: impl Into<String>) {
        if !fine {
            self.0.push(Problem { row: None, what: what.into(), cure: cure.into() });
        }
    }

    fn range(&mut self, key: &str, value: f64, low: f64, high: f64) {
        let cure = format!("give a number from {low} to {high}");
        self.need(inside(value, low, high), format!("`{key}` is {value}"), cure);
    }

    fn clock(&mut self, s: &Scenario) {
        self.range("start_year", s.start_year, -1e6, 1e6);
        self.range("generation_years", s.generation_years, 1e-3, 1e4);
        self.range("settling_generations", f64::from(s.settling_generations), 0.0, 10_000.0);
        self.need(!s.visit.is_empty(), "no `visit`", "add a [[visit]] table");
        self.need(!s.population.is_empty(), "no `population`", "add a [[population]] table");
    }

    fn chromosomes(&mut self, s: &Scenario) {
        self.need(!s.chromosome.is_empty(), "no `chromosome`", "add a [[chromosome]] table");
        for (i, c) in s.chromosome.iter().enumerate() {
            let key = format!("chromosome[{}]", i + 1);
            self.need(
                contig_name(&c.name),
                format!("`{key}.name` is \"{}\"", c.name),
                "use letters, digits, _ - and . without spaces",
            );
            self.range(&format!("{key}.length_bp"), c.length_bp as f64, 1000.0, LONGEST_CONTIG as f64);
            self.range(&format!("{key}.copies"), f64::from(c.copies), 1.0, 10_000.0);
            if let Some(length) = c.map_length_cm {
                self.range(&format!("{key}.map_length_cm"), length, 0.0, 100_000.0);
                self.need(
                    !c.unlinked,
                    format!("`{key}` has both `map_length_cm` and `unlinked`"),
                    "leave one out",
                );
            }
        }
        if self.0.is_empty() {
            let mut names = BTreeSet::new();
            for contig in contigs(s) {
                let once = names.insert(contig.name.clone());
                self.need(once, format!("two chromosomes named {}", contig.name), "rename one");
            }
        }
    }

    fn loci(&mut self, s: &Scenario, set: &LocusSet, key: &str) {
        self.range(&format!("{key}.count"), f64::from(set.count), 1.0, 50_000_000.0);
        self.range(&format!("{key}.alleles"), f64::from(set.alleles), 2.0, 64.0);
        for name in &set.chromosomes {
            let known = s.chromosome.iter().any(|c| c.name == *name);
            self.need(
                known,
                format!("`{key}.chromosomes` names {name}, which is no chromosome"),
                "use the `name` of a [[chromosome]]",
            );
        }
        let two = |found: &mut Self, kind: &str| {
            found.need(
                set.alleles == 2,
                format!("`{key}.frequencies` is `{kind}` for {} alleles", set.alleles),
                "use `dirichlet` or `list` for more than two alleles",
            );
        };
        let shape = format!("{key}.frequencies");
        match &set.frequencies {
            Frequencies::Beta([a, b]) => {
                two(self, "beta");
                self.range(&shape, *a, 1e-3, 1e6);
                self.range(&shape, *b, 1e-3, 1e6);
            }
            Frequencies::Dirichlet(a) => self.range(&shape, *a, 1e-3, 1e6),
            Frequencies::Minor([low, high]) => {
                two(self, "minor");
                self.need(
                    inside(*low, 0.0, *high) && inside(*high, *low, 0.5),
                    format!("`{shape}` is minor = [{low}, {high}]"),
                    "give two numbers from 0 to 0.5, the lower first",
                );
            }
            Frequencies::List(list) => {
                let sum: f64 = list.iter().sum();
                let fine = list.iter().all(|&f| inside(f, 0.0, 1.0)) && (sum - 1.0).abs() < 1e-6;
                self.need(
                    fine && list.len() == set.alleles as usize,
                    format!("`{shape}` lists {} numbers of sum {sum}", list.len()),
                    format!("give {} numbers from 0 to 1 of sum 1", set.alleles),
                );
            }
        }
        // Room for the loci, with all sets on the smallest chromosome in mind.
        let all = contigs(s);
        let room: u64 = carriers(&all, &set.chromosomes, s)
            .into_iter()
            .map(|c| all[c].length_bp.saturating_sub(CONTIG_MARGIN))
            .sum();
        let wanted: u64 = s.loci.iter().map(|l| u64::from(l.count)).sum();
        self.need(
            wanted * 4 <= room,
            format!("`{key}`: {wanted} loci in all for {room} bases of its chromosomes"),
            "have four bases a locus or more",
        );
    }

    fn populations(&mut self, s: &Scenario) {
        let (mut names, mut slugs) = (BTreeSet::new(), BTreeSet::new());
        for (i, p) in s.population.iter().enumerate() {
            let key = format!("population[{}]", i + 1);
            let plain = !p.name.trim().is_empty()
                && !p.name.contains(['\t', '\n', '\r', '"', ',', '@'])
                && !slug(&p.name).is_empty();
            self.need(
                plain,
                format!("`{key}.name` is \"{}\"", p.name),
                "use at least one letter or digit, and no tab, comma, quote or @",
            );
            self.need(
                names.insert(p.name.clone()) && slugs.insert(slug(&p.name)),
                format!("`{key}.name` {} is too like another", p.name),
                "let names differ in their letters and digits",
            );
            self.numbers(p, &key);
        }
    }

    fn numbers(&mut self, p: &Population, key: &str) {
        let most = MOST_ADULTS as f64;
        match (p.size, p.sizes.is_empty()) {
            (Some(size), true) => self.range(&format!("{key}.size"), f64::from(size), 2.0, most),
            (None, false) => {
                for &size in &p.sizes {
                    self.range(&format!("{key}.sizes"), f64::from(size), 2.0, most);
                }
                self.need(
                    p.growth_rate == 0.0 && p.largest_size.is_none(),
                    format!("`{key}` has `sizes` and growth"),
                    "give `size` with `growth_rate`, or write the sizes out",
                );
            }
            _ => self.need(
                false,
                format!("`{key}` needs `size` or `sizes`"),
                "give one of the two",
            ),
        }
        self.range(&format!("{key}.growth_rate"), p.growth_rate, -0.99, 100.0);
        if let Some(limit) = p.largest_size {
            self.range(&format!("{key}.largest_size"), f64::from(limit), 2.0, most);
        }
        for b in &p.bottleneck {
            self.range(&format!("{key}.bottleneck.size"), f64::from(b.size), 2.0, most);
            self.need(
                b.from <= b.to,
                format!("`{key}.bottleneck` from {} to {}", b.from, b.to),
                "put the earlier generation first",
            );
        }
        self.need(
            p.female_share > 0.0 && p.female_share < 1.0,
            format!("`{key}.female_share` is {}", p.female_share),
            "give a share between 0 and 1",
        );
        for variance in [p.family_variance, p.male_family_variance].into_iter().flatten() {
            self.range(&format!("{key}.family_variance"), variance, 0.0, 1e9);
        }
        self.range(&format!("{key}.starts_at"), f64::from(p.starts_at), 0.0, f64::from(MOST_GENERATIONS));
        self.range(&format!("{key}.divergence"), p.divergence, 0.0, 0.99);
    }

    fn movement(&mut self, s: &Scenario) {
        let names: Vec<&str> = s.population.iter().map(|p| p.name.as_str()).collect();
        let ways = s.migration.iter().map(|m| ("migration", &m.from, &m.to));
        let ways: Vec<_> = ways.chain(s.release.iter().map(|r| ("release", &r.from, &r.to))).collect();
        for (key, from, to) in ways {
            for name in [from, to] {
                self.need(
                    names.contains(&name.as_str()),
                    format!("`{key}` names {name}, which is no population"),
                    "use the `name` of a [[population]]",
                );
            }
            self.need(from != to, format!("`{key}` from {from} to itself"), "name two populations");
        }
        for m in &s.migration {
            let way = format!("migration from {} to {}", m.from, m.to);
            self.need(
                m.rate.is_some() != m.number.is_some(),
                format!("{way} needs `rate` or `number`"),
                "give one of the two",
            );
            if let Some(rate) = m.rate {
                self.range("migration.rate", rate, 0.0, 1.0);
            }
        }
        for r in &s.release {
            self.need(
                r.number > 0 && (r.generation > 0),
                format!("release of {} from {} in generation {}", r.number, r.from, r.generation),
                "release at least one individual, in generation 1 or later",
            );
        }
        for (i, p) in s.population.iter().enumerate().filter(|(_, p)| p.starts_at > 0) {
            let number: u32 = released(s, i, p.starts_at).map(|(_, n)| n).sum();
            self.need(
                number >= 2,
                format!("{} starts in generation {} with {number} adults", p.name, p.starts_at),
                "add a [[release]] to it of two or more in that generation",
            );
        }
    }

    fn genotyping(&mut self, g: &Genotyping) {
        self.range("genotyping.miscall_rate", g.miscall_rate, 0.0, 1.0);
        self.range("genotyping.dropout_rate", g.dropout_rate, 0.0, 1.0);
        self.range("genotyping.missing_rate", g.missing_rate, 0.0, 0.99);
        self.range("genotyping.missing_spread_loci", g.missing_spread_loci, 0.0, 10.0);
        self.range("genotyping.missing_spread_samples", g.missing_spread_samples, 0.0, 10.0);
        self.range("genotyping.depth_spread_loci", g.depth_spread_loci, 0.0, 10.0);
        self.range("genotyping.depth_spread_samples", g.depth_spread_samples, 0.0, 10.0);
        self.range("genotyping.read_error_rate", g.read_error_rate, 0.0, 0.5);
        if let Some(depth) = g.depth {
            self.range("genotyping.depth", depth, 0.01, 10_000.0);
        }
        self.need(
            g.depth.is_some() || g.fields.is_empty(),
            "`genotyping.fields` without `genotyping.depth`",
            "give the mean depth",
        );
        for field in [Field::AD, Field::DP, Field::GQ, Field::PL] {
            let times = g.fields.iter().filter(|&&f| f == field).count();
            self.need(times < 2, format!("`genotyping.fields` has {field:?} twice"), "name it once");
        }
    }

    fn sizes(&mut self, s: &Scenario) {
        let last = s.visit.iter().map(|v| v.generation).max().unwrap_or(0);
        if last > MOST_GENERATIONS {
            self.range("visit.generation", f64::from(last), 0.0, f64::from(MOST_GENERATIONS));
            return;
        }
        for generation in 0..=last {
            let mut total = 0;
            for (i, p) in s.population.iter().enumerate() {
                let n = adults(s, i, generation);
                total += u64::from(n);
                let moved: u64 = released(s, i, generation).map(|(_, k)| u64::from(k)).sum();
                self.need(
                    moved <= u64::from(n) || p.starts_at > generation,
                    format!("{moved} released into {} of {n} adults in generation {generation}", p.name),
                    "release fewer, or let it be larger",
                );
                self.variance(s, i, n, generation);
            }
            if total > MOST_ADULTS || self.0.len() > 20 {
                self.need(
                    total <= MOST_ADULTS,
                    format!("{total} adults in generation {generation}"),
                    format!("stay at or below {MOST_ADULTS}; see `largest_size`"),
                );
                return;
            }
        }
    }

    /// A variance of family size above 4N - 4 leaves one parent of a sex: Ne = 1.
    fn variance(&mut self, s: &Scenario, population: usize, n: u32, generation: u32) {
        let p = &s.population[population];
        let f = females(s, population, n);
        let parents = match s.mating {
            Mating::Random => vec![(p.family_variance, f), (p.male_family_variance.or(p.family_variance), n - f)],
            Mating::Pairs => vec![(p.family_variance, f.min(n - f))],
            Mating::Selfing => vec![(p.family_variance, n)],
        };
        for (variance, parents) in parents {
            let (Some(variance), true) = (variance, parents > 1) else { continue };
            let most = 4.0 * f64::from(parents) - 4.0;
            self.need(
                variance < most,
                format!(
                    "`family_variance` {variance} for {parents} parents of {} in generation {generation}",
                    p.name
                ),
                format!("stay below {most}, where one parent has all offspring"),
            );
        }
    }

    fn visits(&mut self, s: &Scenario) {
        let mut seen = BTreeSet::new();
        let mut labels = BTreeSet::new();
        for (i, v) in s.visit.iter().enumerate() {
            let key = format!("visit[{}]", i + 1);
            for name in &v.populations {
                let there = s
                    .population
                    .iter()
                    .position(|p| p.name == *name)
                    .is_some_and(|p| adults(s, p, v.generation) > 0);
                self.need(
                    there,
                    format!("`{key}.populations` names {name}, not there in generation {}", v.generation),
                    "use the `name` of a [[population]] that has started",
                );
            }
            let label = v.label.clone().unwrap_or_default();
            self.need(
                !label.contains(['\t', '\n', '\r', '"', ',', '@']),
                format!("`{key}.label` is \"{label}\""),
                "use no tab, comma, quote or @",
            );
            for p in (0..s.population.len()).filter(|&p| visited(v, s, p)) {
                let name = &s.population[p].name;
                self.need(
                    seen.insert((p, v.generation)) && (label.is_empty() || labels.insert((p, label.clone()))),
                    format!("`{key}` visits {name} twice in one generation or under one label"),
                    "merge the two visits, or change one",
                );
                self.sample(s, v, p, &key);
            }
            self.need(
                (0..s.population.len()).any(|p| visited(v, s, p)),
                format!("`{key}` visits nobody in generation {}", v.generation),
                "choose a later generation",
            );
        }
    }

    fn sample(&mut self, s: &Scenario, v: &Visit, population: usize, key: &str) {
        self.range(&format!("{key}.individuals"), f64::from(v.individuals), 1.0, 1e6);
        let n = adults(s, population, v.generation);
        self.need(
            v.plan == Plan::II || v.individuals <= n,
            format!("`{key}` samples {} of {n} adults of {}", v.individuals, s.population[population].name),
            "sample fewer, or juveniles (plan = \"II\")",
        );
        self.need(
            v.replicates <= v.individuals,
            format!("`{key}` has {} replicates of {} individuals", v.replicates, v.individuals),
            "replicate each individual once at most",
        );
        let earlier = |o: &&Visit| o.generation < v.generation && visited(o, s, population);
        let before = s.visit.iter().filter(earlier).max_by_key(|o| o.generation);
        let known = before.map_or(0, |o| o.individuals);
        let siblings = u64::from(v.full_sib_families) * u64::from(v.full_sib_family_size);
        self.need(
            v.recaptured <= known && u64::from(v.recaptured) + siblings <= u64::from(v.individuals),
            format!("`{key}`: {} recaptured and {siblings} siblings of {} individuals", v.recaptured, v.individuals),
            "let both fit into `individuals`, and the recaptured into the visit before",
        );
        self.need(
            siblings == 0 || (v.plan == Plan::II && v.generation + s.settling_generations > 0),
            format!("`{key}.full_sib_families` needs parents to choose"),
            "use plan = \"II\" and a generation after the first of all",
        );
    }
}

fn contig_name(name: &str) -> bool {
    let fine = |c: char| c.is_ascii_alphanumeric() || "_-.".contains(c);
    name.starts_with(|c: char| c.is_ascii_alphanumeric()) && name.chars().all(fine)
}
