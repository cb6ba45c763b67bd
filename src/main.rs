//! The program `platewright`: files in, files out, what a person sees.

mod audio_files;
mod cli;
mod commands;
mod failure;
mod figures;
mod iec60062;
mod listening;
mod option_values;
mod plan;
mod profile;
mod rendering;
mod report;
mod show;
mod spanned;
mod stage_file;
mod terminal;

use std::process::ExitCode;

use clap::Parser;

use failure::{EXIT_DONE, EXIT_FAILED, EXIT_REFUSED, Failure};
use plan::Plan;

fn main() -> ExitCode {
    failure::install_panic_hook();
    // Without a handler Ctrl-C still ends the program, only less tidily.
    let _ = audio_files::interrupt::listen();
    // A defect unwinds to here, so that files half written are cleaned up on the way.
    ExitCode::from(std::panic::catch_unwind(run).unwrap_or(EXIT_FAILED))
}

fn run() -> u8 {
    let arguments = match cli::Arguments::try_parse() {
        Ok(arguments) => arguments,
        Err(help_or_error) => {
            // Help that nobody reads to its end is no failure.
            let _ = help_or_error.print();
            return if help_or_error.use_stderr() { EXIT_REFUSED } else { EXIT_DONE };
        }
    };
    let done = Plan::new(arguments).map_err(Failure::from).and_then(|plan| commands::run(&plan));
    match done {
        Ok(outcome) => outcome.exit_code(),
        Err(failure) => {
            if let Some(message) = failure.message(terminal::colour()) {
                terminal::message(&message);
            }
            failure.exit_code()
        }
    }
}
