//! WAV files written as a stream of blocks, their length known beforehand.

use std::io::{BufWriter, Write};

use super::output_folder::StagedFile;
use super::samples::SampleFormat;
use super::scratch::frames_of;
use super::{AudioError, interrupt};

/// What a written file turned out to hold.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Levels {
    /// The largest absolute sample before rounding and clipping; 1.0 is full scale.
    pub peak: f64,
    /// Samples beyond full scale: clipped in integer formats, kept in float.
    pub over_full_scale: u64,
}

/// A WAV file on its way to its place.
///
/// Integer formats round to the nearest value. Files beyond 4 GiB become RF64 (EBU Tech 3306).
pub struct WavOutput {
    file: BufWriter<StagedFile>,
    format: SampleFormat,
    channels: usize,
    /// Frames that the header promises.
    frames: u64,
    /// Frames written so far.
    position: u64,
    bytes: Vec<u8>,
    levels: Levels,
}

impl WavOutput {
    /// Begins a file of exactly `frames` frames.
    ///
    /// # Errors
    /// The disk is full or fails.
    pub fn new(
        file: StagedFile,
        format: SampleFormat,
        channels: usize,
        sample_rate: u32,
        frames: u64,
    ) -> Result<Self, AudioError> {
        let mut file = BufWriter::new(file);
        let header = header(format, channels, sample_rate, frames, RIFF_LIMIT);
        file.write_all(&header).map_err(AudioError::write(file.get_ref().target()))?;
        Ok(WavOutput { file, format, channels, frames, position: 0, bytes: Vec::new(), levels: Levels::default() })
    }

    /// Appends a block, one plane a channel, all of one length.
    ///
    /// # Panics
    /// If `planes.len()` is not the number of channels, the planes differ in length, or more frames come than promised.
    ///
    /// # Errors
    /// A sample is NaN or infinite; the disk is full or fails; the user interrupts.
    pub fn write(&mut self, planes: &[impl AsRef<[f64]>]) -> Result<(), AudioError> {
        interrupt::check()?;
        let frames = frames_of(planes, self.channels);
        assert!(self.position + frames as u64 <= self.frames, "more frames than promised");
        for (channel, plane) in planes.iter().enumerate() {
            let plane = plane.as_ref();
            if let Some(at) = plane.iter().position(|sample| !sample.is_finite()) {
                let (path, frame) = (self.file.get_ref().target().to_owned(), self.position + at as u64 + 1);
                return Err(AudioError::NotFinite { path, frame, channel: channel + 1 });
            }
            self.levels.peak = plane.iter().fold(self.levels.peak, |peak, sample| peak.max(sample.abs()));
            self.levels.over_full_scale += plane.iter().filter(|sample| sample.abs() > 1.0).count() as u64;
        }
        self.format.encode(planes, &mut self.bytes);
        self.position += frames as u64;
        self.file.write_all(&self.bytes).map_err(AudioError::write(self.file.get_ref().target()))
    }

    /// Ends the file, which is now ready to be put in place.
    ///
    /// # Panics
    /// If fewer frames came than promised.
    ///
    /// # Errors
    /// The disk is full or fails.
    pub fn finish(mut self) -> Result<(StagedFile, Levels), AudioError> {
        assert_eq!(self.position, self.frames, "as many frames as promised");
        let path = self.file.get_ref().target().to_owned();
        let data_bytes = self.frames * (self.channels * self.format.bytes()) as u64;
        if data_bytes % 2 == 1 {
            self.file.write_all(&[0]).map_err(AudioError::write(&path))?;
        }
        let file = self.file.into_inner().map_err(|error| AudioError::write(&path)(error.into_error()))?;
        Ok((file, self.levels))
    }
}

/// The most that a 32-bit length can say.
const RIFF_LIMIT: u64 = u32::MAX as u64;

/// The bytes before the samples; a container longer than `riff_limit` becomes RF64.
pub(super) fn header(
    format: SampleFormat,
    channels: usize,
    sample_rate: u32,
    frames: u64,
    riff_limit: u64,
) -> Vec<u8> {
    let data_bytes = frames * (channels * format.bytes()) as u64;
    let mut chunks = chunk(b"fmt ", &format_chunk(format, channels, sample_rate));
    if format == SampleFormat::F32 {
        // Every coding but integers needs the number of frames here.
        let frames = u32::try_from(frames).unwrap_or(u32::MAX);
        chunks.extend(chunk(b"fact", &frames.to_le_bytes()));
    }
    // "WAVE", these chunks, the head of the data chunk, the samples, the pad byte.
    let riff_bytes = 4 + chunks.len() as u64 + 8 + data_bytes.next_multiple_of(2);
    let mut header = Vec::new();
    if riff_bytes <= riff_limit {
        header.extend(b"RIFF");
        header.extend((riff_bytes as u32).to_le_bytes());
        header.extend(b"WAVE");
        header.extend(chunks);
        header.extend(b"data");
        header.extend((data_bytes as u32).to_le_bytes());
    } else {
        let mut long = Vec::new();
        let long_chunk_bytes = 36;
        for length in [riff_bytes + long_chunk_bytes, data_bytes, frames] {
            long.extend(length.to_le_bytes());
        }
        long.extend(0_u32.to_le_bytes());
        header.extend(b"RF64");
        header.extend(u32::MAX.to_le_bytes());
        header.extend(b"WAVE");
        header.extend(chunk(b"ds64", &long));
        header.extend(chunks);
        header.extend(b"data");
        header.extend(u32::MAX.to_le_bytes());
    }
    header
}

fn chunk(id: &[u8; 4], contents: &[u8]) -> Vec<u8> {
    let mut bytes = id.to_vec();
    bytes.extend((contents.len() as u32).to_le_bytes());
    bytes.extend(contents);
    bytes
}

/// The `fmt ` chunk: the old short form for one or two channels of 16-bit integers or float, else the extensible one.
fn format_chunk(format: SampleFormat, channels: usize, sample_rate: u32) -> Vec<u8> {
    let tag: u16 = if format == SampleFormat::F32 { 3 } else { 1 };
    let bits = 8 * format.bytes() as u16;
    let extensible = channels > 2 || matches!(format, SampleFormat::I24 | SampleFormat::I32);
    let frame_bytes = channels * format.bytes();
    let mut bytes = Vec::new();
    bytes.extend(if extensible { 0xFFFE } else { tag }.to_le_bytes());
    bytes.extend((channels as u16).to_le_bytes());
    bytes.extend(sample_rate.to_le_bytes());
    bytes.extend(sample_rate.saturating_mul(frame_bytes as u32).to_le_bytes());
    bytes.extend((frame_bytes as u16).to_le_bytes());
    bytes.extend(bits.to_le_bytes());
    if extensible {
        bytes.extend(22_u16.to_le_bytes());
        bytes.extend(bits.to_le_bytes());
        bytes.extend(speakers(channels).to_le_bytes());
        bytes.extend(tag.to_le_bytes());
        // The rest of the identifiers that Microsoft's multichannel WAV gives to integers and float.
        bytes.extend([0, 0, 0, 0, 0x10, 0, 0x80, 0, 0, 0xAA, 0, 0x38, 0x9B, 0x71]);
    } else if tag == 3 {
        bytes.extend(0_u16.to_le_bytes());
    }
    bytes
}

/// The customary speakers of so many channels; 0 where there is no custom.
fn speakers(channels: usize) -> u32 {
    match channels {
        1 => 0x4,
        2 => 0x3,
        4 => 0x33,
        6 => 0x3F,
        8 => 0x63F,
        _ => 0,
    }
}
