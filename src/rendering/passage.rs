//! One recording through every configuration, in blocks.

use std::path::PathBuf;

use platewright_dsp::Kernel;
use platewright_dsp::portable::{decibels, ratio};
use platewright_dsp::signal::{LoudnessMeter, Oversampling, Resampler, TriangularDither};

use super::lanes::Lanes;
use super::level::Level;
use super::progress::Progress;
use super::stepping::{self, BLOCK, Extent};
use super::{Estimate, Job, RenderFigures, names};
use crate::audio_files::{OutputFolder, Recording, SampleFormat, Scratch, StagedFile, WavOutput};
use crate::cli;
use crate::failure::{Failure, RequestError};
use crate::plan::Sound;
use crate::stage_file::Configuration;

/// A recording on its way.
pub struct Passage<'a> {
    configurations: &'a [Configuration],
    recording: &'a Recording,
    sound: &'a Sound,
    oversampling: Oversampling,
    lanes: Lanes,
    files: &'a [PathBuf],
    stated: bool,
    level: &'a Level,
    kernel: Kernel,
}

/// A recording that has passed.
pub struct Passed<'a> {
    passage: Passage<'a>,
    sinks: Vec<Sink>,
    /// The recording's largest sample, 1.0 being full scale.
    input_peak: f64,
}

/// Where a configuration's volts go.
struct Sink {
    /// One a channel, where the files get another sample rate than the recording's.
    resamplers: Vec<Resampler>,
    target: Target,
    peak_volts: f64,
}

enum Target {
    /// The level is known: straight into the file.
    File(Box<ScaledFile>),
    /// It waits for the loudest peak.
    Waiting(Scratch),
}

impl<'a> Passage<'a> {
    pub fn new(
        job: &'a Job<'a>,
        recording: &'a Recording,
        files: &'a [PathBuf],
        oversampling: Oversampling,
        lanes: Lanes,
    ) -> Self {
        Passage {
            configurations: job.configurations,
            recording,
            sound: job.sound,
            oversampling,
            lanes,
            files,
            stated: matches!(job.level, Level::Stated(_)),
            level: &job.level,
            kernel: job.kernel,
        }
    }

    /// Frames of the output at the recording's rate.
    fn frames(&self) -> u64 {
        let tail = (self.sound.tail * f64::from(self.recording.sample_rate())).round() as u64;
        self.recording.frames() + tail
    }

    fn sample_rate(&self) -> u32 {
        self.sound.rate.unwrap_or(self.recording.sample_rate())
    }

    /// Frames of the files.
    fn file_frames(&self) -> Result<u64, Failure> {
        Ok(self.resampler()?.map_or(self.frames(), |r| r.output_frames(self.frames())))
    }

    fn resampler(&self) -> Result<Option<Resampler>, Failure> {
        let (from, to) = (self.recording.sample_rate(), self.sample_rate());
        if from == to {
            return Ok(None);
        }
        let made = Resampler::new(from, to, self.kernel);
        let refused = made.map_err(|bad| RequestError::new(format!("--rate: {bad}"), "choose 8000 to 192000"));
        Ok(Some(refused?))
    }

    fn format(&self) -> SampleFormat {
        match self.sound.format {
            cli::SampleFormat::I16 => SampleFormat::I16,
            cli::SampleFormat::I24 => SampleFormat::I24,
            cli::SampleFormat::I32 => SampleFormat::I32,
            cli::SampleFormat::F32 => SampleFormat::F32,
        }
    }

    fn scaled_file(&self, folder: &OutputFolder, configuration: usize, scale: f64) -> Result<ScaledFile, Failure> {
        let file = folder.stage(&self.files[configuration])?;
        let (channels, format) = (self.recording.channels(), self.format());
        let wav = WavOutput::new(file, format, channels, self.sample_rate(), self.file_frames()?)?;
        let dithered = if self.sound.dither { channels } else { 0 };
        let dither = (0..dithered).map(TriangularDither::for_channel).collect();
        let loudness = LoudnessMeter::new(channels, self.sample_rate()).ok();
        Ok(ScaledFile { wav, scale, dither, step: format.step(), loudness })
    }

