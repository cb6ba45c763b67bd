//! Recordings through every configuration into WAV files at one level.

mod estimate;
mod excerpt;
mod lanes;
mod level;
mod names;
mod passage;
mod progress;
mod stepping;

use std::path::PathBuf;

use platewright_dsp::Kernel;
use platewright_dsp::portable::{decibels, ratio};
use platewright_dsp::signal::Oversampling;
use serde::{Deserialize, Serialize};

use crate::audio_files::{AudioError, OutputFolder, Recording, StagedFile};
use crate::failure::{Failure, RequestError, WorkError};
use crate::plan::Sound;
use crate::stage_file::Configuration;

pub use estimate::Estimate;
pub use excerpt::{Planes, excerpt, recorded};
use level::Level;
use passage::Passage;
pub use progress::Progress;

/// The engine's rate that the default oversampling reaches, steps a second.
const ENGINE_RATE: u32 = 352_800;

/// Recordings, the configurations that they pass, and how.
pub struct Job<'a> {
    configurations: &'a [Configuration],
    recordings: &'a [Recording],
    sound: &'a Sound,
    kernel: Kernel,
    level: Level,
    files: Vec<Vec<PathBuf>>,
}

/// One rendered file.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct RenderFigures {
    /// The recording's file name.
    pub recording: String,
    /// The configuration's name.
    pub configuration: String,
    /// The file, below the output folder, `/` between folders.
    pub file: String,
    /// Hz.
    pub sample_rate: u32,
    /// Channels.
    pub channels: usize,
    /// Frames.
    pub frames: u64,
    /// i16, i24, i32 or f32.
    pub format: String,
    /// Engine steps a frame.
    pub oversampling: usize,
    /// V rms at the output that a 0 dBFS sine stands for: the one level factor.
    pub full_scale_rms: f64,
    /// V at the output's largest peak.
    pub peak_volts: f64,
    /// That peak in the file; `null` for silence.
    #[serde(rename = "peak_dBFS")]
    pub peak_dbfs: Option<f64>,
    /// Integrated loudness of the file (ITU-R BS.1770-4); `null` where nothing rises above −70 LUFS.
    #[serde(rename = "loudness_LUFS", default)]
    pub loudness_lufs: Option<f64>,
    /// Samples beyond 0 dBFS: clipped in integer formats, kept in float.
    pub over_full_scale: u64,
    /// Newton steps of the engine's root a step, on average.
    pub newton_per_step: f64,
    /// Steps whose root stayed above its tolerance.
    pub unresolved_steps: u64,
    /// For a sine that peaks where the recording does.
    #[serde(flatten)]
    pub estimate: Estimate,
}

impl<'a> Job<'a> {
    /// Checks that the job can be done; makes nothing.
    ///
    /// # Errors
    /// [`RequestError`] where only some configurations state the output's full scale.
    pub fn new(
        configurations: &'a [Configuration],
        recordings: &'a [Recording],
        sound: &'a Sound,
        kernel: Kernel,
    ) -> Result<Job<'a>, RequestError> {
        let level = Level::of(configurations, sound)?;
        let files = names::files(configurations, recordings);
        Ok(Job { configurations, recordings, sound, kernel, level, files })
    }

    /// The files that it will write, below the output folder.
    pub fn files(&self) -> impl Iterator<Item = &PathBuf> {
        self.files.iter().flatten()
    }

    /// Does the job: every file staged in `folder`, with its figures.
    ///
    /// # Errors
    /// A file cannot be read or written, a stage cannot be stepped, or the user interrupts.
    pub fn run(&self, folder: &OutputFolder) -> Result<(Vec<StagedFile>, Vec<RenderFigures>), Failure> {
        let work: u64 = self.recordings.iter().map(|r| r.frames() * r.channels() as u64).sum();
        let progress = Progress::new("rendering", work * self.configurations.len() as u64);
        let mut passages = Vec::new();
        for (recording, files) in self.recordings.iter().zip(&self.files) {
            passages.push(self.passage(recording, files)?.run(folder, &progress)?);
        }
        let peak = passages.iter().flat_map(|p| p.peaks()).fold(0.0, f64::max);
        let (mut staged, mut figures) = (Vec::new(), Vec::new());
        for passage in passages {
            passage.finish(&self.level, peak, folder, &mut |file, figure| {
                staged.push(file);
                figures.push(figure);
            })?;
        }
        progress.done();
        Ok((staged, figures))
    }

    fn passage<'j>(&'j self, recording: &'j Recording, files: &'j [PathBuf]) -> Result<Passage<'j>, Failure> {
        let oversampling = oversampling(self.sound, recording)?;
        let lanes = lanes_for(self.configurations, recording, self.sound, oversampling, self.kernel)?;
        Ok(Passage::new(self, recording, files, oversampling, lanes))
    }
}

