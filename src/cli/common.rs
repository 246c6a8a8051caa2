//! Flags that several commands share, and checks of single values.

use std::path::{Path, PathBuf};

use clap::error::ErrorKind;
use clap::{Args, CommandFactory};

/// Flags of every command that computes.
#[derive(Debug, Clone, Args)]
#[command(next_help_heading = "Running")]
pub(super) struct Running {
    /// Threads to use [default: all cores]
    ///
    /// The result is the same, byte for byte, for any number.
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..))]
    threads: Option<u16>,
    /// Keep progress and notes off standard error; errors still appear
    #[arg(long)]
    pub quiet: bool,
}

impl Running {
    pub fn threads(&self) -> Option<usize> {
        self.threads.map(usize::from)
    }
}

/// Refuses a file that is both read and written.
pub(super) fn keep_apart<'a>(
    inputs: impl IntoIterator<Item = Option<&'a PathBuf>>,
    output: Option<&PathBuf>,
) -> Result<(), clap::Error> {
    match output {
        Some(output)
            if output != Path::new("-")
                && inputs.into_iter().flatten().any(|input| input == output) =>
        {
            let text = format!(
                "{} is both read and written: give the output another name",
                output.display()
            );
            Err(super::Flags::command().error(ErrorKind::ArgumentConflict, text))
        }
        _ => Ok(()),
    }
}

/// A finite number above 0.
pub(super) fn above_zero(text: &str) -> Result<f64, String> {
    number(text, |x| x > 0.0, "a number above 0")
}

/// A census size.
pub(super) fn census(text: &str) -> Result<f64, String> {
    number(text, |x| x >= 2.0, "a number of individuals, 2 or more")
}

/// A share from 0 to 1.
pub(super) fn share(text: &str) -> Result<f64, String> {
    number(
        text,
        |x| (0.0..=1.0).contains(&x),
        "a share from 0 to 1; write 0.8 for 80 %",
    )
}

/// A share above 0 and below 1.
pub(super) fn inner_share(text: &str) -> Result<f64, String> {
    let inside = |x| x > 0.0 && x < 1.0;
    number(
        text,
        inside,
        "a share above 0 and below 1; write 0.9 for 90 %",
    )
}

/// An even count of gene copies.
pub(super) fn gene_copies(text: &str) -> Result<u32, String> {
    match text.trim().parse::<u32>() {
        Ok(copies) if copies >= 2 && copies % 2 == 0 => Ok(copies),
        Ok(copies) if copies >= 2 => Err(format!(
            "not even; individuals have two gene copies, so take {}",
            copies - 1
        )),
        _ => Err("not an even whole number of 2 or more".to_string()),
    }
}

/// Text that is not blank.
pub(super) fn label(text: &str) -> Result<String, String> {
    match text.trim() {
        "" => Err("blank".to_string()),
        text => Ok(text.to_string()),
    }
}

fn number(text: &str, holds: impl Fn(f64) -> bool, words: &str) -> Result<f64, String> {
    match text.trim().parse::<f64>() {
        Ok(number) if number.is_finite() && holds(number) => Ok(number),
        _ => Err(format!("not {words}")),
    }
}
