//! A recording: opened, checked as a whole, then streamed in blocks.

use std::fs::{self, File};
use std::io::{BufReader, Read, Seek, SeekFrom};
use std::path::{Path, PathBuf};

use platewright_dsp::signal::LevelMeter;

use super::error::RecordingProblem as Problem;
use super::samples::Coding;
use super::wav_header::{self, HeaderError, WavHeader};
use super::{AudioError, interrupt};

/// Frames read together while a recording is checked.
const CHECK_FRAMES: usize = 4096;

/// A WAV file that can be used: its header makes sense and all its samples are finite.
#[derive(Clone, Debug)]
pub struct Recording {
    path: PathBuf,
    header: WavHeader,
}

impl Recording {
    /// Opens and checks a recording; a float recording is read through in search of NaN and infinity.
    ///
    /// # Errors
    /// No such file; not WAV, or WAV of a kind that is not read; no samples; a NaN or an infinity.
    pub fn open(path: &Path) -> Result<Self, AudioError> {
        // Looked at before it is opened: opening a named pipe would wait for its writer.
        let metadata = fs::metadata(path).map_err(AudioError::open(path))?;
        if !metadata.is_file() {
            return Err(AudioError::recording(path, Problem::NotAFile));
        }
        let mut file = File::open(path).map_err(AudioError::open(path))?;
        let header = wav_header::read(&mut file, metadata.len()).map_err(|error| match error {
            HeaderError::Io(source) => AudioError::read(path)(source),
            HeaderError::Problem(problem) => AudioError::recording(path, problem),
        })?;
        let recording = Recording { path: path.to_owned(), header };
        if recording.header.coding == Coding::F32 {
            recording.peak()?;
        }
        Ok(recording)
    }

    /// The file.
    pub fn path(&self) -> &Path {
        &self.path
    }

    /// Channels, at least one.
    pub fn channels(&self) -> usize {
        self.header.channels
    }

    /// Sample rate in Hz, 8000 to 192 000.
    pub fn sample_rate(&self) -> u32 {
        self.header.sample_rate
    }

    /// Frames, at least one.
    pub fn frames(&self) -> u64 {
        self.header.frames
    }

    /// What a user should know although the recording is used: its end is missing.
    pub fn warning(&self) -> Option<String> {
        let promised = self.header.promised_frames?;
        let (path, frames) = (self.path.display(), self.header.frames);
        Some(format!("{path}: cut short: the header promises {promised} frames, {frames} are there and are used"))
    }

    /// The largest absolute sample of all channels, 1.0 being full scale; reads the whole file.
    ///
    /// # Errors
    /// The file can no longer be read, or the user interrupts.
    pub fn peak(&self) -> Result<f64, AudioError> {
        let mut blocks = self.blocks()?;
        let mut planes = vec![Vec::new(); self.channels()];
        let mut peak = 0.0_f64;
        while blocks.read(&mut planes, CHECK_FRAMES)? > 0 {
            peak = planes.iter().flatten().fold(peak, |peak, sample| peak.max(sample.abs()));
        }
        Ok(peak)
    }

    /// The largest true peak of all channels (ITU-R BS.1770-4, annex 2), 1.0 being full scale; reads the whole file.
    ///
    /// # Errors
    /// The file can no longer be read, or the user interrupts.
    pub fn true_peak(&self) -> Result<f64, AudioError> {
        let Ok(mut meter) = LevelMeter::new(self.channels(), self.sample_rate()) else {
            // More channels than a loudness meter takes: the sample peak is the next best.
            return self.peak();
        };
        let mut blocks = self.blocks()?;
        let mut planes = vec![Vec::new(); self.channels()];
        while blocks.read(&mut planes, CHECK_FRAMES)? > 0 {
            meter.add(&planes);
        }
        Ok(meter.finish().true_peak)
    }

    /// The samples from the start, in blocks.
    ///
    /// # Errors
    /// The file can no longer be opened.
    pub fn blocks(&self) -> Result<BlockReader, AudioError> {
        let mut file = File::open(&self.path).map_err(AudioError::open(&self.path))?;
        file.seek(SeekFrom::Start(self.header.data_start)).map_err(AudioError::read(&self.path))?;
        Ok(BlockReader { recording: self.clone(), file: BufReader::new(file), bytes: Vec::new(), position: 0 })
    }
}

/// The samples of a recording, read one block after another.
pub struct BlockReader {
    recording: Recording,
    file: BufReader<File>,
    bytes: Vec<u8>,
    /// Frames read so far.
    position: u64,
}

impl BlockReader {
    /// Passes over so many frames, or over all that are left.
    ///
    /// # Errors
    /// The file cannot be read.
    pub fn skip(&mut self, frames: u64) -> Result<(), AudioError> {
        let WavHeader { coding, channels, frames: all, .. } = self.recording.header;
        let frames = frames.min(all - self.position);
        let bytes = frames * (channels * coding.bytes()) as u64;
        let seek = self.file.seek_relative(i64::try_from(bytes).unwrap_or(i64::MAX));
        seek.map_err(AudioError::read(&self.recording.path))?;
        self.position += frames;
        Ok(())
    }

    /// Replaces the planes' contents with the next block, one plane a channel, and returns its frames: `max_frames`,
    /// fewer at the end, then 0.
    ///
    /// # Panics
    /// If `planes.len()` is not the number of channels.
    ///
    /// # Errors
    /// The file cannot be read or has changed since it was checked; the user interrupts.
    pub fn read(&mut self, planes: &mut [Vec<f64>], max_frames: usize) -> Result<usize, AudioError> {
        interrupt::check()?;
        let WavHeader { coding, channels, frames, .. } = self.recording.header;
        assert_eq!(planes.len(), channels, "one plane a channel");
        let block_frames = (max_frames as u64).min(frames - self.position) as usize;
        self.bytes.resize(block_frames * channels * coding.bytes(), 0);
        self.file.read_exact(&mut self.bytes).map_err(|error| match error.kind() {
            std::io::ErrorKind::UnexpectedEof => AudioError::recording(&self.recording.path, Problem::Shrunk),
            _ => AudioError::read(&self.recording.path)(error),
        })?;
        coding.decode(&self.bytes, planes);
        if coding == Coding::F32 {
            self.check_finite(planes)?;
        }
        self.position += block_frames as u64;
        Ok(block_frames)
    }

    fn check_finite(&self, planes: &[Vec<f64>]) -> Result<(), AudioError> {
        let bad = |(channel, plane): (usize, &Vec<f64>)| {
            let at = plane.iter().position(|sample| !sample.is_finite())?;
            Some((at, channel, plane[at]))
        };
        let Some((at, channel, value)) = planes.iter().enumerate().filter_map(bad).min_by_key(|bad| (bad.0, bad.1))
        else {
            return Ok(());
        };
        let problem = Problem::NotFinite { frame: self.position + at as u64 + 1, channel: channel + 1, value };
        Err(AudioError::recording(&self.recording.path, problem))
    }
}
