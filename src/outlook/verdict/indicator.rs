//! Share of populations within species with an effective size above 500: headline indicator A.4 of
//! the monitoring framework of the Kunming-Montreal Global Biodiversity Framework (decision 15/5 of
//! the CBD; Hoban et al. 2020, 2023).

use std::cmp::Ordering;
use std::collections::BTreeMap;

use super::Fact;

/// One population of a species.
#[derive(Debug, Clone, PartialEq)]
pub struct Member {
    /// Its name.
    pub population: String,
    /// Its species.
    pub species: String,
    /// Its effective size.
    pub size: Fact,
}

/// The populations of one species.
#[derive(Debug, Clone, PartialEq)]
pub struct SpeciesShare {
    /// Its name.
    pub species: String,
    /// Populations, with and without a size.
    pub total: u64,
    /// Populations with a size.
    pub assessed: u64,
    /// Of these, populations whose size is above the limit.
    pub above: u64,
    /// `above` / `assessed`; `None` where none is assessed.
    pub share: Option<f64>,
    /// The share if every population whose interval holds the limit were below, and above.
    pub range: Option<[f64; 2]>,
}

/// The indicator.
#[derive(Debug, Clone, PartialEq)]
pub struct Indicator {
    /// The size to be above.
    pub size: f64,
    /// Species by name.
    pub species: Vec<SpeciesShare>,
    /// Mean share over the species that have one, each with the same weight.
    pub mean: Option<f64>,
    /// Means of the ranges.
    pub range: Option<[f64; 2]>,
    /// Species with a share.
    pub species_assessed: u64,
}

/// Counts the populations by species. The value decides, as the framework asks; populations without
/// a value leave both numerator and denominator. Strictly above: 500 itself is not.
pub fn indicator(size: f64, members: &[Member]) -> Indicator {
    let mut by_species: BTreeMap<&str, Vec<&Fact>> = BTreeMap::new();
    for member in members {
        by_species
            .entry(&member.species)
            .or_default()
            .push(&member.size);
    }
    let species: Vec<SpeciesShare> = by_species
        .into_iter()
        .map(|(name, sizes)| share(name, &sizes, size))
        .collect();
    let mean = |value: fn(&SpeciesShare) -> Option<f64>| {
        let shares: Vec<f64> = species.iter().filter_map(value).collect();
        (!shares.is_empty()).then(|| shares.iter().sum::<f64>() / shares.len() as f64)
    };
    let (low, high) = (mean(|s| Some(s.range?[0])), mean(|s| Some(s.range?[1])));
    Indicator {
        size,
        mean: mean(|s| s.share),
        range: low.zip(high).map(|(low, high)| [low, high]),
        species_assessed: species.iter().filter(|s| s.share.is_some()).count() as u64,
        species,
    }
}

fn share(name: &str, sizes: &[&Fact], size: f64) -> SpeciesShare {
    let (mut assessed, mut above, mut surely, mut possibly) = (0u64, 0u64, 0u64, 0u64);
    for fact in sizes {
        let Some(order) = fact.compare(size) else {
            continue;
        };
        assessed += 1;
        above += u64::from(order == Ordering::Greater);
        let (low, high) = match fact {
            Fact::Estimate {
                interval: Some([low, high]),
                ..
            } => (
                low.is_some_and(|low| low > size),
                high.is_none_or(|high| high > size),
            ),
            _ => (order == Ordering::Greater, order == Ordering::Greater),
        };
        surely += u64::from(low);
        possibly += u64::from(high);
    }
    let of_assessed = |n: u64| n as f64 / assessed as f64;
    let known = assessed > 0;
    SpeciesShare {
        species: name.to_string(),
        total: sizes.len() as u64,
        assessed,
        above,
        share: known.then(|| of_assessed(above)),
        range: known.then(|| [of_assessed(surely), of_assessed(possibly)]),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn members(species: &str, sizes: &[Option<f64>]) -> Vec<Member> {
        let all = sizes.iter().enumerate();
        all.map(|(i, size)| Member {
            population: format!("{species} {i}"),
            species: species.to_string(),
            size: size.map_or(Fact::Absent("not sampled".into()), Fact::Exact),
        })
        .collect()
    }

    // Arithmetic, by the definition of CBD headline indicator A.4 (check 11.3 of the methods).
    #[test]
    fn three_species() {
        let mut all = members("S1", &[Some(620.0), Some(480.0), Some(510.0), Some(90.0)]);
        all.extend(members("S2", &[None, Some(300.0), Some(5000.0)]));
        all.extend(members("S3", &[Some(499.9), Some(500.0), Some(500.1)]));
        let got = indicator(500.0, &all);
        let counts: Vec<_> = got
            .species
            .iter()
            .map(|s| (s.above, s.assessed, s.total))
            .collect();
        assert_eq!(counts, [(2, 4, 4), (1, 2, 3), (1, 3, 3)]);
        assert_eq!(got.species[0].share, Some(0.5));
        assert_eq!(got.species[1].share, Some(0.5));
        assert!((got.mean.unwrap() - 4.0 / 9.0).abs() < 1e-12);
        assert_eq!(got.species_assessed, 3);
    }

    #[test]
    fn nothing_assessed_is_no_share() {
        let got = indicator(500.0, &members("S", &[None, None]));
        assert_eq!(
            (got.mean, got.species[0].share, got.species[0].total),
            (None, None, 2)
        );
        assert_eq!(indicator(500.0, &[]).mean, None);
    }

    #[test]
    fn intervals_that_hold_the_limit_widen_the_range() {
        let size = |low, high| Member {
            population: String::new(),
            species: "S".into(),
            size: Fact::Estimate {
                value: Some(520.0),
                interval: Some([Some(low), high]),
            },
        };
        let got = indicator(500.0, &[size(510.0, Some(600.0)), size(300.0, None)]);
        assert_eq!(got.species[0].share, Some(1.0));
        assert_eq!(got.range, Some([0.5, 1.0]));
    }
}
