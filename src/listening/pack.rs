//! Making a pack: render, put right, encode, and set the page beside it.

use std::ops::Range;
use std::path::{Path, PathBuf};
use std::time::{Duration, SystemTime};

use platewright_dsp::Kernel;
use platewright_dsp::portable::decibels;
use rayon::prelude::*;

use super::correction::{self, HIGHEST_RATE};
use super::key::{DRY, FORMAT, Key, KeyRecording, KeyTake};
use super::matching::{Match, match_loudness};
use super::secret::{MOST_TAKES, SampleDigest, Secret, sha256_hex};
use super::stage_response::StageResponse;
use super::{flac, maker, page, passage};
use crate::audio_files::{OutputFolder, Recording, SampleFormat, StagedFile, WavOutput};
use crate::failure::{Failure, RequestError, WorkError};
use crate::plan::PackOptions;
use crate::rendering::{Planes, excerpt, recorded};
use crate::stage_file::StageFile;
use crate::terminal;

/// What the stage hears before a passage, s: its bias settles over seconds.
const LEAD_IN_SECONDS: f64 = 10.0;
/// Where the loudest sample peak of the stage's takes goes before any matching, dBFS.
const LOUDEST_PEAK_DBFS: f64 = -1.0;
/// How far the files' loudness may lie from the target, LU.
const MATCHED_LU: f64 = 0.1;
/// The most that is comfortably sent, bytes.
const COMFORTABLE_BYTES: usize = 60_000_000;
/// Every file's time of last change, s after 1970-01-01: 2000-01-01. The same for all, so that it tells nothing.
const MODIFIED_SECONDS: u64 = 946_684_800;

const KEY: &str = "keep/key.json";
const MAKER: &str = "keep/maker.txt";
/// The page, below the pack's folder.
pub const INDEX: &str = "send/index.html";

/// A pack that can be made.
pub struct PackJob<'a> {
    file: &'a StageFile,
    recordings: &'a [Recording],
    options: &'a PackOptions,
    kernel: Kernel,
    passages: Vec<Range<u64>>,
    secret: Secret,
    notes: Vec<String>,
}

/// A pack that has been made.
pub struct PackFigures {
    /// The key.
    pub key: Key,
    /// What a person should know.
    pub notes: Vec<String>,
    /// Bytes of everything in send/.
    pub send_bytes: usize,
}

/// The takes of a recording, ready to be written.
struct Ready {
    recording: KeyRecording,
    /// As many as takes, in order of their letters.
    samples: Vec<Vec<Vec<i32>>>,
    files: Vec<Vec<u8>>,
}

/// A take on its way.
struct Draft {
    name: Option<String>,
    planes: Planes,
    turned: bool,
    dc_removed: Option<f64>,
    response: Option<StageResponse>,
}

