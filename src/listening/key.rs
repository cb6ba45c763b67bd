//! What the letters stand for: the maker's own file, bound to the pack by hashes.

use serde::{Deserialize, Serialize};

use super::secret::sha256_hex;

/// The version of the key's format.
pub const FORMAT: u32 = 1;

/// The key of a pack.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Key {
    /// Version of this format.
    pub format: u32,
    /// The pack's id: a hash over the trials and every take.
    pub pack: String,
    /// Keeps the key's hash, which the page carries, from being guessed.
    pub nonce: String,
    /// Trials of a run, fixed beforehand.
    pub trials: u32,
    /// The recordings, in the page's order.
    pub recordings: Vec<KeyRecording>,
}

/// One recording of a pack.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct KeyRecording {
    /// Its number in the page, from 1.
    pub number: usize,
    /// The recording's file name.
    pub name: String,
    /// Sample rate of the takes, Hz.
    pub sample_rate: u32,
    /// Channels.
    pub channels: usize,
    /// Frames of every take.
    pub frames: usize,
    /// Where in the recording the takes begin, s.
    pub from_seconds: f64,
    /// V rms at the output of a 0 dBFS sine before the gains below.
    pub full_scale_rms: f64,
    /// Loudness of every take, LUFS.
    #[serde(rename = "loudness_LUFS")]
    pub loudness: f64,
    /// The takes, in order of their letters.
    pub takes: Vec<KeyTake>,
}

/// One take of a recording.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct KeyTake {
    /// Its letter.
    pub letter: char,
    /// Its file in send/takes.
    pub file: String,
    /// The file's SHA-256.
    pub sha256: String,
    /// The configuration's name; `null` is the recording itself.
    pub configuration: Option<String>,
    /// Whether the sound was turned around to restore its polarity.
    pub turned: bool,
    /// DC taken out, dBFS; `null` where there was none.
    #[serde(rename = "dc_removed_dBFS")]
    pub dc_removed: Option<f64>,
    /// Loudness before the gain, LUFS.
    #[serde(rename = "own_loudness_LUFS")]
    pub own_loudness: f64,
    /// True peak before the gain, dBTP.
    #[serde(rename = "own_true_peak_dBTP")]
    pub own_true_peak: f64,
    /// The gain, dB: 0 or below.
    #[serde(rename = "gain_dB")]
    pub gain: f64,
    /// Loudness of the file, LUFS.
    #[serde(rename = "loudness_LUFS")]
    pub loudness: f64,
    /// True peak of the file, dBTP.
    #[serde(rename = "true_peak_dBTP")]
    pub true_peak: f64,
    /// DC of the file, dBFS; `null` where there is none.
    #[serde(rename = "dc_dBFS")]
    pub dc: Option<f64>,
    /// Small-signal gain of the stage at 1 kHz, dB; `null` for the recording itself, as are the next two.
    #[serde(rename = "stage_gain_dB")]
    pub stage_gain: Option<f64>,
    /// The stage's response at 20 Hz over that at 1 kHz, dB.
    #[serde(rename = "response_20_Hz_dB")]
    pub response_low: Option<f64>,
    /// The stage's response at 20 kHz over that at 1 kHz, dB.
    #[serde(rename = "response_20_kHz_dB")]
    pub response_high: Option<f64>,
}

impl Key {
    /// The id that the pack's contents have.
    pub fn id(&self) -> String {
        let mut contents = format!("platewright listening pack {}\ntrials {}\n", self.format, self.trials);
        for recording in &self.recordings {
            for take in &recording.takes {
                contents.push_str(&format!("{} {} {}\n", recording.number, take.letter, take.sha256));
            }
        }
        sha256_hex(contents.as_bytes())
    }

    /// The key as its file holds it.
    ///
    /// # Errors
    /// None that a key of finite figures gives.
    pub fn to_json(&self) -> Result<String, serde_json::Error> {
        Ok(serde_json::to_string_pretty(self)? + "\n")
    }

    /// A recording by its number.
    pub fn recording(&self, number: usize) -> Option<&KeyRecording> {
        self.recordings.iter().find(|recording| recording.number == number)
    }
}

impl KeyRecording {
    /// The place in `takes` of a letter.
    pub fn place(&self, letter: &str) -> Option<usize> {
        let mut characters = letter.chars();
        let (Some(letter), None) = (characters.next(), characters.next()) else { return None };
        self.takes.iter().position(|take| take.letter == letter)
    }
}

impl KeyTake {
    /// What it is, for the maker.
    pub fn name(&self) -> &str {
        self.configuration.as_deref().unwrap_or(DRY)
    }
}

/// What the recording itself is called among the takes.
pub const DRY: &str = "the recording itself";
