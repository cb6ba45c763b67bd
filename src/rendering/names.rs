//! Names of rendered files.

use std::path::{Path, PathBuf};

use crate::audio_files::Recording;
use crate::stage_file::{Configuration, file_stems};

/// `CONFIGURATION.wav` for one recording, `RECORDING/CONFIGURATION.wav` for more; a list a recording.
pub fn files(configurations: &[Configuration], recordings: &[Recording]) -> Vec<Vec<PathBuf>> {
    let stem = |r: &Recording| r.path().file_stem().map_or_else(String::new, |s| s.to_string_lossy().into_owned());
    let names: Vec<String> = recordings.iter().map(stem).collect();
    let folders = match recordings.len() {
        1 => vec![String::new()],
        _ => file_stems(names.iter().map(String::as_str)),
    };
    let below = |folder: &String| {
        configurations.iter().map(|c| Path::new(folder).join(format!("{}.wav", c.file_stem))).collect()
    };
    folders.iter().map(below).collect()
}

/// A path below the output folder as JSON writes it, the same on every system.
pub fn shown(file: &Path) -> String {
    file.iter().map(|part| part.to_string_lossy()).collect::<Vec<_>>().join("/")
}
