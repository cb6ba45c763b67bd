//! What can go wrong, and the exit code it ends with.

use std::fmt;
use std::io;

use crate::spanned::problem::Diagnosis;
use crate::terminal::plain;

/// Exit code of a run that did what was asked.
pub const EXIT_DONE: u8 = 0;
/// Exit code of work that failed.
pub const EXIT_FAILED: u8 = 1;
/// Exit code of a wrong request or a wrong file.
pub const EXIT_REFUSED: u8 = 2;
/// Exit code of a finished run in which `--strict` found a warning.
pub const EXIT_WARNED: u8 = 3;

/// How a finished command ended.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Outcome {
    /// Everything asked is done.
    Done,
    /// Everything asked is done, but `--strict` was given and there was a warning.
    Warned,
}

impl Outcome {
    /// The outcome of a command that saw `warnings` under `strict`.
    pub fn of(strict: bool, warnings: bool) -> Self {
        if strict && warnings { Self::Warned } else { Self::Done }
    }

    /// The program's exit code.
    pub fn exit_code(self) -> u8 {
        match self {
            Self::Done => EXIT_DONE,
            Self::Warned => EXIT_WARNED,
        }
    }
}

/// Why a command did not end.
#[derive(Debug)]
pub enum Failure {
    /// Found wrong before any work began; nothing has been created.
    Request(RequestError),
    /// Went wrong while working.
    Work(WorkError),
    /// The program that read standard output has closed it and wants no more: nobody needs to be told.
    ReaderGone,
}

/// A request or a file that is wrong.
#[derive(Debug)]
pub enum RequestError {
    /// A file of the user's with problems, each with its place.
    File(Box<Diagnosis>),
    /// Anything else: what is wrong, and what to do.
    Refused {
        /// What is wrong and where, with what was expected.
        problem: String,
        /// What to do about it.
        remedy: String,
    },
}

/// Work that failed.
#[derive(Debug)]
pub enum WorkError {
    /// Something could not be written.
    Write {
        /// The file or stream.
        what: String,
        /// The system's reason.
        source: io::Error,
    },
    /// Anything else: what failed, and what to do.
    Failed {
        /// What failed.
        problem: String,
        /// What to do about it.
        remedy: String,
    },
}

impl RequestError {
    /// A refusal in two sentences.
    pub fn new(problem: impl Into<String>, remedy: impl Into<String>) -> Self {
        Self::Refused { problem: problem.into(), remedy: remedy.into() }
    }
}

impl From<RequestError> for Failure {
    fn from(error: RequestError) -> Self {
        Self::Request(error)
    }
}

impl From<WorkError> for Failure {
    fn from(error: WorkError) -> Self {
        Self::Work(error)
    }
}

impl Failure {
    /// The program's exit code.
    pub fn exit_code(&self) -> u8 {
        match self {
            Self::Request(_) => EXIT_REFUSED,
            Self::Work(_) => EXIT_FAILED,
            Self::ReaderGone => EXIT_DONE,
        }
    }

    /// The message for a person, coloured where `colour` says so; nothing where nobody needs one.
    pub fn message(&self, colour: bool) -> Option<String> {
        match self {
            Self::Request(RequestError::File(diagnosis)) => Some(diagnosis.render(colour)),
            Self::Request(RequestError::Refused { problem, remedy })
            | Self::Work(WorkError::Failed { problem, remedy }) => Some(two_lines(problem, remedy)),
            Self::Work(error) => Some(format!("error: {error}")),
            Self::ReaderGone => None,
        }
    }
}

fn two_lines(problem: &str, remedy: &str) -> String {
    if remedy.is_empty() { format!("error: {problem}") } else { format!("error: {problem}\n  help: {remedy}") }
}

impl fmt::Display for WorkError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Write { what, source } => write!(f, "{} could not be written: {source}", plain(what)),
            Self::Failed { problem, remedy } => write!(f, "{problem}: {remedy}"),
        }
    }
}

/// Turns a defect of the program into a polite message; the caller of `catch_unwind` turns it into an exit code.
pub fn install_panic_hook() {
    std::panic::set_hook(Box::new(|panic| {
        let place = panic.location().map(|at| format!(" at {}:{}", at.file(), at.line())).unwrap_or_default();
        let reason = panic.payload_as_str().unwrap_or("no reason given");
        crate::terminal::message(&format!(
            "error: platewright has run into a defect of its own{place}: {}\n  help: please report this line together \
             with the stage file and the command",
            plain(reason)
        ));
    }));
}
