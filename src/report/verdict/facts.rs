//! What a report, and the policy beside it, know of each measure.

use super::document::Population;
use super::fields::{self, Scope};
use crate::outlook::verdict::{Fact, Measure, Member, Policy, Rule, indicator};
use crate::report::wire::{EffectiveSize, Kind, Report};

/// Species of populations of which the policy names none.
const NOT_NAMED: &str = "not named";

/// A report and the policy it is judged by.
pub struct Facts<'a> {
    /// The report.
    pub report: &'a Report,
    /// The policy.
    pub policy: &'a Policy,
}

/// A fact and where it was found.
pub struct Found {
    /// Population, pair of strata, or `report`.
    pub place: String,
    /// The fact.
    pub fact: Fact,
    /// Where in the report or the policy.
    pub from: String,
}

/// A population of the indicator.
pub struct MemberFound {
    /// As the indicator counts it.
    pub member: Member,
    /// Where its size comes from.
    pub from: String,
    /// Its size at the common ratio, where it has a census and a ratio of its own.
    pub by_common_ratio: Option<f64>,
}

impl Facts<'_> {
    /// The facts a rule looks at, one a place.
    pub fn of(&self, rule: &Rule) -> Vec<Found> {
        match &rule.measure {
            Measure::PopulationsAbove(size) => vec![self.populations_above(*size)],
            Measure::Field(path) => self.field(rule, path),
            measure => self
                .names(rule)
                .into_iter()
                .map(|name| self.of_population(rule, measure, name))
                .collect(),
        }
    }

    /// The populations a rule holds for: those of the report unless it names its own; for sizes also
    /// those of which only the policy knows a size.
    fn names<'n>(&'n self, rule: &'n Rule) -> Vec<&'n str> {
        if !rule.populations.is_empty() {
            return rule.populations.iter().map(String::as_str).collect();
        }
        let mut names = self.report.populations();
        if matches!(
            rule.measure,
            Measure::EffectiveSize | Measure::InbreedingPerGeneration
        ) {
            let others = self.policy.populations.iter();
            let sized = others.filter(|(_, k)| k.census.or(k.effective_size).is_some());
            let more: Vec<&str> = sized
                .map(|(name, _)| name.as_str())
                .filter(|name| !names.contains(name))
                .collect();
            names.extend(more);
        }
        names
    }

    fn of_population(&self, rule: &Rule, measure: &Measure, name: &str) -> Found {
        let (fact, from) = match measure {
            Measure::EffectiveSize => self.size(name, rule.method.as_deref()),
            Measure::InbreedingPerGeneration => self.inbreeding(name, rule.method.as_deref()),
            Measure::ShareOfCensus => self.share_of_census(name, rule.method.as_deref()),
            Measure::HeterozygosityKept => self.scoped(
                name,
                Scope::SinceBaseline,
                "change.expected_heterozygosity_kept",
            ),
            Measure::AllelesProbablyLost => {
                self.scoped(name, Scope::SinceBaseline, "alleles.probably_lost")
            }
            Measure::ShareProbablyLost => self.share_probably_lost(name),
            _ => self.scoped(name, Scope::Latest, "inbreeding_coefficient"),
        };
        Found {
            place: name.to_owned(),
            fact,
            from,
        }
    }

    /// Effective size: the estimate to quote; else what the policy knows; else the census at a ratio.
    fn size(&self, name: &str, method: Option<&str>) -> (Fact, String) {
        if let Some(size) = self.report.quoted_size(name, method) {
            return (size_fact(size), told(size));
        }
        let known = self.policy.populations.get(name);
        if method.is_none()
            && let Some(known) = known
        {
            if let Some(size) = known.effective_size {
                return (Fact::Exact(size), "policy: effective_size".to_owned());
            }
            if let Some(census) = known.census {
                let ratio = known.ratio.unwrap_or(self.policy.ratio);
                let from = format!("policy: census {census} at a ratio of {ratio}");
                return (Fact::Product { census, ratio }, from);
            }
        }
        let from = "effective_size".to_owned();
        (Fact::Absent(self.why_no_size(name, method)), from)
    }

    fn why_no_size(&self, name: &str, method: Option<&str>) -> String {
        let told = self
            .report
            .effective_size
            .iter()
            .filter(|e| e.population == name && method.is_none_or(|m| e.method == m))
            .find_map(|e| e.absent_because.as_deref());
        match (told, self.report.latest(name)) {
            (Some(why), _) => format!("no estimate of effective size: {why}"),
            (None, None) => "the population is not in the report".to_owned(),
            (None, Some(_)) => "no estimate of effective size".to_owned(),
        }
    }

    fn inbreeding(&self, name: &str, method: Option<&str>) -> (Fact, String) {
        if let Some(size) = self.report.quoted_size(name, method) {
            let from = format!("{}, drift_rate", told(size));
            let lower = |x: f64| Some(x.max(0.0));
            let rate = &size.drift_rate;
            let fact = Fact::Estimate {
                value: rate.estimate.map(|x| x.max(0.0)),
                interval: rate.interval.map(|[low, high]| [lower(low), lower(high)]),
            };
            return (fact, from);
        }
        let (fact, from) = self.size(name, method);
        match fact.value() {
            Some(size) if size > 0.0 => (Fact::Exact(0.5 / size), from),
            _ => (fact, from),
        }
    }

    fn share_of_census(&self, name: &str, method: Option<&str>) -> (Fact, String) {
        let Some(size) = self.report.quoted_size(name, method) else {
            let why = self.why_no_size(name, method);
            return (Fact::Absent(why), "effective_size".to_owned());
        };
        let in_policy = self.policy.populations.get(name).and_then(|k| k.census);
        let in_report = || Some(size.estimate? / size.share_of_census?);
        let Some(census) = in_policy.or_else(in_report).filter(|&n| n > 0.0) else {
            let why = "no census size is known; give it in the policy".to_owned();
            return (Fact::Absent(why), told(size));
        };
        let share = |x: f64| x / census;
        let fact = match size_fact(size) {
            Fact::Estimate { value, interval } => Fact::Estimate {
                value: value.map(share),
                interval: interval.map(|ends| ends.map(|end| end.map(share))),
            },
            other => other,
        };
        (fact, format!("{} over a census of {census}", told(size)))
    }

    fn share_probably_lost(&self, name: &str) -> (Fact, String) {
        let from =
            "comparisons, since_baseline: alleles.probably_lost / alleles.baseline".to_owned();
        let alleles = self
            .report
            .since_baseline(name)
            .and_then(|c| c.alleles.as_ref());
        let fact = match alleles {
            Some(a) if a.baseline > 0 && a.probably_lost.is_some() => {
                Fact::Exact(a.probably_lost.unwrap_or(0) as f64 / a.baseline as f64)
            }
            Some(a) => Fact::Absent(
                a.absent_because
                    .clone()
                    .unwrap_or_else(|| "no allele was called lost or missed".to_owned()),
            ),
            None => Fact::Absent(NO_BASELINE.to_owned()),
        };
        (fact, from)
    }

    fn field(&self, rule: &Rule, path: &str) -> Vec<Found> {
        let Some((scope, below)) = fields::scope_of(path) else {
            return Vec::new();
        };
        let whole = |fact| {
            vec![Found {
                place: "report".to_owned(),
                fact,
                from: path.to_owned(),
            }]
        };
        match scope {
            Scope::Samples => whole(fields::fact(&self.report.samples, below)),
            Scope::Loci => whole(fields::fact(&self.report.loci, below)),
            Scope::BetweenPopulations => self.pairs(rule, below),
            _ => self
                .names(rule)
                .into_iter()
                .map(|name| {
                    let (fact, from) = self.scoped(name, scope, below);
                    Found {
                        place: name.to_owned(),
                        fact,
                        from,
                    }
                })
                .collect(),
        }
    }

    /// Each pair of latest strata of which a population named by the rule is one.
    fn pairs(&self, rule: &Rule, below: &str) -> Vec<Found> {
        let names = self.names(rule);
        let latest = |stratum: &str| {
            names.iter().any(|name| {
                self.report
                    .latest(name)
                    .is_some_and(|latest| latest.stratum == stratum)
            })
        };
        self.report
            .comparisons
            .iter()
            .filter(|c| c.kind == Kind::BetweenPopulations)
            .filter(|c| latest(&c.from) || latest(&c.to))
            .map(|c| Found {
                place: format!("{} and {}", c.from, c.to),
                fact: fields::fact(c, below),
                from: format!("comparisons, {} to {}: {below}", c.from, c.to),
            })
            .collect()
    }

    /// A field of the object that a scope means for a population.
    fn scoped(&self, name: &str, scope: Scope, below: &str) -> (Fact, String) {
        let report = self.report;
        let stratum = match scope {
            Scope::Latest => report.latest(name),
            Scope::Baseline => report
                .since_baseline(name)
                .and_then(|c| report.stratum(&c.from)),
            _ => None,
        };
        if let Some(s) = stratum {
            let from = format!("strata, {}: {below}", s.stratum);
            return (fields::fact(s, below), from);
        }
        let kind = match scope {
            Scope::LastInterval => Kind::BetweenVisits,
            _ => Kind::SinceBaseline,
        };
        // With two visits, the interval since the baseline is the last one.
        let comparison = report
            .ending_latest(name, kind)
            .or_else(|| report.since_baseline(name))
            .filter(|_| matches!(scope, Scope::SinceBaseline | Scope::LastInterval));
        match comparison {
            Some(c) => {
                let from = format!("comparisons, {} to {}: {below}", c.from, c.to);
                (fields::fact(c, below), from)
            }
            None if report.latest(name).is_none() => {
                let why = "the population is not in the report".to_owned();
                (Fact::Absent(why), below.to_owned())
            }
            None => (Fact::Absent(NO_BASELINE.to_owned()), below.to_owned()),
        }
    }

    fn populations_above(&self, size: f64) -> Found {
        let members: Vec<Member> = self.members().into_iter().map(|m| m.member).collect();
        let counted = indicator(size, &members);
        let fact = match counted.mean {
            Some(mean) => Fact::Estimate {
                value: Some(mean),
                interval: counted.range.map(|[low, high]| [Some(low), Some(high)]),
            },
            None => Fact::Absent("no population has an effective size".to_owned()),
        };
        let assessed: u64 = counted.species.iter().map(|s| s.assessed).sum();
        let total: u64 = counted.species.iter().map(|s| s.total).sum();
        Found {
            place: "report".to_owned(),
            fact,
            from: format!(
                "effective_size of {assessed} of {total} populations, mean over {} species",
                counted.species_assessed
            ),
        }
    }

    /// The populations of the indicator: those of the report and those the policy puts into a
    /// species. Where the policy names no species at all, the report's populations are one.
    pub fn members(&self) -> Vec<MemberFound> {
        let known = &self.policy.populations;
        let named = known.values().any(|k| k.species.is_some());
        let mut names = self.report.populations();
        for name in known.keys() {
            if !names.contains(&name.as_str()) {
                names.push(name);
            }
        }
        let species_of = |name: &str| known.get(name).and_then(|k| k.species.clone());
        names
            .into_iter()
            .filter(|name| !named || species_of(name).is_some())
            .map(|name| {
                let (size, from) = self.size(name, None);
                let by_common_ratio = match size {
                    Fact::Product { census, ratio } if ratio != self.policy.ratio => {
                        Some(census * self.policy.ratio)
                    }
                    _ => None,
                };
                let member = Member {
                    population: name.to_owned(),
                    species: species_of(name).unwrap_or_else(|| NOT_NAMED.to_owned()),
                    size,
                };
                MemberFound {
                    member,
                    from,
                    by_common_ratio,
                }
            })
            .collect()
    }
}

