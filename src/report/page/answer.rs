//! The answer for one population in two sentences, made from the numbers and worded no more surely
//! than they allow.

use crate::report::figures::isolated;
use crate::report::figures::numbers::{
    count, counted, effective_size, estimate, percent_with_interval, reason, size, size_range, year,
};
use crate::report::figures::subject::Subject;
use crate::report::wire::{AlleleFates, Comparison, EffectiveSize, Report, Stratum};

/// What happened since the baseline, and on what that rests.
pub fn sentences(report: &Report, subject: &Subject) -> [String; 2] {
    let first = match subject.since_baseline {
        Some(comparison) => since_baseline(subject, comparison),
        None => of_one_visit(subject),
    };
    [first, basis(report, subject)]
}

fn since_baseline(subject: &Subject, comparison: &Comparison) -> String {
    let from = subject.stratum(&comparison.from);
    let when = from.map_or_else(|| comparison.from.clone(), when);
    let (change, fit) = change(subject, comparison);
    let mut clauses = vec![format!("Since {when} {change}")];
    clauses.push(match subject.size {
        Some(e) => size_clause(e, fit),
        None => "no effective size was estimated".to_owned(),
    });
    if let Some(alleles) = &comparison.alleles {
        clauses.push(alleles_clause(alleles));
    }
    clauses.join("; ") + "."
}

/// How the change of heterozygosity stands to the drift that the effective size makes.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Fit {
    /// Their intervals meet, and there is a loss.
    Explains,
    /// More is lost than drift makes.
    More,
    /// Less is lost than drift makes.
    Less,
    /// There is no clear loss, or nothing to hold it against.
    Open,
}

fn change(subject: &Subject, comparison: &Comparison) -> (String, Fit) {
    let who = format!("the sample of {}", isolated(subject.population));
    let kept = &comparison.change.expected_heterozygosity_kept;
    let Some(value) = kept.estimate else {
        let why = reason(kept.absent_because.as_deref());
        let words =
            format!("nothing can be said of a change of expected heterozygosity in {who}: {why}");
        return (words, Fit::Open);
    };
    let loss = 1.0 - value;
    let Some([low, high]) = kept.interval.map(|[low, high]| [1.0 - high, 1.0 - low]) else {
        let (words, size) = match loss >= 0.0 {
            true => ("less", loss),
            false => ("more", -loss),
        };
        let words = format!(
            "{who} shows {} {words} expected heterozygosity, but how sure that is could not be computed",
            percent_with_interval(size, None)
        );
        return (words, Fit::Open);
    };
    let [numbers, gain] = [
        percent_with_interval(loss, Some([low, high])),
        percent_with_interval(-loss, Some([-high, -low])),
    ];
    if low > 0.0 {
        let words = format!("{who} has lost {numbers} of its expected heterozygosity");
        (words, fit(subject, [low, high]))
    } else if high < 0.0 {
        let words = format!("{who} has gained {gain} in expected heterozygosity");
        (words, Fit::Open)
    } else {
        let limit = |share: f64| percent_with_interval(share.max(0.0), None);
        let words = format!(
            "{who} shows no clear change of expected heterozygosity: anything from {} lost to {} gained \
             fits the data",
            limit(high),
            limit(-low)
        );
        (words, Fit::Open)
    }
}

fn fit(subject: &Subject, [low, high]: [f64; 2]) -> Fit {
    let by_drift = subject
        .drift()
        .and_then(|drift| drift.kept_interval(drift.generations));
    match by_drift.map(|[least, most]| [1.0 - most, 1.0 - least]) {
        Some([_, most]) if low > most => Fit::More,
        Some([least, _]) if high < least => Fit::Less,
        Some(_) => Fit::Explains,
        None => Fit::Open,
    }
}

fn size_clause(e: &EffectiveSize, fit: Fit) -> String {
    let is_temporal = e.from.is_some();
    let numbers = match (e.estimate, e.interval) {
        (Some(n), Some((low, high))) => format!("{} ({})", size(n), size_range(low, high)),
        (Some(n), None) => format!("{} (no interval)", size(n)),
        (None, interval) if e.unbounded => {
            let above = match interval {
                Some((Some(low), _)) => format!(" (it is probably above {})", size(low)),
                _ => String::new(),
            };
            let what = match e.method.as_str() {
                _ if is_temporal => {
                    "allele frequencies changed no more than sampling alone makes them"
                }
                "linkage" => "loci are no more linked than sampling alone makes them",
                _ => "the sample shows nothing that a large population would not",
            };
            return format!("{what}, so the effective size has no upper limit{above}");
        }
        (None, _) => {
            let why = reason(e.absent_because.as_deref());
            return format!("the effective size could not be estimated: {why}");
        }
    };
    match (is_temporal, fit) {
        (true, Fit::Explains) => format!("an effective size of {numbers} explains it"),
        (true, Fit::More) => format!(
            "that is more than the effective size of {numbers}, estimated from allele frequencies, explains"
        ),
        (true, Fit::Less) => format!(
            "allele frequencies changed as at an effective size of {numbers}, which would have cost more"
        ),
        (true, Fit::Open) => {
            format!("allele frequencies changed as at an effective size of {numbers}")
        }
        (false, _) => match e.method.as_str() {
            "linkage" => format!("linkage between loci fits an effective size of {numbers}"),
            "heterozygote_excess" => {
                format!("the excess of heterozygotes fits an effective size of {numbers}")
            }
            _ => format!("the effective size is {numbers}"),
        },
    }
}

