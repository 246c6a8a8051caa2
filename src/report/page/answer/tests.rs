//! Sentences for numbers that are sure, unsure, unbounded and absent; the words were written by hand.

use super::super::sample::{absent, estimate, two_populations};
use super::*;
use crate::report::figures::subject::subjects;
use crate::report::wire::Kind;

/// The first sentence of the first population after a change to the report.
fn first(change: impl FnOnce(&mut Report)) -> String {
    let mut report = two_populations();
    change(&mut report);
    let subjects = subjects(&report);
    let [first, _] = sentences(&report, &subjects[0]);
    first
}

fn latest(report: &mut Report) -> &mut Comparison {
    let mut all = report.comparisons.iter_mut();
    all.find(|c| c.kind == Kind::SinceBaseline && c.to == "Aldermere@2024")
        .unwrap()
}

fn size_of(report: &mut Report) -> &mut EffectiveSize {
    let mut all = report.effective_size.iter_mut();
    all.find(|e| e.headline && e.to == "Aldermere@2024")
        .unwrap()
}

#[test]
fn a_clear_loss_is_told_with_what_explains_it() {
    assert_eq!(
        first(|_| ()),
        "Since 2004 the sample of Aldermere has lost 11 % (6 to 16) of its expected heterozygosity; an \
         effective size of 38 (24 to 71) explains it; 14 of 212 baseline alleles are probably gone."
    );
}

#[test]
fn the_second_sentence_tells_the_basis() {
    let report = two_populations();
    let subjects = subjects(&report);
    assert_eq!(
        sentences(&report, &subjects[0])[1],
        "This rests on 30 individuals in 2004 and 28 in 2024, and on 1400 loci; the methods for \
         effective size agree; 1 warning concerns this population."
    );
}

#[test]
fn an_interval_that_reaches_both_ways_is_no_loss() {
    let words = first(|r| {
        latest(r).change.expected_heterozygosity_kept = estimate(0.97, [0.92, 1.03]);
    });
    assert!(
        words.starts_with(
            "Since 2004 the sample of Aldermere shows no clear change of expected heterozygosity: \
             anything from 8 % lost to 3 % gained fits the data; allele frequencies changed as at an \
             effective size of 38 (24 to 71);"
        ),
        "{words}"
    );
}

#[test]
fn a_gain_is_a_gain() {
    let words = first(|r| {
        latest(r).change.expected_heterozygosity_kept = estimate(1.08, [1.04, 1.12]);
    });
    assert!(
        words.contains("has gained 8 % (4 to 12) in expected heterozygosity"),
        "{words}"
    );
}

// At Ne 24 and 5 generations (1 - 1/48)^5 = 0.9001 is kept: a loss of 10 % at most.
#[test]
fn a_loss_beyond_drift_is_not_explained() {
    let words = first(|r| {
        latest(r).change.expected_heterozygosity_kept = estimate(0.70, [0.65, 0.75]);
    });
    assert!(
        words.contains(
            "has lost 30 % (25 to 35) of its expected heterozygosity; that is more than the \
             effective size of 38 (24 to 71), estimated from allele frequencies, explains"
        ),
        "{words}"
    );
}

#[test]
fn a_loss_without_interval_says_so() {
    let words = first(|r| {
        latest(r).change.expected_heterozygosity_kept.interval = None;
    });
    assert!(
        words.contains(
            "shows 11 % less expected heterozygosity, but how sure that is could not be computed"
        ),
        "{words}"
    );
}

#[test]
fn a_size_without_bound_is_not_a_number() {
    let words = first(|r| {
        let size = size_of(r);
        size.estimate = None;
        size.unbounded = true;
        size.interval = Some((Some(120.0), None));
    });
    assert!(
        words.contains(
            "allele frequencies changed no more than sampling alone makes them, so the effective size \
             has no upper limit (it is probably above 120)"
        ),
        "{words}"
    );
}

#[test]
fn an_upper_limit_may_be_missing() {
    let words = first(|r| size_of(r).interval = Some((Some(24.0), None)));
    assert!(
        words.contains("an effective size of 38 (24 to no upper limit) explains it"),
        "{words}"
    );
}

#[test]
fn what_is_absent_is_told_with_its_reason() {
    let words = first(|r| {
        latest(r).change.expected_heterozygosity_kept = absent("no locus could be used");
        let alleles = latest(r).alleles.as_mut().unwrap();
        alleles.probably_lost = None;
        alleles.absent_because = Some("the generation length is not known".to_owned());
        r.effective_size.retain(|e| e.population != "Aldermere");
    });
    assert_eq!(
        words,
        "Since 2004 nothing can be said of a change of expected heterozygosity in the sample of \
         Aldermere: no locus could be used; no effective size was estimated; 31 of 212 baseline alleles \
         were not seen again, lost or merely missed (the generation length is not known)."
    );
}

#[test]
fn one_visit_says_nothing_of_change() {
    let report = two_populations();
    let subjects = subjects(&report);
    assert_eq!(
        sentences(&report, &subjects[1])[0],
        "Birkholm was sampled once, in 2024, so nothing can be said yet of a change; its expected \
         heterozygosity was 0.290 (0.270 to 0.310); linkage between loci fits an effective size of 120 \
         (60 to no upper limit)."
    );
}

#[test]
fn a_labelled_visit_has_its_year_beside_it() {
    let words = first(|r| {
        for s in &mut r.strata {
            if s.visit == "2004" {
                s.visit = "first survey".to_owned();
            }
        }
    });
    assert!(
        words.starts_with("Since first survey (2004) the"),
        "{words}"
    );
}