const NO_BASELINE: &str = "the population has no earlier visit to be held against";

fn size_fact(size: &EffectiveSize) -> Fact {
    Fact::Estimate {
        value: size.estimate,
        interval: size.interval.map(|(low, high)| [low, high]),
    }
}

fn told(size: &EffectiveSize) -> String {
    match &size.from {
        Some(from) => format!("effective_size, {}, {from} to {}", size.method, size.to),
        None => format!("effective_size, {}, {}", size.method, size.to),
    }
}

impl MemberFound {
    /// The population as the document shows it.
    pub fn wire(&self, size: f64) -> Population {
        let order = self.member.size.compare(size);
        let interval = match &self.member.size {
            Fact::Estimate { interval, .. } => *interval,
            _ => None,
        };
        let holds = |[low, high]: [Option<f64>; 2]| {
            low.is_none_or(|low| low <= size) && high.is_none_or(|high| high > size)
        };
        let absent_because = match &self.member.size {
            Fact::Absent(why) => Some(why.clone()),
            _ => None,
        };
        Population {
            population: self.member.population.clone(),
            effective_size: self.member.size.value(),
            interval,
            above: order.map(|order| order.is_gt()),
            uncertain: order.is_none() || interval.is_some_and(holds),
            from: self.from.clone(),
            by_common_ratio: self.by_common_ratio,
            absent_because,
        }
    }
}
