//! Where the samples of a WAV file lie and how they are coded: RIFF, RF64 and BW64, lengths left open or wrong.

use std::io::{self, Read, Seek, SeekFrom};

use super::error::RecordingProblem as Problem;
use super::samples::Coding;

/// What the header of a WAV file says, held against the file's true length.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct WavHeader {
    pub coding: Coding,
    pub channels: usize,
    pub sample_rate: u32,
    /// Where the samples begin, in bytes.
    pub data_start: u64,
    /// Whole frames that are there.
    pub frames: u64,
    /// Frames that the header promises, where these are more.
    pub promised_frames: Option<u64>,
}

/// A header that cannot be used, or a file that cannot be read.
#[derive(Debug)]
pub(super) enum HeaderError {
    Io(io::Error),
    Problem(Problem),
}

impl From<Problem> for HeaderError {
    fn from(problem: Problem) -> Self {
        HeaderError::Problem(problem)
    }
}

impl From<io::Error> for HeaderError {
    fn from(error: io::Error) -> Self {
        match error.kind() {
            io::ErrorKind::UnexpectedEof => HeaderError::Problem(Problem::HeaderCutShort),
            _ => HeaderError::Io(error),
        }
    }
}

/// A pipe's writer cannot know the length. ffmpeg leaves all bits set, sox this value.
const SHORTEST_OPEN_LENGTH: u64 = 0x7FFF_F000;

/// What RF64 writes in place of a length that it gives elsewhere.
const ALL_BITS: u64 = u32::MAX as u64;

/// Far beyond any recording; keeps the sizes of written frames within the format's 16 bits.
const MOST_CHANNELS: u16 = 1024;

struct Format {
    coding: Coding,
    channels: usize,
    sample_rate: u32,
}

/// Reads the header of a WAV file of `file_bytes`.
pub(super) fn read(file: &mut (impl Read + Seek), file_bytes: u64) -> Result<WavHeader, HeaderError> {
    let riff_bytes = read_container(file, file_bytes)?;
    let mut format = None;
    let mut long_data_bytes = None;
    loop {
        let (id, length) = read_chunk_head(file)?;
        let start = file.stream_position()?;
        match &id {
            b"fmt " => format = Some(read_format(file, length)?),
            b"ds64" => long_data_bytes = Some(read_long_lengths(file)?),
            b"data" => {
                let format = format.ok_or_else(|| broken("the format (fmt) does not come before the samples"))?;
                let (declared, open) = match (length, long_data_bytes) {
                    (ALL_BITS, Some(bytes)) => (bytes, bytes == 0 || bytes == u64::MAX),
                    // A recorder that was cut off leaves both lengths as they were at the start.
                    (0, _) => (0, riff_bytes + 8 <= start),
                    _ => (length, length >= SHORTEST_OPEN_LENGTH && start + length > file_bytes),
                };
                return locate_samples(format, start, declared, open, file_bytes);
            }
            _ => {}
        }
        // Chunks are padded to an even length.
        file.seek(SeekFrom::Start(start + length.next_multiple_of(2)))?;
    }
}

fn broken(what: &str) -> Problem {
    Problem::BadHeader { what: what.to_owned() }
}

/// The container's name and kind; returns its declared length.
fn read_container(file: &mut impl Read, file_bytes: u64) -> Result<u64, HeaderError> {
    let mut head = [0; 12];
    let available = file_bytes.min(12) as usize;
    file.read_exact(&mut head[..available])?;
    let is_riff = matches!(&head[..4], b"RIFF" | b"RF64" | b"BW64");
    if is_riff && available < 12 {
        return Err(Problem::HeaderCutShort.into());
    }
    if !is_riff || &head[8..] != b"WAVE" {
        return Err(Problem::NotWav { looks_like: kind_of_file(&head) }.into());
    }
    Ok(u64::from(u32_at(&head, 4)))
}

/// The kinds of file that are most often taken for WAV, by their first bytes.
fn kind_of_file(head: &[u8; 12]) -> Option<&'static str> {
    match head {
        [b'f', b'L', b'a', b'C', ..] => Some("a FLAC file"),
        [b'F', b'O', b'R', b'M', ..] => Some("an AIFF file"),
        [b'O', b'g', b'g', b'S', ..] => Some("an Ogg file"),
        [b'I', b'D', b'3', ..] | [0xFF, 0xFB | 0xF3 | 0xFA, ..] => Some("an MP3 file"),
        [b'R', b'I', b'F', b'X', ..] => Some("a big-endian RIFX file"),
        [b'r', b'i', b'f', b'f', ..] => Some("a Wave64 file"),
        [_, _, _, _, b'f', b't', b'y', b'p', ..] => Some("an MP4 or M4A file"),
        _ => None,
    }
}

