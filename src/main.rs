//! The program: parse, run, tell the one error, exit.

use std::process::ExitCode;

use genewane::{cli, run};

fn main() -> ExitCode {
    let arguments: Vec<_> = std::env::args_os().collect();
    let work = match cli::parse_from(&arguments) {
        Ok(work) => work,
        Err(told) => told.exit(),
    };
    match run::run(work, &arguments) {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) if error.is_broken_pipe() => ExitCode::SUCCESS,
        Err(error) => {
            eprintln!("genewane: {error}");
            ExitCode::from(error.exit_code())
        }
    }
}
