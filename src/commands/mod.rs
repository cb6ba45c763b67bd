//! One file a command: each takes its plan and returns how it ended.

mod bias;
mod compare;
mod demo;
mod measure;
mod new;
mod render;

use std::path::Path;

use crate::failure::{Failure, Outcome, WorkError};
use crate::plan::Plan;
use crate::stage_file::{Library, StageFile};
use crate::terminal;

#[cfg(test)]
pub use {demo::STAGE as DEMO_STAGE, new::EXAMPLE as EXAMPLE_STAGE};

/// Runs the planned command.
///
/// # Errors
/// Whatever keeps the command from ending.
pub fn run(plan: &Plan) -> Result<Outcome, Failure> {
    match plan {
        Plan::New(plan) => new::run(plan),
        Plan::Bias(plan) => bias::run(plan),
        Plan::Measure(plan) => measure::run(plan),
        Plan::Render(plan) => render::run(plan),
        Plan::Compare(plan) => compare::run(plan),
        Plan::Demo(plan) => demo::run(plan),
    }
}

/// The stage file at `path` with the tube library, its notes told.
///
/// # Errors
/// [`Failure::Request`] where anything in it is wrong.
fn stage(path: &Path) -> Result<StageFile, Failure> {
    let file = StageFile::load(path, &Library { find: &|_| None, names: &[] })?;
    for note in &file.notes {
        terminal::message(&format!("note: {note}"));
    }
    Ok(file)
}

fn not_yet(command: &str) -> Failure {
    let problem = format!("`platewright {command}` is not available yet");
    WorkError::Failed { problem, remedy: "the stage file itself is fine".to_owned() }.into()
}
