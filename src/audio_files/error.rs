//! What can go wrong with files: what, where, what was expected, what to do.

use std::fmt;
use std::io;
use std::path::{Path, PathBuf};

/// Why a file could not be read or written.
#[derive(Debug)]
pub enum AudioError {
    /// A recording that cannot be used.
    Recording { path: PathBuf, problem: RecordingProblem },
    /// A file that cannot be opened.
    Open { path: PathBuf, source: io::Error },
    /// A file that was opened and then could not be read.
    Read { path: PathBuf, source: io::Error },
    /// A file or folder that cannot be made, written or moved into place.
    Write { path: PathBuf, source: io::Error },
    /// The output folder holds something and may not be overwritten.
    FolderInUse { folder: PathBuf, holds: PathBuf },
    /// The output folder's place is taken by a file.
    FolderIsFile { folder: PathBuf },
    /// An output's place is taken by a folder.
    OutputIsFolder { path: PathBuf },
    /// An output is there already and may not be overwritten.
    FileExists { path: PathBuf },
    /// An output would overwrite an input.
    OutputIsInput { path: PathBuf },
    /// Two outputs have one name.
    OutputTwice { path: PathBuf },
    /// The sound to be written holds a NaN or an infinity; frame and channel count from 1.
    NotFinite { path: PathBuf, frame: u64, channel: usize },
    /// The user pressed Ctrl-C, or the system asked the program to end.
    Interrupted,
}

/// Why a recording cannot be used.
#[derive(Clone, Debug, PartialEq)]
pub enum RecordingProblem {
    /// Not a regular file.
    NotAFile,
    /// Another kind of file, named where its first bytes tell.
    NotWav { looks_like: Option<&'static str> },
    /// The file ends inside its header.
    HeaderCutShort,
    /// No `fmt ` chunk before the samples, or one that contradicts itself.
    BadHeader { what: String },
    /// A coding or bit depth that is not read.
    UnsupportedCoding { found: String },
    /// A sample rate outside 8 to 192 kHz.
    RateOutOfRange { rate: u32 },
    /// Not one whole frame.
    NoSamples,
    /// A NaN or an infinity; frame and channel count from 1.
    NotFinite { frame: u64, channel: usize, value: f64 },
    /// The file became shorter after it was checked.
    Shrunk,
}

impl AudioError {
    /// Whether the request or a file was wrong, rather than the work failing.
    pub fn is_request(&self) -> bool {
        !matches!(
            self,
            AudioError::Read { .. }
                | AudioError::Write { .. }
                | AudioError::NotFinite { .. }
                | AudioError::Interrupted
        )
    }

    pub(super) fn recording(path: &Path, problem: RecordingProblem) -> Self {
        AudioError::Recording { path: path.to_owned(), problem }
    }

    pub(super) fn open(path: &Path) -> impl Fn(io::Error) -> Self {
        let path = path.to_owned();
        move |source| AudioError::Open { path: path.clone(), source }
    }

    pub(super) fn read(path: &Path) -> impl Fn(io::Error) -> Self {
        let path = path.to_owned();
        move |source| AudioError::Read { path: path.clone(), source }
    }

    pub(super) fn write(path: &Path) -> impl Fn(io::Error) -> Self {
        let path = path.to_owned();
        move |source| AudioError::Write { path: path.clone(), source }
    }
}

impl fmt::Display for AudioError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            AudioError::Recording { path, problem } => write!(f, "{}: {problem}", path.display()),
            AudioError::Open { path, source } if source.kind() == io::ErrorKind::NotFound => {
                write!(f, "{}: there is no such file", path.display())
            }
            AudioError::Open { path, source } => write!(f, "{}: cannot be opened: {source}", path.display()),
            AudioError::Read { path, source } => write!(f, "{}: cannot be read: {source}", path.display()),
            AudioError::Write { path, source } if source.kind() == io::ErrorKind::StorageFull => {
                let path = path.display();
                write!(
                    f,
                    "{path}: the disk is full; nothing was left behind: make room or choose another --into folder"
                )
            }
            AudioError::Write { path, source } => write!(f, "{}: cannot be written: {source}", path.display()),
            AudioError::FolderInUse { folder, holds } => write!(
                f,
                "{}: the folder already holds {}; choose an empty or new folder, or overwrite files of the same names \
                 with --replace",
                folder.display(),
                holds.display()
            ),
            AudioError::FolderIsFile { folder } => {
                write!(
                    f,
                    "{}: a file stands where the output folder should be; choose another folder",
                    folder.display()
                )
            }
            AudioError::OutputIsFolder { path } => {
                write!(f, "{}: a folder stands where this file should be written; move it away", path.display())
            }
            AudioError::FileExists { path } => {
                write!(
                    f,
                    "{}: the file exists already; choose another name, or overwrite it with --replace",
                    path.display()
                )
            }
            AudioError::OutputIsInput { path } => {
                write!(f, "{}: this output would overwrite an input; choose another --into folder", path.display())
            }
            AudioError::OutputTwice { path } => {
                write!(f, "{}: two outputs would get this name; rename one of them", path.display())
            }
            AudioError::NotFinite { path, frame, channel } => write!(
                f,
                "{}: the sound to be written is not a finite number at frame {frame}, channel {channel}; nothing was \
                 written",
                path.display()
            ),
            AudioError::Interrupted => write!(f, "interrupted; no output was left behind"),
        }
    }
}

impl fmt::Display for RecordingProblem {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        const CONVERT: &str = "convert it to WAV, for example with: ffmpeg -i INPUT -c:a pcm_s24le OUTPUT.wav";
        match self {
            RecordingProblem::NotAFile => {
                write!(f, "not a regular file: a recording is read twice, so save it to a file first")
            }
            RecordingProblem::NotWav { looks_like: Some(kind) } => write!(f, "this is {kind}, not WAV; {CONVERT}"),
            RecordingProblem::NotWav { looks_like: None } => {
                write!(f, "not a WAV file (it does not begin with RIFF, RF64 or BW64 and WAVE); {CONVERT}")
            }
            RecordingProblem::HeaderCutShort => {
                write!(
                    f,
                    "the WAV header is cut short: the file ends before its samples begin; copy or export it again"
                )
            }
            RecordingProblem::BadHeader { what } => write!(f, "the WAV header is broken: {what}; export it again"),
            RecordingProblem::UnsupportedCoding { found } => write!(
                f,
                "{found} samples are not read; expected integers of 8, 16, 24 or 32 bit, or 32-bit float; {CONVERT}"
            ),
            RecordingProblem::RateOutOfRange { rate } => {
                write!(f, "a sample rate of {rate} Hz; expected 8000 to 192000 Hz; resample it first")
            }
            RecordingProblem::NoSamples => write!(f, "the recording holds no samples"),
            RecordingProblem::NotFinite { frame, channel, value } => {
                let kind = if value.is_nan() { "NaN (not a number)" } else { "infinite" };
                write!(
                    f,
                    "frame {frame}, channel {channel} is {kind}; repair the recording or export it as integers"
                )
            }
            RecordingProblem::Shrunk => {
                write!(f, "the file became shorter while it was read; leave it alone meanwhile")
            }
        }
    }
}

impl std::error::Error for RecordingProblem {}

impl std::error::Error for AudioError {
    fn source(&self) -> Option<&(dyn std::error::Error + 'static)> {
        match self {
            AudioError::Open { source, .. }
            | AudioError::Read { source, .. }
            | AudioError::Write { source, .. } => Some(source),
            AudioError::Recording { problem, .. } => Some(problem),
            _ => None,
        }
    }
}
