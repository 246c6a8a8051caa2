//! `genewane verdict`: read the report and the policy, judge, write, say breach.

use super::documents::{input_file, provenance, report_of};
use crate::cli::{self, VerdictPlan};
use crate::error::{Error, Result};
use crate::outlook::verdict::{DEFAULT_POLICY, parse_policy, read_policy};
use crate::report::Output;
use crate::report::verdict::{self, OnUncertain};

/// How answers are made.
const METHODS: [(&str, &str); 4] = [
    (
        "answers",
        "met or breached only where the whole interval is on one side of the limit; counts and sizes \
         from a census as they are, compared as decimal numbers",
    ),
    (
        "effective_size",
        "the estimate to quote: temporal_likelihood, else temporal_fs, linkage, temporal_fc, \
         temporal_fk, demographic; from the baseline to the latest visit where it spans time",
    ),
    (
        "inbreeding_per_generation",
        "1/(2Ne), the drift rate of the same estimate (Franklin 1980)",
    ),
    (
        "indicator",
        "populations with Ne above 500 over populations assessed, by species, then the mean over \
         species (CBD headline indicator A.4)",
    ),
];

/// Judges a report. A breach is an error of its own class, after the verdict has been written.
pub fn verdict(plan: &VerdictPlan, arguments: Vec<String>) -> Result<()> {
    let out = Output::create(plan.output.as_deref())?;
    let Some(path) = &plan.report else {
        return out.bytes(DEFAULT_POLICY.as_bytes());
    };
    let mut inputs = Vec::new();
    let policy = match &plan.policy {
        Some(path) => {
            let (policy, bytes) = read_policy(path)?;
            inputs.push(input_file("policy", path, "toml", &bytes));
            policy
        }
        None => parse_policy(DEFAULT_POLICY.as_bytes()).map_err(|problems| Error::Sheet {
            path: "built-in policy".into(),
            problems,
        })?,
    };
    let report = report_of(path, &mut inputs)?;
    let problems = verdict::problems(&report, &policy);
    if !problems.is_empty() {
        let path = plan.policy.clone();
        return Err(Error::Sheet {
            path: path.unwrap_or_else(|| "built-in policy".into()),
            problems,
        });
    }
    let on_uncertain = match plan.on_uncertain {
        cli::OnUncertain::Met => OnUncertain::Met,
        cli::OnUncertain::Breached => OnUncertain::Breached,
        cli::OnUncertain::Tell => OnUncertain::Tell,
    };
    let told_policy = plan.policy.as_ref();
    let told_policy = told_policy.map_or("built in".to_owned(), |p| p.display().to_string());
    let settings = [("policy", told_policy), ("ratio", policy.ratio.to_string())];
    let provenance = provenance(arguments, inputs, settings.into(), &METHODS);
    let verdict = verdict::verdict(&report, &policy, plan.indicator, on_uncertain, provenance);
    if !plan.quiet {
        eprint!("{}", verdict::text_table(&verdict));
    }
    out.json(&verdict)?;
    match verdict.is_breach() {
        true => Err(Error::Breach(
            "a binding rule of the policy is breached".to_owned(),
        )),
        false => Ok(()),
    }
}
