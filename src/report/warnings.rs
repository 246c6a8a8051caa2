//! Notes and findings as warnings of the report.

use super::assemble::{Findings, batch_notes};
use super::wire::Warning;
use crate::model::{ComparisonKind, Note};

/// Share of missing genotypes in one stratum beside another beyond which they hardly compare.
const UNEVEN_CALL_RATE: f64 = 0.1;

/// A note of an earlier part, as the report writes it.
pub fn warning(note: &Note) -> Warning {
    Warning {
        code: note.code.to_owned(),
        place: note.place.clone(),
        text: note.text.clone(),
    }
}

/// What the findings themselves give cause to say.
pub fn of_findings(findings: &Findings) -> Vec<Warning> {
    let mut notes = plan_not_stated(findings);
    notes.extend(few_individuals(findings));
    notes.extend(uneven_call_rates(findings));
    notes.extend(batch_notes(findings));
    if findings.sums.polymorphic == 0 {
        notes.push(Note::new(
            "nothing_varies",
            "calls",
            "no locus varies among the individuals in use, so nothing can be estimated: check that \
             the sheet names the right samples",
        ));
    }
    notes.iter().map(warning).collect()
}

fn plan_not_stated(findings: &Findings) -> Vec<Note> {
    let mut populations: Vec<&str> = findings
        .comparisons
        .iter()
        .filter(|c| c.kind != ComparisonKind::BetweenPopulations && c.generations.is_some())
        .map(|c| findings.strata.strata[c.from].population.as_str())
        .filter(|p| findings.programme.get(p, |s| s.plan).is_none())
        .collect();
    populations.sort_unstable();
    populations.dedup();
    let text = "the sampling plan was not stated, so plan II is assumed (sampled before reproduction and \
                removed, or offspring that never breed). If the sampled individuals had bred or were put \
                back, plan I holds, and plan II can overstate the effective size by half and more: state \
                --sampling-plan, and --census with plan I";
    match populations.is_empty() {
        true => Vec::new(),
        false => vec![Note::new(
            "sampling_plan_not_stated",
            populations.join(", "),
            text,
        )],
    }
}

fn few_individuals(findings: &Findings) -> Vec<Note> {
    let few = findings
        .strata
        .strata
        .iter()
        .filter(|s| s.individuals() < 5);
    few.map(|s| {
        let text = format!(
            "only {} individual(s): no effective size is estimated, and every interval is wide or absent",
            s.individuals()
        );
        Note::new("few_individuals", s.name.clone(), text)
    })
    .collect()
}

/// Visits whose call rates differ: rare alleles and heterozygotes are missed where calling is poor.
fn uneven_call_rates(findings: &Findings) -> Vec<Note> {
    let rate = |s: usize| {
        let possible = findings.sums.kept * findings.strata.strata[s].individuals() as u64;
        findings.sums.strata[s].typed_genotypes as f64 / possible.max(1) as f64
    };
    findings
        .comparisons
        .iter()
        .filter(|c| c.kind == ComparisonKind::SinceBaseline)
        .filter(|c| (rate(c.from) - rate(c.to)).abs() > UNEVEN_CALL_RATE)
        .map(|c| {
            let [from, to] = [c.from, c.to].map(|s| &findings.strata.strata[s].name);
            let text = format!(
                "call rates differ: {:.2} at {from}, {:.2} at {to}; poor calling hides alleles and \
                 heterozygotes, which looks like loss",
                rate(c.from),
                rate(c.to)
            );
            Note::new("uneven_call_rates", to.clone(), text)
        })
        .collect()
}
