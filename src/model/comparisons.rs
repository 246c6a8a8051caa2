//! Which strata are compared, and how many generations lie between them.

use std::collections::BTreeMap;

use super::{
    Comparison, ComparisonKind, Note, PopulationSettings, Problem, Programme, SamplingPlan, Strata,
    Stratum, nearest, spell_out,
};

/// From this share of the census on, a sample under plan II gets a note: if the sampled individuals
/// did reproduce after all, plan I holds, and the two plans differ by 1/N against about 1/S.
const LARGE_SHARE_OF_CENSUS: f64 = 0.2;

/// The comparisons of a sheet, in report order, and what a person should know of them.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Compared {
    /// All since the baseline, then all between visits, then all between populations; within a kind
    /// in the order of the strata.
    pub comparisons: Vec<Comparison>,
    /// Index of the baseline stratum by population; populations of one visit have that one.
    pub baselines: BTreeMap<String, usize>,
    /// Notes.
    pub notes: Vec<Note>,
}

/// Chooses the comparisons.
///
/// - `SinceBaseline`: each visit after the baseline of its population, against that baseline. The
///   baseline is the visit of that label, else of that year, else the earliest.
/// - `BetweenVisits`: each visit against the one before, where that is not the baseline. Visits
///   before the baseline appear here only, and are noted.
/// - `BetweenPopulations`: every two populations that have a visit of the same label, at that visit.
///   Generations are `None`.
///
/// Generations between visits are the difference of the mean generations where both strata have
/// one, else the difference of the mean years divided by the generation length, else `None`. Two
/// visits of the same time have `None` too: no drift can be told from them, which is noted.
///
/// # Errors
/// Every problem at once: a baseline that a population of several visits does not have, a generation
/// that falls while the years rise, sampling plan I without a census size.
pub fn comparisons(strata: &Strata, programme: &Programme) -> Result<Compared, Vec<Problem>> {
    let mut chooser = Chooser {
        strata: &strata.strata,
        ..Chooser::default()
    };
    let mut populations: BTreeMap<&str, Vec<usize>> = BTreeMap::new();
    for (index, stratum) in strata.strata.iter().enumerate() {
        populations
            .entry(&stratum.population)
            .or_default()
            .push(index);
    }
    for (population, visits) in &populations {
        chooser.population(population, visits, &programme.settings(population));
    }
    chooser.between_populations(&populations);
    chooser.note_missing_lengths();
    chooser.note_unsampled(programme, &populations);
    if !chooser.problems.is_empty() {
        return Err(chooser.problems);
    }
    // Stable: the order of the strata stays within a kind.
    chooser
        .compared
        .comparisons
        .sort_by_key(|comparison| comparison.kind);
    Ok(chooser.compared)
}

#[derive(Default)]
struct Chooser<'a> {
    strata: &'a [Stratum],
    compared: Compared,
    problems: Vec<Problem>,
    without_length: Vec<&'a str>,
}

impl<'a> Chooser<'a> {
    fn population(&mut self, population: &str, visits: &[usize], settings: &PopulationSettings) {
        let baseline = match self.baseline(visits, settings.baseline.as_deref()) {
            Ok(baseline) => baseline,
            Err(complaint) if visits.len() > 1 => {
                self.problems.push(Problem::of_all(
                    format!("population '{population}': {complaint}"),
                    format!(
                        "its visits are {}; name one of them in the programme file under \
                         [population.\"{population}\"], or leave the baseline out to use the earliest",
                        self.visit_names(visits)
                    ),
                ));
                return;
            }
            // One visit is compared with nothing in time, whatever the baseline.
            Err(_) => 0,
        };
        let first = visits[baseline];
        self.compared
            .baselines
            .insert(population.to_string(), first);
        self.check_generations(visits);
        self.check_census(population, visits, first, settings);
        for &later in &visits[baseline + 1..] {
            self.in_time(first, later, ComparisonKind::SinceBaseline, settings);
        }
        for pair in visits.windows(2).filter(|pair| pair[0] != first) {
            self.in_time(pair[0], pair[1], ComparisonKind::BetweenVisits, settings);
        }
        if baseline > 0 {
            self.note(
                "visits_before_baseline",
                population,
                format!(
                    "{} came before the baseline '{}': compared from visit to visit only.",
                    self.visit_names(&visits[..baseline]),
                    self.strata[first].visit
                ),
            );
        }
    }

    /// Place among `visits` of the baseline written as `text`, or the complaint.
    fn baseline(&self, visits: &[usize], text: Option<&str>) -> Result<usize, String> {
        let Some(text) = text.map(str::trim) else {
            return Ok(0);
        };
        let places = |test: &dyn Fn(&Stratum) -> bool| -> Vec<usize> {
            (0..visits.len())
                .filter(|&i| test(&self.strata[visits[i]]))
                .collect()
        };
        let mut found = places(&|s| s.visit == text);
        if found.is_empty() {
            found = places(&|s| s.visit.to_lowercase() == text.to_lowercase());
        }
        if let (true, Ok(year)) = (found.is_empty(), text.parse::<f64>()) {
            found = places(&|s| s.year == year);
            if found.is_empty() {
                found = places(&|s| s.year.floor() == year);
            }
        }
        match found[..] {
            [] => Err(format!(
                "no visit is labelled '{text}' or was made in that year"
            )),
            [place] => Ok(place),
            _ => Err(format!("'{text}' fits more than one visit")),
        }
    }