    fn sink(&self, folder: &OutputFolder, configuration: usize) -> Result<Sink, Failure> {
        let channels = self.recording.channels();
        let target = if self.stated {
            let scale = self.level.samples_per_volt(configuration, 0.0);
            Target::File(Box::new(self.scaled_file(folder, configuration, scale)?))
        } else {
            Target::Waiting(Scratch::new_in(folder.path(), channels)?)
        };
        let resamplers = self.resampler()?.map_or_else(Vec::new, |resampler| vec![resampler; channels]);
        Ok(Sink { resamplers, target, peak_volts: 0.0 })
    }

    /// Steps the whole recording, and silence after it until the last frame has come out.
    pub fn run(mut self, folder: &OutputFolder, progress: &Progress) -> Result<Passed<'a>, Failure> {
        let channels = self.recording.channels();
        let mut sinks: Vec<Sink> =
            (0..self.configurations.len()).map(|c| self.sink(folder, c)).collect::<Result<_, _>>()?;
        let mut blocks = self.recording.blocks()?;
        let configurations = self.configurations.len();
        let extent = Extent { configurations, channels, frames: self.frames() };
        let mut input_peak = 0.0_f64;
        let mut read = |planes: &mut [Vec<f64>]| -> Result<usize, Failure> {
            let frames = blocks.read(planes, BLOCK)?;
            progress.add((frames * channels * configurations) as u64);
            input_peak = planes.iter().flatten().fold(input_peak, |peak, sample| peak.max(sample.abs()));
            Ok(frames)
        };
        let mut take = |configuration: usize, planes: &mut [Vec<f64>]| sinks[configuration].take(planes);
        stepping::step(&mut self.lanes, &extent, &mut read, &mut take)?;
        for sink in &mut sinks {
            sink.end()?;
        }
        Ok(Passed { passage: self, sinks, input_peak })
    }
}

impl Sink {
    /// Takes a block, one plane a channel; the planes' contents are used up.
    fn take(&mut self, channels: &mut [Vec<f64>]) -> Result<(), Failure> {
        if self.resamplers.is_empty() {
            return self.put(channels);
        }
        let resample = |(resampler, plane): (&mut Resampler, &Vec<f64>)| {
            let mut out = Vec::new();
            resampler.process(plane, &mut out);
            out
        };
        let mut resampled: Vec<Vec<f64>> = self.resamplers.iter_mut().zip(&*channels).map(resample).collect();
        self.put(&mut resampled)
    }

    /// What the resamplers still hold.
    fn end(&mut self) -> Result<(), Failure> {
        let finish = |resampler: &mut Resampler| {
            let mut out = Vec::new();
            resampler.finish(&mut out);
            out
        };
        let mut rest: Vec<Vec<f64>> = self.resamplers.iter_mut().map(finish).collect();
        if rest.is_empty() { Ok(()) } else { self.put(&mut rest) }
    }

    fn put(&mut self, channels: &mut [Vec<f64>]) -> Result<(), Failure> {
        self.peak_volts = channels.iter().flatten().fold(self.peak_volts, |peak, volts| peak.max(volts.abs()));
        match &mut self.target {
            Target::Waiting(scratch) => Ok(scratch.write(channels)?),
            Target::File(file) => file.write(channels),
        }
    }
}

/// A file with the factor that makes samples of volts.
struct ScaledFile {
    wav: WavOutput,
    scale: f64,
    /// One a channel, where dither is wanted.
    dither: Vec<TriangularDither>,
    step: f64,
    /// None where the file has more channels than loudness is defined for.
    loudness: Option<LoudnessMeter>,
}

