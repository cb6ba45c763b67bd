//! `platewright demo`: the comparison of the built-in stage on the built-in recording.

use std::io::Write;
use std::path::Path;

use super::compare::Comparison;
use crate::audio_files::Recording;
use crate::failure::{Failure, Outcome, WorkError};
use crate::plan::{DemoPlan, LevelUnit, Sound};

/// The built-in stage.
pub const STAGE: &str = include_str!("../demo/stage.toml");
/// The built-in recording.
const RECORDING: &[u8] = include_bytes!("../../audio-samples/stage-piano.wav");
/// What it is called beside the results.
const RECORDING_NAME: &str = "stage-piano.wav";

/// Runs the command. The stage file and the recording are put beside the results, to be changed and used again.
///
/// # Errors
/// [`Failure`] where an output cannot be written or the user interrupts.
pub fn run(plan: &DemoPlan) -> Result<Outcome, Failure> {
    let file = super::stage_of_text("the built-in stage", STAGE)?;
    // A recording is streamed from a file; this one goes away with the folder.
    let folder = tempfile::tempdir().map_err(|source| write_error("a temporary folder", source))?;
    let path = folder.path().join(RECORDING_NAME);
    write(&path).map_err(|source| write_error("a temporary file", source))?;
    let recordings = [Recording::open(&path)?];
    let comparison = Comparison {
        file: &file,
        recordings: &recordings,
        inputs: &[],
        extras: &[("stage.toml", STAGE.as_bytes()), (RECORDING_NAME, RECORDING)],
        into: &plan.into,
        csv: None,
        profile: None,
        level: None,
        trust: true,
        plots: plan.plots,
        levels: LevelUnit::default(),
        sound: &Sound::default(),
        pack: None,
    };
    comparison.run(plan.figures)
}

fn write(path: &Path) -> std::io::Result<()> {
    std::fs::File::create_new(path)?.write_all(RECORDING)
}

fn write_error(what: &str, source: std::io::Error) -> WorkError {
    WorkError::Write { what: what.to_owned(), source }
}