impl<'a> PackJob<'a> {
    /// Checks that the pack can be made; makes nothing.
    ///
    /// # Errors
    /// [`RequestError`] where there are too few or too many takes, or a recording has more than two channels, is silent
    /// or too short; a file error.
    pub fn new(
        file: &'a StageFile,
        recordings: &'a [Recording],
        options: &'a PackOptions,
        kernel: Kernel,
    ) -> Result<PackJob<'a>, Failure> {
        let takes = file.configurations.len() + usize::from(options.with_dry);
        check_takes(takes)?;
        let mut passages = Vec::new();
        let mut digests = Vec::new();
        let mut notes = Vec::new();
        for recording in recordings {
            check_channels(recording)?;
            let range = passage::choose(recording, options.from, options.length)?;
            let planes = recorded(recording, range.clone())?;
            notes.extend(clipping_note(recording, &planes));
            let mut digest = SampleDigest::new(recording.sample_rate());
            digest.add(&planes);
            digests.push(digest.finish());
            passages.push(range);
        }
        let secret = Secret::new(&file.text, &digests, options.seed);
        Ok(PackJob { file, recordings, options, kernel, passages, secret, notes })
    }

    /// The files that it will write, below the pack's folder.
    pub fn files(&self) -> Vec<PathBuf> {
        let takes = self.file.configurations.len() + usize::from(self.options.with_dry);
        let mut files = vec![PathBuf::from(INDEX)];
        for number in 1..=self.recordings.len() {
            files.push(Path::new("send").join(page::script_name(number)));
            let mut letters = self.secret.letters(number, takes);
            letters.sort_unstable();
            for letter in letters {
                files.push(take_path(number, letter, "flac"));
                if self.options.wav {
                    files.push(take_path(number, letter, "wav"));
                }
            }
        }
        files.extend([KEY, MAKER].map(PathBuf::from));
        files
    }

    /// Makes the pack: every file staged below `within`, a folder in `folder`.
    ///
    /// # Errors
    /// A configuration that stays silent; a file cannot be read or written; the user interrupts.
    pub fn run(&self, folder: &OutputFolder, within: &Path) -> Result<(Vec<StagedFile>, PackFigures), Failure> {
        let mut notes = self.notes.clone();
        let mut staged = Vec::new();
        let mut recordings = Vec::new();
        let mut send_bytes = 0;
        for (index, recording) in self.recordings.iter().enumerate() {
            let ready = self.ready(index + 1, recording, self.passages[index].clone())?;
            notes.extend(twins(&ready));
            let (files, bytes) = self.stage_takes(folder, within, &ready)?;
            staged.extend(files);
            send_bytes += bytes;
            recordings.push(ready.recording);
        }
        let mut key = Key {
            format: FORMAT,
            pack: String::new(),
            nonce: self.secret.nonce(),
            trials: self.options.trials,
            recordings,
        };
        key.pack = key.id();
        let key_text = key.to_json().map_err(defect)?;
        let seal = sha256_hex(key_text.as_bytes());
        let index = page::index(&key, &seal).map_err(defect)?;
        let mut put = |name: &str, contents: &[u8]| -> Result<(), Failure> {
            staged.push(folder.stage_contents(within.join(name), contents)?);
            Ok(())
        };
        put(INDEX, index.as_bytes())?;
        put(KEY, key_text.as_bytes())?;
        send_bytes += index.len();
        if send_bytes > COMFORTABLE_BYTES {
            notes.push(format!(
                "send/ comes to {} MB, more than the {} MB that are comfortably sent: choose a shorter --length, or \
                 fewer recordings or configurations",
                send_bytes / 1_000_000,
                COMFORTABLE_BYTES / 1_000_000
            ));
        }
        let text = maker::text(&key, &seal, self.options.seed, &notes);
        staged.push(folder.stage_contents(within.join(MAKER), text.as_bytes())?);
        let modified = SystemTime::UNIX_EPOCH + Duration::from_secs(MODIFIED_SECONDS);
        staged.iter().try_for_each(|file| file.set_modified(modified))?;
        Ok((staged, PackFigures { key, notes, send_bytes }))
    }

    /// The takes of a recording, put right.
    fn ready(&self, number: usize, recording: &Recording, range: Range<u64>) -> Result<Ready, Failure> {
        let (mut drafts, full_scale_rms) = self.drafts(recording, range.clone())?;
        let rate = recording.sample_rate().min(HIGHEST_RATE);
        drafts.par_iter_mut().for_each(|draft| {
            correction::limit_rate(&mut draft.planes, recording.sample_rate(), self.kernel);
            let dc = correction::remove_dc_and_fade(&mut draft.planes, rate);
            let largest = dc.iter().fold(0.0_f64, |largest, dc| largest.max(dc.abs()));
            draft.dc_removed = (largest > 0.0).then(|| tenths(decibels(largest)));
        });
        let (target, matches) = matched(&drafts, rate, recording)?;

        let mut letters = self.secret.letters(number, drafts.len());
        let mut dealt: Vec<(char, Draft, Match)> =
            letters.drain(..).zip(drafts).zip(matches).map(|((l, d), m)| (l, d, m)).collect();
        dealt.sort_by_key(|(letter, ..)| *letter);
        let samples: Vec<Vec<Vec<i32>>> =
            dealt.par_iter().map(|(_, draft, m)| correction::quantise(&draft.planes, m.gain)).collect();
        let files = flac::encode_alike(&samples, rate);
        let mut takes = Vec::new();
        for (((letter, draft, matched), samples), file) in dealt.into_iter().zip(&samples).zip(&files) {
            takes.push(key_take(number, letter, &draft, matched, (samples, rate), (file, target))?);
        }
        let recording = KeyRecording {
            number,
            name: file_name(recording),
            sample_rate: rate,
            channels: recording.channels(),
            frames: samples.first().and_then(|take| take.first()).map_or(0, Vec::len),
            from_seconds: range.start as f64 / f64::from(recording.sample_rate()),
            full_scale_rms,
            loudness: target,
            takes,
        };
        Ok(Ready { recording, samples, files })
    }

    /// Every take before any correction but polarity, at one level, and the V rms that 0 dBFS stands for.
    fn drafts(&self, recording: &Recording, range: Range<u64>) -> Result<(Vec<Draft>, f64), Failure> {
        let configurations = &self.file.configurations;
        let lead_in = (LEAD_IN_SECONDS * f64::from(recording.sample_rate())) as u64;
        let sound = &self.options.sound;
        let volts = excerpt(configurations, recording, sound, self.kernel, range.clone(), lead_in)?;
        let peak = volts.iter().flatten().flatten().fold(0.0_f64, |peak, volts| peak.max(volts.abs()));
        let full_scale_rms = full_scale_rms(peak);
        let mut drafts = Vec::new();
        for (configuration, mut planes) in configurations.iter().zip(volts) {
            let response = StageResponse::of(configuration)?;
            let turned = response.inverts && !self.options.keep_polarity;
            if turned {
                correction::turn(&mut planes);
            }
            correction::scale(&mut planes, 1.0 / (full_scale_rms * std::f64::consts::SQRT_2));
            let name = Some(configuration.name.clone());
            drafts.push(Draft { name, planes, turned, dc_removed: None, response: Some(response) });
        }
        if self.options.with_dry {
            let planes = recorded(recording, range)?;
            drafts.push(Draft { name: None, planes, turned: false, dc_removed: None, response: None });
        }
        Ok((drafts, full_scale_rms))
    }

    /// FLAC files, WAV files where they are wanted, and the sound script; and how many bytes they are together.
    fn stage_takes(
        &self,
        folder: &OutputFolder,
        within: &Path,
        ready: &Ready,
    ) -> Result<(Vec<StagedFile>, usize), Failure> {
        let recording = &ready.recording;
        let mut staged = Vec::new();
        let mut bytes = 0;
        for ((take, samples), file) in recording.takes.iter().zip(&ready.samples).zip(&ready.files) {
            let path = |ending| within.join(take_path(recording.number, take.letter, ending));
            staged.push(folder.stage_contents(path("flac"), file)?);
            bytes += file.len();
            if self.options.wav {
                let file = folder.stage(path("wav"))?;
                let (channels, frames) = (recording.channels, recording.frames);
                let format = SampleFormat::I24;
                let mut wav = WavOutput::new(file, format, channels, recording.sample_rate, frames as u64)?;
                wav.write(&correction::unquantise(samples))?;
                staged.push(wav.finish()?.0);
                bytes += frames * channels * format.bytes();
            }
        }
        let takes = recording.takes.iter().zip(&ready.files).map(|(take, file)| (take.letter, file.as_slice()));
        let script = page::sound_script(recording.number, takes);
        let name = Path::new("send").join(page::script_name(recording.number));
        staged.push(folder.stage_contents(within.join(name), script.as_bytes())?);
        Ok((staged, bytes + script.len()))
    }
}

