//! Numbers and movement of the populations.

use std::collections::BTreeSet;

use super::super::numbers::{adults, females, released};
use super::super::sampling::slug;
use super::super::scenario::{Mating, Population, Scenario};
use super::{Found, MOST_ADULTS, MOST_GENERATIONS};

impl Found {
    pub(super) fn populations(&mut self, s: &Scenario) {
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

    pub(super) fn numbers(&mut self, p: &Population, key: &str) {
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
            self.range(
                &format!("{key}.bottleneck.size"),
                f64::from(b.size),
                2.0,
                most,
            );
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
        for variance in [p.family_variance, p.male_family_variance]
            .into_iter()
            .flatten()
        {
            self.range(&format!("{key}.family_variance"), variance, 0.0, 1e9);
        }
        self.range(
            &format!("{key}.starts_at"),
            f64::from(p.starts_at),
            0.0,
            f64::from(MOST_GENERATIONS),
        );
        self.range(&format!("{key}.divergence"), p.divergence, 0.0, 0.99);
    }

    pub(super) fn movement(&mut self, s: &Scenario) {
        let names: Vec<&str> = s.population.iter().map(|p| p.name.as_str()).collect();
        let ways = s.migration.iter().map(|m| ("migration", &m.from, &m.to));
        let ways: Vec<_> = ways
            .chain(s.release.iter().map(|r| ("release", &r.from, &r.to)))
            .collect();
        for (key, from, to) in ways {
            for name in [from, to] {
                self.need(
                    names.contains(&name.as_str()),
                    format!("`{key}` names {name}, which is no population"),
                    "use the `name` of a [[population]]",
                );
            }
            self.need(
                from != to,
                format!("`{key}` from {from} to itself"),
                "name two populations",
            );
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
                format!(
                    "release of {} from {} in generation {}",
                    r.number, r.from, r.generation
                ),
                "release at least one individual, in generation 1 or later",
            );
        }
        for (i, p) in s
            .population
            .iter()
            .enumerate()
            .filter(|(_, p)| p.starts_at > 0)
        {
            let number: u32 = released(s, i, p.starts_at).map(|(_, n)| n).sum();
            self.need(
                number >= 2,
                format!(
                    "{} starts in generation {} with {number} adults",
                    p.name, p.starts_at
                ),
                "add a [[release]] to it of two or more in that generation",
            );
        }
    }

    pub(super) fn sizes(&mut self, s: &Scenario) {
        let last = s.visit.iter().map(|v| v.generation).max().unwrap_or(0);
        if last > MOST_GENERATIONS {
            self.range(
                "visit.generation",
                f64::from(last),
                0.0,
                f64::from(MOST_GENERATIONS),
            );
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
                    format!(
                        "{moved} released into {} of {n} adults in generation {generation}",
                        p.name
                    ),
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
    pub(super) fn variance(&mut self, s: &Scenario, population: usize, n: u32, generation: u32) {
        let p = &s.population[population];
        let f = females(s, population, n);
        let parents = match s.mating {
            Mating::Random => vec![
                (p.family_variance, f),
                (p.male_family_variance.or(p.family_variance), n - f),
            ],
            Mating::Pairs => vec![(p.family_variance, f.min(n - f))],
            Mating::Selfing => vec![(p.family_variance, n)],
        };
        for (variance, parents) in parents {
            let (Some(variance), true) = (variance, parents > 1) else {
                continue;
            };
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
}