/// Lanes for every channel of `recording` through every configuration.
fn lanes_for(
    configurations: &[Configuration],
    recording: &Recording,
    sound: &Sound,
    oversampling: Oversampling,
    kernel: Kernel,
) -> Result<lanes::Lanes, Failure> {
    let rate = f64::from(recording.sample_rate()) * oversampling.factor() as f64;
    let machines = lanes::machines(configurations, rate).map_err(|(index, reason)| {
        let name = &configurations[index].name;
        WorkError::Failed {
            problem: format!("configuration \"{name}\" cannot be rendered: {reason}"),
            remedy: "look at it with `platewright bias` first".to_owned(),
        }
    })?;
    let drive = ratio(sound.drive);
    Ok(lanes::Lanes::new(configurations, &machines, recording.channels(), oversampling, kernel, drive))
}

fn oversampling(sound: &Sound, recording: &Recording) -> Result<Oversampling, Failure> {
    match sound.oversample {
        None => Ok(Oversampling::to_reach(ENGINE_RATE, recording.sample_rate())),
        Some(factor) => Oversampling::new(factor).map_err(|bad| {
            RequestError::new(format!("--oversample: {bad}"), "leave it out for the usual factor").into()
        }),
    }
}

/// What a person should know of the rendered files although they are there.
pub fn warnings(figures: &[RenderFigures]) -> Vec<String> {
    let over = figures.iter().filter(|f| f.over_full_scale > 0).map(|f| {
        let kept = if f.format == "f32" { "kept in float" } else { "clipped" };
        format!("{}: {} samples beyond 0 dBFS, {kept}; raise the full scale", f.file, f.over_full_scale)
    });
    let unresolved = figures
        .iter()
        .filter(|f| f.unresolved_steps > 0)
        .map(|f| format!("{}: at {} steps the tubes' equations were not met to 1 µV", f.file, f.unresolved_steps));
    let beyond = figures.iter().flat_map(|f| {
        f.estimate.beyond_law.iter().map(|law| format!("{}: {law} (1 kHz at the recording's peak)", f.file))
    });
    over.chain(unresolved).chain(beyond).collect()
}

/// Alias products above this are worth another oversampling, dBc.
const ALIASES_HEARD: f64 = -80.0;

/// The worst alias estimate of every recording, in words.
pub fn alias_lines(figures: &[RenderFigures]) -> Vec<String> {
    let line = |of_recording: &[RenderFigures]| {
        let dbc = |f: &&RenderFigures| f.estimate.alias_dbc.unwrap_or(f64::NEG_INFINITY);
        let worst = of_recording.iter().max_by(|a, b| dbc(a).total_cmp(&dbc(b)))?;
        let (tone, recording) = (worst.estimate.alias_tone / 1000.0, &worst.recording);
        let found = match (worst.estimate.alias_dbc, worst.estimate.why.get("alias_dBc")) {
            (Some(estimate), _) => format!("{estimate:.0} dBc at worst, in {}", worst.configuration),
            (None, reason) => reason.cloned().unwrap_or_default(),
        };
        let heard = worst.estimate.alias_dbc.is_some_and(|dbc| dbc > ALIASES_HEARD) && worst.oversampling < 64;
        let more =
            if heard { format!("; --oversample {} brings less", 2 * worst.oversampling) } else { String::new() };
        Some(format!("alias estimate for a {tone} kHz tone at the peak of {recording}: {found}{more}"))
    };
    figures.chunk_by(|a, b| a.recording == b.recording).filter_map(line).collect()
}

/// The level that all files share, in words.
pub fn level_line(figures: &[RenderFigures]) -> Option<String> {
    let first = figures.first()?;
    let equal = figures.iter().all(|f| f.full_scale_rms == first.full_scale_rms);
    let loudest = figures.iter().max_by(|a, b| a.peak_volts.total_cmp(&b.peak_volts))?;
    let what = if equal { "one factor for all files" } else { "each configuration's own output.full_scale" };
    Some(format!(
        "level: 0 dBFS is {:.4} V rms ({:+.2} dB for 1 V rms), {what}; loudest peak {:.3} V in {}",
        first.full_scale_rms,
        -decibels(first.full_scale_rms),
        loudest.peak_volts,
        loudest.file
    ))
}

impl From<AudioError> for Failure {
    fn from(error: AudioError) -> Self {
        let text = error.to_string();
        // The message of a file's error ends with what to do, after its last semicolon.
        let (problem, remedy) = match text.rsplit_once("; ") {
            Some((problem, remedy)) => (problem.to_owned(), remedy.to_owned()),
            None => (text, String::new()),
        };
        if error.is_request() {
            RequestError::new(problem, remedy).into()
        } else {
            WorkError::Failed { problem, remedy }.into()
        }
    }
}
