//! `genewane help`: commands, and topics that teach by the demonstration data.

use clap::{Args, CommandFactory};

use super::{Flags as Root, Work};
use crate::model::nearest;

/// Name and text of each topic; the first line of a text is `# name: what it is about`.
pub const TOPICS: [(&str, &str); 6] = [
    ("start", include_str!("../../docs/help/start.md")),
    (
        "effective-size",
        include_str!("../../docs/help/effective-size.md"),
    ),
    ("losses", include_str!("../../docs/help/losses.md")),
    ("sampling", include_str!("../../docs/help/sampling.md")),
    ("formats", include_str!("../../docs/help/formats.md")),
    ("methods", include_str!("../../docs/help/methods.md")),
];

/// Explains a command or a topic
///
/// Without a name: the commands and the topics.
#[derive(Debug, Clone, Args)]
pub(super) struct Flags {
    /// Command or topic
    #[arg(value_name = "COMMAND|TOPIC")]
    name: Option<String>,
}

impl Flags {
    /// The text that was asked for.
    ///
    /// # Errors
    /// A name that is neither, with the nearest that is.
    pub fn plan(self) -> Result<Work, clap::Error> {
        let mut root = Root::command();
        root.build();
        let Some(name) = self.name else {
            let mut text = root.render_long_help().to_string();
            text.push_str("\nTopics ('genewane help TOPIC'):\n");
            for (name, topic) in TOPICS {
                text.push_str(&format!("  {name:<16}{}\n", about(topic)));
            }
            return Ok(Work::Words(text));
        };
        if let Some(command) = root.find_subcommand_mut(&name) {
            return Ok(Work::Words(command.render_long_help().to_string()));
        }
        if let Some((_, text)) = TOPICS.iter().find(|(topic, _)| *topic == name) {
            return Ok(Work::Words((*text).to_owned()));
        }
        let known: Vec<String> = root
            .get_subcommands()
            .map(|c| c.get_name().to_owned())
            .chain(TOPICS.iter().map(|(topic, _)| (*topic).to_owned()))
            .collect();
        let cure = match nearest(&name, known.iter().map(String::as_str)) {
            Some(near) => format!("did you mean '{near}'?"),
            None => format!("there are: {}", known.join(", ")),
        };
        Err(root.error(
            clap::error::ErrorKind::InvalidSubcommand,
            format!("no command and no topic is named '{name}'; {cure}"),
        ))
    }
}

/// What a topic is about, from its first line.
fn about(text: &str) -> &str {
    let first = text.lines().next().unwrap_or_default();
    first.split_once(": ").map_or(first, |(_, about)| about)
}