    fn visit_names(&self, visits: &[usize]) -> String {
        spell_out(visits.iter().map(|&i| self.strata[i].visit.as_str()))
    }

    /// Years must not rise while generations fall: one of the two columns is wrong.
    fn check_generations(&mut self, visits: &[usize]) {
        let known: Vec<&Stratum> = visits
            .iter()
            .map(|&i| &self.strata[i])
            .filter(|s| s.generation.is_some())
            .collect();
        for pair in known.windows(2) {
            if let (Some(before), Some(after)) = (pair[0].generation, pair[1].generation)
                && after < before
            {
                self.problems.push(Problem::of_all(
                    format!(
                        "'{}' (year {}) is generation {before}, but the later '{}' (year {}) is \
                         generation {after}",
                        pair[0].name, pair[0].year, pair[1].name, pair[1].year
                    ),
                    "correct the column 'generation' or the years",
                ));
            }
        }
    }

    fn check_census(
        &mut self,
        population: &str,
        visits: &[usize],
        baseline: usize,
        settings: &PopulationSettings,
    ) {
        if visits.len() < 2 {
            return;
        }
        let sampled = self.strata[baseline].individuals();
        let one = settings.plan == Some(SamplingPlan::One);
        match settings.census {
            None if one => self.problems.push(Problem::of_all(
                format!("population '{population}': sampling plan I needs a census size"),
                "give the number of individuals at the baseline with --census or in the programme \
                 file; plan II needs none",
            )),
            None => {}
            Some(census) if census < sampled as f64 => self.note(
                "census_below_sample",
                population,
                format!("{sampled} individuals were sampled of a census of {census}: check both."),
            ),
            Some(census) if !one && sampled as f64 >= LARGE_SHARE_OF_CENSUS * census => self.note(
                "sample_large_share",
                population,
                format!(
                    "{sampled} of {census} individuals were sampled at the baseline. Plan II holds \
                     only if they had no offspring afterwards; if they had, choose plan I."
                ),
            ),
            Some(_) => {}
        }
    }

    /// Adds a comparison of two visits of one population.
    fn in_time(
        &mut self,
        from: usize,
        to: usize,
        kind: ComparisonKind,
        settings: &PopulationSettings,
    ) {
        let strata = self.strata;
        let (earlier, later) = (&strata[from], &strata[to]);
        let span = match (earlier.generation, later.generation) {
            (Some(before), Some(after)) => Some(after - before),
            _ if earlier.year == later.year => Some(0.0),
            _ => settings
                .generation_years
                .map(|length| (later.year - earlier.year) / length),
        };
        let place = || format!("{} to {}", earlier.name, later.name);
        match span {
            None if self.without_length.last() != Some(&earlier.population.as_str()) => {
                self.without_length.push(&earlier.population);
            }
            Some(span) if span <= 0.0 => self.note(
                "same_time",
                &place(),
                "No generation lies between the two (t = 0): nothing about drift follows from \
                 their difference."
                    .to_string(),
            ),
            Some(span) if span < 1.0 => self.note(
                "less_than_a_generation",
                &place(),
                format!("Only {span:.2} generations lie between the two: drift is hardly visible."),
            ),
            _ => {}
        }
        let generations = span.filter(|&span| span > 0.0);
        self.compared.comparisons.push(Comparison {
            from,
            to,
            kind,
            generations,
        });
    }

    fn between_populations(&mut self, populations: &BTreeMap<&str, Vec<usize>>) {
        let strata = self.strata;
        let mut found = false;
        for (from, first) in strata.iter().enumerate() {
            for (to, second) in strata.iter().enumerate().skip(from + 1) {
                if first.visit == second.visit && first.population != second.population {
                    found = true;
                    self.compared.comparisons.push(Comparison {
                        from,
                        to,
                        kind: ComparisonKind::BetweenPopulations,
                        generations: None,
                    });
                }
            }
        }
        if !found && populations.len() > 1 {
            self.note(
                "no_common_visit",
                "sheet",
                "No two populations have a visit of the same label, so populations are not \
                 compared. A column 'visit' can give years that belong together one label."
                    .to_string(),
            );
        }
    }

    fn note_missing_lengths(&mut self) {
        let names = std::mem::take(&mut self.without_length);
        if let [first, ..] = names[..] {
            let place = if names.len() == 1 { first } else { "programme" };
            self.note(
                "generation_length_missing",
                place,
                format!(
                    "The generation length of {} is not known, so nothing that counts generations \
                     is estimated. Give --generation-years, generation_years in the programme \
                     file, or a column 'generation'.",
                    spell_out(names.iter().copied())
                ),
            );
        }
    }

    /// Settings of a population that was not sampled are most likely misspelt.
    fn note_unsampled(&mut self, programme: &Programme, populations: &BTreeMap<&str, Vec<usize>>) {
        for name in programme.by_population.keys() {
            if populations.contains_key(name.as_str()) {
                continue;
            }
            let meant = match nearest(name, populations.keys().copied()) {
                Some(near) => format!(" Is '{near}' meant?"),
                None => String::new(),
            };
            self.note(
                "population_not_sampled",
                name,
                format!(
                    "The programme file has settings for '{name}', which was not sampled.{meant}"
                ),
            );
        }
    }

    fn note(&mut self, code: &'static str, place: &str, text: String) {
        self.compared.notes.push(Note::new(code, place, text));
    }
}

#[cfg(test)]
mod tests;