fn alleles_clause(alleles: &AlleleFates) -> String {
    let all = counted(alleles.baseline, "baseline allele", "baseline alleles");
    let are = |n: u64| if n == 1 { "is" } else { "are" };
    let were = |n: u64| if n == 1 { "was" } else { "were" };
    let mut words = match alleles.probably_lost {
        _ if alleles.baseline == 0 => return "no baseline allele could be followed".to_owned(),
        Some(0) => format!("none of {all} is called lost"),
        Some(n) => format!("{} of {all} {} probably gone", count(n), are(n)),
        None => {
            let n = alleles.not_seen_again;
            let why = reason(alleles.absent_because.as_deref());
            format!(
                "{} of {all} {} not seen again, lost or merely missed ({why})",
                count(n),
                were(n)
            )
        }
    };
    if alleles.faster_than_explained == Some(true) {
        words += ", and more are out of sight than the effective size explains";
    }
    words
}

fn of_one_visit(subject: &Subject) -> String {
    let name = isolated(subject.population);
    let Some(latest) = subject.strata.last() else {
        return format!("{name} has no sample.");
    };
    let diversity = format!(
        "its expected heterozygosity was {}",
        estimate(&latest.expected_heterozygosity, 3)
    );
    let mut clauses = match subject.strata.len() {
        1 => vec![
            format!(
                "{name} was sampled once, in {}, so nothing can be said yet of a change",
                when(latest)
            ),
            diversity,
        ],
        n => vec![
            format!(
                "{name} was sampled {n} times, but the report holds no comparison with a baseline"
            ),
            format!("in {} {diversity}", when(latest)),
        ],
    };
    clauses.extend(subject.size.map(|e| size_clause(e, Fit::Open)));
    clauses.join("; ") + "."
}

fn basis(report: &Report, subject: &Subject) -> String {
    let people = |s: &Stratum| counted(s.individuals, "individual", "individuals");
    let loci = |n: u64| counted(n, "locus", "loci");
    let mut words = match (subject.baseline_and_latest(), subject.since_baseline) {
        (Some((from, to)), Some(comparison)) => format!(
            "This rests on {} in {} and {} in {}, and on {}",
            people(from),
            when(from),
            count(to.individuals),
            when(to),
            loci(comparison.change.expected_heterozygosity_kept.loci),
        ),
        _ => match subject.strata.last() {
            Some(s) => format!("This rests on {} and {}", people(s), loci(s.typed_loci)),
            None => "This rests on nothing".to_owned(),
        },
    };
    words += match subject.summary.and_then(|s| s.agree) {
        Some(true) => "; the methods for effective size agree",
        Some(false) => {
            "; the methods for effective size do not agree, so read their section before using any"
        }
        None => "",
    };
    let warnings = warnings_of(report, subject.population);
    if warnings > 0 {
        let concern = if warnings == 1 { "concerns" } else { "concern" };
        words += &format!(
            "; {} {concern} this population",
            counted(warnings, "warning", "warnings")
        );
    }
    words + "."
}

/// Warnings about a population or one of its strata.
pub fn warnings_of(report: &Report, population: &str) -> u64 {
    let concerns = |place: &str| {
        let rest = place.strip_prefix(population);
        let itself = rest.is_some_and(|rest| rest.is_empty() || rest.starts_with('@'));
        itself || place.split(", ").any(|one| one == population)
    };
    let all = report.warnings.iter().filter(|w| concerns(&w.place));
    all.count() as u64
}

/// The visit as a time: its year, or its label with the year.
pub fn when(s: &Stratum) -> String {
    let year = year(s.year);
    match s.visit.trim() == year || s.visit.trim().is_empty() {
        true => year,
        false => format!("{} ({year})", isolated(s.visit.trim())),
    }
}

/// Effective size for a cell of the overview.
pub fn short_size(e: Option<&EffectiveSize>) -> String {
    e.map_or_else(|| "not estimated".to_owned(), effective_size)
}

#[cfg(test)]
mod tests;
