//! `genewane schema`: what the documents of the program look like.

use clap::Args;

/// Prints the JSON Schema of a document that the program writes
///
/// The dialect is 2020-12. Dashboards and pipelines can check documents with it before they read
/// them; each field has its unit and the reason for which it may be absent.
#[derive(Debug, Clone, Args)]
#[command(after_long_help = EXAMPLES)]
pub(super) struct Flags {
    /// Name of the document, such as report; without one, the names are listed
    #[arg(value_name = "NAME")]
    pub name: Option<String>,
}

const EXAMPLES: &str = "\
Examples:
  The schema of the report:
    genewane schema report > report.schema.json";
