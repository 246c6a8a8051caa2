//! `genewane verdict`: read the report and the policy, judge, write, say breach.

use std::collections::BTreeMap;
use std::fs::File;
use std::io::{self, Read};
use std::path::Path;

use sha2::{Digest, Sha256};

use crate::cli::{self, VerdictPlan};
use crate::error::{Error, Result};
use crate::outlook::verdict::{DEFAULT_POLICY, parse_policy, read_policy};
use crate::report::Output;
use crate::report::page::parse_report;
use crate::report::verdict::{self, OnUncertain};
use crate::report::wire::{InputFile, Provenance, Report};

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

/// Reads a report and notes it as an input.
pub(super) fn report_of(path: &Path, inputs: &mut Vec<InputFile>) -> Result<Report> {
    let mut bytes = Vec::new();
    match path == Path::new("-") {
        true => io::stdin().lock().read_to_end(&mut bytes),
        false => File::open(path).and_then(|mut file| file.read_to_end(&mut bytes)),
    }
    .map_err(|e| Error::io(path, "read", e))?;
    let report = parse_report(path, &bytes)?;
    inputs.insert(0, input_file("report", path, "json", &bytes));
    Ok(report)
}

/// What made a document that builds on a report.
pub(super) fn provenance(
    arguments: Vec<String>,
    inputs: Vec<InputFile>,
    settings: BTreeMap<&str, String>,
    methods: &[(&str, &str)],
) -> Provenance {
    let owned = |(name, text): &(&str, &str)| ((*name).to_owned(), (*text).to_owned());
    Provenance {
        program: env!("CARGO_PKG_NAME").to_owned(),
        version: env!("CARGO_PKG_VERSION").to_owned(),
        arguments,
        inputs,
        settings: settings
            .into_iter()
            .map(|(name, value)| (name.to_owned(), value))
            .collect(),
        methods: methods.iter().map(owned).collect(),
        stamp: None,
    }
}

/// An input file with its digest.
pub(super) fn input_file(role: &str, path: &Path, format: &str, bytes: &[u8]) -> InputFile {
    let digest = Sha256::digest(bytes);
    InputFile {
        role: role.to_owned(),
        name: path.display().to_string(),
        format: format.to_owned(),
        bytes: bytes.len() as u64,
        sha256: digest.iter().map(|byte| format!("{byte:02x}")).collect(),
    }
}