fn read_chunk_head(file: &mut impl Read) -> io::Result<([u8; 4], u64)> {
    let mut head = [0; 8];
    file.read_exact(&mut head)?;
    Ok(([head[0], head[1], head[2], head[3]], u64::from(u32_at(&head, 4))))
}

/// The `ds64` chunk of RF64 (EBU Tech 3306) and BW64 (ITU-R BS.2088): the length of the samples in 64 bits.
fn read_long_lengths(file: &mut impl Read) -> io::Result<u64> {
    let mut lengths = [0; 16];
    file.read_exact(&mut lengths)?;
    Ok(u64::from(u32_at(&lengths, 8)) | u64::from(u32_at(&lengths, 12)) << 32)
}

fn read_format(file: &mut impl Read, length: u64) -> Result<Format, HeaderError> {
    const PCM: u16 = 1;
    const FLOAT: u16 = 3;
    const EXTENSIBLE: u16 = 0xFFFE;
    if length < 16 {
        return Err(broken("its format chunk is too short").into());
    }
    let mut bytes = [0; 40];
    let known = length.min(40) as usize;
    file.read_exact(&mut bytes[..known])?;
    let tag = match u16_at(&bytes, 0) {
        // The extensible form holds the true tag at the head of a 16-byte identifier.
        EXTENSIBLE if known == 40 => u16_at(&bytes, 24),
        tag => tag,
    };
    let (channels, sample_rate) = (u16_at(&bytes, 2), u32_at(&bytes, 4));
    let (frame_bytes, bits) = (u16_at(&bytes, 12), u16_at(&bytes, 14));
    let coding = match (tag, bits) {
        (PCM, 8) => Coding::U8,
        (PCM, 16) => Coding::I16,
        (PCM, 24) => Coding::I24,
        (PCM, 32) => Coding::I32,
        (FLOAT, 32) => Coding::F32,
        _ => return Err(Problem::UnsupportedCoding { found: coding_name(tag, bits) }.into()),
    };
    if !(1..=MOST_CHANNELS).contains(&channels) {
        return Err(
            Problem::BadHeader { what: format!("{channels} channels, expected 1 to {MOST_CHANNELS}") }.into()
        );
    }
    let channels = usize::from(channels);
    if usize::from(frame_bytes) != channels * coding.bytes() {
        let expected = channels * coding.bytes();
        let what = format!("a frame of {frame_bytes} bytes, where {channels} × {bits} bits make {expected}");
        return Err(Problem::BadHeader { what }.into());
    }
    if !(8000..=192_000).contains(&sample_rate) {
        return Err(Problem::RateOutOfRange { rate: sample_rate }.into());
    }
    Ok(Format { coding, channels, sample_rate })
}

fn coding_name(tag: u16, bits: u16) -> String {
    match tag {
        1 => format!("{bits}-bit integer"),
        2 | 0x11 => "ADPCM".to_owned(),
        3 => format!("{bits}-bit float"),
        6 => "A-law".to_owned(),
        7 => "µ-law".to_owned(),
        0x50 | 0x55 => "MPEG".to_owned(),
        _ => format!("compressed (WAV format tag {tag:#06x})"),
    }
}

fn locate_samples(
    format: Format,
    start: u64,
    declared: u64,
    open: bool,
    file_bytes: u64,
) -> Result<WavHeader, HeaderError> {
    let Format { coding, channels, sample_rate } = format;
    let frame_bytes = (channels * coding.bytes()) as u64;
    let there = file_bytes.saturating_sub(start);
    let promised = if open { there } else { declared } / frame_bytes;
    let frames = promised.min(there / frame_bytes);
    if frames == 0 {
        return Err(Problem::NoSamples.into());
    }
    let promised_frames = (promised > frames).then_some(promised);
    Ok(WavHeader { coding, channels, sample_rate, data_start: start, frames, promised_frames })
}

fn u16_at(bytes: &[u8], at: usize) -> u16 {
    u16::from_le_bytes([bytes[at], bytes[at + 1]])
}

fn u32_at(bytes: &[u8], at: usize) -> u32 {
    u32::from_le_bytes([bytes[at], bytes[at + 1], bytes[at + 2], bytes[at + 3]])
}
