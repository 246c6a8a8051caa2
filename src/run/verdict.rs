//! `genewane verdict`: read the report and the policy, judge, write, say breach.

use std::collections::BTreeMap;
use std::fs::File;
use std::io::{self, Read};
use std::path::Path;

use sha2::{Digest, Sha256};

use crate::cli::{self, VerdictPlan};
use crate::error::{Error, Result};
use crate::outlook::verdict::{DEFAULT_POLICY, parse_policy, read_policy};
use crate::report::page::parse_report;
use crate::report::verdict::{self, OnUncertain};
use crate::report::wire::{InputFile, Provenance, Report};
use crate::report::{Output, methods};

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
    let provenance = provenance(arguments, inputs, settings.into());
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
) -> Provenance {
    Provenance {
        program: env!("CARGO_PKG_NAME").to_owned(),
        version: env!("CARGO_PKG_VERSION").to_owned(),
        arguments,
        inputs,
        settings: settings
            .into_iter()
            .map(|(name, value)| (name.to_owned(), value))
            .collect(),
        methods: methods(),
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
