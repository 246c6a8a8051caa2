//! `genewane verdict`: a report held against the limits of a programme.

use std::path::PathBuf;

use clap::{Args, ValueEnum};

use super::{OnUncertain, VerdictPlan, common};

/// Judges a report against the limits of a policy; exit code 3 says breach
///
/// Each rule of the policy is answered for each population: met, breached, or cannot tell, which is
/// the answer where the interval of the estimate crosses the limit. The verdict is a JSON document;
/// a short table goes to standard error. Limits are published rules of thumb, not law.
#[derive(Debug, Clone, Args)]
#[command(after_long_help = EXAMPLES, arg_required_else_help = true)]
pub(super) struct Flags {
    /// Report that 'genewane measure' wrote; '-' is standard input
    #[arg(value_name = "REPORT", required_unless_present = "write_policy")]
    report: Option<PathBuf>,

    /// Policy file: the rules, and what is known of populations beside the report
    ///
    /// TOML. [default: the built-in policy, which --write-policy prints and explains]
    #[arg(long, value_name = "FILE")]
    policy: Option<PathBuf>,

    /// Add the share of populations with an effective size above 500, by species
    ///
    /// Headline indicator A.4 of the monitoring framework of the Kunming-Montreal Global
    /// Biodiversity Framework: per species the populations above 500 over those assessed, then the
    /// mean over species. The policy file names the species of each population. A census counts
    /// at its ratio where there is no estimate.
    #[arg(long)]
    indicator: bool,

    /// What 'cannot tell' counts as for the exit code
    #[arg(long, value_name = "ANSWER", value_enum, default_value_t = Uncertain::Tell)]
    on_uncertain: Uncertain,

    /// Print the built-in policy as a start for one's own, and stop
    #[arg(long, conflicts_with_all = ["report", "policy", "indicator"])]
    write_policy: bool,

    /// Write the verdict here [default: standard output]
    #[arg(short, long, value_name = "FILE", help_heading = "Output")]
    output: Option<PathBuf>,

    /// Keep the table and notes off standard error; errors still appear
    #[arg(long, help_heading = "Running")]
    quiet: bool,
}

#[derive(Debug, Clone, Copy, ValueEnum)]
enum Uncertain {
    /// As met
    Met,
    /// As breached: the cautious reading
    Breached,
    /// As neither: it is told, and the exit code is that of the other rules
    Tell,
}

const EXAMPLES: &str = "\
Examples:
  By the built-in policy:
    genewane verdict report.json -o verdict.json

  By a policy of one's own, where 'cannot tell' is a breach:
    genewane verdict --write-policy > policy.toml
    genewane verdict report.json --policy policy.toml --on-uncertain breached --indicator

Exit status:
  0  no binding rule is breached
  1  the report cannot be read or trusted
  2  wrong usage, or a policy with problems
  3  a binding rule is breached";

impl Flags {
    /// What was typed, as what is meant.
    pub fn plan(self) -> Result<VerdictPlan, clap::Error> {
        let inputs = [self.report.as_ref(), self.policy.as_ref()];
        common::keep_apart(inputs, self.output.as_ref())?;
        Ok(VerdictPlan {
            report: self.report,
            policy: self.policy,
            indicator: self.indicator,
            on_uncertain: match self.on_uncertain {
                Uncertain::Met => OnUncertain::Met,
                Uncertain::Breached => OnUncertain::Breached,
                Uncertain::Tell => OnUncertain::Tell,
            },
            output: self.output.filter(|path| path.as_os_str() != "-"),
            quiet: self.quiet,
        })
    }
}
