//! `platewright new`: a commented stage file to edit.

use std::fs::{self, OpenOptions};
use std::io::{self, Write};
use std::path::Path;

use crate::failure::{Failure, Outcome, RequestError, WorkError};
use crate::plan::NewPlan;
use crate::terminal;

/// The text that is written.
pub const EXAMPLE: &str = include_str!("example.toml");

/// Writes the example, and never over anything.
///
/// # Errors
/// [`RequestError`] where the file exists or its folder does not, [`WorkError`] where it cannot be written.
pub fn run(plan: &NewPlan) -> Result<Outcome, Failure> {
    let name = terminal::path(&plan.file);
    write_new(&plan.file, &name)?;
    terminal::message(&format!("{name} is written; after editing it: platewright bias {name}"));
    Ok(Outcome::Done)
}

fn write_new(path: &Path, name: &str) -> Result<(), Failure> {
    let mut file =
        OpenOptions::new().write(true).create_new(true).open(path).map_err(|error| cannot_create(name, error))?;
    if let Err(source) = file.write_all(EXAMPLE.as_bytes()).and_then(|()| file.sync_all()) {
        // Half a stage file would only puzzle; the trouble that is told is that of the writing.
        let _ = fs::remove_file(path);
        return Err(WorkError::Write { what: name.to_owned(), source }.into());
    }
    Ok(())
}

fn cannot_create(name: &str, error: io::Error) -> Failure {
    let (problem, remedy) = match error.kind() {
        io::ErrorKind::AlreadyExists => (
            format!("{name} exists already, and nothing is ever written over it"),
            "choose another name, or move the old file away",
        ),
        io::ErrorKind::IsADirectory => (format!("{name} is a folder"), "name a file in it, such as stage.toml"),
        io::ErrorKind::NotFound => (format!("the folder of {name} does not exist"), "make the folder first"),
        io::ErrorKind::NotADirectory => (format!("the folder of {name} is a file"), "name a file in a folder"),
        _ => return WorkError::Write { what: name.to_owned(), source: error }.into(),
    };
    RequestError::new(problem, remedy).into()
}