fn check_takes(takes: usize) -> Result<(), RequestError> {
    if takes < 2 {
        return Err(RequestError::new(
            "the stage file has one configuration: there is nothing to compare",
            "add [compare] or [[configuration]] to it, or --with-dry to hear the recording itself beside it",
        ));
    }
    if takes > MOST_TAKES {
        return Err(RequestError::new(
            format!("{takes} takes of a recording are more than anybody compares; a pack holds up to {MOST_TAKES}"),
            "take configurations out of the stage file",
        ));
    }
    Ok(())
}

fn check_channels(recording: &Recording) -> Result<(), RequestError> {
    if recording.channels() <= 2 {
        return Ok(());
    }
    Err(RequestError::new(
        format!(
            "{} has {} channels: a pack is heard over two loudspeakers or headphones",
            terminal::path(recording.path()),
            recording.channels()
        ),
        "mix it down to stereo, or choose two of its channels, first",
    ))
}

/// Frames in a row at one full-scale value that show clipping: a clean crest hardly ever has three alike.
const CLIPPED_FRAMES: usize = 3;
/// What counts as full scale, of 1.0: the largest positive 16-bit sample is 0.99997.
const FULL: f64 = 0.9999;

fn clipping_note(recording: &Recording, planes: &Planes) -> Option<String> {
    let clipped = |plane: &Vec<f64>| {
        let runs = plane.chunk_by(|a, b| a == b);
        runs.filter(|run| run.len() >= CLIPPED_FRAMES && run[0].abs() >= FULL).count()
    };
    let places: usize = planes.iter().map(clipped).sum();
    (places > 0).then(|| {
        format!(
            "{}: the recording itself is clipped at {places} places of the passage, and every take with it",
            terminal::path(recording.path())
        )
    })
}

