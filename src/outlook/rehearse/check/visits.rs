//! The visits.

use std::collections::BTreeSet;

use super::super::numbers::adults;
use super::super::sampling::visited;
use super::super::scenario::{Plan, Scenario, Visit};
use super::Found;

impl Found {
    pub(super) fn visits(&mut self, s: &Scenario) {
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
                    format!(
                        "`{key}.populations` names {name}, not there in generation {}",
                        v.generation
                    ),
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
                    seen.insert((p, v.generation))
                        && (label.is_empty() || labels.insert((p, label.clone()))),
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

    pub(super) fn sample(&mut self, s: &Scenario, v: &Visit, population: usize, key: &str) {
        self.range(
            &format!("{key}.individuals"),
            f64::from(v.individuals),
            1.0,
            1e6,
        );
        let n = adults(s, population, v.generation);
        self.need(
            v.plan == Plan::II || v.individuals <= n,
            format!(
                "`{key}` samples {} of {n} adults of {}",
                v.individuals, s.population[population].name
            ),
            "sample fewer, or juveniles (plan = \"II\")",
        );
        self.need(
            v.replicates <= v.individuals,
            format!(
                "`{key}` has {} replicates of {} individuals",
                v.replicates, v.individuals
            ),
            "replicate each individual once at most",
        );
        let earlier = |o: &&Visit| o.generation < v.generation && visited(o, s, population);
        let before = s.visit.iter().filter(earlier).max_by_key(|o| o.generation);
        let known = before.map_or(0, |o| o.individuals);
        let siblings = u64::from(v.full_sib_families) * u64::from(v.full_sib_family_size);
        self.need(
            v.recaptured <= known && u64::from(v.recaptured) + siblings <= u64::from(v.individuals),
            format!(
                "`{key}`: {} recaptured and {siblings} siblings of {} individuals",
                v.recaptured, v.individuals
            ),
            "let both fit into `individuals`, and the recaptured into the visit before",
        );
        self.need(
            siblings == 0 || (v.plan == Plan::II && v.generation + s.settling_generations > 0),
            format!("`{key}.full_sib_families` needs parents to choose"),
            "use plan = \"II\" and a generation after the first of all",
        );
    }
}