impl ScaledFile {
    fn write(&mut self, channels: &mut [Vec<f64>]) -> Result<(), Failure> {
        channels.iter_mut().flatten().for_each(|volts| *volts *= self.scale);
        for (dither, channel) in self.dither.iter_mut().zip(channels.iter_mut()) {
            dither.add(channel, self.step);
        }
        if let Some(meter) = &mut self.loudness {
            meter.add(channels);
        }
        Ok(self.wav.write(channels)?)
    }
}

impl Passed<'_> {
    /// The largest peak of every configuration, V.
    pub fn peaks(&self) -> impl Iterator<Item = f64> {
        self.sinks.iter().map(|sink| sink.peak_volts)
    }

    /// Writes what waited, now that the loudest peak of all is known, and hands over every file with its figures.
    pub fn finish(
        self,
        level: &Level,
        peak: f64,
        folder: &OutputFolder,
        hand_over: &mut dyn FnMut(StagedFile, RenderFigures),
    ) -> Result<(), Failure> {
        let Passed { passage, sinks, input_peak } = self;
        let channels = passage.recording.channels();
        for (configuration, sink) in sinks.into_iter().enumerate() {
            let scale = level.samples_per_volt(configuration, peak);
            let file = match sink.target {
                Target::File(file) => *file,
                Target::Waiting(scratch) => {
                    let mut file = passage.scaled_file(folder, configuration, scale)?;
                    let mut waiting = scratch.into_reader()?;
                    let mut planes = vec![Vec::new(); channels];
                    while waiting.read(&mut planes, BLOCK)? > 0 {
                        file.write(&mut planes)?;
                    }
                    file
                }
            };
            let loudness = file.loudness.and_then(LoudnessMeter::finish);
            let (staged, levels) = file.wav.finish()?;
            let written = Written {
                frames: passage.file_frames()?,
                scale,
                peak_volts: sink.peak_volts,
                over_full_scale: levels.over_full_scale,
                input_peak,
                loudness,
            };
            hand_over(staged, passage.figures(configuration, &written));
        }
        Ok(())
    }
}

/// What a finished file knows of itself.
struct Written {
    frames: u64,
    /// Samples a volt.
    scale: f64,
    peak_volts: f64,
    over_full_scale: u64,
    /// The recording's largest sample.
    input_peak: f64,
    /// Of the file, LUFS.
    loudness: Option<f64>,
}

impl Passage<'_> {
    fn figures(&self, configuration: usize, written: &Written) -> RenderFigures {
        let stage = &self.configurations[configuration].stage;
        let (sample_rate, times) = (self.recording.sample_rate(), self.oversampling.factor());
        let input_rms = written.input_peak * ratio(self.sound.drive) * stage.source.full_scale;
        let counts = self.lanes.counts(configuration);
        let channels = self.recording.channels();
        let steps =
            (self.frames() + self.lanes.latency() as u64) as f64 * (self.oversampling.factor() * channels) as f64;
        let name =
            |path: &std::path::Path| path.file_name().map_or_else(String::new, |n| n.to_string_lossy().into());
        RenderFigures {
            recording: name(self.recording.path()),
            configuration: self.configurations[configuration].name.clone(),
            file: names::shown(&self.files[configuration]),
            sample_rate: self.sample_rate(),
            channels,
            frames: written.frames,
            format: format!("{:?}", self.sound.format).to_lowercase(),
            oversampling: times,
            full_scale_rms: 1.0 / (written.scale * std::f64::consts::SQRT_2),
            peak_volts: written.peak_volts,
            loudness_lufs: written.loudness,
            peak_dbfs: (written.peak_volts > 0.0).then(|| decibels(written.peak_volts * written.scale)),
            over_full_scale: written.over_full_scale,
            newton_per_step: counts.newton as f64 / steps,
            unresolved_steps: counts.unresolved,
            estimate: Estimate::of(stage, sample_rate, times, input_rms),
        }
    }
}