/// Takes that are the same to the last bit.
fn twins(ready: &Ready) -> Vec<String> {
    let takes = &ready.recording.takes;
    let mut notes = Vec::new();
    for (index, samples) in ready.samples.iter().enumerate() {
        if let Some(earlier) = ready.samples[..index].iter().position(|other| other == samples) {
            notes.push(format!(
                "recording {}: \"{}\" and \"{}\" are the same to the last bit",
                ready.recording.number,
                terminal::plain(takes[earlier].name()),
                terminal::plain(takes[index].name())
            ));
        }
    }
    notes
}

/// The common loudness and each take's way to it.
fn matched(drafts: &[Draft], rate: u32, recording: &Recording) -> Result<(f64, Vec<Match>), Failure> {
    let levels: Option<Vec<_>> = drafts.par_iter().map(|draft| correction::levels(&draft.planes, rate)).collect();
    // One or two channels at a usual rate: the meter takes them.
    let levels = levels.unwrap_or_default();
    match_loudness(&levels).map_err(|silent| {
        let name = drafts[silent].name.as_deref().unwrap_or(DRY);
        let of = terminal::path(recording.path());
        RequestError::new(
            format!("{of}: \"{}\" is silent there: it has no loudness to match", terminal::plain(name)),
            "look at the stage (a pot at 0?) and at the passage, or leave this configuration out",
        )
        .into()
    })
}

/// Everything that the key says of a take, measured on the very samples that are written.
fn key_take(
    number: usize,
    letter: char,
    draft: &Draft,
    matched: Match,
    (samples, rate): (&[Vec<i32>], u32),
    (file, target): (&[u8], f64),
) -> Result<KeyTake, Failure> {
    let written = correction::unquantise(samples);
    let levels = correction::levels(&written, rate);
    let loudness = levels.and_then(|levels| levels.loudness).unwrap_or(f64::NEG_INFINITY);
    if (loudness - target).abs() > MATCHED_LU {
        let name = terminal::plain(draft.name.as_deref().unwrap_or(DRY)).into_owned();
        return Err(WorkError::Failed {
            problem: format!("\"{name}\" cannot be matched: it reads {loudness:.2} LUFS, not {target:.2}"),
            remedy: "choose a passage whose takes differ less in loudness".to_owned(),
        }
        .into());
    }
    let response = draft.response.as_ref();
    Ok(KeyTake {
        letter,
        file: format!("{number}-{letter}.flac"),
        sha256: sha256_hex(file),
        configuration: draft.name.clone(),
        turned: draft.turned,
        dc_removed: draft.dc_removed,
        own_loudness: matched.loudness,
        own_true_peak: matched.true_peak,
        gain: matched.gain,
        loudness: hundredths(loudness),
        true_peak: levels.map_or(f64::NEG_INFINITY, |levels| hundredths(decibels(levels.true_peak))),
        dc: correction::dc_dbfs(&written).map(tenths),
        stage_gain: response.map(|r| hundredths(r.gain_db)),
        response_low: response.map(|r| hundredths(r.low_db)),
        response_high: response.map(|r| hundredths(r.high_db)),
    })
}

/// The V rms of 0 dBFS that puts a peak of `volts` at [`LOUDEST_PEAK_DBFS`], to four digits: what the key states is what
/// was done.
fn full_scale_rms(volts: f64) -> f64 {
    let exact = volts / platewright_dsp::portable::ratio(LOUDEST_PEAK_DBFS) / std::f64::consts::SQRT_2;
    if exact > 0.0 { format!("{exact:.3e}").parse().unwrap_or(exact) } else { 1.0 }
}

fn take_path(number: usize, letter: char, ending: &str) -> PathBuf {
    Path::new("send/takes").join(format!("{number}-{letter}.{ending}"))
}

fn file_name(recording: &Recording) -> String {
    recording.path().file_name().map_or_else(String::new, |name| name.to_string_lossy().into_owned())
}

fn hundredths(value: f64) -> f64 {
    (value * 100.0).round() / 100.0
}

fn tenths(value: f64) -> f64 {
    (value * 10.0).round() / 10.0
}

fn defect(error: serde_json::Error) -> Failure {
    WorkError::Failed {
        problem: format!("the key cannot be put into words: {error}"),
        remedy: "please report this line with the command".to_owned(),
    }
    .into()
}
