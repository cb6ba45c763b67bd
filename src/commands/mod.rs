//! One file a command: each takes its plan and returns how it ended.

mod bias;
mod compare;
mod csv_file;
mod demo;
mod listen;
mod listen_pack;
mod listen_plan;
mod listen_tally;
mod measure;
mod new;
mod render;
mod report;

use std::path::{Path, PathBuf};

use platewright_dsp::Kernel;
use platewright_dsp::triode::library;

use crate::audio_files::Recording;
use crate::failure::{Failure, Outcome};
use crate::figures::Figures;
use crate::plan::Plan;
use crate::stage_file::{Library, StageFile};
use crate::{show, terminal};

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
        Plan::Listen(plan) => listen::run(plan),
        Plan::Demo(plan) => demo::run(plan),
        Plan::Report(plan) => report::run(plan),
    }
}

/// The stage file at `path` with the tube library, its notes told.
///
/// # Errors
/// [`Failure::Request`] where anything in it is wrong.
fn stage(path: &Path) -> Result<StageFile, Failure> {
    told(with_library(&|library| StageFile::load(path, library))?)
}

/// The stage file of `text`, known to a person as `name`.
fn stage_of_text(name: &str, text: &str) -> Result<StageFile, Failure> {
    told(with_library(&|library| StageFile::parse(name, text.to_owned(), library))?)
}

fn with_library(read: &dyn Fn(&Library<'_>) -> Result<StageFile, Failure>) -> Result<StageFile, Failure> {
    let names: Vec<String> = library::names().map(str::to_owned).collect();
    read(&Library { find: &library::find, names: &names })
}

fn told(file: StageFile) -> Result<StageFile, Failure> {
    for note in &file.notes {
        terminal::message(&format!("note: {note}"));
    }
    Ok(file)
}

/// Every recording, opened and checked.
fn recordings(paths: &[PathBuf]) -> Result<Vec<Recording>, Failure> {
    let recordings: Vec<Recording> = paths.iter().map(|path| Recording::open(path)).collect::<Result<_, _>>()?;
    for warning in recordings.iter().filter_map(Recording::warning) {
        terminal::message(&format!("warning: {warning}"));
    }
    Ok(recordings)
}

/// The largest true peak (ITU-R BS.1770-4, annex 2) of all channels of all recordings, as a part of full scale.
fn true_peak(recordings: &[Recording]) -> Result<f64, Failure> {
    let mut largest: f64 = 0.0;
    for recording in recordings {
        largest = largest.max(recording.true_peak()?);
    }
    Ok(largest)
}

/// Prints figures as JSON, or their tables, with the warnings first.
fn print_figures(figures: &Figures, json: bool, tables: &[String]) -> Result<(), Failure> {
    if json {
        return terminal::print(&(figures.to_json()? + "\n"));
    }
    let title = figures.title.as_deref().map(|t| format!("{}\n", terminal::plain(t))).unwrap_or_default();
    let warnings = show::warnings(&figures.configurations, terminal::colour_on_stdout());
    let undecided = show::undecided(&figures.undecided);
    terminal::print(&format!("{title}{warnings}{}\n{undecided}", tables.join("\n")))
}

/// Which compiled form of the engine runs: `PLATEWRIGHT_PORTABLE=1` forces the one for any CPU.
fn kernel() -> Kernel {
    match std::env::var_os("PLATEWRIGHT_PORTABLE") {
        Some(value) if value != "0" => Kernel::Portable,
        _ => Kernel::detect(),
    }
}
