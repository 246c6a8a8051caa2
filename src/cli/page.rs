//! `genewane page`: a report as people read it.

use std::path::PathBuf;

use clap::Args;

use super::PagePlan;

/// Sets a report as one page to read, print or send
///
/// The page is a single HTML file without any link to a network: the answer for each population in
/// two sentences, warnings, figures with their intervals, and the data behind each figure as a table.
/// It reads on a phone, a screen and paper, in light and dark. The same report gives the same bytes.
#[derive(Debug, Clone, Args)]
#[command(after_long_help = EXAMPLES, arg_required_else_help = true)]
pub(super) struct Flags {
    /// Report that 'measure' wrote; '-' is standard input
    #[arg(value_name = "REPORT")]
    report: PathBuf,
    /// Forecasts and verdicts made from this report, in any order
    ///
    /// Each must have been made from the very file given as REPORT: the digest in its provenance is
    /// compared, so that no page mixes two reports. A forecast adds fans by scenario, a verdict adds
    /// its rules and answers.
    #[arg(value_name = "FORECAST|VERDICT")]
    documents: Vec<PathBuf>,
    /// Write the page here [default: standard output]
    #[arg(short, long, value_name = "FILE")]
    output: Option<PathBuf>,
    /// Write each figure into this folder as well, made if absent
    ///
    /// As NAME.svg, and as NAME.vl.json: a chart specification in the Vega-Lite format with its data.
    #[arg(long, value_name = "DIR")]
    figures: Option<PathBuf>,
    /// Leave sample names out, for a page that leaves the house
    ///
    /// Carriers of alleles at risk become numbers, and names quoted in warnings go.
    #[arg(long)]
    without_samples: bool,
}

const EXAMPLES: &str = "\
Examples:
  A page for the board, without sample names:
    genewane page report.json --without-samples -o report.html
  With what lies ahead and the answers to the programme's limits:
    genewane page report.json forecast.json verdict.json -o report.html
  The figures alone, for a paper:
    genewane page report.json --figures figures > /dev/null";

impl Flags {
    /// What was typed, as what is meant.
    pub fn plan(self) -> PagePlan {
        PagePlan {
            report: self.report,
            documents: self.documents,
            output: self.output,
            figures: self.figures,
            without_samples: self.without_samples,
        }
    }
}
